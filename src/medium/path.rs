//! Line integrals along a parton's path, tabulated once a path.
//!
//! The transport coefficient along a light-like ray is kept as linear pieces on equal cells,
//! qhat(l) = m + g (l - l_c), with which the oscillating integrals are done exactly (Filon's method):
//!
//! C(k) = int qhat cos(k l) dl = sum over cells of  m h j0(k a) cos(k l_c) - g 2 a^2 j1(k a) sin(k l_c),
//!
//! a = h/2 half a cell, j0(x) = sin x/x, j1(x) = sin x/x^2 - cos x/x. The phase factors of cells follow from one
//! another by rotation, so a transform costs two trigonometric functions and a few products a cell.

use rand::RngExt;

use crate::random::Stream;

/// One cell: mean of the transport coefficient (GeV^2/fm) and its slope (GeV^2/fm^2).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Cell {
    /// Mean over the cell, GeV^2/fm.
    pub mean: f64,
    /// Slope, GeV^2/fm^2.
    pub slope: f64,
}

/// A gluon's transport coefficient along a path, distances l in fm from the parton's birth.
#[derive(Clone, Debug, Default)]
pub struct Path {
    start_fm: f64,
    step_fm: f64,
    cells: Vec<Cell>,
    /// Sums over the cells up to each one of the integrals of qhat and l^2 qhat, over the step.
    sums: Vec<[f64; 2]>,
    moments: [f64; 4],
}

/// The cosine transform of the transport coefficient and k times its derivative in k.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Transform {
    /// int qhat cos(k l) dl, GeV^2.
    pub cosine: f64,
    /// k d/dk of it: - int qhat k l sin(k l) dl, GeV^2.
    pub cosine_slope: f64,
}

impl Path {
    /// Starts over: cells of `step_fm` from `start_fm` on. Keeps the memory.
    pub fn restart(&mut self, start_fm: f64, step_fm: f64) {
        self.start_fm = start_fm;
        self.step_fm = step_fm;
        self.cells.clear();
        self.sums.clear();
        self.moments = [0.0; 4];
    }

    /// Appends a cell; [`Path::finish`] must follow the last one.
    #[inline]
    pub fn push(&mut self, cell: Cell) {
        self.cells.push(cell);
    }

    /// Appends cells that are known beforehand; [`Path::finish`] must follow.
    #[inline]
    pub fn extend(&mut self, cells: impl Iterator<Item = Cell>) {
        self.cells.extend(cells);
    }

    /// Computes the moments once all cells are there.
    pub fn finish(&mut self) {
        // int l^n qhat dl over a cell for n = 0, 1, 2, 4, by expanding l = c + s and integrating over s in [-h/2, h/2].
        let h = self.step_fm;
        let (s2, s4) = (h * h / 12.0, (h * h) * (h * h) / 80.0);
        let mut sums = [0.0; 4];
        let (start_fm, cells) = (self.start_fm, &self.cells);
        self.sums.clear();
        self.sums
            .extend(cells.iter().enumerate().map(|(place, cell)| {
                let Cell { mean, slope } = *cell;
                let c = start_fm + (place as f64 + 0.5) * h;
                let c2 = c * c;
                sums[0] += mean;
                sums[1] += mean * c + slope * s2;
                sums[2] += mean * (c2 + s2) + slope * 2.0 * c * s2;
                sums[3] += mean * (c2 * c2 + 6.0 * c2 * s2 + s4) + slope * 4.0 * c * (c2 * s2 + s4);
                [sums[0], sums[2]]
            }));
        self.moments = sums.map(|sum| sum * h);
    }

    #[inline]
    fn centre(&self, place: usize) -> f64 {
        self.start_fm + (place as f64 + 0.5) * self.step_fm
    }

    /// I0 = int qhat dl, GeV^2.
    pub fn qhat_integral_gev2(&self) -> f64 {
        self.moments[0]
    }

    /// I1 = int l qhat dl, GeV^2 fm.
    pub fn first_moment_gev2_fm(&self) -> f64 {
        self.moments[1]
    }

    /// I2 = int l^2 qhat dl, GeV^2 fm^2.
    pub fn second_moment_gev2_fm2(&self) -> f64 {
        self.moments[2]
    }

