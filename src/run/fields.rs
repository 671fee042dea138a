//! Several temperature fields in one run: event `id` has field floor(id/events_per_field) modulo their number.
//!
//! At most two fields are in memory, the present one and the next one, which a thread of its own reads ahead. A worker
//! claims the turn of its next event and holds the turn's field until it comes to another turn or to the end of its
//! block. Workers go through their events in ascending order, and the two earliest turns that are claimed are served
//! first; so when workers need more than two fields at once the later ones wait, a worker that waits holds nothing, and
//! the earliest can always go on. What an event holds depends on its number alone, never on who was served first.

use std::any::Any;
use std::collections::BTreeMap;
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::sync::{Arc, Condvar, Mutex, MutexGuard, PoisonError};
use std::thread::JoinHandle;

use thiserror::Error;

use super::panic_message;
use super::surroundings::Surroundings;

/// Fields in memory: the present one and the next.
const MOST_IN_MEMORY: usize = 2;

/// Warnings about fields beyond this number are not kept.
const MOST_WARNINGS: usize = 20;

/// What reads a field.
type Read = Box<dyn Fn(usize) -> Result<Surroundings, FieldReadError> + Send>;

/// Why a field cannot be read.
pub type FieldReadError = Box<dyn std::error::Error + Send + Sync>;

/// A field of a run that cannot be had.
#[derive(Clone, Debug, Error)]
pub enum LostField {
    /// Its file cannot be used.
    #[error("temperature field {index}: {problem}")]
    Unusable {
        /// Its place in the list, from 0.
        index: usize,
        /// What is wrong.
        problem: Arc<dyn std::error::Error + Send + Sync>,
    },
    /// The thread that reads fields panicked: a defect of the program.
    #[error("the reader of temperature field {index} panicked: {message}")]
    Panicked {
        /// Its place in the list, from 0.
        index: usize,
        /// What the panic said.
        message: String,
    },
}

/// The fields of a run, of which at most two are in memory.
pub struct FieldSeries {
    schedule: Schedule,
    /// One a field, mean 1.
    weights: Vec<f64>,
    /// `None` where no event needs its field.
    memory: Option<Memory>,
}

/// The fields in memory, and the thread that reads them.
struct Memory {
    shared: Arc<Shared>,
    reader: Option<JoinHandle<()>>,
}

/// Which event has which field.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Schedule {
    /// Number of fields, at least 1.
    pub count: usize,
    /// Events in a row that share a field, at least 1.
    pub events_per_field: u64,
}

impl Schedule {
    /// The turn of an event: events of one turn follow each other and share a field.
    fn turn(&self, id: i64) -> u64 {
        id.unsigned_abs() / self.events_per_field
    }

    fn field_of_turn(&self, turn: u64) -> usize {
        (turn % self.count as u64) as usize
    }

    /// The field of an event, from 0.
    pub fn field(&self, id: i64) -> usize {
        self.field_of_turn(self.turn(id))
    }
}

impl FieldSeries {
    /// A series whose fields `read` reads; `first` is that of event `first_id`, read already.
    pub fn new(
        schedule: Schedule,
        weights: Vec<f64>,
        first_id: i64,
        first: Surroundings,
        read: impl Fn(usize) -> Result<Surroundings, FieldReadError> + Send + 'static,
    ) -> FieldSeries {
        let turn = schedule.turn(first_id);
        let slot = Slot {
            field: schedule.field_of_turn(turn),
            content: Some(Arc::new(first)),
            holders: 0,
        };
        let shared = Arc::new(Shared {
            schedule,
            state: Mutex::new(State {
                slots: vec![slot],
                claims: BTreeMap::new(),
                latest_turn: turn,
                lost: BTreeMap::new(),
                warnings: Vec::new(),
                closed: false,
            }),
            changed: Condvar::new(),
        });
        let (reads, read): (_, Read) = (Arc::clone(&shared), Box::new(read));
        let reader = std::thread::spawn(move || reads.read_on(&read));
        FieldSeries {
            schedule,
            weights,
            memory: Some(Memory {
                shared,
                reader: Some(reader),
            }),
        }
    }

