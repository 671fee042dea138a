//! Gauss and Legendre's rule with eight points (Abramowitz & Stegun, Handbook of Mathematical Functions, table 25.4).

/// Points of the rule on [-1, 1], the positive half.
const POINTS: [f64; 4] = [
    0.183_434_642_495_649_8,
    0.525_532_409_916_329,
    0.796_666_477_413_626_7,
    0.960_289_856_497_536_3,
];
/// Their weights.
const WEIGHTS: [f64; 4] = [
    0.362_683_783_378_362,
    0.313_706_645_877_887_27,
    0.222_381_034_453_374_48,
    0.101_228_536_290_376_26,
];

/// Calls `visit(point, weight)` for the eight points of the rule on [low, high].
#[inline]
pub fn for_points(low: f64, high: f64, mut visit: impl FnMut(f64, f64)) {
    let (middle, half) = (0.5 * (low + high), 0.5 * (high - low));
    for (point, weight) in POINTS.into_iter().zip(WEIGHTS) {
        visit(middle - half * point, half * weight);
        visit(middle + half * point, half * weight);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn powers_up_to_fifteen_are_exact_and_sixteen_is_not() {
        let integral = |power: i32| {
            let mut sum = 0.0;
            for_points(1.0, 3.0, |x, weight| sum += weight * x.powi(power));
            let exact = (3f64.powi(power + 1) - 1.0) / (power + 1) as f64;
            (sum / exact - 1.0).abs()
        };
        assert!((0..=15).all(|power| integral(power) < 1e-14));
        let mut sum = 0.0;
        for_points(-1.0, 1.0, |x, weight| sum += weight * x.powi(16));
        assert!((sum - 2.0 / 17.0).abs() > 1e-6);
    }
}