    /// int l^4 qhat dl, GeV^2 fm^4.
    pub fn fourth_moment_gev2_fm4(&self) -> f64 {
        self.moments[3]
    }

    /// Where the last cell ends, fm from birth.
    pub fn end_fm(&self) -> f64 {
        self.start_fm + self.cells.len() as f64 * self.step_fm
    }

    /// Where the first cell starts, fm from birth.
    pub fn start_fm(&self) -> f64 {
        self.start_fm
    }

    /// The transport coefficient at `l_fm`, GeV^2/fm; 0 outside the cells.
    #[inline]
    pub fn qhat_gev2_per_fm(&self, l_fm: f64) -> f64 {
        let place = (l_fm - self.start_fm) / self.step_fm;
        if place < 0.0 {
            return 0.0;
        }
        let cell = place as usize;
        match self.cells.get(cell) {
            Some(Cell { mean, slope }) => mean + slope * (l_fm - self.centre(cell)),
            None => 0.0,
        }
    }

    /// int qhat dl from birth to `l_fm`, GeV^2.
    pub fn integral_to(&self, l_fm: f64) -> f64 {
        if l_fm >= self.end_fm() {
            return self.moments[0];
        }
        self.pieces(l_fm).map(|piece| piece.integral()).sum()
    }

    /// The cosine transform at wave number `k_per_fm`.
    pub fn transform(&self, k_per_fm: f64) -> Transform {
        let half = 0.5 * self.step_fm;
        let (sin_step, cos_step) = libm::sincos(k_per_fm * self.step_fm);
        let (mut sin, mut cos) = libm::sincos(k_per_fm * (self.start_fm + half));
        let mut l = self.start_fm + half;
        // Sums over cells of mean and slope times cosine, sine, and l times sine, cosine.
        let (mut mean_cos, mut mean_l_sin, mut slope_sin, mut slope_l_cos) = (0.0, 0.0, 0.0, 0.0);
        for &Cell { mean, slope } in &self.cells {
            mean_cos += mean * cos;
            mean_l_sin += mean * l * sin;
            slope_sin += slope * sin;
            slope_l_cos += slope * l * cos;
            (sin, cos) = (
                sin * cos_step + cos * sin_step,
                cos * cos_step - sin * sin_step,
            );
            l += self.step_fm;
        }
        let x = k_per_fm * half;
        let (j0, j1, j1_over_x) = spherical_bessel(x);
        let (width, lever) = (self.step_fm, 2.0 * half * half);
        let cosine = width * j0 * mean_cos - lever * j1 * slope_sin;
        // d j0/dx = -j1, d j1/dx = j0 - 2 j1/x.
        let cosine_slope = k_per_fm
            * (-width * j0 * mean_l_sin
                - width * half * j1 * mean_cos
                - lever * j1 * slope_l_cos
                - lever * half * (j0 - 2.0 * j1_over_x) * slope_sin);
        Transform {
            cosine,
            cosine_slope,
        }
    }

    /// sum over n of coefficients[n-1] k^(2n) int_0^w l^(2n) qhat dl, w = `window_fm`: for kernels that are even
    /// power series in k l and are cut at a window.
    pub fn power_series(&self, k_per_fm: f64, window_fm: f64, coefficients: &[f64]) -> f64 {
        let mut sum = 0.0;
        for (place, &Cell { mean, slope }) in self.cells.iter().enumerate() {
            let centre = self.centre(place);
            let low = centre - 0.5 * self.step_fm;
            let high = (low + self.step_fm).min(window_fm);
            if high <= low {
                break;
            }
            // qhat = flat + slope l, integrated term by term in phi = k l.
            let flat = mean - slope * centre;
            sum += series_integral(k_per_fm * high, high, [flat, slope], coefficients)
                - series_integral(k_per_fm * low, low, [flat, slope], coefficients);
        }
        sum
    }

    /// A place drawn with the density qhat.
    pub fn draw_by_qhat(&self, stream: &mut Stream) -> f64 {
        let (piece, share) = self.choose(0, stream);
        if piece.slope == 0.0 {
            return piece.low() + share * piece.width;
        }
        piece.draw(stream, |_| 1.0)
    }

