//! The exact boost-invariant conformal solution with transverse flow (Gubser 2010, arXiv:1006.0006):
//!
//! T(tau, r) = A hbar c (2q)^(2/3) tau^(-1/3) B^(-1/3), B = 1 + 2 q^2 (tau^2 + r^2) + q^4 (tau^2 - r^2)^2,
//! u^tau = (1 + q^2 tau^2 + q^2 r^2)/sqrt(B), u^r = 2 q^2 tau r/sqrt(B).
//!
//! The medium exists from a first tau on, or, held, with the values of that tau before.
//!
//! **Along a light-like ray** tau^2 and tau^2 + r^2 are quadratic in the distance l, and tau^2 - r^2 is linear (its
//! square term is 1 - nz^2 - n_perp^2 = 0), so B is a quadratic polynomial, convex, at least 1, and its bounds over a
//! segment are known. The fluid is as hot as T_end where tau B <= D = (A hbar c)^3 (2q)^2/T_end^3.
//!
//! **Where the medium ends.** At given tau, B is least at r^2 = tau^2 - 1/q^2 if that is positive, else at r = 0, so
//! tau B >= tau (1 + q^2 tau^2)^2 for q tau <= 1 and >= 4 q^2 tau^3 beyond: nothing is hot after the tau where this
//! reaches D. Before, tau B need not be monotone along a ray (one that flies inwards heats up first). The stretch runs
//! from the first to the last of a number of equal pieces in which (least tau) (least B) <= D; where tau B grows over
//! the whole last piece, it ends at the crossing itself.
//!
//! **Ceilings** over a piece from a to b: T from the least tau and B; p.u/E is [(1 + q^2 (tau^2 + r^2)) c - 2 q^2 tau
//! n_perp.x]/sqrt(B) with c = (t - nz z)/tau, which never grows; tau^2 + r^2 is convex, so largest at an end; n_perp.x
//! grows linearly, so -tau n_perp.x <= -tau_a (n_perp.x)_a if (n_perp.x)_a >= 0, and <= -tau_b (n_perp.x)_a else.

use super::{
    Ceiling, Fluid, Local, Ray, Stretch, TemperatureField, is_before, milne_flow_factor,
    on_light_cone, proper_time_fm,
};
use crate::qcd::HBAR_C_GEV_FM;

/// The conformal solution with transverse flow.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Radial {
    /// q^2, fm^-2.
    q2: f64,
    /// A hbar c (2q)^(2/3), GeV fm^(1/3).
    scale: f64,
    start_fm: f64,
    hold: bool,
}

/// Cells over a first tau, as in the longitudinal solution.
const CELLS_PER_FIRST_TAU: f64 = 4.0;
/// Cells over 1/q, the size of the fireball: the flow changes over it.
const CELLS_PER_SIZE: f64 = 8.0;
/// More cells than this bring nothing at the accuracy of a linear piece.
const MOST_CELLS: f64 = 1000.0;
/// Pieces in which the ends of the medium are looked for.
const PIECES: usize = 16;
/// Segments with a ceiling of their own.
const SEGMENTS: usize = 8;
/// Allowance of bounds for rounding.
const ROUNDING: f64 = 1.0 + 1e-12;
/// Newton's steps to the last tau: from above on a convex function, so that every step is a bound.
const NEWTON_STEPS: usize = 8;
/// Steps to the end of the medium in the last piece.
const MOST_STEPS: usize = 40;
/// The end is found when tau B is this close to its value there, which no sample of a path can tell.
const CLOSE: f64 = 1e-9;

impl Radial {
    /// The solution with an amplitude A (without dimension), an inverse size q (1/fm) and a first proper time (fm).
    pub fn new(amplitude: f64, q_per_fm: f64, start_fm: f64) -> Radial {
        Radial {
            q2: q_per_fm * q_per_fm,
            scale: amplitude * HBAR_C_GEV_FM * libm::cbrt(4.0 * q_per_fm * q_per_fm),
            start_fm,
            hold: false,
        }
    }

    /// Whether the values at the start stand for what was before it.
    pub fn hold_before_start(self, hold: bool) -> Radial {
        Radial { hold, ..self }
    }

    /// B at squares of tau and r.
    #[inline]
    fn spread(&self, tau2: f64, r2: f64) -> f64 {
        let linear = self.q2 * (tau2 - r2);
        1.0 + 2.0 * self.q2 * (tau2 + r2) + linear * linear
    }

    /// Temperature at a tau not before the start, with B.
    #[inline]
    fn temperature_gev(&self, tau_fm: f64, spread: f64) -> f64 {
        self.scale / libm::cbrt(tau_fm * spread)
    }

    /// Temperature and Milne velocity (u^x, u^y) at a proper time and place; before the start, those of the start.
    fn state(&self, tau_fm: f64, [x, y]: [f64; 2]) -> (f64, [f64; 2]) {
        let tau = tau_fm.max(self.start_fm);
        let spread = self.spread(tau * tau, x * x + y * y);
        let slope = 2.0 * self.q2 * tau / spread.sqrt();
        (self.temperature_gev(tau, spread), [slope * x, slope * y])
    }

