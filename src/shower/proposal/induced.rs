//! The envelope of an induced channel and its inverse.
//!
//! An effect bounds its relative change by R <= s(t)/(z(1-z)), s being the least or greatest of two power laws. With
//! a = alpha_s at its largest and B(z) = P(z)/(z(1-z)), the density is bounded by a/(2 pi) s(t) B(z). B splits exactly
//! into powers that invert in closed form,
//!
//! q -> q g: C_F [1/z + 2/(1-z)^2],   g -> g g: C_A [1/z^2 + 1/(1-z)^2 + 1],
//!
//! and its integral over [m, 1-m], m the smallest fraction at t, is bounded by C_F (2 + e^-3)/m and 2 C_A/m: for the
//! quark, m ln((1-m)/m) - 2m/(1-m) <= m ln(1/m) - 2m <= e^-3 (at m = e^-3); for the gluon, m - 2m/(1-m) <= 0. With
//! the kinematic range 1/m <= 4 t/t0, so the rate in ln t is a power law on each side of one break.

use rand::RngExt;
use rand_distr::OpenClosed01;

use super::{FractionRange, Trial};
use crate::medium::effects::{PowerLaw, RateBound};
use crate::qcd::kernels::Splitting;
use crate::qcd::{C_A, C_F};
use crate::random::Stream;
use crate::shower::ZRange;
use crate::shower::proposal::staircase::VacuumRate;

use std::f64::consts::TAU;

/// As for the vacuum: envelopes lie this much above the exact bound, so that rounding makes no overshoot.
const ROUNDING_MARGIN: f64 = 1e-9;

/// The envelope of one effect for one parton.
#[derive(Clone, Copy, Debug)]
pub struct InducedEnvelope {
    is_gluon: bool,
    range: FractionRange,
    /// Above and below the break: rate in ln t, integrated over z.
    above: PowerLaw,
    below: PowerLaw,
    break_t_gev2: f64,
    /// alpha_s at its largest times the envelope factor.
    largest_alpha_s: f64,
}

impl InducedEnvelope {
    /// The envelope for a bound on the relative change; `None` where the bound vanishes.
    pub fn new(rate: &VacuumRate, is_gluon: bool, bound: RateBound, envelope_factor: f64) -> Option<InducedEnvelope> {
        let kappa2 = rate.range.smallest_kappa2_gev2();
        let largest_alpha_s = rate.coupling.alpha_s(rate.coupling.scale_gev2(kappa2, rate.range.end_t_gev2));
        let largest_alpha_s = largest_alpha_s * envelope_factor * (1.0 + ROUNDING_MARGIN);
        let (first, second) = match bound {
            RateBound::LeastOf(first, second) | RateBound::GreatestOf(first, second) => (first, second),
        };
        let vanishes = match bound {
            RateBound::LeastOf(..) => first.coefficient <= 0.0 || second.coefficient <= 0.0,
            RateBound::GreatestOf(..) => first.coefficient <= 0.0 && second.coefficient <= 0.0,
        };
        if vanishes {
            return None;
        }
        let break_t_gev2 = crossing(first, second);
        let (above, below) = match bound {
            RateBound::LeastOf(..) => (first, second),
            RateBound::GreatestOf(..) => (second, first),
        };
        let whole = |law: PowerLaw| {
            let over_z = integral_bound(&rate.range, is_gluon);
            let coefficient = law.coefficient * over_z.coefficient * largest_alpha_s / TAU;
            PowerLaw { coefficient, power: law.power + over_z.power }
        };
        let (above, below) = (whole(above), whole(below));
        Some(InducedEnvelope { is_gluon, range: rate.range, above, below, break_t_gev2, largest_alpha_s })
    }

    /// The next trial below `t_gev2`, `None` when the cutoff is reached; `trials` counts every proposal.
    pub fn propose(&self, t_gev2: f64, stream: &mut Stream, trials: &mut u64) -> Option<Trial> {
        *trials += 1;
        let uniform: f64 = stream.sample(OpenClosed01);
        let t = self.next_t(t_gev2, -libm::log(uniform));
        if t.is_nan() || t <= self.range.end_t_gev2 {
            return None;
        }
        let smallest = self.range.smallest(t);
        let shape = Shape::new(self.is_gluon, smallest);
        let z = shape.draw(stream);
        let law = if t >= self.break_t_gev2 { self.above } else { self.below };
        // The envelope's density is its rate in ln t times the normalised shape in z, over 2 pi like all densities.
        let envelope = TAU * law.at(t) * shape.value(z) / shape.integral();
        let splitting = if self.is_gluon { Splitting::GluonToGluons } else { Splitting::QuarkToQuarkGluon };
        Some(Trial { t, z, splitting, uniform: stream.random(), inverse_envelope: 1.0 / envelope })
    }

