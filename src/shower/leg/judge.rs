//! How trials are judged: what the medium leaves of the vacuum, and what it adds.

use super::channels::{Envelope, InducedTrial};
use super::{Branching, Leg, Tally, VACUUM, quark_pair, splitting_of, verdict};
use crate::medium::Medium;
use crate::medium::effects::{Passage, Splitting};
use crate::qcd::Species;
use crate::qcd::kernels::Splitting as Kind;
use crate::shower::counters::CUT_UNIT;
use crate::shower::evolution::{Evolution, Tools};
use crate::shower::proposal::Trial;

impl Leg {
    pub(super) fn judge_vacuum(
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
    pub(super) fn left_of_vacuum(&self, tools: Tools, medium: &Medium, trial: &Trial) -> f64 {
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
    pub(super) fn ordered_share(&self, medium: &Medium, passage: &Passage, trial: &Trial) -> f64 {
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

    pub(super) fn judge_induced(
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

    pub(super) fn induced_daughters(
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

    pub(super) fn count_cut(&self, medium: &Medium, place: usize, t_gev2: f64, tally: &mut Tally) {
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
    pub(super) fn count_regime(
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
}
