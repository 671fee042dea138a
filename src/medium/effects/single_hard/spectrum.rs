//! The double-differential gluon spectrum at first order in opacity of a static brick, as one integral.
//!
//! A parton is made at the start of a brick of length L with n0 screened Coulomb centres per length, of screening mass
//! mu and elastic cross section 1: V(q) = mu^2/(pi (q^2 + mu^2)^2). It emits a gluon of energy omega and transverse
//! momentum kappa. With
//!
//! x = 1/gamma = 2 omega/(mu^2 L), y = kappa^2/mu^2, u = gamma y = kappa^2 L/(2 omega),
//!
//! the spectrum per unit of opacity n0 L is a function of x and y alone, here in the normalisation
//!
//! h(x, y) = (pi/(2 alpha_s C_R)) kappa^2 omega dI/(domega dkappa^2)/(n0 L), vacuum: h = 1/2,
//!
//! h = int d^2q V(q) k.q/p^2 [1 - sin(gamma p^2)/(gamma p^2)], p = k - q in units of mu
//!
//! (Gyulassy, Levai & Vitev 2000, nucl-th/0006010; Wiedemann 2000, hep-ph/0005129; from memory, re-derived). The angle
//! integrates in closed form, and one integration by parts leaves, with w = p^2,
//!
//! h = -1/2 int_0^inf dw F'(w) N(w), F = (1 - sin(gamma w)/(gamma w))/w,
//! N = (1 + y + w)/sqrt(D) - 1 = 4 y w/(sqrt(D) (sqrt(D) + 1 + y + w)), D = (1 + y - w)^2 + 4 w,
//!
//! which agrees with the double integral of `validation/references/single_hard_spectrum.py`. After all momenta,
//! int h d ln y = ln gamma + gamma_E - 1 + [pi/2 - cos gamma (pi/2 - Si gamma) - sin gamma Ci gamma]/gamma.
//!
//! Regime: soft gluons (omega << E), a single scattering (n0 L of order 1 or less).
//!
//! Limits:
//! - x -> 0: h -> y/(1+y)^2 [ln(gamma (1+y)^2) + gamma_E - 3] + (pi/(2 gamma)) y (4 - 2 y)/(1+y)^4, all phases gone;
//! - x -> infinity (L -> 0): x h -> a(u) ln x + b(u), proportional to u (ln u + constant) for small u;
//! - y -> 0: h is proportional to y, and negative for x above about 1/2; y -> infinity: the same form as for x -> 0, and
//!   from the sharp far edge (2/y) K0(2 sqrt(gamma u)) [cos(u + gamma) - (2/u) sin(u + gamma)].

use std::f64::consts::{FRAC_PI_2, PI};

use crate::numerics::elementary::{exp, ln};
use crate::numerics::gauss;
use crate::numerics::trigonometry::sin_cos;

/// Euler's constant.
const EULER_GAMMA: f64 = 0.577_215_664_901_532_9;
/// Largest change of phase over a panel.
const PHASE_OF_A_PANEL: f64 = 5.0;
/// Panels grow by this fraction of their distance to w = 0 and, near it, to w = 1 + y.
const GROWTH: f64 = 1.0;
const GROWTH_FROM_PEAK: f64 = 0.7;
/// Before the peak they shrink to this fraction of the distance to it.
const APPROACH: f64 = 0.5;
/// Phases beyond u by which the cosine in F' has averaged out.
const PHASES_BEYOND: f64 = 30.0;
/// Where the integral ends, in units of the largest of 1 + y and 1/gamma; what is left is added by its leading power.
const END: f64 = 100.0;
/// Below this phase F' is summed as a series.
const SMALL_PHASE: f64 = 0.7;
/// Above this argument K0 is nothing.
const LARGE_ARGUMENT: f64 = 20.0;

/// h(x, y) for x, y > 0 by direct quadrature, without allocating; some microseconds, error below 3 10^-5 max(1, h).
pub fn direct(x: f64, y: f64) -> f64 {
    let gamma = 1.0 / x;
    let peak = 1.0 + y;
    let width = 2.0 * peak.sqrt();
    // The cosine is cut where its integral vanishes, at a multiple of pi.
    let silent = PI * ((y * gamma + PHASES_BEYOND) / PI).round() * x;
    let end = END * peak.max(x);
    let mut sum = 0.0;
    let mut low = 0.0;
    let mut step = 0.5 * peak.min(x);
    while low < end {
        let away = (low - peak).abs();
        let by_peak = if low < peak {
            (APPROACH * away).max(0.5 * width)
        } else {
            (GROWTH_FROM_PEAK * away).max(0.5 * width)
        };
        step = step.max(GROWTH * low).min(by_peak);
        let loud = low < silent;
        if loud {
            step = step.min(PHASE_OF_A_PANEL * x);
        }
        let high = if loud && low + step > silent * (1.0 - f64::EPSILON) {
            silent
        } else {
            low + step
        };
        gauss::for_points(low, high, |w, weight| {
            sum += weight * gamma * gamma * slope(gamma * w, loud) * peak_shape(y, w);
        });
        low = high;
    }
    // Beyond the end F' = -1/w^2 and N = 2 y/w.
    0.5 * (y / (low * low) - sum)
}

