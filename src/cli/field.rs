//! `spindrift field check`: what a temperature field holds and whether it can be used.

use std::path::PathBuf;
use std::process::ExitCode;

use super::later;
use super::words::{print_data, say};
use crate::files::field_file::read_field;
use crate::report::FieldSummary;

/// Temperature fields: look at one.
#[derive(Clone, Debug, clap::Args)]
pub struct FieldArgs {
    /// What to do.
    #[command(subcommand)]
    pub command: FieldCommand,
}

/// What can be done with a temperature field.
#[derive(Clone, Debug, clap::Subcommand)]
pub enum FieldCommand {
    /// Says what a temperature field holds and whether it can be used: axes, units, ranges, largest temperature and
    /// flow, centre, second-order event plane, temperature at every edge, estimated interpolation error.
    Check {
        /// The field, HDF5 or netCDF-4.
        #[arg(value_name = "FILE")]
        file: PathBuf,
        /// Draws the field (in a later version).
        #[arg(long, value_name = "FILE.svg")]
        picture: Option<PathBuf>,
    },
    /// Writes a field from an analytic flow (in a later version).
    Make {
        /// The flow.
        #[arg(value_name = "CONFIG")]
        config: PathBuf,
        /// The field file to write.
        #[arg(long, value_name = "FILE")]
        out: PathBuf,
    },
}

/// Checks a field and prints what it holds.
///
/// # Errors
/// [`FieldFileError`](crate::files::field_file::FieldFileError) where the field cannot be used.
pub fn run(args: &FieldArgs) -> anyhow::Result<ExitCode> {
    match &args.command {
        FieldCommand::Make { .. } => later("field make"),
        FieldCommand::Check {
            picture: Some(_), ..
        } => later("field check --picture"),
        FieldCommand::Check {
            file,
            picture: None,
        } => {
            let data = read_field(file)?;
            let summary = FieldSummary::of(&data);
            print_data(&format!("{} can be used\n{summary}", file.display()))?;
            for warning in &data.warnings {
                say(&format!("warning: {warning}"));
            }
            Ok(ExitCode::SUCCESS)
        }
    }
}
