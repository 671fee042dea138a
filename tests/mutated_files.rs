//! Files with changed bytes are read or refused, never a panic, a hang or a crash.
//!
//! Deterministic; `SPINDRIFT_MUTATIONS` sets how many files of each kind are tried (before a release, many more).

mod common;

use std::path::Path;
use std::sync::atomic::AtomicBool;

use common::field_maker::FieldMaker;
use common::{FakeGenerator, provenance};
use rand::{RngExt, SeedableRng};
use rand_pcg::Pcg64;
use spindrift::files::event_file::{EventFileWriter, Provenance, WriteOptions, audit};
use spindrift::files::field_file::{read_field, read_grid};
use spindrift::run::{Sink, run};

const USUAL_MUTATIONS: usize = 200;
const MOST_BYTES_CHANGED: usize = 6;

fn mutations() -> usize {
    let wanted = std::env::var("SPINDRIFT_MUTATIONS").ok();
    wanted.map_or(USUAL_MUTATIONS, |count| count.parse().unwrap())
}

/// Hands `try_file` one mutated copy of the file after another.
fn mutate(path: &Path, seed: u64, mut try_file: impl FnMut(&Path)) {
    let sound = std::fs::read(path).unwrap();
    let mut random = Pcg64::seed_from_u64(seed);
    for _ in 0..mutations() {
        let mut bytes = sound.clone();
        for _ in 0..random.random_range(1..MOST_BYTES_CHANGED) {
            let place = random.random_range(0..bytes.len());
            bytes[place] = match random.random_range(0..3) {
                0 => u8::MAX,
                1 => bytes[place] ^ (1 << random.random_range(0..u8::BITS)),
                _ => random.random(),
            };
        }
        std::fs::write(path, &bytes).unwrap();
        try_file(path);
    }
}

#[test]
fn event_files() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("events.h5");
    let provenance = Provenance {
        medium_exit: true,
        ..provenance(60)
    };
    let writer = EventFileWriter::create(&path, &provenance, WriteOptions::default()).unwrap();
    let never = AtomicBool::new(false);
    run(
        &FakeGenerator {
            exits: true,
            ..FakeGenerator::default()
        },
        0..60,
        1,
        Sink::File(Box::new(writer)),
        &(),
        &never,
    )
    .unwrap();
    let mut refused = 0;
    mutate(&path, 1, |path| {
        refused += usize::from(!audit(path).is_ok_and(|report| report.is_clean()));
    });
    // some bytes mean nothing (padding, unused room in indexes), most do
    assert!(refused > mutations() / 2, "{refused} of {}", mutations());
}

#[test]
fn field_files() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("field.nc");
    let maker = FieldMaker::new(&path);
    maker
        .axis("tau", &[0.6, 1.0], Some("fm"))
        .axis("x", &[-1.0, 0.0, 1.0], Some("fm"))
        .axis("y", &[-1.0, 0.0, 1.0], Some("fm"));
    maker.variable(
        "temperature",
        &["x", "tau", "y"],
        &[0.25f32; 18],
        Some("GeV"),
    );
    drop(maker);
    let mut refused = 0;
    mutate(&path, 2, |path| {
        let whole = read_field(path).is_err();
        assert_eq!(read_grid(path, 0.15, false).is_err(), whole);
        refused += usize::from(whole);
    });
    assert!(refused > 0);
}
