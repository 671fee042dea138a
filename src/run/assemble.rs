//! From a plan to a generator: reads the inputs and builds source, medium and shower.

use std::sync::Arc;

use thiserror::Error;

use super::exits::MediumExits;
use super::generator::Generator;
use super::origins::{BirthError, FieldView, births};
use crate::config::{History, RunPlan};
use crate::files::field_file::{FieldFileError, read_field};
use crate::medium::field::{
    Brick, FieldData, Grid, Longitudinal, Radial, TemperatureField, placed,
};
use crate::medium::origin::{Origin, Placement};
use crate::medium::{FieldKind, FieldSettings, Medium, MediumSettings};
use crate::qcd::CouplingError;
use crate::shower::Shower;
use crate::source;

/// Why a plan cannot be carried out.
#[derive(Debug, Error)]
pub enum AssembleError {
    /// The temperature field cannot be used.
    #[error(transparent)]
    Field(#[from] FieldFileError),
    /// The coupling cannot be had.
    #[error(transparent)]
    Coupling(#[from] CouplingError),
    /// There is no distribution of birth places.
    #[error(transparent)]
    Births(#[from] BirthError),
}

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
    let mut exits = plan.record.medium_exit.then(MediumExits::default);
    let (medium, origin) = match &plan.medium {
        None => (None, None),
        Some(settings) => {
            let Surroundings { field, origin } = surroundings(settings, &mut warnings)?;
            if let Some(exits) = &mut exits {
                exits.field = Some(Arc::clone(&field));
                exits.end_temperature_gev = settings.field.end_temperature_gev;
            }
            (Some(Medium::new(settings, field)), Some(origin))
        }
    };
    let shower = Shower::new(
        &plan.shower,
        &plan.coupling,
        medium,
        source.largest_virtuality_gev(),
    )?;
    let generator = Generator {
        seed: plan.seed,
        source,
        shower,
        origin,
        full_history: plan.record.history == History::Full,
        exits,
    };
    Ok(Assembled {
        generator,
        warnings,
    })
}

/// A field and where jets are born in it.
struct Surroundings {
    field: Arc<dyn TemperatureField>,
    origin: Box<dyn Origin>,
}

fn surroundings(
    settings: &MediumSettings,
    warnings: &mut Vec<String>,
) -> Result<Surroundings, AssembleError> {
    let field = &settings.field;
    let data = match &field.kind {
        FieldKind::Grid { files, .. } => Some(read_field(&files[0])?),
        _ => None,
    };
    let view = FieldView {
        data: data.as_ref(),
        tabulated: None,
        placement: Placement::new(field.rotation_rad, field.shift_fm),
        end_temperature_gev: field.end_temperature_gev,
    };
    let origin = births(&settings.origin, &view, warnings)?;
    if let Some(data) = &data {
        warnings.extend(data.warnings.iter().cloned());
    }
    Ok(Surroundings {
        field: temperature_field(field, data),
        origin,
    })
}

fn temperature_field(
    settings: &FieldSettings,
    data: Option<FieldData>,
) -> Arc<dyn TemperatureField> {
    let hold = settings.hold_before_start;
    let field: Arc<dyn TemperatureField> = match &settings.kind {
        FieldKind::Brick {
            temperature_gev,
            length_fm,
        } => Arc::new(Brick::new(*temperature_gev, *length_fm)),
        FieldKind::Longitudinal {
            temperature_gev,
            start_fm,
        } => Arc::new(Longitudinal::new(*temperature_gev, *start_fm).hold_before_start(hold)),
        FieldKind::Radial {
            amplitude,
            q_per_fm,
            start_fm,
        } => Arc::new(Radial::new(*amplitude, *q_per_fm, *start_fm).hold_before_start(hold)),
        FieldKind::Grid { .. } => {
            let data = data.expect("a grid's file was read before");
            Arc::new(Grid::held(data, settings.end_temperature_gev, hold))
        }
    };
    placed(field, settings.rotation_rad, settings.shift_fm)
}
