//! A temperature field with the places of birth in it, from settings and files.

use std::path::Path;
use std::sync::Arc;

use super::assemble::AssembleError;
use super::origins::{FieldView, births};
use crate::files::field_file::{FieldFileError, read_field};
use crate::medium::field::{
    Brick, FieldData, Grid, Longitudinal, Radial, TemperatureField, placed,
};
use crate::medium::origin::{Origin, Placement, TemperatureSlice};
use crate::medium::{FieldKind, FieldSettings, MediumSettings, OriginSettings};

/// Points along each axis on which the first temperature of an analytic field is tabulated for places of birth.
const SLICE_POINTS: usize = 401;
/// Nothing reaches further out, fm.
const FURTHEST_FM: f64 = 1000.0;
/// The rim of the hot region is found to this share.
const RIM_SHARE: f64 = 0.98;

/// A field and where jets are born in it.
pub struct Surroundings {
    /// The field as it lies in the lab.
    pub field: Arc<dyn TemperatureField>,
    /// Where jets are born, `None` where that does not depend on the field.
    pub origin: Option<Arc<dyn Origin>>,
}

/// Whether each field has places of birth of its own.
pub fn births_follow_the_field(origin: &OriginSettings) -> bool {
    match origin {
        OriginSettings::FieldWeighted { .. } | OriginSettings::CollisionDensity => true,
        OriginSettings::Fixed { .. }
        | OriginSettings::Overlap { .. }
        | OriginSettings::List { .. } => false,
    }
}

/// Builds the field (that of `file` where it is a grid) with the places of birth, and adds what the user should hear.
///
/// # Errors
/// [`AssembleError`] where a file cannot be used or the field has no places of birth.
pub fn surroundings(
    settings: &MediumSettings,
    file: Option<&Path>,
    warnings: &mut Vec<String>,
) -> Result<Surroundings, AssembleError> {
    let (data, tabulated) = read(settings, file)?;
    let view = view(settings, data.as_ref(), tabulated.as_ref());
    let origin = births(&settings.origin, &view, warnings).map_err(|problem| match file {
        None => AssembleError::Births(problem),
        Some(path) => AssembleError::BirthsIn {
            path: path.to_owned(),
            problem,
        },
    })?;
    if let (Some(data), Some(path)) = (&data, file) {
        let named = |words: &String| format!("{}: {words}", path.display());
        warnings.extend(data.warnings.iter().map(named));
    }
    Ok(Surroundings {
        field: temperature_field(&settings.field, data),
        origin: Some(Arc::from(origin)),
    })
}

/// One more field of a series, with places of birth where it has its own.
///
/// # Errors
/// As [`surroundings`].
pub fn one_more(settings: &MediumSettings, file: &Path) -> Result<Surroundings, AssembleError> {
    if births_follow_the_field(&settings.origin) {
        return surroundings(settings, Some(file), &mut Vec::new());
    }
    let (data, _) = read(settings, Some(file))?;
    Ok(Surroundings {
        field: temperature_field(&settings.field, data),
        origin: None,
    })
}

fn read(
    settings: &MediumSettings,
    file: Option<&Path>,
) -> Result<(Option<FieldData>, Option<TemperatureSlice>), FieldFileError> {
    let data = file.map(read_field).transpose()?;
    let is_radial = matches!(settings.field.kind, FieldKind::Radial { .. });
    let tabulated = is_radial.then(|| first_slice(&settings.field));
    Ok((data, tabulated))
}

fn view<'a>(
    settings: &MediumSettings,
    data: Option<&'a FieldData>,
    tabulated: Option<&'a TemperatureSlice>,
) -> FieldView<'a> {
    let field = &settings.field;
    FieldView {
        data,
        tabulated,
        placement: Placement::new(field.rotation_rad, field.shift_fm),
        end_temperature_gev: field.end_temperature_gev,
    }
}

/// The first temperature of an analytic field across the beam, in its own frame, out to where it is cold.
fn first_slice(settings: &FieldSettings) -> TemperatureSlice {
    let unplaced = FieldSettings {
        rotation_rad: 0.0,
        shift_fm: [0.0; 2],
        ..settings.clone()
    };
    let field = temperature_field(&unplaced, None);
    let at = |[x, y]: [f64; 2]| {
        field
            .fluid([field.first_tau_fm(), x, y, 0.0])
            .temperature_gev
    };
    let mut rim_fm = FURTHEST_FM;
    while at([RIM_SHARE * rim_fm, 0.0]) < settings.end_temperature_gev && rim_fm > 1.0 / FURTHEST_FM
    {
        rim_fm *= RIM_SHARE;
    }
    TemperatureSlice::tabulated(rim_fm, SLICE_POINTS, at)
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
