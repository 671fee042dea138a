//! Test statistics, all at one significance.

/// Significance of one check: two-sided false-alarm rate.
pub const SIGNIFICANCE: f64 = 1e-6;
/// Two-sided 10^-6 quantile of a normal variable.
pub const LARGEST_PULL: f64 = 4.8916;
/// Largest Kolmogorov-Smirnov distance times sqrt(N): sqrt(ln(2/10^-6)/2) (asymptotic, and above the exact quantile at
/// finite N: the inequality of Dvoretzky, Kiefer & Wolfowitz with Massart's constant holds for every N).
pub const LARGEST_DISTANCE: f64 = 2.6933;

/// Sums for a weighted mean of one quantity.
#[derive(Clone, Copy, Debug, Default)]
pub struct Mean {
    pub count: u64,
    sum: f64,
    squares: f64,
}

impl Mean {
    pub fn add(&mut self, value: f64) {
        self.count += 1;
        self.sum += value;
        self.squares += value * value;
    }

    /// Counts further entries of value 0.
    pub fn add_zeros(&mut self, count: u64) {
        self.count += count;
    }

    pub fn value(&self) -> f64 {
        self.sum / self.count as f64
    }

    pub fn variance(&self) -> f64 {
        let n = self.count as f64;
        (self.squares / n - self.value() * self.value()) * n / (n - 1.0)
    }

    /// Standard error of the mean.
    pub fn error(&self) -> f64 {
        (self.variance() / self.count as f64).sqrt()
    }

    /// Distance from an expectation in standard errors.
    pub fn pull(&self, expected: f64) -> f64 {
        (self.value() - expected) / self.error()
    }

    /// (sum w)^2 / sum w^2.
    pub fn effective_size(&self) -> f64 {
        self.sum * self.sum / self.squares
    }
}

/// Distance of two means in standard errors of their difference.
pub fn pull_between(first: &Mean, second: &Mean) -> f64 {
    (first.value() - second.value()) / first.error().hypot(second.error())
}

/// Exact two-sided probability to find a count at least as far out as `count` in `trials` trials of probability `p`:
/// twice the smaller tail, at most 1.
pub fn binomial_p_value(count: u64, trials: u64, p: f64) -> f64 {
    let (k, n) = (count as f64, trials as f64);
    let ln_choose = libm::lgamma(n + 1.0) - libm::lgamma(k + 1.0) - libm::lgamma(n - k + 1.0);
    let at_count = (ln_choose + k * p.ln() + (n - k) * (-p).ln_1p()).exp();
    // Terms of the tail that leads away from the mean, by the ratio of neighbours.
    let upwards = k > n * p;
    let (mut term, mut tail, mut place) = (at_count, at_count, k);
    while term > 1e-18 * tail {
        if upwards {
            term *= (n - place) / (place + 1.0) * p / (1.0 - p);
            place += 1.0;
        } else {
            term *= place / (n - place + 1.0) * (1.0 - p) / p;
            place -= 1.0;
        }
        tail += term;
    }
    (2.0 * tail).min(1.0)
}

/// Distance of a count from its mean in standard deviations.
pub fn binomial_pull(count: u64, trials: u64, p: f64) -> f64 {
    let n = trials as f64;
    (count as f64 - n * p) / (n * p * (1.0 - p)).sqrt()
}

/// Kolmogorov-Smirnov distance times sqrt(N) between draws and a cumulative function; sorts the draws.
pub fn distance(draws: &mut [f64], cumulative: impl Fn(f64) -> f64) -> f64 {
    draws.sort_unstable_by(f64::total_cmp);
    let n = draws.len() as f64;
    let largest = draws
        .iter()
        .enumerate()
        .fold(0.0_f64, |largest, (place, draw)| {
            let expected = cumulative(*draw);
            let (below, above) = (place as f64 / n, (place as f64 + 1.0) / n);
            largest
                .max((expected - below).abs())
                .max((expected - above).abs())
        });
    largest * n.sqrt()
}

/// Two-sample Kolmogorov-Smirnov distance times sqrt(n m/(n + m)); conservative for discrete quantities.
pub fn distance_between(first: &mut [f64], second: &mut [f64]) -> f64 {
    first.sort_unstable_by(f64::total_cmp);
    second.sort_unstable_by(f64::total_cmp);
    let (n, m) = (first.len() as f64, second.len() as f64);
    let (mut i, mut j, mut largest) = (0, 0, 0.0_f64);
    while i < first.len() && j < second.len() {
        let value = first[i].min(second[j]);
        while i < first.len() && first[i] <= value {
            i += 1;
        }
        while j < second.len() && second[j] <= value {
            j += 1;
        }
        largest = largest.max((i as f64 / n - j as f64 / m).abs());
    }
    largest * (n * m / (n + m)).sqrt()
}

/// A uniform distribution passes, one that is off by 1.4 % of its range anywhere at N = 10^5 does not; binomial tails
/// are those of a table.
#[test]
fn statistics_know_good_from_bad() {
    use rand::RngExt;
    use spindrift::random::{Key, Purpose};
    const DRAWS: usize = 100_000;
    let mut stream = Key::event(5, 5).stream(Purpose::SOURCE);
    let mut draws: Vec<f64> = (0..DRAWS).map(|_| stream.random()).collect();
    let mut others: Vec<f64> = (0..DRAWS).map(|_| stream.random()).collect();
    let mut shifted: Vec<f64> = draws.iter().map(|u| u + 0.056 * u * (1.0 - u)).collect();
    assert!(distance(&mut draws, |u| u) < LARGEST_DISTANCE);
    assert!(distance_between(&mut draws, &mut others) < LARGEST_DISTANCE);
    assert!(distance(&mut shifted, |u| u) > LARGEST_DISTANCE);
    assert!(distance_between(&mut shifted, &mut others) > LARGEST_DISTANCE);
    // By hand: P(X <= 1) of 10 trials at 0.3 is 0.7^10 + 3 0.7^9; P(X >= 9) is 10 0.3^9 0.7 + 0.3^10.
    let low = 0.7_f64.powi(10) + 3.0 * 0.7_f64.powi(9);
    let high = 7.0 * 0.3_f64.powi(9) + 0.3_f64.powi(10);
    assert!((binomial_p_value(1, 10, 0.3) / (2.0 * low) - 1.0).abs() < 1e-10);
    assert!((binomial_p_value(9, 10, 0.3) / (2.0 * high) - 1.0).abs() < 1e-10);
    // Where the normal law holds its quantile and the exact tail agree.
    let sigma = (1e6_f64 * 0.25).sqrt();
    let tail = binomial_p_value((5e5 + LARGEST_PULL * sigma) as u64, 1_000_000, 0.5);
    assert!((tail / SIGNIFICANCE - 1.0).abs() < 0.02, "{tail}");
}
