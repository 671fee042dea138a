//! A density on a rectangular grid, bilinear between the nodes, sampled exactly.
//!
//! A cell is chosen by its integral, area times the mean of its corners. Inside, the marginal density of the first
//! coordinate is linear, and so is the density of the second given the first; a linear density from a at 0 to b at 1,
//! a + b = 1, has the inverse distribution u = r/(a + sqrt(a^2 + r (b - a))).

use rand_distr::{Distribution, Open01};

use super::chooser::Chooser;
use crate::random::Stream;

/// A bilinear density.
#[derive(Clone, Debug)]
pub(super) struct Bilinear {
    x_fm: Vec<f64>,
    y_fm: Vec<f64>,
    /// Over the largest, so that no product of two vanishes; index [x][y].
    values: Vec<f64>,
    cells: Chooser,
    integral: f64,
}

impl Bilinear {
    /// `None` where all values are 0. Axes are strictly increasing with at least two points; values, index `[x][y]`,
    /// are finite and not negative.
    pub(super) fn new(x_fm: &[f64], y_fm: &[f64], mut values: Vec<f64>) -> Option<Bilinear> {
        let largest = values.iter().copied().fold(0.0, f64::max);
        if largest <= 0.0 {
            return None;
        }
        values.iter_mut().for_each(|value| *value /= largest);
        let rows = y_fm.len();
        let (cells_x, cells_y) = (x_fm.len() - 1, rows - 1);
        let integral = |cell: usize| {
            let (x, y) = (cell / cells_y, cell % cells_y);
            let area = (x_fm[x + 1] - x_fm[x]) * (y_fm[y + 1] - y_fm[y]);
            0.25 * area * corners(&values, rows, x, y).iter().sum::<f64>()
        };
        let integrals: Vec<f64> = (0..cells_x * cells_y).map(integral).collect();
        let cells = Chooser::new(&integrals)?;
        Some(Bilinear {
            integral: cells.total() * largest,
            cells,
            x_fm: x_fm.to_vec(),
            y_fm: y_fm.to_vec(),
            values,
        })
    }

    /// The integral over the grid.
    pub(super) fn integral(&self) -> f64 {
        self.integral
    }

    pub(super) fn draw(&self, stream: &mut Stream) -> [f64; 2] {
        let cells_y = self.y_fm.len() - 1;
        let cell = self.cells.draw(stream);
        let (x, y) = (cell / cells_y, cell % cells_y);
        let [low_low, low_high, high_low, high_high] = corners(&self.values, self.y_fm.len(), x, y);
        let u = draw_linear(low_low + low_high, high_low + high_high, stream);
        let between = |low: f64, high: f64| (1.0 - u) * low + u * high;
        let v = draw_linear(
            between(low_low, high_low),
            between(low_high, high_high),
            stream,
        );
        let place = |axis: &[f64], cell: usize, share: f64| {
            (1.0 - share) * axis[cell] + share * axis[cell + 1]
        };
        [place(&self.x_fm, x, u), place(&self.y_fm, y, v)]
    }
}

/// The values at the corners of a cell: low x low y, low x high y, high x low y, high x high y.
fn corners(values: &[f64], rows: usize, x: usize, y: usize) -> [f64; 4] {
    let corner = x * rows + y;
    [
        values[corner],
        values[corner + 1],
        values[corner + rows],
        values[corner + rows + 1],
    ]
}

/// A number from (0, 1) with a density that goes linearly from `low` to `high`, not both 0. The end points are left
/// out: at one of them the density of the other coordinate may vanish.
#[inline]
fn draw_linear(low: f64, high: f64, stream: &mut Stream) -> f64 {
    let r: f64 = Open01.sample(stream);
    let low_share = low / (low + high);
    r / (low_share
        + (low_share * low_share + r * (1.0 - 2.0 * low_share))
            .max(0.0)
            .sqrt())
}
