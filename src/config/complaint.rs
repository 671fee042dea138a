//! Complaints: what an error says besides its place.

use super::error::{Problem, quote};
use super::keys::{self, Form, Key, Section};
use super::nearest::nearest;
use super::raw::{Member, Node, Shape};
use super::usage::{Selected, is_written, selected, usable_keys, usable_keys_words};

/// A key that stands in more sections than this is no hint where it belongs.
const MOST_HOMES: usize = 2;

/// What goes into an error besides its place.
pub struct Complaint {
    /// What kind of error it is.
    pub problem: Problem,
    /// What was found.
    pub found: String,
    /// What is allowed.
    pub allowed: String,
    /// What to do about it.
    pub remedy: String,
    /// The nearest valid word.
    pub nearest: Option<String>,
}

impl Complaint {
    /// A complaint without a suggestion.
    pub fn new(
        problem: Problem,
        found: String,
        allowed: String,
        remedy: impl Into<String>,
    ) -> Self {
        Complaint {
            problem,
            found,
            allowed,
            remedy: remedy.into(),
            nearest: None,
        }
    }

    /// With the word that was probably meant, if there is one.
    pub fn nearest(self, nearest: Option<&str>) -> Self {
        Complaint {
            remedy: nearest.map_or(self.remedy, |word| format!("did you mean \"{word}\"?")),
            nearest: nearest.map(str::to_owned),
            ..self
        }
    }
}

/// No such key in this section.
pub fn unknown_key(section: &'static Section, members: &[&Member], name: &str) -> Complaint {
    let usable = usable_keys(section, members);
    let near =
        nearest(name, usable).or_else(|| nearest(name, section.built_keys().map(|key| key.name)));
    let complaint = Complaint::new(
        Problem::UnknownKey,
        format!("\"{}\"", quote(name)),
        usable_keys_words(section, members),
        "remove it",
    );
    match homes(name).as_slice() {
        homes @ [_, ..] if near.is_none() && homes.len() <= MOST_HOMES => Complaint {
            remedy: format!("move it to {}", homes.join(" or ")),
            ..complaint
        },
        _ => complaint.nearest(near),
    }
}

/// The sections that have a key of this name.
fn homes(name: &str) -> Vec<String> {
    let mut homes = Vec::new();
    keys::walk(&mut |path, section| {
        if section.key(name).is_some_and(|key| key.built) {
            homes.push(if path.is_empty() {
                "the top level".to_owned()
            } else {
                path.to_owned()
            });
        }
    });
    homes
}

/// A key that a later version will know.
pub fn planned_key(section: &'static Section, key: &Key, members: &[&Member]) -> Complaint {
    Complaint::new(
        Problem::Planned,
        format!("\"{}\" ({})", key.name, key.about.trim_end_matches('.')),
        usable_keys_words(section, members),
        "remove it, or use a later version",
    )
}

/// A key that the chosen kinds do not use.
pub fn unused_key(section: &'static Section, key: &Key, members: &[&Member]) -> Complaint {
    let failing = key
        .when
        .iter()
        .find_map(|when| match selected(section, when.key, members) {
            Selected::Word(word) if !when.is.contains(&word) => Some((when, word)),
            _ => None,
        });
    let Some((when, word)) = failing else {
        let other = key.with.expect("an unused key has a condition that fails");
        return Complaint::new(
            Problem::UnusedKey,
            format!("\"{}\" without \"{other}\"", key.name),
            format!("\"{}\" only together with \"{other}\"", key.name),
            format!("remove it, or add \"{other}\""),
        );
    };
    let default = if is_written(when.key, members) {
        ""
    } else {
        " (the default)"
    };
    let choices = quoted(when.is);
    Complaint::new(
        Problem::UnusedKey,
        format!("\"{}\" with {} \"{word}\"{default}", key.name, when.key),
        format!("\"{}\" only with {} {choices}", key.name, when.key),
        format!("remove it, or set {} to {choices}", when.key),
    )
}

fn quoted(words: &[&str]) -> String {
    let quoted: Vec<_> = words.iter().map(|word| format!("\"{word}\"")).collect();
    quoted.join(" or ")
}