    /// A series whose fields no event needs, and that are never read.
    pub fn unread(schedule: Schedule, weights: Vec<f64>) -> FieldSeries {
        FieldSeries {
            schedule,
            weights,
            memory: None,
        }
    }

    /// Which event has which field.
    pub fn schedule(&self) -> Schedule {
        self.schedule
    }

    /// The weight of each field in the sample, mean 1.
    pub fn weights(&self) -> &[f64] {
        &self.weights
    }

    /// Holds the field of an event; waits until it is in memory. Who waits must hold nothing of another turn. `None` where
    /// no event needs its field.
    ///
    /// # Errors
    /// [`LostField`] where the field cannot be read.
    pub fn claim(&self, id: i64) -> Result<Option<Claim>, LostField> {
        let memory = self.memory.as_ref();
        let claim = memory.map(|memory| Claim::wait(&memory.shared, self.schedule.turn(id)));
        claim.transpose()
    }

    /// What the user should hear of the fields that were read after the start, each thing once.
    pub fn warnings(&self) -> Vec<String> {
        let memory = self.memory.as_ref();
        memory.map_or(Vec::new(), |memory| memory.shared.state().warnings.clone())
    }
}

impl Drop for Memory {
    fn drop(&mut self) {
        self.shared.change(|state| state.closed = true);
        // A field that is being read is read to its end: HDF5 must not be left in the middle of a call.
        if let Some(reader) = self.reader.take() {
            let _ = reader.join();
        }
    }
}

/// A turn's field, held.
pub struct Claim {
    shared: Arc<Shared>,
    turn: u64,
    /// There until it is dropped.
    surroundings: Option<Arc<Surroundings>>,
}

impl Claim {
    fn wait(shared: &Arc<Shared>, turn: u64) -> Result<Claim, LostField> {
        let field = shared.schedule.field_of_turn(turn);
        let mut state = shared.state();
        *state.claims.entry(turn).or_default() += 1;
        shared.changed.notify_all();
        loop {
            if let Some(content) = state.hold(field) {
                return Ok(Claim {
                    shared: Arc::clone(shared),
                    turn,
                    surroundings: Some(content),
                });
            }
            if let Some(lost) = state.lost.get(&field).cloned() {
                state.give_up(turn);
                shared.changed.notify_all();
                return Err(lost);
            }
            state = shared.wait(state);
        }
    }

    /// Whether it holds the field of an event too.
    pub fn covers(&self, id: i64) -> bool {
        self.turn == self.shared.schedule.turn(id)
    }

    /// The field, and where jets are born in it.
    pub fn surroundings(&self) -> &Surroundings {
        self.surroundings
            .as_ref()
            .expect("a claim holds its field until it is dropped")
    }
}

impl Drop for Claim {
    fn drop(&mut self) {
        // First, so that its memory is free when the reader hears of it.
        self.surroundings = None;
        let field = self.shared.schedule.field_of_turn(self.turn);
        self.shared.change(|state| {
            state.release(field);
            state.give_up(self.turn);
        });
    }
}

struct Shared {
    schedule: Schedule,
    state: Mutex<State>,
    changed: Condvar,
}

struct State {
    /// At most [`MOST_IN_MEMORY`], a field that is being read included.
    slots: Vec<Slot>,
    /// How many workers claim a turn, those that wait included.
    claims: BTreeMap<u64, usize>,
    /// The latest turn that was ever claimed.
    latest_turn: u64,
    /// Fields that cannot be had.
    lost: BTreeMap<usize, LostField>,
    warnings: Vec<String>,
    closed: bool,
}

struct Slot {
    field: usize,
    /// `None` while it is being read.
    content: Option<Arc<Surroundings>>,
    holders: usize,
}

impl State {
    fn hold(&mut self, field: usize) -> Option<Arc<Surroundings>> {
        let slot = self.slots.iter_mut().find(|slot| slot.field == field)?;
        let content = slot.content.as_ref()?;
        slot.holders += 1;
        Some(Arc::clone(content))
    }

