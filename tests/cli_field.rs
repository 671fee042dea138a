//! Fields as a user makes and looks at them: `field make`, `field check`, pictures.

use std::fs;
use std::path::PathBuf;
use std::process::{Command, Output};

use serde_json::{Value, json};
use spindrift::files::field_file::{read_field, read_grid};
use spindrift::medium::field::{Placed, Radial, Ray, TemperatureField};

const DONE: i32 = 0;
const BAD_REQUEST: i32 = 2;

/// A folder of its own, in which the program runs.
struct Desk {
    folder: tempfile::TempDir,
}

impl Desk {
    fn new() -> Desk {
        let folder = tempfile::tempdir().unwrap();
        Desk { folder }
    }

    fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    /// Writes a config with a field.
    fn config(&self, field: &Value) -> &'static str {
        let config = json!({
            "events": 20,
            "source": {
                "kind": "single", "parton": "u", "energy_GeV": 100.0, "start_virtuality_GeV": 40.0,
            },
            "medium": {
                "field": field,
                "origin": { "kind": "fixed", "x_fm": 0.0, "y_fm": 0.0 },
                "transport": { "kind": "cubic", "coefficient": 4.0, "for": "gluon" },
                "effects": [],
            },
        });
        fs::write(self.path("run.json"), config.to_string()).unwrap();
        "run.json"
    }

    fn run(&self, arguments: &[&str], expected: i32) -> String {
        let mut command = Command::new(assert_cmd::cargo::cargo_bin!("spindrift"));
        let Output {
            status,
            stdout,
            stderr,
        } = command
            .args(arguments)
            .current_dir(self.folder.path())
            .output()
            .unwrap();
        let words = String::from_utf8(stdout).unwrap() + &String::from_utf8(stderr).unwrap();
        assert_eq!(status.code(), Some(expected), "{arguments:?}: {words}");
        words
    }

    fn names(&self) -> Vec<String> {
        let entries = fs::read_dir(self.folder.path()).unwrap();
        let name = |entry: fs::DirEntry| entry.file_name().into_string().unwrap();
        let mut names: Vec<_> = entries.map(|entry| name(entry.unwrap())).collect();
        names.sort();
        names
    }
}

fn radial() -> Value {
    json!({
        "kind": "radial", "amplitude": 2.99, "q_per_fm": 0.2326, "start_fm": 0.6,
        "rotation_rad": 0.4, "shift_fm": [0.5, -1.0],
    })
}

/// A radial field written and read back is the same field, shifted as it was, to the error of the interpolation; it can be
/// checked, drawn and run in.
#[test]
fn a_radial_field_is_made_checked_and_used() {
    let desk = Desk::new();
    let config = desk.config(&radial());
    let words = desk.run(&["field", "make", config, "--out", "made.h5"], DONE);
    assert!(
        words.contains("made.h5: 35 slices of 81 x 81 points"),
        "{words}"
    );
    let exact = Placed::new(
        std::sync::Arc::new(Radial::new(2.99, 0.2326, 0.6)),
        0.4,
        [0.5, -1.0],
    );
    let loaded = read_grid(&desk.path("made.h5"), 0.15, false).unwrap();
    let mut met = 0;
    for place in 0..200 {
        let azimuth = 0.31 * f64::from(place);
        let ray = Ray {
            birth_fm: [0.0, 0.02 * f64::from(place) - 2.0, 0.7, 0.0],
            direction: [0.8 * azimuth.cos(), 0.8 * azimuth.sin(), 0.6],
        };
        let stretch = exact.stretch(&ray, 0.15).unwrap();
        for share in [0.01, 0.3, 0.6, 0.95] {
            let l = stretch.first_fm + share * (stretch.last_fm - stretch.first_fm);
            let (found, expected) = (loaded.grid.local(&ray, l), exact.local(&ray, l));
            let error = found.temperature_gev / expected.temperature_gev - 1.0;
            assert!(error.abs() < 4e-3, "{found:?} {expected:?}");
            assert!((found.flow_factor - expected.flow_factor).abs() < 2e-3);
            met += 1;
        }
    }
    assert_eq!(met, 800);
    let words = desk.run(
        &["field", "check", "made.h5", "--picture", "made.svg"],
        DONE,
    );
    for part in [
        "made.h5 can be used",
        "axis tau  35 points from 0.6000 to 4.000 fm",
        "largest flow: transverse u",
        "largest T at the edge x = -10.00 fm",
        "interpolation along tau",
    ] {
        assert!(words.contains(part), "{part}: {words}");
    }
    // T^4 reaches the grid's edges, which cut it unevenly.
    let centre: f64 = words
        .split("centre x ")
        .nth(1)
        .and_then(|rest| rest.split(' ').next())
        .map(|number| number.parse().unwrap())
        .unwrap();
    assert!((centre - 0.5).abs() < 0.05, "{centre}");
    let picture = fs::read_to_string(desk.path("made.svg")).unwrap();
    for part in [
        "<title>temperature field made.h5</title>",
        "x (fm)",
        "T (GeV)",
        "flow, 0.4 c",
        "a jet",
    ] {
        assert!(picture.contains(part), "{part}");
    }
    assert_eq!(picture.matches("<clipPath").count(), 6);
    assert_balanced(&picture);
    assert!(!picture.contains("NaN") && !picture.contains("inf"));
    let grid = desk.config(&json!({ "kind": "grid", "file": "made.h5" }));
    desk.run(&["generate", grid, "--out", "events.h5"], DONE);
}

