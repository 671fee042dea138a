//! What can go wrong with an event file.

use std::path::PathBuf;

/// Why an event file cannot be written or read.
#[derive(Debug, thiserror::Error)]
pub enum EventFileError {
    /// The output is there already.
    #[error("{} exists already; give another --out, or --overwrite to replace it", path.display())]
    Exists {
        /// The file.
        path: PathBuf,
    },
    /// Another process writes the same output.
    #[error("{} is being written by another process; wait for it or give another --out", path.display())]
    Locked {
        /// The file.
        path: PathBuf,
    },
    /// The output cannot be created.
    #[error("cannot create {}: {reason}", path.display())]
    Create {
        /// The file.
        path: PathBuf,
        /// What the system or HDF5 says.
        reason: String,
    },
    /// Writing failed; what was committed before is intact.
    #[error("cannot write {what} of {}: {reason}; the events committed before are intact", path.display())]
    Write {
        /// The file.
        path: PathBuf,
        /// The part that failed.
        what: String,
        /// What the system or HDF5 says.
        reason: String,
    },
    /// The file cannot be opened or is no HDF5 file.
    #[error("cannot open {} as HDF5: {reason}", path.display())]
    Open {
        /// The file.
        path: PathBuf,
        /// What the system or HDF5 says.
        reason: String,
    },
    /// An HDF5 file of another kind or version.
    #[error("{} is not an event file that this program reads: {reason}", path.display())]
    Foreign {
        /// The file.
        path: PathBuf,
        /// What is missing or different.
        reason: String,
    },
    /// An event file whose parts do not fit together, or cannot be read back.
    #[error("{} is damaged: {place}: {reason}", path.display())]
    Damaged {
        /// The file.
        path: PathBuf,
        /// Attribute or dataset.
        place: String,
        /// What is wrong with it.
        reason: String,
    },
}

impl EventFileError {
    /// True where the machine failed (exit code 4) rather than the request (exit code 2).
    pub fn is_machine_failure(&self) -> bool {
        matches!(self, EventFileError::Write { .. })
    }
}
