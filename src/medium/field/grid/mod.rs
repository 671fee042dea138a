//! A field on a grid: multilinear interpolation in (tau, x, y) or (tau, x, y, eta).
//!
//! Temperature and the flow components u^x, u^y, tau u^eta are interpolated linearly along each axis; u^tau follows
//! from the normalisation of the four-velocity. Each grid point keeps its four numbers side by side in one vector, and
//! a place is found in constant time on uneven axes too. The error falls with the square of the spacing. Outside the
//! grid there is no medium.

mod axis;
mod hot_region;

use wide::f32x4;

use super::{FieldData, Local, Ray, Stretch, TemperatureField};
use axis::Axis;
use hot_region::HotRegion;

/// Points of a ray that are worked on together: long enough to overlap slow operations, short enough for the first
/// cache.
const BATCH: usize = 16;
/// Cells a spacing of the grid. A cell is sampled at its ends and in its middle, so the samples stand a spacing apart:
/// rays through the demo field then have 0.12 % error in I0 from sampling, as much as from interpolation.
const CELLS_PER_SPACING: f64 = 0.5;
/// More cells than this are not worth their time, whatever the grid.
const MOST_CELLS: f64 = 200.0;

/// A temperature field on a grid, of which only the hot part is kept.
#[derive(Clone, Debug)]
pub struct Grid {
    hot: Option<Hot>,
}

#[derive(Clone, Debug)]
struct Hot {
    region: HotRegion,
    tau: Axis,
    x: Axis,
    y: Axis,
    eta: Option<Axis>,
    /// Temperature, u^x, u^y, tau u^eta of each point.
    values: Vec<f32x4>,
    has_flow: bool,
    spacing_fm: f64,
}

impl Grid {
    /// The field of some data, which must obey what [`FieldData`] promises of its axes and lengths; what is colder than
    /// the end temperature (GeV) is dropped.
    pub fn new(data: FieldData, end_temperature_gev: f64) -> Grid {
        let region = HotRegion::new(&data, end_temperature_gev);
        Grid {
            hot: region.map(|region| Hot::new(data, region)),
        }
    }
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
        let mut local = [Local::EMPTY];
        self.sample_into(ray, l_fm, 0.0, &mut local);
        local[0]
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
        self.sample_into(ray, first_fm, step_fm, samples);
    }

    fn has_artificial_edge(&self) -> bool {
        true
    }
}

impl Grid {
    fn sample_into(&self, ray: &Ray, first_fm: f64, step_fm: f64, samples: &mut [Local]) {
        match &self.hot {
            None => samples.fill(Local::EMPTY),
            Some(hot) => {
                for (place, batch) in samples.chunks_mut(BATCH).enumerate() {
                    hot.sample_batch(
                        ray,
                        first_fm + (place * BATCH) as f64 * step_fm,
                        step_fm,
                        batch,
                    );
                }
            }
        }
    }
}

impl Hot {
    fn new(data: FieldData, region: HotRegion) -> Hot {
        let depth = data.shape()[3];
        let [tau, x, y] = region.planes.map(|[first, last]| first..last + 1);
        let mut values = Vec::with_capacity(tau.len() * x.len() * y.len() * depth);
        for i in tau.clone() {
            for j in x.clone() {
                for k in y.clone() {
                    values.extend((0..depth).map(|m| point(&data, data.index(i, j, k, m))));
                }
            }
        }
        let axis = |points: &[f64], kept: std::ops::Range<usize>| Axis::new(points[kept].to_vec());
        let (tau, x, y) = (
            axis(&data.tau_fm, tau),
            axis(&data.x_fm, x),
            axis(&data.y_fm, y),
        );
        let spacing_fm = x
            .mean_spacing()
            .min(y.mean_spacing())
            .min(tau.mean_spacing());
        let has_flow = data.flow.is_some();
        Hot {
            region,
            tau,
            x,
            y,
            eta: data.eta.map(Axis::new),
            values,
            has_flow,
            spacing_fm,
        }
    }

