//! Reading an event file: provenance, then blocks of events of bounded size.

use std::path::{Path, PathBuf};

use super::error::EventFileError;
use super::layout::Table;
use super::provenance::{Provenance, WeightSums};
use super::read_attributes::{SampleState, read_provenance};
use super::read_columns::{EventRows, TableReader};
use crate::event::{EventBlock, EventSummary};
use crate::files::hdf5_calls::{expect_regular, open_to_read};

/// Events whose columns are read at once.
const EVENTS_AT_ONCE: usize = 1024;
/// Parton rows at which a block is full.
const BLOCK_ROWS: usize = 1 << 16;
/// More rows than any event has: the file must be damaged.
const LARGEST_EVENT_ROWS: i64 = 1 << 22;

/// An event file opened for reading.
///
/// A file that is not complete (still being written, or its run was killed) reads as the events that were committed.
#[derive(Debug)]
pub struct EventFile {
    path: PathBuf,
    provenance: Provenance,
    state: SampleState,
    events: TableReader,
    partons: TableReader,
}

impl EventFile {
    /// Opens a file and checks that everything is there, of the right type and shape, and as long as it says.
    ///
    /// # Errors
    /// [`EventFileError::Open`], [`EventFileError::Foreign`] for another kind of file or a later version,
    /// [`EventFileError::Damaged`] where parts are missing or do not fit.
    pub fn open(path: &Path) -> Result<EventFile, EventFileError> {
        let unusable = |reason| EventFileError::Open {
            path: path.to_owned(),
            reason,
        };
        expect_regular(path).map_err(unusable)?;
        let file = open_to_read(path).map_err(unusable)?;
        let (provenance, state) = read_provenance(path, &file)?;
        let open = |table, rows| TableReader::open(path, &file, table, provenance.columns(), rows);
        let events = open(Table::Events, state.events_committed)?;
        let partons = open(Table::Partons, state.partons_committed)?;
        Ok(EventFile {
            path: path.to_owned(),
            provenance,
            state,
            events,
            partons,
        })
    }

    /// Where the file is.
    pub fn path(&self) -> &Path {
        &self.path
    }

    /// What the file says about the run.
    pub fn provenance(&self) -> &Provenance {
        &self.provenance
    }

    /// True when the run came to its end.
    pub fn is_complete(&self) -> bool {
        self.state.complete
    }

    /// Number of events that can be read.
    pub fn event_count(&self) -> usize {
        self.state.events_committed
    }

    /// Number of parton rows that can be read.
    pub fn parton_count(&self) -> usize {
        self.state.partons_committed
    }

    /// The sums of weights that a complete file states.
    pub fn stated_sums(&self) -> WeightSums {
        self.state.sums
    }

    /// Names and values of the run's counters.
    pub fn counters(&self) -> &[(String, u64)] {
        &self.state.counters
    }

    /// Number of stored rows of every column of a table; in a complete file they all equal the count.
    pub fn extents(&self, table: Table) -> Vec<(&'static str, usize)> {
        match table {
            Table::Events => self.events.extents(),
            Table::Partons => self.partons.extents(),
        }
    }

    /// The events in order, in blocks of bounded size. After an error the iterator ends.
    pub fn blocks(&self) -> Blocks<'_> {
        Blocks {
            file: self,
            next_event: 0,
            next_row: 0,
            batch: EventRows::default(),
            taken: 0,
            failed: false,
        }
    }

    /// The summaries of all events in order, without their rows, some at a time.
    pub fn summaries(
        &self,
    ) -> impl Iterator<Item = Result<Vec<EventSummary>, EventFileError>> + '_ {
        (0..self.event_count())
            .step_by(EVENTS_AT_ONCE)
            .map(|first| {
                let mut batch = EventRows::default();
                let count = EVENTS_AT_ONCE.min(self.event_count() - first);
                self.events.read_events(first, count, &mut batch)?;
                Ok(batch.events)
            })
    }

    /// The one event of number `id`, `None` where the file does not hold it.
    ///
    /// # Errors
    /// [`EventFileError::Damaged`] where the rows before it or its own cannot be read.
    pub fn event(&self, id: i64) -> Result<Option<EventBlock>, EventFileError> {
        let mut batch = EventRows::default();
        let mut first = 0;
        while first < self.event_count() {
            let count = EVENTS_AT_ONCE.min(self.event_count() - first);
            self.events.read_events(first, count, &mut batch)?;
            if let Some(place) = batch.events.iter().position(|event| event.id == id) {
                let event = batch.events[place];
                let start = batch.partons_start[place];
                let rows = self.checked_rows(id, start, i64::from(event.partons_count))?;
                let mut block = EventBlock::default();
                block.events.push(event);
                self.partons.read_rows(rows.start, rows.len(), &mut block)?;
                return Ok(Some(block));
            }
            first += count;
        }
        Ok(None)
    }

    /// The rows of an event, if they can be those of an event of this file.
    fn checked_rows(
        &self,
        id: i64,
        start: i64,
        count: i64,
    ) -> Result<std::ops::Range<usize>, EventFileError> {
        let rows = self.parton_count() as i64;
        if (0..=LARGEST_EVENT_ROWS).contains(&count) && start >= 0 && start <= rows - count {
            return Ok(start as usize..(start + count) as usize);
        }
        Err(self.damaged(
            "/events/partons_start and partons_count",
            format!("event {id} has {count} rows from {start} on, in a table of {rows} rows"),
        ))
    }

    fn damaged(&self, place: &str, reason: String) -> EventFileError {
        EventFileError::Damaged {
            path: self.path.clone(),
            place: place.to_owned(),
            reason,
        }
    }
}

/// Iterator over the blocks of an event file.
#[derive(Debug)]
pub struct Blocks<'a> {
    file: &'a EventFile,
    next_event: usize,
    next_row: usize,
    batch: EventRows,
    taken: usize,
    failed: bool,
}

impl Blocks<'_> {
    fn next_block(&mut self) -> Result<Option<EventBlock>, EventFileError> {
        if self.taken == self.batch.events.len() && !self.read_batch()? {
            return Ok(None);
        }
        let mut block = EventBlock::default();
        let first_row = self.next_row;
        while self.taken < self.batch.events.len() && self.next_row - first_row < BLOCK_ROWS {
            let event = self.batch.events[self.taken];
            let start = self.batch.partons_start[self.taken];
            let count = i64::from(event.partons_count);
            let rows = self.file.checked_rows(event.id, start, count)?;
            if rows.start != self.next_row {
                return Err(self.file.damaged(
                    "/events/partons_start",
                    format!(
                        "event {} starts at row {start}, the events before it end at {}",
                        event.id, self.next_row
                    ),
                ));
            }
            self.next_row = rows.end;
            self.taken += 1;
            block.events.push(event);
        }
        self.file
            .partons
            .read_rows(first_row, self.next_row - first_row, &mut block)?;
        Ok(Some(block))
    }

    fn read_batch(&mut self) -> Result<bool, EventFileError> {
        let left = self.file.event_count() - self.next_event;
        if left == 0 {
            return Ok(false);
        }
        let count = left.min(EVENTS_AT_ONCE);
        self.file
            .events
            .read_events(self.next_event, count, &mut self.batch)?;
        self.next_event += count;
        self.taken = 0;
        Ok(true)
    }
}

impl Iterator for Blocks<'_> {
    type Item = Result<EventBlock, EventFileError>;

    fn next(&mut self) -> Option<Self::Item> {
        if self.failed {
            return None;
        }
        let block = self.next_block().transpose();
        self.failed = matches!(block, Some(Err(_)));
        block
    }
}
