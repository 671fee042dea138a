//! Checks a config against the table of keys, key by key, and fills in the defaults.

use std::collections::{HashMap, HashSet};

use serde_json::{Map, Value};

use super::complaint::{
    Complaint, both_keys, describe, missing_key, neither_key, not_an_object, planned_key,
    unknown_key, unused_key, wrong_type,
};
use super::error::{ConfigError, Problem, Report, quote};
use super::keys::{self, Choice, Form, Key, Length, Need, Range, Section};
use super::raw::{self, Lines, Member, Node, Shape};
use super::usage::{Use, has_planned_kind, is_written, used};
use super::values::{choice, count, empty_list, flag, number, parton, text};

/// Where each value of the config stands.
pub struct Places<'a> {
    lines: &'a Lines,
    offsets: HashMap<String, usize>,
}

impl Places<'_> {
    /// Line of a path, or of the nearest section above it that stands in the file: at the end, the whole config.
    pub fn line(&self, path: &str) -> Option<usize> {
        let mut path = path;
        loop {
            if let Some(at) = self.offsets.get(path) {
                return Some(self.lines.line(*at));
            }
            if path.is_empty() {
                return None;
            }
            path = &path[..path.rfind(['.', '[']).unwrap_or(0)];
        }
    }

    /// Whether the file itself has this path (else it is a default).
    pub fn written(&self, path: &str) -> bool {
        self.offsets.contains_key(path)
    }
}

/// Checks the whole config. What is returned holds every valid value and every default that is used; what is not
/// valid is in the report and left out.
pub fn check<'a>(root: &Node, lines: &'a Lines, report: &mut Report) -> (Value, Places<'a>) {
    let mut checker = Checker {
        places: Places {
            lines,
            offsets: HashMap::from([(String::new(), root.at)]),
        },
        report,
    };
    let resolved = checker.section("", &keys::CONFIG, root);
    (resolved.unwrap_or(Value::Null), checker.places)
}

/// Checks one value by the form of a top-level key (for values from the command line, which have no line).
pub fn check_override(name: &str, value: u64, report: &mut Report) {
    let key = keys::CONFIG
        .key(name)
        .expect("overrides are keys of the config");
    let Form::Count(least, most) = key.form else {
        unreachable!("overrides are counts")
    };
    if !(least..=most).contains(&value) {
        report.add(|| ConfigError {
            problem: Problem::OutOfRange,
            line: None,
            path: format!("--{name}"),
            found: value.to_string(),
            allowed: key.form.words(),
            remedy: "choose a value in this range".to_owned(),
            nearest: None,
        });
    }
}

struct Checker<'a, 'r> {
    places: Places<'a>,
    report: &'r mut Report,
}

impl Checker<'_, '_> {
    fn complain(&mut self, path: &str, at: usize, complaint: impl FnOnce() -> Complaint) {
        let line = self.places.lines.line(at);
        self.report.add(|| {
            let complaint = complaint();
            ConfigError {
                problem: complaint.problem,
                line: Some(line),
                path: path.to_owned(),
                found: complaint.found,
                allowed: complaint.allowed,
                remedy: complaint.remedy,
                nearest: complaint.nearest,
            }
        });
    }

    fn section(&mut self, path: &str, section: &'static Section, node: &Node) -> Option<Value> {
        let Shape::Object(members) = &node.shape else {
            self.complain(path, node.at, || not_an_object(section, node));
            return None;
        };
        let members = self.without_duplicates(path, members);
        // The keys of planned kinds are not all in the table.
        let names_known = !has_planned_kind(section, &members);
        let mut misspelt = Vec::new();
        for member in &members {
            match section.key(&member.name) {
                None if names_known => {
                    misspelt.extend(self.unknown(path, section, &members, member));
                }
                Some(key) if key.built || names_known => {
                    self.usable(path, section, &members, key, member.at);
                }
                _ => {}
            }
        }
        let mut resolved = Map::new();
        for key in section.built_keys() {
            let meant = |name: &str| misspelt.iter().any(|misspelt| misspelt == name);
            let other_meant = matches!(key.need, Need::Either(other) if meant(other));
            if !is_written(key.name, &members) && (meant(key.name) || other_meant) {
                continue;
            }
            if let Some(value) = self.key(path, section, key, &members, node.at)
                && !matches!(key.form, Form::SchemaAddress)
            {
                resolved.insert(key.name.to_owned(), value);
            }
        }
        Some(Value::Object(resolved))
    }

