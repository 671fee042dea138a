//! From a plan to a generator: reads the inputs and builds source, medium and shower.

use std::fs::Metadata;
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::time::SystemTime;

use super::assemble_error::AssembleError;
use super::exits::MediumExits;
use super::fields::{FieldReadError, FieldSeries, Schedule};
use super::generator::Generator;
use super::provenance::event_ids;
use super::surroundings::{
    Surroundings, births_alone, births_follow_the_field, one_more, surroundings,
};
use crate::config::{History, RunPlan};
use crate::files::field_file::read_outline;
use crate::medium::field::{Brick, TemperatureField};
use crate::medium::origin::{CollisionDensity, Origin, Placement};
use crate::medium::{FieldKind, Medium, MediumSettings, OriginSettings};
use crate::shower::Shower;
use crate::source;

/// A generator, and what the user should hear about its inputs.
pub struct Assembled {
    /// Ready to run.
    pub generator: Generator,
    /// Warnings of the input files.
    pub warnings: Vec<String>,
}

/// Builds the generator of a plan.
///
/// # Errors
/// [`AssembleError`] where an input file or the coupling cannot be used.
pub fn assemble(plan: &RunPlan) -> Result<Assembled, AssembleError> {
    let mut warnings = Vec::new();
    let source = source::build(&plan.source);
    let places = match &plan.medium {
        None => Places::default(),
        Some(settings) => {
            let fields_act = !settings.effects.is_empty() || plan.record.medium_exit;
            let first_id = event_ids(plan).start;
            places(settings, first_id, fields_act, &mut warnings)?
        }
    };
    let shower = Shower::new(
        &plan.shower,
        &plan.coupling,
        places.medium,
        source.largest_virtuality_gev(),
    )?;
    let generator = Generator {
        seed: plan.seed,
        source,
        shower,
        origin: places.origin,
        fields: places.fields,
        full_history: plan.record.history == History::Full,
        exits: plan.record.medium_exit.then(|| MediumExits {
            field: places.field,
            end_temperature_gev: places.end_temperature_gev,
        }),
    };
    Ok(Assembled {
        generator,
        warnings,
    })
}

/// What the hard partons are put into.
#[derive(Default)]
struct Places {
    medium: Option<Medium>,
    /// The field, where the medium has but one.
    field: Option<Arc<dyn TemperatureField>>,
    end_temperature_gev: f64,
    origin: Option<Arc<dyn Origin>>,
    fields: Option<FieldSeries>,
}

fn places(
    settings: &MediumSettings,
    first_id: i64,
    fields_act: bool,
    warnings: &mut Vec<String>,
) -> Result<Places, AssembleError> {
    match &settings.field.kind {
        FieldKind::Grid {
            files,
            events_per_field,
        } if files.len() > 1 => {
            let schedule = Schedule {
                count: files.len(),
                events_per_field: *events_per_field,
            };
            if fields_act || births_follow_the_field(&settings.origin) {
                several(settings, files, schedule, first_id, warnings)
            } else {
                unread(settings, files, schedule)
            }
        }
        FieldKind::Grid { files, .. } => one(settings, files.first(), warnings),
        _ => one(settings, None, warnings),
    }
}

fn one(
    settings: &MediumSettings,
    file: Option<&PathBuf>,
    warnings: &mut Vec<String>,
) -> Result<Places, AssembleError> {
    let file = file.map(PathBuf::as_path);
    let Surroundings {
        field,
        origin,
        warnings: mut told,
    } = surroundings(settings, file)?;
    warnings.append(&mut told);
    Ok(Places {
        medium: Some(Medium::new(settings, Arc::clone(&field))),
        field: Some(field),
        end_temperature_gev: settings.field.end_temperature_gev,
        origin,
        fields: None,
    })
}

/// All files are looked at, but only the first field is read before the run.
fn several(
    settings: &MediumSettings,
    files: &[PathBuf],
    schedule: Schedule,
    first_id: i64,
    warnings: &mut Vec<String>,
) -> Result<Places, AssembleError> {
    let seen: Vec<_> = files.iter().map(|file| version(file)).collect();
    let weights = weights(&settings.origin, files)?;
    let file = &files[schedule.field(first_id)];
    let mut first = surroundings(settings, Some(file))?;
    warnings.append(&mut first.warnings);
    let origin = if births_follow_the_field(&settings.origin) {
        None
    } else {
        first.origin.take()
    };
    let (files, reading) = (files.to_vec(), settings.clone());
    let read = move |index: usize| {
        let file = &files[index];
        if version(file) != seen[index] {
            let path = file.clone();
            return Err(FieldReadError::from(AssembleError::Changed { path }));
        }
        one_more(&reading, file).map_err(FieldReadError::from)
    };
    Ok(Places {
        medium: Some(Medium::new(settings, nothing())),
        field: None,
        end_temperature_gev: settings.field.end_temperature_gev,
        origin,
        fields: Some(FieldSeries::new(schedule, weights, first_id, first, read)),
    })
}

/// Fields of which nothing is needed, as for the vacuum twin: looked at, but not read.
fn unread(
    settings: &MediumSettings,
    files: &[PathBuf],
    schedule: Schedule,
) -> Result<Places, AssembleError> {
    let weights = weights(&settings.origin, files)?;
    Ok(Places {
        medium: None,
        field: None,
        end_temperature_gev: settings.field.end_temperature_gev,
        origin: Some(births_alone(settings)?),
        fields: Some(FieldSeries::unread(schedule, weights)),
    })
}

/// Length and time of the last change, where the system tells them.
fn version(file: &Path) -> Option<(u64, Option<SystemTime>)> {
    let version = |about: Metadata| (about.len(), about.modified().ok());
    file.metadata().ok().map(version)
}

/// The weight of each field in the sample, mean 1; every file is looked at.
fn weights(origin: &OriginSettings, files: &[PathBuf]) -> Result<Vec<f64>, AssembleError> {
    let raw: Result<Vec<_>, _> = files.iter().map(|file| weight(origin, file)).collect();
    let raw = raw?;
    let mean = raw.iter().sum::<f64>() / raw.len() as f64;
    Ok(raw.into_iter().map(|weight| weight / mean).collect())
}

/// A field counts by its number of collisions where these are the places of birth.
fn weight(origin: &OriginSettings, file: &Path) -> Result<f64, AssembleError> {
    let outline = read_outline(file)?;
    if !matches!(origin, OriginSettings::CollisionDensity) {
        return Ok(1.0);
    }
    let density = CollisionDensity::new(&outline, Placement::new(0.0, [0.0; 2]));
    let density = density.map_err(|problem| AssembleError::BirthsIn {
        path: file.to_owned(),
        problem: problem.into(),
    })?;
    Ok(density.integral())
}

/// The medium's own field where every event brings its field along.
fn nothing() -> Arc<dyn TemperatureField> {
    Arc::new(Brick::new(0.0, 0.0))
}
