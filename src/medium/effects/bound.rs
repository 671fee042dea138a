//! What an effect says of its largest rate, so that an envelope can be made of it.

/// coefficient * t^power, t in GeV^2.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct PowerLaw {
    /// Value at t = 1 GeV^2.
    pub coefficient: f64,
    /// Exponent, -1 to 1.
    pub power: i32,
}

/// A bound on the positive part of an effect's rate, for all t and z of one parton.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum RateBound {
    /// It is nowhere positive.
    Nothing,
    /// max(R, 0) z(1-z) is at most the smaller of two power laws; the first has the smaller exponent.
    LeastOf(PowerLaw, PowerLaw),
    /// max(R, 0) z(1-z) is at most the larger of two power laws; the first has the smaller exponent.
    GreatestOf(PowerLaw, PowerLaw),
    /// max(R, 0) is at most this number.
    TimesVacuum(f64),
    /// The effect draws all its trials itself, as a Poisson process ([`super::RateEffect::propose_emissions`]).
    Emissions,
}

/// Where the trials of an effect that draws them itself may lie, and how many there are.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct EmissionLimits {
    /// Smallest and largest fraction of the emitted gluon.
    pub fractions: [f64; 2],
    /// Smallest kappa^2, GeV^2.
    pub least_kappa2_gev2: f64,
    /// kappa^2 = z(1-z) t lies below z(1-z) times this, GeV^2.
    pub largest_t_gev2: f64,
    /// kappa lies below the energy of the softer daughter.
    pub limit_to_small_angles: bool,
    /// The largest alpha_s/(2 pi), times the factor on all envelopes.
    pub largest_rate: f64,
}

/// A trial of an effect that draws them itself.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Emission {
    /// Fraction of the emitted gluon.
    pub fraction: f64,
    /// kappa^2, GeV^2.
    pub kappa2_gev2: f64,
    /// The density that it was drawn with, per unit of ln omega and ln kappa^2, over [`EmissionLimits::largest_rate`].
    pub density: f64,
}