    fn without_duplicates<'m>(&mut self, path: &str, members: &'m [Member]) -> Vec<&'m Member> {
        let mut seen = HashSet::new();
        let mut distinct = Vec::new();
        for member in members {
            if seen.insert(member.name.as_str()) {
                distinct.push(member);
            } else {
                self.complain(&path_of(path, &member.name), member.at, || {
                    Complaint::new(
                        Problem::DuplicateKey,
                        format!("\"{}\" a second time", quote(&member.name)),
                        "each key once in its section".to_owned(),
                        "keep one of them",
                    )
                });
            }
        }
        distinct
    }

    /// Tells of an unknown key; returns the key that was probably meant, whose absence is then no second error.
    fn unknown(
        &mut self,
        path: &str,
        section: &'static Section,
        members: &[&Member],
        member: &Member,
    ) -> Option<String> {
        let mut meant = None;
        self.complain(&path_of(path, &member.name), member.at, || {
            let complaint = unknown_key(section, members, &member.name);
            meant.clone_from(&complaint.nearest);
            complaint
        });
        meant
    }

    /// Is the key built, and do the chosen kinds use it?
    fn usable(
        &mut self,
        path: &str,
        section: &'static Section,
        members: &[&Member],
        key: &'static Key,
        at: usize,
    ) {
        let full = keys::join(path, key.name);
        if !key.built {
            self.complain(&full, at, || planned_key(section, key, members));
        } else if used(section, key, members) == Use::No {
            self.complain(&full, at, || unused_key(section, key, members));
        } else if let Some(other) = earlier_alternative(section, key)
            && is_written(other.name, members)
        {
            self.complain(&full, at, || both_keys(key, other));
        }
    }

    fn key(
        &mut self,
        path: &str,
        section: &'static Section,
        key: &'static Key,
        members: &[&Member],
        section_at: usize,
    ) -> Option<Value> {
        let usage = used(section, key, members);
        if usage == Use::No {
            return None;
        }
        let full = keys::join(path, key.name);
        if let Some(member) = members.iter().find(|member| member.name == key.name) {
            self.places.offsets.insert(full.clone(), member.at);
            return self.value(&full, key, &key.form, &member.value);
        }
        match key.need {
            Need::Default(text) if usage == Use::Yes => {
                let node = raw::parse(text).expect("a test parses every default of the table");
                self.value(&full, key, &key.form, &node.moved_to(section_at))
            }
            Need::Required if usage == Use::Yes => {
                self.complain(&full, section_at, || missing_key(section, key, members));
                None
            }
            Need::Either(name) if usage == Use::Yes && !is_written(name, members) => {
                let other = section.key(name).expect("a test finds both keys");
                if earlier_alternative(section, key).is_none() {
                    self.complain(&full, section_at, || {
                        neither_key(section, key, other, members)
                    });
                }
                None
            }
            _ => None,
        }
    }

    fn value(&mut self, path: &str, key: &Key, form: &Form, node: &Node) -> Option<Value> {
        let result = match form {
            Form::Section(section) => return self.section(path, section, node),
            Form::Models(section) => return self.section(path, section(), node),
            Form::OptionalSection(_) if matches!(node.shape, Shape::Null) => Ok(Value::Null),
            Form::OptionalSection(section) => return self.section(path, section, node),
            Form::List(of, length) => return self.list(path, key, of, *length, node),
            Form::Direction if matches!(node.shape, Shape::List(_)) => {
                return self.list(path, key, &VECTOR_COMPONENT, VECTOR_LENGTH, node);
            }
            Form::Direction => choice(DIRECTIONS, node).map_err(|complaint| Complaint {
                allowed: form.words(),
                ..complaint
            }),
            Form::Number(range) => number(key, *range, node),
            Form::Count(least, most) => count(key, *least, *most, node),
            Form::Flag => flag(node),
            Form::Choice(choices) => choice(choices, node),
            Form::Parton => parton(node),
            Form::Files(most) if matches!(node.shape, Shape::List(_)) => {
                return self.list(path, key, &Form::File, Length::of(1, *most), node);
            }
            Form::File | Form::Files(_) | Form::SchemaAddress => text(form, node),
            Form::EmptyList => empty_list(key, node),
        };
        result
            .map_err(|complaint| self.complain(path, node.at, || complaint))
            .ok()
    }

    fn list(
        &mut self,
        path: &str,
        key: &Key,
        of: &Form,
        length: Length,
        node: &Node,
    ) -> Option<Value> {
        let Shape::List(items) = &node.shape else {
            self.complain(path, node.at, || wrong_type(&key.form, node));
            return None;
        };
        if items.len() < length.least || items.len() > length.most {
            self.complain(path, node.at, || {
                Complaint::new(
                    Problem::OutOfRange,
                    describe(node),
                    key.form.words(),
                    "give the list as many values as that",
                )
            });
            return None;
        }
        let values: Vec<_> = items
            .iter()
            .enumerate()
            .map(|(place, item)| {
                let path = format!("{path}[{place}]");
                self.places.offsets.insert(path.clone(), item.at);
                self.value(&path, key, of, item)
            })
            .collect();
        values
            .into_iter()
            .collect::<Option<Vec<_>>>()
            .map(Value::Array)
    }
}

