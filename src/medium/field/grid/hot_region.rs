//! Where a gridded field reaches the end temperature, so that only that part is kept and looked at.

use super::super::{FieldData, Ray};

/// The hot planes of tau, and for each slab of tau the box in x and y that holds every place that is hot then or later.
#[derive(Clone, Debug)]
pub(super) struct HotRegion {
    /// First and last plane of tau, x and y; a plane wider than what is hot on every side.
    pub(super) planes: [[usize; 2]; 3],
    tau_fm: [f64; 2],
    boxes: Vec<[[f64; 2]; 2]>,
}

/// Slabs of proper time that the hot region is cut into.
const SLABS: usize = 6;

/// First and last hot column (x) and row (y) of one plane of tau; the first beyond the last where none is.
type HotPlane = [[usize; 2]; 2];
const COLD: HotPlane = [[usize::MAX, 0]; 2];

impl HotRegion {
    /// The hot region of a field; `None` where it is cold everywhere.
    pub(super) fn new(data: &FieldData, end_temperature_gev: f64) -> Option<HotRegion> {
        let hot = hot_planes(data, end_temperature_gev);
        let first = hot.iter().position(|plane| *plane != COLD)?;
        let last = hot.iter().rposition(|plane| *plane != COLD)?;
        let tau = widen([first, last], hot.len());
        let tau_fm = tau.map(|plane| data.tau_fm[plane]);
        let slab_fm = (tau_fm[1] - tau_fm[0]) / SLABS as f64;
        let later = |from: usize, axis: usize, points: &[f64]| {
            let low = hot[from..]
                .iter()
                .map(|plane| plane[axis][0])
                .min()
                .unwrap_or(0);
            let high = hot[from..]
                .iter()
                .map(|plane| plane[axis][1])
                .max()
                .unwrap_or(0);
            widen([low.min(high), high], points.len())
        };
        let slab = |slab: usize| {
            let start_fm = tau_fm[0] + slab as f64 * slab_fm;
            // The plane before the slab reaches into it; the last hot plane bounds what comes after.
            let from = data
                .tau_fm
                .partition_point(|tau| *tau <= start_fm)
                .saturating_sub(1)
                .min(last);
            let x = later(from, 0, &data.x_fm).map(|plane| data.x_fm[plane]);
            let y = later(from, 1, &data.y_fm).map(|plane| data.y_fm[plane]);
            [x, y]
        };
        let planes = [tau, later(0, 0, &data.x_fm), later(0, 1, &data.y_fm)];
        Some(HotRegion {
            planes,
            tau_fm,
            boxes: (0..SLABS).map(slab).collect(),
        })
    }

    /// First and last distance between which a ray may be inside the region. The boxes only shrink with tau, so a ray
    /// that has left one for good never meets the medium again.
    pub(super) fn stretch(&self, ray: &Ray) -> Option<(f64, f64)> {
        let [_, x, y, _] = ray.birth_fm;
        let in_x = Sides::new(x, ray.direction[0]);
        let in_y = Sides::new(y, ray.direction[1]);
        let slab_fm = (self.tau_fm[1] - self.tau_fm[0]) / SLABS as f64;
        let mut slab_start = ray.distance_to_proper_time(self.tau_fm[0])?;
        let mut stretch: Option<(f64, f64)> = None;
        for (slab, [x_ends, y_ends]) in self.boxes.iter().enumerate() {
            let end_tau_fm = self.tau_fm[0] + (slab + 1) as f64 * slab_fm;
            let slab_end = ray.distance_to_proper_time(end_tau_fm)?;
            let ([x_in, x_out], [y_in, y_out]) = (in_x.between(*x_ends), in_y.between(*y_ends));
            let enter = slab_start.max(x_in).max(y_in);
            let leave = slab_end.min(x_out).min(y_out);
            if leave > enter {
                stretch = Some((stretch.map_or(enter, |(first, _)| first), leave));
            }
            slab_start = slab_end;
        }
        stretch
    }
}

/// One coordinate of a ray, start + speed * l.
struct Sides {
    start: f64,
    speed: f64,
    inverse_speed: f64,
}

impl Sides {
    fn new(start: f64, speed: f64) -> Sides {
        Sides {
            start,
            speed,
            inverse_speed: 1.0 / speed,
        }
    }

    /// The distances at which the coordinate enters and leaves an interval; enter beyond leave where it never does.
    #[inline]
    fn between(&self, [low, high]: [f64; 2]) -> [f64; 2] {
        if self.speed == 0.0 {
            let inside = (low..=high).contains(&self.start);
            return if inside {
                [0.0, f64::INFINITY]
            } else {
                [f64::INFINITY, f64::NEG_INFINITY]
            };
        }
        let (one, other) = (
            (low - self.start) * self.inverse_speed,
            (high - self.start) * self.inverse_speed,
        );
        [one.min(other), one.max(other)]
    }
}

/// Between a hot plane and a cold one the medium reaches into the cell, so each side grows by one plane; and an axis
/// needs two planes.
fn widen([first, last]: [usize; 2], count: usize) -> [usize; 2] {
    [first.saturating_sub(1), (last + 1).min(count - 1)]
}

fn hot_planes(data: &FieldData, end_temperature_gev: f64) -> Vec<HotPlane> {
    let [planes, columns, rows, depth] = data.shape();
    let mut hot = vec![COLD; planes];
    for (place, temperature) in data.temperature_gev.iter().enumerate() {
        if f64::from(*temperature) >= end_temperature_gev {
            let point = place / depth;
            let indices = [point / rows % columns, point % rows];
            for (range, index) in hot[point / (columns * rows)].iter_mut().zip(indices) {
                *range = [range[0].min(index), range[1].max(index)];
            }
        }
    }
    hot
}