/// Every element that is opened is closed.
fn assert_balanced(svg: &str) {
    let mut open: Vec<&str> = Vec::new();
    for tag in svg.split('<').skip(1) {
        let tag = &tag[..tag.find('>').expect("a tag ends")];
        if let Some(closed) = tag.strip_prefix('/') {
            assert_eq!(open.pop(), Some(closed));
        } else if !tag.ends_with('/') {
            open.push(tag.split_whitespace().next().expect("a tag has a name"));
        }
    }
    assert!(open.is_empty(), "{open:?}");
}

#[test]
fn the_grid_is_as_asked_for() {
    let desk = Desk::new();
    let field = json!({ "kind": "longitudinal", "temperature_GeV": 0.45, "start_fm": 0.6 });
    let config = desk.config(&field);
    let make = ["field", "make", config, "--out", "made.h5"];
    desk.run(
        &[
            &make[..],
            &[
                "--extent-fm",
                "3",
                "--spacing-fm",
                "1",
                "--tau-step-fm",
                "0.25",
                "--last-tau-fm",
                "2.1",
            ],
        ]
        .concat(),
        DONE,
    );
    let data = read_field(&desk.path("made.h5")).unwrap();
    assert_eq!(data.shape(), [7, 7, 7, 1]);
    assert_eq!((data.x_fm[0], data.y_fm[6]), (-3.0, 3.0));
    assert_eq!((data.tau_fm[0], data.tau_fm[6]), (0.6, 2.1));
    let last = f64::from(data.temperature_gev[data.index(6, 3, 3, 0)]);
    assert!((last - 0.45 * (0.6_f64 / 2.1).cbrt()).abs() < 1e-7);
    assert!(data.flow.unwrap().iter().flatten().all(|u| *u == 0.0));
    assert!(data.collision_density_per_fm2.is_none());
    // Until all is cold where nothing is asked for: 0.6 (0.45/0.15)^3 = 16.2 fm.
    desk.run(&[&make[..], &["--overwrite"]].concat(), DONE);
    let data = read_field(&desk.path("made.h5")).unwrap();
    let last = data.tau_fm[data.tau_fm.len() - 1];
    assert!((16.2..16.35).contains(&last), "{last}");
}

#[test]
fn what_cannot_be_made_or_drawn_is_told() {
    let desk = Desk::new();
    let cases = [
        (
            json!({ "kind": "brick", "temperature_GeV": 0.3, "length_fm": 4.0 }),
            "a brick",
        ),
        (
            json!({ "kind": "grid", "file": "field.h5" }),
            "a grid already",
        ),
    ];
    let demo = concat!(env!("CARGO_MANIFEST_DIR"), "/demo-data/lumpy-fireball.h5");
    fs::copy(demo, desk.path("field.h5")).unwrap();
    for (field, reason) in cases {
        let config = desk.config(&field);
        let words = desk.run(&["field", "make", config, "--out", "made.h5"], BAD_REQUEST);
        assert!(words.contains(reason), "{words}");
    }
    let config = desk.config(&radial());
    let make = ["field", "make", config, "--out", "made.h5"];
    for wrong in [
        ["--spacing-fm", "0"],
        ["--spacing-fm", "nan"],
        ["--spacing-fm", "0.0001"],
        ["--extent-fm", "-4"],
        ["--tau-step-fm", "0"],
        ["--last-tau-fm", "0.5"],
    ] {
        let option = wrong.join("=");
        desk.run(&[&make[..], &[&option]].concat(), BAD_REQUEST);
    }
    let words = desk.run(&[&make[..4], &["field.h5"]].concat(), BAD_REQUEST);
    assert!(words.contains("field.h5 exists"), "{words}");
    let words = desk.run(&[&make[..4], &["absent/made.h5"]].concat(), BAD_REQUEST);
    assert!(words.contains("no folder absent"), "{words}");
    fs::write(desk.path("old.svg"), "").unwrap();
    desk.run(
        &["field", "check", "field.h5", "--picture", "old.svg"],
        BAD_REQUEST,
    );
    assert_eq!(desk.names(), ["field.h5", "old.svg", "run.json"]);
    let check = [
        "field",
        "check",
        "field.h5",
        "--picture",
        "old.svg",
        "--overwrite",
    ];
    desk.run(&check, DONE);
    assert_balanced(&fs::read_to_string(desk.path("old.svg")).unwrap());
}
