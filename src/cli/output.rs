//! Where a run writes, and what must not stand there.

use std::ffi::OsString;
use std::os::unix::fs::MetadataExt;
use std::path::{Path, PathBuf};

use anyhow::bail;

use crate::config::RunPlan;
use crate::files::event_file::EventFileError;

/// The output that a config has by default: its stem with `.h5`, in the working directory.
pub(super) fn default_for(config: &Path) -> PathBuf {
    let mut name = OsString::from(config.file_stem().unwrap_or_default());
    name.push(".h5");
    PathBuf::from(name)
}

/// Looks before any work is done whether the output can be made.
///
/// # Errors
/// Its folder is none, it exists and must not be replaced, or it is one of the run's own inputs.
pub(super) fn check(
    output: &Path,
    overwrite: bool,
    config: &Path,
    plan: &RunPlan,
) -> anyhow::Result<()> {
    let path = || output.to_owned();
    if output.symlink_metadata().is_ok() {
        if !overwrite {
            return Err(EventFileError::Exists { path: path() }.into());
        }
        if output.is_dir() {
            bail!(
                "{} is a folder; give the name of a file with --out",
                output.display()
            );
        }
        let mut inputs = plan
            .inputs
            .iter()
            .map(|input| input.path.as_path())
            .chain([config]);
        if let Some(input) = inputs.find(|input| is_same(input, output)) {
            bail!(
                "{} is an input of this run ({}); give another --out",
                output.display(),
                input.display()
            );
        }
    }
    let folder = match output.parent() {
        Some(parent) if !parent.as_os_str().is_empty() => parent,
        _ => Path::new("."),
    };
    if !folder.is_dir() {
        let reason = format!(
            "there is no folder {}; make it, or give another --out",
            folder.display()
        );
        return Err(EventFileError::Create {
            path: path(),
            reason,
        }
        .into());
    }
    Ok(())
}

pub(super) fn is_same(one: &Path, other: &Path) -> bool {
    // Device and inode see through links of both kinds.
    match (one.metadata(), other.metadata()) {
        (Ok(one), Ok(other)) => (one.dev(), one.ino()) == (other.dev(), other.ino()),
        _ => false,
    }
}
