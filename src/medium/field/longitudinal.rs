//! Boost-invariant longitudinal expansion of a conformal fluid: T = T0 (tau0/tau)^(1/3), u = (t, 0, 0, z)/tau
//! (Bjorken 1983, Phys. Rev. D 27:140). The medium exists from tau0 on, or, held, with its first temperature before.

use super::{
    Ceiling, Fluid, Local, Ray, Stretch, TemperatureField, is_before, milne_flow_factor,
    on_light_cone, proper_time_fm,
};

/// The longitudinal solution, uniform in the transverse plane.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Longitudinal {
    temperature_gev: f64,
    start_fm: f64,
    hold: bool,
}

/// Cells over a first tau: the transport coefficient falls as a power of tau, so equal cells must resolve its start.
const CELLS_PER_FIRST_TAU: f64 = 4.0;
/// More cells than this bring nothing at the accuracy of a linear piece.
const MOST_CELLS: f64 = 1000.0;
/// Segments with a ceiling of their own.
const SEGMENTS: usize = 8;
/// The temperature of a segment's start bounds the segment but for rounding.
const ROUNDING: f64 = 1.0 + 1e-12;

impl Longitudinal {
    /// The solution with a temperature (GeV) at a proper time (fm).
    pub fn new(temperature_gev: f64, start_fm: f64) -> Longitudinal {
        Longitudinal {
            temperature_gev,
            start_fm,
            hold: false,
        }
    }

    /// Whether the first temperature stands for what was before the start.
    pub fn hold_before_start(self, hold: bool) -> Longitudinal {
        Longitudinal { hold, ..self }
    }

    fn temperature_gev(&self, tau_fm: f64) -> f64 {
        self.temperature_gev * libm::cbrt(self.start_fm / tau_fm.max(self.start_fm))
    }
}

impl TemperatureField for Longitudinal {
    fn stretch(&self, ray: &Ray, end_temperature_gev: f64) -> Option<Stretch> {
        let cooling = self.temperature_gev / end_temperature_gev;
        let end_tau_fm = self.start_fm * cooling * cooling * cooling;
        if end_tau_fm <= self.start_fm {
            return None;
        }
        let first_fm = if self.hold {
            0.0
        } else {
            ray.distance_to_proper_time(self.start_fm)?
        };
        let last_fm = ray.distance_to_proper_time(end_tau_fm)?;
        if last_fm <= first_fm {
            return None;
        }
        let first_tau = proper_time_fm(ray.at(first_fm)).max(self.start_fm);
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
        let point = ray.at(l_fm);
        let tau = self.known_tau_fm(point);
        Local {
            temperature_gev: self.temperature_gev(tau),
            flow_factor: milne_flow_factor(point, ray.direction[2], tau),
        }
    }

    fn fluid(&self, point_fm: [f64; 4]) -> Fluid {
        let tau = proper_time_fm(point_fm);
        if is_before(tau, self.start_fm) && !self.hold {
            return Fluid::EMPTY;
        }
        Fluid::from_milne(self.temperature_gev(tau), [0.0; 3], point_fm)
    }

    fn first_tau_fm(&self) -> f64 {
        self.start_fm
    }

    /// T and the flow factor fall along a ray, so a segment's start bounds it.
    fn ceilings(&self, ray: &Ray, stretch: &Stretch, ceilings: &mut Vec<Ceiling>) -> bool {
        let segment_fm = (stretch.last_fm - stretch.first_fm) / SEGMENTS as f64;
        ceilings.clear();
        if on_light_cone(ray.at(stretch.first_fm)) {
            return false;
        }
        ceilings.extend((0..SEGMENTS).map(|segment| {
            let start = self.local(ray, stretch.first_fm + segment as f64 * segment_fm);
            Ceiling {
                temperature_gev: start.temperature_gev * ROUNDING,
                flow_factor: start.flow_factor * ROUNDING,
            }
        }));
        true
    }
}

impl Longitudinal {
    /// Proper time of a point of a stretch: rounding must not put its start before tau0.
    #[inline]
    fn known_tau_fm(&self, point_fm: [f64; 4]) -> f64 {
        let tau = proper_time_fm(point_fm);
        if self.hold {
            tau
        } else {
            tau.max(self.start_fm)
        }
    }
}
