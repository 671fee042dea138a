//! Proves: where a medium's density changes sign the event weight carries it exactly.
//!
//! `soft-gradient` makes 1 + R negative at small phases. A vacuum trial with f < 0 under an envelope g multiplies the
//! size of the weight by 2|f|/g + 1 whether it is accepted (then the sign turns) or not, so
//! <w^2> = exp(4 int |f| (1 + |f|/g)) over the negative region. It is finite whenever |f|/g is bounded; it is small
//! where the negative region is small and |f|/g is of order 1. Hence set-ups with 1 + R > -5 and envelopes widened
//! fourfold (|f|/g < 1.3): <w^2> is 1.0 to 1.6 here. The one case of medium.json below -5 (L = 5 fm, -12) is left out:
//! weights of 19 and more a trial would make the errors of the mean themselves uncertain.
//!
//! Hypothesis: <w> = 1; the weighted share of unbranched primaries and the weighted cumulative distributions in t
//! and z are those of medium.json. N = 6 x 10^5 primaries a set-up, 6 set-ups; 4 x 10^5 whole events; 3 x 10^5 pairs.
//! Statistic: pulls of means with their sample variance at 10^-6 (4.9); for distributions 20 points at 10^-6/20 each
//! (5.5). Checks: 26 for primaries, 3 for whole events, 2 for pairs.
//! Smallest visible bias: 0.01 to 0.5 % of <w> of a primary, 0.3 % of <w> of an event, 2 % of <w> of a pair.

use spindrift::medium::MediumSettings;
use spindrift::medium::effects::collinear_expansion::PhaseSettings;
use spindrift::medium::field::Ray;
use spindrift::qcd::Species;
use spindrift::random::Key;
use spindrift::shower::ShowerSettings;
use spindrift::shower::counters::ShowerCounters;
use spindrift::shower::evolution::Evolution;
use spindrift::shower::evolution::Tools;
use spindrift::shower::kinematics::relative_transverse_gev2;
use spindrift::shower::leg::{AngularOrder, Branching, Entrance, Leg, Tally};
use spindrift::shower::ordering::{Constraint, settle};

use super::support::first_branching::weighted_pulls;
use super::support::reference::{self, number};
use super::support::setup::{ALPHA_S, Setup, brick, fixed, up};
use super::support::statistics::{LARGEST_PULL, Mean, pull_between};

const EVENTS: u64 = 600_000;
const ENVELOPE_FACTOR: f64 = 4.0;
/// 1 + R may be this negative.
const LOWEST_DENSITY: f64 = -5.0;

/// Pulls of <w>, of the unbranched share, and the largest ones of t and of z of each kind; weights as `weigh` says.
fn pulls(case: &serde_json::Value, seed: u64, weigh: impl Fn(f64) -> f64) -> Vec<f64> {
    let mut setup = reference::setup(case).with_seed(seed);
    setup.shower.envelope_factor = ENVELOPE_FACTOR;
    let found = weighted_pulls(case, &setup, EVENTS, weigh);
    println!("{}: {}", reference::name(case), found.weights);
    found.pulls
}

fn cases() -> Vec<serde_json::Value> {
    let all = reference::cases("medium").into_iter();
    let chosen = all.filter(|case| {
        case["density_changes_sign"] == true
            && number(case, "smallest_one_plus_ratio") > LOWEST_DENSITY
    });
    let chosen: Vec<_> = chosen.collect();
    assert_eq!(chosen.len(), 6);
    chosen
}

#[test]
fn weighted_first_branchings_follow_the_table() {
    for (place, case) in cases().iter().enumerate() {
        let pulls = pulls(case, 800 + place as u64, |weight| weight);
        println!("  pulls {pulls:.2?}");
        assert!(
            pulls.iter().all(|pull| pull.abs() < LARGEST_PULL),
            "{}",
            reference::name(case)
        );
    }
}

