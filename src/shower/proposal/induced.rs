//! The envelope of an induced channel and its inverse.
//!
//! An effect bounds its relative change by R <= s(t)/(z(1-z)), s being the least or greatest of two power laws. With
//! a = alpha_s at its largest and B(z) = P(z)/(z(1-z)), the density is bounded by a/(2 pi) s(t) B(z). B splits exactly
//! into powers that invert in closed form,
//!
//! q -> q g: C_F [1/z + 2/(1-z)^2],   g -> g g: C_A [1/z^2 + 1/(1-z)^2 + 1],
//!
//! and its integral over [m, 1-m], m the smallest fraction at t, is bounded by C_F (2 + e^-3)/m and 2 C_A/m: for the
//! quark, m ln((1-m)/m) - 2m/(1-m) <= m ln(1/m) - 2m <= e^-3 (at m = e^-3); for the gluon, m - 2m/(1-m) <= 0.
//! Where the effect also makes quark pairs, g -> q qbar adds n_f T_R (z^2 + (1-z)^2)/(z(1-z)) <= n_f T_R [1/z + 1/(1-z)]
//! with the integral 2 n_f T_R ln((1-m)/m) <= 2 n_f T_R e^-1/m.
//!
//! m is the larger of the range's own end (1/m <= 4 t/t0, or 1/epsilon) and of the small-angle limit's:
//! z(1-z) t <= min(z, 1-z)^2 E^2 is min(z, 1-z) >= t/(E^2 + t). So 1/m <= min(4 t/t0, (E^2 + t_start)/t), and the rate
//! in ln t is a power law between at most two breaks.

use rand::RngExt;
use rand_distr::OpenClosed01;

use super::Trial;
use crate::medium::effects::{PowerLaw, RateBound};
use crate::medium::field::smaller;
use crate::numerics::elementary::{exp, ln};
use crate::qcd::kernels::Splitting;
use crate::qcd::{C_A, C_F, T_R};
use crate::random::Stream;
use crate::shower::ZRange;
use crate::shower::proposal::FractionRange;
use crate::shower::proposal::staircase::VacuumRate;

use std::f64::consts::TAU;

/// As for the vacuum: envelopes lie this much above the exact bound, so that rounding makes no overshoot.
const ROUNDING_MARGIN: f64 = 1e-9;
/// The widest range at all: fractions up to one half.
const LARGEST_SMALLEST: f64 = 0.5;

/// The parton and the limits that an induced envelope is made for.
#[derive(Clone, Copy, Debug)]
pub struct Emitter {
    /// Gluon or quark.
    pub is_gluon: bool,
    /// How many flavours an induced g -> q qbar can make; 0 where the effect makes none.
    pub pair_flavours: u8,
    /// Where its evolution starts, GeV^2.
    pub start_t_gev2: f64,
    /// Its lab energy squared, GeV^2, where emissions are limited to small angles.
    pub angle_limit_energy2_gev2: Option<f64>,
}

/// The envelope of one effect for one parton, and how far the evolution has come down in it.
#[derive(Clone, Copy, Debug)]
pub struct InducedEnvelope {
    emitter: Emitter,
    range: FractionRange,
    /// From the highest t down: the rate in ln t, integrated over z.
    pieces: [Piece; 3],
    /// s(t), the effect's bound of R z(1-z).
    strength: Broken,
    /// Integral of the rate in ln t from the cutoff up to the last proposal, and where that lies.
    height: f64,
    t_gev2: f64,
    rate_at_t: f64,
}

/// A stretch of t in which the rate is a power law.
#[derive(Clone, Copy, Debug)]
struct Piece {
    rate: PowerLaw,
    /// Its lower end, not below the cutoff, and the integral of the rate from the cutoff up to there.
    low_t_gev2: f64,
    integral_below: f64,
}

/// A trial of an induced channel.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Proposed {
    /// The trial.
    pub trial: Trial,
    /// The vacuum density over the envelope's.
    pub density_ratio: f64,
}

/// A function of t that changes from one power law to another at a break.
#[derive(Clone, Copy, Debug)]
struct Broken {
    above: PowerLaw,
    below: PowerLaw,
    break_t_gev2: f64,
}

