//! The spectrum of multiple soft scattering as a table, for every x and y.
//!
//! | where | what |
//! | --- | --- |
//! | x < 10^-4 (about) | the exact integral, some microseconds |
//! | up to x = 1 | bilinear in (ln x, ln y); proportional to y below; the large-y form above |
//! | up to x = 10^4 (about) | bilinear in ln x and ln u (u <= 1) or u; proportional to u below; the large-y form above |
//! | beyond | the first order in 1/x |
//!
//! Errors against the exact integral at random points (tested below): at most 10^-3 where |h| < 0.3 (for x > 1 also
//! 1.5 10^-3/x) and 0.6 % above.

use super::spectrum::{self, Row};
use crate::medium::effects::scaled_table::{
    Axis, Grid, Rectangle, ScaledSpectrum, column_of_ln_u, ln_u_of_column, overlap,
};
use crate::numerics::elementary::exp;

const LN_X_LOW: f64 = -9.25;
const LN_X_JOIN: f64 = 0.0;
const LN_X_HIGH: f64 = 9.25;
const LN_Y_LOW: f64 = -9.0;
/// y = 30: the large-y form is exact to 10^-4 above.
const LN_Y_HIGH: f64 = 3.4;
const LN_U_LOW: f64 = -5.0;
/// u = 30: the large-y form is exact to 10^-4 above.
const LN_U_HIGH: f64 = 3.4;
/// Steps of the grids: errors are their squares over 8 times second derivatives.
const SMALL_X_STEP: f64 = 0.1;
const LN_Y_STEP: f64 = 0.05;
const LARGE_X_STEP: f64 = 0.15;
const COLUMN_STEP: f64 = 0.1;
/// The table.
#[derive(Clone, Debug)]
pub struct MultipleSoftTable {
    small_x: Grid,
    large_x: Grid,
}

impl MultipleSoftTable {
    /// Computes the table.
    pub fn new() -> MultipleSoftTable {
        let small_x = Grid::new(
            Axis::new(LN_X_LOW, LN_X_JOIN, SMALL_X_STEP),
            Axis::new(LN_Y_LOW, LN_Y_HIGH, LN_Y_STEP),
            |ln_x, columns| values_of_row(ln_x, columns.iter().map(|&ln_y| exp(ln_y))),
        );
        let large_x = Grid::new(
            Axis::new(LN_X_JOIN, LN_X_HIGH, LARGE_X_STEP),
            Axis::new(LN_U_LOW, column_of_ln_u(LN_U_HIGH), COLUMN_STEP),
            |ln_x, columns| {
                let y = columns
                    .iter()
                    .map(|&column| exp(ln_x + ln_u_of_column(column)));
                values_of_row(ln_x, y)
            },
        );
        MultipleSoftTable { small_x, large_x }
    }

    /// Bytes of the table.
    pub fn bytes(&self) -> usize {
        self.small_x.bytes() + self.large_x.bytes()
    }

    #[inline]
    fn at_small_x(&self, ln_x: f64, ln_y: f64) -> f64 {
        if ln_y > LN_Y_HIGH {
            spectrum::tail(exp(ln_x), exp(ln_y))
        } else if ln_y < LN_Y_LOW {
            self.small_x.value(ln_x, LN_Y_LOW) * exp(ln_y - LN_Y_LOW)
        } else {
            self.small_x.value(ln_x, ln_y)
        }
    }

    #[inline]
    fn at_large_x(&self, ln_x: f64, ln_y: f64) -> f64 {
        let ln_u = ln_y - ln_x;
        if ln_u > LN_U_HIGH {
            spectrum::tail(exp(ln_x), exp(ln_y))
        } else if ln_u < LN_U_LOW {
            self.large_x.value(ln_x, LN_U_LOW) * exp(ln_u - LN_U_LOW)
        } else {
            self.large_x.value(ln_x, column_of_ln_u(ln_u))
        }
    }
}

impl Default for MultipleSoftTable {
    fn default() -> Self {
        MultipleSoftTable::new()
    }
}

