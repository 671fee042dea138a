//! The closing summary of a run: its numbers, with stable names for scripts.

use std::path::PathBuf;
use std::time::Duration;

use serde::Serialize;

use crate::config::RunPlan;
use crate::files::event_file::WeightSums;
use crate::medium::effect_names;
use crate::run::RunTotals;
use crate::run::provenance::{COMMIT, PROGRAM_VERSION};
use crate::shower::counters::{ChannelCounters, ShowerCounters};

/// What every sample of this program is.
const CAUTION: &str = "parton level (no hadronization, no underlying event), leading logarithm";
/// An effective sample below this share of the events deserves a warning.
const POOR_EFFECTIVE_SHARE: f64 = 0.1;
/// More paths than this share leaving the field's data while hot deserve a warning.
const MANY_PATHS_LEFT_HOT: f64 = 0.01;

/// How and where a run was carried out.
pub(super) struct Circumstances {
    /// The config file as it was named.
    pub config: PathBuf,
    /// The event file, `None` where nothing was written.
    pub output: Option<PathBuf>,
    /// Threads that made events.
    pub threads: usize,
    /// Time from the first event to the closed file.
    pub wall_time: Duration,
}

/// The numbers of a run. What does not exist, such as a mean of nothing, is `None`.
#[derive(Serialize)]
pub(super) struct Summary {
    pub program_version: &'static str,
    pub commit: &'static str,
    pub config: PathBuf,
    pub config_digest: String,
    pub seed: u64,
    pub output: Option<PathBuf>,
    pub complete: bool,
    pub events_requested: u64,
    pub events: u64,
    pub events_committed: u64,
    pub rows: u64,
    pub final_partons: u64,
    pub final_partons_per_event: Option<f64>,
    pub final_partons_per_event_standard_error: Option<f64>,
    pub branchings_per_event: Option<f64>,
    pub threads: usize,
    pub wall_time_s: f64,
    pub events_per_s: f64,
    pub output_bytes: Option<u64>,
    pub output_bytes_per_final_parton: Option<f64>,
    pub weights: Weights,
    pub channels: Vec<Channel>,
    pub medium: Option<MediumCounts>,
    pub caution: &'static str,
    pub warnings: Vec<String>,
}

/// Nominal weights of the events made.
#[derive(Serialize)]
pub(super) struct Weights {
    pub mean: Option<f64>,
    pub mean_standard_error: Option<f64>,
    pub mean_squared: Option<f64>,
    pub effective_events: f64,
    pub effective_share: Option<f64>,
}

/// One emission channel.
#[derive(Serialize)]
pub(super) struct Channel {
    pub name: String,
    pub trials: u64,
    pub accepted: u64,
    pub acceptance: Option<f64>,
    pub overshoots: u64,
    /// `None` for the vacuum, which has no such limit.
    pub share_cut_by_angle_limit: Option<f64>,
}

/// What partons met.
#[derive(Serialize)]
pub(super) struct MediumCounts {
    pub partons_in_medium: u64,
    pub partons_below_min_energy: u64,
    pub paths_left_hot: u64,
    pub share_of_paths_left_hot: Option<f64>,
}

impl Summary {
    /// Puts together what a run of `plan` came to.
    pub fn new(
        plan: &RunPlan,
        circumstances: Circumstances,
        totals: &RunTotals<ShowerCounters>,
    ) -> Summary {
        let Circumstances {
            config,
            output,
            threads,
            wall_time,
        } = circumstances;
        let about = output.as_ref().and_then(|path| path.metadata().ok());
        let output_bytes = about.map(|about| about.len());
        let (events, finals) = (totals.events, &totals.finals);
        let per_final = |bytes: u64| ratio(bytes as f64, finals.count as f64);
        let mut summary = Summary {
            program_version: PROGRAM_VERSION,
            commit: COMMIT,
            config,
            config_digest: plan.digest.clone(),
            seed: plan.seed,
            output,
            complete: totals.completed,
            events_requested: plan.events,
            events,
            events_committed: totals.committed_events,
            rows: totals.partons,
            final_partons: finals.count,
            final_partons_per_event: finals.mean(&totals.sums),
            final_partons_per_event_standard_error: finals.standard_error(&totals.sums, events),
            branchings_per_event: ratio(totals.counters.branchings as f64, events as f64),
            threads,
            wall_time_s: wall_time.as_secs_f64(),
            events_per_s: events as f64 / wall_time.as_secs_f64().max(f64::MIN_POSITIVE),
            output_bytes,
            // of an interrupted run the file holds fewer partons than were made
            output_bytes_per_final_parton: output_bytes
                .filter(|_| totals.completed)
                .and_then(per_final),
            weights: Weights::new(&totals.sums, events),
            channels: channels(plan, &totals.counters),
            medium: plan
                .medium
                .as_ref()
                .map(|_| MediumCounts::new(&totals.counters)),
            caution: CAUTION,
            warnings: Vec::new(),
        };
        summary.warnings = summary.warnings();
        summary
    }

