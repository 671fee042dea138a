//! A field on a grid: multilinear interpolation in (tau, x, y) or (tau, x, y, eta).
//!
//! Temperature and the flow components u^x, u^y, tau u^eta are interpolated linearly along each axis; u^tau follows
//! from the normalisation of the four-velocity. A grid without flow is at rest in Milne coordinates, u^tau = 1: it
//! expands along the beam like the longitudinal solution. A place is found in constant time on uneven axes too. The
//! error falls with the square of the spacing. Outside the grid there is no medium. Only the hot part is kept, in 4
//! bytes a point, or 16 with flow, which stand side by side.

mod axis;
mod builder;
mod ceilings;
mod hot_region;
mod values;

pub use builder::{Frame, GridBuilder};
pub use hot_region::HotScan;

use wide::f32x4;

use super::{
    Ceiling, Fluid, Local, Ray, Stretch, TemperatureField, is_before, milne_flow_factor,
    on_light_cone, proper_time_fm,
};
use axis::Axis;
use ceilings::CeilingTable;
use hot_region::HotRegion;
use values::{Place, Point, Values};

/// Points of a ray that are worked on together: long enough to overlap slow operations, short enough for the first
/// cache.
const BATCH: usize = 16;
/// Cells a spacing of the grid. A cell is sampled at its ends and in its middle, so the samples stand a spacing apart:
/// rays through the demo field then have 0.12 % error in I0 from sampling, as much as from interpolation.
const CELLS_PER_SPACING: f64 = 0.5;
/// More cells than this are not worth their time, whatever the grid.
const MOST_CELLS: f64 = 200.0;
/// A point beyond the grid by no more than this part of it lies at its edge: paths end there, but for rounding.
const EDGE: f64 = 1e-9;

/// A temperature field on a grid, of which only the hot part is kept.
#[derive(Clone, Debug)]
pub struct Grid {
    first_tau_fm: f64,
    hold: bool,
    is_hot_at_an_end: bool,
    hot: Option<Hot>,
}

#[derive(Clone, Debug)]
struct Hot {
    region: HotRegion,
    tau: Axis,
    x: Axis,
    y: Axis,
    eta: Option<Axis>,
    values: Values,
    ceilings: CeilingTable,
    spacing_fm: f64,
}

impl TemperatureField for Grid {
    fn stretch(&self, ray: &Ray, _end_temperature_gev: f64) -> Option<Stretch> {
        let hot = self.hot.as_ref()?;
        let (first_fm, last_fm) = hot.region.stretch(ray)?;
        let cells = (CELLS_PER_SPACING * (last_fm - first_fm) / hot.spacing_fm).ceil();
        Some(Stretch {
            first_fm,
            last_fm,
            cells: cells.clamp(1.0, MOST_CELLS) as usize,
        })
    }

    fn local(&self, ray: &Ray, l_fm: f64) -> Local {
        let Some(hot) = &self.hot else {
            return Local::EMPTY;
        };
        let point = ray.at(l_fm);
        let tau = proper_time_fm(point);
        match &hot.values {
            Values::Resting(values) => resting(hot.value(values, ray, point, tau), ray, point, tau),
            Values::Moving(values) => moving(hot.value(values, ray, point, tau), ray, point, tau),
        }
    }

    fn sample(
        &self,
        ray: &Ray,
        first_fm: f64,
        step_fm: f64,
        count: usize,
        samples: &mut Vec<Local>,
    ) {
        samples.resize(count, Local::EMPTY);
        let Some(hot) = &self.hot else {
            samples.fill(Local::EMPTY);
            return;
        };
        for (place, batch) in samples.chunks_mut(BATCH).enumerate() {
            let start_fm = first_fm + (place * BATCH) as f64 * step_fm;
            match &hot.values {
                Values::Resting(values) => {
                    hot.sample_batch(values, 0.0, ray, [start_fm, step_fm], batch, resting);
                }
                Values::Moving(values) => {
                    let zero = f32x4::ZERO;
                    hot.sample_batch(values, zero, ray, [start_fm, step_fm], batch, moving);
                }
            }
        }
    }

