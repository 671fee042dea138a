//! The program as a user meets it: exit codes, what stands on stdout, stderr and disk.

use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Child, Command, Output, Stdio};
use std::time::{Duration, Instant};

use serde_json::{Value, json};
use spindrift::event::Parton;
use spindrift::files::event_file::{EventFile, audit};
use spindrift::run::assemble::assemble;
use spindrift::run::forecast::Forecast;
use spindrift::run::provenance::event_ids;

const DONE: i32 = 0;
const BAD_REQUEST: i32 = 2;
const STOPPED: i32 = 3;
const MACHINE: i32 = 4;

/// More events than any test waits for.
const ENDLESS: &str = "1000000000";

/// A batch system's grace between SIGTERM and SIGKILL is rarely shorter.
const GRACE: Duration = Duration::from_secs(5);

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

    /// Writes a config and gives its name.
    fn config(&self, config: &Value) -> &'static str {
        fs::write(self.path("run.json"), config.to_string()).unwrap();
        "run.json"
    }

    fn command(&self, arguments: &[&str]) -> Command {
        let mut command = Command::new(assert_cmd::cargo::cargo_bin!("spindrift"));
        command.args(arguments).current_dir(self.folder.path());
        command.env_remove("SLURM_CPUS_PER_TASK");
        command
    }

    fn run(&self, arguments: &[&str]) -> Output {
        self.command(arguments).output().unwrap()
    }

    fn start(&self, arguments: &[&str]) -> Child {
        let mut command = self.command(arguments);
        command.stdout(Stdio::piped()).stderr(Stdio::piped());
        command.spawn().unwrap()
    }

    /// Names of everything in the folder, hidden files too.
    fn names(&self) -> Vec<String> {
        let entries = fs::read_dir(self.folder.path()).unwrap();
        let name = |entry: fs::DirEntry| entry.file_name().into_string().unwrap();
        let mut names: Vec<_> = entries.map(|entry| name(entry.unwrap())).collect();
        names.sort();
        names
    }
}

fn code(output: &Output) -> i32 {
    output.status.code().expect("no signal ended it")
}

fn stdout(output: &Output) -> &str {
    std::str::from_utf8(&output.stdout).unwrap()
}

fn stderr(output: &Output) -> &str {
    std::str::from_utf8(&output.stderr).unwrap()
}

fn assert_ends(output: &Output, expected: i32) {
    assert_eq!(code(output), expected, "{}", stderr(output));
}

fn vacuum() -> Value {
    json!({
        "events": 300,
        "source": {
            "kind": "single", "parton": "u", "energy_GeV": 100.0, "start_virtuality_GeV": 40.0,
        },
    })
}

fn brick() -> Value {
    let mut config = vacuum();
    config["medium"] = json!({
        "field": { "kind": "brick", "temperature_GeV": 0.3, "length_fm": 3.0 },
        "transport": { "kind": "constant", "qhat_GeV2_per_fm": 1.0, "for": "gluon" },
        "effects": [{ "kind": "collinear-expansion" }],
    });
    config
}

fn partons(path: &Path) -> Vec<Parton> {
    let file = EventFile::open(path).unwrap();
    let blocks = file.blocks().map(|block| block.unwrap().partons);
    blocks.flatten().collect()
}

fn content_digest(path: &Path) -> String {
    let report = audit(path).unwrap();
    assert!(report.is_clean(), "{:?}", report.findings);
    report.digest.expect("a sound file has a digest")
}

// ---------------------------------------------------------------------------------------------- words and arguments

#[test]
fn help_says_what_the_program_is_and_names_every_verb() {
    let output = Desk::new().run(&["--help"]);
    assert_ends(&output, DONE);
    let help = stdout(&output);
    for word in [
        "parton shower",
        "medium",
        "HDF5",
        "no\nhadronization",
        "generate",
        "show",
        "audit",
        "field",
        "schema",
        "Exit codes",
    ] {
        assert!(help.contains(word), "{word} is missing in\n{help}");
    }
    let widest = help.lines().map(|line| line.chars().count()).max();
    assert!(widest <= Some(80), "lines of {widest:?} characters");
}

