//! The double-differential gluon spectrum of multiple soft scattering in a static brick, exactly, as one integral.
//!
//! A parton is made at the start of a brick of length L with transport coefficient qhat (a gluon's) and emits a gluon
//! of energy omega and transverse momentum kappa. With omega_c = qhat L^2/2,
//!
//! x = omega/omega_c, y = kappa^2/(qhat L), u = y/x = kappa^2 L/(2 omega), theta^2 = -i/x,
//!
//! the medium part is a function of x and y alone, here in the normalisation
//!
//! h(x, y) = (pi/(2 alpha_s C_R)) kappa^2 omega dI_med/(domega dkappa^2), vacuum: h = 1/2.
//!
//! Source: the path integral of Wiedemann 2000, hep-ph/0005129, and Salgado & Wiedemann 2003, hep-ph/0302184, for
//! harmonic-oscillator scattering (from memory; re-derived). Both time integrals stand in
//! `validation/references/multiple_soft_spectrum.py`; closing one of them and integrating by parts twice leaves
//!
//! h = Re int_0^1 ds R'(s) exp(-i u g(s)), R = 1 - theta (1-s) tan(theta s), g = tan(theta s)/(theta R), g' = 1/R^2,
//!
//! R(0) = R(1) = 1, which agrees with the double integral to 14 digits. Frullani's theorem then gives the spectrum
//! after all momenta, int h d ln y = ln|cos theta| (Baier, Dokshitzer, Mueller, Peigne & Schiff 1997,
//! hep-ph/9607355).
//!
//! Regime: soft gluons (omega << E), many soft scatterings, no running of the coupling inside.
//!
//! Limits:
//! - x -> 0: h -> y E1(y)/sqrt(2x) for y >> sqrt(x): a gluon formed anywhere in the brick, broadened by the rest;
//! - x -> infinity (L -> 0 at fixed omega and qhat): h -> [(1 + cos u)/u - 2 sin u/u^2]/x, the first order in opacity
//!   of the oscillator, -u/(6x) for small u;
//! - y -> 0: h is proportional to y; y -> infinity: h -> 1/y + 2/y^2 + 6/y^3 + 24/y^4 - 40 x^2/y^4 from the hard
//!   vertex, and from the sharp far edge [cos u - (2/u) sin u] exp(-u/(3x))/y.

use crate::numerics::complex::Complex;
use crate::numerics::elementary::exp;
use crate::numerics::gauss;
use crate::numerics::trigonometry::sin_cos;

/// The first panel of the time integral, in units of the shortest time of the problem.
const FIRST_PANEL: f64 = 0.7;
/// Panels grow by no more than this fraction of their distance to the start.
const GROWTH: f64 = 1.0;
/// They shrink towards the far end to no less than this fraction of what is left.
const SHRINKING: f64 = 0.5;
/// Largest change of phase over a panel.
const PHASE_OF_A_PANEL: f64 = 6.0;
/// Where the exponent is below minus this the integrand is nothing.
const DAMPED: f64 = 40.0;
/// Below this u the first order in opacity is summed as a series.
const SMALL_PHASE: f64 = 0.5;
/// Terms of that series, the first one left out below 10^-17.
const SERIES_TERMS: u32 = 7;

/// |h| sqrt(x) is below int |R'| sqrt(x) <= sup |tan| + sqrt 2 int_0^inf dz/(cosh z + cos z) = 1.143 + 1.694 at any x,
/// since |exp(-i u g)| <= 1.
pub const LARGEST_TIMES_ROOT_X: f64 = 2.9;

/// The integrand at one time: weight times R', and g.
#[derive(Clone, Copy, Debug)]
struct Node {
    slope: Complex,
    phase: Complex,
}

/// The time integral at one x, for all y up to a limit: what does not depend on y is done.
#[derive(Clone, Debug)]
pub struct Row {
    x: f64,
    nodes: Vec<Node>,
}

