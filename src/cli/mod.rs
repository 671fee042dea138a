//! The command line: each verb reads its arguments, calls the library and prints. Data on stdout, words on stderr.

pub mod audit;
pub mod field;
mod field_make;
pub mod generate;
mod output;
mod progress;
pub mod schema;
pub mod show;
mod signals;
mod summary;
mod threads;
mod words;

use std::ffi::OsString;
use std::process::ExitCode;

use crate::run::RunError;

pub use words::say;

/// Exit code of a defect of the program.
pub const EXIT_DEFECT: u8 = 1;
/// Exit code of a request that cannot be served.
pub const EXIT_BAD_REQUEST: u8 = 2;
/// Exit code of a run that a signal stopped, with everything so far safe on disk.
pub const EXIT_STOPPED: u8 = 3;
/// Exit code where the machine failed: disk full, input or output error.
pub const EXIT_MACHINE: u8 = 4;

/// What is said of verbs and options that interface and help name already.
const NOT_BUILT: &str = "is not built yet; it comes with a later version of spindrift";

/// The command line.
#[derive(Debug, clap::Parser)]
#[command(version, about = ABOUT, after_help = EXIT_CODES, arg_required_else_help = true)]
pub struct Cli {
    /// What to do.
    #[command(subcommand)]
    pub verb: Verb,
}

const ABOUT: &str = "\
Turns a hard quark or gluon into a jet of partons, in vacuum or inside a hot
medium: a Monte Carlo parton shower ordered in virtuality, for jets in heavy-ion
collisions. The medium is a temperature field, yours on a grid or an analytic
one; it changes the branching probabilities along each parton's path. Events go
to an HDF5 file that says how it was made; the same config and seed give the
same events on any number of threads. Parton level, leading logarithm: no
hadronization, no underlying event.";

const EXIT_CODES: &str = "\
Exit codes:
  0  done
  1  a defect of the program
  2  the request cannot be served (arguments, config, input); nothing written
  3  stopped early by a signal; what is committed is safe
  4  the machine failed (disk full, I/O error); what was committed is intact";

/// The verbs.
#[derive(Debug, clap::Subcommand)]
pub enum Verb {
    /// Showers events as a config says and streams them to an event file
    Generate(generate::GenerateArgs),
    /// Prints a readable summary of an event file, or one event as a tree
    Show(show::ShowArgs),
    /// Reads whole event files back and checks everything in them
    Audit(audit::AuditArgs),
    /// Looks at a temperature field, or makes one
    Field(field::FieldArgs),
    /// Prints the JSON Schema of a config, for editors
    Schema,
    /// Makes one event file of shards (in a later version)
    #[command(disable_help_flag = true)]
    Join(LaterArgs),
    /// Compares jets of samples with a reference (in a later version)
    #[command(disable_help_flag = true)]
    Contrast(LaterArgs),
    /// Hands events to other programs (in a later version)
    #[command(disable_help_flag = true)]
    Export(LaterArgs),
}

/// Whatever is given to a verb of a later version.
#[derive(Clone, Debug, clap::Args)]
pub struct LaterArgs {
    #[arg(hide = true, trailing_var_arg = true, allow_hyphen_values = true)]
    _anything: Vec<OsString>,
}

impl Verb {
    /// Does it.
    ///
    /// # Errors
    /// What stopped it; [`exit_code`] says how the process ends.
    pub fn run(&self) -> anyhow::Result<ExitCode> {
        if !matches!(self, Verb::Generate(_)) {
            signals::end_with_the_reader()?;
        }
        match self {
            Verb::Generate(args) => generate::run(args),
            Verb::Show(args) => show::run(args),
            Verb::Audit(args) => audit::run(args),
            Verb::Field(args) => field::run(args),
            Verb::Schema => schema::run().map(|()| ExitCode::SUCCESS),
            Verb::Join(_) => later("join"),
            Verb::Contrast(_) => later("contrast"),
            Verb::Export(_) => later("export"),
        }
    }
}

/// Refuses what is not built yet.
fn later(what: &str) -> anyhow::Result<ExitCode> {
    anyhow::bail!("{what} {NOT_BUILT}")
}

/// The exit code of an error.
pub fn exit_code(error: &anyhow::Error) -> u8 {
    match error.downcast_ref::<RunError>() {
        Some(RunError::Defect(_)) => EXIT_DEFECT,
        Some(RunError::Output(_) | RunError::Field(_)) => EXIT_MACHINE,
        Some(RunError::TooLarge(_)) => EXIT_BAD_REQUEST,
        None if error.is::<std::io::Error>() => EXIT_MACHINE,
        None => EXIT_BAD_REQUEST,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::files::event_file::EventFileError;
    use crate::run::EventError;
    use crate::run::fields::{FieldReadError, LostField};

    #[test]
    fn the_command_line_is_well_formed() {
        <Cli as clap::CommandFactory>::command().debug_assert();
    }

    #[test]
    fn exit_codes_tell_who_failed() {
        let path = || "x.h5".into();
        let full = EventFileError::Write {
            path: path(),
            what: "partons".into(),
            reason: "no space left".into(),
        };
        let lost = LostField::Unusable {
            index: 3,
            problem: std::sync::Arc::from(FieldReadError::from("gone")),
        };
        let cases: [(anyhow::Error, u8); 7] = [
            (
                RunError::from(EventError::from(lost.clone())).into(),
                EXIT_MACHINE,
            ),
            // before the start
            (EventError::from(lost).into(), EXIT_BAD_REQUEST),
            (RunError::Defect("a panic".into()).into(), EXIT_DEFECT),
            (RunError::Output(full).into(), EXIT_MACHINE),
            (
                EventFileError::Exists { path: path() }.into(),
                EXIT_BAD_REQUEST,
            ),
            (anyhow::anyhow!("not built yet"), EXIT_BAD_REQUEST),
            (
                anyhow::Error::from(std::io::Error::other("gone")).context("cannot print"),
                EXIT_MACHINE,
            ),
        ];
        for (error, code) in cases {
            assert_eq!(exit_code(&error), code, "{error:#}");
        }
    }
}
