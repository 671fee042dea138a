//! The spectrum at first order in opacity as a table, for every x and y.
//!
//! | where | what |
//! | --- | --- |
//! | x < 1/30 (about) | the closed form without phases |
//! | up to x = 1 | bilinear in (ln x, ln y); proportional to y below; the large-y form above |
//! | up to x = 10^4 (about) | bilinear in ln x and ln u (u <= 1) or u; proportional to u below; the large-y form above |
//! | beyond | x h straight in ln x at a given u; the large-y form above |
//!
//! Errors against the exact integral at random points (tested below): at most 6 10^-4 where |h| < 0.3 (for x > 1 also
//! 0.015/x, the largest h being 0.18/x at x = 1 and 2.8/x at 10^4) and 0.2 % above.

use super::spectrum;
use crate::medium::effects::scaled_table::{
    Axis, Grid, Rectangle, ScaledSpectrum, column_of_ln_u, ln_u_of_column, overlap,
};
use crate::numerics::elementary::exp;

const LN_X_LOW: f64 = -3.4;
const LN_X_JOIN: f64 = 0.0;
const LN_X_HIGH: f64 = 9.25;
/// y = 10^-3: corrections to proportionality are of this relative order below.
const LN_Y_LOW: f64 = -7.0;
/// y = 30: the large-y form is exact to 10^-4 above.
const LN_Y_HIGH: f64 = 3.4;
/// y < 1/100 for all x of the table.
const LN_U_LOW: f64 = -14.0;
/// u = 30: the large-y form is exact to 3 10^-3/x above.
const LN_U_HIGH: f64 = 3.4;
/// Steps of the grids: errors are their squares over 8 times second derivatives.
const SMALL_X_STEP: f64 = 0.1;
const LN_Y_STEP: f64 = 0.08;
const LARGE_X_STEP: f64 = 0.2;
const COLUMN_STEP: f64 = 0.12;
/// Distance in ln x over which the law beyond the table is measured.
const LAW_STEP: f64 = 1.0;

/// The table; x = 2 omega/(mu^2 L), y = kappa^2/mu^2, values per unit of opacity.
#[derive(Clone, Debug)]
pub struct SingleHardTable {
    small_x: Grid,
    large_x: Grid,
}

impl SingleHardTable {
    /// Computes the table.
    pub fn new() -> SingleHardTable {
        let small_x = Grid::new(
            Axis::new(LN_X_LOW, LN_X_JOIN, SMALL_X_STEP),
            Axis::new(LN_Y_LOW, LN_Y_HIGH, LN_Y_STEP),
            |ln_x, columns| {
                let value = |&ln_y: &f64| spectrum::direct(exp(ln_x), exp(ln_y));
                columns.iter().map(value).collect()
            },
        );
        let large_x = Grid::new(
            Axis::new(LN_X_JOIN, LN_X_HIGH, LARGE_X_STEP),
            Axis::new(LN_U_LOW, column_of_ln_u(LN_U_HIGH), COLUMN_STEP),
            |ln_x, columns| {
                let ln_y = |column: f64| ln_x + ln_u_of_column(column);
                let value = |&column: &f64| spectrum::direct(exp(ln_x), exp(ln_y(column)));
                columns.iter().map(value).collect()
            },
        );
        SingleHardTable { small_x, large_x }
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
    fn at_large_x(&self, ln_x: f64, ln_u: f64) -> f64 {
        if ln_u > LN_U_HIGH {
            spectrum::tail(exp(ln_x), exp(ln_u + ln_x))
        } else if ln_u < LN_U_LOW {
            self.large_x.value(ln_x, LN_U_LOW) * exp(ln_u - LN_U_LOW)
        } else {
            self.large_x.value(ln_x, column_of_ln_u(ln_u))
        }
    }

    fn at_huge_x(&self, ln_x: f64, ln_u: f64) -> f64 {
        if ln_u > LN_U_HIGH {
            return spectrum::tail(exp(ln_x), exp(ln_u + ln_x));
        }
        let last = exp(LN_X_HIGH) * self.at_large_x(LN_X_HIGH, ln_u);
        let before = exp(LN_X_HIGH - LAW_STEP) * self.at_large_x(LN_X_HIGH - LAW_STEP, ln_u);
        (last + (last - before) * (ln_x - LN_X_HIGH) / LAW_STEP) * exp(-ln_x)
    }
}

impl Default for SingleHardTable {
    fn default() -> Self {
        SingleHardTable::new()
    }
}

impl ScaledSpectrum for SingleHardTable {
    #[inline]
    fn value(&self, ln_x: f64, ln_y: f64) -> f64 {
        if ln_x < LN_X_LOW {
            spectrum::without_phase(exp(ln_x), exp(ln_y))
        } else if ln_x < LN_X_JOIN {
            self.at_small_x(ln_x, ln_y)
        } else if ln_x <= LN_X_HIGH {
            self.at_large_x(ln_x, ln_y - ln_x)
        } else {
            self.at_huge_x(ln_x, ln_y - ln_x)
        }
    }

