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

#[cfg(test)]
mod tests {
    use super::*;
    use crate::medium::Nucleus;

    /// A field whose first slice is long along `long` (0: x, 1: y) and centred at x = `centre_fm`.
    fn field(long: usize, centre_fm: f64) -> FieldData {
        let axis: Vec<f64> = (-20..=20).map(|step| 0.5 * f64::from(step)).collect();
        let widths = if long == 0 { [4.0, 2.5] } else { [2.5, 4.0] };
        let slice = axis.iter().flat_map(|x| {
            axis.iter().map(move |y| {
                let (x, y) = ((x - centre_fm) / widths[0], y / widths[1]);
                0.4 * (-0.5 * (x * x + y * y)).exp() as f32
            })
        });
        let slice: Vec<f32> = slice.collect();
        FieldData {
            tau_fm: vec![0.6, 1.0],
            x_fm: axis.clone(),
            y_fm: axis,
            temperature_gev: [slice.clone(), slice].concat(),
            ..FieldData::default()
        }
    }

    fn outcome(
        settings: &OriginSettings,
        data: Option<&FieldData>,
        placement: Placement,
    ) -> (Result<Box<dyn Origin>, BirthError>, Vec<String>) {
        let mut warnings = Vec::new();
        let view = FieldView {
            data,
            tabulated: None,
            placement,
            end_temperature_gev: 0.15,
        };
        (births(settings, &view, &mut warnings), warnings)
    }

    #[test]
    fn overlap_warns_where_the_field_lies_otherwise() {
        let overlap = OriginSettings::Overlap {
            nucleus: Nucleus::named("Pb208").unwrap(),
            impact_parameter_fm: 8.0,
        };
        let warnings =
            |data: &FieldData, placement| outcome(&overlap, Some(data), placement).1.join(" ");
        // The overlap is long along y.
        assert_eq!(warnings(&field(1, 0.0), Placement::IDENTITY), "");
        assert!(warnings(&field(0, 0.0), Placement::IDENTITY).contains("rotation_rad"));
        let quarter = Placement::new(std::f64::consts::FRAC_PI_2, [0.0; 2]);
        assert_eq!(warnings(&field(0, 0.0), quarter), "");
        assert!(warnings(&field(1, 2.0), Placement::IDENTITY).contains("shift_fm"));
        assert_eq!(
            warnings(&field(1, 2.0), Placement::new(0.0, [-2.0, 0.0])),
            ""
        );
        // A uniform field has no plane.
        let (births, warnings) = outcome(&overlap, None, Placement::IDENTITY);
        assert!(births.is_ok() && warnings.is_empty());
    }

    #[test]
    fn kinds_that_the_field_cannot_serve_are_refused() {
        let refused = |settings: &OriginSettings, data| {
            let Err(error) = outcome(settings, data, Placement::IDENTITY).0 else {
                panic!("must be refused");
            };
            error.to_string()
        };
        let weighted = OriginSettings::FieldWeighted { power: 4.0 };
        assert!(refused(&weighted, None).starts_with("medium.origin: this field is the same"));
        assert!(
            outcome(&weighted, Some(&field(0, 0.0)), Placement::IDENTITY)
                .0
                .is_ok()
        );
        let (density, data) = (OriginSettings::CollisionDensity, field(0, 0.0));
        assert!(refused(&density, Some(&data)).contains("no collision_density"));
        assert!(refused(&density, None).contains("no collision_density"));
        let list = OriginSettings::List {
            file: "no-such-list.csv".into(),
        };
        assert!(
            refused(&list, None)
                .starts_with("medium.origin.file: no-such-list.csv: cannot be read")
        );
    }
}
