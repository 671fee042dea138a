//! A temperature field with the places of birth in it, from settings and files.

use std::path::Path;
use std::sync::Arc;

use super::assemble_error::AssembleError;
use super::origins::{FieldView, births};
use crate::files::field_file::{FieldFileError, LoadedGrid, read_grid};
use crate::medium::field::{FieldData, Grid, TemperatureField, analytic, placed};
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
    /// What the user should hear.
    pub warnings: Vec<String>,
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

/// Builds the field (that of `file` where it is a grid) with the places of birth.
///
/// # Errors
/// [`AssembleError`] where a file cannot be used or the field has no places of birth.
pub fn surroundings(
    settings: &MediumSettings,
    file: Option<&Path>,
) -> Result<Surroundings, AssembleError> {
    let loaded = file.map(|file| read(settings, file)).transpose()?;
    let (grid, data) = loaded
        .map(|loaded| (loaded.grid, loaded.first_slice))
        .unzip();
    let tabulated = compared_with_births(settings).then(|| first_slice(&settings.field));
    let view = view(settings, data.as_ref(), tabulated.as_ref());
    let mut warnings = Vec::new();
    let origin = births(&settings.origin, &view, &mut warnings);
    let origin = origin.map_err(|problem| match file {
        Some(path) if births_follow_the_field(&settings.origin) => AssembleError::BirthsIn {
            path: path.to_owned(),
            problem,
        },
        _ => AssembleError::Births(problem),
    })?;
    warnings.extend(data.iter().flat_map(|data| data.warnings.iter().cloned()));
    Ok(Surroundings {
        warnings: named(file, warnings),
        field: temperature_field(&settings.field, grid),
        origin: Some(Arc::from(origin)),
    })
}

/// One more field of a series, with places of birth where it has its own.
///
/// # Errors
/// As [`surroundings`].
pub fn one_more(settings: &MediumSettings, file: &Path) -> Result<Surroundings, AssembleError> {
    if births_follow_the_field(&settings.origin) {
        return surroundings(settings, Some(file));
    }
    let LoadedGrid { grid, first_slice } = read(settings, file)?;
    Ok(Surroundings {
        warnings: named(Some(file), first_slice.warnings),
        field: temperature_field(&settings.field, Some(grid)),
        origin: None,
    })
}

fn read(settings: &MediumSettings, file: &Path) -> Result<LoadedGrid, FieldFileError> {
    let field = &settings.field;
    read_grid(file, field.end_temperature_gev, field.hold_before_start)
}

/// Where jets are born, as far as no field is needed for it.
///
/// # Errors
/// [`AssembleError::Births`] where the settings or the list give no distribution.
pub fn births_alone(settings: &MediumSettings) -> Result<Arc<dyn Origin>, AssembleError> {
    let view = view(settings, None, None);
    let origin = births(&settings.origin, &view, &mut Vec::new())?;
    Ok(Arc::from(origin))
}

/// Warnings about a file, with its name.
fn named(file: Option<&Path>, warnings: Vec<String>) -> Vec<String> {
    match file {
        None => warnings,
        Some(path) => {
            let named = |words: String| format!("{}: {words}", path.display());
            warnings.into_iter().map(named).collect()
        }
    }
}

/// Whether an analytic field is looked at across the beam: it weights births, or its plane is compared with theirs.
fn compared_with_births(settings: &MediumSettings) -> bool {
    let is_radial = matches!(settings.field.kind, FieldKind::Radial { .. });
    let is_looked_at = matches!(
        settings.origin,
        OriginSettings::FieldWeighted { .. } | OriginSettings::Overlap { .. }
    );
    is_radial && is_looked_at
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

fn temperature_field(settings: &FieldSettings, grid: Option<Grid>) -> Arc<dyn TemperatureField> {
    match grid {
        Some(grid) => placed(Arc::new(grid), settings.rotation_rad, settings.shift_fm),
        None => analytic(settings).expect("a grid's file was read before"),
    }
}
