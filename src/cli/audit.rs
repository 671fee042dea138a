//! `spindrift audit`: reads whole event files back and checks everything in them.

use std::path::PathBuf;
use std::process::ExitCode;

use super::EXIT_BAD_REQUEST;
use super::words::print_data;
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
/// Standard output cannot be written; what is wrong with a file is printed.
pub fn run(args: &AuditArgs) -> anyhow::Result<ExitCode> {
    let mut sound = true;
    for path in &args.files {
        match audit(path) {
            Ok(report) => {
                sound &= report.is_clean();
                print_data(&report_text(&report))?;
            }
            Err(error) => {
                sound = false;
                print_data(&format!("FAILED {error}\n"))?;
            }
        }
    }
    Ok(if sound {
        ExitCode::SUCCESS
    } else {
        ExitCode::from(EXIT_BAD_REQUEST)
    })
}

fn report_text(report: &AuditReport) -> String {
    let path = report.path.display();
    let (events, partons) = (report.events, report.partons);
    let state = if report.complete {
        String::new()
    } else {
        format!(", incomplete: {events} of {} events", report.events_due)
    };
    let mut text = if report.is_clean() {
        format!("OK {path}: {events} events, {partons} rows{state}\n")
    } else {
        format!(
            "FAILED {path}: {} problems in {events} events, {partons} rows{state}\n",
            report.findings_total
        )
    };
    for finding in &report.findings {
        text += &format!("  {finding}\n");
    }
    if let Some(digest) = &report.digest {
        text += &format!("  content {digest}\n");
    }
    text
}