/// h at one x for rising y, the nodes of the time integral made anew where y has grown too far for them.
fn values_of_row(ln_x: f64, y_values: impl Iterator<Item = f64>) -> Vec<f64> {
    /// Nodes made for a y serve down to so small a fraction of it.
    const REACH: f64 = 4.0;
    let x = exp(ln_x);
    let mut y_values = y_values.peekable();
    let mut largest_y = REACH * y_values.peek().copied().unwrap_or(1.0);
    let mut row = Row::new(x, largest_y);
    y_values
        .map(|y| {
            if y > largest_y {
                largest_y = REACH * y;
                row = Row::new(x, largest_y);
            }
            row.value(y)
        })
        .collect()
}

impl ScaledSpectrum for MultipleSoftTable {
    #[inline]
    fn value(&self, ln_x: f64, ln_y: f64) -> f64 {
        if ln_x < LN_X_LOW {
            at_tiny_x(ln_x, ln_y)
        } else if ln_x < LN_X_JOIN {
            self.at_small_x(ln_x, ln_y)
        } else if ln_x <= LN_X_HIGH {
            self.at_large_x(ln_x, ln_y)
        } else {
            spectrum::first_order(exp(ln_x), exp(ln_y - ln_x))
        }
    }

    fn bound(&self, rectangle: Rectangle) -> f64 {
        let Rectangle { ln_x, ln_y } = rectangle;
        let mut bound: f64 = 0.0;
        if let Some([low, _]) = overlap(ln_x, [f64::NEG_INFINITY, LN_X_LOW]) {
            bound = bound.max(bound_at_tiny_x(low, ln_x[1], ln_y));
        }
        if let Some(ln_x) = overlap(ln_x, [LN_X_LOW, LN_X_JOIN]) {
            bound = bound.max(self.bound_at_small_x(ln_x, ln_y));
        }
        if let Some(ln_x) = overlap(ln_x, [LN_X_JOIN, LN_X_HIGH]) {
            bound = bound.max(self.bound_at_large_x(ln_x, ln_y));
        }
        if let Some([low, _]) = overlap(ln_x, [LN_X_HIGH, f64::INFINITY]) {
            let (least, most) = (exp(ln_y[0] - ln_x[1]), exp(ln_y[1] - low));
            bound = bound.max((most / 6.0).min(2.0 / least + 2.0 / (least * least)) / exp(low));
        }
        bound
    }
}

/// The exact integral, or the large-y form where that is exact.
#[cold]
fn at_tiny_x(ln_x: f64, ln_y: f64) -> f64 {
    if ln_y > LN_Y_HIGH {
        spectrum::tail(exp(ln_x), exp(ln_y))
    } else {
        spectrum::direct(exp(ln_x), exp(ln_y))
    }
}

fn bound_at_tiny_x(lowest: f64, highest: f64, ln_y: [f64; 2]) -> f64 {
    let inside = overlap(ln_y, [f64::NEG_INFINITY, LN_Y_HIGH])
        .map_or(0.0, |_| spectrum::LARGEST_TIMES_ROOT_X * exp(-0.5 * lowest));
    let beyond = overlap(ln_y, [LN_Y_HIGH, f64::INFINITY])
        .map_or(0.0, |[low, _]| spectrum::tail_bound(exp(highest), exp(low)));
    inside.max(beyond)
}

impl MultipleSoftTable {
    fn bound_at_small_x(&self, ln_x: [f64; 2], ln_y: [f64; 2]) -> f64 {
        let mut bound: f64 = 0.0;
        if let Some([_, high]) = overlap(ln_y, [f64::NEG_INFINITY, LN_Y_LOW]) {
            let edge = self.small_x.largest(ln_x, [LN_Y_LOW; 2]);
            bound = bound.max(edge * exp(high - LN_Y_LOW));
        }
        if let Some(ln_y) = overlap(ln_y, [LN_Y_LOW, LN_Y_HIGH]) {
            bound = bound.max(self.small_x.largest(ln_x, ln_y));
        }
        if let Some([low, _]) = overlap(ln_y, [LN_Y_HIGH, f64::INFINITY]) {
            bound = bound.max(spectrum::tail_bound(exp(ln_x[1]), exp(low)));
        }
        bound
    }

