//! Where the final partons of an event left the medium, worked out from its rows.

use std::sync::Arc;

use crate::event::{MediumExit, Parton, Status};
use crate::medium::exit::exit;
use crate::medium::field::{Ray, TemperatureField};
use crate::shower::kinematics::direction;

/// The medium that partons leave, whether or not an effect acts in it; none by default.
#[derive(Clone, Default)]
pub struct MediumExits {
    /// The field, where a run has but one; `None` in vacuum.
    pub field: Option<Arc<dyn TemperatureField>>,
    /// Temperature in GeV below which there is no medium.
    pub end_temperature_gev: f64,
}

impl MediumExits {
    /// Appends the exit of each row; `event_field` is the field of the event, where it has its own.
    pub fn append(
        &self,
        event_field: Option<&dyn TemperatureField>,
        rows: &[Parton],
        exits: &mut Vec<MediumExit>,
    ) {
        let field = event_field.or(self.field.as_deref());
        exits.extend(rows.iter().map(|row| match field {
            Some(field) if row.status == Status::Final => self.of_parton(field, row),
            _ => MediumExit::NONE,
        }));
    }

    fn of_parton(&self, field: &dyn TemperatureField, row: &Parton) -> MediumExit {
        let ray = Ray {
            // As the file tells it, so that the exit lies on the path that a reader sees.
            birth_fm: row.birth_fm.map(f64::from),
            direction: direction(row.momentum_gev),
        };
        // A parton at rest goes nowhere.
        if !ray.direction.iter().all(|component| component.is_finite()) {
            return MediumExit::NONE;
        }
        match exit(field, &ray, self.end_temperature_gev) {
            None => MediumExit::NONE,
            Some(found) => MediumExit {
                place_fm: found.point_fm.map(|component| component as f32),
                temperature_gev: found.fluid.temperature_gev as f32,
                velocity: found.fluid.velocity.map(|component| component as f32),
            },
        }
    }
}