    /// D: the fluid is as hot as the end temperature where tau B <= D.
    fn dilution_fm(&self, end_temperature_gev: f64) -> f64 {
        let ratio = self.scale / end_temperature_gev;
        ratio * ratio * ratio
    }

    /// Nothing is hot after this tau.
    fn last_tau_fm(&self, dilution_fm: f64) -> f64 {
        let q2 = self.q2;
        let late = libm::cbrt(dilution_fm / (4.0 * q2));
        if late * late * q2 >= 1.0 {
            return late;
        }
        // tau (1 + q^2 tau^2)^2 = D: D lies above the root, and so does 1/q, where the left side is 4/q > D.
        let mut tau = dilution_fm.min(1.0 / q2.sqrt());
        for _ in 0..NEWTON_STEPS {
            let a = 1.0 + q2 * tau * tau;
            let slope = a * (a + 4.0 * q2 * tau * tau);
            tau -= (tau * a * a - dilution_fm) / slope;
        }
        tau * ROUNDING
    }
}

/// B along a ray and what goes with it, for taus not before the start.
struct Along<'a> {
    field: &'a Radial,
    ray: &'a Ray,
    /// Where the ray passes the start; B before it is that of the start's tau.
    start_l_fm: f64,
    /// Least point of B after the start.
    turn_l_fm: f64,
}

impl<'a> Along<'a> {
    fn new(field: &'a Radial, ray: &'a Ray) -> Option<Along<'a>> {
        let start_l_fm = ray.distance_to_proper_time(field.start_fm)?;
        let [t, x, y, z] = ray.birth_fm;
        let [nx, ny, nz] = ray.direction;
        // tau^2 = tau_0^2 + 2 b l + a l^2, r^2 = r_0^2 + 2 c l + a l^2, with a = 1 - nz^2 = nx^2 + ny^2.
        let (a, b, c) = (nx * nx + ny * ny, t - nz * z, nx * x + ny * y);
        let difference = t * t - z * z - x * x - y * y;
        let q4 = field.q2 * field.q2;
        let slope = 4.0 * field.q2 * (b + c) + 4.0 * q4 * difference * (b - c);
        let curvature = 4.0 * field.q2 * a + 4.0 * q4 * (b - c) * (b - c);
        Some(Along {
            field,
            ray,
            start_l_fm,
            turn_l_fm: -slope / (2.0 * curvature),
        })
    }

    /// Square of tau (not before the start) and of r.
    fn squares(&self, l_fm: f64) -> [f64; 2] {
        let [t, x, y, z] = self.ray.at(l_fm);
        let start = self.field.start_fm;
        [(t * t - z * z).max(start * start), x * x + y * y]
    }

    fn spread(&self, l_fm: f64) -> f64 {
        let [tau2, r2] = self.squares(l_fm);
        self.field.spread(tau2, r2)
    }

    /// Least tau and a lower bound of B over a piece.
    fn least(&self, [from, to]: [f64; 2]) -> [f64; 2] {
        let [tau2, _] = self.squares(from);
        let mut spread = self.spread(to);
        if from < self.start_l_fm {
            spread = spread.min(self.held_spread([from, to.min(self.start_l_fm)]));
        } else {
            spread = spread.min(self.spread(from));
        }
        if (from.max(self.start_l_fm)..to).contains(&self.turn_l_fm) {
            spread = spread.min(self.spread(self.turn_l_fm));
        }
        [tau2.sqrt(), spread / ROUNDING]
    }

    /// The least B over a piece before the start: at fixed tau B is convex in r^2, and least at tau^2 - 1/q^2.
    fn held_spread(&self, [from, to]: [f64; 2]) -> f64 {
        let [_, x, y, _] = self.ray.birth_fm;
        let [nx, ny, _] = self.ray.direction;
        let nearest =
            (-(nx * x + ny * y) / (nx * nx + ny * ny).max(f64::MIN_POSITIVE)).clamp(from, to);
        let tau2 = self.field.start_fm * self.field.start_fm;
        let r2 = self.squares(nearest)[1].max(tau2 - 1.0 / self.field.q2);
        self.field.spread(tau2, r2)
    }

    fn may_be_hot(&self, piece: [f64; 2], dilution_fm: f64) -> bool {
        let [tau, spread] = self.least(piece);
        tau * spread <= dilution_fm
    }

    /// Where the medium ends in a piece after which all is cold: the crossing where tau B grows over the whole piece,
    /// found by false position (with Illinois' halving) from above.
    fn end(&self, [from, to]: [f64; 2], dilution_fm: f64) -> f64 {
        let excess = |l: f64| self.squares(l)[0].sqrt() * self.spread(l) / dilution_fm - 1.0;
        let (mut low, mut high) = ((from, excess(from)), (to, excess(to)));
        let grows = from >= self.turn_l_fm && from >= self.start_l_fm;
        if !grows || low.1 >= 0.0 || high.1 <= 0.0 {
            return to;
        }
        let mut kept_high = None;
        for _ in 0..MOST_STEPS {
            let middle = (low.0 * high.1 - high.0 * low.1) / (high.1 - low.1);
            let value = excess(middle);
            if value.abs() < CLOSE {
                return middle;
            }
            if value > 0.0 {
                high = (middle, value);
                low.1 *= if kept_high == Some(false) { 0.5 } else { 1.0 };
                kept_high = Some(false);
            } else {
                low = (middle, value);
                high.1 *= if kept_high == Some(true) { 0.5 } else { 1.0 };
                kept_high = Some(true);
            }
        }
        high.0
    }
}

