//! What a run counts: trials, branchings, vetoes.

use std::ops::AddAssign;

/// Unit of [`ChannelCounters::cut_units`].
pub const CUT_UNIT: f64 = 1.0 / (1u64 << 20) as f64;

/// Counts of one emission channel.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct ChannelCounters {
    /// Proposals of the envelope, also those outside the exact range.
    pub trials: u64,
    /// Trials that became branchings, also those that the joint constraint discarded later.
    pub accepted: u64,
    /// Trials whose density lay outside its envelope; the weight carries them.
    pub overshoots: u64,
    /// Expected number of branchings that the limit to small angles cut away, taking coupling and phase factor at the
    /// branchings that it left; in units of [`CUT_UNIT`], so that sums do not depend on their order.
    pub cut_units: u64,
    /// Accepted trials outside the regime of the effect; of an effect on paths, settled partons (which then count as
    /// accepted).
    pub outside_regime: u64,
}

impl ChannelCounters {
    /// Expected number of branchings that the limit to small angles cut away, rounded.
    pub fn cut_by_angle_limit(&self) -> u64 {
        (self.cut_units as f64 * CUT_UNIT).round() as u64
    }
}

/// Counts of a run; those of parts add up.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct ShowerCounters {
    /// Vacuum first, then the effects in config order.
    pub channels: Vec<ChannelCounters>,
    /// Branchings in the final trees.
    pub branchings: u64,
    /// Partons that would have met the medium but lie below the minimum energy.
    pub legs_below_min_energy: u64,
    /// Partons that met the medium.
    pub legs_in_medium: u64,
    /// Paths that left the field's data above the end temperature.
    pub paths_left_hot: u64,
}

impl ShowerCounters {
    /// Zero counts for the vacuum and a number of effects.
    pub fn new(effects: usize) -> ShowerCounters {
        ShowerCounters {
            channels: vec![ChannelCounters::default(); 1 + effects],
            ..ShowerCounters::default()
        }
    }
}

impl AddAssign<&ShowerCounters> for ShowerCounters {
    fn add_assign(&mut self, other: &ShowerCounters) {
        self.channels.resize(
            self.channels.len().max(other.channels.len()),
            ChannelCounters::default(),
        );
        for (sum, part) in self.channels.iter_mut().zip(&other.channels) {
            sum.trials += part.trials;
            sum.accepted += part.accepted;
            sum.overshoots += part.overshoots;
            sum.cut_units += part.cut_units;
            sum.outside_regime += part.outside_regime;
        }
        self.branchings += other.branchings;
        self.legs_below_min_energy += other.legs_below_min_energy;
        self.legs_in_medium += other.legs_in_medium;
        self.paths_left_hot += other.paths_left_hot;
    }
}
