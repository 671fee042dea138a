//! `spindrift field`: looks at temperature fields, and makes them.

use std::path::{Path, PathBuf};
use std::process::ExitCode;

use anyhow::{Context, bail};

use super::field_make::{self, MakeArgs};
use super::output::is_same;
use super::words::{print_data, say};
use crate::files::field_file::read_field;
use crate::medium::field::FieldData;
use crate::report::{FieldSummary, field_picture};

/// Temperature fields: look at one, or make one.
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
    /// flow, centre, second-order event plane, temperature at every edge, estimated interpolation error
    Check(CheckArgs),
    /// Writes a field from an analytic flow, with temperature and flow, in the format that runs read
    Make(MakeArgs),
}

/// Which field to look at.
#[derive(Clone, Debug, clap::Args)]
pub struct CheckArgs {
    /// The field, HDF5 or netCDF-4
    #[arg(value_name = "FILE")]
    file: PathBuf,
    /// Draws the field: temperature and flow at six times, the path of a jet
    #[arg(long, value_name = "FILE.svg")]
    picture: Option<PathBuf>,
    /// Replaces an existing picture
    #[arg(long, requires = "picture")]
    overwrite: bool,
}

/// Does it.
///
/// # Errors
/// [`FieldFileError`](crate::files::field_file::FieldFileError) where the field cannot be used, and what stops the writing
/// of a picture or a field.
pub fn run(args: &FieldArgs) -> anyhow::Result<ExitCode> {
    match &args.command {
        FieldCommand::Make(args) => field_make::run(args),
        FieldCommand::Check(args) => check(args),
    }
}

fn check(args: &CheckArgs) -> anyhow::Result<ExitCode> {
    if let Some(picture) = &args.picture
        && picture.symlink_metadata().is_ok()
        && !args.overwrite
    {
        bail!(
            "{} exists; give another name, or --overwrite",
            picture.display()
        );
    }
    if let Some(picture) = args
        .picture
        .as_deref()
        .filter(|picture| is_same(&args.file, picture))
    {
        bail!(
            "{} is the field itself; give another name",
            picture.display()
        );
    }
    let data = read_field(&args.file)?;
    let summary = FieldSummary::of(&data);
    print_data(&format!("{} can be used\n{summary}", args.file.display()))?;
    for warning in &data.warnings {
        say(&format!("warning: {warning}"));
    }
    if let Some(picture) = &args.picture {
        draw(&args.file, picture, &data, &summary)?;
    }
    Ok(ExitCode::SUCCESS)
}

fn draw(
    file: &Path,
    picture: &Path,
    data: &FieldData,
    summary: &FieldSummary,
) -> anyhow::Result<()> {
    let name = file.file_name().unwrap_or_default().to_string_lossy();
    let Some(svg) = field_picture(data, summary, &name) else {
        bail!("the field is nowhere hot: there is nothing to draw");
    };
    std::fs::write(picture, svg).with_context(|| format!("cannot write {}", picture.display()))?;
    say(&format!("drawn in {}", picture.display()));
    Ok(())
}
