//! The event file: what is written is read back; damaged, truncated and foreign files are refused, never a panic.

mod common;

use std::path::{Path, PathBuf};
use std::sync::atomic::AtomicBool;

use common::{FakeGenerator, provenance};
use spindrift::config::History;
use spindrift::event::EventBlock;
use spindrift::files::event_file::{
    ColumnSet, EVENT_CHUNK_ROWS, EXIT_COLUMNS, EventFile, EventFileError, EventFileWriter,
    PARTON_CHUNK_ROWS, PARTON_COLUMNS, Provenance, Table, WriteOptions, audit,
};
use spindrift::run::{EventGenerator, RunError, RunTotals, Sink, run};

fn write(
    path: &Path,
    generator: &FakeGenerator,
    provenance: &Provenance,
    threads: usize,
) -> RunTotals<common::FakeCounters> {
    let writer = EventFileWriter::create(path, provenance, WriteOptions::default()).unwrap();
    let ids = provenance.first_id..provenance.last_id + 1;
    let never = AtomicBool::new(false);
    run(
        generator,
        ids,
        threads,
        Sink::File(Box::new(writer)),
        &(),
        &never,
    )
    .unwrap()
}

fn generated(generator: &FakeGenerator, ids: std::ops::Range<i64>) -> EventBlock {
    let mut block = EventBlock::default();
    let mut worker = generator.worker();
    for id in ids {
        generator.generate(&mut worker, id, &mut block).unwrap();
    }
    block
}

fn read(path: &Path) -> EventBlock {
    let mut all = EventBlock::default();
    for block in EventFile::open(path).unwrap().blocks() {
        let block = block.unwrap();
        all.events.extend(block.events);
        all.partons.extend(block.partons);
        all.exits.extend(block.exits);
    }
    all
}

/// A small but many-chunked file, with a tail in both tables.
fn sample(folder: &Path, events: i64) -> PathBuf {
    let path = folder.join("sample.h5");
    write(&path, &FakeGenerator::default(), &provenance(events), 2);
    path
}

/// The same with exits from a medium.
fn sample_with_exits(folder: &Path, events: i64, threads: usize) -> PathBuf {
    let path = folder.join("exits.h5");
    write(&path, &WITH_EXITS, &provenance_with_exits(events), threads);
    path
}

const WITH_EXITS: FakeGenerator = FakeGenerator {
    history: History::Final,
    mean_branchings: 8,
    exits: true,
    panic_at: None,
};

fn provenance_with_exits(events: i64) -> Provenance {
    Provenance {
        medium_exit: true,
        ..provenance(events)
    }
}

#[test]
fn what_is_written_is_read_back() {
    let folder = tempfile::tempdir().unwrap();
    let events = 2 * EVENT_CHUNK_ROWS as i64 + 17;
    for (name, history, compression) in [
        ("final.h5", History::Final, 1),
        ("full.h5", History::Full, 1),
        ("stored.h5", History::Final, 0),
        ("slow.h5", History::Final, 9),
    ] {
        let generator = FakeGenerator {
            history,
            ..FakeGenerator::default()
        };
        let provenance = Provenance {
            history,
            compression,
            ..provenance(events)
        };
        let path = folder.path().join(name);
        let totals = write(&path, &generator, &provenance, 2);
        let expected = generated(&generator, 0..events);
        assert!(expected.partons.len() > 2 * PARTON_CHUNK_ROWS);
        assert_eq!(read(&path), expected, "{name}");
        let file = EventFile::open(&path).unwrap();
        assert_eq!(file.provenance(), &provenance);
        assert!(file.is_complete());
        assert_eq!(file.stated_sums(), totals.sums);
        assert_eq!(
            file.counters(),
            [("trials".to_owned(), totals.counters.trials)]
        );
        for table in [Table::Events, Table::Partons] {
            let rows = match table {
                Table::Events => expected.events.len(),
                Table::Partons => expected.partons.len(),
            };
            assert!(
                file.extents(table)
                    .iter()
                    .all(|(_, extent)| *extent == rows)
            );
        }
    }
}

#[test]
fn exits_from_the_medium_are_read_back() {
    let folder = tempfile::tempdir().unwrap();
    let events = 2 * EVENT_CHUNK_ROWS as i64 + 17;
    let mut digests = Vec::new();
    for threads in [1, 3] {
        let path = sample_with_exits(folder.path(), events, threads);
        let expected = generated(&WITH_EXITS, 0..events);
        assert!(expected.partons.len() > 2 * PARTON_CHUNK_ROWS);
        let left = expected.exits.iter().filter(|exit| !exit.is_none()).count();
        assert!(left > 1000 && left < expected.exits.len());
        assert_eq!(read(&path), expected);
        let file = EventFile::open(&path).unwrap();
        assert_eq!(file.provenance(), &provenance_with_exits(events));
        let extents = file.extents(Table::Partons);
        assert_eq!(extents.len(), PARTON_COLUMNS.len() + EXIT_COLUMNS.len());
        assert_eq!(
            file.event(2777).unwrap().unwrap(),
            generated(&WITH_EXITS, 2777..2778)
        );
        let report = audit(&path).unwrap();
        assert!(report.is_clean(), "{:?}", report.findings);
        digests.push(report.digest.unwrap());
        std::fs::remove_file(path).unwrap();
    }
    assert_eq!(digests[0], digests[1]);
}