impl TemperatureField for Radial {
    fn stretch(&self, ray: &Ray, end_temperature_gev: f64) -> Option<Stretch> {
        let dilution_fm = self.dilution_fm(end_temperature_gev);
        let last_tau_fm = self.last_tau_fm(dilution_fm);
        let along = Along::new(self, ray)?;
        let (start, stop) = (
            if self.hold { 0.0 } else { along.start_l_fm },
            ray.distance_to_proper_time(last_tau_fm)?,
        );
        if last_tau_fm <= self.start_fm || stop <= start {
            return None;
        }
        let piece_fm = (stop - start) / PIECES as f64;
        let piece = |place: usize| {
            let from = start + place as f64 * piece_fm;
            [
                from,
                if place + 1 == PIECES {
                    stop
                } else {
                    from + piece_fm
                },
            ]
        };
        let hot = |place: &usize| along.may_be_hot(piece(*place), dilution_fm);
        let first = (0..PIECES).find(hot)?;
        let last = (first..PIECES).rev().find(hot)?;
        let first_fm = piece(first)[0];
        let last_fm = along.end(piece(last), dilution_fm);
        let first_tau = proper_time_fm(ray.at(first_fm)).max(self.start_fm);
        let per_fm = (CELLS_PER_FIRST_TAU / first_tau).max(CELLS_PER_SIZE * self.q2.sqrt());
        let cells = (per_fm * (last_fm - first_fm))
            .ceil()
            .clamp(1.0, MOST_CELLS);
        Some(Stretch {
            first_fm,
            last_fm,
            cells: cells as usize,
        })
    }

    fn local(&self, ray: &Ray, l_fm: f64) -> Local {
        let point = ray.at(l_fm);
        let [_, x, y, _] = point;
        let [nx, ny, nz] = ray.direction;
        let tau = proper_time_fm(point);
        let (temperature_gev, [ux, uy]) = self.state(tau, [x, y]);
        let utau = (1.0 + ux * ux + uy * uy).sqrt();
        let flow_factor = utau * milne_flow_factor(point, nz, tau) - nx * ux - ny * uy;
        Local {
            temperature_gev,
            flow_factor,
        }
    }

    fn fluid(&self, point_fm: [f64; 4]) -> Fluid {
        let tau = proper_time_fm(point_fm);
        if is_before(tau, self.start_fm) && !self.hold {
            return Fluid::EMPTY;
        }
        let (temperature_gev, [ux, uy]) = self.state(tau, [point_fm[1], point_fm[2]]);
        Fluid::from_milne(temperature_gev, [ux, uy, 0.0], point_fm)
    }

    fn first_tau_fm(&self) -> f64 {
        self.start_fm
    }

    fn ceilings(&self, ray: &Ray, stretch: &Stretch, ceilings: &mut Vec<Ceiling>) -> bool {
        ceilings.clear();
        if on_light_cone(ray.at(stretch.first_fm)) {
            return false;
        }
        let Some(along) = Along::new(self, ray) else {
            return false;
        };
        let segment_fm = (stretch.last_fm - stretch.first_fm) / SEGMENTS as f64;
        ceilings.extend((0..SEGMENTS).map(|segment| {
            let from = stretch.first_fm + segment as f64 * segment_fm;
            let ends = [from, from + segment_fm];
            let [tau, spread] = along.least(ends);
            Ceiling {
                temperature_gev: self.temperature_gev(tau, spread) * ROUNDING,
                flow_factor: along.largest_flow_factor(ends, spread) * ROUNDING,
            }
        }));
        true
    }
}

impl Along<'_> {
    /// A bound of p.u/E over a piece in which B >= `spread`.
    fn largest_flow_factor(&self, [from, to]: [f64; 2], spread: f64) -> f64 {
        let ([tau2_a, r2_a], [tau2_b, r2_b]) = (self.squares(from), self.squares(to));
        let point = self.ray.at(from);
        let [nx, ny, nz] = self.ray.direction;
        let outward = nx * point[1] + ny * point[2];
        let tau = if outward >= 0.0 { tau2_a } else { tau2_b }.sqrt();
        let q2 = self.field.q2;
        let longitudinal = milne_flow_factor(point, nz, proper_time_fm(point));
        let swelling = 1.0 + q2 * (tau2_a + r2_a).max(tau2_b + r2_b);
        (swelling * longitudinal - 2.0 * q2 * tau * outward) / spread.sqrt()
    }
}