#[test]
fn wrong_arguments_exit_2_with_nothing_on_stdout() {
    let desk = Desk::new();
    let config = desk.config(&vacuum());
    let cases: [&[&str]; 13] = [
        &[],
        &["brew"],
        &["--nonsense"],
        &["generate"],
        &["generate", config, "--nonsense"],
        &["generate", config, config],
        &["generate", config, "--threads", "0"],
        &["generate", config, "--threads", "many"],
        &["generate", config, "--events", "0"],
        &["generate", config, "--events", "-5"],
        &["generate", config, "--seed", "1.5"],
        &["generate", config, "--discard", "--out", "x.h5"],
        &["generate", "absent.json"],
    ];
    for arguments in cases {
        let output = desk.run(arguments);
        assert_ends(&output, BAD_REQUEST);
        assert_eq!(stdout(&output), "", "{arguments:?}");
        assert!(!stderr(&output).is_empty(), "{arguments:?}");
    }
    assert_eq!(desk.names(), [config]);
}

#[test]
fn verbs_and_options_of_later_versions_exit_2_and_say_so() {
    let desk = Desk::new();
    let config = desk.config(&vacuum());
    let cases: [&[&str]; 7] = [
        &["join", "all.h5", "a.h5", "b.h5", "--virtual"],
        &["contrast", "a.h5", "b.h5"],
        &["export", "a.h5", "--to", "lhef"],
        &["generate", config, "--shard", "0/2"],
        &["generate", config, "--shard", "auto/2"],
        &["generate", config, "--ids", "0..10"],
        &["generate", config, "--resume"],
    ];
    for arguments in cases {
        let output = desk.run(arguments);
        assert_ends(&output, BAD_REQUEST);
        assert!(
            stderr(&output).contains("later version"),
            "{}",
            stderr(&output)
        );
    }
    assert_eq!(desk.names(), [config]);
}

#[test]
fn the_schema_is_json() {
    let output = Desk::new().run(&["schema"]);
    assert_ends(&output, DONE);
    let schema: Value = serde_json::from_str(stdout(&output)).unwrap();
    assert_eq!(schema["title"], "spindrift config");
}

// --------------------------------------------------------------------------------------------------- bad requests

#[test]
fn a_bad_config_is_told_with_its_place_and_writes_nothing() {
    let desk = Desk::new();
    let text = "{\n \"events\": 10,\n \"sauce\": { \"kind\": \"single\" }\n}";
    fs::write(desk.path("bad.json"), text).unwrap();
    let output = desk.run(&["generate", "bad.json"]);
    assert_ends(&output, BAD_REQUEST);
    let words = stderr(&output);
    assert!(words.contains("bad.json:3: sauce: unknown key"), "{words}");
    assert!(words.contains("source"), "the nearest key: {words}");
    assert_eq!(desk.names(), ["bad.json"]);
}

#[test]
fn an_unusable_field_writes_nothing() {
    let desk = Desk::new();
    let mut config = brick();
    config["medium"]["field"] = json!({ "kind": "grid", "file": "field.h5" });
    config["medium"]["transport"] = json!({ "kind": "cubic", "coefficient": 4.0, "for": "gluon" });
    let name = desk.config(&config);
    let absent = desk.run(&["generate", name]);
    assert_ends(&absent, BAD_REQUEST);
    assert!(stderr(&absent).contains("field.h5"), "{}", stderr(&absent));
    fs::write(desk.path("field.h5"), "no field").unwrap();
    let foreign = desk.run(&["generate", name]);
    assert_ends(&foreign, BAD_REQUEST);
    assert!(
        stderr(&foreign).contains("not an HDF5 file"),
        "{}",
        stderr(&foreign)
    );
    assert_eq!(desk.names(), ["field.h5", name]);
}

/// A coupling near 1 above a tiny cutoff branches without bound: refused before a file is made, in bounded memory.
#[test]
fn events_that_would_not_end_are_refused() {
    let desk = Desk::new();
    let config = desk.config(&json!({
        "events": 100,
        "source": { "kind": "single", "parton": "g", "energy_GeV": 1000.0, "start_virtuality_GeV": 1000.0 },
        "coupling": { "argument": "fixed", "alpha_s": 0.99 },
        "shower": { "ordering": "collinear", "virtuality_cutoff_GeV": 0.1 }
    }));
    let output = desk.run(&["generate", config]);
    assert_ends(&output, BAD_REQUEST);
    assert!(
        stderr(&output).contains("raise shower.virtuality_cutoff_GeV"),
        "{}",
        stderr(&output)
    );
    assert_eq!(desk.names(), ["run.json"]);
}

