//! The program: parses the command line, runs the verb, ends with its exit code.

use std::panic::catch_unwind;
use std::process::ExitCode;

use clap::Parser;
use spindrift::cli::{Cli, EXIT_DEFECT, exit_code, say};

fn main() -> ExitCode {
    let verb = Cli::parse().verb;
    match catch_unwind(|| verb.run()) {
        Ok(Ok(code)) => code,
        Ok(Err(error)) => {
            say(&format!("{error:#}"));
            ExitCode::from(exit_code(&error))
        }
        Err(_) => {
            say("this is a defect in spindrift; please report it with the lines above");
            ExitCode::from(EXIT_DEFECT)
        }
    }
}
