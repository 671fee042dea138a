//! Fields in closed form, from settings.

use std::sync::Arc;

use super::{Brick, Longitudinal, Radial, TemperatureField, placed};
use crate::medium::{FieldKind, FieldSettings};

/// The field of some settings as it lies in the lab; `None` for a grid, whose numbers stand in a file.
pub fn analytic(settings: &FieldSettings) -> Option<Arc<dyn TemperatureField>> {
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
        FieldKind::Grid { .. } => return None,
    };
    Some(placed(field, settings.rotation_rad, settings.shift_fm))
}
