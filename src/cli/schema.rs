//! `spindrift schema`: the JSON Schema of a config, for editors.

use std::io::{self, Write};

/// Prints the schema on stdout.
///
/// # Errors
/// What the operating system says when stdout cannot be written.
pub fn run() -> io::Result<()> {
    let mut stdout = io::stdout().lock();
    serde_json::to_writer_pretty(&mut stdout, &crate::config::schema())?;
    writeln!(stdout)?;
    stdout.flush()
}
