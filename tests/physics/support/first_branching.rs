//! First branchings of a primary against a case of a table: shares, t, and z of each kind, with unit weights or weighted.

use serde_json::Value;

use super::reference::{Cumulative, logit, number};
use super::setup::Setup;
use super::statistics::{
    LARGEST_DISTANCE, LARGEST_PULL, Mean, SIGNIFICANCE, binomial_p_value, distance,
};

/// Largest error of linear interpolation in the tables.
const INTERPOLATION_ERROR: f64 = 1e-5;
/// Points of a weighted distribution that are looked at, and their two-sided 10^-6/20 quantile.
const POINTS: usize = 20;
const LARGEST_PULL_OF_POINTS: f64 = 5.4513;

fn kinds(case: &Value) -> &'static [&'static str] {
    if case["parton"] == "gluon" {
        &["g-gg", "g-qq"]
    } else {
        &["q-qg"]
    }
}

fn table(entry: &Value, x: &str, norm: f64) -> Cumulative {
    Cumulative::new(&entry[x], &entry["cumulative"], norm)
}

/// First branchings of events that all have the weight 1.
#[derive(Default)]
pub struct Sample {
    events: u64,
    unbranched: u64,
    /// From a channel of the medium, by kind: emission, pair.
    induced: [u64; 2],
    ln_t: Vec<f64>,
    logit_z: [Vec<f64>; 2],
}

impl Sample {
    pub fn of(setup: &Setup, events: u64) -> Sample {
        let mut sample = Sample {
            events,
            ..Sample::default()
        };
        setup.first_branchings(events, |branching, weight| {
            assert_eq!(weight, 1.0, "the density lies between 0 and its envelope");
            let Some(branching) = branching else {
                sample.unbranched += 1;
                return;
            };
            let pair = !branching.daughters[1].is_gluon();
            sample.induced[pair as usize] += (branching.channel > 0) as u64;
            sample.ln_t.push(branching.t.ln());
            sample.logit_z[pair as usize].push(logit(branching.z));
        });
        sample
    }

    /// Each statistic over its limit, all below 1 if the sample follows the case: no branching, share of each kind from
    /// the medium's channels (where the table has one), t, z of each kind.
    pub fn over_limits(self, case: &Value) -> Vec<f64> {
        self.over_limits_with_surplus(case, 0.0)
    }

    /// The same where the medium's channels may make more than the table's share, and thin the vacuum's as much: up to
    /// `surplus` of it.
    pub fn over_limits_with_surplus(mut self, case: &Value, surplus: f64) -> Vec<f64> {
        let events = self.events;
        let tail = |count, p| binomial_p_value(count, events, p).ln() / SIGNIFICANCE.ln();
        let unbranched = number(case, "no_branching_probability");
        let mut found = vec![tail(self.unbranched, unbranched)];
        for (kind, count) in kinds(case).iter().zip(self.induced) {
            let expected = number(&case["z"][*kind], "induced");
            if expected > 0.0 {
                let share = count as f64 / events as f64;
                let nearest = share.clamp(expected, expected * (1.0 + surplus));
                found.push(tail(count, nearest));
            } else {
                assert_eq!(count, 0, "nothing induced is expected");
            }
        }
        let mut follow = |draws: &mut Vec<f64>, table: Cumulative| {
            let limit = LARGEST_DISTANCE + INTERPOLATION_ERROR * (draws.len() as f64).sqrt();
            found.push(distance(draws, |x| table.at(x)) / limit);
        };
        follow(&mut self.ln_t, table(&case["t"], "ln_t", 1.0 - unbranched));
        for (kind, draws) in kinds(case).iter().zip(&mut self.logit_z) {
            let entry = &case["z"][*kind];
            follow(draws, table(entry, "logit_z", number(entry, "total")));
        }
        found
    }
}

/// Means of w times an indicator: below each point of a table.
struct Weighted {
    table: Cumulative,
    points: Vec<f64>,
    means: Vec<Mean>,
}

impl Weighted {
    fn new(table: Cumulative) -> Weighted {
        let points = table.some_points(POINTS);
        Weighted {
            means: vec![Mean::default(); points.len()],
            table,
            points,
        }
    }

    fn add(&mut self, x: f64, weight: f64) {
        for (point, mean) in self.points.iter().zip(&mut self.means) {
            mean.add(if x < *point { weight } else { 0.0 });
        }
    }

    fn add_nothing(&mut self) {
        self.means.iter_mut().for_each(|mean| mean.add_zeros(1));
    }

    fn largest_pull(&self) -> f64 {
        let pulls = self.points.iter().zip(&self.means);
        pulls
            .map(|(point, mean)| mean.pull(self.table.at(*point)).abs())
            .fold(0.0, f64::max)
    }
}

/// What weighted first branchings of a case give.
pub struct WeightedPulls {
    /// Pulls of <w> (0 where all weights are 1), of the unbranched share, and the largest ones of t and of z of each
    /// kind, scaled to the limit of a single pull.
    pub pulls: Vec<f64>,
    /// <w>, its error and <w^2>, in words.
    pub weights: String,
}

/// Pulls of weighted first branchings, the weights as `weigh` says.
pub fn weighted_pulls(
    case: &Value,
    setup: &Setup,
    events: u64,
    weigh: impl Fn(f64) -> f64,
) -> WeightedPulls {
    let mut in_t = Weighted::new(table(&case["t"], "ln_t", 1.0));
    let mut in_z: Vec<Weighted> = kinds(case)
        .iter()
        .map(|kind| Weighted::new(table(&case["z"][*kind], "logit_z", 1.0)))
        .collect();
    let (mut all, mut unbranched) = (Mean::default(), Mean::default());
    setup.first_branchings(events, |branching, weight| {
        let weight = weigh(weight);
        all.add(weight);
        let Some(branching) = branching else {
            unbranched.add(weight);
            in_t.add_nothing();
            in_z.iter_mut().for_each(Weighted::add_nothing);
            return;
        };
        unbranched.add_zeros(1);
        in_t.add(branching.t.ln(), weight);
        let pair = !branching.daughters[1].is_gluon();
        for (kind, weighted) in in_z.iter_mut().enumerate() {
            if kind == pair as usize {
                weighted.add(logit(branching.z), weight);
            } else {
                weighted.add_nothing();
            }
        }
    });
    let weights = format!(
        "<w> - 1 = {:+.1e} +- {:.1e}, <w^2> = {:.3}, effective {:.2} of the events",
        all.value() - 1.0,
        all.error(),
        all.variance() + 1.0,
        all.effective_size() / events as f64
    );
    let of_weight = if all.variance() > 0.0 {
        all.pull(1.0)
    } else {
        0.0
    };
    let scale = LARGEST_PULL / LARGEST_PULL_OF_POINTS;
    let mut pulls = vec![
        of_weight,
        unbranched.pull(number(case, "no_branching_probability")),
        in_t.largest_pull() * scale,
    ];
    pulls.extend(in_z.iter().map(|weighted| weighted.largest_pull() * scale));
    WeightedPulls { pulls, weights }
}
