//! The thickness of a nucleus along the beam per nucleon, T(s) = int rho(sqrt(s^2 + z^2)) dz with int rho d^3r = 1
//! (Miller, Reygers, Sanders & Steinberg 2007, nucl-ex/0701025, eq. (1) on: T_A is A times it).
//!
//! Woods-Saxon: rho = rho_0/(1 + exp((r - R)/a)), with 1/rho_0 = 4 pi int r^2/(1 + exp((r - R)/a)) dr =
//! 4 pi [R^3/3 + pi^2 a^2 R/3 + 2 a^3 sum_k (-1)^(k+1) e^(-k R/a)/k^3].
//!
//! The integral over z is done with z = c exp(u - e^(-u)) and equal steps in u, which converges exponentially: the poles
//! nearest to the axis, z = R +- i pi a at s = 0, are away from it by arctan(pi a/R) in u. ln T and its slope are kept
//! at equal steps of s; between them a cubic that is made monotonic (Fritsch & Carlson 1980, SIAM J. Numer. Anal.
//! 17:238). The relative error is below 1e-6 for every allowed nucleus (3e-8 for R > 5 a, tested), and T falls
//! everywhere.

use std::f64::consts::PI;

use super::Nucleus;

/// Steps of s over a diffuseness.
const STEPS_PER_DIFFUSENESS: f64 = 16.0;
/// The table ends this many diffusenesses beyond the radius; from there on T falls as an exponential.
const TAIL_DIFFUSENESSES: f64 = 60.0;
/// An integrand is followed until it has fallen by exp of minus this.
const NEGLIGIBLE_EXPONENT: f64 = 40.0;
/// c of the substitution over the diffuseness: below it nothing of the profile is left to resolve.
const SMALLEST_LENGTH: f64 = 0.25;
/// Terms below this no longer matter.
const SERIES_END: f64 = 1e-16;
/// u at which z has become negligible: exp(-e^4).
const FIRST_U: f64 = -4.0;

/// The thickness of a nucleus.
#[derive(Clone, Debug)]
pub struct Thickness {
    steps_per_fm: f64,
    /// ln T (T in fm^-2) and its slope times the step at each node.
    nodes: Vec<[f64; 2]>,
}

impl Thickness {
    /// The thickness of a nucleus that passed [`Nucleus::check`].
    pub fn new(nucleus: &Nucleus) -> Thickness {
        let (radius, diffuseness) = (nucleus.radius_fm, nucleus.diffuseness_fm);
        let last_fm = radius + TAIL_DIFFUSENESSES * diffuseness;
        let step_fm = diffuseness / STEPS_PER_DIFFUSENESS;
        let count = (last_fm / step_fm).ceil() as usize + 1;
        let ln_density = -libm::log(volume_fm3(nucleus));
        let node = |place: usize| {
            let [integral, slope] = along_beam(nucleus, place as f64 * step_fm);
            [ln_density + libm::log(integral), step_fm * slope / integral]
        };
        let mut nodes: Vec<[f64; 2]> = (0..count).map(node).collect();
        make_monotonic(&mut nodes);
        Thickness {
            steps_per_fm: 1.0 / step_fm,
            nodes,
        }
    }

    /// ln of T (in fm^-2) at a distance from the centre in fm.
    pub fn ln_at(&self, distance_fm: f64) -> f64 {
        let scaled = distance_fm * self.steps_per_fm;
        let last = self.nodes.len() - 1;
        let place = scaled as usize;
        if place >= last {
            let [end, slope] = self.nodes[last];
            return end + slope * (scaled - last as f64);
        }
        let u = scaled - place as f64;
        let ([from, first], [to, second]) = (self.nodes[place], self.nodes[place + 1]);
        let rise = to - from;
        from + u
            * (first + u * (3.0 * rise - 2.0 * first - second + u * (first + second - 2.0 * rise)))
    }

    /// T in fm^-2 at a distance from the centre in fm.
    pub fn at(&self, distance_fm: f64) -> f64 {
        libm::exp(self.ln_at(distance_fm))
    }
}

/// A falling cubic needs slopes of its ends between 0 and 3 times that of the chord.
fn make_monotonic(nodes: &mut [[f64; 2]]) {
    for place in 0..nodes.len() {
        let mut steepest = f64::NEG_INFINITY;
        if place > 0 {
            steepest = steepest.max(3.0 * (nodes[place][0] - nodes[place - 1][0]));
        }
        if place + 1 < nodes.len() {
            steepest = steepest.max(3.0 * (nodes[place + 1][0] - nodes[place][0]));
        }
        nodes[place][1] = nodes[place][1].clamp(steepest.min(0.0), 0.0);
    }
}

/// int d^3r/(1 + exp((r - R)/a)) in fm^3.
fn volume_fm3(nucleus: &Nucleus) -> f64 {
    let (radius, diffuseness) = (nucleus.radius_fm, nucleus.diffuseness_fm);
    let decay = libm::exp(-radius / diffuseness);
    // An alternating series whose terms fall: the rest is below the first term that is left out.
    let (mut sum, mut power, mut k) = (0.0, decay, 1.0);
    while power > SERIES_END * k * k * k {
        let sign = if k % 2.0 == 1.0 { 1.0 } else { -1.0 };
        sum += sign * power / (k * k * k);
        power *= decay;
        k += 1.0;
    }
    let pi_a = PI * diffuseness;
    4.0 * PI * (radius.powi(3) / 3.0 + pi_a * pi_a * radius / 3.0 + 2.0 * diffuseness.powi(3) * sum)
}

/// int dz/(1 + exp((r - R)/a)) in fm and its derivative in s, r = sqrt(s^2 + z^2).
fn along_beam(nucleus: &Nucleus, s_fm: f64) -> [f64; 2] {
    let (radius, diffuseness) = (nucleus.radius_fm, nucleus.diffuseness_fm);
    // The error of equal steps h is exp(-2 pi d/h), d the distance of the nearest pole.
    let distance = libm::atan2(PI * diffuseness, radius);
    let step = 2.0 * PI * distance / NEGLIGIBLE_EXPONENT;
    let furthest = s_fm.max(radius) + NEGLIGIBLE_EXPONENT * diffuseness;
    let last_z = (furthest * furthest - s_fm * s_fm).sqrt();
    let (mut integral, mut slope) = (0.0, 0.0);
    let mut place = 0;
    loop {
        let u = FIRST_U + f64::from(place) * step;
        let decay = libm::exp(-u);
        let z = SMALLEST_LENGTH * diffuseness * libm::exp(u - decay);
        if z > last_z {
            break;
        }
        let r = libm::hypot(s_fm, z);
        let inverse = libm::exp((r - radius) / diffuseness);
        let density = 1.0 / (1.0 + inverse);
        let width = step * z * (1.0 + decay);
        integral += width * density;
        slope -= width * density * (inverse * density) / diffuseness * (s_fm / r);
        place += 1;
    }
    // Both sides of z = 0.
    [2.0 * integral, 2.0 * slope]
}
