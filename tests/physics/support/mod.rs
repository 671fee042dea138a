//! What the subjects share: set-ups, samples, statistics, reference tables.

pub mod reference;
pub mod setup;
pub mod statistics;