    fn bound(&self, rectangle: Rectangle) -> f64 {
        let Rectangle { ln_x, ln_y } = rectangle;
        let mut bound: f64 = 0.0;
        if let Some(ln_x) = overlap(ln_x, [f64::NEG_INFINITY, LN_X_LOW]) {
            bound = bound.max(spectrum::without_phase_bound(ln_x.map(exp), ln_y.map(exp)));
        }
        if let Some(ln_x) = overlap(ln_x, [LN_X_LOW, LN_X_JOIN]) {
            bound = bound.max(self.bound_at_small_x(ln_x, ln_y));
        }
        if let Some(ln_x) = overlap(ln_x, [LN_X_JOIN, LN_X_HIGH]) {
            bound = bound.max(self.bound_at_large_x(ln_x, ln_y));
        }
        if let Some(ln_x) = overlap(ln_x, [LN_X_HIGH, f64::INFINITY]) {
            bound = bound.max(self.bound_at_huge_x(ln_x, ln_y));
        }
        bound
    }
}

impl SingleHardTable {
    fn bound_at_small_x(&self, ln_x: [f64; 2], ln_y: [f64; 2]) -> f64 {
        let mut bound: f64 = 0.0;
        if let Some([_, high]) = overlap(ln_y, [f64::NEG_INFINITY, LN_Y_LOW]) {
            let edge = self.small_x.largest(ln_x, [LN_Y_LOW; 2]);
            bound = bound.max(edge * exp(high - LN_Y_LOW));
        }
        if let Some(ln_y) = overlap(ln_y, [LN_Y_LOW, LN_Y_HIGH]) {
            bound = bound.max(self.small_x.largest(ln_x, ln_y));
        }
        if let Some(ln_y) = overlap(ln_y, [LN_Y_HIGH, f64::INFINITY]) {
            bound = bound.max(spectrum::tail_bound(ln_x.map(exp), ln_y.map(exp)));
        }
        bound
    }

    fn bound_at_large_x(&self, ln_x: [f64; 2], ln_y: [f64; 2]) -> f64 {
        let ln_u = [ln_y[0] - ln_x[1], ln_y[1] - ln_x[0]];
        let mut bound: f64 = tail_bound(ln_x, ln_y);
        if let Some([_, high]) = overlap(ln_u, [f64::NEG_INFINITY, LN_U_LOW]) {
            let edge = self.large_x.largest(ln_x, [LN_U_LOW; 2]);
            bound = bound.max(edge * exp(high - LN_U_LOW));
        }
        if let Some(ln_u) = overlap(ln_u, [LN_U_LOW, LN_U_HIGH]) {
            let columns = ln_u.map(column_of_ln_u);
            bound = bound.max(self.large_x.largest(ln_x, columns));
        }
        bound
    }

    fn bound_at_huge_x(&self, ln_x: [f64; 2], ln_y: [f64; 2]) -> f64 {
        let ln_u = [ln_y[0] - ln_x[1], ln_y[1] - ln_x[0]];
        let bound = tail_bound(ln_x, ln_y);
        let Some(inside) = overlap(ln_u, [f64::NEG_INFINITY, LN_U_HIGH]) else {
            return bound;
        };
        let columns = inside.map(|ln_u| column_of_ln_u(ln_u.max(LN_U_LOW)));
        let (last_x, before_x) = (LN_X_HIGH, LN_X_HIGH - LAW_STEP);
        let last = exp(last_x) * self.large_x.largest([last_x; 2], columns);
        let before = exp(before_x) * self.large_x.smallest([before_x; 2], columns);
        let rise = (last - before).max(0.0) * (ln_x[1] - LN_X_HIGH) / LAW_STEP;
        bound.max((last.max(0.0) + rise) * exp(-ln_x[0]))
    }
}

/// A bound on the large-y form where the rectangle reaches it.
fn tail_bound(ln_x: [f64; 2], ln_y: [f64; 2]) -> f64 {
    overlap(ln_y, [LN_U_HIGH + ln_x[0], f64::INFINITY]).map_or(0.0, |ln_y| {
        spectrum::tail_bound(ln_x.map(exp), ln_y.map(exp))
    })
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
        assert_that_bounds_hold(&SingleHardTable::new(), f64::NEG_INFINITY);
    }

    /// Largest error of the table where |h| < 0.3, the same times x for x > 1, and largest relative error above, over
    /// random points in and beyond the table.
    fn errors() -> [f64; 3] {
        let table = SingleHardTable::new();
        let mut stream = Key::event(1, 4).stream(Purpose::named("test"));
        let mut worst: [f64; 3] = [0.0; 3];
        for _ in 0..POINTS {
            let ln_x = 23.0 * stream.random::<f64>() - 11.0;
            let ln_u = 20.0 * stream.random::<f64>() - 14.0 - ln_x.min(0.0);
            // There the exact integral costs milliseconds.
            if ln_u > 6.5 {
                continue;
            }
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
            small < 6e-4 && thin < 1.5e-2 && large < 2e-3,
            "{small} {thin} {large}"
        );
    }

    #[test]
    fn it_is_finite_everywhere_and_continuous_where_its_parts_meet() {
        let table = SingleHardTable::new();
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
                    jump.abs() < 5e-3 * (1.0 + size) / exp(joint).max(1.0),
                    "ln x = {joint}, ln y = {ln_y}: {jump}"
                );
            }
        }
    }
}
