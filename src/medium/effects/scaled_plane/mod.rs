//! Drawing points under a bound on a spectrum of two scaled variables.
//!
//! The plane (ln x, ln y) is cut into square cells, each with a bound on max(h, 0) over it
//! ([`ScaledSpectrum::bound`]). A parton's emissions are a Poisson process in (ln omega, ln kappa^2) whose intensity is
//! a factor of the parton times h: [`Plane::mean`] is the integral of the bounds over the parton's region and
//! [`Plane::draw`] draws a point with their density. Points are then kept by the exact h over the bound.
//!
//! A region is cut off exactly in ln x and at its lower limit of ln y. Its upper limit, a broken line, is replaced row
//! of cells by row by its highest place there, so points may lie a little above it: they must be refused afterwards.
//! Sums along ln y are tabulated: the cost of `mean` is a few operations a row. Far outside the tabulated cells (where
//! no brick of nuclear size leads) bounds are computed when needed.

use rand::RngExt;

use crate::medium::effects::scaled_table::{Rectangle, ScaledSpectrum};
use crate::random::Stream;

/// Side of a cell.
const STEP: f64 = 0.25;
/// First cells of the table in both directions, as multiples of the step, and their numbers.
const FIRST_ROW: i64 = -48;
const ROWS: usize = 96;
const FIRST_COLUMN: i64 = -56;
const COLUMNS: usize = 128;

/// An upper limit: ln y <= at_zero + slope ln x.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Line {
    /// ln y at x = 1.
    pub at_zero: f64,
    /// Its rise with ln x.
    pub slope: f64,
}

impl Line {
    #[inline]
    fn at(&self, ln_x: f64) -> f64 {
        self.at_zero + self.slope * ln_x
    }

    /// The highest place over a range.
    #[inline]
    fn highest(&self, [low, high]: [f64; 2]) -> f64 {
        self.at(if self.slope > 0.0 { high } else { low })
    }
}

/// Where points are wanted; all numbers finite.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Region {
    /// Range of ln x.
    pub ln_x: [f64; 2],
    /// Lower limit of ln y.
    pub ln_y_floor: f64,
    /// Upper limits of ln y: the lower one counts.
    pub ceilings: [Line; 2],
}

impl Region {
    /// Whether a point lies inside.
    #[inline]
    pub fn holds(&self, ln_x: f64, ln_y: f64) -> bool {
        self.ln_x[0] <= ln_x
            && ln_x <= self.ln_x[1]
            && self.ln_y_floor <= ln_y
            && self.ceilings.iter().all(|line| ln_y <= line.at(ln_x))
    }

    #[inline]
    fn highest(&self, ln_x: [f64; 2]) -> f64 {
        let [first, second] = self.ceilings;
        first.highest(ln_x).min(second.highest(ln_x))
    }
}

/// A drawn point.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Point {
    /// ln x.
    pub ln_x: f64,
    /// ln y.
    pub ln_y: f64,
    /// The bound on max(h, 0) in its cell: its density was the bound over [`Plane::mean`].
    pub bound: f64,
}

/// The part of a region in one row of cells.
#[derive(Clone, Copy, Debug)]
struct Strip {
    row: i64,
    ln_x: [f64; 2],
    /// Ends in ln y in units of the step, from the table's first column.
    columns: [f64; 2],
}

impl Strip {
    fn width(&self) -> f64 {
        self.ln_x[1] - self.ln_x[0]
    }
}

/// A spectrum with the bounds of its cells.
#[derive(Clone, Debug)]
pub struct Plane<S> {
    spectrum: S,
    bounds: Vec<f64>,
    /// [row][column]: the integral of the bounds over ln y up to the column's lower end, one more than columns.
    sums: Vec<f64>,
}

impl<S: ScaledSpectrum> Plane<S> {
    /// Computes all bounds.
    pub fn new(spectrum: S) -> Plane<S> {
        let mut bounds = Vec::with_capacity(ROWS * COLUMNS);
        let mut sums = Vec::with_capacity(ROWS * (COLUMNS + 1));
        for row in FIRST_ROW..FIRST_ROW + ROWS as i64 {
            let mut sum = 0.0;
            for column in 0..COLUMNS as i64 {
                let bound = spectrum.bound(cell(row, column));
                bounds.push(bound);
                sums.push(sum);
                sum += STEP * bound;
            }
            sums.push(sum);
        }
        Plane {
            spectrum,
            bounds,
            sums,
        }
    }

    /// The spectrum.
    pub fn spectrum(&self) -> &S {
        &self.spectrum
    }

    /// Bytes of the tables of bounds.
    pub fn bytes(&self) -> usize {
        (self.bounds.len() + self.sums.len()) * size_of::<f64>()
    }

    /// The integral of the bounds over the cells' part of the region (and a little above its upper limit).
    pub fn mean(&self, region: &Region) -> f64 {
        strips(region).map(|strip| self.strip_mean(&strip)).sum()
    }