/// Exits add datasets and nothing else: every other chunk stays the same to the last byte, and a file without them has
/// no trace of them.
#[test]
fn exits_leave_the_other_columns_alone() {
    let folder = tempfile::tempdir().unwrap();
    let (without, with) = (
        folder.path().join("without.h5"),
        folder.path().join("with.h5"),
    );
    write(&without, &WITH_EXITS, &provenance(5000), 2);
    write(&with, &WITH_EXITS, &provenance_with_exits(5000), 2);
    let bytes = [&without, &with].map(|path| std::fs::read(path).unwrap());
    let files = [&without, &with].map(|path| hdf5::File::open(path).unwrap());
    for table in [Table::Events, Table::Partons] {
        let members =
            |file: &hdf5::File| file.group(table.group()).unwrap().member_names().unwrap();
        let columns = ColumnSet::default().columns(table);
        assert_eq!(members(&files[0]).len(), columns.len());
        for column in columns {
            let place = format!("{}/{}", table.group(), column.name);
            let [one, other] = [0, 1].map(|file: usize| {
                let dataset = files[file].dataset(&place).unwrap();
                let chunks = (0..dataset.num_chunks().unwrap()).map(|chunk| {
                    let chunk = dataset.chunk_info(chunk).unwrap();
                    bytes[file][chunk.addr as usize..][..chunk.size as usize].to_vec()
                });
                chunks.collect::<Vec<_>>()
            });
            assert!(one.len() > 1 && one == other, "{place}");
        }
    }
    let names = files.map(|file| file.attr_names().unwrap());
    assert_eq!(names[0], names[1]);
    let digests = [&without, &with].map(|path| audit(path).unwrap().digest);
    assert_ne!(digests[0], digests[1]);
}

#[test]
fn columns_of_exits_are_all_there_or_none() {
    for column in &EXIT_COLUMNS {
        let folder = tempfile::tempdir().unwrap();
        let path = sample_with_exits(folder.path(), 100, 1);
        let place = format!("/partons/{}", column.name);
        let file = hdf5::File::open_rw(&path).unwrap();
        file.unlink(&place).unwrap();
        drop(file);
        let error = audit(&path).unwrap_err().to_string();
        assert!(error.contains(&place), "{error}");
    }
}

/// A generator that makes no exits for a file that keeps them is a defect, told as such, on any number of threads.
#[test]
fn exits_that_were_not_made_are_a_defect() {
    for threads in [1, 2] {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("missing.h5");
        let provenance = provenance_with_exits(100);
        let writer = EventFileWriter::create(&path, &provenance, WriteOptions::default()).unwrap();
        let sink = Sink::File(Box::new(writer));
        let never = AtomicBool::new(false);
        let outcome = run(
            &FakeGenerator::default(),
            0..100,
            threads,
            sink,
            &(),
            &never,
        );
        let Err(RunError::Defect(reason)) = outcome else {
            panic!("{outcome:?}");
        };
        assert!(reason.contains("keeps exits"), "{reason}");
    }
}

#[test]
fn samples_that_fill_chunks_exactly_or_not_at_all() {
    let folder = tempfile::tempdir().unwrap();
    for events in [0, 1, EVENT_CHUNK_ROWS as i64] {
        let path = folder.path().join(format!("{events}.h5"));
        write(&path, &FakeGenerator::default(), &provenance(events), 1);
        assert_eq!(read(&path), generated(&FakeGenerator::default(), 0..events));
        assert!(audit(&path).unwrap().is_clean());
    }
}

#[test]
fn content_does_not_depend_on_threads_or_compression() {
    let folder = tempfile::tempdir().unwrap();
    let events = 5000;
    let digest = |name: &str, threads, compression| {
        let path = folder.path().join(name);
        let provenance = Provenance {
            compression,
            ..provenance(events)
        };
        write(&path, &FakeGenerator::default(), &provenance, threads);
        audit(&path).unwrap().digest.unwrap()
    };
    let one = digest("1.h5", 1, 1);
    assert_eq!(digest("2.h5", 2, 1), one);
    assert_eq!(digest("3.h5", 3, 1), one);
    assert_eq!(digest("0.h5", 2, 0), one);
    assert_eq!(digest("6.h5", 2, 6), one);
}

