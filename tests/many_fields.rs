//! Runs with several temperature fields: each event has its field whatever the threads, and counts as the field does.

mod common;

use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};
use std::sync::{Mutex, MutexGuard, PoisonError};

use common::field_maker::FieldMaker;
use serde_json::{Value, json};
use spindrift::event::{EventSummary, Parton};
use spindrift::files::event_file::{EventFile, audit};

const TEMPERATURES_GEV: [f64; 3] = [0.3, 0.4, 0.35];
const EVENTS_PER_FIELD: i64 = 100;
const EVENTS: i64 = 450;

const TAU_FM: [f64; 3] = [0.5, 3.0, 6.0];
const PLACE_FM: [f64; 3] = [-8.0, 0.0, 8.0];

/// Programs inherit the locks of HDF5 files that are open where they are started, so one test at a time.
static ALONE: Mutex<()> = Mutex::new(());

/// A folder with three fields, of which the one in the middle is the hottest.
struct Desk {
    folder: tempfile::TempDir,
    _alone: MutexGuard<'static, ()>,
}

impl Desk {
    fn path(&self) -> &Path {
        self.folder.path()
    }
}

fn folder() -> Desk {
    let alone = ALONE.lock().unwrap_or_else(PoisonError::into_inner);
    let folder = tempfile::tempdir().unwrap();
    for (place, temperature) in TEMPERATURES_GEV.iter().enumerate() {
        write_field(
            &folder.path().join(name(place)),
            *temperature,
            1.0 + place as f64,
        );
    }
    Desk {
        folder,
        _alone: alone,
    }
}

fn name(place: usize) -> String {
    format!("field-{place}.h5")
}

/// A field of one temperature; its collision density is even, with an integral in proportion to `collisions`.
fn write_field(path: &Path, temperature_gev: f64, collisions: f64) {
    let maker = FieldMaker::new(path);
    maker.axis("tau", &TAU_FM, Some("fm"));
    maker.axis("x", &PLACE_FM, Some("fm"));
    maker.axis("y", &PLACE_FM, Some("fm"));
    let values = [temperature_gev; 27];
    maker.variable("temperature", &["tau", "x", "y"], &values, Some("GeV"));
    let density = [collisions; 9];
    maker.variable("collision_density", &["x", "y"], &density, Some("fm^-2"));
}

fn config(field: Value) -> Value {
    json!({
        "events": EVENTS,
        "source": {
            "kind": "single", "parton": "u", "energy_GeV": 100.0, "start_virtuality_GeV": 40.0,
        },
        "medium": {
            "field": field,
            "transport": { "kind": "cubic", "coefficient": 4.0, "for": "gluon" },
            "effects": [{ "kind": "collinear-expansion" }],
        },
    })
}

fn several() -> Value {
    config(json!({
        "kind": "grid", "files": "field-*.h5", "events_per_field": EVENTS_PER_FIELD,
    }))
}

fn run(folder: &Path, config: &Value, arguments: &[&str]) -> Output {
    fs::write(folder.join("run.json"), config.to_string()).unwrap();
    let mut command = Command::new(assert_cmd::cargo::cargo_bin!("spindrift"));
    command.args(["generate", "run.json"]).args(arguments);
    command.current_dir(folder).output().unwrap()
}

fn made(folder: &Path, config: &Value, arguments: &[&str]) -> PathBuf {
    let output = run(folder, config, arguments);
    let said = String::from_utf8_lossy(&output.stderr);
    assert_eq!(output.status.code(), Some(0), "{said}");
    let place = arguments.iter().position(|word| *word == "--out").unwrap();
    folder.join(arguments[place + 1])
}

fn events(path: &Path) -> Vec<(EventSummary, Vec<Parton>)> {
    let report = audit(path).unwrap();
    assert!(report.is_clean(), "{:?}", report.findings);
    let file = EventFile::open(path).unwrap();
    let mut events = Vec::new();
    for block in file.blocks() {
        let block = block.unwrap();
        events.extend(block.iter().map(|(event, rows)| (*event, rows.to_vec())));
    }
    events
}

