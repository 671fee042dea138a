//! The envelope of a scaled spectrum: a plane of cells in (ln x, ln y), each as high as the spectrum can be in it.
//!
//! Trials are a Poisson process with the intensity factor * (height of the cell), over all cells that touch the region
//! where a parton can emit. Sums along each row make the number of trials and the place of each a matter of a few
//! additions.

use rand::RngExt;
use rand_distr::OpenClosed01;

use super::scaled_table::{Rectangle, ScaledSpectrum};
use crate::numerics::elementary::ln;
use crate::random::Stream;

/// Where a spectrum is taken as it is; beyond, it is taken as zero. No gluon of a jet has so small an x, and at the other
/// ends the spectra are below 10^-5.
pub const SUPPORT: Rectangle = Rectangle {
    ln_x: [-18.0, 16.0],
    ln_y: [-14.0, 24.0],
};
/// Sides of a cell: the spectrum changes by its own size over about 1.
const CELL_WIDTH: f64 = 0.4;
const ROWS: usize = 85;
const COLUMNS: usize = 95;

/// Where a parton can emit, in scaled variables.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Region {
    /// Range of ln x.
    pub ln_x: [f64; 2],
    /// ln y is at least this.
    pub least_ln_y: f64,
    /// ln y lies below this + ln x.
    pub below_slope_1: f64,
    /// ln y lies below this + 2 ln x.
    pub below_slope_2: f64,
}

/// The cells of a spectrum.
#[derive(Clone, Debug)]
pub struct EmissionPlane {
    /// Row by row: a bound on the positive part of the spectrum.
    heights: Vec<f64>,
    /// Row by row: the sum of the heights below a column; one more entry a row than columns.
    sums: Vec<f64>,
}

impl EmissionPlane {
    /// The plane of a spectrum.
    pub fn new(spectrum: &impl ScaledSpectrum) -> EmissionPlane {
        let mut heights = Vec::with_capacity(ROWS * COLUMNS);
        let mut sums = Vec::with_capacity(ROWS * (COLUMNS + 1));
        for row in 0..ROWS {
            let mut sum = 0.0;
            for column in 0..COLUMNS {
                let low = [
                    SUPPORT.ln_x[0] + row as f64 * CELL_WIDTH,
                    SUPPORT.ln_y[0] + column as f64 * CELL_WIDTH,
                ];
                let height = spectrum.bound(Rectangle {
                    ln_x: [low[0], low[0] + CELL_WIDTH],
                    ln_y: [low[1], low[1] + CELL_WIDTH],
                });
                sums.push(sum);
                heights.push(height);
                sum += height;
            }
            sums.push(sum);
        }
        EmissionPlane { heights, sums }
    }

    /// Draws the process with `factor` times the heights over the cells that touch the region, and gives each point
    /// (ln x, ln y) with the height of its cell.
    pub fn draw_all(
        &self,
        region: &Region,
        factor: f64,
        stream: &mut Stream,
        mut visit: impl FnMut(f64, f64, f64),
    ) {
        let rows = rows(region);
        let mut ranges = [(0, 0); ROWS];
        let mut total = 0.0;
        for (row, range) in ranges.iter_mut().enumerate().take(rows[1]).skip(rows[0]) {
            *range = columns(region, row);
            total += self.mass(row, *range);
        }
        let mean = factor * CELL_WIDTH * CELL_WIDTH * total;
        let mut gap = exponential(stream);
        while gap < mean {
            let mut target = stream.random::<f64>() * total;
            let mut row = rows[0];
            while row + 1 < rows[1] && target >= self.mass(row, ranges[row]) {
                target -= self.mass(row, ranges[row]);
                row += 1;
            }
            let column = self.column(row, ranges[row], target);
            let place =
                |low: f64, cell: usize, uniform: f64| low + (cell as f64 + uniform) * CELL_WIDTH;
            visit(
                place(SUPPORT.ln_x[0], row, stream.random()),
                place(SUPPORT.ln_y[0], column, stream.random()),
                self.heights[row * COLUMNS + column],
            );
            gap += exponential(stream);
        }
    }

    fn mass(&self, row: usize, (first, end): (usize, usize)) -> f64 {
        let sums = &self.sums[row * (COLUMNS + 1)..];
        sums[end] - sums[first]
    }

    /// The column from `first` on up to which the heights of a row add up to `target`.
    fn column(&self, row: usize, (first, end): (usize, usize), target: f64) -> usize {
        let sums = &self.sums[row * (COLUMNS + 1)..][..=end];
        let above = sums[first..].partition_point(|sum| sum - sums[first] <= target);
        // Rounding may leave a target that no column reaches.
        (first + above - 1).min(end - 1)
    }
}

/// First row and the one after the last that the region touches.
fn rows(region: &Region) -> [usize; 2] {
    let cell = |ln_x: f64| ((ln_x - SUPPORT.ln_x[0]) / CELL_WIDTH).clamp(0.0, ROWS as f64);
    let [first, last] = region.ln_x.map(cell);
    [first.floor() as usize, last.ceil() as usize]
}