impl InducedEnvelope {
    /// The envelope for a bound on the relative change; `None` where the bound vanishes.
    #[inline]
    pub fn new(
        rate: &VacuumRate,
        emitter: Emitter,
        bound: RateBound,
        envelope_factor: f64,
    ) -> Option<InducedEnvelope> {
        let factor = rate.largest_alpha_s / TAU * envelope_factor * (1.0 + ROUNDING_MARGIN);
        let strength = Broken::strength(bound)?;
        let width = Broken::inverse_smallest(&rate.range, &emitter);
        let over_z = if emitter.is_gluon {
            2.0 * C_A + 2.0 * emitter.pair_strength() * exp(-1.0)
        } else {
            C_F * (2.0 + exp(-3.0))
        };
        let mut envelope = InducedEnvelope {
            emitter,
            range: rate.range,
            pieces: product(
                &strength,
                &width,
                factor * over_z,
                [rate.range.end_t_gev2, emitter.start_t_gev2],
            ),
            strength,
            height: 0.0,
            t_gev2: emitter.start_t_gev2,
            rate_at_t: 0.0,
        };
        envelope.height = envelope.integral(emitter.start_t_gev2);
        Some(envelope)
    }

    /// Integral of the rate in ln t from the cutoff up to `t_gev2`.
    #[inline]
    fn integral(&self, t_gev2: f64) -> f64 {
        let above = |piece: &&Piece| t_gev2 > piece.low_t_gev2;
        self.pieces.iter().find(above).map_or(0.0, |piece| {
            piece.integral_below + piece.rate.integral(piece.low_t_gev2, t_gev2)
        })
    }

    /// Goes down to the next proposal, which spends `budget`, an exponential number of mean 1, of the rate's integral; its
    /// t, 0 where the cutoff comes first.
    #[inline]
    pub fn descend(&mut self, budget: f64) -> f64 {
        self.height -= budget;
        let before = std::mem::take(&mut self.t_gev2);
        if self.height <= 0.0 {
            return 0.0;
        }
        for piece in &self.pieces {
            if self.height > piece.integral_below {
                let rest = self.height - piece.integral_below;
                // Rounding must not lead up.
                self.t_gev2 = smaller(piece.rate.ascend(piece.low_t_gev2, rest), before);
                self.rate_at_t = piece.rate.at(self.t_gev2);
                break;
            }
        }
        self.t_gev2
    }

    /// Makes a trial of the proposal that [`InducedEnvelope::descend`] came to, or of the next one that is not rejected
    /// whatever the effect says, as long as it lies above `floor_t_gev2`. `None` once one lies below, and its t is where
    /// the envelope stands; `trials` counts every proposal after the first.
    pub fn propose(
        &mut self,
        vacuum: &VacuumRate,
        floor_t_gev2: f64,
        stream: &mut Stream,
        trials: &mut u64,
    ) -> Option<Proposed> {
        while self.t_gev2 > floor_t_gev2 {
            let proposed = self.draw(vacuum, stream);
            if proposed.is_some() {
                return proposed;
            }
            *trials += 1;
            self.descend(draw_budget(stream));
        }
        None
    }

    /// The t where the envelope stands, GeV^2; 0 below the cutoff.
    #[inline]
    pub fn t_gev2(&self) -> f64 {
        self.t_gev2
    }

