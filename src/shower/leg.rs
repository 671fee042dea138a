//! One parton on its way down in virtuality: emission channels compete, trial by trial.
//!
//! Of all pending trials (vacuum and each effect) the one with the highest t is judged next; the others stay pending,
//! also across a resume. Each channel draws from a stream of its own, so the vacuum trials are the same with and
//! without a medium.

use rand::RngExt;

use std::f64::consts::TAU;

use super::accept::judge;
use super::counters::{CUT_UNIT, ShowerCounters};
use super::proposal::Trial;
use super::proposal::induced::{Emitter, InducedEnvelope, Proposed, draw_budget};
use super::proposal::staircase::{Height, Staircase, VacuumRate};
use super::tree::Tools;
use crate::medium::Medium;
use crate::medium::effects::{Emission, EmissionLimits, Journey, Passage, RateBound, Splitting};
use crate::medium::field::Ray;
use crate::medium::trace::{Outcome, Trace};
use crate::qcd::Species;
use crate::qcd::kernels::Splitting as Kind;
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
    /// Whether g -> q qbar is on.
    pub makes_pairs: bool,
    /// Streams of the channels of the effects on rates.
    pub effect_purposes: Vec<Purpose>,
    /// Streams of the effects on paths.
    pub path_purposes: Vec<Purpose>,
    /// See [`super::ShowerSettings::envelope_factor`].
    pub envelope_factor: f64,
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

/// What an emission channel of the medium draws its trials from.
enum Envelope {
    /// Power laws in t.
    Induced(InducedEnvelope),
    /// So many times the vacuum's.
    Vacuum { height: Height, times: f64 },
    /// The effect drew all trials beforehand: the next place in the leg's list.
    List { next: usize },
}

struct Channel {
    /// Place among the effects on rates.
    rate: usize,
    stream: Stream,
    envelope: Envelope,
    pending: Option<Pending>,
    /// The pending trial became a branching: the next one is due should the evolution resume.
    due: bool,
}

/// What a channel offers next.
#[derive(Clone, Copy)]
enum Pending {
    /// A trial at this t, whose rest is not drawn before its turn.
    At(f64),
    Drawn(InducedTrial),
}

impl Pending {
    #[inline]
    fn t_gev2(&self) -> f64 {
        match self {
            Pending::At(t_gev2) => *t_gev2,
            Pending::Drawn(drawn) => drawn.trial.t,
        }
    }
}

#[derive(Clone, Copy)]
struct InducedTrial {
    trial: Trial,
    /// The vacuum density over the envelope's.
    density_ratio: f64,
    place_fm: f64,
    emits_first: bool,
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

    /// Opens the channels of the effects on rates, each with its first trial.
    fn open_channels(
        &mut self,
        tools: Tools,
        medium: &Medium,
        entrance: &Entrance,
        tally: &mut Tally,
    ) {
        self.induced.clear();
        if !tools.evolution.emits[self.species.is_gluon() as usize] {
            return;
        }
        for rate in 0..medium.rates().len() {
            if let Some(envelope) = self.envelope(tools, medium, rate, entrance) {
                let mut stream = entrance.key.stream(tools.evolution.effect_purposes[rate]);
                if let Envelope::List { .. } = envelope {
                    self.list_trials(tools, medium, rate, entrance, &mut stream);
                }
                self.induced.push(Channel {
                    rate,
                    stream,
                    envelope,
                    pending: None,
                    due: false,
                });
                self.propose(tools, medium, self.induced.len() - 1, tally);
            }
        }
    }

    #[inline(always)]
    fn envelope(
        &self,
        tools: Tools,
        medium: &Medium,
        rate: usize,
        entrance: &Entrance,
    ) -> Option<Envelope> {
        let evolution = tools.evolution;
        let effect = &medium.rates()[rate].effect;
        let bound = effect.bound(&self.passage(tools, medium));
        match bound {
            RateBound::Nothing => None,
            RateBound::Emissions => Some(Envelope::List { next: 0 }),
            RateBound::TimesVacuum(times) if times <= 0.0 => None,
            RateBound::TimesVacuum(times) => Some(Envelope::Vacuum {
                height: evolution.stairs[self.species.is_gluon() as usize]
                    .height(entrance.largest_t_gev2)?,
                times: times * evolution.envelope_factor,
            }),
            RateBound::LeastOf(..) | RateBound::GreatestOf(..) => {
                let is_gluon = self.species.is_gluon();
                let makes_pairs = is_gluon && effect.makes_quark_pairs() && evolution.makes_pairs;
                let emitter = Emitter {
                    is_gluon,
                    pair_flavours: if makes_pairs {
                        evolution.rate.flavours.most()
                    } else {
                        0
                    },
                    start_t_gev2: entrance.largest_t_gev2,
                    angle_limit_energy2_gev2: medium
                        .limits_angles()
                        .then_some(self.energy_gev * self.energy_gev),
                };
                InducedEnvelope::new(&evolution.rate, emitter, bound, evolution.envelope_factor)
                    .map(Envelope::Induced)
            }
        }
    }

