//! Where a gridded field reaches the end temperature, so that only that part is kept and looked at.

use super::super::{Ray, larger, smaller};
use super::Frame;

/// First and last hot index of x and of y in each plane of tau: all that must be known of a field before its hot part
/// is read.
#[derive(Clone, Debug)]
pub struct HotScan {
    end_temperature_gev: f32,
    lengths: [usize; 4],
    planes: Vec<HotPlane>,
}

/// First and last hot column (x) and row (y) of one plane of tau; the first beyond the last where none is.
type HotPlane = [[usize; 2]; 2];
const COLD: HotPlane = [[usize::MAX, 0]; 2];

impl HotScan {
    /// Nothing seen yet of a grid of so many points along tau, x, y and eta (1 for a boost-invariant field).
    pub fn new(lengths: [usize; 4], end_temperature_gev: f64) -> HotScan {
        // The least f32 that is not below the end temperature.
        let nearest = end_temperature_gev as f32;
        let below = f64::from(nearest) < end_temperature_gev;
        HotScan {
            end_temperature_gev: if below { nearest.next_up() } else { nearest },
            lengths,
            planes: vec![COLD; lengths[0]],
        }
    }

    /// Takes note of the temperature (GeV) at a place in C order over (tau, x, y, eta).
    #[inline]
    pub fn see(&mut self, place: usize, temperature_gev: f32) {
        if temperature_gev >= self.end_temperature_gev {
            self.see_hot(place);
        }
    }

    fn see_hot(&mut self, place: usize) {
        let [_, columns, rows, depth] = self.lengths;
        let point = place / depth;
        let indices = [point / rows % columns, point % rows];
        for (range, index) in self.planes[point / (columns * rows)]
            .iter_mut()
            .zip(indices)
        {
            *range = [range[0].min(index), range[1].max(index)];
        }
    }

    /// First and last plane to keep of tau, x and y, one wider than what is hot; `None` where nothing is.
    pub fn kept(&self) -> Option<[[usize; 2]; 3]> {
        let hot = |plane: &HotPlane| *plane != COLD;
        let first = self.planes.iter().position(hot)?;
        let last = self.planes.iter().rposition(hot)?;
        let [columns, rows] = [0, 1].map(|axis| self.extent_from(0, axis));
        Some([widen([first, last], self.lengths[0]), columns, rows])
    }

    /// Whether the field is hot at the last tau, or at an end of x or y: a path can then leave it hot.
    pub(super) fn is_hot_at_an_end(&self) -> bool {
        let [_, columns, rows, _] = self.lengths;
        let hot = |plane: &&HotPlane| **plane != COLD;
        let reaches = |plane: &HotPlane| {
            let [x, y] = plane;
            x[0] == 0 || x[1] + 1 == columns || y[0] == 0 || y[1] + 1 == rows
        };
        self.planes.iter().filter(hot).any(reaches)
            || self.planes.last().is_some_and(|plane| *plane != COLD)
    }

    /// First and last plane to keep of x (axis 0) or y (axis 1) from a plane of tau on.
    fn extent_from(&self, from: usize, axis: usize) -> [usize; 2] {
        let planes = &self.planes[from..];
        let low = planes.iter().map(|plane| plane[axis][0]).min().unwrap_or(0);
        let high = planes.iter().map(|plane| plane[axis][1]).max().unwrap_or(0);
        widen([low.min(high), high], self.lengths[axis + 1])
    }
}

/// Between a hot plane and a cold one the medium reaches into the cell, so each side grows by one plane; and an axis
/// needs two planes.
fn widen([first, last]: [usize; 2], count: usize) -> [usize; 2] {
    [first.saturating_sub(1), (last + 1).min(count - 1)]
}

/// For each slab of tau the box in x and y that holds every place that is hot then or later.
#[derive(Clone, Debug)]
pub(super) struct HotRegion {
    tau_fm: [f64; 2],
    /// Squares of the proper times between the slabs, and of the ends.
    tau2_fm2: [f64; SLABS + 1],
    /// First and last x of each box.
    x_fm: [[f64; SLABS]; 2],
    /// First and last y of each box.
    y_fm: [[f64; SLABS]; 2],
}

/// Slabs of proper time that the hot region is cut into.
const SLABS: usize = 6;