    /// Draws the rest of the present proposal; `None` where the effect's bound is enough to reject it. The bound of the
    /// accept rule's ratio comes down step by step, and the uniform number is compared with each.
    #[inline]
    fn draw(&self, vacuum: &VacuumRate, stream: &mut Stream) -> Option<Proposed> {
        let t = self.t_gev2;
        let smallest = self.emitter.smallest(t).max(self.range.smallest(t));
        // Above t = E^2 no emission is at a small angle.
        if smallest >= LARGEST_SMALLEST {
            return None;
        }
        let uniform: f64 = stream.random();
        let shape = Shape::new(self.emitter.is_gluon, smallest);
        let pairs = self.emitter.pair_strength();
        let pair_integral = if pairs > 0.0 {
            2.0 * pairs * shape.logarithm()
        } else {
            0.0
        };
        let integral = shape.integral() + pair_integral;
        // R z(1-z) is at most the strength.
        let strength = self.strength.at_or_below(t).at(t);
        let over_rate = integral / (TAU * self.rate_at_t);
        if uniform >= vacuum.largest_alpha_s * strength * over_rate {
            return None;
        }
        let makes_pair = pairs > 0.0 && stream.random::<f64>() * integral < pair_integral;
        // The density is the rate in ln t times the normalised shape in z, without 1/(2 pi) like all densities.
        let (splitting, z, value) = if makes_pair {
            let z = shape.draw_pair(stream);
            (Splitting::GluonToQuarks, z, pairs / (z * (1.0 - z)))
        } else {
            let z = shape.draw(stream);
            (self.emitter.emission(), z, shape.value(z))
        };
        let trial = Trial {
            t,
            z,
            splitting,
            uniform,
            inverse_envelope: over_rate / value,
        };
        let density_ratio = vacuum.density(&trial) * trial.inverse_envelope;
        let is_open = uniform * z * (1.0 - z) < density_ratio * strength;
        is_open.then_some(Proposed {
            trial,
            density_ratio,
        })
    }

    /// The expected number of branchings at `t_gev2` that the small-angle limit cut away for each that it left, taking
    /// coupling and phase factor to be the same for both.
    pub fn cut_away(&self, t_gev2: f64) -> f64 {
        let whole = self.range.smallest(t_gev2);
        let smallest = self.emitter.smallest(t_gev2).max(whole);
        let integral = |smallest| Shape::new(self.emitter.is_gluon, smallest).integral();
        integral(whole) / integral(smallest) - 1.0
    }
}

/// An exponential number of mean 1: what a proposal spends of the rate's integral.
#[inline]
pub fn draw_budget(stream: &mut Stream) -> f64 {
    let uniform: f64 = stream.sample(OpenClosed01);
    -ln(uniform)
}

impl Emitter {
    /// n_f T_R.
    #[inline]
    fn pair_strength(&self) -> f64 {
        f64::from(self.pair_flavours) * T_R
    }

    #[inline]
    fn emission(&self) -> Splitting {
        if self.is_gluon {
            Splitting::GluonToGluons
        } else {
            Splitting::QuarkToQuarkGluon
        }
    }

    /// The smallest fraction inside the small-angle limit.
    #[inline]
    fn smallest(&self, t_gev2: f64) -> f64 {
        self.angle_limit_energy2_gev2
            .map_or(0.0, |energy2| t_gev2 / (energy2 + t_gev2))
    }
}

impl Broken {
    /// s(t) of a bound.
    #[inline]
    fn strength(bound: RateBound) -> Option<Broken> {
        let (first, second, least) = match bound {
            RateBound::LeastOf(first, second) => (first, second, true),
            RateBound::GreatestOf(first, second) => (first, second, false),
            RateBound::Nothing | RateBound::TimesVacuum(_) | RateBound::Emissions => return None,
        };
        let positive = [first.coefficient > 0.0, second.coefficient > 0.0];
        if !(positive[0] && positive[1] || !least && (positive[0] || positive[1])) {
            return None;
        }
        let break_t_gev2 = crossing(first, second);
        let (above, below) = if least {
            (first, second)
        } else {
            (second, first)
        };
        Some(Broken {
            above,
            below,
            break_t_gev2,
        })
    }

    /// A bound on 1/m, m the smallest fraction.
    #[inline]
    fn inverse_smallest(range: &FractionRange, emitter: &Emitter) -> Broken {
        let below = match range.kind {
            ZRange::Constant { epsilon } => PowerLaw {
                coefficient: 1.0 / epsilon,
                power: 0,
            },
            // m is at least t0/(4 t).
            ZRange::Kinematic => PowerLaw {
                coefficient: 4.0 / range.end_t_gev2,
                power: 1,
            },
        };
        match emitter.angle_limit_energy2_gev2 {
            None => Broken {
                above: below,
                below,
                break_t_gev2: f64::INFINITY,
            },
            Some(energy2) => {
                let above = PowerLaw {
                    coefficient: energy2 + emitter.start_t_gev2,
                    power: -1,
                };
                Broken {
                    above,
                    below,
                    break_t_gev2: crossing(above, below),
                }
            }
        }
    }

