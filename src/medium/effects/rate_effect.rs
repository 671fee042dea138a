//! Changes of the branching rates.
//!
//! An effect states the relative change R = D/f_vac of the vacuum density at (t, z). The positive part of D is a
//! channel of its own; the negative part, and what the effect vetoes, thin the vacuum channel:
//!
//! f_vacuum channel = f_vac (product of the factors + sum of min(R, 0)),   f_channel i = f_vac max(R_i, 0).

use super::bound::{Emission, EmissionLimits, RateBound};
use crate::medium::trace::Trace;
use crate::medium::{Medium, field::TemperatureField};
use crate::qcd::Species;
use crate::random::Stream;

/// What an effect sees of a parton on its way.
#[derive(Clone, Copy)]
pub struct Passage<'a> {
    /// The parton.
    pub species: Species,
    /// Its lab energy in GeV.
    pub energy_gev: f64,
    /// The transport coefficient of a gluon along its path: exact, or bounds of it where no effect needs more.
    pub trace: &'a Trace,
    /// The medium, to look up single points.
    pub medium: &'a Medium,
    /// Its field in this event.
    pub field: &'a dyn TemperatureField,
}

impl Passage<'_> {
    /// The gluon's transport coefficient over its bound at `l_fm` from birth: 1 where the path is exact.
    #[inline]
    pub fn share_of_bound(&self, l_fm: f64) -> f64 {
        if self.trace.is_exact() {
            return 1.0;
        }
        let bound = self.trace.path.qhat_gev2_per_fm(l_fm);
        let ray = self.trace.ray();
        self.medium
            .gluon_qhat_gev2_per_fm(self.field, ray, l_fm, self.energy_gev)
            / bound
    }
}

/// A splitting to be judged.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Splitting {
    /// Virtuality squared, GeV^2.
    pub t_gev2: f64,
    /// Light-cone fraction of the first daughter.
    pub z: f64,
    /// Where along the path it was proposed (fm from birth), by [`RateEffect::propose_place_fm`]; 0 for vacuum trials.
    pub place_fm: f64,
    /// The first daughter is the emitted gluon, not the second (for gluons, where both are).
    pub emits_first: bool,
}

/// A change of the branching rates by the medium.
pub trait RateEffect: Send + Sync {
    /// Its name, unique in a run: the key of its random streams and its channel's name in the event file.
    fn name(&self) -> &str;

    /// A bound on its positive part for all t and z of a parton on this passage.
    fn bound(&self, passage: &Passage) -> RateBound;

    /// R of a splitting of its own channel. Where the effect proposes places, the mean over places is D/f_vac.
    fn relative_change(&self, passage: &Passage, splitting: &Splitting) -> f64;

    /// Whether it needs the whole path. Else bounds of it will do: [`RateEffect::relative_change`] then answers for the
    /// bound, must be proportional to it at the splitting's place, and is multiplied by
    /// [`Passage::share_of_bound`] there.
    fn needs_whole_path(&self) -> bool {
        true
    }

    /// Whether it needs the energy loss along the path.
    fn needs_loss(&self) -> bool {
        false
    }

    /// A place along the path for a trial at t, fm from birth.
    fn propose_place_fm(&self, _passage: &Passage, _t_gev2: f64, _stream: &mut Stream) -> f64 {
        0.0
    }

    /// Draws all trials of a parton's evolution, in any order, where the bound is [`RateBound::Emissions`]: a Poisson
    /// process in (ln omega, ln kappa^2) that covers at least the limits, with any of the two gluons of g -> g g as
    /// the emitted one.
    fn propose_emissions(
        &self,
        _passage: &Passage,
        _limits: &EmissionLimits,
        _stream: &mut Stream,
        _emissions: &mut Vec<Emission>,
    ) {
    }

    /// Where along the path an induced branching happens, fm from birth; `None` where its lifetime is that of a vacuum
    /// branching.
    fn vertex_fm(
        &self,
        _passage: &Passage,
        splitting: &Splitting,
        _stream: &mut Stream,
    ) -> Option<f64> {
        Some(splitting.place_fm)
    }

    /// Whether it only vetoes vacuum emissions: its regime is then asked about these.
    fn only_vetoes(&self) -> bool {
        false
    }

    /// Whether it ever thins the vacuum channel.
    fn thins_the_vacuum(&self) -> bool {
        false
    }

    /// min(R, 0) at a vacuum trial of q -> q g or g -> g g.
    fn negative_change(&self, _passage: &Passage, _splitting: &Splitting) -> f64 {
        0.0
    }

    /// What is left of the vacuum rate itself, 0 to 1.
    fn vacuum_factor(&self, _passage: &Passage, _splitting: &Splitting) -> f64 {
        1.0
    }

    /// Whether an effect that thins the vacuum channel lifts the ordering in angle from a vacuum emission of a parton that was born with an angle
    /// squared (t/(z(1-z)E^2) of its parent's branching).
    fn lifts_angular_order(
        &self,
        _passage: &Passage,
        _splitting: &Splitting,
        _birth_angle2: f64,
    ) -> bool {
        false
    }

    /// Whether it also acts on g -> q qbar.
    fn makes_quark_pairs(&self) -> bool {
        false
    }

    /// Whether a branching that it made lies outside its regime.
    fn is_outside_regime(&self, passage: &Passage, splitting: &Splitting) -> bool;
}
