//! The rate of one parton with fixed coupling, integrated over z by closed forms and over ln t by Gauss's rule, and events
//! in which both daughters of a primary stay unbranched.

use spindrift::qcd::{C_A, C_F, T_R};

use super::setup::{ALPHA_S, Setup};
use super::ways::{Way, pair, ways};

/// The rate of one parton with fixed coupling, integrated over z by closed forms.
pub struct Rate<'a> {
    pub is_gluon: bool,
    /// The smallest fraction of a daughter at t; 1/2 and more where there is none.
    pub smallest: &'a dyn Fn(f64) -> f64,
    /// Where `smallest` jumps.
    pub jump_t_gev2: f64,
    /// What a medium adds at t to gluon emission.
    pub added: &'a dyn Fn(f64) -> Added,
}

/// A change of the density of gluon emission.
#[derive(Clone, Copy)]
pub struct Added {
    /// Factor of the soft-singular part, 2 C_F/(1-z) or C_A [1/z + 1/(1-z)].
    pub singular: f64,
    /// Factor of the kernel over z(1-z).
    pub over_fractions: f64,
    /// The smallest fraction that it leaves to a daughter.
    pub smallest: f64,
}

/// A medium that adds nothing.
pub fn nothing(_: f64) -> Added {
    Added {
        singular: 0.0,
        over_fractions: 0.0,
        smallest: 0.5,
    }
}

/// Antiderivative of what is added.
fn added_below(is_gluon: bool, z: f64, added: Added) -> f64 {
    let rest = 1.0 - z;
    if is_gluon {
        C_A * (added.singular * (z / rest).ln() + added.over_fractions * (1.0 / rest - 1.0 / z + z))
    } else {
        C_F * (-2.0 * added.singular * rest.ln() + added.over_fractions * (z.ln() + 2.0 / rest))
    }
}

/// Antiderivative of the kernels' sum.
pub fn kernels_below(is_gluon: bool, z: f64, t: f64) -> f64 {
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
        let over = |low: f64, below: &dyn Fn(f64) -> f64| {
            if low < 0.5 {
                below(1.0 - low) - below(low)
            } else {
                0.0
            }
        };
        let vacuum = over((self.smallest)(t), &|z| kernels_below(self.is_gluon, z, t));
        let added = (self.added)(t);
        let medium = over(added.smallest, &|z| added_below(self.is_gluon, z, added));
        ALPHA_S / std::f64::consts::TAU * (vacuum + medium)
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

/// The probability that one (0 or 1) of the daughters of a parton does not branch.
pub type Law = dyn Fn(&Way, [&Way; 2], usize) -> f64;

/// Pulls of the number of events in which neither daughter of the primary branches, in four bins of z, one list for each law
/// of its probability.
///
/// Under the joint constraint a branching is only discarded in favour of another that stays, so neither daughter branches
/// exactly if neither had any candidate: with the product of their own probabilities.
pub fn pulls_of_unbranched_pairs(setup: &Setup, events: i64, laws: &[&Law]) -> Vec<[f64; 4]> {
    let mut counts = [0.0; 4];
    let mut sums = vec![[[0.0; 2]; 4]; laws.len()];
    setup.events(0..events, |_, rows| {
        let all = ways(rows);
        let Some(daughters) = pair(&all, &all[0]) else {
            return;
        };
        let z = f64::from(daughters[0].parton.splitting_fraction);
        let bin = [0.2, 0.5, 0.8].iter().filter(|edge| z > **edge).count();
        counts[bin] += f64::from(daughters.iter().all(|daughter| daughter.is_final()));
        for (law, sums) in laws.iter().zip(&mut sums) {
            let p = law(&all[0], daughters, 0) * law(&all[0], daughters, 1);
            sums[bin][0] += p;
            sums[bin][1] += p * (1.0 - p);
        }
    });
    let pull = |sums: &[[f64; 2]; 4]| {
        std::array::from_fn(|bin| (counts[bin] - sums[bin][0]) / sums[bin][1].sqrt())
    };
    sums.iter().map(pull).collect()
}