    fn at_or_below(&self, t: f64) -> PowerLaw {
        if t > self.break_t_gev2 {
            self.above
        } else {
            self.below
        }
    }
}

/// The product of two broken power laws and a factor, from the highest t down, between the cutoff and the start; pieces
/// beyond the start stay empty.
#[inline]
fn product(
    first: &Broken,
    second: &Broken,
    factor: f64,
    [end_t_gev2, start_t_gev2]: [f64; 2],
) -> [Piece; 3] {
    let high = first.break_t_gev2.max(second.break_t_gev2);
    let low = first.break_t_gev2.min(second.break_t_gev2);
    let mut pieces = [(f64::INFINITY, high), (high, low), (low, 0.0)].map(|(top, low_t_gev2)| {
        let (a, b) = (first.at_or_below(top), second.at_or_below(top));
        let rate = PowerLaw {
            coefficient: factor * a.coefficient * b.coefficient,
            power: a.power + b.power,
        };
        Piece {
            rate,
            low_t_gev2: low_t_gev2.max(end_t_gev2),
            integral_below: 0.0,
        }
    });
    for place in [1, 0] {
        let (top, below) = (pieces[place].low_t_gev2, pieces[place + 1]);
        pieces[place].integral_below = if top >= start_t_gev2 {
            f64::INFINITY
        } else {
            below.integral_below + below.rate.integral(below.low_t_gev2, top)
        };
    }
    pieces
}

/// Where two power laws of different exponent cross.
fn crossing(first: PowerLaw, second: PowerLaw) -> f64 {
    let ratio = first.coefficient / second.coefficient;
    if second.power - first.power == 1 {
        ratio
    } else {
        ratio.sqrt()
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
            0 => self.coefficient * ln(high / low),
            power => {
                let rise = integer_power(high, power) - integer_power(low, power);
                self.coefficient * rise / f64::from(power)
            }
        }
    }

    /// The t at which the integral over ln t from `low` to there is `integral`.
    #[inline]
    fn ascend(&self, low: f64, integral: f64) -> f64 {
        match self.power {
            0 => low * exp(integral / self.coefficient),
            power => {
                let rise = integral * f64::from(power) / self.coefficient;
                integer_root(integer_power(low, power) + rise, power)
            }
        }
    }
}