impl Row {
    /// The nodes for x > 0 and 0 < y <= `largest_y`.
    pub fn new(x: f64, largest_y: f64) -> Row {
        let mut nodes = Vec::new();
        for_nodes(x, largest_y, |node| nodes.push(node));
        Row { x, nodes }
    }

    /// h(x, y).
    pub fn value(&self, y: f64) -> f64 {
        let u = y / self.x;
        self.nodes.iter().map(|node| contribution(*node, u)).sum()
    }
}

/// h(x, y) for x, y > 0 by direct quadrature, without allocating; some ten microseconds, error below 10^-6 max(1, |h|).
pub fn direct(x: f64, y: f64) -> f64 {
    let u = y / x;
    let mut sum = 0.0;
    for_nodes(x, y, |node| sum += contribution(node, u));
    sum
}

/// Re slope (exp(-i u g) - 1): the slopes alone sum to 0.
#[inline]
fn contribution(node: Node, u: f64) -> f64 {
    let exponent = u * node.phase.im;
    if exponent < -DAMPED {
        return -node.slope.re;
    }
    let (sine, cosine) = sin_cos(u * node.phase.re);
    let size = exp(exponent);
    node.slope.re * (size * cosine - 1.0) + node.slope.im * size * sine
}

/// Visits the Gauss points of the time integral, on panels that resolve the formation time, the vertex and the end.
fn for_nodes(x: f64, y: f64, mut visit: impl FnMut(Node)) {
    let theta = Complex::new(1.0, -1.0).scaled((0.5 / x).sqrt());
    let u = y / x;
    let formation = x.sqrt();
    let first = FIRST_PANEL * x.min(1.0).min(1.0 / u);
    let near_end = FIRST_PANEL * formation.max(y).min(1.0);
    let mut low = 0.0_f64;
    while low < 1.0 {
        let left = 1.0 - low;
        // |g'| = 1/|R|^2, R being about 1 + (1-s) min(s, sqrt x)/x.
        let r = 1.0 + left * low.min(formation) / x;
        let damping = if left > 0.0 {
            y * low * low / (low * low + x * x) / left.max(formation)
        } else {
            0.0
        };
        let by_phase = if damping > DAMPED {
            1.0
        } else {
            PHASE_OF_A_PANEL * r * r / u
        };
        let step = first
            .max(GROWTH * low)
            .min((SHRINKING * left).max(near_end))
            .min(by_phase);
        let high = if low + step > 1.0 - 0.1 * step {
            1.0
        } else {
            low + step
        };
        gauss::for_points(low, high, |s, weight| visit(node(theta, s, weight)));
        low = high;
    }
}

/// R' and g at a time s, from q = exp(-2 i theta s), which falls with s.
fn node(theta: Complex, s: f64, weight: f64) -> Node {
    let angle = theta.scaled(s);
    let q = Complex::new(2.0 * angle.im, -2.0 * angle.re).exp();
    let inverse = (Complex::ONE + q).inverse();
    let tangent = -(Complex::I * (Complex::ONE - q) * inverse);
    let inverse_cosine_square = (q * inverse * inverse).scaled(4.0);
    let r = Complex::ONE - theta * tangent.scaled(1.0 - s);
    let slope = theta * tangent - theta * theta * inverse_cosine_square.scaled(1.0 - s);
    Node {
        slope: slope.scaled(weight),
        phase: tangent * (theta * r).inverse(),
    }
}

/// The first order in 1/x at fixed u: [(1 + cos u)/u - 2 sin u/u^2]/x = -(u/x) int_0^1 ds s (1-s) cos(u s).
#[inline]
pub fn first_order(x: f64, u: f64) -> f64 {
    if u < SMALL_PHASE {
        // int_0^1 ds s^(2n+1) (1-s) = 1/((2n+2)(2n+3)).
        let (mut sum, mut term) = (0.0, 1.0);
        for n in 0..SERIES_TERMS {
            let even = f64::from(2 * n);
            sum += term / ((even + 2.0) * (even + 3.0));
            term *= -u * u / ((even + 1.0) * (even + 2.0));
        }
        return -u * sum / x;
    }
    let (sine, cosine) = sin_cos(u);
    ((1.0 + cosine) / u - 2.0 * sine / (u * u)) / x
}

