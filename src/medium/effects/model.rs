//! What a model says of itself: its name, parameters, the physics that it describes, and how it is built.

use super::{PathEffect, RateEffect};
use crate::parameters::{Key, Need, Setting, Values};

/// A published model of what the medium does.
pub struct Model {
    /// Its kind in a config.
    pub kind: &'static str,
    /// What it does, in a line.
    pub about: &'static str,
    /// Its parameters.
    pub keys: &'static [Key],
    /// What it describes; two models of the same physics count it twice.
    pub describes: &'static [Physics],
    /// Where it holds, and when to use it: told where a run leaves the regime.
    pub regime: &'static str,
    /// The effect under a name that is unique in the run.
    pub build: fn(name: String, values: &Values) -> Effect,
}

/// A piece of physics that a model describes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Physics {
    /// More branchings than in vacuum.
    InducedEmission,
    /// Emissions that the medium does not resolve.
    UnresolvedEmission,
    /// Transverse momentum from many kicks.
    Broadening,
    /// Energy given to the medium.
    EnergyLoss,
}

impl Physics {
    /// In words.
    pub fn words(self) -> &'static str {
        match self {
            Physics::InducedEmission => "branchings that the medium induces",
            Physics::UnresolvedEmission => "emissions that the medium does not resolve",
            Physics::Broadening => "transverse momentum from the medium",
            Physics::EnergyLoss => "energy given to the medium",
        }
    }
}

/// A built effect.
pub enum Effect {
    /// It changes branching rates.
    Rate(Box<dyn RateEffect>),
    /// It changes the momenta of settled partons.
    Path(Box<dyn PathEffect>),
}

/// One effect of a medium: a model with its numbers.
#[derive(Clone)]
pub struct EffectSettings {
    /// The model.
    pub model: &'static Model,
    /// Its checked parameters.
    pub values: Values,
}

impl EffectSettings {
    /// A model with some of its parameters given and the defaults for the others.
    ///
    /// # Panics
    /// Where a default is no number, flag or word, which a test of the registry excludes.
    pub fn new(model: &'static Model, given: &[(&'static str, Setting)]) -> EffectSettings {
        let mut values = Values::default();
        for key in model.keys {
            if let Need::Default(text) = key.need {
                values.set(key.name, default(text));
            }
        }
        for (name, setting) in given {
            values.set(name, setting.clone());
        }
        EffectSettings { model, values }
    }
}

fn default(text: &'static str) -> Setting {
    match text {
        "true" => Setting::Flag(true),
        "false" => Setting::Flag(false),
        _ if text.starts_with('"') => Setting::Word(text.trim_matches('"')),
        _ => Setting::Number(
            text.parse()
                .expect("a default is a number, a flag or a word"),
        ),
    }
}

impl PartialEq for EffectSettings {
    fn eq(&self, other: &Self) -> bool {
        self.model.kind == other.model.kind && self.values == other.values
    }
}

impl std::fmt::Debug for EffectSettings {
    fn fmt(&self, out: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(out, "{} {:?}", self.model.kind, self.values)
    }
}

#[cfg(test)]
mod tests {
    use super::super::MODELS;
    use super::*;

    /// Kinds are unique, and every default can be taken without a config.
    #[test]
    fn the_registry_is_sound() {
        for (place, model) in MODELS.iter().enumerate() {
            assert!(MODELS[..place].iter().all(|other| other.kind != model.kind));
            assert!(
                model.about.len() > 10 && model.regime.len() > 10,
                "{}",
                model.kind
            );
            assert!(!model.describes.is_empty(), "{}", model.kind);
            EffectSettings::new(model, &[]);
        }
    }
}
