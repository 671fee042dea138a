//! The driver on several threads: workers make blocks and pack row groups, the calling thread puts both in order.

use std::collections::{BTreeMap, VecDeque};
use std::ops::Range;
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::{Arc, Condvar, Mutex, MutexGuard, PoisonError};
use std::time::Duration;

use crossbeam_channel::{Receiver, RecvTimeoutError, Sender, unbounded};

use super::block::{block_count, block_ids, event_count, fill, settle};
use super::{
    EventError, EventGenerator, FinalPartons, Progress, RunCounters, RunError, RunTotals, Sink,
    close, keep, panic_message,
};
use crate::config::RecordSettings;
use crate::event::EventBlock;
use crate::files::event_file::{EventFileWriter, PackedGroup, Packer, RowGroup, RowGrouper, Table};

/// Fewest blocks under way for each worker: one in work, one finished early.
const FEWEST_BLOCKS_PER_WORKER: u64 = 2;
/// Most blocks under way for each worker: enough to work on while the calling thread writes a row group.
const MOST_BLOCKS_PER_WORKER: u64 = 32;
/// Rows under way for each worker, which bounds memory where events are large.
const ROWS_PER_WORKER: u64 = 1 << 16;
/// Row groups between grouping and writing, besides one for every two workers.
const ROW_GROUPS: usize = 4;
/// How often a stop is looked for while no worker reports.
const STOP_POLL: Duration = Duration::from_millis(50);

pub(super) fn run<G: EventGenerator>(
    generator: &G,
    ids: Range<i64>,
    threads: usize,
    mut sink: Sink,
    progress: &dyn Progress,
    stop: &AtomicBool,
) -> Result<RunTotals<G::Counters>, RunError> {
    let (reports, inbox) = unbounded();
    let board = Board::new(&ids, threads);
    let record = match &sink {
        Sink::Discard => None,
        Sink::File(writer) => Some(writer.record()),
    };
    let mut totals: RunTotals<G::Counters> = RunTotals::default();
    let made = std::thread::scope(|scope| {
        let workers: Vec<_> = (0..threads)
            .map(|_| {
                let reports = reports.clone();
                let (board, ids) = (&board, &ids);
                scope.spawn(move || work(generator, board, ids, record.as_ref(), &reports))
            })
            .collect();
        drop(reports);
        // however this thread leaves the scope, the workers are sent home
        let closing = CloseOnDrop(&board);
        let mut coordinator = Coordinator {
            ids: &ids,
            board: &board,
            writer: match &mut sink {
                Sink::Discard => None,
                Sink::File(writer) => Some(writer),
            },
            grouper: RowGrouper::default(),
            early_blocks: BTreeMap::new(),
            early_groups: [BTreeMap::new(), BTreeMap::new()],
            next_group: [0, 0],
            groups_open: 0,
            blocks_settled: 0,
            totals: &mut totals,
        };
        coordinator.coordinate(&inbox, progress, stop)?;
        drop(closing);
        for worker in workers {
            let counters = worker
                .join()
                .map_err(|panic| RunError::Defect(panic_message(panic)))?;
            if let Some(counters) = counters {
                totals.counters.merge(&counters);
            }
        }
        Ok::<_, RunError>(())
    });
    if let Err(error) = made {
        return Err(keep(sink, error));
    }
    totals.completed = totals.events == event_count(&ids);
    close(sink, &mut totals)?;
    Ok(totals)
}

/// What there is to do, seen by all threads.
struct Board {
    state: Mutex<BoardState>,
    changed: Condvar,
    blocks: u64,
    threads: u64,
    group_window: usize,
    spare_blocks: Mutex<Vec<EventBlock>>,
    spare_groups: Mutex<Vec<PackedGroup>>,
}

#[derive(Default)]
struct BoardState {
    to_pack: VecDeque<RowGroup>,
    next_block: u64,
    blocks_settled: u64,
    rows_settled: u64,
    groups_open: usize,
    no_more_blocks: bool,
    closed: bool,
}

enum Task {
    Make(u64),
    Pack(RowGroup),
}

enum Report {
    Made(u64, EventBlock, FinalPartons),
    Packed(PackedGroup),
    Failed(EventError),
    Panicked(String),
}