#[test]
fn an_existing_output_is_kept_unless_overwritten() {
    let desk = Desk::new();
    let config = desk.config(&vacuum());
    fs::write(desk.path("run.h5"), "precious").unwrap();
    let refused = desk.run(&["generate", config]);
    assert_ends(&refused, BAD_REQUEST);
    assert!(
        stderr(&refused).contains("--overwrite"),
        "{}",
        stderr(&refused)
    );
    assert!(!stderr(&refused).contains("forecast"), "it began to work");
    assert_eq!(fs::read(desk.path("run.h5")).unwrap(), b"precious");
    assert_ends(&desk.run(&["generate", config, "--overwrite"]), DONE);
    assert_eq!(
        EventFile::open(&desk.path("run.h5")).unwrap().event_count(),
        300
    );
    assert_eq!(desk.names(), ["run.h5", config]);
}

#[test]
fn an_input_is_never_overwritten() {
    let desk = Desk::new();
    let config = desk.config(&vacuum());
    let before = fs::read(desk.path(config)).unwrap();
    for out in [config, "./run.json"] {
        let output = desk.run(&["generate", config, "--overwrite", "--out", out]);
        assert_ends(&output, BAD_REQUEST);
        assert!(
            stderr(&output).contains("input of this run"),
            "{}",
            stderr(&output)
        );
    }
    assert_eq!(fs::read(desk.path(config)).unwrap(), before);
}

#[test]
fn an_output_that_cannot_be_made_is_exit_2_before_the_start() {
    let desk = Desk::new();
    let config = desk.config(&vacuum());
    fs::create_dir(desk.path("folder")).unwrap();
    for out in ["absent/x.h5", "run.json/x.h5", "/proc/x.h5", "folder"] {
        let output = desk.run(&["generate", config, "--overwrite", "--out", out]);
        assert_ends(&output, BAD_REQUEST);
        assert!(stderr(&output).contains(out), "{out}: {}", stderr(&output));
        assert!(
            !stderr(&output).contains("forecast"),
            "{out}: it began to work"
        );
    }
    assert_eq!(desk.names(), ["folder", config]);
}

// -------------------------------------------------------------------------------------------------- what a run does

#[test]
fn a_run_writes_a_sound_file_and_sums_up_on_stderr() {
    let desk = Desk::new();
    let config = desk.config(&brick());
    let output = desk.run(&["generate", config, "--seed", "7"]);
    assert_ends(&output, DONE);
    assert_eq!(stdout(&output), "", "words belong on stderr");
    for word in [
        "forecast: 300 events",
        "300 events in",
        "run.h5",
        "final partons",
        "branchings",
        "weights",
        "vacuum",
        "collinear-expansion",
        "overshoots",
        "cut by angle",
        "minimum energy",
        "left the field",
        "parton level, leading logarithm",
    ] {
        assert!(
            stderr(&output).contains(word),
            "{word} is missing in\n{}",
            stderr(&output)
        );
    }
    let path = desk.path("run.h5");
    content_digest(&path);
    let file = EventFile::open(&path).unwrap();
    assert!(file.is_complete());
    let provenance = file.provenance();
    assert_eq!(provenance.program_version, env!("CARGO_PKG_VERSION"));
    assert!(
        provenance
            .command_line
            .ends_with("generate run.json --seed 7")
    );
    assert_eq!(
        (provenance.seed, provenance.first_id, provenance.last_id),
        (7, 0, 299)
    );
    assert_eq!(provenance.open_colour_lines, 1);
    assert_eq!(provenance.effects, ["collinear-expansion"]);
    assert_eq!(provenance.fields[0].name, "brick");
    assert_eq!(provenance.created.len(), "2026-01-01T00:00:00Z".len());
    let resolved: Value = serde_json::from_str(&provenance.config).unwrap();
    assert_eq!(
        resolved["seed"], 7,
        "the config in the file is the one that was run"
    );
    assert_eq!(
        desk.names(),
        ["run.h5", config],
        "nothing is left beside the file"
    );
}