#[test]
fn momenta_are_rounded_as_declared() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("rounded.h5");
    let bits = 30;
    let provenance = Provenance {
        momentum_bits: Some(bits),
        ..provenance(3000)
    };
    write(&path, &FakeGenerator::default(), &provenance, 2);
    assert!(audit(&path).unwrap().is_clean());
    let (exact, rounded) = (generated(&FakeGenerator::default(), 0..3000), read(&path));
    let half_step = 0.5f64.powi(i32::from(bits) + 1);
    let mut changed = 0;
    for (exact, rounded) in exact.partons.iter().zip(&rounded.partons) {
        for (a, b) in exact.momentum_gev.iter().zip(rounded.momentum_gev) {
            assert!((a - b).abs() <= half_step * a.abs());
            assert!(b.to_bits().trailing_zeros() >= 52 - u32::from(bits));
            changed += usize::from(*a != b);
        }
    }
    assert!(changed > 3 * exact.partons.len());
}

#[test]
fn one_event_is_found_by_its_number() {
    let folder = tempfile::tempdir().unwrap();
    let path = sample(folder.path(), 3000);
    let file = EventFile::open(&path).unwrap();
    assert_eq!(
        file.event(2777).unwrap().unwrap(),
        generated(&FakeGenerator::default(), 2777..2778)
    );
    assert_eq!(file.event(3000).unwrap(), None);
}

#[test]
fn an_existing_file_is_kept_unless_told_otherwise() {
    let folder = tempfile::tempdir().unwrap();
    let path = sample(folder.path(), 100);
    let refused = EventFileWriter::create(&path, &provenance(1), WriteOptions::default());
    assert!(matches!(refused, Err(EventFileError::Exists { .. })));
    assert_eq!(read(&path).events.len(), 100);
    let replace = WriteOptions { overwrite: true };
    drop(EventFileWriter::create(&path, &provenance(1), replace).unwrap());
    assert_eq!(read(&path).events.len(), 0);
}

#[test]
fn two_writers_cannot_share_an_output() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("one.h5");
    let first = EventFileWriter::create(&path, &provenance(1), WriteOptions::default()).unwrap();
    let replace = WriteOptions { overwrite: true };
    let second = EventFileWriter::create(&path, &provenance(1), replace);
    assert!(matches!(second, Err(EventFileError::Locked { .. })));
    drop(first);
    assert!(EventFileWriter::create(&path, &provenance(1), replace).is_ok());
    let left: Vec<_> = std::fs::read_dir(folder.path()).unwrap().collect();
    assert_eq!(left.len(), 1, "no lock file stays behind: {left:?}");
}

#[test]
fn an_unwritable_place_is_an_error() {
    let path = Path::new("/nonexistent-folder/out.h5");
    let refused = EventFileWriter::create(path, &provenance(1), WriteOptions::default());
    assert!(matches!(refused, Err(EventFileError::Create { .. })));
}

#[test]
fn foreign_files_are_refused() {
    let folder = tempfile::tempdir().unwrap();
    let text = folder.path().join("text.h5");
    std::fs::write(&text, "no HDF5 at all").unwrap();
    assert!(matches!(
        EventFile::open(&text),
        Err(EventFileError::Open { .. })
    ));
    let absent = folder.path().join("absent.h5");
    assert!(matches!(
        EventFile::open(&absent),
        Err(EventFileError::Open { .. })
    ));
    let other = folder.path().join("other.h5");
    let file = hdf5::File::create(&other).unwrap();
    file.new_dataset::<f64>().shape([3]).create("x").unwrap();
    drop(file);
    assert!(matches!(
        EventFile::open(&other),
        Err(EventFileError::Foreign { .. })
    ));
}

/// Changes a file through HDF5 and expects that opening or reading it fails in words.
fn expect_damaged(change: impl Fn(&hdf5::File)) -> String {
    let folder = tempfile::tempdir().unwrap();
    let path = sample(folder.path(), 3000);
    let file = hdf5::File::open_rw(&path).unwrap();
    change(&file);
    drop(file);
    match audit(&path) {
        Err(error) => error.to_string(),
        Ok(report) => {
            assert!(!report.is_clean(), "the change went unnoticed");
            report.findings[0].to_string()
        }
    }
}