#[test]
fn without_their_signs_or_sizes_the_weights_fail() {
    let case = &cases()[0];
    let worst = |weigh: fn(f64) -> f64| {
        pulls(case, 820, weigh)
            .into_iter()
            .map(f64::abs)
            .fold(0.0, f64::max)
    };
    assert!(worst(|_| 1.0) > LARGEST_PULL);
    assert!(worst(f64::abs) > LARGEST_PULL);
}

/// Whole events, with the joint constraint and its discarded branchings: <w> = 1, and the weighted number of partons
/// does not depend on the envelope although the weights do.
#[test]
fn whole_events_have_the_mean_weight_one() {
    const EVENTS: i64 = 400_000;
    let brick = brick(2.0, 0.5, PhaseSettings::SoftGradient);
    let setup = Setup::single(up(), 100.0, 10.0)
        .with_coupling(fixed(ALPHA_S))
        .with_medium(brick);
    let sample = |envelope_factor, seed| {
        let mut setup = setup.clone().with_seed(seed);
        setup.shower.envelope_factor = envelope_factor;
        setup.full_history = false;
        let (mut weight, mut number) = (Mean::default(), Mean::default());
        setup.events(0..EVENTS, |event, rows| {
            weight.add(event.weight);
            number.add(event.weight * (rows.len() - 1) as f64);
        });
        println!(
            "envelope {envelope_factor}: <w> - 1 = {:+.1e} +- {:.1e}, <w^2> = {:.3}, <w n> = {:.4} +- {:.4}",
            weight.value() - 1.0,
            weight.error(),
            weight.variance() + 1.0,
            number.value(),
            number.error()
        );
        [weight, number]
    };
    let (narrow, wide) = (sample(1.5, 31), sample(6.0, 32));
    for [weight, _] in [narrow, wide] {
        assert!(weight.variance() > 0.01);
        assert!(weight.pull(1.0).abs() < LARGEST_PULL);
    }
    assert!(pull_between(&narrow[1], &wide[1]).abs() < LARGEST_PULL);
}

/// Two daughters of a branching: what they are evolved with.
struct Pair {
    evolution: Evolution,
    settings: ShowerSettings,
    t: f64,
    z: f64,
    energies_gev: [f64; 2],
    seed: u64,
}

fn pair(alpha_s: f64, envelope_factor: f64, medium: Option<MediumSettings>) -> Pair {
    // Energetic enough for the density to be negative up to the virtualities that the constraint discards.
    let (t, z, energy_gev) = (200.0_f64, 0.4, 500.0);
    let mut setup = Setup::single(up(), energy_gev, t.sqrt()).with_coupling(fixed(alpha_s));
    setup.shower.envelope_factor = envelope_factor;
    setup.medium = medium;
    Pair {
        evolution: setup.evolution(),
        settings: setup.shower,
        t,
        z,
        energies_gev: [z * energy_gev, (1.0 - z) * energy_gev],
        seed: 41,
    }
}

