//! Temperature fields: temperature and flow along a light-like ray.

mod analytic;
mod brick;
mod data;
mod grid;
mod longitudinal;
mod placed;
mod radial;

pub use analytic::analytic;
pub use brick::Brick;
pub use data::FieldData;
pub use grid::{Frame, Grid, GridBuilder, HotScan};
pub use longitudinal::Longitudinal;
pub use placed::{Placed, placed};
pub use radial::Radial;

/// The larger of two numbers; the second where the first is NaN. (One instruction, which `f64::max` is not.)
#[inline(always)]
pub(crate) fn larger(one: f64, other: f64) -> f64 {
    if one > other { one } else { other }
}

/// The smaller of two numbers; the second where the first is NaN.
#[inline(always)]
pub(crate) fn smaller(one: f64, other: f64) -> f64 {
    if one < other { one } else { other }
}

/// The longitudinal part of p.u/E of a light-like parton along a ray in a fluid at rest in Milne coordinates,
/// (t - nz z)/tau = sqrt(1 - nz^2) cosh(eta - y), y the ray's rapidity; at tau = 0 its value along a ray from the hard
/// vertex, sqrt(1 - nz^2).
///
/// It never grows along a ray: its derivative is -(z - nz t)^2/tau^3, and z - nz t = z_0 - nz t_0 is constant.
#[inline]
pub(crate) fn milne_flow_factor([t, _, _, z]: [f64; 4], nz: f64, tau_fm: f64) -> f64 {
    if tau_fm > 0.0 {
        (t - nz * z) / tau_fm
    } else {
        (1.0 - nz * nz).sqrt()
    }
}

/// Milne proper time sqrt(t^2 - z^2) of a point `[t, x, y, z]`, fm.
#[inline]
pub(crate) fn proper_time_fm([t, _, _, z]: [f64; 4]) -> f64 {
    larger(t * t - z * z, 0.0).sqrt()
}

/// Whether a point lies on the light cone of the hard vertex but not at the vertex: the flow factor is unbounded there.
#[inline]
pub(crate) fn on_light_cone(point_fm: [f64; 4]) -> bool {
    point_fm[0] > 0.0 && proper_time_fm(point_fm) == 0.0
}

/// Whether a proper time lies before a start by more than rounding.
#[inline]
pub(crate) fn is_before(tau_fm: f64, start_fm: f64) -> bool {
    const ROUNDING: f64 = 1e-9;
    tau_fm < start_fm * (1.0 - ROUNDING)
}

/// A light-like ray: place of birth (lab frame, fm) and unit direction.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Ray {
    /// `[t, x, y, z]` in fm.
    pub birth_fm: [f64; 4],
    /// Unit vector.
    pub direction: [f64; 3],
}

impl Ray {
    /// The point at distance `l_fm` from birth, `[t, x, y, z]` in fm.
    #[inline]
    pub fn at(&self, l_fm: f64) -> [f64; 4] {
        let [t, x, y, z] = self.birth_fm;
        let [nx, ny, nz] = self.direction;
        [t + l_fm, x + nx * l_fm, y + ny * l_fm, z + nz * l_fm]
    }

    /// The distance from birth at which the ray reaches proper time `tau_fm` (tau^2 = t^2 - z^2); `None` where it
    /// never does. Birth must lie in the forward light cone of the hard vertex (t >= |z|), so tau grows along the ray.
    pub fn distance_to_proper_time(&self, tau_fm: f64) -> Option<f64> {
        let [t, _, _, z] = self.birth_fm;
        let nz = self.direction[2];
        // tau^2(l) = tau_0^2 + 2 b l + a l^2.
        let (a, b) = (1.0 - nz * nz, t - nz * z);
        let missing = tau_fm * tau_fm - (t * t - z * z);
        if missing <= 0.0 {
            return Some(0.0);
        }
        let l = missing / (b + (b * b + a * missing).sqrt());
        l.is_finite().then_some(l)
    }
}