#[test]
fn missing_and_wrong_parts_are_named() {
    let missing = expect_damaged(|file| file.unlink("partons/px").unwrap());
    assert!(missing.contains("/partons/px"), "{missing}");
    let gone = expect_damaged(|file| file.delete_attr("seed").unwrap());
    assert!(gone.contains("seed"), "{gone}");
    let wrong_type = expect_damaged(|file| {
        file.unlink("events/id").unwrap();
        file.new_dataset::<f64>()
            .shape([3000])
            .create("events/id")
            .unwrap();
    });
    assert!(wrong_type.contains("/events/id"), "{wrong_type}");
    let wrong_shape = expect_damaged(|file| {
        file.unlink("events/origin").unwrap();
        file.new_dataset::<f32>()
            .chunk([64, 3])
            .shape([3000, 3])
            .create("events/origin")
            .unwrap();
    });
    assert!(wrong_shape.contains("/events/origin"), "{wrong_shape}");
}

#[test]
fn absurd_sizes_are_refused_before_memory_is_taken() {
    let rows = 1i64 << 50;
    let huge = expect_damaged(|file| {
        for name in file.group("partons").unwrap().member_names().unwrap() {
            let column = file.dataset(&format!("partons/{name}")).unwrap();
            column.resize(rows as usize).unwrap();
        }
        let count = file.attr("partons_committed").unwrap();
        count.write_scalar(&rows).unwrap();
    });
    assert!(huge.contains("chunks"), "{huge}");
    let beyond = expect_damaged(|file| {
        file.attr("events_committed")
            .unwrap()
            .write_scalar(&i64::MAX)
            .unwrap();
    });
    assert!(beyond.contains("declared"), "{beyond}");
    let negative = expect_damaged(|file| {
        file.attr("events_committed")
            .unwrap()
            .write_scalar(&-1i64)
            .unwrap();
    });
    assert!(negative.contains("negative"), "{negative}");
}

#[test]
fn wild_places_of_rows_are_refused() {
    for (column, value) in [
        ("partons_start", i64::MAX),
        ("partons_start", -5),
        ("partons_count", i64::from(i32::MAX)),
        ("partons_count", -1),
    ] {
        let message = expect_damaged(|file| {
            let dataset = file.dataset(&format!("events/{column}")).unwrap();
            let mut values = dataset.read_raw::<i64>().unwrap();
            values[1000] = value;
            dataset.write_raw(&values).unwrap();
        });
        assert!(message.contains("partons_start"), "{message}");
    }
}

#[test]
fn a_flipped_bit_in_any_column_fails_its_checksum() {
    let folder = tempfile::tempdir().unwrap();
    let path = sample_with_exits(folder.path(), 5000, 2);
    let whole = std::fs::read(&path).unwrap();
    let set = ColumnSet { medium_exit: true };
    for table in [Table::Events, Table::Partons] {
        for column in set.columns(table) {
            let place = format!("{}/{}", table.group(), column.name);
            let file = hdf5::File::open(&path).unwrap();
            let chunk = file.dataset(&place).unwrap().chunk_info(1).unwrap();
            drop(file);
            let mut bytes = whole.clone();
            bytes[(chunk.addr + chunk.size / 2) as usize] ^= 0x10;
            std::fs::write(&path, &bytes).unwrap();
            let report = audit(&path).unwrap();
            let message = report.findings[0].to_string();
            assert!(message.contains(&place), "{place}: {message}");
            assert_eq!(report.digest, None);
        }
    }
}

#[test]
fn truncated_files_are_refused_or_read_to_their_end() {
    let folder = tempfile::tempdir().unwrap();
    let path = sample(folder.path(), 3000);
    let whole = std::fs::read(&path).unwrap();
    for tenth in 0..10 {
        std::fs::write(&path, &whole[..whole.len() * tenth / 10]).unwrap();
        if let Ok(report) = audit(&path) {
            assert!(!report.is_clean(), "{tenth} tenths of a file pass");
        }
    }
}

#[test]
fn an_abandoned_file_reads_as_its_last_commit() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("abandoned.h5");
    let generator = WITH_EXITS;
    let stop = AtomicBool::new(false);
    struct StopSoon<'a>(&'a AtomicBool);
    impl spindrift::run::Progress for StopSoon<'_> {
        fn events_done(&self, done: u64, _: u64) {
            if done > 9000 {
                self.0.store(true, std::sync::atomic::Ordering::Relaxed);
            }
        }
    }
    let writer = EventFileWriter::create(
        &path,
        &provenance_with_exits(50_000),
        WriteOptions::default(),
    )
    .unwrap();
    let totals = run(
        &generator,
        0..50_000,
        2,
        Sink::File(Box::new(writer)),
        &StopSoon(&stop),
        &stop,
    )
    .unwrap();
    let committed = totals.committed_events as i64;
    assert!(committed >= 3 * EVENT_CHUNK_ROWS as i64);
    assert_eq!(read(&path), generated(&generator, 0..committed));
    let report = audit(&path).unwrap();
    assert!(report.is_clean() && !report.complete);
    assert_eq!(report.events_due, 50_000);
}