    /// Spends `budget` of the rate's integral on the way down from `t`; NaN or below the cutoff when it is not spent.
    fn next_t(&self, t: f64, budget: f64) -> f64 {
        if t <= self.break_t_gev2 {
            return self.below.descend(t, budget);
        }
        let landing = self.above.descend(t, budget);
        if landing >= self.break_t_gev2 {
            return landing;
        }
        let rest = budget - self.above.integral(self.break_t_gev2, t);
        self.below.descend(self.break_t_gev2, rest.max(0.0))
    }

    /// alpha_s at its largest, with the envelope factor.
    pub fn largest_alpha_s(&self) -> f64 {
        self.largest_alpha_s
    }
}

/// Where two power laws of different exponent cross.
fn crossing(first: PowerLaw, second: PowerLaw) -> f64 {
    let ratio = first.coefficient / second.coefficient;
    if second.power - first.power == 1 { ratio } else { ratio.sqrt() }
}

/// A bound on the integral of B over the range at t, as a power law in t.
fn integral_bound(range: &FractionRange, is_gluon: bool) -> PowerLaw {
    match range.kind {
        ZRange::Constant { epsilon } => PowerLaw { coefficient: Shape::new(is_gluon, epsilon).integral(), power: 0 },
        ZRange::Kinematic => {
            let factor = if is_gluon { 2.0 * C_A } else { C_F * (2.0 + libm::exp(-3.0)) };
            // The smallest fraction m obeys 1/m <= 4 t/t0.
            PowerLaw { coefficient: factor * 4.0 / range.end_t_gev2, power: 1 }
        }
    }
}

impl PowerLaw {
    #[inline]
    fn at(&self, t: f64) -> f64 {
        self.coefficient * integer_power(t, self.power)
    }

    /// Integral over ln t.
    fn integral(&self, low: f64, high: f64) -> f64 {
        match self.power {
            0 => self.coefficient * libm::log(high / low),
            power => {
                let rise = integer_power(high, power) - integer_power(low, power);
                self.coefficient * rise / f64::from(power)
            }
        }
    }

    /// The t at which the integral over ln t from there to `t` is `budget`; NaN or 0 where there is none.
    #[inline]
    fn descend(&self, t: f64, budget: f64) -> f64 {
        match self.power {
            0 => t * libm::exp(-budget / self.coefficient),
            power => {
                let left = integer_power(t, power) - budget * f64::from(power) / self.coefficient;
                integer_root(left, power)
            }
        }
    }
}

#[inline]
fn integer_power(t: f64, power: i32) -> f64 {
    match power {
        -1 => 1.0 / t,
        0 => 1.0,
        1 => t,
        2 => t * t,
        power => libm::pow(t, f64::from(power)),
    }
}

#[inline]
fn integer_root(value: f64, power: i32) -> f64 {
    match power {
        -1 => 1.0 / value,
        1 => value,
        2 => value.sqrt(),
        power => libm::pow(value, 1.0 / f64::from(power)),
    }
}

/// B(z) on [m, 1-m]: exact terms, each with a closed inverse.
struct Shape {
    is_gluon: bool,
    smallest: f64,
    /// Integral of the term that is invertible by a logarithm (quark, 1/z) or flat (gluon).
    other: f64,
    /// Integral of 1/(1-z)^2 over the range.
    square: f64,
}

impl Shape {
    #[inline]
    fn new(is_gluon: bool, smallest: f64) -> Shape {
        let largest = 1.0 - smallest;
        let square = 1.0 / smallest - 1.0 / largest;
        let other = if is_gluon { largest - smallest } else { libm::log(largest / smallest) };
        Shape { is_gluon, smallest, other, square }
    }

    fn integral(&self) -> f64 {
        let casimir = if self.is_gluon { C_A } else { C_F };
        casimir * (self.other + 2.0 * self.square)
    }

    fn value(&self, z: f64) -> f64 {
        let soft = 1.0 - z;
        if self.is_gluon {
            C_A * (1.0 / (z * z) + 1.0 / (soft * soft) + 1.0)
        } else {
            C_F * (1.0 / z + 2.0 / (soft * soft))
        }
    }