    /// Lets an effect draw all its trials, and puts those inside the exact range in order.
    fn list_trials(
        &mut self,
        tools: Tools,
        medium: &Medium,
        rate: usize,
        entrance: &Entrance,
        stream: &mut Stream,
    ) {
        let evolution = tools.evolution;
        let range = &evolution.rate.range;
        let largest_alpha_s = evolution.rate.largest_alpha_s;
        let smallest = range.smallest(entrance.largest_t_gev2);
        let limits = EmissionLimits {
            fractions: [smallest, 1.0 - smallest],
            least_kappa2_gev2: range.smallest_kappa2_gev2(),
            largest_t_gev2: entrance.largest_t_gev2,
            limit_to_small_angles: medium.limits_angles(),
            largest_rate: largest_alpha_s / TAU * evolution.envelope_factor,
        };
        let effect = &medium.rates()[rate].effect;
        let mut emissions = std::mem::take(&mut self.emissions);
        emissions.clear();
        effect.propose_emissions(
            &self.passage(tools, medium),
            &limits,
            stream,
            &mut emissions,
        );
        self.lists.resize_with(medium.rates().len(), Vec::new);
        let mut list = std::mem::take(&mut self.lists[rate]);
        list.clear();
        let is_gluon = self.species.is_gluon();
        for emission in &emissions {
            let emits_first = is_gluon && stream.random::<bool>();
            let Emission {
                fraction,
                kappa2_gev2,
                density,
            } = *emission;
            let z = if emits_first {
                fraction
            } else {
                1.0 - fraction
            };
            let t = kappa2_gev2 / (fraction * (1.0 - fraction));
            let uniform = stream.random();
            if t < entrance.largest_t_gev2 && t > range.end_t_gev2 && range.allows(z, kappa2_gev2) {
                // Each of the two gluons is the emitted one in half of the trials.
                let images = if is_gluon { 2.0 } else { 1.0 };
                let envelope = largest_alpha_s * evolution.envelope_factor * density / fraction;
                let trial = Trial {
                    t,
                    z,
                    splitting: if is_gluon {
                        Kind::GluonToGluons
                    } else {
                        Kind::QuarkToQuarkGluon
                    },
                    uniform,
                    inverse_envelope: images / envelope,
                };
                list.push(InducedTrial {
                    trial,
                    density_ratio: evolution.rate.density(&trial) * trial.inverse_envelope,
                    place_fm: 0.0,
                    emits_first,
                });
            }
        }
        list.sort_unstable_by(|one, other| other.trial.t.total_cmp(&one.trial.t));
        self.lists[rate] = list;
        self.emissions = emissions;
    }

    /// The next trial of an induced channel below its last one.
    fn propose(&mut self, tools: Tools, medium: &Medium, place: usize, tally: &mut Tally) {
        let evolution = tools.evolution;
        let channel = &mut self.induced[place];
        let number = medium.rates()[channel.rate].place + 1;
        let trials = &mut tally.counters.channels[number].trials;
        let stairs = &evolution.stairs[self.species.is_gluon() as usize];
        let (trial, times) = match &mut channel.envelope {
            Envelope::List { next } => {
                let listed = self.lists[channel.rate].get(*next).copied();
                *next += 1;
                *trials += 1;
                channel.pending = listed.map(Pending::Drawn);
                return;
            }
            Envelope::Induced(envelope) => {
                *trials += 1;
                let t_gev2 = envelope.descend(draw_budget(&mut channel.stream));
                channel.pending = (t_gev2 > 0.0).then_some(Pending::At(t_gev2));
                return;
            }
            Envelope::Vacuum { height, times } => {
                let trial = stairs.propose_times(*times, height, &mut channel.stream, trials);
                (trial, *times)
            }
        };
        let proposed = trial.map(|trial| Proposed {
            trial,
            density_ratio: evolution.rate.density(&trial) * trial.inverse_envelope / times,
        });
        self.place(tools, medium, place, proposed);
    }