    fn fluid(&self, point_fm: [f64; 4]) -> Fluid {
        match &self.hot {
            Some(hot) => hot.fluid(point_fm, self.hold),
            None => Fluid::EMPTY,
        }
    }

    fn first_tau_fm(&self) -> f64 {
        self.first_tau_fm
    }

    fn ceilings(&self, ray: &Ray, stretch: &Stretch, ceilings: &mut Vec<Ceiling>) -> bool {
        ceilings.clear();
        match &self.hot {
            Some(hot) if !on_light_cone(ray.at(stretch.first_fm)) => {
                hot.ceilings.ceilings(ray, stretch, ceilings)
            }
            _ => false,
        }
    }

    fn has_artificial_edge(&self) -> bool {
        self.is_hot_at_an_end
    }
}

impl Grid {
    /// Memory that the numbers of the field take, bytes.
    pub fn bytes(&self) -> usize {
        self.hot.as_ref().map_or(0, |hot| match &hot.values {
            Values::Resting(values) => size_of_val(&values[..]),
            Values::Moving(values) => size_of_val(&values[..]),
        })
    }
}

impl Hot {
    /// Interpolated values at points `step_fm` apart, at most [`BATCH`] of them, turned into samples by `local`. Each
    /// loop does one kind of slow operation for all, so that the processor overlaps them.
    #[inline]
    fn sample_batch<V: Point>(
        &self,
        values: &[V],
        zero: V,
        ray: &Ray,
        [first_fm, step_fm]: [f64; 2],
        samples: &mut [Local],
        local: impl Fn(Option<V>, &Ray, [f64; 4], f64) -> Local,
    ) {
        let mut points = [[0.0; 4]; BATCH];
        let mut taus = [0.0; BATCH];
        for (place, (point, tau)) in points.iter_mut().zip(&mut taus).enumerate() {
            *point = ray.at(first_fm + place as f64 * step_fm);
            *tau = proper_time_fm(*point);
        }
        let mut found = [Some(zero); BATCH];
        for ((value, point), tau) in found[..samples.len()].iter_mut().zip(points).zip(taus) {
            *value = self.value(values, ray, point, tau);
        }
        for (((sample, value), point), tau) in samples.iter_mut().zip(found).zip(points).zip(taus) {
            *sample = local(value, ray, point, tau);
        }
    }

    /// Interpolated values at a point of a ray; `None` outside the rapidity axis.
    #[inline(always)]
    fn value<V: Point>(
        &self,
        values: &[V],
        ray: &Ray,
        [t, x, y, z]: [f64; 4],
        tau: f64,
    ) -> Option<V> {
        // The limit of tanh eta along a ray from the hard vertex.
        let eta = || libm::atanh(if t > 0.0 { z / t } else { ray.direction[2] });
        let place = self.place(tau, [x, y], eta)?;
        // SAFETY: an axis locates a coordinate in a cell, whose next point is on the axis; `values` has all points.
        Some(unsafe { place.value(values) })
    }

    #[inline(always)]
    fn place(&self, tau: f64, [x, y]: [f64; 2], eta: impl Fn() -> f64) -> Option<Place> {
        let ((i, u), (j, v), (k, w)) = (self.tau.locate(tau), self.x.locate(x), self.y.locate(y));
        let corner = (i * self.x.len() + j) * self.y.len() + k;
        let place = Place {
            corner,
            strides: [self.x.len() * self.y.len(), self.y.len(), 1],
            shares: [u, v, w],
            eta_share: None,
        };
        let Some(axis) = &self.eta else {
            return Some(place);
        };
        let eta = eta();
        if !(axis.first()..=axis.last()).contains(&eta) {
            return None;
        }
        let (m, share) = axis.locate(eta);
        Some(Place {
            corner: corner * axis.len() + m,
            strides: place.strides.map(|stride| stride * axis.len()),
            eta_share: Some(share),
            ..place
        })
    }

