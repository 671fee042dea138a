//! Spectra of two scaled variables: what a table of one must offer, and the bilinear grid behind it.
//!
//! A static brick's induced spectrum depends on the gluon's energy and transverse momentum through x, proportional to
//! omega, and y, proportional to kappa^2 and not to omega, alone; u = y/x = kappa^2 L/(2 omega) is the phase over the
//! brick. Where x is small the spectrum is smooth in ln y; where x is large its far edge makes it oscillate in u, and
//! there the columns of a grid are ln u below u = 1 and u - 1 above ([`column_of_ln_u`]).

use crate::numerics::elementary::{exp, ln};

/// A rectangle in (ln x, ln y): lower and upper ends, which may coincide.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Rectangle {
    /// Range of ln x.
    pub ln_x: [f64; 2],
    /// Range of ln y.
    pub ln_y: [f64; 2],
}

/// A tabulated spectrum h(x, y), defined for all finite ln x and ln y.
pub trait ScaledSpectrum {
    /// h.
    fn value(&self, ln_x: f64, ln_y: f64) -> f64;

    /// A number that is not negative and not below [`ScaledSpectrum::value`] anywhere in the rectangle, borders included.
    fn bound(&self, rectangle: Rectangle) -> f64;
}

/// Rounding of an interpolation between nodes, relative to the largest.
pub const ROUNDING: f64 = 1e-12;

/// The part of [low, high] inside [least, most], if there is any.
pub fn overlap([low, high]: [f64; 2], [least, most]: [f64; 2]) -> Option<[f64; 2]> {
    let (low, high) = (low.max(least), high.min(most));
    (low <= high).then_some([low, high])
}

/// ln u for u <= 1, u - 1 above: continuous with its slope.
#[inline]
pub fn column_of_ln_u(ln_u: f64) -> f64 {
    if ln_u <= 0.0 { ln_u } else { exp(ln_u) - 1.0 }
}

/// The inverse of [`column_of_ln_u`].
#[inline]
pub fn ln_u_of_column(column: f64) -> f64 {
    if column <= 0.0 {
        column
    } else {
        ln(1.0 + column)
    }
}

/// Evenly spaced nodes from `low` to `high`.
#[derive(Clone, Copy, Debug)]
pub struct Axis {
    low: f64,
    step: f64,
    per_step: f64,
    cells: usize,
}

impl Axis {
    /// Nodes at both ends, no further apart than `widest`.
    pub fn new(low: f64, high: f64, widest: f64) -> Axis {
        let cells = ((high - low) / widest).ceil().max(1.0) as usize;
        let step = (high - low) / cells as f64;
        Axis {
            low,
            step,
            per_step: 1.0 / step,
            cells,
        }
    }

    /// Number of nodes.
    pub fn nodes(&self) -> usize {
        self.cells + 1
    }

    /// Place of a node.
    pub fn node(&self, index: usize) -> f64 {
        self.low + index as f64 * self.step
    }

    /// The cell of a place and how far into it the place lies; the outermost cells take what lies beyond by rounding.
    #[inline]
    fn locate(&self, place: f64) -> (usize, f64) {
        let position = (place - self.low) * self.per_step;
        let cell = (position as usize).min(self.cells - 1);
        (cell, (position - cell as f64).clamp(0.0, 1.0))
    }
}

/// Values on a rectangle of nodes, bilinear between them.
#[derive(Clone, Debug)]
pub struct Grid {
    rows: Axis,
    columns: Axis,
    values: Vec<f32>,
}

impl Grid {
    /// `row_values(row, columns)` gives the values at a row's place in the order of the columns.
    pub fn new(
        rows: Axis,
        columns: Axis,
        mut row_values: impl FnMut(f64, &[f64]) -> Vec<f64>,
    ) -> Grid {
        let places: Vec<f64> = (0..columns.nodes())
            .map(|index| columns.node(index))
            .collect();
        let values = (0..rows.nodes())
            .flat_map(|row| row_values(rows.node(row), &places))
            .map(|value| value as f32)
            .collect();
        Grid {
            rows,
            columns,
            values,
        }
    }

    /// The value at a place inside the rectangle.
    #[inline]
    pub fn value(&self, row: f64, column: f64) -> f64 {
        let (i, across) = self.rows.locate(row);
        let (j, along) = self.columns.locate(column);
        let length = self.columns.nodes();
        let start = i * length + j;
        let corners = &self.values[start..start + length + 2];
        let between =
            |left: f32, right: f32| f64::from(left) + along * (f64::from(right) - f64::from(left));
        let first = between(corners[0], corners[1]);
        let second = between(corners[length], corners[length + 1]);
        first + across * (second - first)
    }

    /// The largest node of all cells that a part of the rectangle touches: a bound on the values there.
    pub fn largest(&self, rows: [f64; 2], columns: [f64; 2]) -> f64 {
        let largest = self.of_nodes(rows, columns, f64::NEG_INFINITY, f64::max);
        largest + ROUNDING * largest.abs()
    }

