//! Effects of the medium on branching rates: one file a published model.
//!
//! An effect states the relative change R = D/f_vac of the vacuum density at (t, z) for the splittings q -> q g and
//! g -> g g. The positive part of D is a channel of its own; the negative part thins the vacuum channel.

pub mod collinear_expansion;
pub mod multiple_soft;
pub mod scaled_plane;
pub mod scaled_table;
pub mod single_hard;

use crate::medium::path::Path;
use crate::qcd::Species;
use crate::random::Stream;

/// What an effect sees of a parton on its way: all path integrals are done.
#[derive(Clone, Copy, Debug)]
pub struct Passage<'a> {
    /// The parton.
    pub species: Species,
    /// Its lab energy in GeV.
    pub energy_gev: f64,
    /// The transport coefficient of a gluon along its path.
    pub path: &'a Path,
}

/// coefficient * t^power, t in GeV^2.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct PowerLaw {
    /// Value at t = 1 GeV^2.
    pub coefficient: f64,
    /// Exponent, -1 to 1.
    pub power: i32,
}

/// A bound on max(R, 0) z(1-z) as a function of t: the least or the greatest of two power laws.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum RateBound {
    /// The smaller of the two; the first has the smaller exponent.
    LeastOf(PowerLaw, PowerLaw),
    /// The larger of the two; the first has the smaller exponent.
    GreatestOf(PowerLaw, PowerLaw),
}

/// A change of the branching rates by the medium.
pub trait RateEffect: Send + Sync {
    /// Its name, unique in a run: the key of its random streams and its channel's name in the event file.
    fn name(&self) -> &str;

    /// A bound on its positive part for all t and z of a parton on this passage.
    fn bound(&self, passage: &Passage) -> RateBound;

    /// R(t, z) = D/f_vac: change of the density of a splitting at t (GeV^2) and z over the vacuum's.
    fn relative_change(&self, passage: &Passage, t_gev2: f64, z: f64) -> f64;

    /// Whether R can be negative, so that vacuum trials must be thinned.
    fn thins_the_vacuum(&self) -> bool;

    /// Where along the path (fm from birth) an induced branching at t happens, drawn from the path integrand.
    fn vertex_fm(&self, passage: &Passage, t_gev2: f64, stream: &mut Stream) -> f64;
}
