//! Row groups: which rows of which blocks make one chunk of every column of a table.

use std::ops::Range;
use std::sync::Arc;

use super::layout::Table;
use crate::event::EventBlock;

/// The rows of one chunk, as ranges over shared blocks; holding it copies nothing.
#[derive(Clone, Debug)]
pub struct RowGroup {
    /// The table.
    pub table: Table,
    /// Place of the chunk in the table, counted from 0.
    pub index: u64,
    /// Blocks with the rows taken from each, in order.
    pub segments: Vec<(Arc<EventBlock>, Range<usize>)>,
    /// Number of rows; a whole chunk but in the last group.
    pub rows: usize,
    /// For events: the first row of the group's first event in the partons table.
    pub first_parton_row: i64,
}

/// Cuts a sequence of blocks into row groups.
#[derive(Debug)]
pub struct RowGrouper {
    events: Open,
    partons: Open,
    parton_rows: i64,
}

/// The group that is being filled.
#[derive(Debug)]
struct Open {
    table: Table,
    next_index: u64,
    segments: Vec<(Arc<EventBlock>, Range<usize>)>,
    rows: usize,
    first_parton_row: i64,
}

impl Open {
    fn new(table: Table) -> Self {
        Open {
            table,
            next_index: 0,
            segments: Vec::new(),
            rows: 0,
            first_parton_row: 0,
        }
    }

    fn room(&self) -> usize {
        self.table.chunk_rows() - self.rows
    }

    fn append(&mut self, block: &Arc<EventBlock>, rows: Range<usize>) {
        if !rows.is_empty() {
            self.rows += rows.len();
            self.segments.push((Arc::clone(block), rows));
        }
    }

    fn close(&mut self) -> RowGroup {
        let group = RowGroup {
            table: self.table,
            index: self.next_index,
            segments: std::mem::take(&mut self.segments),
            rows: self.rows,
            first_parton_row: self.first_parton_row,
        };
        self.next_index += 1;
        self.rows = 0;
        group
    }
}

impl Default for RowGrouper {
    fn default() -> Self {
        RowGrouper {
            events: Open::new(Table::Events),
            partons: Open::new(Table::Partons),
            parton_rows: 0,
        }
    }
}

impl RowGrouper {
    /// Takes the next block and hands every group that it fills to `filled`.
    pub fn push(&mut self, block: &Arc<EventBlock>, mut filled: impl FnMut(RowGroup)) {
        self.push_events(block, &mut filled);
        let mut taken = 0;
        while taken < block.partons.len() {
            let end = block.partons.len().min(taken + self.partons.room());
            self.partons.append(block, taken..end);
            taken = end;
            if self.partons.room() == 0 {
                filled(self.partons.close());
            }
        }
    }

    fn push_events(&mut self, block: &Arc<EventBlock>, filled: &mut impl FnMut(RowGroup)) {
        let mut taken = 0;
        while taken < block.events.len() {
            if self.events.rows == 0 {
                self.events.first_parton_row = self.parton_rows;
            }
            let end = block.events.len().min(taken + self.events.room());
            let counts = block.events[taken..end].iter();
            self.parton_rows += counts
                .map(|event| i64::from(event.partons_count))
                .sum::<i64>();
            self.events.append(block, taken..end);
            taken = end;
            if self.events.room() == 0 {
                filled(self.events.close());
            }
        }
    }

    /// The partly filled groups that are left at the end of a sample.
    pub fn finish(mut self) -> Vec<RowGroup> {
        [&mut self.events, &mut self.partons]
            .into_iter()
            .filter(|open| open.rows > 0)
            .map(Open::close)
            .collect()
    }
}