/// Bit for bit, an event is the one that a run with its field alone makes; whatever the number of threads.
#[test]
fn each_event_is_that_of_its_own_field() {
    let desk = folder();
    let folder = desk.path();
    let one = made(folder, &several(), &["--out", "one.h5", "--threads", "1"]);
    let four = made(folder, &several(), &["--out", "four.h5", "--threads", "4"]);
    let (one, four) = (events(&one), events(&four));
    assert!(one == four, "the content depends on the number of threads");
    let mut alone = Vec::new();
    for place in 0..3 {
        let field = json!({ "kind": "grid", "file": name(place) });
        let out = format!("alone-{place}.h5");
        alone.push(events(&made(folder, &config(field), &["--out", &out])));
    }
    for (id, (event, rows)) in one.iter().enumerate() {
        let field = id / EVENTS_PER_FIELD as usize % 3;
        assert_eq!((event.id, event.field), (id as i64, field as i32));
        assert_eq!(event.source_weight, 1.0);
        assert!(*rows == alone[field][id].1, "event {id}");
    }
    // Else nothing was compared: the fields make different events.
    let differs = |a: usize, b: usize| (0..100).any(|id| alone[a][id].1 != alone[b][id].1);
    assert!(differs(0, 1) && differs(1, 2) && differs(0, 2));
}

/// A turn shorter than a block of the driver, and as short as one event.
#[test]
fn short_turns_on_many_threads() {
    let folder = folder();
    for in_a_row in [1, 7] {
        let mut config = several();
        config["medium"]["field"]["events_per_field"] = json!(in_a_row);
        let out = format!("{in_a_row}.h5");
        let path = made(folder.path(), &config, &["--out", &out, "--threads", "4"]);
        for (event, _) in events(&path) {
            assert_eq!(i64::from(event.field), event.id / in_a_row % 3);
        }
    }
}

#[test]
fn the_file_lists_the_fields_and_show_tells_them() {
    let folder = folder();
    let path = made(folder.path(), &several(), &["--out", "run.h5"]);
    let fields = EventFile::open(&path).unwrap().provenance().fields.clone();
    let names: Vec<_> = fields.iter().map(|field| field.name.as_str()).collect();
    assert_eq!(names, [name(0), name(1), name(2)]);
    for field in &fields {
        assert_eq!((field.weight, field.sha256.len()), (1.0, 64));
    }
    let mut command = Command::new(assert_cmd::cargo::cargo_bin!("spindrift"));
    let shown = command.arg("show").arg(&path).output().unwrap();
    let shown = String::from_utf8(shown.stdout).unwrap();
    for name in names {
        assert!(shown.contains(name), "{shown}");
    }
}

/// Collision densities of 1, 2 and 3 count as 1/2, 1 and 3/2; origins come from the fields.
#[test]
fn fields_count_by_their_collisions() {
    let folder = folder();
    let mut config = several();
    config["medium"]["origin"] = json!({ "kind": "collision-density" });
    let path = made(
        folder.path(),
        &config,
        &["--out", "run.h5", "--threads", "3"],
    );
    let expected = [0.5, 1.0, 1.5];
    let file = EventFile::open(&path).unwrap();
    let weights: Vec<_> = file
        .provenance()
        .fields
        .iter()
        .map(|field| field.weight)
        .collect();
    let events = events(&path);
    for (weight, expected) in weights.iter().zip(expected) {
        assert!((weight - expected).abs() < 1e-12, "{weights:?}");
    }
    for (event, _) in &events {
        assert_eq!(event.source_weight, weights[event.field as usize]);
        assert!(event.origin_fm[1..3].iter().all(|x| x.abs() <= 8.0));
    }
    let sums = file.stated_sums();
    let total: f64 = events.iter().map(|(event, _)| event.source_weight).sum();
    assert!((sums.source_weights - total).abs() < 1e-9 * total);
    let differ = events
        .windows(2)
        .filter(|pair| pair[0].0.origin_fm != pair[1].0.origin_fm);
    assert_eq!(differ.count() as i64, EVENTS - 1);
}

#[test]
fn uneven_use_is_warned_of() {
    let folder = folder();
    let told = |events: i64| {
        let mut config = several();
        config["events"] = json!(events);
        let output = run(folder.path(), &config, &["--discard"]);
        assert_eq!(output.status.code(), Some(0));
        String::from_utf8(output.stderr).unwrap()
    };
    assert!(told(450).contains("use 3 fields unequally; a multiple of 300"));
    assert!(told(150).contains("use 2 of 3 fields"));
    assert!(!told(600).contains("events_per_field"));
}

