//! Legs that must follow the rate below an angle.

use spindrift::qcd::Species;
use spindrift::random::Key;
use spindrift::shower::counters::ShowerCounters;
use spindrift::shower::evolution::Tools;
use spindrift::shower::leg::{AngularOrder, Leg, Tally};

use super::super::support::rate::{Rate, fraction_of, kernels_below, nothing};
use super::super::support::setup::{ALPHA_S, Setup, fixed, up};
use super::super::support::statistics::{
    LARGEST_DISTANCE, SIGNIFICANCE, binomial_p_value, distance,
};
use super::CUTOFF_T_GEV2;

/// Kinematic range, and the order in angle below a' = `most`.
pub fn ordered_fraction(t: f64, most: f64) -> f64 {
    fraction_of((0.25 * CUTOFF_T_GEV2 / t).max(t / most))
}

#[test]
fn legs_below_an_angle_follow_the_rate() {
    const LEGS: u64 = 300_000;
    const START_T_GEV2: f64 = 60.0;
    const MOST_GEV2: f64 = 120.0;
    for (parton, seed) in [(up(), 7), (Species::GLUON, 8)] {
        let setup = Setup::single(parton, 100.0, START_T_GEV2.sqrt()).with_coupling(fixed(ALPHA_S));
        let evolution = setup.evolution();
        let tools = Tools {
            field: None,
            evolution: &evolution,
            settings: &setup.shower,
        };
        let mut tally = Tally {
            weight: 1.0,
            counters: ShowerCounters::new(0),
            trials_left: u32::MAX,
        };
        let order = AngularOrder {
            most_gev2: MOST_GEV2,
            birth_angle2: f64::INFINITY,
        };
        let smallest = |t| ordered_fraction(t, MOST_GEV2);
        let rate = Rate {
            is_gluon: parton.is_gluon(),
            smallest: &smallest,
            jump_t_gev2: 0.0,
            added: &nothing,
        };
        // Nothing is left of the range above a quarter of the largest a.
        let end = START_T_GEV2.min(0.25 * MOST_GEV2);
        let (mut unbranched, mut in_t, mut in_z) = (0, Vec::new(), Vec::new());
        let whole = (-rate.exponent(CUTOFF_T_GEV2, end)).exp();
        let table: Vec<f64> = (0..=400)
            .map(|step| CUTOFF_T_GEV2 * (end / CUTOFF_T_GEV2).powf(f64::from(step) / 400.0))
            .collect();
        let survival: Vec<f64> = table
            .iter()
            .map(|t| (-rate.exponent(*t, end)).exp())
            .collect();
        let mut leg = Leg::idle();
        for id in 0..LEGS {
            let key = Key::event(seed, id);
            leg.start(&evolution, parton, key, START_T_GEV2, order);
            let Some(branching) = leg.evolve(tools, &mut tally) else {
                unbranched += 1;
                continue;
            };
            let (t, z) = (branching.t, branching.z);
            assert!(t < MOST_GEV2 * z * (1.0 - z));
            let place = (t / CUTOFF_T_GEV2).ln() / (end / CUTOFF_T_GEV2).ln() * 400.0;
            let left = place as usize;
            let share = place - left as f64;
            let survives = survival[left] + share * (survival[left + 1] - survival[left]);
            in_t.push((survives - whole) / (1.0 - whole));
            let low = smallest(t);
            let below = |z| kernels_below(parton.is_gluon(), z, t);
            in_z.push((below(z) - below(low)) / (below(1.0 - low) - below(low)));
        }
        let tail = binomial_p_value(unbranched, LEGS, whole);
        let found = [distance(&mut in_t, |u| u), distance(&mut in_z, |u| u)];
        println!(
            "{}: {unbranched} unbranched against {:.0}, tail {tail:.3}, distances {found:.2?}",
            parton.name(),
            whole * LEGS as f64
        );
        assert!(tail > SIGNIFICANCE);
        assert!(found.iter().all(|value| *value < LARGEST_DISTANCE));
        // An angle that is 5 % wider.
        let wider = |t| ordered_fraction(t, 1.05 * MOST_GEV2);
        let wider = Rate {
            smallest: &wider,
            ..rate
        };
        let biased = (-wider.exponent(CUTOFF_T_GEV2, 1.05 * end)).exp();
        assert!(binomial_p_value(unbranched, LEGS, biased) < SIGNIFICANCE);
    }
}
