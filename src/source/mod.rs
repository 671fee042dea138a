//! Sources of hard partons.

use crate::qcd::Species;

/// Which hard process, with its numbers.
#[derive(Clone, Debug, PartialEq)]
pub enum SourceSettings {
    /// One parton without a recoiler.
    Single(SingleSettings),
    /// Two partons back to back in their rest frame.
    Pair(PairSettings),
}

/// Numbers of the `single` source.
#[derive(Clone, Debug, PartialEq)]
pub struct SingleSettings {
    /// The parton.
    pub parton: Species,
    /// Its energy in GeV.
    pub energy_gev: f64,
    /// Largest virtuality (not squared) in GeV, at most the energy.
    pub start_virtuality_gev: f64,
    /// Where it flies.
    pub direction: Direction,
}

/// Numbers of the `pair` source.
#[derive(Clone, Debug, PartialEq)]
pub struct PairSettings {
    /// The two partons; the first flies along the direction. Allowed: quark with its antiquark, or two gluons.
    pub partons: [Species; 2],
    /// Invariant mass of the pair in GeV.
    pub sqrt_s_gev: f64,
    /// Largest virtuality of each in GeV, at most half the invariant mass.
    pub start_virtuality_gev: f64,
    /// Where the first one flies.
    pub direction: Direction,
}

/// Direction of flight of the (first) hard parton; the beam is z.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Direction {
    /// Uniform azimuth at rapidity 0.
    Transverse,
    /// A unit vector.
    Along([f64; 3]),
}