impl Board {
    fn new(ids: &Range<i64>, threads: usize) -> Self {
        Board {
            state: Mutex::default(),
            changed: Condvar::new(),
            blocks: block_count(ids),
            threads: threads as u64,
            group_window: ROW_GROUPS + threads / 2,
            spare_blocks: Mutex::default(),
            spare_groups: Mutex::default(),
        }
    }

    /// A panic never happens while the state is half changed, so a poisoned lock is still good.
    fn state(&self) -> MutexGuard<'_, BoardState> {
        self.state.lock().unwrap_or_else(PoisonError::into_inner)
    }

    fn change(&self, change: impl FnOnce(&mut BoardState)) {
        change(&mut self.state());
        self.changed.notify_all();
    }

    /// Waits for the next task, packing before making; `None` when the run is over.
    fn next_task(&self) -> Option<Task> {
        let mut state = self.state();
        loop {
            if state.closed {
                return None;
            }
            if let Some(group) = state.to_pack.pop_front() {
                return Some(Task::Pack(group));
            }
            if !state.no_more_blocks
                && state.next_block < self.blocks
                && state.next_block - state.blocks_settled < self.block_window(&state)
                && state.groups_open < self.group_window
            {
                state.next_block += 1;
                return Some(Task::Make(state.next_block - 1));
            }
            state = self
                .changed
                .wait(state)
                .unwrap_or_else(PoisonError::into_inner);
        }
    }

    /// How many blocks may be under way, judged by the size of those settled so far.
    fn block_window(&self, state: &BoardState) -> u64 {
        let rows_per_block = state.rows_settled / state.blocks_settled.max(1);
        let per_worker = ROWS_PER_WORKER / rows_per_block.max(1);
        let per_worker = match state.blocks_settled {
            0 => FEWEST_BLOCKS_PER_WORKER,
            _ => per_worker.clamp(FEWEST_BLOCKS_PER_WORKER, MOST_BLOCKS_PER_WORKER),
        };
        self.threads * per_worker
    }

    fn reclaim(&self, block: Arc<EventBlock>) {
        if let Some(mut block) = Arc::into_inner(block) {
            block.clear();
            give(&self.spare_blocks, block);
        }
    }
}

fn give<T>(pool: &Mutex<Vec<T>>, item: T) {
    pool.lock()
        .unwrap_or_else(PoisonError::into_inner)
        .push(item);
}

fn take<T: Default>(pool: &Mutex<Vec<T>>) -> T {
    let spare = pool.lock().unwrap_or_else(PoisonError::into_inner).pop();
    spare.unwrap_or_default()
}

struct CloseOnDrop<'a>(&'a Board);

impl Drop for CloseOnDrop<'_> {
    fn drop(&mut self) {
        self.0.change(|state| state.closed = true);
    }
}

/// One worker's life; returns what it counted, nothing after a panic.
fn work<G: EventGenerator>(
    generator: &G,
    board: &Board,
    ids: &Range<i64>,
    record: Option<&RecordSettings>,
    reports: &Sender<Report>,
) -> Option<G::Counters> {
    let outcome = catch_unwind(AssertUnwindSafe(|| {
        let mut worker = generator.worker();
        let mut packer = record.map(Packer::new);
        while let Some(task) = board.next_task() {
            let report = match task {
                Task::Make(index) => {
                    let mut block: EventBlock = take(&board.spare_blocks);
                    match fill(generator, &mut worker, block_ids(ids, index), &mut block) {
                        Ok(finals) => Report::Made(index, block, finals),
                        Err(error) => Report::Failed(error),
                    }
                }
                Task::Pack(group) => {
                    let mut packed: PackedGroup = take(&board.spare_groups);
                    let packer = packer.as_mut().expect("nothing is packed without a file");
                    packer.pack(&group, &mut packed);
                    for (block, _) in group.segments {
                        board.reclaim(block);
                    }
                    Report::Packed(packed)
                }
            };
            if reports.send(report).is_err() {
                break;
            }
        }
        generator.counters(&worker)
    }));
    match outcome {
        Ok(counters) => Some(counters),
        Err(panic) => {
            // the coordinator may be gone already, and then nobody needs to hear
            let _ = reports.send(Report::Panicked(panic_message(panic)));
            None
        }
    }
}

