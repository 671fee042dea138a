//! Statistical and physics tests of the engine: one file a subject, one binary so that everything is linked once.
//!
//! Each file says what it proves, its hypotheses, the number of events, the statistic, the smallest visible bias, and
//! how many checks it makes. All thresholds come from one significance a check, `support::statistics::SIGNIFICANCE`
//! = 10^-6; with fewer than 1000 checks the false-alarm rate of all of them together stays below 10^-3. Seeds are fixed.

mod angular;
mod behaviour;
mod collinear;
mod conservation;
mod effect_limits;
mod exits;
mod fields;
mod first_branching;
mod grids;
mod medium;
mod medium_limits;
mod medium_sign;
mod no_branching;
mod origins;
mod parton_numbers;
mod path_effects;
mod paths;
mod rate_effects;
mod support;
mod thermal;
mod twins;
