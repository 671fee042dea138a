//! The driver: event numbers in, events out in ascending order, on any number of threads.
//!
//! The content of the output depends on the generator and the event numbers alone: blocks hold a fixed number of
//! events, and everything that is added up over events is added in ascending event number.

pub mod assemble;
pub mod assemble_error;
mod block;
mod clock;
pub mod exits;
pub mod fields;
mod final_partons;
pub mod forecast;
pub mod generator;
mod origins;
mod parallel;
pub mod provenance;
mod serial;
pub mod summary;
mod surroundings;

use std::ops::Range;
use std::sync::atomic::AtomicBool;

use crate::event::EventBlock;
use crate::files::event_file::{EventFileError, EventFileWriter, WeightSums};
use crate::shower::tree::TooManyBranchings;

pub use block::EVENTS_PER_BLOCK;
use fields::LostField;
pub use final_partons::FinalPartons;

/// Makes events from event numbers; shared by all workers.
pub trait EventGenerator: Sync {
    /// What one worker owns: tables, buffers, counters.
    type Worker: Send;
    /// What is counted over a run.
    type Counters: RunCounters;

    /// A fresh worker.
    fn worker(&self) -> Self::Worker;

    /// Appends the one event of number `id` to `out`: its summary, its rows, and their exits from the medium where the
    /// run records them. The event may depend on nothing but the generator and `id`.
    ///
    /// # Errors
    /// [`EventError`] where the event would not end, or an input that it needs is lost.
    fn generate(
        &self,
        worker: &mut Self::Worker,
        id: i64,
        out: &mut EventBlock,
    ) -> Result<(), EventError>;

    /// The worker has come to the end of a block, and may not be asked for the next one soon: it gives up what others
    /// may wait for.
    fn rest(&self, _worker: &mut Self::Worker) {}

    /// What a worker has counted.
    fn counters(&self, worker: &Self::Worker) -> Self::Counters;
}

/// Counts of a run; integers, so that their sum does not depend on how events were shared among workers.
pub trait RunCounters: Default + Send {
    /// Adds another worker's counts.
    fn merge(&mut self, other: &Self);

    /// Name and value of each count, in a fixed order; the names become attributes of the event file.
    fn named(&self) -> Vec<(String, u64)>;
}

impl RunCounters for () {
    fn merge(&mut self, (): &()) {}

    fn named(&self) -> Vec<(String, u64)> {
        Vec::new()
    }
}

/// Hears how far a run has come; called now and then from the thread that called [`run`].
pub trait Progress {
    /// `done` of `total` events are made.
    fn events_done(&self, done: u64, total: u64);
}

impl Progress for () {
    fn events_done(&self, _done: u64, _total: u64) {}
}

/// Where events go.
#[derive(Debug)]
pub enum Sink {
    /// Nowhere: shower only, for timing.
    Discard,
    /// Into an event file.
    File(Box<EventFileWriter>),
}

/// What a run came to.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct RunTotals<C> {
    /// Events made.
    pub events: u64,
    /// Rows made.
    pub partons: u64,
    /// Sums over the events made, added in ascending event number.
    pub sums: WeightSums,
    /// How many final partons the events have.
    pub finals: FinalPartons,
    /// The generator's counts.
    pub counters: C,
    /// Bytes of all chunks written.
    pub packed_bytes: u64,
    /// Events that are safe in the file; of an interrupted run fewer than were made.
    pub committed_events: u64,
    /// False when the run was stopped before its last event.
    pub completed: bool,
}

/// An event that would not end.
#[derive(Clone, Copy, Debug, PartialEq, Eq, thiserror::Error)]
#[error("event {id} {reason}")]
pub struct EventTooLarge {
    /// Its number.
    pub id: i64,
    /// What it passed, and the remedy.
    pub reason: TooManyBranchings,
}

