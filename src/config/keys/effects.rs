//! The entries of the table: the effects, put together from what each model of the registry says of itself.

use std::sync::LazyLock;

use super::{Choice, Form, Key, Section, When};
use crate::medium::effects::{MODELS, Model};

/// The section of an effect: made once, and kept.
pub fn effect() -> &'static Section {
    static EFFECT: LazyLock<Section> = LazyLock::new(|| Section {
        about: "One model of what the medium does.",
        keys: effect_keys(MODELS).leak(),
    });
    &EFFECT
}

fn effect_keys(models: &[&'static Model]) -> Vec<Key> {
    let choices = models
        .iter()
        .map(|model| Choice::built(model.kind, model.about));
    let choices: Vec<Choice> = choices.collect();
    let kind = Form::Choice(choices.leak());
    let mut keys = vec![Key::required("kind", kind, "Which model.")];
    for (place, model) in models.iter().enumerate() {
        for key in model.keys {
            if !models[..place]
                .iter()
                .any(|other| key_of(other, key.name).is_some())
            {
                keys.push(shared(key, models));
            }
        }
    }
    keys
}

fn key_of(model: &Model, name: &str) -> Option<&'static Key> {
    model.keys.iter().find(|key| key.name == name)
}

/// A parameter is used with the kinds of the models that have it.
fn shared(key: &Key, models: &[&'static Model]) -> Key {
    let owners: Vec<_> = models
        .iter()
        .filter(|model| key_of(model, key.name).is_some())
        .map(|model| model.kind)
        .collect();
    let kind = When {
        key: "kind",
        is: owners.leak(),
    };
    let when: Vec<When> = std::iter::once(kind)
        .chain(key.when.iter().copied())
        .collect();
    key.when(when.leak())
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A name stands in the config for one thing: models that share a parameter agree on all of it.
    #[test]
    fn models_that_share_a_parameter_agree_on_it() {
        for model in MODELS {
            for key in model.keys {
                for other in MODELS.iter().filter_map(|other| key_of(other, key.name)) {
                    let facts =
                        |key: &Key| format!("{:?}", (key.form, key.unit, key.need, key.when));
                    assert_eq!(facts(key), facts(other), "{} {}", model.kind, key.name);
                }
            }
        }
    }
}
