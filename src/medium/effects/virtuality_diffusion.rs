//! Virtuality from the medium (Renk 2008, arXiv:0806.0305; from memory).
//!
//! A parton that branches at t gains dt = int qhat dl over its lifetime: its daughters start from z (t + dt) and
//! (1-z)(t + dt). Plus momentum, transverse momentum and the constraint that its own branching had to obey keep their
//! values; a final parton gains nothing. qhat is the parton's own (C_R/C_A of a gluon's).
//!
//! Regime: dt of the order of t or less. It makes more branchings by itself, so it describes the same physics as the
//! effects that induce emissions.

use super::path_effect::{Flight, Journey, PathEffect};
use super::{Effect, Model, Physics};
use crate::parameters::Values;
use crate::random::Stream;

/// The registry's entry.
pub static MODEL: Model = Model {
    kind: "virtuality-diffusion",
    about: "virtuality that a branching parton gains along its path",
    keys: &[],
    describes: &[Physics::InducedEmission],
    regime: "a gain below the parton's own virtuality squared",
    build,
};

fn build(name: String, _: &Values) -> Effect {
    Effect::Path(Box::new(VirtualityDiffusion { name }))
}

/// The effect `virtuality-diffusion`.
#[derive(Clone, Debug)]
struct VirtualityDiffusion {
    name: String,
}

impl PathEffect for VirtualityDiffusion {
    fn name(&self) -> &str {
        &self.name
    }

    fn act(&self, journey: &Journey, flight: &mut Flight, _: &mut Stream) -> bool {
        if journey.is_final {
            return true;
        }
        let gain_gev2 = journey.qhat_integral_gev2();
        let is_moderate = gain_gev2 <= flight.t_gev2;
        flight.t_gev2 += gain_gev2;
        is_moderate
    }
}
