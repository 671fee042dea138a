//! Effects of the medium: one file a published model, its formula, source, regime, bound and parameters first.
//!
//! A rate effect changes the branching rates along a parton's path; a path effect changes the momentum of a settled
//! parton. [`MODELS`] is the registry: a new effect adds a file and a line there.

pub mod bound;
pub mod broadening;
pub mod collinear_expansion;
pub mod drag;
pub mod emission_plane;
pub mod model;
pub mod multiple_soft;
pub mod path_effect;
pub mod rate_effect;
pub mod resolved_only;
pub mod scaled_emission;
pub mod scaled_table;
pub mod single_hard;
pub mod singular_enhancement;
pub mod virtuality_diffusion;

pub use bound::{Emission, EmissionLimits, PowerLaw, RateBound};
pub use model::{Effect, EffectSettings, Model, Physics};
pub use path_effect::{Flight, Journey, PathEffect};
pub use rate_effect::{Passage, RateEffect, Splitting};

/// Every effect that a config may name.
pub static MODELS: &[&Model] = &[
    &collinear_expansion::MODEL,
    &multiple_soft::MODEL,
    &single_hard::MODEL,
    &singular_enhancement::MODEL,
    &resolved_only::MODEL,
    &broadening::MODEL,
    &drag::MODEL,
    &virtuality_diffusion::MODEL,
];

/// The model of a name.
pub fn model(kind: &str) -> Option<&'static Model> {
    MODELS.iter().find(|model| model.kind == kind).copied()
}

/// Names of the effects' channels: the kind, with a number from the second of the same kind on.
pub fn effect_names(effects: &[EffectSettings]) -> Vec<String> {
    let name = |place: usize| {
        let kind = effects[place].model.kind;
        let earlier = effects[..place]
            .iter()
            .filter(|other| other.model.kind == kind)
            .count();
        if earlier == 0 {
            kind.to_string()
        } else {
            format!("{kind}-{}", earlier + 1)
        }
    };
    (0..effects.len()).map(name).collect()
}
