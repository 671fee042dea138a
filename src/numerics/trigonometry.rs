//! Sine and cosine together, in basic arithmetic alone, for integrals and tables that need millions of them.
//!
//! x = n pi/2 + r, |r| <= pi/4, then the Taylor series of both. Absolute errors are a few 10^-16, tested below.

use std::f64::consts::FRAC_2_PI;

/// pi/2 in two parts with so few bits that their products with n are exact, and the rest.
const HALF_PI_HIGH: f64 = f64::from_bits(0x3ff9_21fb_5440_0000);
const HALF_PI_MIDDLE: f64 = f64::from_bits(0x3dd0_b461_1a60_0000);
const HALF_PI_LOW: f64 = f64::from_bits(0x3ba3_198a_2e03_7073);
/// Adding and subtracting 1.5 * 2^52 rounds a double to an integer.
const ROUNDER: f64 = 6_755_399_441_055_744.0;
/// The reduction is exact enough up to here: n has then fewer bits than the parts of pi/2 leave free.
const LARGEST: f64 = 1e5;

/// Coefficients (-1)^n/(2n+1)! and (-1)^n/(2n)!.
const SINE: [f64; 9] = alternating_inverse_factorials(1);
const COSINE: [f64; 9] = alternating_inverse_factorials(0);

const fn alternating_inverse_factorials(offset: u32) -> [f64; 9] {
    let mut series = [1.0; 9];
    let mut n = 1;
    while n < 9 {
        let power = (2 * n as u32 + offset) as f64;
        series[n] = -series[n - 1] / (power * (power - 1.0));
        n += 1;
    }
    series
}

/// (sin x, cos x) to an absolute error of a few 10^-16; libm's values beyond 10^5.
#[inline]
pub fn sin_cos(x: f64) -> (f64, f64) {
    if !(-LARGEST..=LARGEST).contains(&x) {
        return (libm::sin(x), libm::cos(x));
    }
    let n = (x * FRAC_2_PI + ROUNDER) - ROUNDER;
    let r = ((x - n * HALF_PI_HIGH) - n * HALF_PI_MIDDLE) - n * HALF_PI_LOW;
    let q = r * r;
    let q2 = q * q;
    // r - r^3/3! + ... + r^17/17! and 1 - r^2/2! + ... + r^16/16!, in pairs of terms.
    let pair = |series: &[f64; 9], first: usize| series[first] + q * series[first + 1];
    let q4 = q2 * q2;
    let sum = |series: &[f64; 9]| {
        let (low, high) = (
            pair(series, 0) + q2 * pair(series, 2),
            pair(series, 4) + q2 * pair(series, 6),
        );
        low + q4 * (high + q4 * series[8])
    };
    let (sine, cosine) = (r * sum(&SINE), sum(&COSINE));
    match n as i64 & 3 {
        0 => (sine, cosine),
        1 => (cosine, -sine),
        2 => (-sine, -cosine),
        _ => (-cosine, sine),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::random::{Key, Purpose};
    use rand::RngExt;

    #[test]
    fn both_agree_with_libm() {
        let mut stream = Key::event(1, 3).stream(Purpose::named("test"));
        for scale in [1.0, 30.0, 1e3, 9e4, 1e7] {
            for _ in 0..100_000 {
                let x = scale * (2.0 * stream.random::<f64>() - 1.0);
                let (sine, cosine) = sin_cos(x);
                assert!((sine - libm::sin(x)).abs() < 5e-16, "sin {x}");
                assert!((cosine - libm::cos(x)).abs() < 5e-16, "cos {x}");
            }
        }
        assert_eq!(sin_cos(0.0), (0.0, 1.0));
        assert!(sin_cos(f64::NAN).0.is_nan() && sin_cos(f64::INFINITY).1.is_nan());
    }
}
