//! Daughters that stay unbranched, with the probability of their rate below their parent's angle.

use spindrift::qcd::Species;

use super::super::support::setup::{Setup, up};
use super::super::support::statistics::LARGEST_PULL;
use super::super::support::ways::{Way, ways};
use super::rate::{Rate, ordered_fraction};
use super::{CUTOFF_T_GEV2, inside, pair, primaries, spread};

/// What a set-up asks of the daughters of a primary.
#[derive(Clone, Copy, PartialEq)]
struct Rules {
    ordered: bool,
    /// a' < a z^power.
    power: i32,
    resolved_only: bool,
    /// `resolved-only` lifts the order.
    lifts: bool,
}

impl Rules {
    fn of(ordered: bool, resolved_only: bool) -> Rules {
        Rules {
            ordered,
            power: 2,
            resolved_only,
            lifts: true,
        }
    }
}

/// The probability that a daughter of a primary does not branch.
fn stays(mother: &Way, daughters: [&Way; 2], which: usize, rules: Rules) -> f64 {
    let z = f64::from(daughters[which].parton.splitting_fraction);
    let start_t = z * f64::from(mother.parton.virtuality_squared_gev2);
    if start_t <= CUTOFF_T_GEV2 {
        return 1.0;
    }
    let most = spread(mother, daughters) * z.powi(rules.power);
    let inside = inside(mother, daughters, which).filter(|_| rules.resolved_only);
    let smallest = |t: f64| {
        let forms_outside = inside
            .as_ref()
            .is_some_and(|inside| t < inside.first_t_gev2);
        let lifted = forms_outside && rules.lifts && inside.as_ref().is_some_and(|it| it.wide);
        let most = if rules.ordered && !lifted {
            most
        } else {
            f64::INFINITY
        };
        let vetoed_below = match &inside {
            Some(inside) if !forms_outside => inside.softness_gev4 / (t * t),
            _ => 0.0,
        };
        ordered_fraction(t, most).max(vetoed_below)
    };
    let rate = Rate {
        is_gluon: daughters[which].is_gluon(),
        smallest: &smallest,
        jump_t_gev2: inside.as_ref().map_or(0.0, |inside| inside.first_t_gev2),
    };
    (-rate.exponent(CUTOFF_T_GEV2, start_t)).exp()
}

/// Pulls of the number of events in which neither daughter branches, in bins of z, one list for each set of rules.
fn pulls(setup: &Setup, events: i64, rules: &[Rules]) -> Vec<[f64; 4]> {
    let mut counts = [0.0; 4];
    let mut sums = vec![[[0.0; 2]; 4]; rules.len()];
    setup.events(0..events, |_, rows| {
        let all = ways(rows);
        let Some(daughters) = pair(&all, &all[0]) else {
            return;
        };
        let z = f64::from(daughters[0].parton.splitting_fraction);
        let bin = [0.2, 0.5, 0.8].iter().filter(|edge| z > **edge).count();
        counts[bin] += f64::from(daughters.iter().all(|daughter| daughter.is_final()));
        for (rules, sums) in rules.iter().zip(&mut sums) {
            let p = [0, 1].map(|which| stays(&all[0], daughters, which, *rules));
            let p = p[0] * p[1];
            sums[bin][0] += p;
            sums[bin][1] += p * (1.0 - p);
        }
    });
    let pull = |sums: &[[f64; 2]; 4]| {
        std::array::from_fn(|bin| (counts[bin] - sums[bin][0]) / sums[bin][1].sqrt())
    };
    sums.iter().map(pull).collect()
}

#[test]
fn daughters_stay_unbranched_with_the_probability_of_their_rate() {
    for (parton, seed) in [(up(), 21), (Species::GLUON, 22)] {
        for (place, (ordered, resolved_only)) in
            [(false, false), (false, true), (true, false), (true, true)]
                .into_iter()
                .enumerate()
        {
            let setup = primaries(parton, [100.0, 20.0], ordered, resolved_only)
                .with_seed(seed + 10 * place as u64);
            let right = Rules::of(ordered, resolved_only);
            // Wrong in one thing each.
            let mut rules = vec![right];
            rules.extend(ordered.then_some(Rules { power: 1, ..right }));
            let not = |rules: Rules| Rules {
                ordered: !rules.ordered,
                ..rules
            };
            rules.push(not(right));
            rules.push(Rules {
                resolved_only: !resolved_only,
                ..right
            });
            let found = pulls(&setup, 40_000, &rules);
            println!(
                "{} ordered {ordered}, resolved only {resolved_only}:",
                parton.name()
            );
            for pulls in &found {
                println!("  pulls {pulls:.2?}");
            }
            let sees = |pulls: &[f64; 4]| pulls.iter().any(|pull| pull.abs() > LARGEST_PULL);
            assert!(!sees(&found[0]));
            assert!(found[1..].iter().all(sees));
        }
    }
}

/// The share that the lifted order leaves; without lifting it is another. 4 bins, 8 x 10^4 events.
#[test]
fn lifted_daughters_stay_unbranched_with_the_probability_of_their_rate() {
    let right = Rules::of(true, true);
    let bound = Rules {
        lifts: false,
        ..right
    };
    let setup = primaries(Species::GLUON, [200.0, 15.0], true, true).with_seed(71);
    let found = pulls(&setup, 80_000, &[right, bound]);
    println!("pulls {:.2?}, without lifting {:.2?}", found[0], found[1]);
    assert!(found[0].iter().all(|pull| pull.abs() < LARGEST_PULL));
    assert!(found[1].iter().any(|pull| pull.abs() > LARGEST_PULL));
}
