//! From the file to the plan.

use std::fs::File;
use std::io::Read;
use std::path::Path;

use serde_json::Value;

use super::build::{self, Checked};
use super::check::{check, check_override};
use super::error::{ConfigError, ConfigErrors, Problem, Report};
use super::inputs::{self, Inputs};
use super::plan::RunPlan;
use super::raw::{self, Lines, Member, Node, Shape};
use super::{digest, rules};

/// Largest config file that is read, in bytes.
pub const MAX_CONFIG_BYTES: u64 = 8 << 20;

const BYTE_ORDER_MARK: char = '\u{feff}';

/// Values from the command line that take the place of the config's.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Overrides {
    /// Number of events of the whole sample.
    pub events: Option<u64>,
    /// Seed of all random streams.
    pub seed: Option<u64>,
}

impl Overrides {
    fn given(&self) -> impl Iterator<Item = (&'static str, u64)> {
        [("events", self.events), ("seed", self.seed)]
            .into_iter()
            .filter_map(|(name, value)| Some((name, value?)))
    }
}

/// Reads a config file. See [`load_with`].
pub fn load(path: &Path) -> Result<RunPlan, ConfigErrors> {
    load_with(path, &Overrides::default())
}

/// Reads a config file, with values from the command line.
///
/// # Errors
/// Everything that is wrong with it, all at once: see [`Problem`].
pub fn load_with(path: &Path, overrides: &Overrides) -> Result<RunPlan, ConfigErrors> {
    let text = read(path)?;
    load_text(&text, path, overrides)
}

/// Reads the text of a config as if it stood in the file `path`, whose folder its paths start from.
///
/// # Errors
/// As [`load_with`].
pub fn load_text(text: &str, path: &Path, overrides: &Overrides) -> Result<RunPlan, ConfigErrors> {
    let mut root = parse(text, path)?;
    add_missing(&mut root, overrides);
    let lines = Lines::of(text);
    let mut report = Report::default();
    let (mut resolved, places) = check(&root, &lines, &mut report);
    for (name, value) in overrides.given() {
        check_override(name, value, &mut report);
        if let Some(key) = resolved.get_mut(name) {
            *key = Value::from(value);
        }
    }
    let mut warnings = rules::check(&resolved, &places, &mut report);
    let folder = path.parent().unwrap_or(Path::new(""));
    let inputs = inputs::find(&resolved, folder, &places, &mut report);
    if !report.is_empty() {
        return Err(report.finish(path.to_owned()));
    }
    rules::warn_of_inputs(&resolved, &inputs, &mut warnings);
    Ok(plan(resolved, &inputs, warnings))
}

fn plan(resolved: Value, inputs: &Inputs, warnings: Vec<String>) -> RunPlan {
    let root = Checked(&resolved);
    RunPlan {
        events: root.count("events"),
        seed: root.count("seed"),
        source: build::source(root.section("source")),
        coupling: build::coupling(root),
        shower: build::shower(root.section("shower")),
        medium: build::medium(root.section("medium"), inputs),
        record: build::record(root.section("record")),
        digest: digest::of_config(&resolved, &inputs.hashes()),
        inputs: inputs.files(),
        warnings,
        resolved,
    }
}

/// What is wrong with the file as a whole.
struct Whole {
    problem: Problem,
    line: Option<usize>,
    found: String,
    allowed: &'static str,
    remedy: &'static str,
}

impl Whole {
    fn unreadable(found: String, remedy: &'static str) -> Self {
        Whole {
            problem: Problem::Unreadable,
            line: None,
            found,
            allowed: "a readable file of JSON",
            remedy,
        }
    }

    fn syntax(line: usize, found: &str, allowed: &'static str, remedy: &'static str) -> Self {
        Whole {
            problem: Problem::Syntax,
            line: Some(line),
            found: found.to_owned(),
            allowed,
            remedy,
        }
    }

    fn of(self, path: &Path) -> ConfigErrors {
        ConfigErrors {
            file: path.to_owned(),
            errors: vec![ConfigError {
                problem: self.problem,
                line: self.line,
                path: String::new(),
                found: self.found,
                allowed: self.allowed.to_owned(),
                remedy: self.remedy.to_owned(),
                nearest: None,
            }],
            omitted: 0,
        }
    }
}

fn read(path: &Path) -> Result<String, ConfigErrors> {
    let mut bytes = Vec::new();
    File::open(path)
        .and_then(|file| file.take(MAX_CONFIG_BYTES + 1).read_to_end(&mut bytes))
        .map_err(|error| {
            Whole::unreadable(error.to_string(), "check the name and that you may read it").of(path)
        })?;
    if bytes.len() as u64 > MAX_CONFIG_BYTES {
        let found = format!("more than {MAX_CONFIG_BYTES} bytes");
        let remedy = "check that this is a config: none is as large";
        return Err(Whole::unreadable(found, remedy).of(path));
    }
    String::from_utf8(bytes).map_err(|error| not_utf8(&error).of(path))
}

fn not_utf8(error: &std::string::FromUtf8Error) -> Whole {
    let valid = &error.as_bytes()[..error.utf8_error().valid_up_to()];
    let line = 1 + valid.iter().filter(|byte| **byte == b'\n').count();
    Whole::syntax(
        line,
        "bytes that are no UTF-8",
        "text in UTF-8",
        "save the file as UTF-8",
    )
}

fn parse(text: &str, path: &Path) -> Result<Node, ConfigErrors> {
    if text.starts_with(BYTE_ORDER_MARK) {
        return Err(Whole::syntax(
            1,
            "a byte order mark",
            "text in UTF-8 without a byte order mark",
            "save the file as UTF-8 without a byte order mark",
        )
        .of(path));
    }
    if text.trim().is_empty() {
        return Err(Whole::syntax(
            1,
            "an empty file",
            "one JSON object, { \"events\": ..., \"source\": { ... } }",
            "write a config: `spindrift schema` says what it may hold",
        )
        .of(path));
    }
    raw::parse(text).map_err(|error| {
        Whole::syntax(error.line, &error.found, error.allowed, error.remedy).of(path)
    })
}

/// A key that the command line gives need not stand in the file.
fn add_missing(root: &mut Node, overrides: &Overrides) {
    let at = root.at;
    let Shape::Object(members) = &mut root.shape else {
        return;
    };
    for (name, value) in overrides.given() {
        if members.iter().all(|member| member.name != name) {
            let shape = Shape::Number(value.to_string());
            members.push(Member {
                name: name.to_owned(),
                at,
                value: Node { at, shape },
            });
        }
    }
}
