//! The emission channels of the medium: what each draws its trials from, and the trial that it has pending.

use rand::RngExt;

use std::f64::consts::TAU;

use super::{Entrance, Leg, Tally};
use crate::medium::Medium;
use crate::medium::effects::{Emission, EmissionLimits, RateBound};
use crate::qcd::kernels::Splitting as Kind;
use crate::random::Stream;
use crate::shower::evolution::Tools;
use crate::shower::proposal::Trial;
use crate::shower::proposal::induced::{Emitter, InducedEnvelope, Proposed, draw_budget};
use crate::shower::proposal::staircase::Height;

/// What an emission channel of the medium draws its trials from.
pub(super) enum Envelope {
    /// Power laws in t.
    Induced(InducedEnvelope),
    /// So many times the vacuum's.
    Vacuum { height: Height, times: f64 },
    /// The effect drew all trials beforehand: the next place in the leg's list.
    List { next: usize },
}

pub(super) struct Channel {
    /// Place among the effects on rates.
    pub(super) rate: usize,
    pub(super) stream: Stream,
    pub(super) envelope: Envelope,
    pub(super) pending: Option<Pending>,
    /// The pending trial became a branching: the next one is due should the evolution resume.
    pub(super) due: bool,
}

/// What a channel offers next.
#[derive(Clone, Copy)]
pub(super) enum Pending {
    /// A trial at this t, whose rest is not drawn before its turn.
    At(f64),
    Drawn(InducedTrial),
}

impl Pending {
    #[inline]
    pub(super) fn t_gev2(&self) -> f64 {
        match self {
            Pending::At(t_gev2) => *t_gev2,
            Pending::Drawn(drawn) => drawn.trial.t,
        }
    }
}

#[derive(Clone, Copy)]
pub(super) struct InducedTrial {
    pub(super) trial: Trial,
    /// The vacuum density over the envelope's.
    pub(super) density_ratio: f64,
    pub(super) place_fm: f64,
    pub(super) emits_first: bool,
}

impl Leg {
    /// Opens the channels of the effects on rates, each with its first trial.
    pub(super) fn open_channels(
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
    pub(super) fn envelope(
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
    pub(super) fn list_trials(
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
    pub(super) fn propose(
        &mut self,
        tools: Tools,
        medium: &Medium,
        place: usize,
        tally: &mut Tally,
    ) {
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
    pub(super) fn draw(
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
    pub(super) fn place(
        &mut self,
        tools: Tools,
        medium: &Medium,
        place: usize,
        proposed: Option<Proposed>,
    ) {
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

    /// Makes the trials that the last branching left open.
    pub(super) fn propose_due(&mut self, tools: Tools, medium: &Medium, tally: &mut Tally) {
        if std::mem::take(&mut self.vacuum_due) {
            self.pending = self.next_vacuum(tools.evolution, tally);
        }
        for place in 0..self.induced.len() {
            if std::mem::take(&mut self.induced[place].due) {
                self.propose(tools, medium, place, tally);
            }
        }
    }
}