impl HotRegion {
    /// The hot region of a whole grid's scan, which must not be cold everywhere. With `hold` it reaches back to tau = 0
    /// if it begins with the first plane.
    pub(super) fn new(scan: &HotScan, frame: &Frame, hold: bool) -> Option<HotRegion> {
        let [tau, ..] = scan.kept()?;
        let last_hot = scan.planes.iter().rposition(|plane| *plane != COLD)?;
        let [mut start_fm, end_fm] = tau.map(|plane| frame.tau_fm[plane]);
        if hold && tau[0] == 0 {
            start_fm = 0.0;
        }
        let slab_fm = (end_fm - start_fm) / SLABS as f64;
        let slab = |slab: usize| {
            let slab_start_fm = start_fm + slab as f64 * slab_fm;
            // The plane before the slab reaches into it; the last hot plane bounds what comes after.
            let from = frame
                .tau_fm
                .partition_point(|tau| *tau <= slab_start_fm)
                .saturating_sub(1)
                .min(last_hot);
            let x = scan.extent_from(from, 0).map(|plane| frame.x_fm[plane]);
            let y = scan.extent_from(from, 1).map(|plane| frame.y_fm[plane]);
            [x, y]
        };
        let boxes: [[[f64; 2]; 2]; SLABS] = std::array::from_fn(slab);
        let ends = |axis: usize| {
            [0, 1].map(|end| std::array::from_fn(|slab: usize| boxes[slab][axis][end]))
        };
        Some(HotRegion {
            tau_fm: [start_fm, end_fm],
            tau2_fm2: std::array::from_fn(|slab| (start_fm + slab as f64 * slab_fm).powi(2)),
            x_fm: ends(0),
            y_fm: ends(1),
        })
    }

    /// Proper times between which the region lies, fm.
    pub(super) fn tau_fm(&self) -> [f64; 2] {
        self.tau_fm
    }

    /// First and last distance between which a ray may be inside the region. The boxes only shrink with tau, so a ray
    /// that has left one for good never meets the medium again.
    pub(super) fn stretch(&self, ray: &Ray) -> Option<(f64, f64)> {
        let [t, x, y, z] = ray.birth_fm;
        let [nx, ny, nz] = ray.direction;
        // As Ray::distance_to_proper_time, for all slabs at once.
        let (a, b, born2) = (1.0 - nz * nz, t - nz * z, t * t - z * z);
        let reached: [f64; SLABS + 1] = std::array::from_fn(|slab| {
            let missing = larger(self.tau2_fm2[slab] - born2, 0.0);
            missing / larger(b + (b * b + a * missing).sqrt(), f64::MIN_POSITIVE)
        });
        if !reached[SLABS].is_finite() {
            return None;
        }
        let (in_x, in_y) = (between(&self.x_fm, x, nx), between(&self.y_fm, y, ny));
        let enter: [f64; SLABS] =
            std::array::from_fn(|slab| larger(reached[slab], larger(in_x[0][slab], in_y[0][slab])));
        let leave: [f64; SLABS] = std::array::from_fn(|slab| {
            smaller(reached[slab + 1], smaller(in_x[1][slab], in_y[1][slab]))
        });
        let inside = |slab: &usize| leave[*slab] > enter[*slab];
        let first = (0..SLABS).find(inside)?;
        let last = (first..SLABS).rfind(inside)?;
        Some((enter[first], leave[last]))
    }
}

/// The distances at which a coordinate, start + speed * l, enters and leaves intervals; enter beyond leave where it
/// never does.
#[inline(always)]
fn between<const N: usize>([low, high]: &[[f64; N]; 2], start: f64, speed: f64) -> [[f64; N]; 2] {
    // What does not move is inside from ever to ever, or never.
    let inverse_speed = 1.0 / if speed == 0.0 { STANDSTILL } else { speed };
    let one: [f64; N] = std::array::from_fn(|place| (low[place] - start) * inverse_speed);
    let other: [f64; N] = std::array::from_fn(|place| (high[place] - start) * inverse_speed);
    [
        std::array::from_fn(|place| smaller(one[place], other[place])),
        std::array::from_fn(|place| larger(one[place], other[place])),
    ]
}

/// A speed at which nothing gets anywhere.
const STANDSTILL: f64 = 1e-200;