/// dPhi/dX of Phi(X) = (1 - sin X/X)/X; without its oscillating part where that has averaged out.
#[inline]
fn slope(phase: f64, loud: bool) -> f64 {
    let inverse = 1.0 / phase;
    if !loud {
        return -inverse * inverse;
    }
    if phase < SMALL_PHASE {
        // Phi = X/3! - X^3/5! + ...
        let q = phase * phase;
        return 1.0 / 6.0
            - q * (1.0 / 40.0 - q * (1.0 / 1008.0 - q * (1.0 / 51_840.0 - q / 4_435_200.0)));
    }
    let (sine, cosine) = sin_cos(phase);
    inverse * inverse * (2.0 * sine * inverse - 1.0 - cosine)
}

/// N(w).
#[inline]
fn peak_shape(y: f64, w: f64) -> f64 {
    let sum = 1.0 + y + w;
    let difference = 1.0 + y - w;
    let root = (difference * difference + 4.0 * w).sqrt();
    4.0 * y * w / (root * (root + sum))
}

/// The limit x -> 0 with its first correction.
#[inline]
pub fn without_phase(x: f64, y: f64) -> f64 {
    let whole = 1.0 + y;
    let inverse_square = 1.0 / (whole * whole);
    let logarithm = 2.0 * ln(whole) - ln(x) + EULER_GAMMA - 3.0;
    y * inverse_square * (logarithm + FRAC_PI_2 * x * (4.0 - 2.0 * y) * inverse_square)
}

/// A bound on [`without_phase`] over ranges of x and y.
pub fn without_phase_bound(x: [f64; 2], y: [f64; 2]) -> f64 {
    // y/(1+y)^2 peaks at 1, where it is 1/4; x is smallest where the logarithm is largest.
    let shape = |y: f64| y / ((1.0 + y) * (1.0 + y));
    let nearest_one = 1.0f64.clamp(y[0], y[1]);
    let logarithm = 2.0 * ln(1.0 + y[1]) - ln(x[0]) + EULER_GAMMA - 3.0;
    let correction = FRAC_PI_2 * x[1] * (4.0 - 2.0 * y[0]).max(0.0) / ((1.0 + y[0]) * (1.0 + y[0]));
    shape(nearest_one) * (logarithm + correction).max(0.0)
}

/// The large-y form, for u >> 1 and y >> 1.
#[inline]
pub fn tail(x: f64, y: f64) -> f64 {
    let (u, gamma) = (y / x, 1.0 / x);
    let argument = 2.0 * y.sqrt() * gamma;
    let edge = if argument > LARGE_ARGUMENT {
        0.0
    } else {
        let (sine, cosine) = sin_cos(u + gamma);
        2.0 * modified_bessel_k0(argument) * (cosine - 2.0 * sine / u)
    };
    without_phase(x, y) + edge / y
}

/// A bound on [`tail`] over ranges of x and y with u >= 10 and y >= 10.
pub fn tail_bound(x: [f64; 2], y: [f64; 2]) -> f64 {
    let argument = 2.0 * y[0].sqrt() / x[1];
    let edge = if argument > LARGE_ARGUMENT {
        0.0
    } else {
        2.0 * modified_bessel_k0(argument)
    };
    without_phase_bound(x, y) + edge * (1.0 + 2.0 * x[1] / y[0]) / y[0]
}

