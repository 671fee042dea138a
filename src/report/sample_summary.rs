//! What an event file holds, in a few lines.

use std::fmt;

use super::numbers::significant;
use crate::config::History;
use crate::files::event_file::{
    EventFile, EventFileError, FieldEntry, Kinematics, Provenance, WeightSums,
};

/// Significant digits of means.
const DIGITS: i32 = 5;
/// Fields that are listed one by one.
const MOST_FIELDS_SHOWN: usize = 12;
/// An effective sample below this share of the events deserves a warning.
const POOR_EFFECTIVE_SHARE: f64 = 0.1;

/// The summary of one event file, from its attributes and event columns.
#[derive(Clone, Debug, PartialEq)]
pub struct SampleSummary {
    /// The file's name.
    pub file: String,
    /// What the file says about its run.
    pub provenance: Provenance,
    /// False for a run that has not come to its end.
    pub complete: bool,
    /// Events that can be read.
    pub events: u64,
    /// Rows that can be read.
    pub partons: u64,
    /// Fewest and most rows of an event; `None` without events.
    pub rows_per_event: Option<(i32, i32)>,
    /// Sums over the events that can be read.
    pub sums: WeightSums,
    /// Smallest and largest weight; `None` without events.
    pub weights: Option<(f64, f64)>,
    /// The run's counters, written when it ended.
    pub counters: Vec<(String, u64)>,
}

impl SampleSummary {
    /// Reads the event columns of a file.
    ///
    /// # Errors
    /// [`EventFileError::Damaged`] where they cannot be read.
    pub fn of(file: &EventFile) -> Result<Self, EventFileError> {
        let mut summary = SampleSummary {
            file: file.path().display().to_string(),
            provenance: file.provenance().clone(),
            complete: file.is_complete(),
            events: file.event_count() as u64,
            partons: file.parton_count() as u64,
            rows_per_event: None,
            sums: WeightSums::default(),
            weights: None,
            counters: file.counters().to_vec(),
        };
        for batch in file.summaries() {
            for event in batch? {
                summary.sums.add(event.source_weight, event.weight);
                let (rows, weight) = (event.partons_count, event.weight);
                let (least, most) = summary.rows_per_event.unwrap_or((rows, rows));
                summary.rows_per_event = Some((least.min(rows), most.max(rows)));
                let (least, most) = summary.weights.unwrap_or((weight, weight));
                summary.weights = Some((least.min(weight), most.max(weight)));
            }
        }
        Ok(summary)
    }

    /// What deserves attention.
    pub fn warnings(&self) -> Vec<String> {
        let mut warnings = Vec::new();
        if !self.complete {
            warnings.push(format!(
                "the sample is incomplete: {} of {} events are committed",
                self.events,
                self.events_due()
            ));
        }
        let effective = self.sums.effective_events();
        if self.events > 0 && effective < POOR_EFFECTIVE_SHARE * self.events as f64 {
            warnings.push(format!(
                "few events carry most of the weight: {} events count as {}",
                self.events,
                significant(effective, DIGITS)
            ));
        }
        warnings
    }

    fn events_due(&self) -> i64 {
        let (first, last) = (self.provenance.first_id, self.provenance.last_id);
        last.saturating_sub(first).saturating_add(1)
    }

    fn write_events(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        let (first, last) = (self.provenance.first_id, self.provenance.last_id);
        writeln!(
            out,
            "events        {} (numbers {first} to {last})",
            self.events
        )?;
        let Some((least, most)) = self.rows_per_event else {
            return Ok(());
        };
        let mean = self.partons as f64 / self.events as f64;
        writeln!(
            out,
            "rows          {}: {} an event, from {least} to {most}",
            self.partons,
            significant(mean, DIGITS)
        )
    }

    fn write_weights(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Some((least, most)) = self.weights else {
            return Ok(());
        };
        let events = self.events as f64;
        let effective = self.sums.effective_events();
        writeln!(
            out,
            "weights       sum {}, mean {}, from {} to {}",
            significant(self.sums.weights, DIGITS),
            significant(self.sums.weights / events, DIGITS),
            significant(least, DIGITS),
            significant(most, DIGITS)
        )?;
        writeln!(
            out,
            "              the sample counts as {} unweighted events ({} %)",
            significant(effective, DIGITS),
            significant(100.0 * effective / events, 3)
        )
    }

    fn write_record(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        let provenance = &self.provenance;
        let history = match provenance.history {
            History::Final => "hard and final partons",
            History::Full => "every parton",
        };
        let kinematics = match provenance.kinematics {
            Kinematics::Exact => "exact four-momenta",
            Kinematics::Collinear => "collinear fractions only",
        };
        let momenta = match provenance.momentum_bits {
            None => "lossless".to_owned(),
            Some(bits) => format!("momenta rounded to {bits} mantissa bits"),
        };
        let exits = match provenance.medium_exit {
            true => "; where final partons left the medium",
            false => "",
        };
        writeln!(
            out,
            "record        {history}; {kinematics}; {momenta}{exits}"
        )?;
        if provenance.open_colour_lines > 0 {
            writeln!(
                out,
                "              colour lines left open by the source: {}",
                provenance.open_colour_lines
            )?;
        }
        match &provenance.cross_section {
            None => writeln!(out, "cross section none: weights are per hard event"),
            Some(cross_section) => writeln!(
                out,
                "cross section {} {}",
                significant(cross_section.value, DIGITS),
                cross_section.unit
            ),
        }
    }
}

/// The first few of many.
fn write_fields(fields: &[FieldEntry], out: &mut fmt::Formatter<'_>) -> fmt::Result {
    for (index, field) in fields.iter().enumerate().take(MOST_FIELDS_SHOWN) {
        let sha256 = match field.sha256.as_str() {
            "" => "none: analytic",
            sha256 => sha256,
        };
        write!(out, "field {index:<7} {} (SHA-256 {sha256})", field.name)?;
        if field.weight != 1.0 {
            write!(out, ", weight {}", significant(field.weight, DIGITS))?;
        }
        writeln!(out)?;
    }
    if fields.len() > MOST_FIELDS_SHOWN {
        let more = fields.len() - MOST_FIELDS_SHOWN;
        writeln!(out, "              and {more} more fields, see /fields")?;
    }
    Ok(())
}

impl fmt::Display for SampleSummary {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        let provenance = &self.provenance;
        writeln!(out, "{}", self.file)?;
        writeln!(
            out,
            "made by       spindrift {} (commit {}) on {}, {}",
            provenance.program_version, provenance.commit, provenance.host, provenance.created
        )?;
        writeln!(out, "command       {}", provenance.command_line)?;
        writeln!(
            out,
            "config        digest {}, seed {}",
            provenance.config_digest, provenance.seed
        )?;
        self.write_events(out)?;
        self.write_weights(out)?;
        self.write_record(out)?;
        write_fields(&provenance.fields, out)?;
        for (index, effect) in provenance.effects.iter().enumerate() {
            writeln!(out, "channel {:<5} {effect}", index + 2)?;
        }
        for (name, count) in &self.counters {
            writeln!(out, "counter       {name} {count}")?;
        }
        Ok(())
    }
}
