//! Vacuum emissions that the medium does not resolve are vetoed (Mehtar-Tani, Salgado & Tywoniuk 2010-2012,
//! arXiv:1009.2965 and 1205.5739; Caucal, Iancu, Mueller & Soyez 2018, arXiv:1801.09703; from memory).
//!
//! A vacuum emission of a parton that was born inside is vetoed if
//!
//! sqrt(2 omega/qhat) < tau_f < L,   omega = min(z, 1-z) E,   tau_f = 2 E/t,
//!
//! qhat being a gluon's at the place of birth and L the rest of the path in the medium: it would form inside, but later
//! than the medium gives it more transverse momentum than it has. A parton that is born before its path meets the medium
//! (before the first proper time of the field, say) is judged too, with the mean that a brick of its path would have,
//! qhat = 2 int l qhat dl/L^2: else the primary, and most of its early daughters, would never be. With `angular` ordering, an emission that forms
//! outside (tau_f > L) is not bound by the angle of its parent's branching if that branching lay inside and was wider than
//! theta_c = 2/sqrt(qhat L^3): the medium has destroyed the coherence of the two.
//!
//! Regime: double logarithms, at large numbers of colours; L much larger than sqrt(2 omega/qhat). It only removes
//! vacuum emissions, so it needs no envelope; induced ones are the business of another effect.

use super::rate_effect::{Passage, RateEffect, Splitting};
use super::{Effect, Model, Physics, RateBound};
use crate::parameters::Values;
use crate::qcd::HBAR_C_GEV_FM;

/// The registry's entry.
pub static MODEL: Model = Model {
    kind: "resolved-only",
    about: "vacuum emissions that would form inside the medium but later than it resolves them are vetoed",
    keys: &[],
    describes: &[Physics::UnresolvedEmission],
    regime: "double logarithms: emissions much softer than their parent",
    build,
};

/// A vacuum emission counts as soft below this fraction of its parent.
const LARGEST_SOFT_FRACTION: f64 = 0.3;

fn build(name: String, _: &Values) -> Effect {
    Effect::Rate(Box::new(ResolvedOnly { name }))
}

/// The effect `resolved-only`.
#[derive(Clone, Debug)]
struct ResolvedOnly {
    name: String,
}

/// qhat (GeV^2/fm) and the rest of the path (fm) of a parton whose path meets the medium.
fn inside(passage: &Passage) -> Option<(f64, f64)> {
    let path = &passage.trace.path;
    let rest_fm = path.end_fm();
    let at_birth = path.qhat_gev2_per_fm(0.0);
    let qhat = if at_birth > 0.0 {
        at_birth
    } else {
        2.0 * path.first_moment_gev2_fm() / (rest_fm * rest_fm)
    };
    (qhat > 0.0).then_some((qhat, rest_fm))
}

fn formation_fm(passage: &Passage, t_gev2: f64) -> f64 {
    2.0 * passage.energy_gev / t_gev2 * HBAR_C_GEV_FM
}

impl RateEffect for ResolvedOnly {
    fn name(&self) -> &str {
        &self.name
    }

    fn bound(&self, _: &Passage) -> RateBound {
        RateBound::Nothing
    }

    fn relative_change(&self, _: &Passage, _: &Splitting) -> f64 {
        0.0
    }

    fn only_vetoes(&self) -> bool {
        true
    }

    fn thins_the_vacuum(&self) -> bool {
        true
    }

    fn vacuum_factor(&self, passage: &Passage, splitting: &Splitting) -> f64 {
        let Some((qhat, rest_fm)) = inside(passage) else {
            return 1.0;
        };
        let Splitting { t_gev2, z, .. } = *splitting;
        let formation_fm = formation_fm(passage, t_gev2);
        let omega_gev = z.min(1.0 - z) * passage.energy_gev;
        let broadened = qhat * formation_fm * formation_fm > 2.0 * omega_gev * HBAR_C_GEV_FM;
        if broadened && formation_fm < rest_fm {
            0.0
        } else {
            1.0
        }
    }

    fn lifts_angular_order(
        &self,
        passage: &Passage,
        splitting: &Splitting,
        birth_angle2: f64,
    ) -> bool {
        let Some((qhat, rest_fm)) = inside(passage) else {
            return false;
        };
        // theta_c^2 = 4/(qhat L^3), with lengths in inverse energies.
        let critical_angle2 =
            4.0 * HBAR_C_GEV_FM * HBAR_C_GEV_FM / (qhat * rest_fm * rest_fm * rest_fm);
        formation_fm(passage, splitting.t_gev2) > rest_fm && birth_angle2 > critical_angle2
    }

    /// Told of vacuum emissions inside, which this effect judges.
    fn is_outside_regime(&self, _: &Passage, splitting: &Splitting) -> bool {
        splitting.z.min(1.0 - splitting.z) > LARGEST_SOFT_FRACTION
    }
}