/// K0(z) for z > 0 to 2 10^-7 (Abramowitz & Stegun, Handbook of Mathematical Functions, 9.8.1, 9.8.5, 9.8.6).
pub fn modified_bessel_k0(z: f64) -> f64 {
    let horner =
        |coefficients: &[f64], t: f64| coefficients.iter().rev().fold(0.0, |sum, c| sum * t + c);
    if z <= 2.0 {
        const I0: [f64; 7] = [
            1.0, 3.5156229, 3.0899424, 1.2067492, 0.2659732, 0.0360768, 0.0045813,
        ];
        const K0: [f64; 7] = [
            -0.57721566,
            0.42278420,
            0.23069756,
            0.03488590,
            0.00262698,
            0.00010750,
            0.00000740,
        ];
        let (t, half) = (z / 3.75, 0.5 * z);
        return horner(&K0, half * half) - ln(half) * horner(&I0, t * t);
    }
    const LARGE: [f64; 7] = [
        1.25331414,
        -0.07832358,
        0.02189568,
        -0.01062446,
        0.00587872,
        -0.00251540,
        0.00053208,
    ];
    exp(-z) / z.sqrt() * horner(&LARGE, 2.0 / z)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The table of `validation/references/single_hard_spectrum.py`.
    fn reference() -> serde_json::Value {
        let text = include_str!("../../../../validation/references/single_hard_spectrum.json");
        serde_json::from_str(text).expect("a committed table")
    }

    #[test]
    fn it_is_the_integral_over_the_momentum_transfer() {
        let table = reference();
        let points = table["points"].as_array().unwrap();
        assert!(points.len() >= 40);
        for point in points {
            let [x, y, h] = ["inverse_gamma", "v", "h"].map(|name| point[name].as_f64().unwrap());
            let error = (direct(x, y) - h).abs();
            assert!(
                error < 3e-5 && error < 3e-4 * h.abs(),
                "h({x}, {y}) off by {error}"
            );
        }
    }

    /// int h d ln y against its closed form, by the trapezium rule in ln y and the large-y form above 600.
    #[test]
    fn its_integral_over_the_transverse_momentum() {
        const STEPS: usize = 4000;
        for entry in reference()["integrals"].as_array().unwrap() {
            let [x, closed] =
                ["inverse_gamma", "integral"].map(|name| entry[name].as_f64().unwrap());
            let (low, top) = (-14.0, 600.0f64);
            let step = (ln(top) - low) / STEPS as f64;
            let value = |place: usize| direct(x, exp(low + place as f64 * step));
            let inside: f64 = (1..STEPS).map(value).sum();
            let beyond = (ln(top * top / x) + EULER_GAMMA - 1.0) / top;
            let found = step * (inside + 0.5 * (value(0) + value(STEPS))) + beyond;
            assert!(
                (found - closed).abs() < 2e-4,
                "x = {x}: {found}, not {closed}"
            );
        }
    }

    /// x -> 0: the closed form, corrections of order x^3 once the pole's exp(-2 gamma sqrt(y)) is gone.
    #[test]
    fn a_thick_brick_has_no_phases() {
        for x in [0.03f64, 0.01, 0.003] {
            for y in [0.01, 0.3, 1.0, 4.0, 30.0] {
                let difference = direct(x, y) - without_phase(x, y);
                assert!(
                    difference.abs() < 30.0 * x.powi(3) + 3e-5,
                    "x = {x}, y = {y}: {difference}"
                );
            }
        }
    }

    /// x -> infinity, which is L -> 0: x h at a given u becomes straight in ln x, so h vanishes like ln x/x.
    #[test]
    fn a_thin_brick_is_linear_in_the_logarithm() {
        for u in [0.03, 1.0, 4.0, 12.0, 25.0] {
            let scaled = |x: f64| x * direct(x, x * u);
            let (one, two, three) = (scaled(1e5), scaled(1e6), scaled(1e7));
            let (first, second) = (two - one, three - two);
            assert!(
                (first - second).abs() < 0.01 * first.abs() + 1e-3,
                "u = {u}: {one} {two} {three}"
            );
            assert!(first.abs() > 1e-3, "u = {u}");
        }
    }

    #[test]
    fn it_vanishes_linearly_at_small_momentum() {
        for x in [1e-3, 0.1, 1.0, 30.0] {
            let ratio = direct(x, 1e-4) / direct(x, 5e-5);
            assert!((ratio - 2.0).abs() < 1e-3, "x = {x}: {ratio}");
        }
        assert!(direct(0.3, 1e-3) > 0.0 && direct(1.0, 1e-3) < 0.0);
    }

    #[test]
    fn its_large_momentum_form() {
        for x in [0.1f64, 1.0, 3.0, 30.0, 1e3] {
            for u in [30.0, 33.3, 50.0, 100.0] {
                let y = (u * x).max(u);
                let (found, expected) = (tail(x, y), direct(x, y));
                assert!(
                    (found - expected).abs() < 4e-3 / x.max(10.0),
                    "x = {x}, y = {y}: {found}, {expected}"
                );
                assert!(found <= tail_bound([x, x], [y, y]));
            }
        }
    }

    /// Abramowitz & Stegun, table 9.8 (from memory; all digits agree with scipy).
    #[test]
    fn modified_bessel_function() {
        for (z, k0) in [
            (0.1, 2.427_069_024_7),
            (1.0, 0.421_024_438_2),
            (2.0, 0.113_893_872_8),
            (5.0, 0.003_691_098_3),
        ] {
            assert!((modified_bessel_k0(z) / k0 - 1.0).abs() < 1e-6, "K0({z})");
        }
    }

    #[test]
    fn the_series_and_the_closed_form_of_the_slope_meet() {
        let (below, above) = (
            slope(SMALL_PHASE * (1.0 - 1e-12), true),
            slope(SMALL_PHASE, true),
        );
        assert!((below - above).abs() < 1e-9, "{below} {above}");
    }
}