/// What a parton meets at a point.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Local {
    /// Temperature of the fluid at rest, GeV; 0 without a medium.
    pub temperature_gev: f64,
    /// p.u/E of a light-like parton along the ray: 1 where the fluid is at rest.
    pub flow_factor: f64,
}

impl Local {
    /// No medium.
    pub const EMPTY: Local = Local {
        temperature_gev: 0.0,
        flow_factor: 1.0,
    };
}

/// The fluid at a point of the lab.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Fluid {
    /// Temperature of the fluid at rest, GeV; 0 without a medium.
    pub temperature_gev: f64,
    /// Lab four-velocity components u^x, u^y, u^z; u^t = sqrt(1 + u^2).
    pub velocity: [f64; 3],
}

impl Fluid {
    /// No medium.
    pub const EMPTY: Fluid = Fluid {
        temperature_gev: 0.0,
        velocity: [0.0; 3],
    };

    /// A fluid of four-velocity components u^x, u^y, tau u^eta at a point: u^z = u^tau sinh eta + (tau u^eta) cosh eta.
    fn from_milne(temperature_gev: f64, [ux, uy, ueta]: [f64; 3], point_fm: [f64; 4]) -> Fluid {
        let [t, _, _, z] = point_fm;
        let tau = proper_time_fm(point_fm);
        // On the light cone there is no longitudinal rest frame; z = 0 stands for it.
        let (sinh, cosh) = if tau > 0.0 {
            (z / tau, t / tau)
        } else {
            (0.0, 1.0)
        };
        let utau = (1.0 + ux * ux + uy * uy + ueta * ueta).sqrt();
        Fluid {
            temperature_gev,
            velocity: [ux, uy, utau * sinh + ueta * cosh],
        }
    }
}

/// Upper bounds over one segment of a ray.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Ceiling {
    /// No point of the segment is hotter, GeV.
    pub temperature_gev: f64,
    /// p.u/E is nowhere larger where there is a medium.
    pub flow_factor: f64,
}

/// Where along a ray there may be a medium, and how finely it wants to be sampled.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Stretch {
    /// Distances from birth in fm, first < last.
    pub first_fm: f64,
    /// End, fm.
    pub last_fm: f64,
    /// Number of equal cells that resolve the field between them.
    pub cells: usize,
}

/// A temperature field.
pub trait TemperatureField: Send + Sync {
    /// The stretch of a ray in which the temperature may lie above `end_temperature_gev`; `None` where nowhere.
    fn stretch(&self, ray: &Ray, end_temperature_gev: f64) -> Option<Stretch>;

    /// Temperature and flow at distance `l_fm` along the ray, inside its stretch.
    fn local(&self, ray: &Ray, l_fm: f64) -> Local;

    /// Fills `samples` with `count` points from `first_fm` on, `step_fm` apart.
    fn sample(
        &self,
        ray: &Ray,
        first_fm: f64,
        step_fm: f64,
        count: usize,
        samples: &mut Vec<Local>,
    ) {
        samples.clear();
        samples.extend((0..count).map(|place| self.local(ray, first_fm + place as f64 * step_fm)));
    }

    /// Temperature and flow at a point of the lab, `[t, x, y, z]` in fm; [`Fluid::EMPTY`] where the field has nothing.
    fn fluid(&self, point_fm: [f64; 4]) -> Fluid;

    /// Proper time from which on the field is known, fm; 0 for a brick.
    fn first_tau_fm(&self) -> f64;

    /// Fills `ceilings` with rigorous bounds over equal segments of a ray's stretch, few and cheap; `false`, and none,
    /// where the field offers none.
    fn ceilings(&self, _ray: &Ray, _stretch: &Stretch, ceilings: &mut Vec<Ceiling>) -> bool {
        ceilings.clear();
        false
    }

    /// Whether the field ends where its data end, so that a path may leave it while the medium is still hot.
    fn has_artificial_edge(&self) -> bool {
        false
    }
}
