//! The closing summary of a run: its numbers, with stable names for scripts.

use std::path::PathBuf;
use std::time::Duration;

use serde::Serialize;

use super::RunTotals;
use super::provenance::{COMMIT, PROGRAM_VERSION};
use crate::config::RunPlan;
use crate::files::event_file::WeightSums;
use crate::medium::effect_names;
use crate::shower::counters::{ChannelCounters, ShowerCounters};

/// What every sample of this program is.
const CAUTION: &str = "parton level, leading logarithm: no hadronization, no underlying event";
/// An effective sample below this share of the events deserves a warning.
const POOR_EFFECTIVE_SHARE: f64 = 0.1;
/// More of an effect than this share outside its regime deserves a warning.
const MUCH_OUTSIDE_REGIME: f64 = 0.1;
/// More paths than this share leaving the field's data while hot deserve a warning.
const MANY_PATHS_LEFT_HOT: f64 = 0.01;

/// How and where a run was carried out.
#[derive(Clone, Debug)]
pub struct Circumstances {
    /// The config file as it was named.
    pub config: PathBuf,
    /// The event file, `None` where nothing was written.
    pub output: Option<PathBuf>,
    /// Threads that made events.
    pub threads: usize,
    /// Time from the first event to the closed file.
    pub wall_time: Duration,
    /// What config and input files made the program warn of.
    pub input_warnings: Vec<String>,
}

/// The numbers of a run. What does not exist, such as a mean of nothing, is `None`.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct RunSummary {
    /// Version of the program.
    pub program_version: &'static str,
    /// Commit that it was built from.
    pub commit: &'static str,
    /// The config file as it was named.
    pub config: String,
    /// Digest of the resolved config, as in the event file.
    pub config_digest: String,
    /// Seed of all random streams.
    pub seed: u64,
    /// The event file, `None` where nothing was written.
    pub output: Option<String>,
    /// False when the run was stopped before its last event.
    pub complete: bool,
    /// Events that were asked for.
    pub events_requested: u64,
    /// Events made.
    pub events: u64,
    /// Events that are safe in the event file.
    pub events_committed: u64,
    /// Rows of all events made.
    pub rows: u64,
    /// Final partons of all events made.
    pub final_partons: u64,
    /// Weighted mean of an event's number of final partons.
    pub final_partons_per_event: Option<f64>,
    /// Its standard error.
    pub final_partons_per_event_standard_error: Option<f64>,
    /// Mean number of branchings in an event's tree, unweighted.
    pub branchings_per_event: Option<f64>,
    /// Threads that made events.
    pub threads: usize,
    /// Time from the first event to the closed file.
    pub wall_time_s: f64,
    /// Events made in that time.
    pub events_per_s: f64,
    /// Size of the event file.
    pub output_bytes: Option<u64>,
    /// The same for each final parton; `None` for an interrupted run, whose file holds fewer than were made.
    pub output_bytes_per_final_parton: Option<f64>,
    /// Nominal weights.
    pub weights: WeightSummary,
    /// Emission channels: the vacuum, then the effects in config order.
    pub channels: Vec<ChannelSummary>,
    /// What partons met, `None` where no effect acts.
    pub medium: Option<MediumSummary>,
    /// What every sample of this program is.
    pub caution: &'static str,
    /// What config and input files made the program warn of.
    pub input_warnings: Vec<String>,
    /// What the run itself made the program warn of.
    pub warnings: Vec<String>,
}

/// Nominal weights of the events made.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct WeightSummary {
    /// Mean weight.
    pub mean: Option<f64>,
    /// Its standard error.
    pub mean_standard_error: Option<f64>,
    /// Mean of the squared weight.
    pub mean_squared: Option<f64>,
    /// Number of equally weighted events that would be as good, (sum w)^2 / sum w^2.
    pub effective_events: f64,
    /// The same as a share of the events made.
    pub effective_share: Option<f64>,
}

/// One emission channel.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct ChannelSummary {
    /// `vacuum` or the effect's name.
    pub name: String,
    /// Proposals of the envelope.
    pub trials: u64,
    /// Trials that became branchings, also those that the joint constraint discarded later.
    pub accepted: u64,
    /// Accepted trials as a share of all.
    pub acceptance: Option<f64>,
    /// Trials above their envelope.
    pub overshoots: u64,
    /// Share of the effect's branchings that the limit to small angles cut away; `None` where it cut nothing, and for
    /// effects whose spectrum ends at small angles by itself.
    pub share_cut_by_angle_limit: Option<f64>,
    /// Share of what the effect did (branchings that it made or let pass, partons that it acted on) outside the regime
    /// of its model; `None` for the vacuum and for an effect that did nothing.
    pub share_outside_regime: Option<f64>,
    /// The regime in words; `None` for the vacuum.
    pub regime: Option<&'static str>,
}

