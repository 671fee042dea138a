//! Sources of hard partons.

mod hard_process;
mod pair;
mod single;

pub use hard_process::{HardParton, HardProcess, Topology};
pub use pair::Pair;
pub use single::Single;

use rand::RngExt;

use crate::qcd::Species;
use crate::random::Stream;

/// A source of hard processes.
pub trait HardSource: Send + Sync {
    /// Draws a hard process from the event's own stream.
    fn draw(&self, stream: &mut Stream) -> HardProcess;

    /// The largest start virtuality (not squared) that it can give, GeV.
    fn largest_virtuality_gev(&self) -> f64;

    /// Colour lines that stay open because the source has no recoiler.
    fn open_colour_lines(&self) -> u32;
}

/// The registry of sources.
pub fn build(settings: &SourceSettings) -> Box<dyn HardSource> {
    match settings {
        SourceSettings::Single(settings) => Box::new(Single::new(settings.clone())),
        SourceSettings::Pair(settings) => Box::new(Pair::new(settings.clone())),
    }
}

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
    /// Largest virtuality of each in GeV, at most the invariant mass; M1 + M2 stays below it by the resume rule.
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

impl Direction {
    /// A unit vector: fixed, or with uniform azimuth at rapidity 0.
    pub fn draw(&self, stream: &mut Stream) -> [f64; 3] {
        match *self {
            Direction::Along(vector) => vector,
            Direction::Transverse => {
                let (sin, cos) = libm::sincos(std::f64::consts::TAU * stream.random::<f64>());
                [cos, sin, 0.0]
            }
        }
    }
}
