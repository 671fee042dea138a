//! `spindrift show`: a readable summary of an event file, or one event as a tree.

use std::path::PathBuf;
use std::process::ExitCode;

use super::words::{print_data, say};
use crate::files::event_file::EventFile;
use crate::report::{SampleSummary, event_tree};

/// A readable summary of an event file; with `--event`, one event's branching history as a tree.
#[derive(Clone, Debug, clap::Args)]
pub struct ShowArgs {
    /// The event file.
    #[arg(value_name = "FILE")]
    pub file: PathBuf,
    /// Number of the event to print, as in `/events/id`.
    #[arg(long, value_name = "N", allow_negative_numbers = true)]
    pub event: Option<i64>,
}

/// Prints the summary or the event.
///
/// # Errors
/// Where the file cannot be read, or holds no such event.
pub fn run(args: &ShowArgs) -> anyhow::Result<ExitCode> {
    let file = EventFile::open(&args.file)?;
    match args.event {
        None => show_sample(&file)?,
        Some(id) => show_event(&file, id)?,
    }
    Ok(ExitCode::SUCCESS)
}

fn show_sample(file: &EventFile) -> anyhow::Result<()> {
    let summary = SampleSummary::of(file)?;
    print_data(&summary.to_string())?;
    for warning in summary.warnings() {
        say(&format!("warning: {warning}"));
    }
    Ok(())
}

fn show_event(file: &EventFile, id: i64) -> anyhow::Result<()> {
    let Some(block) = file.event(id)? else {
        let provenance = file.provenance();
        anyhow::bail!(
            "{} holds no event {id}; it holds {} events of {} to {}",
            file.path().display(),
            file.event_count(),
            provenance.first_id,
            provenance.last_id
        );
    };
    for (event, rows, exits) in block.iter_with_exits() {
        print_data(&event_tree(event, rows, exits, &file.provenance().effects))?;
    }
    Ok(())
}
