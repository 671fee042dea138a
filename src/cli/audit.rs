//! `spindrift audit`: reads whole event files back and checks everything in them.

use std::path::PathBuf;
use std::process::ExitCode;

use super::EXIT_BAD_REQUEST;
use crate::files::event_file::{AuditReport, audit};

/// Reads whole event files back: four-momentum and colour conserved, checksums, counts, ids, provenance; prints a
/// digest of the content.
///
/// Exit code 0 when every file is sound (an incomplete one up to its last commit), 2 when one is not or cannot be
/// read; the first offenders are printed.
#[derive(Clone, Debug, clap::Args)]
pub struct AuditArgs {
    /// The event files.
    #[arg(required = true, value_name = "FILE")]
    pub files: Vec<PathBuf>,
}

/// Audits every file, even after one has failed.
///
/// # Errors
/// None at present: what is wrong with a file is printed.
pub fn run(args: &AuditArgs) -> anyhow::Result<ExitCode> {
    let mut sound = true;
    for path in &args.files {
        match audit(path) {
            Ok(report) => {
                sound &= report.is_clean();
                print_report(&report);
            }
            Err(error) => {
                sound = false;
                println!("FAILED {error}");
            }
        }
    }
    Ok(if sound {
        ExitCode::SUCCESS
    } else {
        ExitCode::from(EXIT_BAD_REQUEST)
    })
}

fn print_report(report: &AuditReport) {
    let path = report.path.display();
    let (events, partons) = (report.events, report.partons);
    let state = if report.complete {
        String::new()
    } else {
        format!(", incomplete: {events} of {} events", report.events_due)
    };
    if report.is_clean() {
        println!("OK {path}: {events} events, {partons} rows{state}");
    } else {
        println!(
            "FAILED {path}: {} problems in {events} events, {partons} rows{state}",
            report.findings_total
        );
        for finding in &report.findings {
            println!("  {finding}");
        }
    }
    if let Some(digest) = &report.digest {
        println!("  content {digest}");
    }
}