    fn release(&mut self, field: usize) {
        let slot = self.slots.iter_mut().find(|slot| slot.field == field);
        slot.expect("a field that is held is in memory").holders -= 1;
    }

    fn give_up(&mut self, turn: u64) {
        let claims = self.claims.get_mut(&turn);
        let claims = claims.expect("a claim was noted when it was made");
        *claims -= 1;
        if *claims == 0 {
            self.claims.remove(&turn);
        }
        self.latest_turn = self.latest_turn.max(turn);
    }

    /// A field that is read again has the same to say again.
    fn note(&mut self, warnings: Vec<String>) {
        for warning in warnings {
            if self.warnings.len() < MOST_WARNINGS && !self.warnings.contains(&warning) {
                self.warnings.push(warning);
            }
        }
    }

    /// The fields that should be in memory, the most urgent first: those of the earliest turns claimed, then the next.
    fn wanted(&self, schedule: Schedule) -> Vec<usize> {
        let mut wanted = Vec::with_capacity(MOST_IN_MEMORY);
        let last = self.claims.last_key_value();
        let last = last.map_or(self.latest_turn, |(turn, _)| *turn);
        let claimed = self.claims.keys().copied();
        for turn in claimed.chain([last, last.saturating_add(1)]) {
            let field = schedule.field_of_turn(turn);
            if wanted.len() < MOST_IN_MEMORY && !wanted.contains(&field) {
                wanted.push(field);
            }
        }
        wanted
    }

    /// The next field to read, with a slot made free for it; the field that had the slot comes along, to be dropped.
    fn next_to_read(&mut self, schedule: Schedule) -> Option<(usize, Option<Slot>)> {
        let wanted = self.wanted(schedule);
        let missing = |field: &usize| {
            !self.lost.contains_key(field) && self.slots.iter().all(|slot| slot.field != *field)
        };
        let field = wanted.iter().copied().find(missing)?;
        let mut evicted = None;
        if self.slots.len() == MOST_IN_MEMORY {
            let is_idle = |slot: &Slot| slot.holders == 0 && !wanted.contains(&slot.field);
            let place = self.slots.iter().position(is_idle)?;
            evicted = Some(self.slots.swap_remove(place));
        }
        self.slots.push(Slot {
            field,
            content: None,
            holders: 0,
        });
        Some((field, evicted))
    }
}

impl Shared {
    /// A panic never happens while the state is half changed, so a poisoned lock is still good.
    fn state(&self) -> MutexGuard<'_, State> {
        self.state.lock().unwrap_or_else(PoisonError::into_inner)
    }

    fn wait<'a>(&self, state: MutexGuard<'a, State>) -> MutexGuard<'a, State> {
        let waited = self.changed.wait(state);
        waited.unwrap_or_else(PoisonError::into_inner)
    }

    fn change(&self, change: impl FnOnce(&mut State)) {
        change(&mut self.state());
        self.changed.notify_all();
    }

    /// The reader's life.
    fn read_on(&self, read: &Read) {
        while let Some(field) = self.next_to_read() {
            let outcome = catch_unwind(AssertUnwindSafe(|| read(field)));
            let outcome = outcome.map_or_else(
                |panic| Err(panicked(field, panic)),
                |read| {
                    read.map_err(|problem| LostField::Unusable {
                        index: field,
                        problem: problem.into(),
                    })
                },
            );
            self.change(|state| {
                let place = state.slots.iter().position(|slot| slot.field == field);
                let place = place.expect("the slot of a field that is being read stays");
                match outcome {
                    Ok(mut surroundings) => {
                        state.note(std::mem::take(&mut surroundings.warnings));
                        state.slots[place].content = Some(Arc::new(surroundings));
                    }
                    Err(lost) => {
                        state.slots.swap_remove(place);
                        state.lost.insert(field, lost);
                    }
                }
            });
        }
    }

    /// Waits for something to read; `None` when the run is over.
    fn next_to_read(&self) -> Option<usize> {
        let mut state = self.state();
        loop {
            if state.closed {
                return None;
            }
            if let Some((field, evicted)) = state.next_to_read(self.schedule) {
                drop(state);
                // Before the next one takes its memory.
                drop(evicted);
                return Some(field);
            }
            state = self.wait(state);
        }
    }
}