#[test]
fn the_json_summary_agrees_with_the_file() {
    let desk = Desk::new();
    let config = desk.config(&brick());
    let output = desk.run(&[
        "generate",
        config,
        "--json",
        "--out",
        "made.h5",
        "--threads",
        "2",
    ]);
    assert_ends(&output, DONE);
    let summary: Value = serde_json::from_str(stdout(&output)).unwrap();
    let path = desk.path("made.h5");
    let file = EventFile::open(&path).unwrap();
    assert_eq!(summary["output"], "made.h5");
    assert_eq!(summary["complete"], true);
    assert_eq!(summary["threads"], 2);
    assert_eq!(summary["program_version"], env!("CARGO_PKG_VERSION"));
    assert_eq!(summary["commit"], file.provenance().commit.as_str());
    assert_eq!(
        summary["config_digest"],
        file.provenance().config_digest.as_str()
    );
    assert_eq!(summary["seed"], 1);
    for key in ["events", "events_requested", "events_committed"] {
        assert_eq!(summary[key], file.event_count(), "{key}");
    }
    assert_eq!(summary["rows"], file.parton_count());
    // a single hard parton and the final ones
    let finals = file.parton_count() - file.event_count();
    assert_eq!(summary["final_partons"], finals);
    let mean = summary["final_partons_per_event"].as_f64().unwrap();
    assert!((mean - finals as f64 / 300.0).abs() < 1e-12, "{mean}");
    // one parton becomes two at every branching
    let branchings = summary["branchings_per_event"].as_f64().unwrap();
    assert!((branchings - (mean - 1.0)).abs() < 1e-12, "{branchings}");
    let bytes = fs::metadata(&path).unwrap().len();
    assert_eq!(summary["output_bytes"], bytes);
    assert_eq!(summary["weights"]["mean"], 1.0);
    assert_eq!(summary["weights"]["effective_events"], 300.0);
    for (place, channel) in summary["channels"].as_array().unwrap().iter().enumerate() {
        for count in ["trials", "accepted", "overshoots"] {
            let name = format!("channel_{}_{count}", place + 1);
            let stored = file.counters().iter().find(|(counter, _)| *counter == name);
            assert_eq!(channel[count], stored.unwrap().1, "{name}");
        }
    }
    assert_eq!(summary["channels"][1]["name"], "collinear-expansion");
    assert!(summary["wall_time_s"].as_f64() > Some(0.0));
}

#[test]
fn the_multiplicity_and_its_error_are_those_of_the_events() {
    let desk = Desk::new();
    let config = desk.config(&brick());
    let output = desk.run(&["generate", config, "--json"]);
    let summary: Value = serde_json::from_str(stdout(&output)).unwrap();
    let file = EventFile::open(&desk.path("run.h5")).unwrap();
    let mut counts = Vec::new();
    for block in file.blocks() {
        let block = block.unwrap();
        counts.extend(
            block
                .events
                .iter()
                .map(|event| f64::from(event.partons_count - 1)),
        );
    }
    let events = counts.len() as f64;
    let mean = counts.iter().sum::<f64>() / events;
    let square = |count: &f64| (count - mean) * (count - mean);
    let variance = counts.iter().map(square).sum::<f64>() / (events - 1.0);
    let told = |key: &str| summary[key].as_f64().unwrap();
    let error = (variance / events).sqrt();
    assert!((told("final_partons_per_event") / mean - 1.0).abs() < 1e-12);
    assert!((told("final_partons_per_event_standard_error") / error - 1.0).abs() < 1e-9);
}

#[test]
fn quiet_is_quiet() {
    let desk = Desk::new();
    // Weak enough to stay inside the regime of its effect: warnings are told even then.
    let mut config = brick();
    config["medium"]["transport"]["qhat_GeV2_per_fm"] = 0.05.into();
    let output = desk.run(&["generate", desk.config(&config), "--quiet"]);
    assert_ends(&output, DONE);
    assert_eq!((stdout(&output), stderr(&output)), ("", ""));
}

#[test]
fn discard_writes_nothing() {
    let desk = Desk::new();
    let config = desk.config(&brick());
    let output = desk.run(&["generate", config, "--discard", "--json"]);
    assert_ends(&output, DONE);
    assert_eq!(desk.names(), [config]);
    let summary: Value = serde_json::from_str(stdout(&output)).unwrap();
    assert_eq!(summary["output"], Value::Null);
    assert_eq!(summary["events"], 300);
    assert_eq!(summary["events_committed"], 0);
}

