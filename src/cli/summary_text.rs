//! The closing summary as a person reads it.

use std::fmt;

use super::summary::{Channel, MediumCounts, Summary};
use super::words::{bytes, grouped, or_dash, percent, time};

/// Width of the names of channels, at least.
const NAME_WIDTH: usize = 20;

impl fmt::Display for Summary {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        self.write_run(out)?;
        self.write_partons(out)?;
        self.write_weights(out)?;
        self.write_channels(out)?;
        if let Some(medium) = &self.medium {
            medium.write(out)?;
        }
        write!(out, "  caution    {}", self.caution)
    }
}

impl Summary {
    /// What a run that a signal stopped leaves behind.
    pub(super) fn stop_message(&self) -> String {
        let Some(path) = &self.output else {
            return format!("stopped by a signal after {} events", grouped(self.events));
        };
        format!(
            "stopped by a signal: {} of {} events are safe in {}, which is marked incomplete; it can be read as it is, but continuing it is for a later version",
            grouped(self.events_committed),
            grouped(self.events_requested),
            path.display()
        )
    }

    fn write_run(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        writeln!(
            out,
            "\n{} events in {}: {} events/s on {} {}",
            grouped(self.events),
            time(self.wall_time_s),
            grouped(self.events_per_s as u64),
            self.threads,
            if self.threads == 1 {
                "thread"
            } else {
                "threads"
            },
        )?;
        match (&self.output, self.output_bytes) {
            (Some(path), Some(size)) => writeln!(
                out,
                "  file       {}, {}, {} bytes a final parton",
                path.display(),
                bytes(size as f64),
                or_dash(
                    self.output_bytes_per_final_parton
                        .map(|size| format!("{size:.1}"))
                ),
            ),
            _ => writeln!(out, "  file       none: the events were discarded"),
        }
    }

    fn write_partons(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        writeln!(
            out,
            "  partons    {} final, {} rows",
            grouped(self.final_partons),
            grouped(self.rows)
        )?;
        let decimals = |value: f64| format!("{value:.4}");
        writeln!(
            out,
            "  per event  {} +- {} final partons, {} branchings",
            or_dash(self.final_partons_per_event.map(decimals)),
            or_dash(self.final_partons_per_event_standard_error.map(decimals)),
            or_dash(self.branchings_per_event.map(decimals)),
        )
    }

    fn write_weights(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        let weights = &self.weights;
        let decimals = |value: f64| format!("{value:.6}");
        writeln!(
            out,
            "  weights    mean {} +- {}, mean square {}, as good as {} equal events ({})",
            or_dash(weights.mean.map(decimals)),
            or_dash(weights.mean_standard_error.map(decimals)),
            or_dash(weights.mean_squared.map(decimals)),
            grouped(weights.effective_events.round() as u64),
            or_dash(weights.effective_share.map(percent)),
        )
    }

    fn write_channels(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        let names = self.channels.iter().map(|channel| channel.name.len());
        let width = names.max().unwrap_or(0).max(NAME_WIDTH);
        writeln!(
            out,
            "\n  {:width$} {:>15} {:>15} {:>9} {:>11} {:>13}",
            "channel", "trials", "accepted", "share", "overshoots", "cut by angle"
        )?;
        for channel in &self.channels {
            channel.write(width, out)?;
        }
        writeln!(out)
    }
}

impl Channel {
    fn write(&self, width: usize, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        writeln!(
            out,
            "  {:width$} {:>15} {:>15} {:>9} {:>11} {:>13}",
            self.name,
            grouped(self.trials),
            grouped(self.accepted),
            or_dash(self.acceptance.map(percent)),
            grouped(self.overshoots),
            or_dash(self.share_cut_by_angle_limit.map(percent)),
        )
    }
}

impl MediumCounts {
    fn write(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        writeln!(
            out,
            "  medium     {} partons met it, {} were below the minimum energy; {} of the paths left the field hot",
            grouped(self.partons_in_medium),
            grouped(self.partons_below_min_energy),
            or_dash(self.share_of_paths_left_hot.map(percent)),
        )
    }
}
