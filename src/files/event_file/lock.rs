//! The lock that keeps two processes from writing one output.

use std::fs::{File, OpenOptions, TryLockError};
use std::os::unix::fs::MetadataExt;
use std::path::{Path, PathBuf};

use super::error::EventFileError;

/// An exclusive lock on an output file, held through a small file beside it.
///
/// The event file cannot carry the lock itself: HDF5 locks it through a descriptor of its own, and the two would
/// exclude each other. The system drops the lock when the process ends, however it ends; a left-over lock file
/// locks nobody out.
#[derive(Debug)]
pub(super) struct OutputLock {
    path: PathBuf,
    _file: File,
}

impl OutputLock {
    /// Locks `output`.
    pub(super) fn acquire(output: &Path) -> Result<Self, EventFileError> {
        let path = lock_path(output);
        let failed = |reason: std::io::Error| EventFileError::Create {
            path: output.to_owned(),
            reason: reason.to_string(),
        };
        loop {
            let file = OpenOptions::new()
                .create(true)
                .truncate(false)
                .write(true)
                .open(&path)
                .map_err(failed)?;
            match file.try_lock() {
                Ok(()) if is_same_file(&file, &path) => {
                    return Ok(OutputLock { path, _file: file });
                }
                // its last owner removed it between our opening and locking it
                Ok(()) => continue,
                Err(TryLockError::WouldBlock) => {
                    return Err(EventFileError::Locked {
                        path: output.to_owned(),
                    });
                }
                // a file system without locks: go on without one, as HDF5 itself does
                Err(TryLockError::Error(error))
                    if error.kind() == std::io::ErrorKind::Unsupported =>
                {
                    return Ok(OutputLock { path, _file: file });
                }
                Err(TryLockError::Error(error)) => return Err(failed(error)),
            }
        }
    }
}

impl Drop for OutputLock {
    fn drop(&mut self) {
        // removed while still locked, so nobody can lock a file that is about to vanish unnoticed; if that fails,
        // the file left over is harmless
        let _ = std::fs::remove_file(&self.path);
    }
}

fn lock_path(output: &Path) -> PathBuf {
    let mut name = std::ffi::OsString::from(".");
    name.push(output.file_name().unwrap_or_default());
    name.push(".lock");
    output.with_file_name(name)
}

fn is_same_file(file: &File, path: &Path) -> bool {
    match (file.metadata(), std::fs::metadata(path)) {
        (Ok(ours), Ok(there)) => ours.ino() == there.ino() && ours.dev() == there.dev(),
        _ => false,
    }
}