/// What partons met.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct MediumSummary {
    /// Partons that met the medium.
    pub partons_in_medium: u64,
    /// Partons whose energy was too low to see it.
    pub partons_below_min_energy: u64,
    /// Paths that left the field's data above the end temperature.
    pub paths_left_hot: u64,
    /// The same as a share of the partons that met the medium.
    pub share_of_paths_left_hot: Option<f64>,
}

impl RunSummary {
    /// Puts together what a run of `plan` came to.
    pub fn new(
        plan: &RunPlan,
        circumstances: Circumstances,
        totals: &RunTotals<ShowerCounters>,
    ) -> RunSummary {
        let Circumstances {
            config,
            output,
            threads,
            wall_time,
            input_warnings,
        } = circumstances;
        let about = output.as_ref().and_then(|path| path.metadata().ok());
        let output_bytes = about.map(|about| about.len());
        let (events, finals) = (totals.events, &totals.finals);
        let per_final = |bytes: u64| ratio(bytes as f64, finals.count as f64);
        let mut summary = RunSummary {
            program_version: PROGRAM_VERSION,
            commit: COMMIT,
            config: config.display().to_string(),
            config_digest: plan.digest.clone(),
            seed: plan.seed,
            output: output.map(|path| path.display().to_string()),
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
            output_bytes_per_final_parton: output_bytes
                .filter(|_| totals.completed)
                .and_then(per_final),
            weights: WeightSummary::new(&totals.sums, events),
            channels: channels(plan, &totals.counters),
            medium: acts(plan).then(|| MediumSummary::new(&totals.counters)),
            caution: CAUTION,
            input_warnings,
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
                "channel {}: {} of {} trials had a density below zero or above its envelope; the event weights carry it and stay exact in the mean (below zero is what effects do that thin the vacuum by more than there is; above the envelope deserves a report)",
                channel.name, channel.overshoots, channel.trials
            ));
        }
        for channel in &self.channels {
            warnings.extend(channel.regime_warning());
        }
        if self.events > 0
            && self
                .medium
                .as_ref()
                .is_some_and(|medium| medium.partons_in_medium == 0)
        {
            warnings.push(
                "no parton met the medium: check the origin, the field's extent and end_temperature_GeV".to_owned(),
            );
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

impl WeightSummary {
    fn new(sums: &WeightSums, events: u64) -> WeightSummary {
        let count = events as f64;
        let mean = ratio(sums.weights, count);
        let mean_squared = ratio(sums.squared_weights, count);
        let variance = mean
            .zip(mean_squared)
            .map(|(mean, squared)| squared - mean * mean);
        WeightSummary {
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

/// Whether a medium can change anything.
fn acts(plan: &RunPlan) -> bool {
    plan.medium
        .as_ref()
        .is_some_and(|medium| !medium.effects.is_empty())
}

fn channels(plan: &RunPlan, counters: &ShowerCounters) -> Vec<ChannelSummary> {
    let effects = plan
        .medium
        .as_ref()
        .map_or(&[][..], |medium| &medium.effects);
    let regimes = effects.iter().map(|effect| Some(effect.model.regime));
    let channels = std::iter::once(("vacuum".to_owned(), None))
        .chain(effect_names(effects).into_iter().zip(regimes));
    channels
        .zip(&counters.channels)
        .map(|((name, regime), counts)| ChannelSummary::new(name, regime, counts))
        .collect()
}

impl ChannelSummary {
    fn new(name: String, regime: Option<&'static str>, counts: &ChannelCounters) -> ChannelSummary {
        let cut = counts.cut_by_angle_limit() as f64;
        ChannelSummary {
            name,
            trials: counts.trials,
            accepted: counts.accepted,
            acceptance: ratio(counts.accepted as f64, counts.trials as f64),
            overshoots: counts.overshoots,
            share_cut_by_angle_limit: ratio(cut, cut + counts.accepted as f64)
                .filter(|_| regime.is_some() && counts.cut_units > 0),
            share_outside_regime: ratio(counts.outside_regime as f64, counts.accepted as f64)
                .filter(|_| regime.is_some()),
            regime,
        }
    }
}

impl ChannelSummary {
    fn regime_warning(&self) -> Option<String> {
        let share = self
            .share_outside_regime
            .filter(|share| *share > MUCH_OUTSIDE_REGIME)?;
        let regime = self.regime?;
        Some(format!(
            "{}: {:.0} % of what it did lies outside the regime of its model ({regime})",
            self.name,
            100.0 * share
        ))
    }
}

impl MediumSummary {
    fn new(counters: &ShowerCounters) -> MediumSummary {
        let (paths, left) = (counters.legs_in_medium, counters.paths_left_hot);
        MediumSummary {
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

#[cfg(test)]
mod tests {
    use std::path::Path;

    use super::*;
    use crate::config::{Overrides, load_text};

    const CONFIG: &str = r#"{
        "events": 1000,
        "source": {
            "kind": "single", "parton": "u", "energy_GeV": 100.0, "start_virtuality_GeV": 40.0
        },
        "medium": {
            "field": { "kind": "brick", "temperature_GeV": 0.3, "length_fm": 3.0 },
            "transport": { "kind": "constant", "qhat_GeV2_per_fm": 1.0, "for": "gluon" },
            "effects": [{ "kind": "collinear-expansion" }]
        }
    }"#;

    fn totals() -> RunTotals<ShowerCounters> {
        let mut counters = ShowerCounters::new(1);
        counters.channels[0].trials = 4000;
        counters.channels[0].accepted = 1000;
        counters.legs_in_medium = 2000;
        counters.branchings = 900;
        let sums = WeightSums {
            source_weights: 1000.0,
            weights: 1000.0,
            squared_weights: 1000.0,
        };
        RunTotals {
            events: 1000,
            sums,
            counters,
            completed: true,
            ..RunTotals::default()
        }
    }

    fn summary(totals: &RunTotals<ShowerCounters>) -> RunSummary {
        let path = Path::new("run.json");
        let plan = load_text(CONFIG, path, &Overrides::default()).unwrap();
        let circumstances = Circumstances {
            config: path.to_owned(),
            output: None,
            threads: 1,
            wall_time: Duration::from_secs(2),
            input_warnings: Vec::new(),
        };
        RunSummary::new(&plan, circumstances, totals)
    }

    #[test]
    fn a_sound_run_has_nothing_to_warn_of() {
        let summary = summary(&totals());
        assert_eq!(summary.warnings, [""; 0]);
        assert_eq!(summary.events_per_s, 500.0);
        assert_eq!(summary.branchings_per_event, Some(0.9));
        assert_eq!(summary.weights.mean_standard_error, Some(0.0));
        let [vacuum, effect] = &summary.channels[..] else {
            panic!("{:?}", summary.channels)
        };
        assert_eq!(
            (vacuum.name.as_str(), vacuum.acceptance),
            ("vacuum", Some(0.25))
        );
        assert_eq!(vacuum.share_cut_by_angle_limit, None);
        assert_eq!(
            (effect.name.as_str(), effect.acceptance),
            ("collinear-expansion", None)
        );
    }

    #[test]
    fn a_collapsed_sample_is_warned_of() {
        let with_effective = |events: f64| {
            let mut totals = totals();
            totals.sums.squared_weights = 1e6 / events;
            summary(&totals).warnings
        };
        assert_eq!(with_effective(101.0).len(), 0);
        let warnings = with_effective(99.0);
        assert_eq!(warnings.len(), 1);
        assert!(warnings[0].contains("9.900 %"), "{warnings:?}");
    }

    #[test]
    fn one_overshoot_is_warned_of() {
        let mut totals = totals();
        totals.counters.channels[1].overshoots = 1;
        let warnings = summary(&totals).warnings;
        assert_eq!(warnings.len(), 1);
        assert!(warnings[0].contains("collinear-expansion"), "{warnings:?}");
    }

    #[test]
    fn paths_that_leave_the_field_hot_are_warned_of() {
        let with_paths = |paths: u64| {
            let mut totals = totals();
            totals.counters.paths_left_hot = paths;
            summary(&totals).warnings.len()
        };
        assert_eq!([0, 20, 21].map(with_paths), [0, 0, 1]);
    }

    #[test]
    fn a_run_without_events_has_no_means() {
        let summary = summary(&RunTotals::default());
        assert_eq!(summary.final_partons_per_event, None);
        assert_eq!(summary.branchings_per_event, None);
        assert_eq!(summary.weights.mean, None);
        assert_eq!(summary.warnings, [""; 0]);
        let json = serde_json::to_value(&summary).unwrap();
        assert!(json["weights"]["mean"].is_null());
    }
}
