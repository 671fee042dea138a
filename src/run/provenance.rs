//! What an event file says about the run that makes it.

use std::ffi::OsString;
use std::fs;
use std::path::{Path, PathBuf};

use super::clock::now_utc;
use super::fields::FieldSeries;
use super::generator::Generator;
use super::{EventGenerator, RunCounters};
use crate::config::RunPlan;
use crate::files::event_file::{FieldEntry, Kinematics, Provenance};
use crate::medium::{FieldKind, FieldSettings, effect_names};
use crate::shower::Ordering;

/// Version of the program.
pub const PROGRAM_VERSION: &str = env!("CARGO_PKG_VERSION");

/// The commit that the program was built from, with " modified" where the sources were not those of the commit;
/// "unknown" where it was built outside its repository.
pub const COMMIT: &str = env!("SPINDRIFT_COMMIT");

/// Where the system tells its name.
const HOST_NAME_FILES: [&str; 2] = ["/proc/sys/kernel/hostname", "/etc/hostname"];

/// Characters that a shell takes as they are.
const PLAIN_CHARACTERS: &str = "-_./=:,+@%";

/// The event numbers of a plan as the event file counts them.
pub fn event_ids(plan: &RunPlan) -> std::ops::Range<i64> {
    let events = i64::try_from(plan.events);
    0..events.expect("the config bounds the number of events far below 2^63")
}

/// The provenance of a run of `plan` by `generator`, started now, on this machine, by this process's command line.
pub fn describe(plan: &RunPlan, generator: &Generator) -> Provenance {
    let ids = event_ids(plan);
    let medium = plan.medium.as_ref();
    let counters = generator.counters(&generator.worker());
    Provenance {
        program_version: PROGRAM_VERSION.to_owned(),
        commit: COMMIT.to_owned(),
        command_line: command_line(std::env::args_os()),
        host: host(),
        created: now_utc(),
        config: plan.resolved.to_string(),
        config_digest: plan.digest.clone(),
        seed: plan.seed,
        first_id: ids.start,
        last_id: ids.end - 1,
        kinematics: match plan.shower.ordering {
            Ordering::Virtuality | Ordering::Angular => Kinematics::Exact,
            Ordering::Collinear => Kinematics::Collinear,
        },
        open_colour_lines: generator.source.open_colour_lines() as i32,
        // neither source that is built has one
        cross_section: None,
        history: plan.record.history,
        compression: plan.record.compression,
        momentum_bits: plan.record.momentum_bits,
        medium_exit: plan.record.medium_exit,
        effects: medium.map_or(Vec::new(), |medium| effect_names(&medium.effects)),
        fields: medium.map_or(Vec::new(), |medium| {
            let weights = generator.fields.as_ref().map(FieldSeries::weights);
            fields(plan, &medium.field, weights)
        }),
        counters: counters.named().into_iter().map(|(name, _)| name).collect(),
    }
}

/// The fields that the events count, with their weights.
fn fields(plan: &RunPlan, settings: &FieldSettings, weights: Option<&[f64]>) -> Vec<FieldEntry> {
    let analytic = |name: &str| {
        vec![FieldEntry {
            name: name.to_owned(),
            sha256: String::new(),
            weight: 1.0,
        }]
    };
    match &settings.kind {
        FieldKind::Brick { .. } => analytic("brick"),
        FieldKind::Longitudinal { .. } => analytic("longitudinal"),
        FieldKind::Radial { .. } => analytic("radial"),
        FieldKind::Grid { files, .. } => {
            let entry = |(index, file): (usize, &PathBuf)| FieldEntry {
                weight: weights.map_or(1.0, |weights| weights[index]),
                ..file_entry(plan, file)
            };
            files.iter().enumerate().map(entry).collect()
        }
    }
}

fn file_entry(plan: &RunPlan, file: &Path) -> FieldEntry {
    let input = plan.inputs.iter().find(|input| input.path == *file);
    let input = input.expect("the config hashes every input file");
    let name = file.file_name().unwrap_or(file.as_os_str());
    FieldEntry {
        name: name.to_string_lossy().into_owned(),
        sha256: input.sha256.clone(),
        weight: 1.0,
    }
}

/// Arguments as a shell would take them back; bytes that are no UTF-8 are replaced.
fn command_line(arguments: impl Iterator<Item = OsString>) -> String {
    let quoted: Vec<_> = arguments
        .map(|argument| quote(&argument.to_string_lossy()))
        .collect();
    quoted.join(" ")
}

fn quote(argument: &str) -> String {
    let is_plain =
        |character: char| character.is_alphanumeric() || PLAIN_CHARACTERS.contains(character);
    if !argument.is_empty() && argument.chars().all(is_plain) {
        argument.to_owned()
    } else {
        format!("'{}'", argument.replace('\'', r"'\''"))
    }
}

fn host() -> String {
    let read = |file: &&str| fs::read_to_string(file).ok();
    let names = HOST_NAME_FILES.iter().filter_map(read);
    names
        .map(|name| name.trim().to_owned())
        .find(|name| !name.is_empty())
        .unwrap_or_else(|| "unknown".to_owned())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_command_line_can_be_typed_again() {
        let arguments = [
            "spindrift",
            "generate",
            "my config.json",
            "--out=a.h5",
            "it's",
            "",
        ];
        assert_eq!(
            command_line(arguments.into_iter().map(OsString::from)),
            r"spindrift generate 'my config.json' --out=a.h5 'it'\''s' ''"
        );
    }
}
