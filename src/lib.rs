//! **spindrift** turns a hard quark or gluon into a jet of partons, in vacuum and inside a hot medium.
//!
//! It is a Monte Carlo parton shower ordered in virtuality: leading logarithm, parton level (no hadronization, no
//! underlying event). The modules stand in the order in which data flows through them:
//!
//! ```text
//! config -> source -> shower (+ medium) -> event -> run (stream) -> files
//! ```
//!
//! Units: natural units with energies, momenta and temperatures in GeV; lengths and times in fm. A name carries its
//! unit (`_gev`, `_gev2`, `_fm`). `t` always means virtuality squared in GeV^2, `z` the light-cone momentum fraction
//! of the first daughter.

pub mod cli;
pub mod config;
pub mod event;
pub mod files;
pub mod medium;
pub mod numerics;
pub mod parameters;
pub mod qcd;
pub mod random;
pub mod report;
pub mod run;
pub mod shower;
pub mod source;