/// What made an absent key required.
fn required_by(section: &'static Section, key: &Key, members: &[&Member]) -> String {
    let choices = key
        .when
        .iter()
        .filter_map(|when| match selected(section, when.key, members) {
            Selected::Word(word) => Some(format!("{} \"{word}\"", when.key)),
            Selected::Planned | Selected::Unclear => None,
        });
    let beside = key.with.map(|other| format!("\"{other}\""));
    let reasons: Vec<_> = choices.chain(beside).collect();
    if reasons.is_empty() {
        String::new()
    } else {
        format!(" with {}", reasons.join(" and "))
    }
}

/// Neither of two keys of which one must be there.
pub fn neither_key(
    section: &'static Section,
    key: &Key,
    other: &Key,
    members: &[&Member],
) -> Complaint {
    Complaint::new(
        Problem::MissingKey,
        format!("neither \"{}\" nor \"{}\"", key.name, other.name),
        format!(
            "\"{}\": {}; or \"{}\": {}",
            key.name,
            key.form.words(),
            other.name,
            other.form.words()
        ),
        format!(
            "add \"{}\" or \"{}\", one of which is required{}",
            key.name,
            other.name,
            required_by(section, key, members)
        ),
    )
}

/// Both of two keys that exclude each other.
pub fn both_keys(key: &Key, other: &Key) -> Complaint {
    Complaint::new(
        Problem::UnusedKey,
        format!("\"{}\" beside \"{}\"", key.name, other.name),
        format!("one of \"{}\" and \"{}\"", other.name, key.name),
        "remove one of them",
    )
}

/// A required key that is absent.
pub fn missing_key(section: &'static Section, key: &Key, members: &[&Member]) -> Complaint {
    let chosen = required_by(section, key, members);
    Complaint::new(
        Problem::MissingKey,
        format!("no \"{}\"", key.name),
        allowed(key, &key.form),
        format!(
            "add \"{}\", which is required{chosen}: {}",
            key.name,
            key.about.trim_end_matches('.')
        ),
    )
}

/// What a form allows, with the unit of its key.
pub fn allowed(key: &Key, form: &Form) -> String {
    let unit = key.unit.map_or(String::new(), |unit| format!(" ({unit})"));
    format!("{}{unit}", form.words())
}

/// A value, as it was found.
pub fn describe(node: &Node) -> String {
    match &node.shape {
        Shape::Null => "null".to_owned(),
        Shape::Flag(flag) => flag.to_string(),
        Shape::Number(text) => quote(text),
        Shape::Text(text) => format!("the string \"{}\"", quote(text)),
        Shape::List(items) => format!("a list of {}", items.len()),
        Shape::Object(members) => format!("an object of {} keys", members.len()),
    }
}

/// A value that is not of the form's type.
pub fn wrong_type(form: &Form, node: &Node) -> Complaint {
    Complaint::new(
        Problem::WrongType,
        describe(node),
        form.words(),
        "write such a value",
    )
}

/// Something else where a section should be.
pub fn not_an_object(section: &'static Section, node: &Node) -> Complaint {
    let kinds = match section.key("kind").map(|key| key.form) {
        Some(Form::Choice(choices)) => choices,
        _ => &[],
    };
    let remedy = match &node.shape {
        Shape::Text(word) if kinds.iter().any(|kind| kind.name == word) => {
            format!(
                "write {{ \"kind\": \"{word}\" }}, with the other keys of that kind if it has any"
            )
        }
        _ => "write an object { ... } with the keys of this section".to_owned(),
    };
    let keys: Vec<_> = section.built_keys().map(|key| key.name).collect();
    Complaint::new(
        Problem::WrongType,
        describe(node),
        format!("an object with the keys {}", keys.join(", ")),
        remedy,
    )
}

/// A number outside its range.
pub fn out_of_range(key: &Key, node: &Node, allowed: String) -> Complaint {
    let remedy = match key.hint {
        Some(hint) => format!("choose a value in this range; {hint}"),
        None => "choose a value in this range".to_owned(),
    };
    Complaint::new(Problem::OutOfRange, describe(node), allowed, remedy)
}