    /// A place drawn with the density l^2 qhat.
    pub fn draw_by_qhat_l2(&self, stream: &mut Stream) -> f64 {
        let (piece, share) = self.choose(1, stream);
        let (low, top) = (piece.low(), piece.low() + piece.width);
        if piece.slope == 0.0 {
            let (low, top) = (low * low * low, top * top * top);
            return libm::cbrt(low + share * (top - low));
        }
        piece.draw(stream, |l| (l / top) * (l / top))
    }

    /// A cell drawn by its part of the moment of qhat (0) or l^2 qhat (1), and what is left of the uniform number.
    #[inline]
    fn choose(&self, moment: usize, stream: &mut Stream) -> (Piece, f64) {
        let last = self.cells.len() - 1;
        let target = stream.random::<f64>() * self.sums[last][moment];
        let mut place = 0;
        while place < last && self.sums[place][moment] <= target {
            place += 1;
        }
        let below = if place == 0 {
            0.0
        } else {
            self.sums[place - 1][moment]
        };
        let Cell { mean, slope } = self.cells[place];
        let piece = Piece {
            centre: self.centre(place),
            width: self.step_fm,
            mean,
            slope,
        };
        let mass = self.sums[place][moment] - below;
        // A target that was rounded up to the whole lands at the end of the last cell, be it empty.
        (piece, ((target - below) / mass).min(1.0))
    }

    /// The cells, the last one cut at `end_fm`.
    fn pieces(&self, end_fm: f64) -> impl Iterator<Item = Piece> {
        let half = 0.5 * self.step_fm;
        self.cells
            .iter()
            .enumerate()
            .map_while(move |(place, &Cell { mean, slope })| {
                let centre = self.centre(place);
                let low = centre - half;
                let width = (end_fm - low).min(self.step_fm);
                let shift = low + 0.5 * width - centre;
                (width > 0.0).then_some(Piece {
                    centre: centre + shift,
                    width,
                    mean: mean + slope * shift,
                    slope,
                })
            })
    }
}

/// A part of a cell.
#[derive(Clone, Copy, Debug)]
struct Piece {
    centre: f64,
    width: f64,
    mean: f64,
    slope: f64,
}

impl Piece {
    fn integral(&self) -> f64 {
        self.mean * self.width
    }

    fn low(&self) -> f64 {
        self.centre - 0.5 * self.width
    }

    /// A place with the density qhat times `weight`, which lies in [0, 1].
    fn draw(&self, stream: &mut Stream, weight: impl Fn(f64) -> f64) -> f64 {
        let largest = self.mean + 0.5 * self.slope.abs() * self.width;
        loop {
            let s = (stream.random::<f64>() - 0.5) * self.width;
            let l = self.centre + s;
            if stream.random::<f64>() * largest < (self.mean + self.slope * s) * weight(l) {
                return l;
            }
        }
    }
}

/// j0, j1 and j1/x.
fn spherical_bessel(x: f64) -> (f64, f64, f64) {
    /// Below this the closed forms lose more digits than the series' next term.
    const SMALL: f64 = 0.05;
    if x < SMALL {
        let x2 = x * x;
        let j0 = 1.0 - x2 / 6.0 * (1.0 - x2 / 20.0 * (1.0 - x2 / 42.0));
        let j1_over_x = (1.0 - x2 / 10.0 * (1.0 - x2 / 28.0 * (1.0 - x2 / 54.0))) / 3.0;
        return (j0, j1_over_x * x, j1_over_x);
    }
    let (sin, cos) = libm::sincos(x);
    let j0 = sin / x;
    let j1 = (j0 - cos) / x;
    (j0, j1, j1 / x)
}

