//! One parton on its way down in virtuality: emission channels compete, trial by trial.
//!
//! Of all pending trials (vacuum and each effect) the one with the highest t is judged next; the others stay pending,
//! also across a resume. Each channel draws from a stream of its own, so the vacuum trials are the same with and
//! without a medium.

mod channels;
mod judge;

use rand::RngExt;

use super::accept::judge;
use super::counters::ShowerCounters;
use super::evolution::{Evolution, Tools};
use super::proposal::Trial;
use super::proposal::staircase::Height;
use crate::medium::Medium;
use crate::medium::effects::{Emission, Journey, Passage, Splitting};
use crate::medium::field::Ray;
use crate::medium::trace::{Outcome, Trace};
use crate::qcd::Species;
use crate::qcd::kernels::Splitting as Kind;
use crate::random::{Key, Purpose, Stream};
use channels::{Channel, InducedTrial, Pending};

/// The channel number of the vacuum among a leg's channels; effect i is i + 1.
const VACUUM: usize = 0;

/// A branching that the accept rule let through.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Branching {
    /// Virtuality squared, GeV^2.
    pub t: f64,
    /// Light-cone fraction of the first daughter.
    pub z: f64,
    /// The daughters.
    pub daughters: [Species; 2],
    /// 0 the vacuum, i + 1 effect i.
    pub channel: usize,
    /// Where an induced branching was proposed, fm along the path from birth.
    pub place_fm: f64,
}

/// What judging changes besides the leg: the event's weight and the counters.
#[derive(Clone, Debug)]
pub struct Tally {
    /// The shower's weight of the event.
    pub weight: f64,
    /// Counts of this worker.
    pub counters: ShowerCounters,
    /// Trials in the medium that this event may still judge; at 0 the event is given up.
    pub trials_left: u32,
}

/// An evolving parton; its memory is used again for the next one.
pub struct Leg {
    species: Species,
    vacuum: Stream,
    height: Option<Height>,
    pending: Option<Trial>,
    /// The pending vacuum trial became a branching: the next one is due should the evolution resume.
    vacuum_due: bool,
    induced: Vec<Channel>,
    /// Trials that effects drew beforehand, by their place among the effects on rates, from the highest t down.
    lists: Vec<Vec<InducedTrial>>,
    emissions: Vec<Emission>,
    in_medium: bool,
    energy_gev: f64,
    order: AngularOrder,
    trace: Trace,
}

/// What ordering in angle asks of a parton's vacuum emissions.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct AngularOrder {
    /// t/(z(1-z)) of an emission must lie below this: its parent's value times (x/x_parent)^2, GeV^2; infinite where
    /// angles are not ordered.
    pub most_gev2: f64,
    /// t/(z(1-z) E^2) of the branching that the parton was born in.
    pub birth_angle2: f64,
}

impl AngularOrder {
    /// No order.
    pub const NONE: AngularOrder = AngularOrder {
        most_gev2: f64::INFINITY,
        birth_angle2: f64::INFINITY,
    };
}

/// How a parton meets the medium.
#[derive(Clone, Copy, Debug)]
pub struct Entrance {
    /// Its key.
    pub key: Key,
    /// Where its evolution starts, GeV^2.
    pub largest_t_gev2: f64,
    /// Its lab energy, GeV.
    pub energy_gev: f64,
    /// Its path.
    pub ray: Ray,
}

impl Leg {
    /// A leg at rest; [`Leg::start`] sets it going.
    pub fn idle() -> Leg {
        Leg {
            species: Species::GLUON,
            vacuum: Key::event(0, 0).stream(Purpose::VACUUM),
            height: None,
            pending: None,
            vacuum_due: false,
            induced: Vec::new(),
            lists: Vec::new(),
            emissions: Vec::new(),
            in_medium: false,
            energy_gev: 0.0,
            order: AngularOrder::NONE,
            trace: Trace::default(),
        }
    }

