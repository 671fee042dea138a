//! Boost-invariant longitudinal expansion of a conformal fluid: T = T0 (tau0/tau)^(1/3), u = (t, 0, 0, z)/tau
//! (Bjorken 1983, Phys. Rev. D 27:140). The medium exists from tau0 on.

use super::{Local, Ray, Stretch, TemperatureField};

/// The longitudinal solution, uniform in the transverse plane.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Longitudinal {
    temperature_gev: f64,
    start_fm: f64,
}

/// Cells over a first tau: the transport coefficient falls as a power of tau, so equal cells must resolve its start.
const CELLS_PER_FIRST_TAU: f64 = 4.0;
/// More cells than this bring nothing at the accuracy of a linear piece.
const MOST_CELLS: f64 = 1000.0;

impl Longitudinal {
    /// The solution with a temperature (GeV) at a proper time (fm).
    pub fn new(temperature_gev: f64, start_fm: f64) -> Longitudinal {
        Longitudinal {
            temperature_gev,
            start_fm,
        }
    }
}

impl TemperatureField for Longitudinal {
    fn stretch(&self, ray: &Ray, end_temperature_gev: f64) -> Option<Stretch> {
        let cooling = self.temperature_gev / end_temperature_gev;
        let end_tau_fm = self.start_fm * cooling * cooling * cooling;
        let first_fm = ray.distance_to_proper_time(self.start_fm)?;
        let last_fm = ray.distance_to_proper_time(end_tau_fm)?;
        if last_fm <= first_fm {
            return None;
        }
        let [t, _, _, z] = ray.at(first_fm);
        let first_tau = (t * t - z * z).max(0.0).sqrt().max(self.start_fm);
        let cells = (CELLS_PER_FIRST_TAU * (last_fm - first_fm) / first_tau)
            .ceil()
            .clamp(1.0, MOST_CELLS);
        Some(Stretch {
            first_fm,
            last_fm,
            cells: cells as usize,
        })
    }

    fn local(&self, ray: &Ray, l_fm: f64) -> Local {
        let [t, _, _, z] = ray.at(l_fm);
        let tau = (t * t - z * z).max(0.0).sqrt().max(self.start_fm);
        let temperature_gev = self.temperature_gev * libm::cbrt(self.start_fm / tau);
        Local {
            temperature_gev,
            flow_factor: (t - ray.direction[2] * z) / tau,
        }
    }
}