    fn draw(&self, stream: &mut Stream) -> f64 {
        let place = stream.random::<f64>() * (self.other + 2.0 * self.square);
        if place < self.other {
            let u = place / self.other;
            return if self.is_gluon {
                self.smallest + u * (1.0 - 2.0 * self.smallest)
            } else {
                self.smallest * libm::exp(u * self.other)
            };
        }
        let squared = place - self.other;
        let (depth, mirror) =
            if squared < self.square { (squared, true) } else { (squared - self.square, !self.is_gluon) };
        let e = 1.0 / (1.0 / self.smallest - depth);
        if mirror { 1.0 - e } else { e }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::qcd::kernels;
    use crate::random::{Key, Purpose};

    #[test]
    fn the_shape_is_the_kernel_over_z_one_minus_z() {
        for z in [1e-4, 0.2, 0.5, 0.77, 0.9999] {
            let soft = z * (1.0 - z);
            let quark = Shape::new(false, 1e-5).value(z) / (kernels::quark_to_quark_gluon(z) / soft);
            let gluon = Shape::new(true, 1e-5).value(z) / (kernels::gluon_to_gluons(z) / soft);
            assert!((quark - 1.0).abs() < 1e-10 && (gluon - 1.0).abs() < 1e-10, "{z}: {quark} {gluon}");
        }
    }

    /// Distribution of the draws against the closed cumulative function, Kolmogorov-Smirnov at 10^-6 (N = 10^5: a
    /// difference of 0.9 % anywhere would be seen).
    #[test]
    fn draws_follow_the_shape() {
        const DRAWS: usize = 100_000;
        const LARGEST_DISTANCE: f64 = 2.69;
        for is_gluon in [false, true] {
            for smallest in [0.01, 0.2] {
                let shape = Shape::new(is_gluon, smallest);
                let mut stream = Key::event(3, is_gluon as u64).stream(Purpose::VACUUM);
                let mut draws: Vec<f64> = (0..DRAWS).map(|_| shape.draw(&mut stream)).collect();
                draws.sort_by(f64::total_cmp);
                let cumulative = |z: f64| {
                    let square = 1.0 / (1.0 - z) - 1.0 / (1.0 - smallest);
                    let mirror = 1.0 / smallest - 1.0 / z;
                    if is_gluon {
                        C_A * (square + mirror + z - smallest) / shape.integral()
                    } else {
                        C_F * ((z / smallest).ln() + 2.0 * square) / shape.integral()
                    }
                };
                let distance = draws
                    .iter()
                    .enumerate()
                    .map(|(place, z)| (cumulative(*z) - (place as f64 + 0.5) / DRAWS as f64).abs())
                    .fold(0.0, f64::max);
                assert!(distance * (DRAWS as f64).sqrt() < LARGEST_DISTANCE, "{is_gluon} {smallest}: {distance}");
            }
        }
    }

    #[test]
    fn the_integral_bound_holds() {
        let range = FractionRange { end_t_gev2: 1.0, kind: ZRange::Kinematic };
        for is_gluon in [false, true] {
            for step in 0..2000 {
                let t = libm::exp(0.005 * step as f64);
                let exact = Shape::new(is_gluon, range.smallest(t)).integral();
                assert!(exact <= integral_bound(&range, is_gluon).at(t), "{t}");
            }
        }
    }

    /// Descending spends exactly the budget, across the break too.
    #[test]
    fn descents_spend_their_budget() {
        let range = FractionRange { end_t_gev2: 1.0, kind: ZRange::Kinematic };
        for (above, below) in [(0, 2), (1, 0), (-1, 1)] {
            let above = PowerLaw { coefficient: 0.7, power: above };
            let below = PowerLaw { coefficient: above.at(9.0) / integer_power(9.0, below), power: below };
            let envelope =
                InducedEnvelope { is_gluon: true, range, above, below, break_t_gev2: 9.0, largest_alpha_s: 1.0 };
            for (start, end) in [(80.0, 20.0), (80.0, 4.0), (6.0, 2.0)] {
                let top: f64 = start;
                let upper = if top > 9.0 { above.integral(9.0_f64.max(end), top) } else { 0.0 };
                let lower = if end < 9.0 { below.integral(end, top.min(9.0)) } else { 0.0 };
                let found = envelope.next_t(start, upper + lower);
                assert!((found / end - 1.0).abs() < 1e-9, "{start} to {end}: {found}");
            }
        }
    }
}