impl Pair {
    fn tools(&self) -> Tools<'_> {
        Tools {
            field: None,
            evolution: &self.evolution,
            settings: &self.settings,
        }
    }

    fn largest_t(&self) -> [f64; 2] {
        [self.z * self.t, (1.0 - self.z) * self.t]
    }

    fn legs(&self, id: u64, tally: &mut Tally) -> [Leg; 2] {
        let mut legs = [Leg::idle(), Leg::idle()];
        let species = [up(), Species::GLUON];
        for (place, leg) in legs.iter_mut().enumerate() {
            let key = Key::event(self.seed, id).daughter(place as u64);
            let largest_t = self.largest_t()[place];
            leg.start(
                &self.evolution,
                species[place],
                key,
                largest_t,
                AngularOrder::NONE,
            );
            let ray = Ray {
                birth_fm: [0.0; 4],
                direction: [1.0, 0.0, 0.0],
            };
            let entrance = Entrance {
                key,
                largest_t_gev2: largest_t,
                energy_gev: self.energies_gev[place],
                ray,
            };
            leg.enter_medium(self.tools(), &entrance, tally);
        }
        legs
    }

    /// The engine's rule.
    fn settled(&self, id: u64) -> ([Option<Branching>; 2], f64) {
        let mut tally = tally();
        let mut legs = self.legs(id, &mut tally);
        let constraint = Constraint::Daughters {
            t: self.t,
            z: self.z,
        };
        let largest = self.largest_t();
        let branchings = settle(self.tools(), &mut legs, largest, constraint, &mut tally);
        (branchings, tally.weight)
    }

    /// The same written out, with the weight of all trials and the weight that forgets discarded branchings; and
    /// whether any was discarded.
    fn by_hand(&self, id: u64) -> ([Option<Branching>; 2], f64, f64, bool) {
        let mut tallies = [tally(), tally()];
        let mut legs = self.legs(id, &mut tallies[0]);
        let mut branchings = [0, 1].map(|i| legs[i].evolve(self.tools(), &mut tallies[i]));
        let mut remembered = [tallies[0].weight, tallies[1].weight];
        let mut kept = remembered[0] * remembered[1];
        let mut resumed = false;
        loop {
            let t = branchings.map(|branching| branching.map_or(0.0, |branching| branching.t));
            if relative_transverse_gev2(self.t, self.z, t) >= 0.0 {
                return (branchings, kept, remembered[0] * remembered[1], resumed);
            }
            resumed = true;
            let share = [0, 1].map(|i| t[i] / self.largest_t()[i]);
            let i = (share[1] >= share[0]) as usize;
            tallies[i].weight = 1.0;
            branchings[i] = legs[i].evolve(self.tools(), &mut tallies[i]);
            kept *= tallies[i].weight;
            remembered[i] = tallies[i].weight;
        }
    }
}

fn tally() -> Tally {
    Tally {
        trials_left: u32::MAX,
        weight: 1.0,
        counters: ShowerCounters::new(1),
    }
}

/// A pair under the joint constraint: the rule written out here gives the engine's pairs and weights, of mean 1;
/// dropping the factors of discarded branchings, the one difference, does not. In vacuum under envelopes that are
/// too low, and in a medium whose density changes sign.
#[test]
fn the_weights_of_discarded_branchings_belong_to_the_event() {
    const PAIRS: u64 = 300_000;
    let soft_gradient = brick(2.0, 0.5, PhaseSettings::SoftGradient);
    for (name, pair) in [
        ("vacuum, low envelope", pair(0.3, 0.88, None)),
        ("soft-gradient", pair(0.3, 4.0, Some(soft_gradient))),
    ] {
        let (mut all, mut forgetful) = (Mean::default(), Mean::default());
        let (mut discards, mut of_discards) = (0, Mean::default());
        for id in 0..PAIRS {
            let (branchings, weight) = pair.settled(id);
            let (again, kept, remembered, resumed) = pair.by_hand(id);
            assert_eq!(branchings, again);
            assert!((kept - weight).abs() <= 1e-12 * weight.abs());
            all.add(weight);
            forgetful.add(remembered);
            if resumed {
                discards += 1;
                of_discards.add(weight);
            }
        }
        println!(
            "{name}: <w> - 1 = {:+.1e} +- {:.1e} (pull {:.2}); forgetful {:.4} (pull {:.0}); {:.3} of the pairs \
             resumed, <w> of those {:.4}",
            all.value() - 1.0,
            all.error(),
            all.pull(1.0),
            forgetful.value(),
            forgetful.pull(1.0),
            discards as f64 / PAIRS as f64,
            of_discards.value(),
        );
        assert!(all.pull(1.0).abs() < LARGEST_PULL);
        assert!(forgetful.pull(1.0).abs() > LARGEST_PULL);
    }
}
