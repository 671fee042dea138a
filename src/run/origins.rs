//! From settings to a distribution of birth places, with the inputs that each kind needs.

use thiserror::Error;

use crate::files::number_table::TableFileError;
use crate::files::place_list::read_place_list;
use crate::medium::OriginSettings;
use crate::medium::field::FieldData;
use crate::medium::origin::{
    CollisionDensity, FieldWeighted, Fixed, Origin, OriginError, Overlap, Placement,
    TemperatureSlice,
};

/// Why there is no distribution of birth places.
#[derive(Debug, Error)]
pub enum BirthError {
    /// The settings and the field do not give one.
    #[error("medium.origin: {0}")]
    Origin(#[from] OriginError),
    /// The list cannot be used.
    #[error("medium.origin.file: {0}")]
    List(#[from] TableFileError),
}

/// What is known of a field before it is given away.
pub struct FieldView<'a> {
    /// The numbers of a gridded field.
    pub data: Option<&'a FieldData>,
    /// The first temperature across the beam of a field without a grid that is not uniform there.
    pub tabulated: Option<&'a TemperatureSlice>,
    /// Where the field lies in the lab.
    pub placement: Placement,
    /// Temperature in GeV below which the medium has no effect.
    pub end_temperature_gev: f64,
}

impl FieldView<'_> {
    /// The first temperature across the beam, in the field's own frame.
    fn slice(&self) -> Result<TemperatureSlice, OriginError> {
        match self.data {
            Some(data) => TemperatureSlice::of_grid(data),
            None => self.tabulated.cloned().ok_or(OriginError::Uniform),
        }
    }
}

/// Power of the temperature that weights the plane of a field: the energy density of an ideal gas of massless particles.
const PLANE_POWER: f64 = 4.0;

/// Builds the distribution, with a warning where `overlap` and the field disagree on centre or plane.
///
/// # Errors
/// [`BirthError`] where the settings, the field or the list do not give one.
pub fn births(
    settings: &OriginSettings,
    field: &FieldView,
    warnings: &mut Vec<String>,
) -> Result<Box<dyn Origin>, BirthError> {
    Ok(match settings {
        OriginSettings::Fixed { x_fm, y_fm } => Box::new(Fixed {
            x_fm: *x_fm,
            y_fm: *y_fm,
        }),
        OriginSettings::Overlap {
            nucleus,
            impact_parameter_fm,
        } => {
            let overlap = Overlap::new(nucleus, *impact_parameter_fm)?;
            // A field without a slice at mid-rapidity has no plane to disagree with.
            let slice = field.slice().ok();
            let plane = slice.and_then(|slice| slice.plane(PLANE_POWER, field.end_temperature_gev));
            if let Some(plane) = plane {
                let disagreement = overlap
                    .plane()
                    .disagreement(&plane.placed(&field.placement));
                warnings
                    .extend(disagreement.map(|words| format!("medium.origin overlap: {words}")));
            }
            Box::new(overlap)
        }
        OriginSettings::FieldWeighted { power } => Box::new(FieldWeighted::new(
            field.slice()?,
            *power,
            field.end_temperature_gev,
            field.placement,
        )?),
        OriginSettings::CollisionDensity => {
            let data = field.data.ok_or(OriginError::NoCollisionDensity)?;
            Box::new(CollisionDensity::new(data, field.placement)?)
        }
        OriginSettings::List { file } => Box::new(read_place_list(file)?),
    })
}
