//! Exponential and logarithm for the inner loop: table-driven, in basic arithmetic alone, so that every machine gives
//! the same bits (the system's functions differ from one C library to the next).
//!
//! ln x: x = 2^k z, z near a table point c, ln x = k ln 2 + ln c + ln(1 + (z - c)/c), the last by its series.
//! exp x: x = n ln 2/128 + r, exp x = 2^(n/128) exp r, the last by its series. (Method: Tang 1989, ACM Trans. Math.
//! Softw. 15:144, and 1990, 16:378.) Errors are a few units in the last place, tested below.

const TABLE_BITS: u32 = 7;
const TABLE_SIZE: usize = 1 << TABLE_BITS;
const MANTISSA_BITS: u32 = 52;
const EXPONENT_BIAS: i64 = 1023;
/// Bits of 0.6875: significands are taken from [0.6875, 1.375), so that 1 lies inside and ln is accurate there.
const LOWEST_SIGNIFICAND: u64 = 0x3fe6_0000_0000_0000;
/// ln 2 in a part with so few bits that its products with exponents (and with 128 times exponents) are exact, and the
/// rest.
const LN2_HIGH: f64 = f64::from_bits(0x3fe6_2e42_fefa_0000);
const LN2_LOW: f64 = f64::from_bits(0x3d7c_f79a_bc9e_3b3a);
/// Adding and subtracting 1.5 * 2^52 rounds a double to an integer.
const ROUNDER: f64 = 6_755_399_441_055_744.0;
/// exp leaves the normal range of doubles beyond these.
const EXP_RANGE: f64 = 700.0;
/// Terms that bring the series of the tables below the rounding of a double.
const SERIES_TERMS: u32 = 40;

/// Table point c, 1/c and ln c.
static LOGARITHMS: [[f64; 3]; TABLE_SIZE] = logarithms();
/// 2^(j/128).
static POWERS: [f64; TABLE_SIZE] = powers();

const fn logarithms() -> [[f64; 3]; TABLE_SIZE] {
    let mut table = [[0.0; 3]; TABLE_SIZE];
    let mut cell = 0;
    while cell < TABLE_SIZE {
        let width = 1u64 << (MANTISSA_BITS - TABLE_BITS);
        let low = f64::from_bits(LOWEST_SIGNIFICAND + cell as u64 * width);
        let high = f64::from_bits(LOWEST_SIGNIFICAND + (cell as u64 + 1) * width);
        // The two cells that touch 1 use it as their point: ln 1 is then exactly 0.
        let point = if low == 1.0 || high == 1.0 {
            1.0
        } else {
            0.5 * (low + high)
        };
        table[cell] = [point, 1.0 / point, logarithm_by_series(point)];
        cell += 1;
    }
    table
}

/// ln c = 2 artanh((c-1)/(c+1)), summed from the smallest term.
const fn logarithm_by_series(c: f64) -> f64 {
    let u = (c - 1.0) / (c + 1.0);
    let mut sum = 0.0;
    let mut term = SERIES_TERMS;
    while term > 0 {
        term -= 1;
        sum = sum * u * u + 1.0 / (2 * term + 1) as f64;
    }
    2.0 * u * sum
}

const fn powers() -> [f64; TABLE_SIZE] {
    let mut table = [1.0; TABLE_SIZE];
    let mut place = 0;
    while place < TABLE_SIZE {
        let x = place as f64 / TABLE_SIZE as f64 * (LN2_HIGH + LN2_LOW);
        let mut sum = 1.0;
        let mut term = SERIES_TERMS;
        while term > 0 {
            sum = 1.0 + sum * x / term as f64;
            term -= 1;
        }
        table[place] = sum;
        place += 1;
    }
    table
}