/// Why an event cannot be made.
#[derive(Clone, Debug, thiserror::Error)]
pub enum EventError {
    /// It would not end.
    #[error(transparent)]
    TooLarge(#[from] EventTooLarge),
    /// Its temperature field cannot be had.
    #[error(transparent)]
    Field(#[from] LostField),
}

/// Events that [`probe`] makes.
const PROBED_EVENTS: i64 = 16;

/// Makes the first few events and drops them, so that a config whose events would not end is refused before anything is
/// written.
///
/// # Errors
/// [`EventError`] for the first such event.
pub fn probe<G: EventGenerator>(generator: &G, ids: Range<i64>) -> Result<(), EventError> {
    let mut worker = generator.worker();
    let mut block = EventBlock::default();
    for id in ids.start..ids.end.min(ids.start + PROBED_EVENTS) {
        block.clear();
        generator.generate(&mut worker, id, &mut block)?;
    }
    Ok(())
}

/// Why a run failed.
#[derive(Debug, thiserror::Error)]
pub enum RunError {
    /// The output could not be written; what was committed before is intact.
    #[error(transparent)]
    Output(#[from] EventFileError),
    /// An event would not end; what was committed before is intact.
    #[error(transparent)]
    TooLarge(#[from] EventTooLarge),
    /// A temperature field cannot be had; what was committed before is intact.
    #[error("{0}; the events committed before are intact")]
    Field(LostField),
    /// A worker panicked or broke the driver's contract: a defect of the program.
    #[error("a defect in the program stopped the run: {0}")]
    Defect(String),
}

impl From<EventError> for RunError {
    fn from(error: EventError) -> RunError {
        match error {
            EventError::TooLarge(event) => RunError::TooLarge(event),
            EventError::Field(lost @ LostField::Panicked { .. }) => {
                RunError::Defect(lost.to_string())
            }
            EventError::Field(lost) => RunError::Field(lost),
        }
    }
}

/// Makes the events `ids` on `threads` threads and sends them to `sink` in ascending order.
///
/// With one thread everything happens in the calling thread. When `stop` becomes true, events under way are finished,
/// whole chunks are committed, and the totals say `completed` = false; the file then stays incomplete. Memory does
/// not grow with the number of events.
///
/// # Errors
/// [`RunError::Output`] when the file cannot be written, [`RunError::Defect`] when the generator panics or appends
/// something other than the event asked for.
pub fn run<G: EventGenerator>(
    generator: &G,
    ids: Range<i64>,
    threads: usize,
    sink: Sink,
    progress: &dyn Progress,
    stop: &AtomicBool,
) -> Result<RunTotals<G::Counters>, RunError> {
    if threads <= 1 {
        serial::run(generator, ids, sink, progress, stop)
    } else {
        parallel::run(generator, ids, threads, sink, progress, stop)
    }
}

/// Ends a file, complete or not, and notes in the totals what is safe.
fn close<C: RunCounters>(sink: Sink, totals: &mut RunTotals<C>) -> Result<(), EventFileError> {
    let Sink::File(mut writer) = sink else {
        return Ok(());
    };
    if totals.completed {
        totals.committed_events = totals.events;
        let counters = totals.counters.named();
        let counters: Vec<(&str, u64)> = counters
            .iter()
            .map(|(name, value)| (name.as_str(), *value))
            .collect();
        writer.finish(&totals.sums, &counters)
    } else {
        writer.commit()?;
        totals.committed_events = writer.committed_events().unsigned_abs();
        Ok(())
    }
}

/// Commits what was written before an event could not be made; other failures leave the file as it is.
fn keep(sink: Sink, error: RunError) -> RunError {
    let events_before_are_sound = matches!(error, RunError::TooLarge(_) | RunError::Field(_));
    if let Sink::File(mut writer) = sink
        && events_before_are_sound
        && let Err(failure) = writer.commit()
    {
        return failure.into();
    }
    error
}

/// What a panic said.
fn panic_message(payload: Box<dyn std::any::Any + Send>) -> String {
    match payload.downcast::<String>() {
        Ok(text) => *text,
        Err(payload) => match payload.downcast::<&'static str>() {
            Ok(text) => (*text).to_owned(),
            Err(_) => "a panic without a message".to_owned(),
        },
    }
}