/// sum over n of c_n phi^(2n) (flat l/(2n+1) + slope l^2/(2n+2)), phi = k l.
fn series_integral(phi: f64, l: f64, [flat, slope]: [f64; 2], coefficients: &[f64]) -> f64 {
    let mut power = 1.0;
    let mut sum = 0.0;
    for (place, coefficient) in coefficients.iter().enumerate() {
        power *= phi * phi;
        let n = 2.0 * (place as f64 + 1.0);
        sum += coefficient * power * (flat * l / (n + 1.0) + slope * l * l / (n + 2.0));
    }
    sum
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::random::{Key, Purpose};

    fn path() -> Path {
        let mut path = Path::default();
        path.restart(0.4, 0.25);
        for place in 0..12 {
            let mean = 1.0 + (place as f64 * 0.7).sin().abs();
            path.push(Cell {
                mean,
                slope: 0.8 * (place as f64).cos(),
            });
        }
        path.finish();
        path
    }

    /// Cells without a slope, one of them empty.
    fn steps() -> Path {
        let mut path = Path::default();
        path.restart(0.4, 0.25);
        for place in 0..12 {
            let mean = ((place * 5) % 12) as f64;
            path.push(Cell { mean, slope: 0.0 });
        }
        path.finish();
        path
    }

    /// Simpson's rule cell by cell.
    fn integral(path: &Path, weight: impl Fn(f64) -> f64) -> f64 {
        let steps = 400;
        let mut sum = 0.0;
        for (place, cell) in path.cells.iter().enumerate() {
            for step in 0..=steps {
                let s = (step as f64 / steps as f64 - 0.5) * path.step_fm;
                let rule = if step == 0 || step == steps {
                    1.0
                } else if step % 2 == 1 {
                    4.0
                } else {
                    2.0
                };
                sum += rule * (cell.mean + cell.slope * s) * weight(path.centre(place) + s);
            }
        }
        sum * path.step_fm / steps as f64 / 3.0
    }

    #[test]
    fn moments_and_transforms_match_simpson() {
        let path = path();
        let moments = [
            (path.qhat_integral_gev2(), 0),
            (path.first_moment_gev2_fm(), 1),
            (path.second_moment_gev2_fm2(), 2),
            (path.fourth_moment_gev2_fm4(), 4),
        ];
        for (found, power) in moments {
            assert!(
                (found / integral(&path, |l| l.powi(power)) - 1.0).abs() < 1e-9,
                "moment {power}"
            );
        }
        for k in [1e-4, 0.01, 0.3, 1.0, 7.0, 40.0_f64] {
            let found = path.transform(k);
            let cosine = integral(&path, |l| (k * l).cos());
            let slope = integral(&path, |l| -k * l * (k * l).sin());
            assert!(
                (found.cosine - cosine).abs() < 1e-7,
                "k = {k}: {} against {cosine}",
                found.cosine
            );
            assert!(
                (found.cosine_slope - slope).abs() < 1e-6 * (1.0 + k),
                "k = {k}: {} against {slope}",
                found.cosine_slope
            );
        }
    }

    #[test]
    fn power_series_stop_at_the_window() {
        let path = path();
        let (k, coefficients) = (0.5, [1.0, -0.75, 0.1]);
        for window in [0.2, 0.9, 1.37, 5.0] {
            let kernel = |l: f64| {
                let phi2 = (k * l) * (k * l);
                if l > window {
                    0.0
                } else {
                    phi2 * (1.0 + phi2 * (-0.75 + phi2 * 0.1))
                }
            };
            let found = path.power_series(k, window, &coefficients);
            assert!(
                (found - integral(&path, kernel)).abs() < 3e-3 * (1.0 + found.abs()),
                "{window}: {found}"
            );
        }
    }

    /// Kolmogorov-Smirnov at 10^-6 with 10^5 draws (2.69/sqrt(N)): differences above 0.9 % would be seen.
    #[test]
    fn draws_follow_the_integrand() {
        const DRAWS: usize = 100_000;
        for (path, power) in [(path(), 0), (path(), 2), (steps(), 0), (steps(), 2)] {
            let mut stream = Key::event(9, power).stream(Purpose::INDUCED_VERTEX);
            let mut draws: Vec<f64> = (0..DRAWS)
                .map(|_| {
                    if power == 0 {
                        path.draw_by_qhat(&mut stream)
                    } else {
                        path.draw_by_qhat_l2(&mut stream)
                    }
                })
                .collect();
            draws.sort_by(f64::total_cmp);
            let total = integral(&path, |l| l.powi(power as i32));
            for quantile in [0.05, 0.2, 0.4, 0.6, 0.8, 0.95] {
                let l = draws[(quantile * DRAWS as f64) as usize];
                let below =
                    integral(&path, |x| if x < l { x.powi(power as i32) } else { 0.0 }) / total;
                // Simpson's rule across the step at l is off by a part of a sub-cell.
                assert!(
                    (below - quantile).abs() < 0.0085 + 5e-4,
                    "power {power}: {below} against {quantile}"
                );
            }
        }
    }
}