    /// Temperature and flow at points `step_fm` apart, at most [`BATCH`] of them. Each loop does one kind of slow
    /// operation for all, so that the processor overlaps them.
    fn sample_batch(&self, ray: &Ray, first_fm: f64, step_fm: f64, samples: &mut [Local]) {
        let mut points = [[0.0; 4]; BATCH];
        let mut taus = [0.0; BATCH];
        for (place, (point, tau)) in points.iter_mut().zip(&mut taus).enumerate() {
            *point = ray.at(first_fm + place as f64 * step_fm);
            let [t, _, _, z] = *point;
            *tau = (t * t - z * z).max(0.0).sqrt();
        }
        let mut values = [f32x4::ZERO; BATCH];
        for ((value, [t, x, y, z]), tau) in values[..samples.len()].iter_mut().zip(points).zip(taus)
        {
            *value = self.values_at(tau, x, y, || {
                libm::atanh(if t > 0.0 { z / t } else { ray.direction[2] })
            });
        }
        for (((sample, value), [t, _, _, z]), tau) in
            samples.iter_mut().zip(values).zip(points).zip(taus)
        {
            *sample = if self.has_flow {
                moving(value, ray, [t, z], tau)
            } else {
                resting(value)
            };
        }
    }

    /// Interpolated values at Milne coordinates; nothing outside the rapidity axis.
    #[inline(always)]
    fn values_at(&self, tau: f64, x: f64, y: f64, eta: impl Fn() -> f64) -> f32x4 {
        let ((i, u), (j, v), (k, w)) = (self.tau.locate(tau), self.x.locate(x), self.y.locate(y));
        let corner = (i * self.x.len() + j) * self.y.len() + k;
        let strides = [self.x.len() * self.y.len(), self.y.len(), 1];
        let Some(eta_axis) = &self.eta else {
            return trilinear(&self.values, corner, strides, [u, v, w]);
        };
        let eta = eta();
        if !(eta_axis.first()..=eta_axis.last()).contains(&eta) {
            return f32x4::ZERO;
        }
        let (m, s) = eta_axis.locate(eta);
        let depth = eta_axis.len();
        let strides = strides.map(|stride| stride * depth);
        let low = trilinear(&self.values, corner * depth + m, strides, [u, v, w]);
        let high = trilinear(&self.values, corner * depth + m + 1, strides, [u, v, w]);
        low + (high - low) * s
    }
}

fn point(data: &FieldData, place: usize) -> f32x4 {
    let flow = match &data.flow {
        Some(flow) => [flow[0][place], flow[1][place], flow[2][place]],
        None => [0.0; 3],
    };
    f32x4::new([data.temperature_gev[place], flow[0], flow[1], flow[2]])
}

fn resting(values: f32x4) -> Local {
    Local {
        temperature_gev: f64::from(values.to_array()[0]),
        flow_factor: 1.0,
    }
}

/// Temperature and flow factor of a moving fluid from interpolated values at a point.
#[inline(always)]
fn moving(values: f32x4, ray: &Ray, [t, z]: [f64; 2], tau: f64) -> Local {
    let [temperature, ux, uy, ueta] = values.to_array();
    let [nx, ny, nz] = ray.direction;
    let utau = f64::from((1.0 + ux * ux + uy * uy + ueta * ueta).sqrt());
    // Milne to lab: u^t = u^tau cosh eta + (tau u^eta) sinh eta and u^z likewise, with cosh eta = t/tau.
    let longitudinal = if tau > 0.0 {
        (utau * (t - nz * z) + f64::from(ueta) * (z - nz * t)) / tau
    } else {
        // The limit along a ray from the hard vertex, where t = z = 0.
        utau * (1.0 - nz * nz).sqrt()
    };
    let flow_factor = longitudinal - nx * f64::from(ux) - ny * f64::from(uy);
    Local {
        temperature_gev: f64::from(temperature),
        flow_factor,
    }
}

/// The eight corners of a cell from `corner` on, `strides` apart, mixed by the place in the cell.
#[inline(always)]
fn trilinear(values: &[f32x4], corner: usize, strides: [usize; 3], [u, v, w]: [f32; 3]) -> f32x4 {
    let edge = |point: usize| {
        let (low, high) = (values[point], values[point + strides[2]]);
        low + (high - low) * w
    };
    let face = |point: usize| {
        let (low, high) = (edge(point), edge(point + strides[1]));
        low + (high - low) * v
    };
    let (low, high) = (face(corner), face(corner + strides[0]));
    low + (high - low) * u
}

#[cfg(test)]
mod tests {
    use super::*;

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
