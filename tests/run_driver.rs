//! The driver: same events on any number of threads, stops, panics, errors.

mod common;

use std::sync::atomic::{AtomicBool, Ordering};

use common::{FakeGenerator, provenance};
use spindrift::files::event_file::{EventFileWriter, WriteOptions};
use spindrift::run::{Progress, RunError, Sink, run};

fn running() -> AtomicBool {
    AtomicBool::new(false)
}

fn sink(path: &std::path::Path, events: i64) -> Sink {
    let writer = EventFileWriter::create(path, &provenance(events), WriteOptions::default());
    Sink::File(Box::new(writer.expect("a new file in a temporary folder")))
}

#[test]
fn totals_do_not_depend_on_threads() {
    let generator = FakeGenerator::default();
    let of = |threads| {
        run(&generator, 5..3210, threads, Sink::Discard, &(), &running()).expect("nothing fails")
    };
    let one = of(1);
    assert!(one.completed);
    assert_eq!(one.events, 3205);
    assert!(one.counters.trials > 0);
    for threads in [2, 3, 7] {
        assert_eq!(of(threads), one, "{threads} threads");
    }
}

#[test]
fn written_totals_do_not_depend_on_threads() {
    let folder = tempfile::tempdir().unwrap();
    let generator = FakeGenerator::default();
    let of = |threads: usize| {
        let path = folder.path().join(format!("{threads}.h5"));
        run(
            &generator,
            0..20_000,
            threads,
            sink(&path, 20_000),
            &(),
            &running(),
        )
        .unwrap()
    };
    let one = of(1);
    assert!(one.packed_bytes > 0);
    assert_eq!(of(2), one);
    assert_eq!(of(3), one);
}

#[test]
fn an_empty_range_makes_an_empty_complete_run() {
    for threads in [1, 2] {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("none.h5");
        let generator = FakeGenerator::default();
        let totals = run(&generator, 0..0, threads, sink(&path, 0), &(), &running()).unwrap();
        assert!(totals.completed);
        assert_eq!(totals.events, 0);
    }
}

#[test]
fn a_panic_becomes_an_error() {
    let generator = FakeGenerator {
        panic_at: Some(1000),
        ..FakeGenerator::default()
    };
    for threads in [1, 2, 3] {
        let outcome = run(&generator, 0..5000, threads, Sink::Discard, &(), &running());
        match outcome {
            Err(RunError::Defect(message)) => assert!(message.contains("told to panic")),
            other => panic!("{other:?}"),
        }
    }
}

/// Stops the run after some events.
struct StopAfter<'a> {
    events: u64,
    stop: &'a AtomicBool,
}

impl Progress for StopAfter<'_> {
    fn events_done(&self, done: u64, _total: u64) {
        if done >= self.events {
            self.stop.store(true, Ordering::Relaxed);
        }
    }
}

#[test]
fn a_stop_leaves_whole_events_committed() {
    for threads in [1, 2] {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("stopped.h5");
        let stop = running();
        let generator = FakeGenerator::default();
        let hook = StopAfter {
            events: 30_000,
            stop: &stop,
        };
        let totals = run(
            &generator,
            0..10_000_000,
            threads,
            sink(&path, 10_000_000),
            &hook,
            &stop,
        )
        .unwrap();
        assert!(!totals.completed);
        assert!(totals.events >= 30_000 && totals.events < 40_000);
        assert!(totals.committed_events > 20_000);
        assert!(totals.committed_events <= totals.events);
    }
}
