//! What can be wrong with a temperature field file.

use std::path::{Path, PathBuf};

/// Why a temperature field cannot be used: the file and the problem.
#[derive(Debug, thiserror::Error)]
#[error("{}: {problem}", path.display())]
pub struct FieldFileError {
    /// The file.
    pub path: PathBuf,
    /// What is wrong.
    pub problem: Box<FieldProblem>,
}

impl FieldFileError {
    pub(super) fn new(path: &Path, problem: FieldProblem) -> FieldFileError {
        FieldFileError {
            path: path.to_owned(),
            problem: Box::new(problem),
        }
    }
}

/// What is wrong with a temperature field file.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum FieldProblem {
    /// No such file, no permission, truncated.
    #[error("cannot be opened: {0}")]
    Unreadable(String),
    /// The classic netCDF format.
    #[error("is a netCDF-3 file; write it as HDF5: dataset.to_netcdf(path, engine=\"h5netcdf\")")]
    NetCdf3,
    /// Some other format.
    #[error(
        "is not an HDF5 file; write it with xarray: dataset.to_netcdf(path, engine=\"h5netcdf\")"
    )]
    NotHdf5,
    /// A variable that must be there is not.
    #[error("has no variable \"{name}\" (found: {found}); {remedy}")]
    Missing {
        /// Its name.
        name: &'static str,
        /// The variables that are there.
        found: String,
        /// What to do.
        remedy: String,
    },
    /// A variable's dimensions or shape do not fit.
    #[error("variable \"{name}\": {problem}")]
    Shape {
        /// The variable.
        name: String,
        /// What does not fit, and what would.
        problem: String,
    },
    /// Units missing or not understood.
    #[error(
        "variable \"{name}\": units {found}; allowed: {allowed}; set dataset[\"{name}\"].attrs[\"units\"]"
    )]
    Units {
        /// The variable.
        name: String,
        /// What was found.
        found: String,
        /// What is understood.
        allowed: String,
    },
    /// A value outside its range.
    #[error("variable \"{name}\" is {value} at {place}: {problem}")]
    Value {
        /// The variable.
        name: String,
        /// The value, with its unit.
        value: String,
        /// Where on the grid.
        place: String,
        /// The allowed range and the remedy.
        problem: String,
    },
    /// More grid points than the program looks through.
    #[error("declares {points} grid points; at most {limit} are allowed; coarsen or crop the grid")]
    TooManyPoints {
        /// Number of grid points.
        points: u128,
        /// Most that are allowed.
        limit: u128,
    },
    /// More numbers than the program takes into memory.
    #[error(
        "has {points} grid points to keep, which would take {bytes} bytes of memory; at most {limit} are allowed; coarsen or crop the grid"
    )]
    TooLarge {
        /// Number of grid points.
        points: u128,
        /// Memory they would take.
        bytes: u128,
        /// Largest memory allowed.
        limit: u128,
    },
    /// Variables that contradict each other.
    #[error("{0}")]
    Contradiction(String),
}