    /// Starts the evolution of a parton below `largest_t_gev2`.
    #[inline]
    pub fn start(
        &mut self,
        evolution: &Evolution,
        species: Species,
        key: Key,
        largest_t_gev2: f64,
        order: AngularOrder,
    ) {
        self.species = species;
        self.in_medium = false;
        self.order = order;
        self.height = evolution.stairs[species.is_gluon() as usize].height(largest_t_gev2);
        if self.height.is_some() {
            self.vacuum = key.stream(Purpose::VACUUM);
        }
    }

    /// Lets the medium act on the parton that was just started: traces its path and opens the induced channels.
    pub fn enter_medium(&mut self, tools: Tools, entrance: &Entrance, tally: &mut Tally) {
        let Some(medium) = tools.evolution.medium.as_ref() else {
            return;
        };
        if self.height.is_none() && medium.paths().is_empty() {
            return;
        }
        if entrance.energy_gev < medium.min_energy_gev() {
            tally.counters.legs_below_min_energy += 1;
            return;
        }
        let (field, ray) = (tools.field(medium), &entrance.ray);
        let outcome = medium.trace(field, ray, entrance.energy_gev, &mut self.trace);
        let Outcome::Medium { left_hot } = outcome else {
            return;
        };
        tally.counters.legs_in_medium += 1;
        tally.counters.paths_left_hot += left_hot as u64;
        self.in_medium = true;
        self.energy_gev = entrance.energy_gev;
        if self.height.is_some() {
            self.open_channels(tools, medium, entrance, tally);
            self.vacuum_due = true;
            // Whom the medium neither offers a trial nor sees again goes on in vacuum.
            self.in_medium = medium.thins_the_vacuum()
                || !medium.paths().is_empty()
                || self.induced.iter().any(|channel| channel.pending.is_some());
        } else {
            self.induced.clear();
            self.pending = None;
            self.vacuum_due = false;
        }
    }

    /// The next branching below the present virtuality, `None` when the parton is final.
    #[inline]
    pub fn evolve(&mut self, tools: Tools, tally: &mut Tally) -> Option<Branching> {
        match &tools.evolution.medium {
            Some(medium) if self.in_medium => self.evolve_in_medium(tools, medium, tally),
            _ => self.evolve_in_vacuum(tools.evolution, tally),
        }
    }

    #[inline]
    fn evolve_in_vacuum(&mut self, evolution: &Evolution, tally: &mut Tally) -> Option<Branching> {
        loop {
            let trial = self.next_vacuum(evolution, tally)?;
            let mut ratio = evolution.rate.density(&trial) * trial.inverse_envelope;
            if trial.t >= self.order.most_gev2 * trial.z * (1.0 - trial.z) {
                ratio = 0.0;
            }
            if verdict(ratio, &trial, VACUUM, tally) {
                return Some(self.vacuum_branching(evolution, &trial));
            }
        }
    }

    fn evolve_in_medium(
        &mut self,
        tools: Tools,
        medium: &Medium,
        tally: &mut Tally,
    ) -> Option<Branching> {
        self.propose_due(tools, medium, tally);
        loop {
            let vacuum_t = self.pending.map_or(0.0, |trial| trial.t);
            let (leader, t) = self.leader(vacuum_t);
            if t <= 0.0 || tally.trials_left == 0 {
                return None;
            }
            let branching = match leader {
                None => self.judge_vacuum(tools, medium, tally),
                Some(place) => match self.induced[place].pending.take() {
                    Some(Pending::Drawn(drawn)) => {
                        self.judge_induced(tools, medium, place, drawn, tally)
                    }
                    _ => {
                        self.draw(tools, medium, place, vacuum_t, tally);
                        continue;
                    }
                },
            };
            tally.trials_left -= 1;
            if branching.is_some() {
                return branching;
            }
        }
    }

