//! Induced emission by a single hard scattering: the spectrum and its table.

pub mod spectrum;
pub mod table;