/// The calling thread's side: settles blocks and writes row groups in order.
struct Coordinator<'a, C> {
    ids: &'a Range<i64>,
    board: &'a Board,
    writer: Option<&'a mut EventFileWriter>,
    grouper: RowGrouper,
    early_blocks: BTreeMap<u64, (EventBlock, FinalPartons)>,
    early_groups: [BTreeMap<u64, PackedGroup>; 2],
    next_group: [u64; 2],
    groups_open: usize,
    blocks_settled: u64,
    totals: &'a mut RunTotals<C>,
}

impl<C> Coordinator<'_, C> {
    fn coordinate(
        &mut self,
        inbox: &Receiver<Report>,
        progress: &dyn Progress,
        stop: &AtomicBool,
    ) -> Result<(), RunError> {
        while !self.all_blocks_settled() {
            if stop.load(Ordering::Relaxed) {
                self.board.change(|state| state.no_more_blocks = true);
            }
            self.take_report(inbox)?;
            progress.events_done(self.totals.events, event_count(self.ids));
        }
        if self.blocks_settled == self.board.blocks {
            let last = std::mem::take(&mut self.grouper).finish();
            self.hand_out(last);
        }
        while self.groups_open > 0 {
            self.take_report(inbox)?;
        }
        Ok(())
    }

    fn all_blocks_settled(&self) -> bool {
        let state = self.board.state();
        let made = if state.no_more_blocks {
            state.next_block
        } else {
            self.board.blocks
        };
        self.blocks_settled == made
    }

    fn take_report(&mut self, inbox: &Receiver<Report>) -> Result<(), RunError> {
        match inbox.recv_timeout(STOP_POLL) {
            Ok(Report::Made(index, block, finals)) => {
                self.early_blocks.insert(index, (block, finals));
                self.settle_blocks()
            }
            Ok(Report::Packed(group)) => {
                let slot = slot(group.table().expect("a packed group has a table"));
                self.early_groups[slot].insert(group.index, group);
                self.write_groups(slot)
            }
            Ok(Report::Failed(error)) => Err(error.into()),
            Ok(Report::Panicked(message)) => Err(RunError::Defect(message)),
            Err(RecvTimeoutError::Timeout) => Ok(()),
            Err(RecvTimeoutError::Disconnected) => {
                Err(RunError::Defect("all workers left before the end".into()))
            }
        }
    }

    fn settle_blocks(&mut self) -> Result<(), RunError> {
        while let Some((block, finals)) = self.early_blocks.remove(&self.blocks_settled) {
            settle(
                &block,
                &finals,
                block_ids(self.ids, self.blocks_settled),
                self.totals,
            )?;
            let block = Arc::new(block);
            let mut filled = Vec::new();
            if self.writer.is_some() {
                self.grouper.push(&block, |group| filled.push(group));
            }
            self.board.reclaim(block);
            self.blocks_settled += 1;
            self.hand_out(filled);
        }
        Ok(())
    }

    fn hand_out(&mut self, groups: Vec<RowGroup>) {
        self.groups_open += groups.len();
        let (settled, open) = (self.blocks_settled, self.groups_open);
        let rows = self.totals.partons;
        self.board.change(|state| {
            state.blocks_settled = settled;
            state.rows_settled = rows;
            state.groups_open = open;
            state.to_pack.extend(groups);
        });
    }

    fn write_groups(&mut self, slot: usize) -> Result<(), RunError> {
        while let Some(group) = self.early_groups[slot].remove(&self.next_group[slot]) {
            self.totals.packed_bytes += group.packed_bytes() as u64;
            if let Some(writer) = &mut self.writer {
                writer.write(&group)?;
            }
            give(&self.board.spare_groups, group);
            self.next_group[slot] += 1;
            self.groups_open -= 1;
            let open = self.groups_open;
            self.board.change(|state| state.groups_open = open);
        }
        Ok(())
    }
}

fn slot(table: Table) -> usize {
    match table {
        Table::Events => 0,
        Table::Partons => 1,
    }
}