    /// The smallest node of all cells that a part of the rectangle touches.
    pub fn smallest(&self, rows: [f64; 2], columns: [f64; 2]) -> f64 {
        let smallest = self.of_nodes(rows, columns, f64::INFINITY, f64::min);
        smallest - ROUNDING * smallest.abs()
    }

    fn of_nodes(
        &self,
        rows: [f64; 2],
        columns: [f64; 2],
        start: f64,
        choose: impl Fn(f64, f64) -> f64,
    ) -> f64 {
        let [first_row, last_row] = rows.map(|place| self.rows.locate(place).0);
        let [first, last] = columns.map(|place| self.columns.locate(place).0);
        let length = self.columns.nodes();
        let rows = (first_row..=last_row + 1).map(|row| row * length);
        rows.flat_map(|row| &self.values[row + first..=row + last + 1])
            .fold(start, |chosen, value| choose(chosen, f64::from(*value)))
    }

    /// Bytes of the table.
    pub fn bytes(&self) -> usize {
        self.values.len() * size_of::<f32>()
    }
}

#[cfg(test)]
pub(super) mod tests {
    use super::*;
    use crate::random::{Key, Purpose};
    use rand::RngExt;

    /// Asserts that bounds hold at 10^5 random points of random cells, a third of them on a border in ln x, a fifth in
    /// ln y. Where the exact spectrum costs microseconds (below `cheap_from` in ln x) one in eight is tried.
    pub fn assert_that_bounds_hold(spectrum: &impl ScaledSpectrum, cheap_from: f64) {
        const SIDE: f64 = 0.4;
        let mut stream = Key::event(11, 1).stream(Purpose::named("test"));
        for place in 0..100_000 {
            let mut corner = |low: f64, high: f64| low + (high - low) * stream.random::<f64>();
            let (x, y) = (corner(-16.0, 14.0), corner(-15.0, 22.0));
            let cell = Rectangle {
                ln_x: [x, x + SIDE],
                ln_y: [y, y + SIDE],
            };
            let mut within = |[low, high]: [f64; 2], on_border: bool| {
                let share: f64 = stream.random();
                let share = if on_border { share.round() } else { share };
                (low + share * (high - low)).min(high)
            };
            let ln_x = within(cell.ln_x, place % 3 == 0);
            let ln_y = within(cell.ln_y, place % 5 == 0);
            if ln_x < cheap_from && place % 8 != 0 {
                continue;
            }
            let (h, bound) = (spectrum.value(ln_x, ln_y), spectrum.bound(cell));
            assert!(h.is_finite() && bound >= 0.0);
            assert!(h <= bound, "h({ln_x}, {ln_y}) = {h} above {bound}");
        }
    }

    /// A spectrum whose bound is a thousandth too low.
    struct TooLow<S>(S);

    impl<S: ScaledSpectrum> ScaledSpectrum for TooLow<S> {
        fn value(&self, ln_x: f64, ln_y: f64) -> f64 {
            self.0.value(ln_x, ln_y)
        }

        fn bound(&self, rectangle: Rectangle) -> f64 {
            0.999 * self.0.bound(rectangle)
        }
    }

    /// A ridge that rises and falls with ln y, its bound exact.
    struct Ridge;

    impl ScaledSpectrum for Ridge {
        fn value(&self, _: f64, ln_y: f64) -> f64 {
            1.0 / (1.0 + ln_y * ln_y)
        }

        fn bound(&self, Rectangle { ln_y, .. }: Rectangle) -> f64 {
            self.value(0.0, 0f64.clamp(ln_y[0], ln_y[1]))
        }
    }

    #[test]
    fn bounds_of_a_ridge_hold() {
        assert_that_bounds_hold(&Ridge, f64::NEG_INFINITY);
    }

    #[test]
    #[should_panic(expected = "above")]
    fn a_bound_that_is_too_low_is_found() {
        assert_that_bounds_hold(&TooLow(Ridge), f64::NEG_INFINITY);
    }

    #[test]
    fn a_grid_is_exact_at_nodes_and_for_bilinear_functions() {
        let f = |x: f64, y: f64| 1.0 + 2.0 * x - 3.0 * y + 0.5 * x * y;
        let grid = Grid::new(
            Axis::new(-2.0, 1.0, 0.3),
            Axis::new(0.0, 5.0, 0.4),
            |x, columns| columns.iter().map(|&y| f(x, y)).collect(),
        );
        for (x, y) in [(-2.0, 0.0), (1.0, 5.0), (-0.37, 4.9), (0.999, 0.01)] {
            assert!((grid.value(x, y) - f(x, y)).abs() < 1e-5);
        }
        let largest = grid.largest([-0.1, 0.2], [1.0, 1.1]);
        assert!(largest >= f(0.2, 1.0) && largest <= f(0.5, 0.7) + 0.2);
    }

    #[test]
    fn columns_and_their_inverse() {
        for ln_u in [-7.0, -1.0, 0.0, 0.3, 3.0] {
            assert!((ln_u_of_column(column_of_ln_u(ln_u)) - ln_u).abs() < 1e-14);
        }
    }
}
