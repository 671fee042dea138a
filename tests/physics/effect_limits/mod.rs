//! Proves: each effect on rates has the limits that its formula has, as the engine itself evaluates it.
//!
//! Deterministic, R = D/f_vac as the effect states it on a traced path of a brick (the mean over places and images):
//! - `collinear-expansion`: S(X) = +-X^3/3 for a short path, 2 qhat L/(z(1-z) t) for a long one (interference), nothing
//!   more beyond the window (rescattering);
//! - `singular-enhancement`: f for a soft gluon, whatever t; linear in L and qhat along the path;
//! - `multiple-soft`: integrated over kappa^2 the spectrum ln|cos((1+i) sqrt(omega_c/(2 omega)))| (Baier, Dokshitzer,
//!   Mueller, Peigne & Schiff 1997, hep-ph/9607355), its thin and thick limits, and in an expanding medium the brick of the
//!   same omega_c and length;
//! - `single-hard`: integrated over kappa^2 n0 L gamma int dr (r - sin r)/(r^2 (r + gamma)) (from memory of Salgado &
//!   Wiedemann 2003, hep-ph/0302184), linear in the opacity, `transport` the same as `given` with qhat/mu^2 and mu = m_D;
//! - `resolved-only`: vetoes nothing for L -> 0, everything soft that forms inside, more with qhat;
//! - all: R(z) = R(1-z) for gluons, R -> 0 with the medium.
//!
//! Statistical (10^-6 each): fractions of induced g -> g g are symmetric (binomial and two-sample Kolmogorov-Smirnov, 5
//! effects, 10 checks; smallest visible bias 3 %); induced branchings of the spectra happen where qhat is, in a brick and in
//! longitudinal expansion, those of the enhancement after an exponential lifetime (Kolmogorov-Smirnov, 5 checks).
//!
//! See `formulas`, `spectra` and `sampled`.

mod formulas;
mod sampled;
mod spectra;

use std::sync::Arc;

use spindrift::medium::Medium;
use spindrift::medium::effects::{EffectSettings, Passage, RateEffect, Splitting};
use spindrift::medium::field::{Brick, Ray};
use spindrift::medium::trace::Trace;
use spindrift::qcd::Species;

use super::support::setup::brick_with;

const TEMPERATURE_GEV: f64 = 0.3;
const ACROSS: Ray = Ray {
    birth_fm: [0.0; 4],
    direction: [1.0, 0.0, 0.0],
};

/// An effect on a traced path.
struct Traced {
    medium: Medium,
    trace: Trace,
}

impl Traced {
    fn brick(effect: &EffectSettings, length_fm: f64, qhat: f64) -> Traced {
        let settings = brick_with(length_fm, qhat, vec![effect.clone()]);
        Traced::new(Medium::new(
            &settings,
            Arc::new(Brick::new(TEMPERATURE_GEV, length_fm)),
        ))
    }

    fn new(medium: Medium) -> Traced {
        let mut trace = Trace::default();
        medium.trace(medium.field(), &ACROSS, 100.0, &mut trace);
        Traced { medium, trace }
    }

    fn ask<R>(
        &self,
        species: Species,
        energy_gev: f64,
        question: impl Fn(&dyn RateEffect, &Passage) -> R,
    ) -> R {
        let passage = Passage {
            species,
            energy_gev,
            trace: &self.trace,
            medium: &self.medium,
            field: self.medium.field(),
        };
        question(&*self.medium.rates()[0].effect, &passage)
    }

    /// R: of both gluons, where either may be the emitted one.
    fn change(&self, species: Species, energy_gev: f64, t: f64, z: f64, images: bool) -> f64 {
        self.ask(species, energy_gev, |effect, passage| {
            let of = |emits_first| {
                let splitting = Splitting {
                    t_gev2: t,
                    z,
                    place_fm: 0.0,
                    emits_first,
                };
                effect.relative_change(passage, &splitting)
            };
            if images && species.is_gluon() {
                of(false) + of(true)
            } else {
                of(false)
            }
        })
    }

    fn vacuum_factor(&self, energy_gev: f64, t: f64, z: f64) -> f64 {
        self.ask(Species::GLUON, energy_gev, |effect, passage| {
            let splitting = Splitting {
                t_gev2: t,
                z,
                place_fm: 0.0,
                emits_first: false,
            };
            effect.vacuum_factor(passage, &splitting)
        })
    }
}