#[test]
fn a_file_of_the_wrong_shape_or_without_a_density_is_refused_before_the_start() {
    let folder = folder();
    let path = folder.path().join(name(2));
    let refused = |config: &Value, words: &str| {
        let output = run(folder.path(), config, &["--out", "run.h5"]);
        let said = String::from_utf8_lossy(&output.stderr).into_owned();
        assert_eq!(output.status.code(), Some(2), "{said}");
        assert!(
            said.contains("field-2.h5") && said.contains(words),
            "{said}"
        );
        assert!(!folder.path().join("run.h5").exists());
    };
    let maker = FieldMaker::new(&path);
    maker.axis("tau", &TAU_FM, Some("fm"));
    maker.axis("x", &PLACE_FM, Some("fm"));
    maker.axis("y", &PLACE_FM, Some("fm"));
    maker.variable("temperature", &["tau", "x", "y"], &[0.3; 27], Some("GeV"));
    drop(maker);
    let mut by_density = several();
    by_density["medium"]["origin"] = json!({ "kind": "collision-density" });
    refused(&by_density, "collision_density");
    let maker = FieldMaker::new(&path);
    maker.axis("tau", &TAU_FM, Some("fm"));
    maker.axis("x", &PLACE_FM, Some("fm"));
    maker.variable("temperature", &["tau", "x"], &[0.3; 9], Some("GeV"));
    drop(maker);
    refused(&several(), "dimensions");
    fs::write(&path, "no field").unwrap();
    refused(&several(), "HDF5");
}

/// A value that only reading finds ends the run with exit 4; the events before it are there and sound.
#[test]
fn a_bad_value_found_late_leaves_the_events_before_it() {
    let folder = folder();
    let path = folder.path().join(name(2));
    write_field(&path, f64::NAN, 1.0);
    let mut config = several();
    config["medium"]["field"]["events_per_field"] = json!(4000);
    config["events"] = json!(12_000);
    for threads in ["1", "3"] {
        let out = format!("{threads}.h5");
        let arguments = ["--out", &out, "--threads", threads];
        let output = run(folder.path(), &config, &arguments);
        let said = String::from_utf8_lossy(&output.stderr);
        assert_eq!(output.status.code(), Some(4), "{said}");
        assert!(
            said.contains("field-2.h5") && said.contains("fillna"),
            "{said}"
        );
        let file = EventFile::open(&folder.path().join(&out)).unwrap();
        assert!(!file.is_complete() && file.event_count() <= 8000);
        // On several threads a block may be late; on one all whole chunks before the bad field are there.
        assert!(
            threads != "1" || file.event_count() > 4000,
            "{}",
            file.event_count()
        );
        assert!(audit(file.path()).unwrap().is_clean());
    }
}

/// The vacuum twin has the same fields, weights and origins.
#[test]
fn the_twin_without_effects_keeps_fields_and_weights() {
    let folder = folder();
    let mut config = several();
    config["medium"]["origin"] = json!({ "kind": "collision-density" });
    let medium = events(&made(folder.path(), &config, &["--out", "medium.h5"]));
    config["medium"]["effects"] = json!([]);
    let vacuum = events(&made(folder.path(), &config, &["--out", "vacuum.h5"]));
    for ((one, _), (other, _)) in medium.iter().zip(&vacuum) {
        assert_eq!(one.field, other.field);
        assert_eq!(one.source_weight, other.source_weight);
        assert_eq!(one.origin_fm, other.origin_fm);
    }
}

/// Where nothing depends on them, fields are looked at but not read: vacuum twins cost no reading.
#[test]
fn fields_that_nobody_needs_are_not_read() {
    let folder = folder();
    write_field(&folder.path().join(name(2)), f64::NAN, 1.0);
    let mut config = several();
    config["medium"]["effects"] = json!([]);
    let path = made(folder.path(), &config, &["--out", "vacuum.h5"]);
    for (event, _) in events(&path) {
        assert_eq!(i64::from(event.field), event.id / EVENTS_PER_FIELD % 3);
    }
    config["record"] = json!({ "medium_exit": true });
    let output = run(folder.path(), &config, &["--out", "exits.h5"]);
    assert_ne!(output.status.code(), Some(0));
}

/// What is odd about a field that is read during the run is told when it ends.
#[test]
fn warnings_of_later_fields_are_told() {
    let folder = folder();
    write_field(&folder.path().join(name(1)), 1.5, 1.0);
    let output = run(folder.path(), &several(), &["--discard"]);
    let said = String::from_utf8_lossy(&output.stderr);
    assert_eq!(output.status.code(), Some(0), "{said}");
    assert!(
        said.contains("field-1.h5: the largest temperature is 1.5 GeV"),
        "{said}"
    );
}