#[inline]
fn integer_power(t: f64, power: i32) -> f64 {
    match power {
        -2 => 1.0 / (t * t),
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
        -2 => 1.0 / value.sqrt(),
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
        let other = if is_gluon {
            largest - smallest
        } else {
            ln(largest / smallest)
        };
        Shape {
            is_gluon,
            smallest,
            other,
            square,
        }
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

    /// int dz/z = int dz/(1-z) over the range.
    #[inline]
    fn logarithm(&self) -> f64 {
        ln((1.0 - self.smallest) / self.smallest)
    }

    /// z with the density 1/z + 1/(1-z) = 1/(z(1-z)): uniform in ln(z/(1-z)).
    fn draw_pair(&self, stream: &mut Stream) -> f64 {
        let odds = exp((2.0 * stream.random::<f64>() - 1.0) * self.logarithm());
        odds / (1.0 + odds)
    }

    fn draw(&self, stream: &mut Stream) -> f64 {
        let place = stream.random::<f64>() * (self.other + 2.0 * self.square);
        if place < self.other {
            let u = place / self.other;
            return if self.is_gluon {
                self.smallest + u * (1.0 - 2.0 * self.smallest)
            } else {
                self.smallest * exp(u * self.other)
            };
        }
        let squared = place - self.other;
        let (depth, mirror) = if squared < self.square {
            (squared, true)
        } else {
            (squared - self.square, !self.is_gluon)
        };
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
            let quark =
                Shape::new(false, 1e-5).value(z) / (kernels::quark_to_quark_gluon(z) / soft);
            let gluon = Shape::new(true, 1e-5).value(z) / (kernels::gluon_to_gluons(z) / soft);
            assert!(
                (quark - 1.0).abs() < 1e-10 && (gluon - 1.0).abs() < 1e-10,
                "{z}: {quark} {gluon}"
            );
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
                assert!(
                    distance * (DRAWS as f64).sqrt() < LARGEST_DISTANCE,
                    "{is_gluon} {smallest}: {distance}"
                );
            }
        }
    }

    fn range() -> FractionRange {
        FractionRange {
            end_t_gev2: 1.0,
            kind: ZRange::Kinematic,
        }
    }

    /// The bound on the integral of B holds for both ends of the range, and the small-angle end is where the
    /// condition itself says.
    #[test]
    fn the_integral_bound_holds() {
        for is_gluon in [false, true] {
            for energy in [3.0, 20.0, 300.0] {
                let emitter = Emitter {
                    is_gluon,
                    pair_flavours: 0,
                    start_t_gev2: 5e3,
                    angle_limit_energy2_gev2: Some(energy * energy),
                };
                let width = Broken::inverse_smallest(&range(), &emitter);
                let over_z = if is_gluon {
                    2.0 * C_A
                } else {
                    C_F * (2.0 + (-3.0_f64).exp())
                };
                for step in 1..1700 {
                    let t = (0.005 * step as f64).exp();
                    let smallest = emitter.smallest(t).max(range().smallest(t));
                    if smallest < LARGEST_SMALLEST {
                        let bound = over_z * width.at_or_below(t).at(t);
                        assert!(Shape::new(is_gluon, smallest).integral() <= bound, "{t}");
                    }
                    let e = emitter.smallest(t);
                    let angle = |e: f64| e * (1.0 - e) * t - e * e * energy * energy;
                    assert!(e >= 0.5 || (angle(e * 1.0001) < 0.0 && angle(e * 0.9999) > 0.0));
                }
            }
        }
    }

    /// Descending spends exactly the budget, across both breaks too.
    #[test]
    fn descents_spend_their_budget() {
        let law = |coefficient, power| PowerLaw { coefficient, power };
        for (strength, angle) in [
            ((4.0, 0.1), Some(400.0)),
            ((1.0, 0.004), Some(30.0)),
            ((3.0, 1.0), None),
        ] {
            let bound = RateBound::LeastOf(law(strength.0, -1), law(strength.1, 1));
            let emitter = Emitter {
                is_gluon: true,
                pair_flavours: 0,
                start_t_gev2: 90.0,
                angle_limit_energy2_gev2: angle,
            };
            let (strength, width) = (
                Broken::strength(bound).unwrap(),
                Broken::inverse_smallest(&range(), &emitter),
            );
            let ends = [range().end_t_gev2, emitter.start_t_gev2];
            let pieces = product(&strength, &width, 0.02, ends);
            let envelope = |start: f64| {
                let mut envelope = InducedEnvelope {
                    emitter,
                    range: range(),
                    pieces,
                    strength,
                    height: 0.0,
                    t_gev2: start,
                    rate_at_t: 0.0,
                };
                envelope.height = envelope.integral(start);
                envelope
            };
            let rate = |t: f64| 0.02 * strength.at_or_below(t).at(t) * width.at_or_below(t).at(t);
            for (start, end) in [(80.0, 20.0), (80.0, 4.0), (6.0, 2.0_f64)] {
                let (steps, span) = (100_000, (start / end).ln());
                let middle = |step: i32| end * (span * (step as f64 + 0.5) / steps as f64).exp();
                let budget =
                    (0..steps).map(|step| rate(middle(step))).sum::<f64>() * span / steps as f64;
                let mut envelope = envelope(start);
                let (found, rate_there) = (envelope.descend(budget), envelope.rate_at_t);
                assert!(
                    (found / end - 1.0).abs() < 1e-6,
                    "{start} to {end}: {found}"
                );
                assert!((rate_there / rate(end) - 1.0).abs() < 1e-5);
            }
        }
    }
}
