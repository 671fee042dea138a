//! A field on a grid: multilinear interpolation in (tau, x, y) or (tau, x, y, eta).
//!
//! Temperature and the flow components u^x, u^y, tau u^eta are interpolated linearly along each axis; u^tau follows
//! from the normalisation of the four-velocity. Each grid point keeps its four numbers side by side, and a place is
//! found in constant time on uneven axes too. The error falls with the square of the spacing. Outside the grid there
//! is no medium.

use super::{FieldData, Local, Ray, Stretch, TemperatureField};

/// Numbers a grid point keeps: temperature and three components of flow.
const VALUES: usize = 4;
/// Cells a shortest spacing of the grid: each cell is sampled at its ends and in its middle, so two spacings a cell
/// still see every grid plane.
const CELLS_PER_SPACING: f64 = 0.5;
/// More cells than this are not worth their time, whatever the grid.
const MOST_CELLS: f64 = 200.0;

/// A temperature field on a grid.
#[derive(Clone, Debug)]
pub struct Grid {
    tau: Axis,
    x: Axis,
    y: Axis,
    eta: Option<Axis>,
    values: Vec<[f32; VALUES]>,
    has_flow: bool,
    spacing_fm: f64,
    hot: HotBox,
}

/// The smallest box of grid planes outside of which the temperature nowhere reaches the end temperature.
#[derive(Clone, Copy, Debug)]
struct HotBox {
    tau_fm: [f64; 2],
    x_fm: [f64; 2],
    y_fm: [f64; 2],
}

/// A strictly increasing axis with a table that leads to the cell of any coordinate.
#[derive(Clone, Debug)]
struct Axis {
    points: Vec<f64>,
    inverse_widths: Vec<f64>,
    /// One over the spacing of an even axis.
    even: Option<f64>,
    /// The cell of the left edge of each of equal bins over the whole axis.
    guide: Vec<u32>,
    bins_per_unit: f64,
}

/// An axis is even when its points lie this close (in units of its spacing) to even ones: the rounding of single
/// precision coordinates must pass.
const EVENNESS: f64 = 1e-4;

fn is_even(points: &[f64]) -> bool {
    let (first, cells) = (points[0], points.len() - 1);
    let spacing = (points[cells] - first) / cells as f64;
    let off = |(place, point): (usize, &f64)| (point - first - spacing * place as f64).abs();
    points
        .iter()
        .enumerate()
        .map(off)
        .all(|off| off < EVENNESS * spacing)
}

/// Bins of the guide a cell of the axis.
const BINS_PER_CELL: usize = 2;

impl Axis {
    fn new(points: Vec<f64>) -> Axis {
        let cells = points.len() - 1;
        let span = points[cells] - points[0];
        let bins = cells * BINS_PER_CELL;
        let mut cell = 0;
        let guide = (0..bins).map(|bin| {
            let edge = points[0] + span * bin as f64 / bins as f64;
            while cell + 1 < cells && points[cell + 1] <= edge {
                cell += 1;
            }
            cell as u32
        });
        let guide = guide.collect();
        let inverse_widths = points
            .windows(2)
            .map(|pair| 1.0 / (pair[1] - pair[0]))
            .collect();
        let even = is_even(&points).then_some(cells as f64 / span);
        Axis {
            even,
            guide,
            bins_per_unit: bins as f64 / span,
            inverse_widths,
            points,
        }
    }

    fn first(&self) -> f64 {
        self.points[0]
    }

    fn last(&self) -> f64 {
        self.points[self.points.len() - 1]
    }

    /// Cell and place in it (0 to 1) of a coordinate; beyond an end, the end itself.
    #[inline(always)]
    fn locate(&self, coordinate: f64) -> (usize, f32) {
        let Some(inverse_width) = self.even else {
            return self.locate_by_guide(coordinate);
        };
        // The cast takes numbers below 0 to 0.
        let scaled = (coordinate - self.points[0]) * inverse_width;
        let cell = (scaled as usize).min(self.points.len() - 2);
        (cell, (scaled - cell as f64).clamp(0.0, 1.0) as f32)
    }