/// The large-y form, for y >> 1 and u >> 1.
#[inline]
pub fn tail(x: f64, y: f64) -> f64 {
    let u = y / x;
    let damping = u / (3.0 * x);
    let edge = if damping > DAMPED {
        0.0
    } else {
        // g(1) = tan(theta)/theta = 1 + theta^2/3 + 2 theta^4/15 + ...
        let (sine, cosine) = sin_cos(u * (1.0 - 2.0 / (15.0 * x * x)));
        (cosine - 2.0 * sine / u) * exp(-damping)
    };
    vertex_tail(x, y) + edge / y
}

/// A bound on [`tail`] for all y above the given one and all x below the given one, where u >= 50 or y >= 50.
pub fn tail_bound(x: f64, y: f64) -> f64 {
    let edge = if y / (3.0 * x * x) > DAMPED {
        0.0
    } else {
        (1.0 + 2.0 * x / y) * exp(-y / (3.0 * x * x))
    };
    vertex_tail(0.0, y) + edge / y
}

/// The part of the large-y form that comes from the vertex.
#[inline]
fn vertex_tail(x: f64, y: f64) -> f64 {
    let i = 1.0 / y;
    i * (1.0 + i * (2.0 + i * (6.0 + i * (24.0 - 40.0 * x * x))))
}

#[cfg(test)]
mod tests {
    use super::*;

    struct Point {
        x: f64,
        y: f64,
        h: f64,
    }

    /// The table of `validation/references/multiple_soft_spectrum.py`.
    fn reference() -> serde_json::Value {
        let text = include_str!("../../../../validation/references/multiple_soft_spectrum.json");
        serde_json::from_str(text).expect("a committed table")
    }

    fn points() -> Vec<Point> {
        let table = reference();
        let number = |point: &serde_json::Value, name: &str| point[name].as_f64().unwrap();
        let points = table["points"].as_array().unwrap().iter();
        points
            .map(|point| Point {
                x: number(point, "x"),
                y: number(point, "y"),
                h: number(point, "h"),
            })
            .collect()
    }

    #[test]
    fn it_is_the_double_time_integral() {
        let points = points();
        assert!(points.len() >= 40);
        for Point { x, y, h } in points {
            let error = (direct(x, y) - h).abs();
            assert!(
                error < 1e-6 * h.abs().max(1.0),
                "h({x}, {y}) off by {error}"
            );
            let of_row = (Row::new(x, 4.0 * y).value(y) - h).abs();
            assert!(
                of_row < 5e-5 * h.abs().max(1.0),
                "row {x} at {y} off by {of_row}"
            );
        }
    }

    /// int h d ln y = ln|cos((1+i)/sqrt(2x))|, and the same up to kappa = omega, by the trapezium rule in ln y.
    #[test]
    fn its_integrals_over_the_transverse_momentum() {
        const STEPS: usize = 4000;
        let up_to = |x: f64, ln_top: f64| {
            let low = -20.0;
            let step = (ln_top - low) / STEPS as f64;
            let value = |place: usize| direct(x, exp(low + place as f64 * step));
            let inside: f64 = (1..STEPS).map(value).sum();
            step * (inside + 0.5 * (value(0) + value(STEPS)))
        };
        for entry in reference()["integrals"].as_array().unwrap() {
            let (x, closed) = (
                entry["x"].as_f64().unwrap(),
                entry["integral"].as_f64().unwrap(),
            );
            // int_Y^inf of the large-y form.
            let (top, beyond) = (200.0, 1.0 / 200.0 + 1.0 / 200.0f64.powi(2));
            let found = up_to(x, libm::log(top)) + beyond;
            assert!(
                (found - closed).abs() < 1e-5,
                "integral at {x}: {found}, not {closed}"
            );
            for limited in entry["small_angles"].as_array().unwrap() {
                let r = limited["radiation_parameter"].as_f64().unwrap();
                let expected = limited["integral"].as_f64().unwrap();
                let found = up_to(x, libm::log(0.5 * x * x * r));
                assert!(
                    (found - expected).abs() < 1e-5,
                    "x = {x}, R = {r}: {found}, not {expected}"
                );
            }
        }
    }

