//! Transverse momentum from many kicks: Gaussian with <k_T^2> = int qhat dl, half in each component (the
//! small-angle limit of multiple scattering; Baier, Dokshitzer, Mueller, Peigne & Schiff 1997, hep-ph/9608322; from
//! memory).
//!
//! It shifts the parton's transverse momentum q in its jet's light-cone frame at fixed plus momentum and virtuality.
//! qhat is the parton's own (C_R/C_A of a gluon's).
//!
//! At fixed plus momentum a kick k raises the energy by (q.k + k^2/2)/p+. A parton that flies straight back along its jet
//! (p+ below a millionth of E, less than vacuum branchings leave) would gain without bound: it is not kicked, and counts as outside the regime.
//!
//! Regime: many soft kicks at small angles, k_T much below the energy; the tail of single hard kicks is not in it.

use rand::RngExt;
use rand_distr::OpenClosed01;

use super::path_effect::{Flight, Journey, PathEffect};
use super::{Effect, Model, Physics};
use crate::numerics::elementary::ln;
use crate::parameters::Values;
use crate::random::Stream;

use std::f64::consts::TAU;

/// The registry's entry.
pub static MODEL: Model = Model {
    kind: "broadening",
    about: "transverse momentum from many soft kicks along the path",
    keys: &[],
    describes: &[Physics::Broadening],
    regime: "many soft kicks at small angles: transverse momentum below half of the energy",
    build,
};

/// Plus momentum over energy below which a parton flies back along its jet.
const BACKWARDS_SHARE: f64 = 1e-6;
/// Kicks above this share of the energy are no small angles.
const LARGEST_SHARE: f64 = 0.5;

fn build(name: String, _: &Values) -> Effect {
    Effect::Path(Box::new(Broadening { name }))
}

/// The effect `broadening`.
#[derive(Clone, Debug)]
struct Broadening {
    name: String,
}

impl PathEffect for Broadening {
    fn name(&self) -> &str {
        &self.name
    }

    fn act(&self, journey: &Journey, flight: &mut Flight, stream: &mut Stream) -> bool {
        let energy_gev = flight.energy_gev();
        if flight.plus_gev < BACKWARDS_SHARE * energy_gev {
            return false;
        }
        let kick_gev = kick(journey.qhat_integral_gev2(), stream);
        for (component, kick) in flight.transverse_gev.iter_mut().zip(kick_gev) {
            *component += kick;
        }
        let [x, y] = kick_gev;
        x * x + y * y <= LARGEST_SHARE * LARGEST_SHARE * energy_gev * energy_gev
    }
}

/// A Gaussian vector in the plane: its square is exponential with the mean `mean_square`.
fn kick(mean_square: f64, stream: &mut Stream) -> [f64; 2] {
    let uniform: f64 = stream.sample(OpenClosed01);
    let size = (-ln(uniform) * mean_square).sqrt();
    let (sin, cos) = libm::sincos(TAU * stream.random::<f64>());
    [size * cos, size * sin]
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::random::{Key, Purpose};

    /// Variances of both components are half the mean square, the fourth moment is that of a Gaussian (3 sigma^4), and
    /// the components are independent: N = 10^6, each pull below 4.9 (two-sided 10^-6); a variance off by 0.7 % would be
    /// seen.
    #[test]
    fn kicks_are_gaussian() {
        const DRAWS: usize = 1_000_000;
        let mean_square = 3.0;
        let mut stream = Key::event(5, 0).stream(Purpose::named("broadening"));
        let (mut second, mut fourth, mut cross) = ([0.0; 2], [0.0; 2], 0.0);
        for _ in 0..DRAWS {
            let draw = kick(mean_square, &mut stream);
            for (place, component) in draw.into_iter().enumerate() {
                second[place] += component * component;
                fourth[place] += component.powi(4);
            }
            cross += draw[0] * draw[1];
        }
        let n = DRAWS as f64;
        let sigma2 = 0.5 * mean_square;
        for place in [0, 1] {
            // Var(x^2) = 2 sigma^4, Var(x^4) = 96 sigma^8.
            let pull = (second[place] / n - sigma2) / (sigma2 * (2.0 / n).sqrt());
            assert!(pull.abs() < 4.9, "{pull}");
            let pull =
                (fourth[place] / n - 3.0 * sigma2 * sigma2) / (sigma2 * sigma2 * (96.0 / n).sqrt());
            assert!(pull.abs() < 4.9, "{pull}");
        }
        let pull = cross / n / (sigma2 / n.sqrt());
        assert!(pull.abs() < 4.9, "{pull}");
    }
}
