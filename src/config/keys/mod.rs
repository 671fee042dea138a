//! The table of keys: [`table`] and [`medium`] hold the entries.

mod medium;
mod table;

pub use crate::parameters::{Choice, Form, Key, Length, Need, Range, Section, When};
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
            let expected = [("_GeV2_per_fm", "GeV^2/fm"), ("_GeV", "GeV"), ("_fm", "fm")]
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
            // The schema states the need of a conditional key under its one selector.
            if key.need == Need::Required {
                assert!(key.when.len() <= 1, "{path} {}", key.name);
            }
        });
    }
}