    fn locate_by_guide(&self, coordinate: f64) -> (usize, f32) {
        let inside = coordinate.clamp(self.first(), self.last());
        let bin = ((inside - self.first()) * self.bins_per_unit) as usize;
        let mut cell = self.guide[bin.min(self.guide.len() - 1)] as usize;
        while cell + 2 < self.points.len() && self.points[cell + 1] <= inside {
            cell += 1;
        }
        // A bin edge may round past the point that it stands for.
        while cell > 0 && self.points[cell] > inside {
            cell -= 1;
        }
        (
            cell,
            ((inside - self.points[cell]) * self.inverse_widths[cell]) as f32,
        )
    }

    fn mean_spacing(&self) -> f64 {
        (self.last() - self.first()) / (self.points.len() - 1) as f64
    }
}

impl Grid {
    /// The field of some data, which must obey what [`FieldData`] promises of its axes and lengths; places colder than
    /// the end temperature (GeV) are not looked at.
    pub fn new(data: FieldData, end_temperature_gev: f64) -> Grid {
        let hot = HotBox::new(&data, end_temperature_gev);
        let count = data.temperature_gev.len();
        let values = (0..count).map(|place| {
            let flow = data.flow.as_ref().map_or([0.0; 3], |flow| {
                [flow[0][place], flow[1][place], flow[2][place]]
            });
            [data.temperature_gev[place], flow[0], flow[1], flow[2]]
        });
        let values = values.collect();
        let (tau, x, y) = (
            Axis::new(data.tau_fm),
            Axis::new(data.x_fm),
            Axis::new(data.y_fm),
        );
        let spacing_fm = x
            .mean_spacing()
            .min(y.mean_spacing())
            .min(tau.mean_spacing());
        Grid {
            tau,
            x,
            y,
            eta: data.eta.map(Axis::new),
            values,
            has_flow: data.flow.is_some(),
            spacing_fm,
            hot,
        }
    }

    /// Interpolated values at Milne coordinates; `None` outside the rapidity axis.
    #[inline(always)]
    fn values_at(&self, tau: f64, x: f64, y: f64, eta: impl Fn() -> f64) -> Option<[f32; VALUES]> {
        let (i, u) = self.tau.locate(tau);
        let (j, v) = self.x.locate(x);
        let (k, w) = self.y.locate(y);
        let (columns, rows) = (self.x.points.len(), self.y.points.len());
        let corner = (i * columns + j) * rows + k;
        let strides = [columns * rows, rows, 1];
        let Some(eta_axis) = &self.eta else {
            return Some(trilinear(&self.values, corner, strides, [u, v, w]));
        };
        let eta = eta();
        if !(eta_axis.first()..=eta_axis.last()).contains(&eta) {
            return None;
        }
        let (m, s) = eta_axis.locate(eta);
        let depth = eta_axis.points.len();
        let strides = strides.map(|stride| stride * depth);
        let low = trilinear(&self.values, corner * depth + m, strides, [u, v, w]);
        let high = trilinear(&self.values, corner * depth + m + 1, strides, [u, v, w]);
        let mut sum = [0.0; VALUES];
        add_scaled(&mut sum, &low, 1.0 - s);
        add_scaled(&mut sum, &high, s);
        Some(sum)
    }
}

#[inline(always)]
fn add_scaled(sum: &mut [f32; VALUES], values: &[f32; VALUES], weight: f32) {
    for (sum, value) in sum.iter_mut().zip(values) {
        *sum += weight * value;
    }
}

/// The eight corners of a cell from `corner` on, `strides` apart, weighted by the place in the cell.
#[inline(always)]
fn trilinear(
    values: &[[f32; VALUES]],
    corner: usize,
    strides: [usize; 3],
    [u, v, w]: [f32; 3],
) -> [f32; VALUES] {
    let mut sum = [0.0; VALUES];
    let faces = [(corner, 1.0 - u), (corner + strides[0], u)];
    for (face, face_weight) in faces {
        let edges = [
            (face, face_weight * (1.0 - v)),
            (face + strides[1], face_weight * v),
        ];
        for (edge, edge_weight) in edges {
            add_scaled(&mut sum, &values[edge], edge_weight * (1.0 - w));
            add_scaled(&mut sum, &values[edge + strides[2]], edge_weight * w);
        }
    }
    sum
}

