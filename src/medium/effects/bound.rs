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
}
