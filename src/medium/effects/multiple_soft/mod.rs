//! Induced emission by multiple soft scattering: the spectrum and its table.

pub mod spectrum;
pub mod table;
