//! The rate below an angle, integrated, and legs that must follow it.

use spindrift::qcd::{C_A, C_F, Species, T_R};
use spindrift::random::Key;
use spindrift::shower::counters::ShowerCounters;
use spindrift::shower::evolution::Tools;
use spindrift::shower::leg::{AngularOrder, Leg, Tally};

use super::super::support::setup::{ALPHA_S, Setup, fixed, up};
use super::super::support::statistics::{
    LARGEST_DISTANCE, SIGNIFICANCE, binomial_p_value, distance,
};
use super::CUTOFF_T_GEV2;

/// The rate of one parton with fixed coupling, integrated over z by closed forms.
pub struct Rate<'a> {
    pub is_gluon: bool,
    /// The smallest fraction of a daughter at t; 1/2 and more where there is none.
    pub smallest: &'a dyn Fn(f64) -> f64,
    /// Where `smallest` jumps.
    pub jump_t_gev2: f64,
}

/// Antiderivative of the kernels' sum.
fn kernels_below(is_gluon: bool, z: f64, t: f64) -> f64 {
    let rest = 1.0 - z;
    if !is_gluon {
        // C_F (1 + z^2)/(1 - z).
        return C_F * (-2.0 * rest.ln() - z - 0.5 * z * z);
    }
    // C_A [1/z + 1/(1-z) - 2 + z(1-z)], the half for identical gluons in it, and n_f T_R [z^2 + (1-z)^2].
    let open = 3.0 + f64::from(t > 9.0) + f64::from(t > 4.0 * 4.75 * 4.75);
    C_A * ((z / rest).ln() - 2.0 * z + z * z / 2.0 - z * z * z / 3.0)
        + open * T_R * (z - z * z + 2.0 * z * z * z / 3.0)
}

impl Rate<'_> {
    /// Per unit of ln t.
    fn at(&self, t: f64) -> f64 {
        let low = (self.smallest)(t);
        if low >= 0.5 {
            return 0.0;
        }
        let below = |z| kernels_below(self.is_gluon, z, t);
        ALPHA_S / std::f64::consts::TAU * (below(1.0 - low) - below(low))
    }

    /// The exponent of no branching between two values of t.
    pub fn exponent(&self, low_t: f64, high_t: f64) -> f64 {
        // Gauss-Legendre, four points.
        const NODES: [f64; 2] = [0.339_981_043_584_856_3, 0.861_136_311_594_052_6];
        const WEIGHTS: [f64; 2] = [0.652_145_154_862_546_1, 0.347_854_845_137_453_9];
        const PANELS: usize = 10;
        let marks = [9.0, 4.0 * 4.75 * 4.75, self.jump_t_gev2];
        let mut edges = vec![low_t, high_t];
        edges.extend(marks.into_iter().filter(|t| *t > low_t && *t < high_t));
        edges.sort_by(f64::total_cmp);
        let mut sum = 0.0;
        for piece in edges.windows(2) {
            let (from, to) = (piece[0].ln(), piece[1].ln());
            let half = 0.5 * (to - from) / PANELS as f64;
            for panel in 0..PANELS {
                let centre = from + (2.0 * panel as f64 + 1.0) * half;
                for (node, weight) in NODES.into_iter().zip(WEIGHTS) {
                    let both = self.at((centre + half * node).exp())
                        + self.at((centre - half * node).exp());
                    sum += weight * half * both;
                }
            }
        }
        sum
    }
}

/// The smallest fraction for which z(1-z) >= `product`.
pub fn fraction_of(product: f64) -> f64 {
    if product >= 0.25 {
        return 0.5;
    }
    2.0 * product / (1.0 + (1.0 - 4.0 * product).sqrt())
}

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
