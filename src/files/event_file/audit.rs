//! Auditing a whole event file: can every event be read, and does everything balance?

use std::fmt;
use std::path::{Path, PathBuf};

use super::digest::ContentDigest;
use super::error::EventFileError;
use super::layout::Table;
use super::provenance::{Kinematics, Provenance, WeightSums};
use super::reader::EventFile;
use crate::config::History;
use crate::event::{CheckRules, EventBlock, EventSummary, Imbalance, check_event, check_exits};

/// Offenders that are kept; the rest is only counted.
const KEPT_FINDINGS: usize = 10;
/// Rounding of a sum of weights that was added up in another order.
const SUM_TOLERANCE: f64 = 1e-12;
/// Hexadecimal digits of a SHA-256.
const DIGEST_DIGITS: usize = 64;

/// The result of an audit.
#[derive(Clone, Debug, PartialEq)]
pub struct AuditReport {
    /// The file.
    pub path: PathBuf,
    /// Events read.
    pub events: u64,
    /// Parton rows read.
    pub partons: u64,
    /// False for a file whose run has not come to its end.
    pub complete: bool,
    /// Number of events that the whole file should have.
    pub events_due: u64,
    /// The first things found wrong.
    pub findings: Vec<Finding>,
    /// Number of all things found wrong.
    pub findings_total: u64,
    /// SHA-256 of the content, `None` where not all of it could be read.
    pub digest: Option<String>,
}

impl AuditReport {
    /// True when nothing is wrong.
    pub fn is_clean(&self) -> bool {
        self.findings_total == 0
    }

    fn add(&mut self, finding: Finding) {
        self.findings_total += 1;
        if self.findings.len() < KEPT_FINDINGS {
            self.findings.push(finding);
        }
    }

    fn add_to_file(&mut self, what: impl Into<String>, by: f64) {
        self.add(Finding {
            event: None,
            imbalance: Imbalance {
                row: None,
                what: what.into(),
                by,
            },
        });
    }
}

/// One thing that is wrong.
#[derive(Clone, Debug, PartialEq)]
pub struct Finding {
    /// The event's number, `None` for the file as a whole.
    pub event: Option<i64>,
    /// What is wrong, where in the event, and by how much.
    pub imbalance: Imbalance,
}

impl fmt::Display for Finding {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        if let Some(event) = self.event {
            write!(out, "event {event}")?;
            if let Some(row) = self.imbalance.row {
                write!(out, " row {row}")?;
            }
            write!(out, ": ")?;
        }
        write!(out, "{}", self.imbalance.what)?;
        if self.imbalance.by != 0.0 {
            write!(out, ", by {:e}", self.imbalance.by)?;
        }
        Ok(())
    }
}

/// Reads a whole event file and checks all of it.
///
/// Reading makes HDF5 verify every checksum. A file that is not complete is checked up to its last commit.
///
/// # Errors
/// Only where the file cannot be opened as an event file; what turns out to be damaged later becomes a finding.
pub fn audit(path: &Path) -> Result<AuditReport, EventFileError> {
    let file = EventFile::open(path)?;
    let provenance = file.provenance();
    let due = (provenance.last_id.saturating_sub(provenance.first_id)).saturating_add(1);
    let mut report = AuditReport {
        path: path.to_owned(),
        events: 0,
        partons: 0,
        complete: file.is_complete(),
        events_due: due.max(0).unsigned_abs(),
        findings: Vec::new(),
        findings_total: 0,
        digest: None,
    };
    check_provenance(provenance, &mut report);
    check_extents(&file, &mut report);
    read_all(&file, &mut report);
    Ok(report)
}

fn check_provenance(provenance: &Provenance, report: &mut AuditReport) {
    let digest = &provenance.config_digest;
    let is_digest =
        digest.len() == DIGEST_DIGITS && digest.bytes().all(|byte| byte.is_ascii_hexdigit());
    if !is_digest {
        report.add_to_file(
            format!("attribute config_digest is no SHA-256: \"{digest}\""),
            0.0,
        );
    }
    if serde_json::from_str::<serde::de::IgnoredAny>(&provenance.config).is_err() {
        report.add_to_file("attribute config is no JSON", 0.0);
    }
    for (index, field) in provenance.fields.iter().enumerate() {
        if !(field.weight.is_finite() && field.weight >= 0.0) {
            report.add_to_file(
                format!(
                    "/fields/weight[{index}] is {}, must not be negative",
                    field.weight
                ),
                0.0,
            );
        }
    }
    if provenance.program_version.is_empty() {
        report.add_to_file("attribute program_version is empty", 0.0);
    }
}

