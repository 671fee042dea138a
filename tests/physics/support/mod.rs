//! What the subjects share: set-ups, samples, statistics, reference tables.

pub mod effects;
pub mod first_branching;
pub mod reference;
pub mod setup;
pub mod statistics;
pub mod ways;