/// The natural logarithm of a positive, normal, finite number; libm's value for all others.
#[inline]
pub fn ln(x: f64) -> f64 {
    if !(f64::MIN_POSITIVE..=f64::MAX).contains(&x) {
        return libm::log(x);
    }
    let bits = x.to_bits();
    let offset = bits.wrapping_sub(LOWEST_SIGNIFICAND);
    let cell = (offset >> (MANTISSA_BITS - TABLE_BITS)) as usize % TABLE_SIZE;
    let exponent = (offset as i64) >> MANTISSA_BITS;
    let significand = f64::from_bits(bits.wrapping_sub((exponent as u64) << MANTISSA_BITS));
    let [point, inverse, logarithm] = LOGARITHMS[cell];
    let r = (significand - point) * inverse;
    let r2 = r * r;
    // r - r^2/2 + r^3/3 - ... up to r^7.
    let series = r2
        * (-0.5 + r * (1.0 / 3.0) + r2 * (-0.25 + r * 0.2 + r2 * (-1.0 / 6.0 + r * (1.0 / 7.0))));
    let k = exponent as f64;
    (k * LN2_HIGH + logarithm) + (r + (series + k * LN2_LOW))
}

/// The exponential function; libm's value beyond the normal range.
#[inline]
pub fn exp(x: f64) -> f64 {
    if !(-EXP_RANGE..=EXP_RANGE).contains(&x) {
        return libm::exp(x);
    }
    const STEPS_PER_UNIT: f64 = TABLE_SIZE as f64 * std::f64::consts::LOG2_E;
    let n = (x * STEPS_PER_UNIT + ROUNDER) - ROUNDER;
    let step = 1.0 / TABLE_SIZE as f64;
    let r = (x - n * (LN2_HIGH * step)) - n * (LN2_LOW * step);
    let n = n as i64;
    let (power, whole) = (POWERS[n as usize % TABLE_SIZE], n >> TABLE_BITS);
    let r2 = r * r;
    // r + r^2/2 + r^3/6 + r^4/24 + r^5/120.
    let series = r + r2 * (0.5 + r * (1.0 / 6.0) + r2 * (1.0 / 24.0 + r * (1.0 / 120.0)));
    let scale = f64::from_bits(((whole + EXPONENT_BIAS) as u64) << MANTISSA_BITS);
    scale * (power + power * series)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::random::{Key, Purpose};
    use rand::RngExt;

    /// Units in the last place that a result may be off libm's (itself within one of the truth).
    const ALLOWED_ULPS: f64 = 4.0;
    const SAMPLES: usize = 1_000_000;

    fn ulps(found: f64, expected: f64) -> f64 {
        (found - expected).abs() / (expected.abs() * f64::EPSILON)
    }

    #[test]
    fn exp_is_within_a_few_units_in_the_last_place() {
        let mut stream = Key::event(1, 1).stream(Purpose::named("test"));
        for _ in 0..SAMPLES {
            let x = 1399.0 * (stream.random::<f64>() - 0.5);
            assert!(ulps(exp(x), libm::exp(x)) <= ALLOWED_ULPS, "exp {x}");
        }
        assert_eq!((exp(0.0), exp(-1e4), exp(1e4)), (1.0, 0.0, f64::INFINITY));
        assert!(exp(f64::NAN).is_nan());
    }

    #[test]
    fn ln_is_within_a_few_units_in_the_last_place() {
        let mut stream = Key::event(1, 2).stream(Purpose::named("test"));
        for _ in 0..SAMPLES {
            let x = libm::exp(1400.0 * (stream.random::<f64>() - 0.5));
            assert!(ulps(ln(x), libm::log(x)) <= ALLOWED_ULPS, "ln {x}");
            let near_one = 1.0 + 0.5 * (stream.random::<f64>() - 0.5);
            assert!(
                ulps(ln(near_one), libm::log(near_one)) <= ALLOWED_ULPS,
                "ln {near_one}"
            );
            let tiny = 1.0 - 1e-9 * stream.random::<f64>();
            assert!(ulps(ln(tiny), libm::log(tiny)) <= ALLOWED_ULPS, "ln {tiny}");
        }
        assert_eq!(
            (ln(1.0), ln(0.0), ln(f64::INFINITY)),
            (0.0, f64::NEG_INFINITY, f64::INFINITY)
        );
        assert!(ln(-1.0).is_nan() && ln(f64::NAN).is_nan());
        assert!(ulps(ln(5e-324), libm::log(5e-324)) <= ALLOWED_ULPS);
    }
}
