//! Temperature fields: temperature and flow along a light-like ray.

mod brick;
mod data;
mod grid;
mod longitudinal;

pub use brick::Brick;
pub use data::FieldData;
pub use grid::Grid;
pub use longitudinal::Longitudinal;

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

/// What is found at a point of the lab.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Fluid {
    /// Temperature of the fluid at rest, GeV; 0 without a medium.
    pub temperature_gev: f64,
    /// Its lab four-velocity u^x, u^y, u^z.
    pub velocity: [f64; 3],
}

/// Upper bounds over one segment of a ray.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Ceiling {
    /// Of the temperature, GeV.
    pub temperature_gev: f64,
    /// Of p.u/E.
    pub flow_factor: f64,
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

    /// Upper bounds over each of some equal segments of a stretch; false where the field offers none.
    fn ceilings(&self, _ray: &Ray, _stretch: &Stretch, _ceilings: &mut Vec<Ceiling>) -> bool {
        false
    }

    /// Whether the field ends where its data end, so that a path may leave it while the medium is still hot.
    fn has_artificial_edge(&self) -> bool {
        false
    }
}
