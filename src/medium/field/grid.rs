//! A field on a grid: multilinear interpolation in (tau, x, y) or (tau, x, y, eta).
//!
//! Temperature and the flow components u^x, u^y, tau u^eta are interpolated linearly along each axis; u^tau follows
//! from the normalisation of the four-velocity. Each grid point keeps its four numbers side by side in one vector, and
//! a place is found in constant time on uneven axes too. The error falls with the square of the spacing. Outside the
//! grid there is no medium.

use wide::f32x4;

use super::{FieldData, Local, Ray, Stretch, TemperatureField};

/// Points of a ray that are worked on together: long enough to overlap slow operations, short enough for registers and
/// the first cache.
const BATCH: usize = 8;
/// Cells a shortest spacing of the grid: each cell is sampled at its ends and in its middle, so two spacings a cell
/// still see every grid plane.
const CELLS_PER_SPACING: f64 = 0.35;
/// More cells than this are not worth their time, whatever the grid.
const MOST_CELLS: f64 = 200.0;

/// A temperature field on a grid.
#[derive(Clone, Debug)]
pub struct Grid {
    tau: Axis,
    x: Axis,
    y: Axis,
    eta: Option<Axis>,
    /// Temperature, u^x, u^y, tau u^eta of each point.
    values: Vec<f32x4>,
    has_flow: bool,
    spacing_fm: f64,
    hot: HotRegion,
}

/// Where the field reaches the end temperature: the hot planes of tau, and for each slab of tau the box in x and y
/// that holds every place as hot, then or later.
#[derive(Clone, Debug)]
struct HotRegion {
    tau_fm: [f64; 2],
    boxes: Vec<[[f64; 2]; 2]>,
}

