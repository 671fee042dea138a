//! File formats: the event file and the temperature field file. No other module knows HDF5.

pub mod event_file;
mod hdf5_calls;