    fn warnings(&self) -> Vec<String> {
        let mut warnings = Vec::new();
        if let Some(share) = self
            .weights
            .effective_share
            .filter(|share| *share < POOR_EFFECTIVE_SHARE)
        {
            warnings.push(format!(
                "a few events carry most of the weight: the sample counts as {:.3} % of its events",
                100.0 * share
            ));
        }
        for channel in self
            .channels
            .iter()
            .filter(|channel| channel.overshoots > 0)
        {
            warnings.push(format!(
                "channel {}: {} of {} trials lay above their envelope; the weights carry them, so results stay exact, but please report it",
                channel.name, channel.overshoots, channel.trials
            ));
        }
        let left_hot = self
            .medium
            .as_ref()
            .and_then(|medium| medium.share_of_paths_left_hot);
        if let Some(share) = left_hot.filter(|share| *share > MANY_PATHS_LEFT_HOT) {
            warnings.push(format!(
                "{:.2} % of the paths left the grid of the temperature field where it was still hot; the field should reach further or last longer",
                100.0 * share
            ));
        }
        warnings
    }
}

impl Weights {
    fn new(sums: &WeightSums, events: u64) -> Weights {
        let count = events as f64;
        let mean = ratio(sums.weights, count);
        let mean_squared = ratio(sums.squared_weights, count);
        let variance = mean
            .zip(mean_squared)
            .map(|(mean, squared)| squared - mean * mean);
        Weights {
            mean,
            mean_standard_error: variance
                .filter(|_| events > 1)
                // rounding can push the variance of equal weights below zero
                .map(|variance| (variance.max(0.0) / (count - 1.0)).sqrt()),
            mean_squared,
            effective_events: sums.effective_events(),
            effective_share: ratio(sums.effective_events(), count),
        }
    }
}

fn channels(plan: &RunPlan, counters: &ShowerCounters) -> Vec<Channel> {
    let effects = plan
        .medium
        .as_ref()
        .map_or(Vec::new(), |medium| effect_names(&medium.effects));
    let names = std::iter::once("vacuum".to_owned()).chain(effects);
    let numbered = counters.channels.iter().enumerate();
    let rows = names.zip(numbered);
    rows.map(|(name, (place, counts))| Channel::new(name, place > 0, counts))
        .collect()
}

impl Channel {
    fn new(name: String, is_induced: bool, counts: &ChannelCounters) -> Channel {
        let cut = counts.cut_by_angle_limit() as f64;
        Channel {
            name,
            trials: counts.trials,
            accepted: counts.accepted,
            acceptance: ratio(counts.accepted as f64, counts.trials as f64),
            overshoots: counts.overshoots,
            share_cut_by_angle_limit: ratio(cut, cut + counts.accepted as f64)
                .filter(|_| is_induced),
        }
    }
}

impl MediumCounts {
    fn new(counters: &ShowerCounters) -> MediumCounts {
        let (paths, left) = (counters.legs_in_medium, counters.paths_left_hot);
        MediumCounts {
            partons_in_medium: paths,
            partons_below_min_energy: counters.legs_below_min_energy,
            paths_left_hot: left,
            share_of_paths_left_hot: ratio(left as f64, paths as f64),
        }
    }
}

fn ratio(part: f64, whole: f64) -> Option<f64> {
    (whole != 0.0).then(|| part / whole)
}