/// First column and the one after the last that the region touches in a row.
fn columns(region: &Region, row: usize) -> (usize, usize) {
    let top = SUPPORT.ln_x[0] + (row + 1) as f64 * CELL_WIDTH;
    let most = (region.below_slope_1 + top).min(region.below_slope_2 + 2.0 * top);
    let cell = |ln_y: f64| ((ln_y - SUPPORT.ln_y[0]) / CELL_WIDTH).clamp(0.0, COLUMNS as f64);
    let first = cell(region.least_ln_y).floor() as usize;
    (first, (cell(most).ceil() as usize).max(first))
}

fn exponential(stream: &mut Stream) -> f64 {
    let uniform: f64 = stream.sample(OpenClosed01);
    -ln(uniform)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::random::{Key, Purpose};

    /// A ridge that falls on all sides.
    struct Ridge;

    impl Ridge {
        fn height(ln_x: f64, ln_y: f64) -> f64 {
            2.0 * (-0.5 * (ln_x + 3.0).abs() - (ln_y + 1.0).abs()).exp()
        }
    }

    impl ScaledSpectrum for Ridge {
        fn value(&self, ln_x: f64, ln_y: f64) -> f64 {
            Ridge::height(ln_x, ln_y)
        }

        fn bound(&self, rectangle: Rectangle) -> f64 {
            let Rectangle { ln_x, ln_y } = rectangle;
            Ridge::height(
                (-3.0_f64).clamp(ln_x[0], ln_x[1]),
                (-1.0_f64).clamp(ln_y[0], ln_y[1]),
            )
        }
    }

    const REGION: Region = Region {
        ln_x: [-6.1, 0.3],
        least_ln_y: -4.0,
        below_slope_1: 2.0,
        below_slope_2: 5.0,
    };

    fn inside([ln_x, ln_y]: [f64; 2]) -> bool {
        let most = (REGION.below_slope_1 + ln_x).min(REGION.below_slope_2 + 2.0 * ln_x);
        (REGION.ln_x[0]..REGION.ln_x[1]).contains(&ln_x) && ln_y >= REGION.least_ln_y && ln_y < most
    }

    /// Hypothesis: thinned to the spectrum, the points inside the region are a Poisson process of that intensity. Counts
    /// in boxes of side 1, and their sum's variance over repetitions. N = 2 x 10^4 processes; chi-square over boxes
    /// (normal limit, 4.9 sigma, 10^-6) and the ratio of variance and mean of the whole count (its error sqrt(2/N)). A
    /// box off by 3 % in the ridge would be seen; a plane that forgot its last row or column too.
    #[test]
    fn thinned_points_are_a_poisson_process() {
        const PROCESSES: u64 = 20_000;
        const FACTOR: f64 = 0.7;
        let plane = EmissionPlane::new(&Ridge);
        let mut counts = [[0.0_f64; 7]; 11];
        let (mut sum, mut square) = (0.0, 0.0);
        for id in 0..PROCESSES {
            let mut stream = Key::event(8, id).stream(Purpose::named("plane"));
            let mut thinning = Key::event(9, id).stream(Purpose::named("plane"));
            let mut count = 0.0;
            plane.draw_all(&REGION, FACTOR, &mut stream, |ln_x, ln_y, height| {
                let value = Ridge.value(ln_x, ln_y);
                assert!(value <= height);
                if inside([ln_x, ln_y]) && thinning.random::<f64>() * height < value {
                    counts[(ln_y + 4.0) as usize][(ln_x + 6.1) as usize] += 1.0;
                    count += 1.0;
                }
            });
            sum += count;
            square += count * count;
        }
        let n = PROCESSES as f64;
        let mean = sum / n;
        let ratio = (square / n - mean * mean) / mean;
        assert!((ratio - 1.0).abs() < 4.9 * (2.0 / n).sqrt(), "{ratio}");
        let (mut chi_square, mut boxes) = (0.0, 0.0);
        for (row, line) in counts.iter().enumerate() {
            for (column, count) in line.iter().enumerate() {
                let expected = n * FACTOR * integral([column as f64 - 6.1, row as f64 - 4.0]);
                if expected > 20.0 {
                    chi_square += (count - expected) * (count - expected) / expected;
                    boxes += 1.0;
                }
            }
        }
        let pull = (chi_square - boxes) / (2.0_f64 * boxes).sqrt();
        assert!(
            boxes > 20.0 && pull < 4.9,
            "{chi_square} over {boxes} boxes"
        );
    }

    /// Midpoint rule over a box of side 1 inside the region.
    fn integral(low: [f64; 2]) -> f64 {
        const STEPS: usize = 400;
        let step = 1.0 / STEPS as f64;
        let mut sum = 0.0;
        for i in 0..STEPS {
            for j in 0..STEPS {
                let point = [
                    low[0] + (i as f64 + 0.5) * step,
                    low[1] + (j as f64 + 0.5) * step,
                ];
                if inside(point) {
                    sum += Ridge::height(point[0], point[1]);
                }
            }
        }
        sum * step * step
    }
}
