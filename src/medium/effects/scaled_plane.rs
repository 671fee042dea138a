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

use super::scaled_table::{Rectangle, ScaledSpectrum};
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

    /// A point with the density of the bounds; [`Plane::mean`] of the region must be positive.
    pub fn draw(&self, region: &Region, stream: &mut Stream) -> Point {
        let mut left = stream.random::<f64>() * self.mean(region);
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
mod tests {
    use super::*;
    use crate::medium::effects::multiple_soft::table::MultipleSoftTable;
    use crate::medium::effects::single_hard::table::SingleHardTable;
    use crate::random::{Key, Purpose};

    fn stream(number: u64) -> Stream {
        Key::event(11, number).stream(Purpose::named("test"))
    }

    /// omega from 1 to 100 GeV, omega_c = 63 GeV, qhat L = 5 GeV^2, kappa > 0.5 GeV, start virtuality 100 GeV, kappa < omega.
    fn strong_brick() -> Region {
        Region {
            ln_x: [-4.14, 0.46],
            ln_y_floor: -3.0,
            ceilings: [
                Line {
                    at_zero: 7.14,
                    slope: 1.0,
                },
                Line {
                    at_zero: 6.68,
                    slope: 2.0,
                },
            ],
        }
    }

    /// omega_c = 3 GeV, qhat L = 0.6 GeV^2, start virtuality 20 GeV.
    fn weak_brick() -> Region {
        Region {
            ln_x: [-1.1, 3.5],
            ln_y_floor: -0.9,
            ceilings: [
                Line {
                    at_zero: 3.0,
                    slope: 1.0,
                },
                Line {
                    at_zero: 2.7,
                    slope: 2.0,
                },
            ],
        }
    }

    /// Partly beyond the tabulated cells on every side.
    fn vast() -> [Region; 4] {
        let level = |at_zero| {
            [Line {
                at_zero,
                slope: 0.0,
            }; 2]
        };
        [
            Region {
                ln_x: [-13.1, -11.3],
                ln_y_floor: -1.0,
                ceilings: level(2.1),
            },
            Region {
                ln_x: [11.4, 12.9],
                ln_y_floor: 11.0,
                ceilings: level(16.0),
            },
            Region {
                ln_x: [-3.0, -2.0],
                ln_y_floor: -15.3,
                ceilings: level(-13.2),
            },
            Region {
                ln_x: [1.0, 1.5],
                ln_y_floor: 17.1,
                ceilings: level(19.0),
            },
        ]
    }

    /// The bound holds at random points of random cells and on their borders.
    fn bound_holds<S: ScaledSpectrum>(spectrum: &S) {
        let mut stream = stream(1);
        for place in 0..100_000 {
            let row = -52 + (104.0 * stream.random::<f64>()) as i64;
            let column = -4 + (136.0 * stream.random::<f64>()) as i64;
            let cell = cell(row, column);
            let bound = spectrum.bound(cell);
            let mut within = |[low, high]: [f64; 2], border: bool| {
                let share: f64 = stream.random();
                if border {
                    [low, high][(share < 0.5) as usize]
                } else {
                    low + share * (high - low)
                }
            };
            let ln_x = within(cell.ln_x, place % 3 == 0);
            let ln_y = within(cell.ln_y, place % 5 == 0);
            // Below the table the exact spectrum costs microseconds.
            if ln_x < -9.25 && place % 8 != 0 {
                continue;
            }
            let h = spectrum.value(ln_x, ln_y);
            assert!(h.is_finite() && bound >= 0.0);
            assert!(h <= bound, "h({ln_x}, {ln_y}) = {h} above {bound}");
        }
    }

    #[test]
    fn bounds_hold_everywhere() {
        bound_holds(&MultipleSoftTable::new());
        bound_holds(&SingleHardTable::new());
    }

    /// Pull of chi-square for drawn points in cells (hypothesis: density bound/mean), over cells with 20 or more expected,
    /// the rest as one; `bias` multiplies the expectation in every other cell.
    fn pull<S: ScaledSpectrum>(plane: &Plane<S>, region: &Region, draws: usize, bias: f64) -> f64 {
        let mut stream = stream(2);
        let mut counts = std::collections::BTreeMap::new();
        for _ in 0..draws {
            let point = plane.draw(region, &mut stream);
            let row = (point.ln_x / STEP).floor() as i64;
            let column = (point.ln_y / STEP).floor() as i64 - FIRST_COLUMN;
            assert!(point.bound > 0.0 && point.ln_y >= region.ln_y_floor - 1e-12);
            assert_eq!(point.bound, plane.bound(row, column));
            *counts.entry((row, column)).or_insert(0u64) += 1;
        }
        let mut expected = Vec::new();
        for strip in strips(region) {
            for (column, share) in pieces(&strip) {
                let weight = if (strip.row + column) % 2 == 0 {
                    bias
                } else {
                    1.0
                };
                let mean = strip.width() * share * STEP * plane.bound(strip.row, column);
                expected.push(((strip.row, column), weight * mean));
            }
        }
        let total: f64 = expected.iter().map(|(_, mean)| mean).sum();
        let (mut chi_square, mut cells) = (0.0, 0.0);
        let (mut rest_found, mut rest_expected) = (0.0, 0.0);
        for (place, mean) in expected {
            let mean = mean / total * draws as f64;
            let found = counts.get(&place).copied().unwrap_or(0) as f64;
            if mean < 20.0 {
                rest_found += found;
                rest_expected += mean;
                continue;
            }
            chi_square += (found - mean).powi(2) / mean;
            cells += 1.0;
        }
        if rest_expected > 20.0 {
            chi_square += (rest_found - rest_expected).powi(2) / rest_expected;
            cells += 1.0;
        }
        let freedom: f64 = cells - 1.0;
        // Wilson & Hilferty 1931: the cube root of chi-square is nearly normal.
        let spread = 2.0 / (9.0 * freedom);
        ((chi_square / freedom).cbrt() - (1.0 - spread)) / spread.sqrt()
    }

    /// N = 10^6 for the two bricks, 10^5 beyond the tables; one-sided 10^-6. A bias of 2 % in every other cell (of which a
    /// third of the expectation would be seen) fails.
    #[test]
    fn drawn_points_have_the_density_of_the_bounds() {
        const LARGEST_PULL: f64 = 4.8;
        let plane = Plane::new(MultipleSoftTable::new());
        for region in [strong_brick(), weak_brick()] {
            let found = pull(&plane, &region, 1_000_000, 1.0);
            assert!(found < LARGEST_PULL, "{found}");
            assert!(pull(&plane, &region, 1_000_000, 1.02) > LARGEST_PULL);
        }
        for region in vast() {
            let found = pull(&plane, &region, 100_000, 1.0);
            assert!(found < LARGEST_PULL, "{region:?}: {found}");
        }
    }

    /// The mean is the integral over strips of cells, also where tables and computed bounds meet, and adds up.
    #[test]
    fn the_mean_is_the_integral_of_the_bounds() {
        let plane = Plane::new(SingleHardTable::new());
        for region in vast().into_iter().chain([strong_brick(), weak_brick()]) {
            let direct: f64 = strips(&region)
                .flat_map(|strip| {
                    pieces(&strip)
                        .map(move |(column, share)| (strip, column, share))
                        .collect::<Vec<_>>()
                })
                .map(|(strip, column, share)| {
                    strip.width() * share * STEP * plane.spectrum().bound(cell(strip.row, column))
                })
                .sum();
            let mean = plane.mean(&region);
            assert!(
                (mean - direct).abs() <= 1e-9 * direct,
                "{mean}, not {direct}"
            );
        }
        let empty = Region {
            ln_x: [1.0, 1.0],
            ..strong_brick()
        };
        let closed = Region {
            ln_y_floor: 30.0,
            ..strong_brick()
        };
        assert_eq!((plane.mean(&empty), plane.mean(&closed)), (0.0, 0.0));
        assert_eq!(plane.draw(&closed, &mut stream(4)).bound, 0.0);
    }

    /// Share of drawn points that the exact spectrum keeps: N = 20000, so one per cent is three standard deviations.
    fn acceptance<S: ScaledSpectrum>(plane: &Plane<S>, region: &Region) -> f64 {
        let mut stream = stream(3);
        let kept: f64 = (0..20_000)
            .map(|_| plane.draw(region, &mut stream))
            .filter(|point| region.holds(point.ln_x, point.ln_y))
            .map(|point| plane.spectrum().value(point.ln_x, point.ln_y).max(0.0) / point.bound)
            .sum();
        kept / 20_000.0
    }

    #[test]
    fn most_drawn_points_are_kept() {
        let (soft, hard) = (
            Plane::new(MultipleSoftTable::new()),
            Plane::new(SingleHardTable::new()),
        );
        for region in [strong_brick(), weak_brick()] {
            let kept = (acceptance(&soft, &region), acceptance(&hard, &region));
            println!("kept {kept:?}");
            assert!(kept.0 > 0.4 && kept.1 > 0.4, "{kept:?}");
        }
    }

    /// Prints times: `cargo test --release speed_of -- --ignored --nocapture`.
    #[test]
    #[ignore = "a measurement"]
    fn speed_of_tables_and_plane() {
        let timed = |name: &str, count: usize, work: &mut dyn FnMut() -> f64| {
            let mut best = f64::INFINITY;
            let mut sum = 0.0;
            for _ in 0..7 {
                let start = std::time::Instant::now();
                sum += work();
                best = best.min(start.elapsed().as_secs_f64());
            }
            println!("{name}: {:.2} ns ({sum:.3e})", best * 1e9 / count as f64);
        };
        timed("build soft", 1, &mut || {
            MultipleSoftTable::new().bytes() as f64
        });
        timed("build hard", 1, &mut || {
            SingleHardTable::new().bytes() as f64
        });
        let (soft, hard) = (MultipleSoftTable::new(), SingleHardTable::new());
        timed("build plane", 1, &mut || {
            Plane::new(soft.clone()).bytes() as f64
        });
        let (soft, hard) = (Plane::new(soft), Plane::new(hard));
        for region in [strong_brick(), weak_brick()] {
            let mut stream = stream(5);
            let points: Vec<Point> = (0..1000).map(|_| soft.draw(&region, &mut stream)).collect();
            timed("soft value", 100_000, &mut || {
                (0..100)
                    .flat_map(|_| &points)
                    .map(|point| soft.spectrum().value(point.ln_x, point.ln_y))
                    .sum()
            });
            timed("hard value", 100_000, &mut || {
                (0..100)
                    .flat_map(|_| &points)
                    .map(|point| hard.spectrum().value(point.ln_x, point.ln_y))
                    .sum()
            });
            timed("mean", 10_000, &mut || {
                (0..10_000)
                    .map(|n| {
                        soft.mean(&Region {
                            ln_y_floor: region.ln_y_floor + 1e-5 * n as f64,
                            ..region
                        })
                    })
                    .sum()
            });
            timed("draw", 10_000, &mut || {
                (0..10_000)
                    .map(|_| soft.draw(&region, &mut stream).ln_y)
                    .sum()
            });
        }
    }
}