#[test]
fn threads_follow_the_command_line_then_the_batch_system() {
    let desk = Desk::new();
    let config = desk.config(&vacuum());
    let threads = |variable: &str, arguments: &[&str]| {
        let mut command = desk.command(&["generate", config, "--discard", "--json"]);
        let output = command
            .args(arguments)
            .env("SLURM_CPUS_PER_TASK", variable)
            .output();
        output.unwrap()
    };
    let told = |output: &Output| {
        let summary: Value = serde_json::from_str(stdout(output)).unwrap();
        summary["threads"].as_u64().unwrap()
    };
    assert_eq!(told(&threads("3", &[])), 3);
    assert_eq!(told(&threads("3", &["--threads", "2"])), 2);
    for wrong in ["0", "-1", "four", ""] {
        let output = threads(wrong, &[]);
        assert_ends(&output, BAD_REQUEST);
        assert!(
            stderr(&output).contains("SLURM_CPUS_PER_TASK"),
            "{}",
            stderr(&output)
        );
    }
}

#[test]
fn the_content_does_not_depend_on_the_number_of_threads() {
    let desk = Desk::new();
    let config = desk.config(&brick());
    let digest = |threads: &str| {
        let name = format!("{threads}.h5");
        let arguments = [
            "generate",
            config,
            "--events",
            "5000",
            "--threads",
            threads,
            "--out",
        ];
        assert_ends(&desk.run(&[&arguments[..], &[&name]].concat()), DONE);
        content_digest(&desk.path(&name))
    };
    let one = digest("1");
    assert_eq!(digest("2"), one);
    assert_eq!(digest("5"), one);
}

#[test]
fn another_seed_gives_other_events() {
    let desk = Desk::new();
    let config = desk.config(&vacuum());
    for seed in ["1", "2"] {
        let arguments = ["generate", config, "--seed", seed, "--out", seed];
        assert_ends(&desk.run(&arguments), DONE);
    }
    assert_ne!(
        content_digest(&desk.path("1")),
        content_digest(&desk.path("2"))
    );
}

#[test]
fn no_effects_are_the_vacuum_to_the_last_bit() {
    let desk = Desk::new();
    let mut twin = brick();
    twin["medium"]["effects"] = json!([]);
    for (name, config) in [("vacuum", vacuum()), ("twin", twin), ("medium", brick())] {
        let config = desk.config(&config);
        assert_ends(&desk.run(&["generate", config, "--out", name]), DONE);
    }
    let vacuum = partons(&desk.path("vacuum"));
    assert!(vacuum.len() > 1000);
    assert_eq!(partons(&desk.path("twin")), vacuum);
    assert_ne!(
        partons(&desk.path("medium")),
        vacuum,
        "the test can tell a difference"
    );
}

#[test]
fn report_verbs_read_what_was_made() {
    let desk = Desk::new();
    assert_ends(&desk.run(&["generate", desk.config(&brick())]), DONE);
    let audit = desk.run(&["audit", "run.h5"]);
    assert_ends(&audit, DONE);
    assert!(stdout(&audit).contains("300 events"), "{}", stdout(&audit));
    let show = desk.run(&["show", "run.h5"]);
    assert_ends(&show, DONE);
    assert!(
        stdout(&show).contains("collinear-expansion"),
        "{}",
        stdout(&show)
    );
    assert_ends(&desk.run(&["show", "run.h5", "--event", "299"]), DONE);
    assert_ends(
        &desk.run(&["show", "run.h5", "--event", "300"]),
        BAD_REQUEST,
    );
    for verb in ["show", "audit"] {
        assert_ends(&desk.run(&[verb, "run.json"]), BAD_REQUEST);
        assert_ends(&desk.run(&[verb, "absent.h5"]), BAD_REQUEST);
    }
    assert_ends(&desk.run(&["field", "check", "run.h5"]), BAD_REQUEST);
}

