//! Induced emission by a single hard scattering: numerics of the spectrum and its table.

pub mod spectrum;
pub mod table;