    fn fluid(&self, point_fm: [f64; 4], hold: bool) -> Fluid {
        let [t, x, y, z] = point_fm;
        let tau = proper_time_fm(point_fm);
        let early = is_before(tau, self.tau.first()) && !(hold && self.region.tau_fm()[0] == 0.0);
        let inside = |axis: &Axis, coordinate: f64| {
            let slack = EDGE * (axis.last() - axis.first());
            coordinate >= axis.first() - slack && coordinate <= axis.last() + slack
        };
        let late = tau > self.tau.last() + EDGE * (self.tau.last() - self.tau.first());
        if early || late || !inside(&self.x, x) || !inside(&self.y, y) {
            return Fluid::EMPTY;
        }
        let eta = || libm::atanh(if t > 0.0 { z / t } else { 0.0 });
        let Some(place) = self.place(tau, [x, y], eta) else {
            return Fluid::EMPTY;
        };
        let [temperature, ux, uy, ueta] = match &self.values {
            // SAFETY: as in `value`.
            Values::Resting(values) => [unsafe { place.value(values) }, 0.0, 0.0, 0.0],
            // SAFETY: as in `value`.
            Values::Moving(values) => unsafe { place.value(values) }.to_array(),
        }
        .map(f64::from);
        Fluid::from_milne(temperature, [ux, uy, ueta], point_fm)
    }
}

/// Temperature and flow factor of a fluid at rest in Milne coordinates.
#[inline(always)]
fn resting(value: Option<f32>, ray: &Ray, point: [f64; 4], tau: f64) -> Local {
    Local {
        temperature_gev: f64::from(value.unwrap_or(0.0)),
        flow_factor: milne_flow_factor(point, ray.direction[2], tau),
    }
}

/// Temperature and flow factor of a moving fluid from interpolated values at a point.
#[inline(always)]
fn moving(value: Option<f32x4>, ray: &Ray, point: [f64; 4], tau: f64) -> Local {
    let Some(value) = value else {
        return Local::EMPTY;
    };
    let [temperature, ux, uy, ueta] = value.to_array();
    let ([t, _, _, z], [nx, ny, nz]) = (point, ray.direction);
    let utau = f64::from((1.0 + ux * ux + uy * uy + ueta * ueta).sqrt());
    // Milne to lab: u^t = u^tau cosh eta + (tau u^eta) sinh eta and u^z likewise, with cosh eta = t/tau.
    let across = if tau > 0.0 {
        (z - nz * t) / tau
    } else {
        // Along a ray from the hard vertex, where t = z = 0.
        0.0
    };
    let longitudinal = utau * milne_flow_factor(point, nz, tau) + f64::from(ueta) * across;
    let flow_factor = longitudinal - nx * f64::from(ux) - ny * f64::from(uy);
    Local {
        temperature_gev: f64::from(temperature),
        flow_factor,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::medium::field::FieldData;

    /// A uniform moving field from tau = 0 on: at the hard vertex itself the flow factor is the limit along the ray,
    /// u^tau sqrt(1 - nz^2) - n.u, as a hair later.
    #[test]
    fn a_moving_field_may_start_at_tau_zero() {
        let (ux, nz) = (0.7_f32, 0.6);
        let points = 2 * 2 * 2;
        let data = FieldData {
            tau_fm: vec![0.0, 4.0],
            x_fm: vec![-9.0, 9.0],
            y_fm: vec![-9.0, 9.0],
            temperature_gev: vec![0.3; points],
            flow: Some([vec![ux; points], vec![0.0; points], vec![0.0; points]]),
            ..FieldData::default()
        };
        let grid = Grid::new(data, 0.15);
        let ray = Ray {
            birth_fm: [0.0; 4],
            direction: [0.8, 0.0, nz],
        };
        let ux = f64::from(ux);
        let expected = (1.0 + ux * ux).sqrt() * (1.0 - nz * nz).sqrt() - 0.8 * ux;
        for l_fm in [0.0, 1e-6, 1.0] {
            let found = grid.local(&ray, l_fm).flow_factor;
            assert!(
                (found - expected).abs() < 1e-6,
                "{l_fm}: {found} against {expected}"
            );
        }
    }
}
