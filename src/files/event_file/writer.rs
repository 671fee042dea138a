//! Writing an event file: whole chunks in order, committed every few seconds, readable at any moment.

use std::collections::VecDeque;
use std::mem::ManuallyDrop;
use std::os::unix::fs::MetadataExt;
use std::path::{Path, PathBuf};
use std::time::{Duration, Instant};

use hdf5::File;

use super::create::{TableDatasets, create_content, create_file};
use super::error::EventFileError;
use super::layout::Table;
use super::lock::OutputLock;
use super::pack::PackedGroup;
use super::provenance::{Provenance, WeightSums, columns_of};
use crate::config::RecordSettings;
use crate::files::hdf5_calls::{reason, write_chunk};

/// The longest time between two commits while rows arrive.
const COMMIT_INTERVAL: Duration = Duration::from_secs(5);

/// How to treat what stands at the output's path.
#[derive(Clone, Copy, Debug, Default)]
pub struct WriteOptions {
    /// Replace an existing file instead of refusing.
    pub overwrite: bool,
}

/// An event file under construction; one thread owns it.
///
/// Until [`finish`](Self::finish) the file says `complete` = 0 and how many events and rows are committed; readers
/// clip to these. After an error nothing more is written, not even on drop, so the last commit stays as it was.
#[derive(Debug)]
pub struct EventFileWriter {
    path: PathBuf,
    // dropped by hand: after a failed write, closing would flush half of what HDF5 holds in memory
    handles: ManuallyDrop<Handles>,
    /// Device and inode of the file made at `path`.
    identity: Option<(u64, u64)>,
    failed: bool,
    record: RecordSettings,
    events: Progress,
    partons: Progress,
    /// One past the last parton row of each event that is written but not committed.
    parton_row_ends: VecDeque<i64>,
    committed_events: i64,
    committed_partons: i64,
    last_commit: Instant,
    _lock: OutputLock,
}

#[derive(Debug)]
struct Handles {
    file: File,
    events: TableDatasets,
    partons: TableDatasets,
}

/// How far one table is written.
#[derive(Debug, Default)]
struct Progress {
    next_index: u64,
    rows: usize,
}

impl EventFileWriter {
    /// Creates the file with everything but rows in it, and locks it against other processes.
    ///
    /// # Errors
    /// [`EventFileError::Exists`], [`EventFileError::Locked`], or [`EventFileError::Create`] where the path cannot
    /// be written.
    pub fn create(
        path: &Path,
        provenance: &Provenance,
        options: WriteOptions,
    ) -> Result<Self, EventFileError> {
        let lock = OutputLock::acquire(path)?;
        if !options.overwrite && path.symlink_metadata().is_ok() {
            return Err(EventFileError::Exists {
                path: path.to_owned(),
            });
        }
        let failed = |error: hdf5::Error| EventFileError::Create {
            path: path.to_owned(),
            reason: reason(&error),
        };
        let file = create_file(path).map_err(failed)?;
        let (events, partons) = create_content(&file, provenance).map_err(failed)?;
        file.flush().map_err(failed)?;
        Ok(EventFileWriter {
            path: path.to_owned(),
            handles: ManuallyDrop::new(Handles {
                file,
                events,
                partons,
            }),
            identity: identity(path),
            failed: false,
            record: provenance.record(),
            events: Progress::default(),
            partons: Progress::default(),
            parton_row_ends: VecDeque::new(),
            committed_events: 0,
            committed_partons: 0,
            last_commit: Instant::now(),
            _lock: lock,
        })
    }

    /// Whether the path still leads to the file that is being written.
    fn expect_in_place(&self) -> Result<(), EventFileError> {
        if identity(&self.path) == self.identity {
            return Ok(());
        }
        Err(EventFileError::Write {
            path: self.path.clone(),
            what: "the file".to_owned(),
            reason: "it was removed or replaced during the run; what was written is lost"
                .to_owned(),
        })
    }

    /// Where the file is.
    pub fn path(&self) -> &Path {
        &self.path
    }

    /// What the file keeps, for the packers of its rows.
    pub fn record(&self) -> RecordSettings {
        self.record
    }

    /// Events committed so far.
    pub fn committed_events(&self) -> i64 {
        self.committed_events
    }

