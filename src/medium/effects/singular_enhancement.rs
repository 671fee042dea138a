//! The soft-singular part of each kernel enhanced by 1 + f (Borghini & Wiedemann 2005, hep-ph/0506218; from memory).
//!
//! D = f alpha_s/(2 pi) P_s(z),   P_s = 2 C_F/(1-z) for q -> q g,   C_A [1/z + 1/(1-z)] for g -> g g (with its 1/2),
//!
//! with f constant for partons whose path meets the medium, or f = slope * I0, I0 = int qhat dl of a gluon in GeV^2.
//!
//! Regime: a parametrisation, without phases or formation times; f of order 1. In the literature it acts over the whole
//! phase space of the vacuum shower, that is with `limit_to_small_angles` false.
//!
//! Bound: P_s/P = 2/(1 + z^2) <= 2 for quarks and (1 - z(1-z))^-2 <= 16/9 for gluons, so R <= 2 f.

use super::rate_effect::{Passage, RateEffect, Splitting};
use super::{Effect, Model, Physics, RateBound};
use crate::parameters::{Choice, Form, Key, Range, Values, When};
use crate::random::Stream;

/// Above this enhancement a first-order change of the kernel makes no sense.
const LARGEST_FACTOR: f64 = 100.0;
/// f above which a branching counts as outside the regime: the medium's part outweighs the vacuum's several times.
const LARGEST_SENSIBLE_FACTOR: f64 = 4.0;

const CONSTANT: &[When] = &[When {
    key: "law",
    is: &["constant"],
}];
const ALONG_PATH: &[When] = &[When {
    key: "law",
    is: &["path"],
}];

/// The registry's entry.
pub static MODEL: Model = Model {
    kind: "singular-enhancement",
    about: "the soft-singular part of each kernel enhanced by 1 + f",
    keys: &[
        Key::default(
            "law",
            Form::Choice(&[
                Choice::built(
                    "constant",
                    "f is the same for every parton that meets the medium",
                ),
                Choice::built("path", "f grows with the path integral of qhat"),
            ]),
            "\"constant\"",
            "How f follows from the path.",
        ),
        Key::required(
            "factor",
            Form::Number(Range::from(0.0, LARGEST_FACTOR)),
            "f, the enhancement of the soft-singular part over the vacuum's.",
        )
        .when(CONSTANT),
        Key::required(
            "slope_per_GeV2",
            Form::Number(Range::from(0.0, LARGEST_FACTOR)),
            "f over the path integral of a gluon's qhat.",
        )
        .unit("GeV^-2")
        .when(ALONG_PATH),
    ],
    describes: &[Physics::InducedEmission],
    regime: "a parametrisation without formation times, for f of order 1 (at most 4)",
    build,
};

fn build(name: String, values: &Values) -> Effect {
    let law = match values.word("law") {
        "constant" => Law::Constant(values.number("factor")),
        _ => Law::Slope(values.number("slope_per_GeV2")),
    };
    Effect::Rate(Box::new(SingularEnhancement { name, law }))
}

/// The effect `singular-enhancement`.
#[derive(Clone, Debug)]
struct SingularEnhancement {
    name: String,
    law: Law,
}

#[derive(Clone, Copy, Debug)]
enum Law {
    Constant(f64),
    Slope(f64),
}

impl SingularEnhancement {
    fn factor(&self, passage: &Passage) -> f64 {
        match self.law {
            Law::Constant(factor) => factor,
            Law::Slope(slope) => slope * passage.trace.path.qhat_integral_gev2(),
        }
    }
}

/// P_s/P.
fn singular_share(is_gluon: bool, z: f64) -> f64 {
    if is_gluon {
        let regular = 1.0 - z * (1.0 - z);
        1.0 / (regular * regular)
    } else {
        2.0 / (1.0 + z * z)
    }
}

impl RateEffect for SingularEnhancement {
    fn name(&self) -> &str {
        &self.name
    }

    fn bound(&self, passage: &Passage) -> RateBound {
        RateBound::TimesVacuum(2.0 * self.factor(passage))
    }

    fn relative_change(&self, passage: &Passage, splitting: &Splitting) -> f64 {
        self.factor(passage) * singular_share(passage.species.is_gluon(), splitting.z)
    }

    fn vertex_fm(&self, _: &Passage, _: &Splitting, _: &mut Stream) -> Option<f64> {
        None
    }

    fn is_outside_regime(&self, passage: &Passage, _: &Splitting) -> bool {
        self.factor(passage) > LARGEST_SENSIBLE_FACTOR
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::qcd::kernels::{gluon_to_gluons, quark_to_quark_gluon};
    use crate::qcd::{C_A, C_F};

    /// The share is the singular part over the kernel, between 1 and 2, and 1 in the soft limit.
    #[test]
    fn the_singular_part_is_a_share_of_the_kernel() {
        for step in 1..1000 {
            let z = f64::from(step) / 1000.0;
            let quark = 2.0 * C_F / (1.0 - z) / quark_to_quark_gluon(z);
            let gluon = C_A * (1.0 / z + 1.0 / (1.0 - z)) / gluon_to_gluons(z);
            assert!((singular_share(false, z) / quark - 1.0).abs() < 1e-12);
            assert!((singular_share(true, z) / gluon - 1.0).abs() < 1e-12);
            assert!(singular_share(false, z) <= 2.0 && singular_share(true, z) <= 2.0);
        }
        let soft = 1.0 - 1e-9;
        assert!((singular_share(false, soft) - 1.0).abs() < 1e-8);
        assert!((singular_share(true, soft) - 1.0).abs() < 1e-8);
    }
}
