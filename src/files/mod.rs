//! File formats: the event file, the temperature field file, and small tables. No other module knows HDF5.

mod attributes;
pub mod event_file;
pub mod field_file;
mod global_heap;
mod hdf5_calls;
pub mod number_table;
pub mod place_list;
pub mod transport_table;
