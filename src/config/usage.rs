//! Which keys the chosen kinds use.

use super::keys::{Form, Key, Section};
use super::raw::{Member, Shape};

/// What a key that others depend on is set to.
pub enum Selected {
    /// A valid word.
    Word(&'static str),
    /// A word that a later version will know.
    Planned,
    /// Absent or wrong.
    Unclear,
}

/// Whether the chosen kinds use a key.
#[derive(Clone, Copy, PartialEq, Eq)]
pub enum Use {
    Yes,
    No,
    Unclear,
}

/// What a key that others depend on is set to.
pub fn selected(section: &'static Section, selector: &str, members: &[&Member]) -> Selected {
    let key = section
        .key(selector)
        .expect("a test finds every selector of the table");
    let Form::Choice(choices) = key.form else {
        unreachable!("a test checks that every selector is a choice")
    };
    let written = members.iter().find(|member| member.name == selector);
    let word = match written.map(|member| &member.value.shape) {
        Some(Shape::Text(word)) => word.as_str(),
        Some(_) => return Selected::Unclear,
        None => match key.default_text() {
            Some(text) => text.trim_matches('"'),
            None => return Selected::Unclear,
        },
    };
    match choices.iter().find(|choice| choice.name == word) {
        Some(choice) if choice.built => Selected::Word(choice.name),
        Some(_) => Selected::Planned,
        None => Selected::Unclear,
    }
}

/// Whether the chosen kinds, and the keys beside it, use a key.
pub fn used(section: &'static Section, key: &Key, members: &[&Member]) -> Use {
    let mut usage = Use::Yes;
    if let Some(other) = key.with
        && !is_written(other, members)
    {
        // A misspelt key may be the other one.
        let all_known = members
            .iter()
            .all(|member| section.key(&member.name).is_some());
        if all_known {
            return Use::No;
        }
        usage = Use::Unclear;
    }
    for when in key.when {
        match selected(section, when.key, members) {
            Selected::Word(word) if when.is.contains(&word) => {}
            Selected::Word(_) => return Use::No,
            Selected::Planned | Selected::Unclear => usage = Use::Unclear,
        }
    }
    usage
}

/// Whether a key stands in the file.
pub fn is_written(name: &str, members: &[&Member]) -> bool {
    members.iter().any(|member| member.name == name)
}

/// Whether the section's kind is one that a later version will know.
pub fn has_planned_kind(section: &'static Section, members: &[&Member]) -> bool {
    section.key("kind").is_some() && matches!(selected(section, "kind", members), Selected::Planned)
}

/// The keys that the chosen kinds use.
pub fn usable_keys(section: &'static Section, members: &[&Member]) -> Vec<&'static str> {
    section
        .built_keys()
        .filter(|key| used(section, key, members) != Use::No)
        .map(|key| key.name)
        .collect()
}

/// The same in words.
pub fn usable_keys_words(section: &'static Section, members: &[&Member]) -> String {
    format!("the keys {}", usable_keys(section, members).join(", "))
}