fn panicked(index: usize, panic: Box<dyn Any + Send>) -> LostField {
    LostField::Panicked {
        index,
        message: panic_message(panic),
    }
}

#[cfg(test)]
mod tests {
    use std::sync::atomic::{AtomicUsize, Ordering};
    use std::time::{Duration, Instant};

    use super::*;
    use crate::medium::field::{Fluid, Local, Ray, Stretch, TemperatureField};

    /// A field that knows its place in the list, and counts itself among the living.
    struct Marked {
        field: usize,
        living: Arc<Living>,
    }

    #[derive(Default)]
    struct Living {
        now: AtomicUsize,
        most: AtomicUsize,
        reads: AtomicUsize,
    }

    impl Drop for Marked {
        fn drop(&mut self) {
            self.living.now.fetch_sub(1, Ordering::SeqCst);
        }
    }

    impl TemperatureField for Marked {
        fn stretch(&self, _ray: &Ray, _end_temperature_gev: f64) -> Option<Stretch> {
            None
        }

        fn local(&self, _ray: &Ray, _l_fm: f64) -> Local {
            Local::EMPTY
        }

        fn fluid(&self, _point_fm: [f64; 4]) -> Fluid {
            Fluid {
                temperature_gev: self.field as f64,
                ..Fluid::EMPTY
            }
        }

        fn first_tau_fm(&self) -> f64 {
            0.0
        }
    }

    fn marked(field: usize, living: &Arc<Living>) -> Surroundings {
        let now = 1 + living.now.fetch_add(1, Ordering::SeqCst);
        living.most.fetch_max(now, Ordering::SeqCst);
        let living = Arc::clone(living);
        Surroundings {
            field: Arc::new(Marked { field, living }),
            origin: None,
            warnings: vec![format!("field {field} is warm")],
        }
    }

    fn claimed(series: &FieldSeries, id: i64) -> Claim {
        series.claim(id).unwrap().expect("the fields are read")
    }

    /// A series whose fields `spoilt` cannot be read, and whose reader panics at `fatal`.
    fn series(
        schedule: Schedule,
        living: &Arc<Living>,
        spoilt: &[usize],
        fatal: Option<usize>,
    ) -> FieldSeries {
        let first = marked(0, living);
        let (living, spoilt) = (Arc::clone(living), spoilt.to_vec());
        let read = move |field: usize| {
            living.reads.fetch_add(1, Ordering::SeqCst);
            assert_ne!(Some(field), fatal, "told to panic");
            if spoilt.contains(&field) {
                return Err("told to fail".into());
            }
            Ok(marked(field, &living))
        };
        FieldSeries::new(schedule, vec![1.0; schedule.count], 0, first, read)
    }

    fn field_of(claim: &Claim) -> usize {
        claim.surroundings().field.fluid([0.0; 4]).temperature_gev as usize
    }

    fn schedule(count: usize, events_per_field: u64) -> Schedule {
        Schedule {
            count,
            events_per_field,
        }
    }

    #[test]
    fn events_have_their_fields_and_two_are_in_memory() {
        let living = Arc::new(Living::default());
        let series = series(schedule(3, 5), &living, &[], None);
        let mut claim: Option<Claim> = None;
        for id in 0..60 {
            if !claim.as_ref().is_some_and(|claim| claim.covers(id)) {
                drop(claim.take());
                claim = Some(claimed(&series, id));
            }
            assert_eq!(field_of(claim.as_ref().unwrap()), (id as usize / 5) % 3);
        }
        drop(claim);
        // The first field's were told when it was read.
        assert_eq!(
            series.warnings()[..2],
            ["field 1 is warm", "field 2 is warm"]
        );
        assert!(series.warnings().len() <= 3);
        drop(series);
        assert!(living.most.load(Ordering::SeqCst) <= MOST_IN_MEMORY);
        assert_eq!(living.now.load(Ordering::SeqCst), 0);
        // Twelve turns, of which the first was read before, and perhaps one ahead; a field that is still there when its
        // turn comes again is not read again.
        assert!(living.reads.load(Ordering::SeqCst) <= 12);
    }

