//! Energy given to the medium: a mean loss dE = int ehat dl with ehat = qhat/(4 T), tied to the diffusion by fluctuation
//! and dissipation (common practice; the classical relation of a diffusing particle's drag to its diffusion).
//!
//! In the rest frame of the fluid a light-like parton shrinks along itself. Its relative loss and dt/E are the same in every
//! frame: per lab length it loses ehat of the fluid at rest, without the flow factor f = p.u/E that qhat carries, and the
//! variance of longitudinal diffusion per lab length is qhat/(2 f), qhat at rest.
//!
//! The loss scales plus momentum and transverse momentum of the parton alike, at fixed virtuality: a massless parton
//! keeps its direction. (Scaling the plus momentum alone would turn partons away from the jet axis.) The energy stays
//! at least max(sqrt(t), `min_energy_GeV`) and a thousandth of what it was, and a parton below that loses nothing. With fluctuations the loss is
//! Gaussian about the mean with that variance, and may be a gain.
//! qhat is the parton's own (C_R/C_A of a gluon's).
//!
//! Regime: many soft kicks, loss small against the energy.

use rand::RngExt;
use rand_distr::OpenClosed01;

use super::path_effect::{Flight, Journey, PathEffect};
use super::{Effect, Model, Physics};
use crate::numerics::elementary::ln;
use crate::parameters::{Form, Key, Values};
use crate::random::Stream;

use std::f64::consts::TAU;

/// The registry's entry.
pub static MODEL: Model = Model {
    kind: "drag",
    about: "energy given to the medium along the path, with ehat = qhat/(4 T)",
    keys: &[Key::default(
        "fluctuations",
        Form::Flag,
        "false",
        "Whether the loss fluctuates about its mean, with the variance of longitudinal diffusion.",
    )],
    describes: &[Physics::EnergyLoss],
    regime: "many soft kicks: loss below half of the energy",
    build,
};

/// A parton that has lost all but this share has stopped: a light-like one without any energy has no direction.
const STOPPED_SHARE: f64 = 1e-3;
/// Losses above this share of the energy are not small.
const LARGEST_SHARE: f64 = 0.5;

fn build(name: String, values: &Values) -> Effect {
    Effect::Path(Box::new(Drag {
        name,
        fluctuations: values.flag("fluctuations"),
    }))
}

/// The effect `drag`.
#[derive(Clone, Debug)]
struct Drag {
    name: String,
    fluctuations: bool,
}

impl PathEffect for Drag {
    fn name(&self) -> &str {
        &self.name
    }

    fn needs_loss(&self) -> bool {
        true
    }

    fn act(&self, journey: &Journey, flight: &mut Flight, stream: &mut Stream) -> bool {
        let mut loss_gev = journey.mean_loss_gev();
        if self.fluctuations {
            loss_gev += journey.loss_variance_gev2().sqrt() * normal(stream);
        }
        let energy_gev = flight.energy_gev();
        // A parton below the least energy loses nothing; a gain is what it is.
        let floor_gev = least_energy_gev(flight, journey.min_energy_gev).min(energy_gev);
        let left_gev = (energy_gev - loss_gev).max(floor_gev);
        if left_gev != energy_gev {
            scale_to_energy(flight, left_gev);
        }
        loss_gev <= LARGEST_SHARE * energy_gev
    }
}

/// What the energy may not fall below, GeV.
fn least_energy_gev(flight: &Flight, min_energy_gev: f64) -> f64 {
    at_rest_gev(flight)
        .max(min_energy_gev)
        .max(STOPPED_SHARE * flight.energy_gev())
}

/// The least energy that a common factor on plus and transverse momentum can reach: sqrt(t) for a parton along the axis.
fn at_rest_gev(flight: &Flight) -> f64 {
    let tilt = 1.0 + flight.transverse2_gev2() / (flight.plus_gev * flight.plus_gev);
    (flight.t_gev2 * tilt).sqrt()
}

/// Scales plus and transverse momentum by a common factor f such that the energy, half of f a + t/(f p+) with
/// a = p+ + q^2/p+, becomes `energy_gev`. Of the two solutions it takes the one on the parton's side of rest: one that
/// moves backwards (a < t/p+) slows down with a larger f.
fn scale_to_energy(flight: &mut Flight, energy_gev: f64) {
    let a = flight.plus_gev + flight.transverse2_gev2() / flight.plus_gev;
    let rest_gev = at_rest_gev(flight);
    let root = ((energy_gev - rest_gev) * (energy_gev + rest_gev))
        .max(0.0)
        .sqrt();
    let moves_forwards = a * flight.plus_gev >= flight.t_gev2;
    let factor = (energy_gev + if moves_forwards { root } else { -root }) / a;
    flight.plus_gev *= factor;
    flight.transverse_gev = flight.transverse_gev.map(|component| component * factor);
}

/// A standard normal number (Box & Muller 1958, Ann. Math. Statist. 29:610).
fn normal(stream: &mut Stream) -> f64 {
    let uniform: f64 = stream.sample(OpenClosed01);
    (-2.0 * ln(uniform)).sqrt() * libm::cos(TAU * stream.random::<f64>())
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The energy comes out as asked, virtuality stays, and a massless parton keeps its direction.
    #[test]
    fn scaling_reaches_the_energy() {
        for (plus_gev, transverse_gev, t_gev2) in [
            (80.0, [3.0, -4.0], 0.0),
            (12.0, [0.5, 0.2], 30.0),
            (200.0, [0.0, 0.0], 900.0),
            (12.0, [1.0, -2.0], 300.0),
        ] {
            let before = Flight {
                plus_gev,
                transverse_gev,
                t_gev2,
            };
            for share in [0.9, 0.99, 1.0, 1.3] {
                let mut flight = before;
                let energy_gev = (share * before.energy_gev()).max(at_rest_gev(&before));
                scale_to_energy(&mut flight, energy_gev);
                assert!((flight.energy_gev() / energy_gev - 1.0).abs() < 1e-12);
                assert_eq!(flight.t_gev2, t_gev2);
                // Nearer to the energy, nearer to where it was: on the same side of rest.
                let change = (flight.plus_gev / before.plus_gev - 1.0).abs();
                assert!(share != 1.0 || change < 1e-7, "{change}");
                let turn = |flight: &Flight| flight.transverse_gev[0] / flight.plus_gev;
                assert!((turn(&flight) - turn(&before)).abs() < 1e-12);
            }
        }
    }
}