/// Exits from the medium stand in further columns, are audited and shown; all else of the content stays.
#[test]
fn exits_from_the_medium_are_kept_where_asked_for() {
    let desk = Desk::new();
    let mut config = brick();
    let before = {
        assert_ends(&desk.run(&["generate", desk.config(&config)]), DONE);
        partons(&desk.path("run.h5"))
    };
    let plain = desk.run(&["show", "run.h5", "--event", "7"]);
    assert!(!stdout(&plain).contains("exit t"), "{}", stdout(&plain));
    config["record"] = json!({ "medium_exit": true });
    let mut digests = Vec::new();
    for threads in ["1", "2"] {
        let name = desk.config(&config);
        let arguments = ["generate", name, "--overwrite", "--threads", threads];
        assert_ends(&desk.run(&arguments), DONE);
        digests.push(content_digest(&desk.path("run.h5")));
    }
    assert_eq!(digests[0], digests[1]);
    let file = EventFile::open(&desk.path("run.h5")).unwrap();
    assert!(file.provenance().medium_exit);
    let (mut rows, mut left) = (Vec::new(), 0);
    for block in file.blocks() {
        let block = block.unwrap();
        assert_eq!(block.exits.len(), block.partons.len());
        for exit in block.exits.iter().filter(|exit| !exit.is_none()) {
            left += 1;
            // The brick's length; it is as hot at its end as before, and at rest.
            assert!((exit.place_fm[0] - 3.0).abs() < 1e-5, "{exit:?}");
            assert_eq!((exit.temperature_gev, exit.velocity), (0.3, [0.0; 3]));
        }
        rows.extend(block.partons);
    }
    assert_eq!(rows, before);
    assert!(left >= 300, "{left} exits");
    let summary = desk.run(&["show", "run.h5"]);
    assert!(
        stdout(&summary).contains("left the medium"),
        "{}",
        stdout(&summary)
    );
    let event = desk.run(&["show", "run.h5", "--event", "7"]);
    assert!(stdout(&event).contains("exit t"), "{}", stdout(&event));
}

/// Without a medium the columns are there, empty, with a warning before the start.
#[test]
fn there_is_no_exit_from_the_vacuum() {
    let desk = Desk::new();
    let mut config = vacuum();
    config["record"] = json!({ "medium_exit": true });
    let output = desk.run(&["generate", desk.config(&config)]);
    assert_ends(&output, DONE);
    assert!(
        stderr(&output).contains("no medium to leave"),
        "{}",
        stderr(&output)
    );
    content_digest(&desk.path("run.h5"));
    let file = EventFile::open(&desk.path("run.h5")).unwrap();
    let exits = file.blocks().flat_map(|block| block.unwrap().exits);
    let exits: Vec<_> = exits.collect();
    assert_eq!(exits.len(), file.parton_count());
    assert!(exits.iter().all(|exit| exit.is_none()));
}

#[test]
fn a_reader_that_leaves_early_ends_the_writer_quietly() {
    let desk = Desk::new();
    let mut child = desk.start(&["schema"]);
    drop(child.stdout.take());
    let output = child.wait_with_output().unwrap();
    assert_eq!(stderr(&output), "");
    // no exit code: it was ended by the signal of a broken pipe
    assert!(matches!(output.status.code(), None | Some(DONE)));
}

#[test]
fn a_full_stdout_is_exit_4_not_a_defect() {
    let desk = Desk::new();
    assert_ends(&desk.run(&["generate", desk.config(&brick())]), DONE);
    let cases: [&[&str]; 4] = [
        &["schema"],
        &["show", "run.h5"],
        &["audit", "run.h5"],
        &["generate", "run.json", "--discard", "--json"],
    ];
    for arguments in cases {
        let full = fs::OpenOptions::new()
            .write(true)
            .open("/dev/full")
            .unwrap();
        let output = desk.command(arguments).stdout(full).output().unwrap();
        assert_ends(&output, MACHINE);
        assert!(
            stderr(&output).contains("standard output"),
            "{}",
            stderr(&output)
        );
    }
}

#[test]
fn the_forecast_of_bytes_is_near_the_size_of_the_file() {
    let desk = Desk::new();
    let mut config = brick();
    config["events"] = json!(10_000);
    config["record"] = json!({ "medium_exit": true });
    let name = desk.config(&config);
    assert_ends(&desk.run(&["generate", name]), DONE);
    let made = fs::metadata(desk.path("run.h5")).unwrap().len() as f64;
    let plan = spindrift::config::load(&desk.path(name)).unwrap();
    let generator = assemble(&plan).unwrap().generator;
    let forecast = |record| Forecast::measure(&generator, event_ids(&plan), 1, record);
    // 256 events give the mean multiplicity to 2 %; attributes and indexes, 0.1 MB, are left out of the forecast
    let told = forecast(Some(&plan.record));
    assert!(
        (told.bytes / made - 1.0).abs() < 0.12,
        "{} for {made}",
        told.bytes
    );
    assert!(told.events_sampled >= 256 && told.seconds > 0.0);
    assert_eq!(forecast(None).bytes, 0.0);
}

