//! Induced emission at first order in opacity: a single scattering on a screened Coulomb centre (Gyulassy, Levai & Vitev
//! 2000, nucl-th/0006010; Wiedemann 2000, hep-ph/0005129; from memory, re-derived in [`spectrum`]).
//!
//! The spectrum of a static brick of length L, double differential in energy and transverse momentum, as a change of the
//! splitting rates ([`super::scaled_emission`]). A gluon scatters n0 times per length, on centres with the screening mass
//! mu. By `centres`:
//!
//! - `transport`: n0 L = I0/mu^2 with I0 = int qhat dl of a gluon (qhat = n0 mu^2 but for the logarithm of the tail), and
//!   mu = m_D(T) = T sqrt(4 pi alpha_s (1 + n_f/6)) at the temperature T = int qhat dl / int (qhat/T) dl;
//! - `given`: n0 and mu as numbers, n0 per length of the path inside the medium.
//!
//! Expanding media enter through I0 and the length of the path alone. It can be negative at small kappa, and thins the
//! vacuum there.
//!
//! Regime: soft gluons (omega << E), opacity of order 1 or less, small angles (kappa < omega).
//!
//! A branching is placed by the density qhat(l) along the path, where the scattering centres are.

pub mod spectrum;
pub mod table;

use std::sync::LazyLock;

use super::bound::{Emission, EmissionLimits, RateBound};
use super::emission_plane::EmissionPlane;
use super::rate_effect::{Passage, RateEffect, Splitting};
use super::scaled_emission::{self, Scales};
use super::{Effect, Model, Physics};
use crate::medium::transport::debye_mass_gev;
use crate::parameters::{Choice, Form, Key, Range, Values, When};
use crate::qcd::HBAR_C_GEV_FM;
use crate::random::Stream;
use table::SingleHardTable;

/// Far beyond the density of centres of any medium, per fm.
const LARGEST_DENSITY_PER_FM: f64 = 100.0;
/// Far beyond the screening mass of any medium.
const LARGEST_MASS_GEV: f64 = 10.0;
/// Light flavours of a medium.
const MOST_FLAVOURS: u64 = 6;

const TRANSPORT: &[When] = &[When {
    key: "centres",
    is: &["transport"],
}];
const GIVEN: &[When] = &[When {
    key: "centres",
    is: &["given"],
}];

/// The registry's entry.
pub static MODEL: Model = Model {
    kind: "single-hard",
    about: "induced emission by a single hard scattering (first order in opacity)",
    keys: &[
        Key::default(
            "centres",
            Form::Choice(&[
                Choice::built(
                    "transport",
                    "from qhat, and the Debye mass at the medium's temperature",
                ),
                Choice::built("given", "as numbers"),
            ]),
            "\"transport\"",
            "Where density and screening mass of the scattering centres come from.",
        ),
        Key::default(
            "alpha_s",
            Form::Number(Range::between(0.0, 1.0)),
            "0.3",
            "Coupling of the medium in the Debye mass.",
        )
        .when(TRANSPORT),
        Key::default(
            "flavours",
            Form::Count(0, MOST_FLAVOURS),
            "3",
            "Number of light flavours of the medium in the Debye mass.",
        )
        .when(TRANSPORT),
        Key::required(
            "opacity_per_fm",
            Form::Number(Range::from(0.0, LARGEST_DENSITY_PER_FM)),
            "Scatterings of a gluon per length of its path.",
        )
        .unit("1/fm")
        .when(GIVEN),
        Key::required(
            "debye_mass_GeV",
            Form::Number(Range::above(0.0, LARGEST_MASS_GEV)),
            "Screening mass of the scattering centres.",
        )
        .unit("GeV")
        .when(GIVEN),
    ],
    describes: &[Physics::InducedEmission, Physics::UnresolvedEmission],
    regime: "soft gluons (below .3 of the energy), opacity below 1",
    build,
};

/// A gluon counts as soft below this fraction of its emitter.
const LARGEST_SOFT_FRACTION: f64 = 0.3;
/// One scattering describes media up to this opacity.
const LARGEST_OPACITY: f64 = 1.0;

/// The spectrum and its envelope, computed once.
static SPECTRUM: LazyLock<(SingleHardTable, EmissionPlane)> = LazyLock::new(|| {
    let table = SingleHardTable::new();
    let plane = EmissionPlane::new(&table);
    (table, plane)
});

fn build(name: String, values: &Values) -> Effect {
    let centres = match values.word("centres") {
        "transport" => Centres::Transport {
            alpha_s: values.number("alpha_s"),
            flavours: values.number("flavours") as u8,
        },
        _ => Centres::Given {
            opacity_per_fm: values.number("opacity_per_fm"),
            debye_mass_gev: values.number("debye_mass_GeV"),
        },
    };
    Effect::Rate(Box::new(SingleHard { name, centres }))
}

/// The effect `single-hard`.
#[derive(Clone, Debug)]
struct SingleHard {
    name: String,
    centres: Centres,
}

#[derive(Clone, Copy, Debug)]
enum Centres {
    Transport {
        alpha_s: f64,
        flavours: u8,
    },
    Given {
        opacity_per_fm: f64,
        debye_mass_gev: f64,
    },
}

impl SingleHard {
    fn scales(&self, passage: &Passage) -> Scales {
        let path = &passage.trace.path;
        let (opacity, mass_gev) = match self.centres {
            Centres::Transport { alpha_s, flavours } => {
                let integral_gev2 = path.qhat_integral_gev2();
                let temperature_gev = integral_gev2 / passage.trace.qhat_over_temperature_gev;
                let mass_gev = debye_mass_gev(temperature_gev, alpha_s, flavours);
                (integral_gev2 / (mass_gev * mass_gev), mass_gev)
            }
            Centres::Given {
                opacity_per_fm,
                debye_mass_gev,
            } => (
                opacity_per_fm * (path.end_fm() - path.start_fm()),
                debye_mass_gev,
            ),
        };
        let mass2_gev2 = mass_gev * mass_gev;
        Scales {
            omega_gev: mass2_gev2 * path.end_fm() / (2.0 * HBAR_C_GEV_FM),
            kappa2_gev2: mass2_gev2,
            strength: opacity,
        }
    }
}

impl RateEffect for SingleHard {
    fn name(&self) -> &str {
        &self.name
    }

    fn needs_loss(&self) -> bool {
        matches!(self.centres, Centres::Transport { .. })
    }

    fn bound(&self, passage: &Passage) -> RateBound {
        if self.scales(passage).act() {
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
        let scales = self.scales(passage);
        scaled_emission::propose(&SPECTRUM.1, &scales, passage, limits, stream, emissions);
    }

    fn relative_change(&self, passage: &Passage, splitting: &Splitting) -> f64 {
        scaled_emission::relative_change(&SPECTRUM.0, &self.scales(passage), passage, splitting)
    }

    fn thins_the_vacuum(&self) -> bool {
        true
    }

    fn negative_change(&self, passage: &Passage, splitting: &Splitting) -> f64 {
        let scales = self.scales(passage);
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
        fraction > LARGEST_SOFT_FRACTION || self.scales(passage).strength > LARGEST_OPACITY
    }
}