    /// The channel whose pending trial is highest: `None` for the vacuum, else its place among the induced ones.
    fn leader(&self, vacuum_t: f64) -> (Option<usize>, f64) {
        let mut best = (None, vacuum_t);
        for (place, channel) in self.induced.iter().enumerate() {
            let t_gev2 = channel.pending.map_or(0.0, |pending| pending.t_gev2());
            if t_gev2 > best.1 {
                best = (Some(place), t_gev2);
            }
        }
        best
    }

    #[inline]
    fn next_vacuum(&mut self, evolution: &Evolution, tally: &mut Tally) -> Option<Trial> {
        let height = self.height.as_mut()?;
        let stairs = &evolution.stairs[self.species.is_gluon() as usize];
        let trial = stairs.propose(
            height,
            &mut self.vacuum,
            &mut tally.counters.channels[VACUUM].trials,
        );
        if trial.is_none() {
            self.height = None;
        }
        trial
    }

    #[inline]
    fn vacuum_branching(&mut self, evolution: &Evolution, trial: &Trial) -> Branching {
        let daughters = match trial.splitting {
            Kind::QuarkToQuarkGluon | Kind::GluonToGluons => [self.species, Species::GLUON],
            Kind::GluonToQuarks => quark_pair(evolution, trial.t, &mut self.vacuum),
        };
        Branching {
            t: trial.t,
            z: trial.z,
            daughters,
            channel: VACUUM,
            place_fm: 0.0,
        }
    }

    fn passage<'a>(&'a self, tools: Tools<'a>, medium: &'a Medium) -> Passage<'a> {
        Passage {
            species: self.species,
            energy_gev: self.energy_gev,
            trace: &self.trace,
            medium,
            field: tools.field(medium),
        }
    }

    /// Where an induced branching of this leg happens, fm along its path from birth; `None` for a vacuum branching, and
    /// where the effect leaves it to the lifetime.
    pub fn induced_vertex_fm(&self, tools: Tools, branching: &Branching, key: Key) -> Option<f64> {
        let medium = tools.evolution.medium.as_ref()?;
        let place = branching.channel.checked_sub(1)?;
        let rate = medium.rates().iter().find(|rate| rate.place == place)?;
        let splitting = Splitting {
            t_gev2: branching.t,
            z: branching.z,
            place_fm: branching.place_fm,
            emits_first: false,
        };
        rate.effect.vertex_fm(
            &self.passage(tools, medium),
            &splitting,
            &mut key.stream(Purpose::INDUCED_VERTEX),
        )
    }

    /// The way of the settled parton through the medium, `length_fm` from birth; `None` where it met none.
    pub fn journey(&self, medium: &Medium, length_fm: f64, is_final: bool) -> Option<Journey<'_>> {
        self.in_medium.then(|| Journey {
            species: self.species,
            path: &self.trace.path,
            loss: &self.trace.loss,
            spread: &self.trace.spread,
            length_fm,
            is_final,
            min_energy_gev: medium.min_energy_gev(),
        })
    }
}

fn splitting_of(trial: &Trial, place_fm: f64) -> Splitting {
    Splitting {
        t_gev2: trial.t,
        z: trial.z,
        place_fm,
        emits_first: false,
    }
}

fn quark_pair(evolution: &Evolution, t_gev2: f64, stream: &mut Stream) -> [Species; 2] {
    let open = evolution.rate.flavours.open(t_gev2);
    let quark = Species::quark(1 + (stream.random::<f64>() * f64::from(open)) as u8);
    [quark, quark.conjugate()]
}

/// Judges and counts a trial.
#[inline]
fn verdict(ratio: f64, trial: &Trial, channel: usize, tally: &mut Tally) -> bool {
    let verdict = judge(ratio, trial.uniform, &mut tally.weight);
    let counters = &mut tally.counters.channels[channel];
    counters.accepted += verdict.accepted as u64;
    counters.overshoots += verdict.overshoot as u64;
    verdict.accepted
}
