//! What quantum chromodynamics gives the shower: species and colour factors, the running coupling, splitting kernels.

pub mod coupling;
pub mod kernels;
pub mod species;

pub use coupling::{Coupling, CouplingError, CouplingLaw, CouplingSettings, Loops, ScaleArgument};
pub use species::Species;

/// Casimir factor of a quark.
pub const C_F: f64 = 4.0 / 3.0;
/// Casimir factor of a gluon.
pub const C_A: f64 = 3.0;
/// Normalisation of the fundamental representation.
pub const T_R: f64 = 0.5;
/// hbar c in GeV fm (CODATA 2018).
pub const HBAR_C_GEV_FM: f64 = 0.197_326_980_4;
/// Mass of the Z boson in GeV, the reference scale of alpha_s (Review of Particle Physics).
pub const Z_MASS_GEV: f64 = 91.1876;
/// The first colour-line tag, as the examples of the Les Houches accord have it (Boos et al. 2001, hep-ph/0109068).
pub const FIRST_COLOUR_TAG: i32 = 501;
