//! Why a plan cannot be carried out.

use std::path::PathBuf;

use thiserror::Error;

use super::origins::BirthError;
use crate::files::field_file::FieldFileError;
use crate::qcd::CouplingError;

/// Why a plan cannot be carried out.
#[derive(Debug, Error)]
pub enum AssembleError {
    /// The temperature field cannot be used.
    #[error(transparent)]
    Field(#[from] FieldFileError),
    /// The coupling cannot be had.
    #[error(transparent)]
    Coupling(#[from] CouplingError),
    /// There is no distribution of birth places.
    #[error(transparent)]
    Births(#[from] BirthError),
    /// There is no distribution of birth places in a field of a file.
    #[error("{}: {problem}", path.display())]
    BirthsIn {
        /// The file.
        path: PathBuf,
        /// Why.
        problem: BirthError,
    },
    /// An input file is no longer what it was when the run began.
    #[error("{} was changed after the run began; the events so far have its former content", path.display())]
    Changed {
        /// The file.
        path: PathBuf,
    },
}
