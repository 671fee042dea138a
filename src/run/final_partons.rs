//! The mean number of final partons of an event, with its statistical error.

use crate::event::{Parton, Status};
use crate::files::event_file::WeightSums;

/// Sums over events, n being an event's number of final partons and w its weight.
///
/// They are made block by block, so they do not depend on how blocks were shared among threads.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct FinalPartons {
    /// Final partons of all events, unweighted.
    pub count: u64,
    weighted: f64,
    squared: f64,
    crossed: f64,
}

impl FinalPartons {
    /// Adds an event, given its weight and its rows.
    pub(super) fn add(&mut self, weight: f64, rows: &[Parton]) {
        let finals = rows
            .iter()
            .filter(|row| row.status == Status::Final)
            .count();
        let weighted = weight * finals as f64;
        self.count += finals as u64;
        self.weighted += weighted;
        self.squared += weighted * weighted;
        self.crossed += weight * weighted;
    }

    /// Adds the sums over other events.
    pub(super) fn merge(&mut self, other: &FinalPartons) {
        self.count += other.count;
        self.weighted += other.weighted;
        self.squared += other.squared;
        self.crossed += other.crossed;
    }

    /// The weighted mean m = sum w n / sum w; `None` where the weights add up to nothing.
    pub fn mean(&self, sums: &WeightSums) -> Option<f64> {
        (sums.weights != 0.0).then(|| self.weighted / sums.weights)
    }

    /// Standard error of the mean: the root of N/(N-1) sum w^2 (n - m)^2 / (sum w)^2 (the variance of a ratio of
    /// sums; common practice). `None` with fewer than two events.
    pub fn standard_error(&self, sums: &WeightSums, events: u64) -> Option<f64> {
        let mean = self.mean(sums).filter(|_| events > 1)?;
        let scatter = self.squared - 2.0 * mean * self.crossed + mean * mean * sums.squared_weights;
        let freedom = events as f64 / (events - 1) as f64;
        // rounding can push the scatter of equal events below zero
        Some((freedom * scatter.max(0.0)).sqrt() / sums.weights.abs())
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::event::NO_PARENT;

    fn rows(finals: usize) -> Vec<Parton> {
        let row = |status| Parton {
            momentum_gev: [0.0; 4],
            birth_fm: [0.0; 4],
            virtuality_squared_gev2: 0.0,
            splitting_fraction: 1.0,
            jet_fraction: 1.0,
            pdg: 21,
            parent: NO_PARENT,
            colour: 501,
            anticolour: 502,
            status,
            channel: 0,
        };
        let mut rows = vec![row(Status::Hard), row(Status::Branched)];
        rows.extend(vec![row(Status::Final); finals]);
        rows
    }

    fn of(events: &[(f64, usize)]) -> (FinalPartons, WeightSums) {
        let (mut finals, mut sums) = (FinalPartons::default(), WeightSums::default());
        for (weight, count) in events {
            finals.add(*weight, &rows(*count));
            sums.add(1.0, *weight);
        }
        (finals, sums)
    }

    #[test]
    fn unit_weights_give_the_textbook_standard_error() {
        let (finals, sums) = of(&[(1.0, 2), (1.0, 4), (1.0, 9)]);
        assert_eq!(finals.count, 15);
        assert_eq!(finals.mean(&sums), Some(5.0));
        // sample variance (9 + 1 + 16)/2 = 13
        let error = finals.standard_error(&sums, 3).unwrap();
        assert!((error - (13f64 / 3.0).sqrt()).abs() < 1e-14, "{error}");
    }

    #[test]
    fn weights_count() {
        let (finals, sums) = of(&[(3.0, 2), (1.0, 6)]);
        assert_eq!(finals.mean(&sums), Some(3.0));
        // 2/1 (9 * 1 + 1 * 9)/16
        let error = finals.standard_error(&sums, 2).unwrap();
        assert!((error - 1.5).abs() < 1e-14, "{error}");
    }

    #[test]
    fn too_few_events_have_no_error() {
        let (finals, sums) = of(&[]);
        assert_eq!(finals.mean(&sums), None);
        let (finals, sums) = of(&[(1.0, 3)]);
        assert_eq!(finals.standard_error(&sums, 1), None);
        let (finals, sums) = of(&[(0.1, 3); 10]);
        assert!(finals.standard_error(&sums, 10).unwrap() < 1e-7);
    }
}
