//! `spindrift schema`: the JSON Schema of a config, for editors.

use super::words::print_data;

/// Prints the schema on stdout.
///
/// # Errors
/// What the operating system says when stdout cannot be written.
pub fn run() -> anyhow::Result<()> {
    print_data(&format!("{:#}\n", crate::config::schema()))
}