/// The stretch of distances in which start + speed * l lies between two ends.
fn crossing(ends: [f64; 2], start: f64, speed: f64) -> Option<[f64; 2]> {
    if speed == 0.0 {
        let inside = (ends[0]..=ends[1]).contains(&start);
        return inside.then_some([0.0, f64::INFINITY]);
    }
    let [one, other] = ends.map(|end| (end - start) / speed);
    Some([one.min(other), one.max(other)])
}

impl HotBox {
    fn new(data: &FieldData, end_temperature_gev: f64) -> HotBox {
        let [_, columns, rows, depth] = data.shape();
        // First and last hot plane of each axis; none yet.
        let mut planes = [[usize::MAX, 0]; 3];
        for (place, temperature) in data.temperature_gev.iter().enumerate() {
            if f64::from(*temperature) >= end_temperature_gev {
                let point = place / depth;
                let indices = [
                    point / (columns * rows),
                    point / rows % columns,
                    point % rows,
                ];
                for (plane, index) in planes.iter_mut().zip(indices) {
                    *plane = [plane[0].min(index), plane[1].max(index)];
                }
            }
        }
        // Between a hot plane and a cold one the medium reaches into the cell, so each side grows by one plane.
        let ends = |points: &[f64], [first, last]: [usize; 2]| match first {
            usize::MAX => [f64::INFINITY, f64::NEG_INFINITY],
            _ => [
                points[first.saturating_sub(1)],
                points[(last + 1).min(points.len() - 1)],
            ],
        };
        HotBox {
            tau_fm: ends(&data.tau_fm, planes[0]),
            x_fm: ends(&data.x_fm, planes[1]),
            y_fm: ends(&data.y_fm, planes[2]),
        }
    }
}

impl TemperatureField for Grid {
    fn stretch(&self, ray: &Ray, _end_temperature_gev: f64) -> Option<Stretch> {
        let [first_tau, last_tau] = self.hot.tau_fm;
        let mut first_fm = ray.distance_to_proper_time(first_tau)?;
        let mut last_fm = ray
            .distance_to_proper_time(last_tau)
            .unwrap_or(f64::INFINITY);
        let [_, x, y, _] = ray.birth_fm;
        for (ends, start, speed) in [
            (self.hot.x_fm, x, ray.direction[0]),
            (self.hot.y_fm, y, ray.direction[1]),
        ] {
            let [enter, leave] = crossing(ends, start, speed)?;
            first_fm = first_fm.max(enter);
            last_fm = last_fm.min(leave);
        }
        if last_fm.is_infinite() || last_fm <= first_fm {
            return None;
        }
        let cells = (CELLS_PER_SPACING * (last_fm - first_fm) / self.spacing_fm).ceil();
        Some(Stretch {
            first_fm,
            last_fm,
            cells: cells.clamp(1.0, MOST_CELLS) as usize,
        })
    }

    #[inline]
    fn local(&self, ray: &Ray, l_fm: f64) -> Local {
        let [t, x, y, z] = ray.at(l_fm);
        let tau = (t * t - z * z).max(0.0).sqrt();
        let values = self.values_at(tau, x, y, || libm::atanh(z / t));
        let Some([temperature, ux, uy, ueta]) = values.map(|values| values.map(f64::from)) else {
            return Local::EMPTY;
        };
        if !self.has_flow {
            return Local {
                temperature_gev: temperature,
                flow_factor: 1.0,
            };
        }
        let [nx, ny, nz] = ray.direction;
        let utau = (1.0 + ux * ux + uy * uy + ueta * ueta).sqrt();
        // Milne to lab: u^t = u^tau cosh eta + (tau u^eta) sinh eta and u^z likewise, with cosh eta = t/tau.
        let longitudinal = (utau * (t - nz * z) + ueta * (z - nz * t)) / tau;
        Local {
            temperature_gev: temperature,
            flow_factor: longitudinal - nx * ux - ny * uy,
        }
    }

    fn has_artificial_edge(&self) -> bool {
        true
    }
}
