//! Where a sample comes from: what the attributes of an event file say about the run.

use super::layout::ColumnSet;
use crate::config::{History, RecordSettings};

/// Everything about a run that is known before its first event.
#[derive(Clone, Debug, PartialEq)]
pub struct Provenance {
    /// Version of the program.
    pub program_version: String,
    /// Commit that the program was built from.
    pub commit: String,
    /// The command line as typed.
    pub command_line: String,
    /// Name of the machine.
    pub host: String,
    /// Time of creation, ISO 8601 in UTC.
    pub created: String,
    /// The whole resolved config, JSON.
    pub config: String,
    /// SHA-256 (hex) of the resolved config without events, shard, output and paths.
    pub config_digest: String,
    /// Seed of all random streams.
    pub seed: u64,
    /// Smallest event number of this file.
    pub first_id: i64,
    /// Largest event number of this file; one less than `first_id` for a file without events.
    pub last_id: i64,
    /// Whether rows carry settled four-momenta.
    pub kinematics: Kinematics,
    /// Colour lines left open by a source without recoiler: 0, 1 (quark) or 2 (gluon).
    pub open_colour_lines: i32,
    /// Cross section of the hard process, `None` where the source has none.
    pub cross_section: Option<CrossSection>,
    /// Which rows are kept.
    pub history: History,
    /// Deflate level, 0 (none) to 9.
    pub compression: u8,
    /// Mantissa bits kept in momenta, `None` for all.
    pub momentum_bits: Option<u8>,
    /// Whether rows carry the exits of final partons from the medium.
    pub medium_exit: bool,
    /// Names of the effects, in config order: the channels from 2 on.
    pub effects: Vec<String>,
    /// The temperature fields that `/events/field` counts.
    pub fields: Vec<FieldEntry>,
    /// Names of the run's counters, which become attributes when the file is complete.
    pub counters: Vec<String>,
}

impl Provenance {
    /// What the file keeps of each event.
    pub fn record(&self) -> RecordSettings {
        RecordSettings {
            history: self.history,
            compression: self.compression,
            momentum_bits: self.momentum_bits,
            medium_exit: self.medium_exit,
        }
    }

    /// Which columns the file has.
    pub fn columns(&self) -> ColumnSet {
        columns_of(&self.record())
    }
}

/// Which columns a file with such a record has.
pub(super) fn columns_of(record: &RecordSettings) -> ColumnSet {
    ColumnSet {
        medium_exit: record.medium_exit,
    }
}

/// What the momenta of the rows are.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kinematics {
    /// Settled four-momenta, conserved at every vertex.
    Exact,
    /// Collinear fractions of the hard parton's momentum, light-like.
    Collinear,
}

impl Kinematics {
    /// The `kinematics` attribute.
    pub const fn name(self) -> &'static str {
        match self {
            Kinematics::Exact => "exact",
            Kinematics::Collinear => "collinear",
        }
    }

    /// The value of a `kinematics` attribute.
    pub fn from_name(name: &str) -> Option<Self> {
        [Kinematics::Exact, Kinematics::Collinear]
            .into_iter()
            .find(|kinematics| kinematics.name() == name)
    }
}

/// Cross section of the hard process with its unit.
#[derive(Clone, Debug, PartialEq)]
pub struct CrossSection {
    /// The number.
    pub value: f64,
    /// Its unit, such as `mb` or `pb`.
    pub unit: String,
}

/// One temperature field of a run.
#[derive(Clone, Debug, PartialEq)]
pub struct FieldEntry {
    /// Name: the file's name without folders, or the kind of an analytic field.
    pub name: String,
    /// SHA-256 (hex) of the file, empty for an analytic field.
    pub sha256: String,
    /// Weight of the field in the sample.
    pub weight: f64,
}

/// Running sums over events, added in ascending event number.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct WeightSums {
    /// Sum of the hard process's weights.
    pub source_weights: f64,
    /// Sum of the nominal weights.
    pub weights: f64,
    /// Sum of the squares of the nominal weights.
    pub squared_weights: f64,
}

impl WeightSums {
    /// Adds one event.
    pub fn add(&mut self, source_weight: f64, weight: f64) {
        self.source_weights += source_weight;
        self.weights += weight;
        self.squared_weights += weight * weight;
    }

    /// Effective number of events, (sum w)^2 / sum w^2 (Kish 1965); 0 without events.
    pub fn effective_events(&self) -> f64 {
        if self.squared_weights > 0.0 {
            self.weights * self.weights / self.squared_weights
        } else {
            0.0
        }
    }
}

/// The `history` attribute.
pub(super) const fn history_name(history: History) -> &'static str {
    match history {
        History::Final => "final",
        History::Full => "full",
    }
}

/// The value of a `history` attribute.
pub(super) fn history_from_name(name: &str) -> Option<History> {
    [History::Final, History::Full]
        .into_iter()
        .find(|history| history_name(*history) == name)
}