fn check_extents(file: &EventFile, report: &mut AuditReport) {
    if !file.is_complete() {
        return;
    }
    for (table, rows) in [
        (Table::Events, file.event_count()),
        (Table::Partons, file.parton_count()),
    ] {
        for (column, extent) in file.extents(table) {
            if extent != rows {
                report.add_to_file(
                    format!(
                        "/{}/{column} holds {extent} rows, the file counts {rows}",
                        table.group()
                    ),
                    extent as f64 - rows as f64,
                );
            }
        }
    }
    if file.event_count() as u64 != report.events_due {
        let what = format!(
            "the file says it is complete with {} events, first_id to last_id are {}",
            file.event_count(),
            report.events_due
        );
        report.add_to_file(what, file.event_count() as f64 - report.events_due as f64);
    }
}

fn read_all(file: &EventFile, report: &mut AuditReport) {
    let rules = rules_of(file.provenance());
    let mut digest = ContentDigest::new(file.provenance().columns());
    let mut sums = WeightSums::default();
    let mut last_id = None;
    for block in file.blocks() {
        let block = match block {
            Ok(block) => block,
            Err(error) => {
                report.add_to_file(error.to_string(), 0.0);
                return;
            }
        };
        digest.add(&block);
        check_block(&block, file.provenance(), &rules, &mut last_id, report);
        for event in &block.events {
            sums.add(event.source_weight, event.weight);
        }
        report.events += block.events.len() as u64;
        report.partons += block.partons.len() as u64;
    }
    if report.partons != file.parton_count() as u64 {
        report.add_to_file(
            format!(
                "the events have {} rows, the file counts {}",
                report.partons,
                file.parton_count()
            ),
            report.partons as f64 - file.parton_count() as f64,
        );
    }
    if file.is_complete() {
        check_sums(&sums, &file.stated_sums(), report);
    }
    report.digest = Some(digest.finish());
}

fn rules_of(provenance: &Provenance) -> CheckRules {
    CheckRules {
        full_history: provenance.history == History::Full,
        exact_kinematics: provenance.kinematics == Kinematics::Exact,
        open_colour_lines: provenance.open_colour_lines,
        momentum_tolerance: CheckRules::tolerance_of_bits(provenance.momentum_bits),
    }
}

fn check_block(
    block: &EventBlock,
    provenance: &Provenance,
    rules: &CheckRules,
    last_id: &mut Option<i64>,
    report: &mut AuditReport,
) {
    for (event, rows, exits) in block.iter_with_exits() {
        let mut found = check_event(rows, rules);
        check_exits(event, rows, exits, rules, &mut found);
        check_summary(event, provenance, *last_id, &mut found);
        *last_id = Some(event.id);
        for imbalance in found {
            report.add(Finding {
                event: Some(event.id),
                imbalance,
            });
        }
    }
}

fn check_summary(
    event: &EventSummary,
    provenance: &Provenance,
    last_id: Option<i64>,
    found: &mut Vec<Imbalance>,
) {
    let mut add = |what: String, by: f64| {
        found.push(Imbalance {
            row: None,
            what,
            by,
        });
    };
    if !(provenance.first_id..=provenance.last_id).contains(&event.id) {
        add(
            format!(
                "its number lies outside first_id {} to last_id {}",
                provenance.first_id, provenance.last_id
            ),
            0.0,
        );
    }
    if last_id.is_some_and(|last| last >= event.id) {
        add("numbers do not ascend".into(), 0.0);
    }
    if !event.source_weight.is_finite() || !event.weight.is_finite() {
        add("a weight is not finite".into(), 0.0);
    }
    if !(event.hard_scale_gev.is_finite() && event.origin_fm.iter().all(|x| x.is_finite())) {
        add("the hard scale or origin is not finite".into(), 0.0);
    }
    let fields = provenance.fields.len() as i64;
    if !(-1..fields).contains(&i64::from(event.field)) {
        add(
            format!("field {} is not in the list of {fields}", event.field),
            0.0,
        );
    }
}

fn check_sums(sums: &WeightSums, stated: &WeightSums, report: &mut AuditReport) {
    for (name, sum, stated) in [
        (
            "sum_of_source_weights",
            sums.source_weights,
            stated.source_weights,
        ),
        ("sum_of_weights", sums.weights, stated.weights),
        (
            "sum_of_squared_weights",
            sums.squared_weights,
            stated.squared_weights,
        ),
    ] {
        let scale = sums.squared_weights.sqrt() + sums.source_weights.abs() + sum.abs();
        let fits = (sum - stated).abs() <= SUM_TOLERANCE * scale || sum == stated;
        if !fits {
            report.add_to_file(
                format!("attribute {name} is {stated}, the events add up to {sum}"),
                stated - sum,
            );
        }
    }
}