    /// A point with the density of the bounds; `mean` is the region's [`Plane::mean`] and must be positive.
    pub fn draw(&self, region: &Region, mean: f64, stream: &mut Stream) -> Point {
        let mut left = stream.random::<f64>() * mean;
        let mut chosen = None;
        for strip in strips(region) {
            let mean = self.strip_mean(&strip);
            if mean > 0.0 {
                chosen = Some((strip, left.min(mean) / strip.width()));
                if left < mean {
                    break;
                }
            }
            left -= mean;
        }
        let Some((strip, sum)) = chosen else {
            // Nothing to draw: a point that every acceptance refuses.
            let [ln_x, _] = region.ln_x;
            return Point {
                ln_x,
                ln_y: region.ln_y_floor,
                bound: 0.0,
            };
        };
        let across = stream.random::<f64>();
        let (column, cell) = self.column_at(&strip, sum);
        Point {
            ln_x: strip.ln_x[0] + across * strip.width(),
            ln_y: (FIRST_COLUMN as f64 + column) * STEP,
            bound: self.bound(strip.row, cell),
        }
    }

    /// The bound of a cell.
    #[inline]
    fn bound(&self, row: i64, column: i64) -> f64 {
        match table_row(row) {
            Some(table_row) if (0..COLUMNS as i64).contains(&column) => {
                self.bounds[table_row * COLUMNS + column as usize]
            }
            _ => self.spectrum.bound(cell(row, column)),
        }
    }

    #[inline]
    fn sums_of(&self, strip: &Strip) -> Option<&[f64]> {
        let [low, high] = strip.columns;
        let inside = low >= 0.0 && high <= COLUMNS as f64;
        let row = table_row(strip.row).filter(|_| inside)?;
        Some(&self.sums[row * (COLUMNS + 1)..(row + 1) * (COLUMNS + 1)])
    }

    #[inline]
    fn strip_mean(&self, strip: &Strip) -> f64 {
        let [low, high] = strip.columns;
        let over_ln_y = match self.sums_of(strip) {
            Some(sums) => sum_at(sums, high) - sum_at(sums, low),
            None => pieces(strip)
                .map(|(column, share)| share * STEP * self.bound(strip.row, column))
                .sum(),
        };
        strip.width() * over_ln_y.max(0.0)
    }

    /// The place in a strip up to which the bounds integrate to a given sum, and its cell.
    fn column_at(&self, strip: &Strip, sum: f64) -> (f64, i64) {
        let [low, high] = strip.columns;
        if let Some(sums) = self.sums_of(strip) {
            let target = sum_at(sums, low) + sum;
            let cell = sums
                .partition_point(|&below| below <= target)
                .clamp(1, COLUMNS)
                - 1;
            let share =
                (target - sums[cell]) / (sums[cell + 1] - sums[cell]).max(f64::MIN_POSITIVE);
            return ((cell as f64 + share.min(1.0)).clamp(low, high), cell as i64);
        }
        let mut left = sum;
        let mut last = (high, low.floor() as i64);
        for (column, share) in pieces(strip) {
            let whole = STEP * self.bound(strip.row, column);
            let start = low.max(column as f64);
            if whole > 0.0 {
                last = (start + (left / whole).min(share), column);
            }
            if left < share * whole {
                break;
            }
            left -= share * whole;
        }
        last
    }
}

#[inline]
fn table_row(row: i64) -> Option<usize> {
    let table_row = row - FIRST_ROW;
    (0..ROWS as i64)
        .contains(&table_row)
        .then_some(table_row as usize)
}

/// The cell of a row and of a column counted from the table's first.
fn cell(row: i64, column: i64) -> Rectangle {
    let range = |first: i64| [first as f64 * STEP, (first + 1) as f64 * STEP];
    Rectangle {
        ln_x: range(row),
        ln_y: range(FIRST_COLUMN + column),
    }
}

/// The sum up to a place between columns.
#[inline]
fn sum_at(sums: &[f64], column: f64) -> f64 {
    let cell = (column as usize).min(COLUMNS - 1);
    sums[cell] + (column - cell as f64) * (sums[cell + 1] - sums[cell])
}

/// The strips of a region that are not empty.
fn strips(region: &Region) -> impl Iterator<Item = Strip> {
    let [low, high] = region.ln_x;
    let floor = region.ln_y_floor / STEP - FIRST_COLUMN as f64;
    let first = (low / STEP).floor() as i64;
    let end = if low < high {
        (high / STEP).ceil() as i64
    } else {
        first
    };
    (first..end).filter_map(move |row| {
        let ln_x = [
            low.max(row as f64 * STEP),
            high.min((row + 1) as f64 * STEP),
        ];
        let top = region.highest(ln_x) / STEP - FIRST_COLUMN as f64;
        let strip = Strip {
            row,
            ln_x,
            columns: [floor, top],
        };
        (top > floor && strip.width() > 0.0).then_some(strip)
    })
}

/// The columns of a strip and the share of each that belongs to it.
fn pieces(strip: &Strip) -> impl Iterator<Item = (i64, f64)> {
    let [low, high] = strip.columns;
    (low.floor() as i64..high.ceil() as i64).map(move |column| {
        (
            column,
            high.min((column + 1) as f64) - low.max(column as f64),
        )
    })
}

#[cfg(test)]
mod tests;
