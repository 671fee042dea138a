//! Induced emission by multiple soft scattering (Baier, Dokshitzer, Mueller, Peigne & Schiff 1997, hep-ph/9607355;
//! Zakharov 1997; Salgado & Wiedemann 2003, hep-ph/0302184; from memory, re-derived in [`spectrum`]).
//!
//! The spectrum of a static brick of length L, double differential in energy and transverse momentum, as a change of the
//! splitting rates ([`super::scaled_emission`]), with the gluon's qhat and
//!
//! omega_c = int l qhat dl,   qhat L = 2 omega_c/L,   L the rest of the path in the medium,
//!
//! which is qhat L^2/2 in a brick and the dynamical scaling law in an expanding medium (Salgado & Wiedemann 2002,
//! hep-ph/0204221). Against the direct solution for qhat ~ 1/l from .2 or .6 fm to 2 ... 16 fm the law's spectrum is lower by
//! up to 17 % at omega << omega_c and higher by up to 28 % at omega >> omega_c; the mean loss is exact; 2 omega_c/L lies
//! between 1/2 and 1.2 of int qhat dl (`validation/references/expanding_scaling.json`).
//!
//! It is negative at small kappa for omega above about omega_c/2, and thins the vacuum there.
//!
//! Regime: soft gluons (omega << E), many scatterings (omega < omega_c), small angles (kappa < omega).
//!
//! A branching is placed by the density qhat(l) along the path: the amplitude has no place of its own, and this is where
//! the scatterings are.

pub mod spectrum;
pub mod table;

use std::sync::LazyLock;

use super::bound::{Emission, EmissionLimits, RateBound};
use super::emission_plane::EmissionPlane;
use super::rate_effect::{Passage, RateEffect, Splitting};
use super::scaled_emission::{self, Scales};
use super::{Effect, Model, Physics};
use crate::parameters::Values;
use crate::qcd::HBAR_C_GEV_FM;
use crate::random::Stream;
use table::MultipleSoftTable;

/// The registry's entry.
pub static MODEL: Model = Model {
    kind: "multiple-soft",
    about: "induced emission by many soft scatterings",
    keys: &[],
    describes: &[
        Physics::InducedEmission,
        Physics::UnresolvedEmission,
        Physics::Broadening,
    ],
    regime: "soft gluons (below .3 of the energy) below omega_c = qhat L^2/2",
    build,
};

/// A gluon counts as soft below this fraction of its emitter.
const LARGEST_SOFT_FRACTION: f64 = 0.3;

/// The spectrum and its envelope, computed once: constants of nature, as it were.
static SPECTRUM: LazyLock<(MultipleSoftTable, EmissionPlane)> = LazyLock::new(|| {
    let table = MultipleSoftTable::new();
    let plane = EmissionPlane::new(&table);
    (table, plane)
});

fn build(name: String, _: &Values) -> Effect {
    Effect::Rate(Box::new(MultipleSoft { name }))
}

/// The effect `multiple-soft`.
#[derive(Clone, Debug)]
struct MultipleSoft {
    name: String,
}

/// omega_c and qhat L of the rest of the path.
fn scales(passage: &Passage) -> Scales {
    let path = &passage.trace.path;
    let first_moment = path.first_moment_gev2_fm();
    Scales {
        omega_gev: first_moment / HBAR_C_GEV_FM,
        kappa2_gev2: 2.0 * first_moment / path.end_fm(),
        strength: 1.0,
    }
}

impl RateEffect for MultipleSoft {
    fn name(&self) -> &str {
        &self.name
    }

    fn bound(&self, passage: &Passage) -> RateBound {
        if scales(passage).act() {
            RateBound::Emissions
        } else {
            RateBound::Nothing
        }
    }

    fn propose_emissions(
        &self,
        passage: &Passage,
        limits: &EmissionLimits,
        stream: &mut Stream,
        emissions: &mut Vec<Emission>,
    ) {
        scaled_emission::propose(
            &SPECTRUM.1,
            &scales(passage),
            passage,
            limits,
            stream,
            emissions,
        );
    }

    fn relative_change(&self, passage: &Passage, splitting: &Splitting) -> f64 {
        scaled_emission::relative_change(&SPECTRUM.0, &scales(passage), passage, splitting)
    }

    fn thins_the_vacuum(&self) -> bool {
        true
    }

    fn negative_change(&self, passage: &Passage, splitting: &Splitting) -> f64 {
        let scales = scales(passage);
        if scales.act() {
            scaled_emission::negative_change(&SPECTRUM.0, &scales, passage, splitting)
        } else {
            0.0
        }
    }

    fn vertex_fm(&self, passage: &Passage, _: &Splitting, stream: &mut Stream) -> Option<f64> {
        Some(passage.trace.path.draw_by_qhat(stream))
    }

    fn is_outside_regime(&self, passage: &Passage, splitting: &Splitting) -> bool {
        let fraction = scaled_emission::emitted_fraction(splitting);
        let omega_gev = fraction * passage.energy_gev;
        fraction > LARGEST_SOFT_FRACTION || omega_gev > scales(passage).omega_gev
    }
}
