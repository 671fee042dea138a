//! File formats: the event file and the temperature field file. No other module knows HDF5.

mod attributes;
pub mod event_file;
pub mod field_file;
mod global_heap;
mod hdf5_calls;
