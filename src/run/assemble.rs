//! From a plan to a generator: reads the inputs and builds source, medium and shower.

use thiserror::Error;

use super::generator::Generator;
use crate::config::{History, RunPlan};
use crate::files::field_file::{FieldFileError, read_grid};
use crate::medium::field::{Brick, Longitudinal, Radial, TemperatureField, placed};
use crate::medium::{FieldKind, FieldSettings, Medium};
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
    let medium = match &plan.medium {
        None => None,
        Some(settings) => Some(Medium::new(
            settings,
            field(&settings.field, &mut warnings)?,
        )),
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
        origin: plan.medium.as_ref().map(|medium| medium.origin),
        full_history: plan.record.history == History::Full,
    };
    Ok(Assembled {
        generator,
        warnings,
    })
}

fn field(
    settings: &FieldSettings,
    warnings: &mut Vec<String>,
) -> Result<Box<dyn TemperatureField>, FieldFileError> {
    let hold = settings.hold_before_start;
    let field: Box<dyn TemperatureField> = match &settings.kind {
        FieldKind::Brick {
            temperature_gev,
            length_fm,
        } => Box::new(Brick::new(*temperature_gev, *length_fm)),
        FieldKind::Longitudinal {
            temperature_gev,
            start_fm,
        } => Box::new(Longitudinal::new(*temperature_gev, *start_fm).hold_before_start(hold)),
        FieldKind::Radial {
            amplitude,
            q_per_fm,
            start_fm,
        } => Box::new(Radial::new(*amplitude, *q_per_fm, *start_fm).hold_before_start(hold)),
        FieldKind::Grid { files, .. } => {
            let mut loaded = read_grid(&files[0], settings.end_temperature_gev, hold)?;
            warnings.append(&mut loaded.warnings);
            Box::new(loaded.grid)
        }
    };
    Ok(placed(field, settings.rotation_rad, settings.shift_fm))
}
