//! One parton on its way down in virtuality: emission channels compete, trial by trial.
//!
//! Of all pending trials (vacuum and each effect) the one with the highest t is judged next; the others stay pending,
//! also across a resume. Each channel draws from a stream of its own, so the vacuum trials are the same with and
//! without a medium.

use rand::RngExt;

use super::accept::judge;
use super::counters::{CUT_UNIT, ShowerCounters};
use super::proposal::Trial;
use super::proposal::induced::{Emitter, InducedEnvelope};
use super::proposal::staircase::{Height, Staircase, VacuumRate};
use crate::medium::Medium;
use crate::medium::effects::Passage;
use crate::medium::field::Ray;
use crate::medium::trace::{Outcome, Trace};
use crate::qcd::Species;
use crate::qcd::kernels::Splitting;
use crate::random::{Key, Purpose, Stream};

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

/// What all legs of a shower share.
pub struct Evolution {
    /// Coupling, ranges, flavours.
    pub rate: VacuumRate,
    /// Envelopes of a quark and of a gluon.
    pub stairs: [Staircase; 2],
    /// The medium, unless its list of effects is empty.
    pub medium: Option<Medium>,
    /// Whether quarks and gluons emit gluons at all (the splittings that are on); the medium changes these alone.
    pub emits: [bool; 2],
    /// Streams of the effects' channels.
    pub effect_purposes: Vec<Purpose>,
    /// See [`super::ShowerSettings::envelope_factor`].
    pub envelope_factor: f64,
}

/// An evolving parton; its memory is used again for the next one.
pub struct Leg {
    species: Species,
    vacuum: Stream,
    height: Option<Height>,
    pending: Option<Trial>,
    induced: Vec<Channel>,
    in_medium: bool,
    energy_gev: f64,
    trace: Trace,
}

struct Channel {
    effect: usize,
    stream: Stream,
    envelope: InducedEnvelope,
    pending: Option<Trial>,
}