    /// x -> infinity, which is L -> 0: h x -> a function of u, corrections of relative order 1/x.
    #[test]
    fn a_thin_brick_is_first_order_in_opacity() {
        for x in [1e3, 1e5, 1e7] {
            for u in [1e-3, 0.1, 0.499, 0.501, 2.0, 7.0, 25.0] {
                let difference = direct(x, x * u) - first_order(x, u);
                assert!(
                    difference.abs() < 0.1 * (u / x) / x.min(1e6),
                    "x = {x}, u = {u}: {difference}"
                );
            }
            assert!((first_order(x, 1e-4) * x / 1e-4 + 1.0 / 6.0).abs() < 1e-8);
        }
    }

    /// x -> 0: sqrt(2x) h -> y E1(y), corrections of relative order sqrt(x) ln(1/x) at these y. E1 from Abramowitz &
    /// Stegun, table 5.1 (from memory; all digits agree with scipy).
    #[test]
    fn a_thick_brick_emits_everywhere_and_broadens() {
        let e1 = [
            (0.3, 0.905_676_65),
            (1.0, 0.219_383_93),
            (3.0, 0.013_048_38),
        ];
        for x in [1e-6f64, 1e-8, 1e-10] {
            for (y, e1) in e1 {
                let ratio = direct(x, y) * (2.0 * x).sqrt() / (y * e1);
                assert!(
                    (ratio - 1.0).abs() < 4.0 * x.sqrt() * libm::log(1.0 / x),
                    "x = {x}, y = {y}: {ratio}"
                );
            }
        }
    }

    #[test]
    fn it_vanishes_linearly_at_small_momentum() {
        for x in [1e-3, 0.1, 0.5, 3.0, 100.0f64] {
            let y = 1e-4 * x.sqrt().min(x);
            let ratio = direct(x, y) / direct(x, 0.5 * y);
            assert!((ratio - 2.0).abs() < 1e-3, "x = {x}: {ratio}");
        }
    }

    #[test]
    fn its_large_momentum_form() {
        for x in [1e-3f64, 0.1, 1.0, 3.0, 30.0, 1e3] {
            for u in [30.0, 33.3, 100.0, 1234.5] {
                let y = (u * x).max(u);
                let (found, expected) = (tail(x, y), direct(x, y));
                assert!(
                    (found - expected).abs() < 4e-4 / x.max(1.0),
                    "x = {x}, y = {y}: {found}, {expected}"
                );
                assert!(found <= tail_bound(x, y));
            }
        }
    }

    /// The medium never takes away more than the vacuum emits.
    #[test]
    fn the_whole_spectrum_is_not_negative() {
        let mut smallest: f64 = 0.0;
        for i in 0..120 {
            for j in 0..120 {
                let (x, y) = (exp(0.15 * i as f64 - 9.0), exp(0.15 * j as f64 - 9.0));
                smallest = smallest.min(direct(x, y));
            }
        }
        assert!(smallest > -0.5 && smallest < -0.05, "{smallest}");
    }

    /// |exp(-i u g)| <= 1 at all times: what the bound at tiny x rests on.
    #[test]
    fn the_phase_is_damped_and_the_slopes_are_bounded() {
        for x in [1e-12, 1e-6, 1e-3, 0.1, 1.0, 30.0f64] {
            let mut slopes = 0.0;
            for_nodes(x, 10.0, |node| {
                assert!(node.phase.im <= 1e-15);
                slopes += (node.slope.re.powi(2) + node.slope.im.powi(2)).sqrt();
            });
            assert!(
                slopes * x.sqrt() < LARGEST_TIMES_ROOT_X,
                "{}",
                slopes * x.sqrt()
            );
        }
    }
}
