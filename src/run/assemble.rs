//! From a plan to a generator: reads the inputs and builds source, medium and shower.

use thiserror::Error;

use super::generator::Generator;
use super::origins::{BirthError, FieldView, births};
use crate::config::{History, RunPlan};
use crate::files::field_file::{FieldFileError, read_field};
use crate::medium::field::{Brick, Grid, Longitudinal, TemperatureField};
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
    let (medium, origin) = match &plan.medium {
        None => (None, None),
        Some(settings) => {
            let Surroundings { field, origin } = surroundings(settings, &mut warnings)?;
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
    };
    Ok(Assembled {
        generator,
        warnings,
    })
}

/// A field and where jets are born in it.
struct Surroundings {
    field: Box<dyn TemperatureField>,
    origin: Box<dyn Origin>,
}

fn surroundings(
    settings: &MediumSettings,
    warnings: &mut Vec<String>,
) -> Result<Surroundings, AssembleError> {
    let FieldSettings {
        kind,
        end_temperature_gev,
    } = &settings.field;
    let data = match kind {
        FieldKind::Grid { file } => Some(read_field(file)?),
        _ => None,
    };
    let view = FieldView {
        data: data.as_ref(),
        tabulated: None,
        placement: Placement::IDENTITY,
        end_temperature_gev: *end_temperature_gev,
    };
    let origin = births(&settings.origin, &view, warnings)?;
    let field: Box<dyn TemperatureField> = match (kind, data) {
        (
            FieldKind::Brick {
                temperature_gev,
                length_fm,
            },
            _,
        ) => Box::new(Brick::new(*temperature_gev, *length_fm)),
        (
            FieldKind::Longitudinal {
                temperature_gev,
                start_fm,
            },
            _,
        ) => Box::new(Longitudinal::new(*temperature_gev, *start_fm)),
        (FieldKind::Grid { .. }, data) => {
            let mut data = data.expect("a grid's file was read above");
            warnings.append(&mut data.warnings);
            Box::new(Grid::new(data, *end_temperature_gev))
        }
    };
    Ok(Surroundings { field, origin })
}
