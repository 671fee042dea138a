//! The resolved plan of a run: immutable, checked, every quantity in the unit that its name carries.

use std::path::PathBuf;

use crate::medium::MediumSettings;
use crate::qcd::CouplingSettings;
use crate::shower::ShowerSettings;
use crate::source::SourceSettings;

/// Everything that a run needs to know, checked.
#[derive(Clone, Debug)]
pub struct RunPlan {
    /// Number of events of the whole sample.
    pub events: u64,
    /// Seed of all random streams.
    pub seed: u64,
    /// The hard process.
    pub source: SourceSettings,
    /// The strong coupling.
    pub coupling: CouplingSettings,
    /// The shower's choices.
    pub shower: ShowerSettings,
    /// The medium, `None` in vacuum.
    pub medium: Option<MediumSettings>,
    /// What the event file keeps.
    pub record: RecordSettings,
    /// The whole config with every default filled in, as it goes into the event file.
    pub resolved: serde_json::Value,
    /// SHA-256 (hex) of the resolved config without events and paths, with the SHA-256 of every input file in it.
    pub digest: String,
    /// Every input file, in the order of the config.
    pub inputs: Vec<InputFile>,
    /// Things that are allowed but that the user should hear of before the run starts.
    pub warnings: Vec<String>,
}

/// A file that the config names.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct InputFile {
    /// Where it is.
    pub path: PathBuf,
    /// SHA-256 of its bytes, hex.
    pub sha256: String,
}

/// What the event file keeps of each event.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct RecordSettings {
    /// Which rows are kept.
    pub history: History,
    /// Deflate level, 0 (none) to 9, of the bytes that compress.
    pub compression: u8,
    /// Mantissa bits kept in momenta (1 to 52), `None` for lossless.
    pub momentum_bits: Option<u8>,
    /// Whether it is kept where each final parton left the medium, with temperature and flow there.
    pub medium_exit: bool,
}

/// Which rows of an event are kept.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum History {
    /// Hard partons and final partons.
    Final,
    /// Every parton, parents before daughters.
    Full,
}
