//! Chooses one of many by weight in constant time: the alias method (Walker 1977, ACM Trans. Math. Softw. 3:253), as
//! `rand_distr` has it. What has no weight is left out, so that no rounding can choose it.

use rand_distr::Distribution;
use rand_distr::weighted::WeightedAliasIndex;

use crate::random::Stream;

/// A distribution over places 0.. with weights.
#[derive(Clone, Debug)]
pub(super) struct Chooser {
    alias: WeightedAliasIndex<f64>,
    places: Vec<u32>,
    total: f64,
}

impl Chooser {
    /// `None` where no weight is above 0. Weights must be finite and not negative, at most 2^32 of them.
    pub(super) fn new(weights: &[f64]) -> Option<Chooser> {
        let largest = weights.iter().copied().fold(0.0, f64::max);
        if largest <= 0.0 {
            return None;
        }
        let chosen = || {
            let relative = weights.iter().map(|weight| weight / largest);
            relative.enumerate().filter(|(_, weight)| *weight > 0.0)
        };
        let alias = WeightedAliasIndex::new(chosen().map(|(_, weight)| weight).collect());
        Some(Chooser {
            alias: alias.expect("weights lie in (0, 1], and there is one"),
            places: chosen().map(|(place, _)| place as u32).collect(),
            total: chosen().map(|(_, weight)| weight).sum::<f64>() * largest,
        })
    }

    /// Draws a place.
    #[inline]
    pub(super) fn draw(&self, stream: &mut Stream) -> usize {
        self.places[self.alias.sample(stream)] as usize
    }

    /// Sum of the weights.
    pub(super) fn total(&self) -> f64 {
        self.total
    }
}