    /// Draws the rest of a pending trial, or of the next one that may be accepted, as long as it lies above
    /// `floor_t_gev2`.
    fn draw(
        &mut self,
        tools: Tools,
        medium: &Medium,
        place: usize,
        floor_t_gev2: f64,
        tally: &mut Tally,
    ) {
        let channel = &mut self.induced[place];
        let number = medium.rates()[channel.rate].place + 1;
        let trials = &mut tally.counters.channels[number].trials;
        let Envelope::Induced(envelope) = &mut channel.envelope else {
            return;
        };
        let (rate, stream, before) = (&tools.evolution.rate, &mut channel.stream, *trials);
        let proposed = envelope.propose(rate, floor_t_gev2, stream, trials);
        let t_gev2 = envelope.t_gev2();
        tally.trials_left = tally.trials_left.saturating_sub((*trials - before) as u32);
        if proposed.is_some() {
            self.place(tools, medium, place, proposed);
        } else {
            channel.pending = (t_gev2 > 0.0).then_some(Pending::At(t_gev2));
        }
    }

    /// Draws the place of a trial, which is then pending.
    fn place(&mut self, tools: Tools, medium: &Medium, place: usize, proposed: Option<Proposed>) {
        self.induced[place].pending = proposed.map(|proposed| {
            let Proposed {
                trial,
                density_ratio,
            } = proposed;
            let mut stream = self.induced[place].stream.clone();
            let effect = &medium.rates()[self.induced[place].rate].effect;
            let place_fm =
                effect.propose_place_fm(&self.passage(tools, medium), trial.t, &mut stream);
            self.induced[place].stream = stream;
            Pending::Drawn(InducedTrial {
                trial,
                density_ratio,
                place_fm,
                emits_first: false,
            })
        });
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

    /// Makes the trials that the last branching left open.
    fn propose_due(&mut self, tools: Tools, medium: &Medium, tally: &mut Tally) {
        if std::mem::take(&mut self.vacuum_due) {
            self.pending = self.next_vacuum(tools.evolution, tally);
        }
        for place in 0..self.induced.len() {
            if std::mem::take(&mut self.induced[place].due) {
                self.propose(tools, medium, place, tally);
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

    fn judge_vacuum(
        &mut self,
        tools: Tools,
        medium: &Medium,
        tally: &mut Tally,
    ) -> Option<Branching> {
        let evolution = tools.evolution;
        let trial = self.pending.take().expect("the leader has a pending trial");
        let ratio = evolution.rate.density(&trial)
            * trial.inverse_envelope
            * self.left_of_vacuum(tools, medium, &trial);
        let branching =
            verdict(ratio, &trial, VACUUM, tally).then(|| self.vacuum_branching(evolution, &trial));
        if branching.is_some() {
            if medium.thins_the_vacuum() {
                self.count_regime(tools, medium, None, &splitting_of(&trial, 0.0), tally);
            }
            self.vacuum_due = true;
        } else {
            self.pending = self.next_vacuum(evolution, tally);
        }
        branching
    }

    /// What the medium and the order in angle leave of the vacuum density: factors times, and negative changes added.
    fn left_of_vacuum(&self, tools: Tools, medium: &Medium, trial: &Trial) -> f64 {
        if !medium.thins_the_vacuum() {
            return f64::from(trial.t < self.order.most_gev2 * trial.z * (1.0 - trial.z));
        }
        let passage = self.passage(tools, medium);
        let splitting = splitting_of(trial, 0.0);
        let mut left = self.ordered_share(medium, &passage, trial);
        let makes_pair = trial.splitting == Kind::GluonToQuarks;
        let at_small_angle = medium.allows_angle(trial.t, trial.z, self.energy_gev);
        let thinning = || {
            let rates = medium.rates().iter().map(|rate| &rate.effect);
            rates.filter(|effect| effect.thins_the_vacuum())
        };
        for effect in thinning() {
            left *= effect.vacuum_factor(&passage, &splitting);
        }
        for effect in thinning() {
            if at_small_angle && (!makes_pair || effect.makes_quark_pairs()) {
                left += effect.negative_change(&passage, &splitting);
            }
        }
        left
    }

    /// 0 for a vacuum emission at too wide an angle, unless an effect lifts the order; else 1.
    fn ordered_share(&self, medium: &Medium, passage: &Passage, trial: &Trial) -> f64 {
        if trial.t < self.order.most_gev2 * trial.z * (1.0 - trial.z) {
            return 1.0;
        }
        let splitting = splitting_of(trial, 0.0);
        let lifted = medium.rates().iter().any(|rate| {
            rate.effect
                .lifts_angular_order(passage, &splitting, self.order.birth_angle2)
        });
        f64::from(lifted)
    }

    fn judge_induced(
        &mut self,
        tools: Tools,
        medium: &Medium,
        place: usize,
        drawn: InducedTrial,
        tally: &mut Tally,
    ) -> Option<Branching> {
        let InducedTrial {
            trial,
            density_ratio,
            place_fm,
            emits_first,
        } = drawn;
        let rate = &medium.rates()[self.induced[place].rate];
        let number = rate.place + 1;
        let splitting = Splitting {
            emits_first,
            ..splitting_of(&trial, place_fm)
        };
        // The envelope of an induced channel keeps to small angles by itself; the vacuum's does not.
        let acts = trial.splitting != Kind::GluonToQuarks || rate.effect.makes_quark_pairs();
        let passage = self.passage(tools, medium);
        let change = if acts {
            rate.effect.relative_change(&passage, &splitting).max(0.0)
        } else {
            0.0
        };
        let evolution = tools.evolution;
        let mut ratio = density_ratio * change;
        if !medium.allows_angle(trial.t, trial.z, self.energy_gev) {
            // What would have been accepted without the limit; other envelopes keep to small angles by themselves.
            if let Envelope::Vacuum { .. } = self.induced[place].envelope {
                tally.counters.channels[number].cut_units += (ratio.min(1.0) / CUT_UNIT) as u64;
            }
            ratio = 0.0;
        }
        // What is rejected even at the bound of the transport coefficient need not be looked up.
        if !self.trace.is_exact() && (trial.uniform < ratio || ratio > 1.0) {
            ratio *= passage.share_of_bound(place_fm);
        }
        let accepted = verdict(ratio, &trial, number, tally);
        if accepted {
            self.count_cut(medium, place, trial.t, tally);
            self.count_regime(tools, medium, Some(place), &splitting, tally);
        }
        let branching = accepted.then(|| Branching {
            t: trial.t,
            z: trial.z,
            daughters: self.induced_daughters(evolution, place, &trial),
            channel: number,
            place_fm,
        });
        if accepted {
            self.induced[place].due = true;
        } else {
            self.propose(tools, medium, place, tally);
        }
        branching
    }

    fn induced_daughters(
        &mut self,
        evolution: &Evolution,
        place: usize,
        trial: &Trial,
    ) -> [Species; 2] {
        if trial.splitting == Kind::GluonToQuarks {
            quark_pair(evolution, trial.t, &mut self.induced[place].stream)
        } else {
            [self.species, Species::GLUON]
        }
    }

    fn count_cut(&self, medium: &Medium, place: usize, t_gev2: f64, tally: &mut Tally) {
        if let Envelope::Induced(envelope) = &self.induced[place].envelope
            && medium.limits_angles()
        {
            let number = medium.rates()[self.induced[place].rate].place + 1;
            let cut_away = envelope.cut_away(t_gev2);
            tally.counters.channels[number].cut_units += (cut_away / CUT_UNIT) as u64;
        }
    }

    /// Counts an accepted branching that lies outside the regime of the effect that made it, or of those that only veto
    /// vacuum emissions.
    fn count_regime(
        &self,
        tools: Tools,
        medium: &Medium,
        place: Option<usize>,
        splitting: &Splitting,
        tally: &mut Tally,
    ) {
        let passage = self.passage(tools, medium);
        match place {
            Some(place) => {
                let rate = &medium.rates()[self.induced[place].rate];
                let outside = rate.effect.is_outside_regime(&passage, splitting);
                tally.counters.channels[rate.place + 1].outside_regime += outside as u64;
            }
            None => {
                for rate in medium
                    .rates()
                    .iter()
                    .filter(|rate| rate.effect.only_vetoes())
                {
                    let outside = rate.effect.is_outside_regime(&passage, splitting);
                    let counters = &mut tally.counters.channels[rate.place + 1];
                    counters.accepted += 1;
                    counters.outside_regime += outside as u64;
                }
            }
        }
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