impl Leg {
    /// A leg at rest; [`Leg::start`] sets it going.
    pub fn idle() -> Leg {
        Leg {
            species: Species::GLUON,
            vacuum: Key::event(0, 0).stream(Purpose::VACUUM),
            height: None,
            pending: None,
            induced: Vec::new(),
            in_medium: false,
            energy_gev: 0.0,
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
    ) {
        self.species = species;
        self.in_medium = false;
        self.height = evolution.stairs[species.is_gluon() as usize].height(largest_t_gev2);
        if self.height.is_some() {
            self.vacuum = key.stream(Purpose::VACUUM);
        }
    }

    /// Lets the medium act on the parton that was just started: traces its path and opens the induced channels.
    pub fn enter_medium(
        &mut self,
        evolution: &Evolution,
        key: Key,
        largest_t_gev2: f64,
        (energy_gev, ray): (f64, Ray),
        tally: &mut Tally,
    ) {
        let Some(medium) = evolution.medium.as_ref().filter(|_| self.height.is_some()) else {
            return;
        };
        if energy_gev < medium.min_energy_gev() {
            tally.counters.legs_below_min_energy += 1;
            return;
        }
        let Outcome::Medium { left_hot } = medium.trace(&ray, &mut self.trace) else {
            return;
        };
        tally.counters.legs_in_medium += 1;
        tally.counters.paths_left_hot += left_hot as u64;
        self.in_medium = true;
        self.energy_gev = energy_gev;
        self.open_channels(evolution, medium, key, largest_t_gev2, tally);
        self.pending = self.next_vacuum(evolution, tally);
    }

    fn open_channels(
        &mut self,
        evolution: &Evolution,
        medium: &Medium,
        key: Key,
        t_gev2: f64,
        tally: &mut Tally,
    ) {
        self.induced.clear();
        if !evolution.emits[self.species.is_gluon() as usize] {
            return;
        }
        let passage = Passage {
            species: self.species,
            energy_gev: self.energy_gev,
            path: &self.trace.path,
        };
        for (effect, model) in medium.effects().iter().enumerate() {
            let bound = model.bound(&passage);
            let emitter = Emitter {
                is_gluon: self.species.is_gluon(),
                start_t_gev2: t_gev2,
                angle_limit_energy2_gev2: medium
                    .limits_angles()
                    .then_some(self.energy_gev * self.energy_gev),
            };
            let envelope =
                InducedEnvelope::new(&evolution.rate, emitter, bound, evolution.envelope_factor);
            if let Some(envelope) = envelope {
                let mut stream = key.stream(evolution.effect_purposes[effect]);
                let trials = &mut tally.counters.channels[effect + 1].trials;
                let pending = envelope.propose(t_gev2, &mut stream, trials);
                self.induced.push(Channel {
                    effect,
                    stream,
                    envelope,
                    pending,
                });
            }
        }
    }

    /// The next branching below the present virtuality, `None` when the parton is final.
    #[inline]
    pub fn evolve(&mut self, evolution: &Evolution, tally: &mut Tally) -> Option<Branching> {
        if self.in_medium {
            self.evolve_in_medium(evolution, tally)
        } else {
            self.evolve_in_vacuum(evolution, tally)
        }
    }

    #[inline]
    fn evolve_in_vacuum(&mut self, evolution: &Evolution, tally: &mut Tally) -> Option<Branching> {
        loop {
            let trial = self.next_vacuum(evolution, tally)?;
            let ratio = evolution.rate.density(&trial) * trial.inverse_envelope;
            if verdict(ratio, &trial, VACUUM, tally) {
                return Some(self.vacuum_branching(evolution, &trial));
            }
        }
    }

    fn evolve_in_medium(&mut self, evolution: &Evolution, tally: &mut Tally) -> Option<Branching> {
        loop {
            let vacuum_t = self.pending.map_or(0.0, |trial| trial.t);
            let (leader, t) = self.leader(vacuum_t);
            if t <= 0.0 || tally.trials_left == 0 {
                return None;
            }
            tally.trials_left -= 1;
            let branching = match leader {
                None => self.judge_vacuum(evolution, tally),
                Some(place) => self.judge_induced(place, evolution, tally),
            };
            if branching.is_some() {
                return branching;
            }
        }
    }

    /// The channel whose pending trial is highest: `None` for the vacuum, else its place among the induced ones.
    fn leader(&self, vacuum_t: f64) -> (Option<usize>, f64) {
        let mut best = (None, vacuum_t);
        for (place, channel) in self.induced.iter().enumerate() {
            if let Some(trial) = channel.pending.filter(|trial| trial.t > best.1) {
                best = (Some(place), trial.t);
            }
        }
        best
    }

    fn judge_vacuum(&mut self, evolution: &Evolution, tally: &mut Tally) -> Option<Branching> {
        let trial = self.pending.take().expect("the leader has a pending trial");
        let ratio = evolution.rate.density(&trial)
            * trial.inverse_envelope
            * self.thinning(evolution, &trial);
        let branching =
            verdict(ratio, &trial, VACUUM, tally).then(|| self.vacuum_branching(evolution, &trial));
        self.pending = self.next_vacuum(evolution, tally);
        branching
    }

    /// 1 + sum over effects of min(R, 0): what is left of the vacuum density.
    fn thinning(&self, evolution: &Evolution, trial: &Trial) -> f64 {
        let Some(medium) = &evolution.medium else {
            return 1.0;
        };
        let open = trial.splitting != Splitting::GluonToQuarks;
        if !open || !medium.allows_angle(trial.t, trial.z, self.energy_gev) {
            return 1.0;
        }
        let passage = self.passage();
        let negative = |change: f64| change.min(0.0);
        let thinning = medium
            .effects()
            .iter()
            .filter(|effect| effect.thins_the_vacuum());
        1.0 + thinning
            .map(|effect| negative(effect.relative_change(&passage, trial.t, trial.z)))
            .sum::<f64>()
    }

    fn judge_induced(
        &mut self,
        place: usize,
        evolution: &Evolution,
        tally: &mut Tally,
    ) -> Option<Branching> {
        let medium = evolution
            .medium
            .as_ref()
            .expect("an induced channel has a medium");
        let trial = self.induced[place]
            .pending
            .take()
            .expect("the leader has a pending trial");
        let number = self.induced[place].effect + 1;
        let effect = &medium.effects()[number - 1];
        let change = effect
            .relative_change(&self.passage(), trial.t, trial.z)
            .max(0.0);
        let ratio = evolution.rate.density(&trial) * trial.inverse_envelope * change;
        let accepted = verdict(ratio, &trial, number, tally);
        let channel = &mut self.induced[place];
        if accepted && medium.limits_angles() {
            let cut_away = channel.envelope.cut_away(trial.t);
            tally.counters.channels[number].cut_units += (cut_away / CUT_UNIT) as u64;
        }
        let trials = &mut tally.counters.channels[number].trials;
        channel.pending = channel
            .envelope
            .propose(trial.t, &mut channel.stream, trials);
        let daughters = [self.species, Species::GLUON];
        accepted.then_some(Branching {
            t: trial.t,
            z: trial.z,
            daughters,
            channel: number,
        })
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
            Splitting::QuarkToQuarkGluon | Splitting::GluonToGluons => {
                [self.species, Species::GLUON]
            }
            Splitting::GluonToQuarks => {
                let open = evolution.rate.flavours.open(trial.t);
                let quark =
                    Species::quark(1 + (self.vacuum.random::<f64>() * f64::from(open)) as u8);
                [quark, quark.conjugate()]
            }
        };
        Branching {
            t: trial.t,
            z: trial.z,
            daughters,
            channel: VACUUM,
        }
    }

    fn passage(&self) -> Passage<'_> {
        Passage {
            species: self.species,
            energy_gev: self.energy_gev,
            path: &self.trace.path,
        }
    }

    /// Where an induced branching of this leg happens, fm along its path from birth.
    pub fn induced_vertex_fm(&self, evolution: &Evolution, branching: &Branching, key: Key) -> f64 {
        let medium = evolution
            .medium
            .as_ref()
            .expect("an induced branching has a medium");
        let effect = &medium.effects()[branching.channel - 1];
        effect.vertex_fm(
            &self.passage(),
            branching.t,
            &mut key.stream(Purpose::INDUCED_VERTEX),
        )
    }
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