/// Slabs of proper time that the hot region is cut into.
const SLABS: usize = 12;

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

    #[inline(always)]
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
        let hot = HotRegion::new(&data, end_temperature_gev);
        let count = data.temperature_gev.len();
        let values = (0..count).map(|place| {
            let flow = data.flow.as_ref().map_or([0.0; 3], |flow| {
                [flow[0][place], flow[1][place], flow[2][place]]
            });
            f32x4::new([data.temperature_gev[place], flow[0], flow[1], flow[2]])
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
    fn values_at(&self, tau: f64, x: f64, y: f64, eta: impl Fn() -> f64) -> Option<f32x4> {
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
        Some(low + (high - low) * s)
    }
}

impl Grid {
    /// Temperature and flow at points `step_fm` apart. Each loop does one kind of slow operation for the whole batch,
    /// so that the processor overlaps them.
    fn batch(&self, ray: &Ray, first_fm: f64, step_fm: f64) -> [Local; BATCH] {
        let points: [[f64; 4]; BATCH] =
            std::array::from_fn(|place| ray.at(first_fm + place as f64 * step_fm));
        let taus = points.map(|[t, _, _, z]| (t * t - z * z).max(0.0).sqrt());
        let values: [Option<f32x4>; BATCH] = std::array::from_fn(|place| {
            let [t, x, y, z] = points[place];
            self.values_at(taus[place], x, y, || libm::atanh(z / t))
        });
        std::array::from_fn(|place| match values[place] {
            None => Local::EMPTY,
            Some(values) if !self.has_flow => Local {
                temperature_gev: f64::from(values.to_array()[0]),
                flow_factor: 1.0,
            },
            Some(values) => moving(values, ray, points[place], taus[place]),
        })
    }
}

/// Temperature and flow factor of a moving fluid from interpolated values at a point.
#[inline(always)]
fn moving(values: f32x4, ray: &Ray, [t, _, _, z]: [f64; 4], tau: f64) -> Local {
    let [temperature, ux, uy, ueta] = values.to_array();
    let [nx, ny, nz] = ray.direction;
    let utau = f64::from((1.0 + ux * ux + uy * uy + ueta * ueta).sqrt());
    // Milne to lab: u^t = u^tau cosh eta + (tau u^eta) sinh eta and u^z likewise, with cosh eta = t/tau.
    let longitudinal = (utau * (t - nz * z) + f64::from(ueta) * (z - nz * t)) / tau;
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

/// The stretch of distances in which start + speed * l lies between two ends.
fn crossing(ends: [f64; 2], start: f64, speed: f64) -> Option<[f64; 2]> {
    if speed == 0.0 {
        let inside = (ends[0]..=ends[1]).contains(&start);
        return inside.then_some([0.0, f64::INFINITY]);
    }
    let [one, other] = ends.map(|end| (end - start) / speed);
    Some([one.min(other), one.max(other)])
}

impl HotRegion {
    fn new(data: &FieldData, end_temperature_gev: f64) -> HotRegion {
        let [planes, columns, rows, depth] = data.shape();
        let plane_size = columns * rows * depth;
        // First and last hot column and row of each plane of tau; none yet.
        let mut hot = vec![[[usize::MAX, 0]; 2]; planes];
        for (place, temperature) in data.temperature_gev.iter().enumerate() {
            if f64::from(*temperature) >= end_temperature_gev {
                let point = place / depth;
                let indices = [point / rows % columns, point % rows];
                for (range, index) in hot[place / plane_size].iter_mut().zip(indices) {
                    *range = [range[0].min(index), range[1].max(index)];
                }
            }
        }
        let is_hot = |plane: &[[usize; 2]; 2]| plane[0][0] != usize::MAX;
        let (Some(first), Some(last)) = (hot.iter().position(is_hot), hot.iter().rposition(is_hot))
        else {
            return HotRegion {
                tau_fm: [f64::INFINITY, f64::NEG_INFINITY],
                boxes: Vec::new(),
            };
        };
        // Between a hot plane and a cold one the medium reaches into the cell, so every side grows by one plane.
        let (first, last) = (first.saturating_sub(1), (last + 1).min(planes - 1));
        let tau_fm = [data.tau_fm[first], data.tau_fm[last]];
        let slab_width = (tau_fm[1] - tau_fm[0]) / SLABS as f64;
        let slab = |slab: usize| {
            let start_fm = tau_fm[0] + slab as f64 * slab_width;
            let from = data
                .tau_fm
                .partition_point(|tau| *tau <= start_fm)
                .saturating_sub(1);
            let ends = |axis: usize, points: &[f64]| {
                let low = hot[from..]
                    .iter()
                    .map(|plane| plane[axis][0])
                    .min()
                    .unwrap_or(usize::MAX);
                let high = hot[from..]
                    .iter()
                    .map(|plane| plane[axis][1])
                    .max()
                    .unwrap_or(0);
                // Slabs end at the last hot plane, so low and high exist.
                [
                    points[low.saturating_sub(1).min(points.len() - 1)],
                    points[(high + 1).min(points.len() - 1)],
                ]
            };
            [ends(0, &data.x_fm), ends(1, &data.y_fm)]
        };
        HotRegion {
            tau_fm,
            boxes: (0..SLABS).map(slab).collect(),
        }
    }

    /// The stretch of a ray in which it may be inside the region. The boxes only shrink with tau, so a ray that has
    /// left one for good never meets the medium again.
    fn stretch(&self, ray: &Ray) -> Option<(f64, f64)> {
        let [_, x, y, _] = ray.birth_fm;
        let slab_width = (self.tau_fm[1] - self.tau_fm[0]) / SLABS as f64;
        let mut slab_start = ray.distance_to_proper_time(self.tau_fm[0])?;
        let mut stretch: Option<(f64, f64)> = None;
        for (slab, [x_ends, y_ends]) in self.boxes.iter().enumerate() {
            let slab_end_tau = self.tau_fm[0] + (slab + 1) as f64 * slab_width;
            let slab_end = ray.distance_to_proper_time(slab_end_tau)?;
            if slab_end > slab_start {
                let in_x = crossing(*x_ends, x, ray.direction[0]);
                let in_y = crossing(*y_ends, y, ray.direction[1]);
                let [x_in, x_out] = in_x.unwrap_or([f64::INFINITY, f64::NEG_INFINITY]);
                let [y_in, y_out] = in_y.unwrap_or([f64::INFINITY, f64::NEG_INFINITY]);
                let (enter, leave) = (
                    slab_start.max(x_in).max(y_in),
                    slab_end.min(x_out).min(y_out),
                );
                if leave > enter {
                    let first = stretch.map_or(enter, |(first, _)| first);
                    stretch = Some((first, leave));
                }
            }
            slab_start = slab_end;
        }
        stretch
    }
}

impl TemperatureField for Grid {
    fn stretch(&self, ray: &Ray, _end_temperature_gev: f64) -> Option<Stretch> {
        let (first_fm, last_fm) = self.hot.stretch(ray)?;
        let cells = (CELLS_PER_SPACING * (last_fm - first_fm) / self.spacing_fm).ceil();
        Some(Stretch {
            first_fm,
            last_fm,
            cells: cells.clamp(1.0, MOST_CELLS) as usize,
        })
    }

    fn local(&self, ray: &Ray, l_fm: f64) -> Local {
        self.batch(ray, l_fm, 0.0)[0]
    }

    fn sample(
        &self,
        ray: &Ray,
        first_fm: f64,
        step_fm: f64,
        count: usize,
        samples: &mut Vec<Local>,
    ) {
        samples.clear();
        while samples.len() < count {
            let batch = self.batch(ray, first_fm + samples.len() as f64 * step_fm, step_fm);
            samples.extend_from_slice(&batch[..BATCH.min(count - samples.len())]);
        }
    }

    fn has_artificial_edge(&self) -> bool {
        true
    }
}