// ------------------------------------------------------------------------------------------------ stops and failures

/// Waits until a file has grown beyond `bytes`.
fn wait_for(path: &Path, bytes: u64) {
    let start = Instant::now();
    while fs::metadata(path).map_or(0, |about| about.len()) < bytes {
        assert!(
            start.elapsed() < Duration::from_secs(60),
            "{} does not grow",
            path.display()
        );
        std::thread::sleep(Duration::from_millis(10));
    }
}

fn signal(child: &Child, name: &str) {
    // The shell's own kill: a bare machine has no program of that name.
    let command = format!("kill {name} {}", child.id());
    assert!(
        Command::new("sh")
            .args(["-c", &command])
            .status()
            .unwrap()
            .success()
    );
}

#[test]
fn a_signal_stops_a_run_in_good_order() {
    for (name, threads) in [("-TERM", "1"), ("-INT", "2")] {
        let desk = Desk::new();
        let config = desk.config(&vacuum());
        let arguments = [
            "generate",
            config,
            "--events",
            ENDLESS,
            "--json",
            "--threads",
            threads,
        ];
        let child = desk.start(&arguments);
        let path = desk.path("run.h5");
        wait_for(&path, 10_000_000);
        signal(&child, name);
        let sent = Instant::now();
        let output = child.wait_with_output().unwrap();
        assert!(sent.elapsed() < GRACE, "{name}: {:?}", sent.elapsed());
        assert_ends(&output, STOPPED);
        let summary: Value = serde_json::from_str(stdout(&output)).unwrap();
        assert_eq!(summary["complete"], false);
        let file = EventFile::open(&path).unwrap();
        assert!(!file.is_complete());
        assert!(file.event_count() > 10_000);
        assert_eq!(summary["events_committed"], file.event_count());
        let report = audit(&path).unwrap();
        assert!(report.is_clean(), "{:?}", report.findings);
        assert!(
            stderr(&output).contains("stopped by a signal"),
            "{}",
            stderr(&output)
        );
        assert_eq!(desk.names(), ["run.h5", config]);
    }
}

#[test]
fn two_processes_do_not_share_an_output() {
    let desk = Desk::new();
    let config = desk.config(&vacuum());
    let child = desk.start(&["generate", config, "--events", ENDLESS, "--threads", "1"]);
    wait_for(&desk.path("run.h5"), 1);
    let second = desk.run(&["generate", config, "--overwrite"]);
    signal(&child, "-TERM");
    assert_ends(&child.wait_with_output().unwrap(), STOPPED);
    assert_ends(&second, BAD_REQUEST);
    assert!(
        stderr(&second).contains("another process"),
        "{}",
        stderr(&second)
    );
}

#[test]
fn a_full_disk_is_exit_4_and_leaves_a_readable_file() {
    // a limit on the size of files stands for a full disk
    let script = "ulimit -f 8192; exec \"$0\" \"$@\"";
    for threads in ["1", "2"] {
        // A desk each: a child of another test may still hold this process's lock on a file that was read here.
        let desk = Desk::new();
        let config = desk.config(&vacuum());
        let mut command = Command::new("sh");
        command
            .args(["-c", script])
            .arg(assert_cmd::cargo::cargo_bin!("spindrift"));
        command.args([
            "generate",
            config,
            "--events",
            ENDLESS,
            "--overwrite",
            "--threads",
            threads,
        ]);
        let output = command.current_dir(desk.folder.path()).output().unwrap();
        assert_ends(&output, MACHINE);
        assert!(
            stderr(&output).contains("committed before are intact"),
            "{}",
            stderr(&output)
        );
        let path = desk.path("run.h5");
        assert!(!EventFile::open(&path).unwrap().is_complete());
        let report = audit(&path).unwrap();
        assert!(report.is_clean(), "{:?}", report.findings);
        assert_eq!(desk.names(), ["run.h5", config]);
    }
}
