//! Induced emission by multiple soft scattering: numerics of the spectrum and its table.

pub mod spectrum;
pub mod table;