    fn bound_at_large_x(&self, ln_x: [f64; 2], ln_y: [f64; 2]) -> f64 {
        let ln_u = [ln_y[0] - ln_x[1], ln_y[1] - ln_x[0]];
        let mut bound: f64 = 0.0;
        if let Some([_, high]) = overlap(ln_u, [f64::NEG_INFINITY, LN_U_LOW]) {
            let edge = self.large_x.largest(ln_x, [LN_U_LOW; 2]);
            bound = bound.max(edge * exp(high - LN_U_LOW));
        }
        if let Some(ln_u) = overlap(ln_u, [LN_U_LOW, LN_U_HIGH]) {
            let columns = ln_u.map(column_of_ln_u);
            bound = bound.max(self.large_x.largest(ln_x, columns));
        }
        if let Some([low, _]) = overlap(ln_u, [LN_U_HIGH, f64::INFINITY]) {
            // The large-y form is asked for at large u alone; the smallest y there follows from either variable.
            let y = exp(ln_y[0].max(low + ln_x[0]));
            bound = bound.max(spectrum::tail_bound(exp(ln_x[1]), y));
        }
        bound
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::medium::effects::scaled_table::tests::assert_that_bounds_hold;
    use crate::random::{Key, Purpose};
    use rand::RngExt;

    const POINTS: usize = 40_000;

    #[test]
    fn its_bounds_hold() {
        assert_that_bounds_hold(&MultipleSoftTable::new(), LN_X_LOW);
    }

    /// Largest error of the table where |h| < 0.3, the same times x for x > 1, and largest relative error above, over
    /// random points in and beyond the table.
    fn errors() -> [f64; 3] {
        let table = MultipleSoftTable::new();
        let mut stream = Key::event(1, 4).stream(Purpose::named("test"));
        let mut worst: [f64; 3] = [0.0; 3];
        for _ in 0..POINTS {
            let ln_x = 23.0 * stream.random::<f64>() - 11.0;
            let ln_u = 20.0 * stream.random::<f64>() - 14.0 - ln_x.min(0.0);
            let exact = spectrum::direct(exp(ln_x), exp(ln_x + ln_u));
            let error = (table.value(ln_x, ln_x + ln_u) - exact).abs();
            let place = match exact.abs() {
                0.0..0.3 => 0,
                _ => 2,
            };
            let scale = if place == 2 { exact.abs() } else { 1.0 };
            worst[place] = worst[place].max(error / scale);
            if ln_x > 0.0 {
                worst[1] = worst[1].max(error * exp(ln_x));
            }
        }
        worst
    }

    #[test]
    fn it_interpolates_the_exact_spectrum() {
        let [small, thin, large] = errors();
        assert!(
            small < 1e-3 && thin < 1.5e-3 && large < 6e-3,
            "{small} {thin} {large}"
        );
    }

    #[test]
    fn it_is_finite_everywhere_and_continuous_where_its_parts_meet() {
        let table = MultipleSoftTable::new();
        for i in -60..=60 {
            for j in -80..=80 {
                let (ln_x, ln_y) = (f64::from(i) * 0.5, f64::from(j) * 0.5);
                assert!(table.value(ln_x, ln_y).is_finite(), "{ln_x} {ln_y}");
            }
        }
        for place in 0..2000 {
            let along = 0.01 * f64::from(place) - 10.0;
            for joint in [LN_X_LOW, LN_X_JOIN, LN_X_HIGH] {
                let ln_y = along + joint.max(0.0);
                let jump = table.value(joint - 1e-9, ln_y) - table.value(joint + 1e-9, ln_y);
                let size = table.value(joint - 1e-9, ln_y).abs();
                assert!(
                    jump.abs() < 3e-3 * (1.0 + size) / exp(joint).max(1.0),
                    "ln x = {joint}, ln y = {ln_y}: {jump}"
                );
            }
        }
    }
}
