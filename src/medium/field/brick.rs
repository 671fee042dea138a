//! A brick: uniform temperature everywhere from lab time 0 to its length, at rest (common practice for tests of
//! energy-loss models).

use super::{Ceiling, Fluid, Local, Ray, Stretch, TemperatureField};

/// A uniform medium at rest that ends at a lab time.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Brick {
    temperature_gev: f64,
    length_fm: f64,
}

impl Brick {
    /// A brick of a temperature (GeV) and a length (fm).
    pub fn new(temperature_gev: f64, length_fm: f64) -> Brick {
        Brick {
            temperature_gev,
            length_fm,
        }
    }
}

impl TemperatureField for Brick {
    fn stretch(&self, ray: &Ray, end_temperature_gev: f64) -> Option<Stretch> {
        let last_fm = self.length_fm - ray.birth_fm[0];
        let hot = self.temperature_gev >= end_temperature_gev;
        (hot && last_fm > 0.0).then_some(Stretch {
            first_fm: 0.0,
            last_fm,
            cells: 1,
        })
    }

    fn local(&self, _ray: &Ray, _l_fm: f64) -> Local {
        Local {
            temperature_gev: self.temperature_gev,
            flow_factor: 1.0,
        }
    }

    fn fluid(&self, [t, ..]: [f64; 4]) -> Fluid {
        let inside = (0.0..=self.length_fm).contains(&t);
        Fluid {
            temperature_gev: if inside { self.temperature_gev } else { 0.0 },
            ..Fluid::EMPTY
        }
    }

    fn first_tau_fm(&self) -> f64 {
        0.0
    }

    fn ceilings(&self, _ray: &Ray, _stretch: &Stretch, ceilings: &mut Vec<Ceiling>) -> bool {
        ceilings.clear();
        ceilings.push(Ceiling {
            temperature_gev: self.temperature_gev,
            flow_factor: 1.0,
        });
        true
    }
}
