//! The run: event numbers in, ordered blocks of events out.

pub mod generator;
