//! One axis of a grid: from a coordinate to its cell in constant time, on uneven axes too.

use std::ops::Range;

use super::super::{larger, smaller};

/// A strictly increasing axis.
#[derive(Clone, Debug)]
pub(super) struct Axis {
    points: Vec<f64>,
    /// Start and inverse width of each cell, and a last one that no coordinate reaches.
    cells: Vec<[f64; 2]>,
    /// Equal bins over the whole axis a unit of the coordinate.
    bins_per_unit: f64,
    bins: f64,
    last_bin: f64,
    first: f64,
    /// The cell of the left edge of each bin; empty for an even axis, whose bins are its cells.
    guide: Vec<u32>,
    /// Most points inside a bin.
    most_steps: u32,
}

/// An axis is even when its points lie this close (in units of its spacing) to even ones: the rounding of single
/// precision coordinates must pass. It is then taken as even.
const EVENNESS: f64 = 1e-5;
/// More bins than this are not made, however uneven the axis.
const MOST_BINS: f64 = 65_536.0;

impl Axis {
    /// An axis of at least two points.
    pub(super) fn new(points: Vec<f64>) -> Axis {
        let count = points.len() - 1;
        let span = points[count] - points[0];
        let widths = || points.windows(2).map(|pair| pair[1] - pair[0]);
        let narrowest = widths().fold(f64::INFINITY, f64::min);
        let even = is_even(&points);
        // A bin no wider than the narrowest cell holds at most one point.
        let bins = if even {
            count
        } else {
            (span / narrowest).ceil().min(MOST_BINS) as usize
        };
        let cell_at = |edge: f64| points[1..count].partition_point(|point| *point <= edge) as u32;
        let mut guide = Vec::new();
        let mut most_steps = 0;
        if !even {
            let edge = |bin: usize| points[0] + span * bin as f64 / bins as f64;
            guide = (0..bins).map(|bin| cell_at(edge(bin))).collect();
            // Rounding may put a coordinate at an edge into the bin beside it; its place is then clamped to the edge.
            let step = |bin: usize| cell_at(edge(bin + 1)) - guide[bin];
            most_steps = (0..bins).map(step).max().unwrap_or(0);
        }
        Axis {
            bins_per_unit: bins as f64 / span,
            bins: bins as f64,
            last_bin: (bins - 1) as f64,
            first: points[0],
            guide,
            most_steps,
            cells: points
                .windows(2)
                .map(|pair| [pair[0], 1.0 / (pair[1] - pair[0])])
                .chain([[f64::INFINITY, 0.0]])
                .collect(),
            points,
        }
    }

    pub(super) fn len(&self) -> usize {
        self.points.len()
    }

    pub(super) fn first(&self) -> f64 {
        self.points[0]
    }

    pub(super) fn last(&self) -> f64 {
        self.points[self.points.len() - 1]
    }

    pub(super) fn mean_spacing(&self) -> f64 {
        (self.last() - self.first()) / (self.points.len() - 1) as f64
    }

    /// The points of all cells that touch an interval (where the axis ends, of the cell at the end).
    pub(super) fn around(&self, low: f64, high: f64) -> Range<usize> {
        let from = self.points.partition_point(|point| *point <= low);
        let to = self.points.partition_point(|point| *point < high);
        from.saturating_sub(1)..(to + 1).min(self.points.len())
    }

    /// Cell and place in it (0 to 1) of a coordinate; beyond an end, the end itself.
    #[inline(always)]
    pub(super) fn locate(&self, coordinate: f64) -> (usize, f32) {
        let scaled = (coordinate - self.first) * self.bins_per_unit;
        let scaled = smaller(larger(scaled, 0.0), self.bins);
        // SAFETY: this leaves a number from 0 to the last bin, also of NaN, and there are at most 2^16 bins or as many as
        // the axis has cells.
        let bin = unsafe { smaller(scaled, self.last_bin).to_int_unchecked::<i64>() };
        if self.guide.is_empty() {
            return (bin as usize, (scaled - bin as f64) as f32);
        }
        let mut cell = self.guide[bin as usize] as usize;
        for _ in 0..self.most_steps {
            // A sum, not a branch: whether the next cell has begun is not to be foreseen.
            cell += usize::from(self.cells[cell + 1][0] <= coordinate);
        }
        let [start, inverse_width] = self.cells[cell];
        let place = (coordinate - start) * inverse_width;
        (cell, smaller(larger(place, 0.0), 1.0) as f32)
    }
}

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

#[cfg(test)]
mod tests {
    use super::*;

    /// Against a linear search, on even, uneven and very uneven axes, with coordinates on the points and beyond the
    /// ends.
    #[test]
    fn cells_and_places_are_those_of_a_search() {
        let axes = [
            vec![-1.0, -0.5, 0.0, 0.5, 1.0],
            vec![0.6, 0.7, 0.9, 1.3, 1.35, 4.0],
            vec![0.0, 1e-7, 1.0, 1.5, 1e4],
            vec![2.0, 3.0],
        ];
        for points in axes {
            let axis = Axis::new(points.clone());
            let (first, last) = (axis.first(), axis.last());
            let between =
                (0..=4000).map(|step| first - 0.1 + (last - first + 0.2) * step as f64 / 4000.0);
            for coordinate in between.chain(points.iter().copied()) {
                let inside = coordinate.clamp(first, last);
                let (cell, place) = axis.locate(coordinate);
                let found = points[cell] + f64::from(place) * (points[cell + 1] - points[cell]);
                assert!(
                    (found - inside).abs() < 2e-7 * (last - first),
                    "{points:?} {coordinate}: {found}"
                );
            }
        }
    }
}