    /// Appends the chunks of the next row group of a table, and commits if the last commit is some seconds back.
    ///
    /// A group with fewer rows than a chunk must be the last of its table.
    ///
    /// # Errors
    /// [`EventFileError::Write`]; the writer is of no use afterwards.
    pub fn write(&mut self, group: &PackedGroup) -> Result<(), EventFileError> {
        let table = group.table().expect("a packed group has a table");
        let progress = match table {
            Table::Events => &mut self.events,
            Table::Partons => &mut self.partons,
        };
        assert_eq!(group.index, progress.next_index, "row groups in order");
        let start = progress.rows;
        assert_eq!(
            start % table.chunk_rows(),
            0,
            "only the last group is short"
        );
        progress.next_index += 1;
        progress.rows += group.rows;
        self.parton_row_ends.extend(&group.parton_row_ends);
        let outcome = self.append(table, start, group);
        self.checked(table.group(), outcome)?;
        if self.last_commit.elapsed() >= COMMIT_INTERVAL {
            self.commit()?;
        }
        Ok(())
    }

    fn append(&self, table: Table, start: usize, group: &PackedGroup) -> hdf5::Result<()> {
        let datasets = self.datasets(table);
        let end = start + group.rows;
        for ((column, dataset), chunk) in columns_of(&self.record)
            .columns(table)
            .iter()
            .zip(&datasets.columns)
            .zip(group.chunks())
        {
            if column.width == 1 {
                dataset.resize(end)?;
                write_chunk(dataset, &[start as u64], chunk)?;
            } else {
                dataset.resize((end, column.width))?;
                write_chunk(dataset, &[start as u64, 0], chunk)?;
            }
        }
        datasets.scale.resize(end)
    }

    /// Makes everything written so far safe against the end of the process.
    ///
    /// # Errors
    /// [`EventFileError::Write`]; the writer is of no use afterwards.
    pub fn commit(&mut self) -> Result<(), EventFileError> {
        self.expect_in_place()?;
        let outcome = self.commit_rows();
        self.checked("a commit", outcome)?;
        self.last_commit = Instant::now();
        Ok(())
    }

    fn commit_rows(&mut self) -> hdf5::Result<()> {
        let rows_written = self.partons.rows as i64;
        while let Some(end) = self
            .parton_row_ends
            .front()
            .filter(|end| **end <= rows_written)
        {
            self.committed_partons = *end;
            self.committed_events += 1;
            self.parton_row_ends.pop_front();
        }
        let file = &self.handles.file;
        // first the rows, then the counts that vouch for them
        file.flush()?;
        update(file, "events_committed", self.committed_events)?;
        update(file, "partons_committed", self.committed_partons)?;
        file.flush()
    }

    /// Declares the sample complete and closes the file: all row groups, the short last ones too, must be written.
    ///
    /// # Errors
    /// [`EventFileError::Write`]; the file then stays incomplete, with its last commit.
    pub fn finish(
        mut self,
        sums: &WeightSums,
        counters: &[(&str, u64)],
    ) -> Result<(), EventFileError> {
        self.commit()?;
        assert!(self.parton_row_ends.is_empty(), "every event has its rows");
        assert_eq!(self.committed_partons, self.partons.rows as i64);
        let outcome = self.close_sample(sums, counters);
        self.checked("the closing attributes", outcome)
    }

    fn close_sample(&self, sums: &WeightSums, counters: &[(&str, u64)]) -> hdf5::Result<()> {
        let file = &self.handles.file;
        update(file, "sum_of_source_weights", sums.source_weights)?;
        update(file, "sum_of_weights", sums.weights)?;
        update(file, "sum_of_squared_weights", sums.squared_weights)?;
        for (name, value) in counters {
            update(file, name, *value)?;
        }
        file.flush()?;
        update(file, "complete", 1i32)?;
        file.flush()
    }

    fn datasets(&self, table: Table) -> &TableDatasets {
        match table {
            Table::Events => &self.handles.events,
            Table::Partons => &self.handles.partons,
        }
    }

    fn checked(&mut self, what: &str, outcome: hdf5::Result<()>) -> Result<(), EventFileError> {
        outcome.map_err(|error| {
            self.failed = true;
            EventFileError::Write {
                path: self.path.clone(),
                what: what.to_owned(),
                reason: reason(&error),
            }
        })
    }
}

fn identity(path: &Path) -> Option<(u64, u64)> {
    path.metadata().ok().map(|about| (about.dev(), about.ino()))
}

impl Drop for EventFileWriter {
    fn drop(&mut self) {
        if !self.failed {
            // SAFETY: dropped once, here, and not used afterwards.
            unsafe { ManuallyDrop::drop(&mut self.handles) };
        }
    }
}

fn update<T: hdf5::H5Type>(file: &File, name: &str, value: T) -> hdf5::Result<()> {
    file.attr(name)?.write_scalar(&value)
}
