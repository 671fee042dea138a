//! A field turned about the beam and moved in the transverse plane: what the field has at X stands at R(angle) X + shift.

use std::sync::Arc;

use super::{Ceiling, Fluid, Local, Ray, Stretch, TemperatureField};

/// A field somewhere else.
pub struct Placed {
    field: Arc<dyn TemperatureField>,
    sin: f64,
    cos: f64,
    shift_fm: [f64; 2],
}

/// A field turned by an angle (radians, from x to y) about the beam, then shifted (x, y in fm); the field itself where
/// neither does anything.
pub fn placed(
    field: Arc<dyn TemperatureField>,
    rotation_rad: f64,
    shift_fm: [f64; 2],
) -> Arc<dyn TemperatureField> {
    if rotation_rad == 0.0 && shift_fm == [0.0; 2] {
        field
    } else {
        Arc::new(Placed::new(field, rotation_rad, shift_fm))
    }
}

impl Placed {
    /// A field turned by an angle (radians, from x to y) about the beam, then shifted (x, y in fm).
    pub fn new(field: Arc<dyn TemperatureField>, rotation_rad: f64, shift_fm: [f64; 2]) -> Placed {
        let (sin, cos) = rotation_rad.sin_cos();
        Placed {
            field,
            sin,
            cos,
            shift_fm,
        }
    }

    #[inline]
    fn turn_back(&self, [x, y]: [f64; 2]) -> [f64; 2] {
        [self.cos * x + self.sin * y, self.cos * y - self.sin * x]
    }

    #[inline]
    fn turn(&self, [x, y]: [f64; 2]) -> [f64; 2] {
        [self.cos * x - self.sin * y, self.cos * y + self.sin * x]
    }

    /// A lab point as the field knows it.
    #[inline]
    fn point(&self, [t, x, y, z]: [f64; 4]) -> [f64; 4] {
        let [x, y] = self.turn_back([x - self.shift_fm[0], y - self.shift_fm[1]]);
        [t, x, y, z]
    }

    /// A lab ray as the field knows it.
    #[inline]
    fn ray(&self, ray: &Ray) -> Ray {
        let [nx, ny, nz] = ray.direction;
        let [nx, ny] = self.turn_back([nx, ny]);
        Ray {
            birth_fm: self.point(ray.birth_fm),
            direction: [nx, ny, nz],
        }
    }
}

impl TemperatureField for Placed {
    fn stretch(&self, ray: &Ray, end_temperature_gev: f64) -> Option<Stretch> {
        self.field.stretch(&self.ray(ray), end_temperature_gev)
    }

    fn local(&self, ray: &Ray, l_fm: f64) -> Local {
        self.field.local(&self.ray(ray), l_fm)
    }

    fn sample(
        &self,
        ray: &Ray,
        first_fm: f64,
        step_fm: f64,
        count: usize,
        samples: &mut Vec<Local>,
    ) {
        self.field
            .sample(&self.ray(ray), first_fm, step_fm, count, samples);
    }

    fn fluid(&self, point_fm: [f64; 4]) -> Fluid {
        let fluid = self.field.fluid(self.point(point_fm));
        let [ux, uy, uz] = fluid.velocity;
        let [ux, uy] = self.turn([ux, uy]);
        Fluid {
            velocity: [ux, uy, uz],
            ..fluid
        }
    }

    fn first_tau_fm(&self) -> f64 {
        self.field.first_tau_fm()
    }

    fn ceilings(&self, ray: &Ray, stretch: &Stretch, ceilings: &mut Vec<Ceiling>) -> bool {
        self.field.ceilings(&self.ray(ray), stretch, ceilings)
    }

    fn has_artificial_edge(&self) -> bool {
        self.field.has_artificial_edge()
    }
}