/// The other one of two keys of which one must be there, where it stands first in the table.
fn earlier_alternative(section: &'static Section, key: &Key) -> Option<&'static Key> {
    let Need::Either(name) = key.need else {
        return None;
    };
    let place = |name: &str| section.keys.iter().position(|key| key.name == name);
    (place(name) < place(key.name)).then(|| section.key(name))?
}

const DIRECTIONS: &[Choice] = &[Choice {
    name: "transverse",
    built: true,
    about: "uniform azimuth at rapidity 0",
}];

/// Components of a direction have no meaningful scale; the bound keeps their squares finite.
const VECTOR_COMPONENT: Form = Form::Number(Range {
    low: -1e100,
    high: 1e100,
    low_included: true,
    high_included: true,
});

const VECTOR_LENGTH: Length = Length { least: 3, most: 3 };

/// The path of a key as it stands in the file; odd characters are quoted.
fn path_of(section: &str, name: &str) -> String {
    let plain = |c: char| c.is_alphanumeric() || matches!(c, '_' | '-' | '$');
    if !name.is_empty() && name.chars().all(plain) {
        keys::join(section, &quote(name))
    } else {
        format!("{section}[\"{}\"]", quote(name))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_default_of_the_table_is_valid() {
        keys::walk(&mut |path, section| {
            for key in section.built_keys() {
                let Some(text) = key.default_text() else {
                    continue;
                };
                let lines = Lines::of(text);
                let mut report = Report::default();
                let mut checker = Checker {
                    places: Places {
                        lines: &lines,
                        offsets: HashMap::new(),
                    },
                    report: &mut report,
                };
                let node = raw::parse(text).unwrap();
                let value = checker.value(key.name, key, &key.form, &node);
                assert!(value.is_some(), "{path} {}", key.name);
                assert!(report.is_empty(), "{path} {}: {report:?}", key.name);
            }
        });
    }
}
