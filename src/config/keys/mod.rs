//! The table of keys: [`table`], [`medium`] and what belongs to it hold the entries.

mod effects;
mod field;
mod medium;
mod origin;
mod table;
mod transport;

pub use crate::parameters::{Choice, Form, Key, Length, Need, Range, Section, When};
pub use field::HOTTEST_GEV;
pub use origin::CUSTOM;
pub use table::CONFIG;

/// Every section with its path, and every key in it, from the root down.
pub fn walk(visit: &mut impl FnMut(&str, &'static Section)) {
    fn descend(
        path: &str,
        section: &'static Section,
        visit: &mut impl FnMut(&str, &'static Section),
    ) {
        visit(path, section);
        for key in section.keys {
            if let Some(inner) = key.form.section() {
                let list = if matches!(key.form, Form::List(..)) {
                    "[]"
                } else {
                    ""
                };
                descend(&join(path, &format!("{}{list}", key.name)), inner, visit);
            }
        }
    }
    descend("", &CONFIG, visit);
}

/// The path of a key in a section.
pub fn join(section: &str, key: &str) -> String {
    if section.is_empty() {
        key.to_owned()
    } else {
        format!("{section}.{key}")
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn every_key(mut visit: impl FnMut(&str, &'static Section, &'static Key)) {
        walk(&mut |path, section| {
            for key in section.keys {
                visit(path, section, key);
            }
        });
    }

    #[test]
    fn every_key_and_choice_is_documented() {
        every_key(|path, section, key| {
            let name = join(path, key.name);
            assert!(!section.about.is_empty(), "{path}");
            assert!(
                key.about.len() > 10 && key.about.ends_with('.'),
                "{name}: {:?}",
                key.about
            );
            if let Form::Choice(choices) = key.form {
                for choice in choices {
                    assert!(choice.about.len() > 5, "{name} {}", choice.name);
                }
            }
        });
    }

    #[test]
    fn names_are_unique_and_units_agree_with_them() {
        every_key(|path, section, key| {
            let name = join(path, key.name);
            let same = section.keys.iter().filter(|other| other.name == key.name);
            assert_eq!(same.count(), 1, "{name}");
            let endings = [
                ("_GeV2_per_fm", "GeV^2/fm"),
                ("_per_GeV2", "GeV^-2"),
                ("_per_fm", "1/fm"),
                ("_GeV", "GeV"),
                ("_fm", "fm"),
                ("_rad", "rad"),
            ];
            let expected = endings
                .into_iter()
                .find(|(ending, _)| key.name.ends_with(ending))
                .map(|(_, unit)| unit);
            if key.built {
                assert_eq!(key.unit, expected, "{name}");
            }
        });
    }

    #[test]
    fn conditions_name_choices_of_the_same_section() {
        every_key(|path, section, key| {
            for when in key.when {
                let selector = section.key(when.key).expect("the selector exists");
                let Form::Choice(choices) = selector.form else {
                    panic!("{path}: {} is no choice", when.key)
                };
                for word in when.is {
                    assert!(
                        choices.iter().any(|choice| choice.name == *word),
                        "{path} {word}"
                    );
                }
            }
            let names = |name: &str| section.key(name).filter(|key| key.built);
            if let Some(other) = key.with {
                assert!(names(other).is_some(), "{path} {}", key.name);
            }
            // Two keys of which one must be there name each other, and the same choices use them.
            if let Need::Either(other) = key.need {
                let other = names(other).expect("the other key exists");
                assert_eq!(other.need, Need::Either(key.name), "{path} {}", key.name);
                let facts = |key: &Key| format!("{:?}", (key.when, key.with));
                assert_eq!(facts(key), facts(other), "{path} {}", key.name);
            }
        });
    }
}