    #[test]
    fn two_fields_are_read_once() {
        let living = Arc::new(Living::default());
        let series = series(schedule(2, 1), &living, &[], None);
        for id in 0..40 {
            assert_eq!(field_of(&claimed(&series, id)), id as usize % 2);
        }
        drop(series);
        assert_eq!(living.reads.load(Ordering::SeqCst), 1);
    }

    #[test]
    fn the_next_field_is_read_before_anyone_asks() {
        let living = Arc::new(Living::default());
        let series = series(schedule(5, 1000), &living, &[], None);
        let _claim = claimed(&series, 0);
        let start = Instant::now();
        while living.now.load(Ordering::SeqCst) < 2 {
            assert!(
                start.elapsed() < Duration::from_secs(60),
                "nothing was read"
            );
            std::thread::sleep(Duration::from_millis(1));
        }
        assert_eq!(living.reads.load(Ordering::SeqCst), 1);
    }

    /// Workers take ascending blocks as the driver hands them out, shorter and longer than a turn.
    #[test]
    fn many_workers_agree_and_never_block_each_other_for_good() {
        for (count, events_per_field, block) in [(7, 3, 8), (3, 1, 16), (5, 100, 8), (4, 8, 8)] {
            let living = Arc::new(Living::default());
            let series = series(schedule(count, events_per_field), &living, &[], None);
            let next_block = AtomicUsize::new(0);
            std::thread::scope(|scope| {
                for _ in 0..5 {
                    scope.spawn(|| {
                        loop {
                            let first = block * next_block.fetch_add(1, Ordering::SeqCst);
                            if first >= 400 {
                                break;
                            }
                            let mut claim: Option<Claim> = None;
                            for id in first..first + block {
                                let id = id as i64;
                                if !claim.as_ref().is_some_and(|claim| claim.covers(id)) {
                                    drop(claim.take());
                                    claim = Some(claimed(&series, id));
                                }
                                let expected = id as usize / events_per_field as usize % count;
                                assert_eq!(field_of(claim.as_ref().unwrap()), expected);
                                std::thread::yield_now();
                            }
                        }
                    });
                }
            });
            drop(series);
            assert!(living.most.load(Ordering::SeqCst) <= MOST_IN_MEMORY);
            assert_eq!(living.now.load(Ordering::SeqCst), 0);
        }
    }

    #[test]
    fn a_field_that_cannot_be_read_is_told_to_who_needs_it_alone() {
        let living = Arc::new(Living::default());
        let series = series(schedule(3, 10), &living, &[1], None);
        drop(claimed(&series, 9));
        for id in [10, 19, 40] {
            let lost = series.claim(id).err().expect("field 1 is spoilt");
            assert!(lost.to_string().contains("field 1: told to fail"), "{lost}");
        }
        assert_eq!(field_of(&claimed(&series, 20)), 2);
    }

    #[test]
    fn a_panic_of_the_reader_is_told() {
        let living = Arc::new(Living::default());
        let series = series(schedule(3, 10), &living, &[], Some(2));
        drop(claimed(&series, 10));
        let lost = series.claim(20).err().expect("the reader panics");
        assert!(
            matches!(&lost, LostField::Panicked { index: 2, .. }),
            "{lost}"
        );
        assert_eq!(field_of(&claimed(&series, 30)), 0);
    }

    #[test]
    fn fields_that_nobody_needs_are_not_read() {
        let series = FieldSeries::unread(schedule(3, 10), vec![1.0; 3]);
        assert!(series.claim(20).unwrap().is_none());
        assert_eq!(series.schedule().field(20), 2);
    }
}
