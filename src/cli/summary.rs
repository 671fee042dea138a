//! What a person reads before and after a run: the forecast and the closing summary.

use std::fmt::{Display, Formatter, Result};

use super::words::{bytes, grouped, or_dash, percent, time, with_error};
use crate::run::forecast::Forecast;
use crate::run::summary::{ChannelSummary, MediumSummary, RunSummary, WeightSummary};

/// Least width of the column of channel names.
const NAME_WIDTH: usize = 19;

/// Titles of the table of channels.
const TITLES: [&str; 7] = [
    "channel",
    "trials",
    "accepted",
    "share",
    "overshoots",
    "cut by angle",
    "outside regime",
];

/// Prints a summary as a few aligned lines.
pub(super) struct SummaryText<'a>(pub &'a RunSummary);

impl Display for SummaryText<'_> {
    fn fmt(&self, out: &mut Formatter) -> Result {
        let summary = self.0;
        write_run(summary, out)?;
        write_partons(summary, out)?;
        write_weights(&summary.weights, out)?;
        write_channels(&summary.channels, out)?;
        if let Some(medium) = &summary.medium {
            write_medium(medium, out)?;
        }
        write!(out, "  caution    {}", summary.caution)
    }
}

/// What to expect of a run.
pub(super) fn forecast_line(events: u64, forecast: &Forecast, size_bytes: Option<f64>) -> String {
    let size = size_bytes.map_or("nothing written".to_owned(), bytes);
    format!(
        "forecast: {} events, about {} if the cores are free, {size} (from the first {})",
        grouped(events),
        time(forecast.seconds),
        grouped(forecast.events_sampled),
    )
}

/// What a run that a signal stopped leaves behind.
pub(super) fn stop_message(summary: &RunSummary) -> String {
    let Some(path) = &summary.output else {
        let made = grouped(summary.events);
        return format!("stopped by a signal after {made} events; none were to be written");
    };
    format!(
        "stopped by a signal: {} of {} events are safe in {path}; the file is marked incomplete and can be read as it is, continuing it is for a later version",
        grouped(summary.events_committed),
        grouped(summary.events_requested),
    )
}

fn write_run(summary: &RunSummary, out: &mut Formatter) -> Result {
    let threads = if summary.threads == 1 {
        "thread"
    } else {
        "threads"
    };
    writeln!(
        out,
        "\n{} events in {} ({} a second on {} {threads})\n",
        grouped(summary.events),
        time(summary.wall_time_s),
        grouped(summary.events_per_s as u64),
        summary.threads,
    )?;
    let (Some(path), Some(size)) = (&summary.output, summary.output_bytes) else {
        return writeln!(out, "  file       none, the events were discarded");
    };
    let share = summary.output_bytes_per_final_parton;
    let share = share.map_or(String::new(), |share| {
        format!(", {share:.1} bytes a final parton")
    });
    writeln!(out, "  file       {path}, {}{share}", bytes(size as f64))
}

fn write_partons(summary: &RunSummary, out: &mut Formatter) -> Result {
    writeln!(
        out,
        "  partons    {} final in {} rows",
        grouped(summary.final_partons),
        grouped(summary.rows)
    )?;
    let finals = with_error(
        summary.final_partons_per_event,
        summary.final_partons_per_event_standard_error,
    );
    let branchings = summary
        .branchings_per_event
        .map(|mean| format!("{mean:.3}"));
    writeln!(
        out,
        "  an event   {finals} final partons, {} branchings",
        or_dash(branchings),
    )
}

fn write_weights(weights: &WeightSummary, out: &mut Formatter) -> Result {
    writeln!(
        out,
        "  weights    mean {}, mean square {}",
        with_error(weights.mean, weights.mean_standard_error),
        or_dash(weights.mean_squared.map(|mean| format!("{mean:.4}"))),
    )?;
    writeln!(
        out,
        "             as good as {} events of equal weight ({})\n",
        grouped(weights.effective_events.round() as u64),
        or_dash(weights.effective_share.map(percent)),
    )
}

fn write_channels(channels: &[ChannelSummary], out: &mut Formatter) -> Result {
    let names = channels.iter().map(|channel| channel.name.len());
    let width = names.max().unwrap_or(0).max(NAME_WIDTH);
    let mut line = |[name, trials, accepted, share, overshoots, cut, outside]: [&str; 7]| {
        writeln!(
            out,
            "  {name:width$} {trials:>13} {accepted:>13} {share:>8} {overshoots:>10} {cut:>12} {outside:>15}"
        )
    };
    line(TITLES)?;
    for channel in channels {
        line([
            &channel.name,
            &grouped(channel.trials),
            &grouped(channel.accepted),
            &or_dash(channel.acceptance.map(percent)),
            &grouped(channel.overshoots),
            &or_dash(channel.share_cut_by_angle_limit.map(percent)),
            &or_dash(channel.share_outside_regime.map(percent)),
        ])?;
    }
    writeln!(out)
}

fn write_medium(medium: &MediumSummary, out: &mut Formatter) -> Result {
    writeln!(
        out,
        "  medium     met by {} partons; {} were below the minimum energy",
        grouped(medium.partons_in_medium),
        grouped(medium.partons_below_min_energy),
    )?;
    writeln!(
        out,
        "             {} of the paths left the field where it was hot",
        or_dash(medium.share_of_paths_left_hot.map(percent)),
    )
}
