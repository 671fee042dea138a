//! Why a distribution of birth places cannot be had.

use thiserror::Error;

/// Why a distribution of birth places cannot be had, with the remedy.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum OriginError {
    /// A nucleus out of range.
    #[error("nucleus with {quantity} {value_fm} fm; allowed: {least_fm} to {most_fm} fm")]
    Nucleus {
        /// `radius` or `diffuseness`.
        quantity: &'static str,
        /// What was asked for.
        value_fm: f64,
        /// Least allowed.
        least_fm: f64,
        /// Most allowed.
        most_fm: f64,
    },
    /// Nuclei that pass each other.
    #[error(
        "impact parameter {value_fm} fm; allowed: 0 to {most_fm:.2} fm (beyond, these nuclei do not meet)"
    )]
    ImpactParameter {
        /// What was asked for.
        value_fm: f64,
        /// Most allowed for these nuclei.
        most_fm: f64,
    },
    /// A power that is no weight.
    #[error("power {0} of the temperature; allowed: above 0 and at most {most}", most = super::field_weighted::LARGEST_POWER)]
    Power(f64),
    /// A field without structure across the beam.
    #[error(
        "this field is the same everywhere across the beam, so \"field-weighted\" has no distribution; use \"fixed\", \"overlap\" or \"list\""
    )]
    Uniform,
    /// A field that starts cold.
    #[error(
        "the field's first slice is nowhere above the end temperature of {end_temperature_gev} GeV at mid-rapidity (its largest temperature is {largest_gev} GeV; 0.1 % above is the least), so \"field-weighted\" has no distribution; use \"collision-density\", \"overlap\" or \"list\""
    )]
    Cold {
        /// Temperature in GeV below which the medium has no effect.
        end_temperature_gev: f64,
        /// Largest temperature of the slice in GeV.
        largest_gev: f64,
    },
    /// A field that does not reach mid-rapidity.
    #[error(
        "the field's eta runs from {first} to {last} and does not hold mid-rapidity (eta = 0), so \"field-weighted\" has no distribution; use \"collision-density\", \"overlap\" or \"list\""
    )]
    NoMidRapidity {
        /// First eta.
        first: f64,
        /// Last eta.
        last: f64,
    },
    /// A field without its own density.
    #[error(
        "the field holds no collision_density(x, y), so \"collision-density\" has no distribution; add the variable to the field file, or use \"field-weighted\", \"overlap\" or \"list\""
    )]
    NoCollisionDensity,
    /// A density that is 0 everywhere.
    #[error("{0} is 0 everywhere; at least one value must be above 0")]
    Empty(&'static str),
    /// A number that is no place or weight.
    #[error("place {place}: {quantity} is {value}; allowed: {allowed}")]
    Place {
        /// Number of the place, from 0.
        place: usize,
        /// `x_fm`, `y_fm` or `weight`.
        quantity: &'static str,
        /// The number.
        value: f64,
        /// What is allowed.
        allowed: &'static str,
    },
}
