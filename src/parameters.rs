//! What a key of a config is: name, form, unit, range, default, when it is used, and what it means.
//!
//! Physics modules state the parameters of their models with these types; the config makes checks, defaults and schema
//! from them.

use crate::qcd::Species;

/// A JSON object of the config: its keys.
#[derive(Debug)]
pub struct Section {
    /// What the object is about.
    pub about: &'static str,
    /// Its keys, in the order of the resolved config.
    pub keys: &'static [Key],
}

/// One key.
#[derive(Clone, Copy, Debug)]
pub struct Key {
    /// Its name.
    pub name: &'static str,
    /// What its value looks like.
    pub form: Form,
    /// Unit, where it has a dimension.
    pub unit: Option<&'static str>,
    /// Whether it must be there.
    pub need: Need,
    /// The choices that use it: all must hold.
    pub when: &'static [When],
    /// The other key of the section without which it is not used.
    pub with: Option<&'static str>,
    /// False for a key that a later version will know.
    pub built: bool,
    /// What it means.
    pub about: &'static str,
    /// The likely mistake behind a value out of range.
    pub hint: Option<&'static str>,
}

/// Whether a key must be there.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Need {
    /// Always, where it is used.
    Required,
    /// No; absent means something by itself.
    Optional,
    /// No; absent means this JSON text.
    Default(&'static str),
    /// Where it is used, either it or this other key must be there, and not both. The two name each other.
    Either(&'static str),
}

/// A key is used when another key of the same section has one of some values.
#[derive(Clone, Copy, Debug)]
pub struct When {
    /// The other key, a [`Form::Choice`].
    pub key: &'static str,
    /// Its values.
    pub is: &'static [&'static str],
}

/// What a value looks like.
#[derive(Clone, Copy, Debug)]
pub enum Form {
    /// A finite number in a range.
    Number(Range),
    /// An integer from the first to the second, both included.
    Count(u64, u64),
    /// `true` or `false`.
    Flag,
    /// One of some words.
    Choice(&'static [Choice]),
    /// The name of a parton.
    Parton,
    /// `"transverse"` or a vector.
    Direction,
    /// The path of a file.
    File,
    /// Paths of files: a list, or a pattern that stands for all that match, sorted. At most so many.
    Files(usize),
    /// The address of a JSON Schema, for editors; not looked at.
    SchemaAddress,
    /// A list of so many values of one form.
    List(&'static Form, Length),
    /// A list that must be empty until a later version.
    EmptyList,
    /// An object.
    Section(&'static Section),
    /// An object whose section is put together from models that state their own parameters.
    Models(fn() -> &'static Section),
    /// An object or null.
    OptionalSection(&'static Section),
}

/// Smallest and largest length of a list.
#[derive(Clone, Copy, Debug)]
pub struct Length {
    /// Smallest.
    pub least: usize,
    /// Largest.
    pub most: usize,
}

/// One word of a [`Form::Choice`].
#[derive(Clone, Copy, Debug)]
pub struct Choice {
    /// The word.
    pub name: &'static str,
    /// False for a word that a later version will know.
    pub built: bool,
    /// What it means.
    pub about: &'static str,
}

/// A range of numbers.
#[derive(Clone, Copy, Debug)]
pub struct Range {
    /// Lower end.
    pub low: f64,
    /// Upper end.
    pub high: f64,
    /// Whether the lower end belongs to it.
    pub low_included: bool,
    /// Whether the upper end belongs to it.
    pub high_included: bool,
}

impl Range {
    /// Both ends excluded.
    pub const fn between(low: f64, high: f64) -> Self {
        Range {
            low,
            high,
            low_included: false,
            high_included: false,
        }
    }

    /// Upper end included.
    pub const fn above(low: f64, high: f64) -> Self {
        Range {
            high_included: true,
            ..Range::between(low, high)
        }
    }

    /// Both ends included.
    pub const fn from(low: f64, high: f64) -> Self {
        Range {
            low_included: true,
            ..Range::above(low, high)
        }
    }

    /// Whether a number lies in it; never for NaN.
    pub fn contains(&self, number: f64) -> bool {
        let above = number > self.low || (self.low_included && number == self.low);
        let below = number < self.high || (self.high_included && number == self.high);
        above && below
    }

    /// The range in words.
    pub fn words(&self) -> String {
        let low = if self.low_included {
            "at least"
        } else {
            "above"
        };
        let high = if self.high_included {
            "at most"
        } else {
            "below"
        };
        format!("{low} {} and {high} {}", self.low, self.high)
    }
}

impl Key {
    /// A key with everything that need not be said left out.
    pub const fn new(name: &'static str, form: Form, need: Need, about: &'static str) -> Self {
        Key {
            name,
            form,
            unit: None,
            need,
            when: &[],
            with: None,
            built: true,
            about,
            hint: None,
        }
    }

    /// A key that must be there.
    pub const fn required(name: &'static str, form: Form, about: &'static str) -> Self {
        Key::new(name, form, Need::Required, about)
    }

    /// A key whose absence means something by itself.
    pub const fn optional(name: &'static str, form: Form, about: &'static str) -> Self {
        Key::new(name, form, Need::Optional, about)
    }

    /// A key with a default (JSON text).
    pub const fn default(
        name: &'static str,
        form: Form,
        default: &'static str,
        about: &'static str,
    ) -> Self {
        Key::new(name, form, Need::Default(default), about)
    }

    /// One of two keys, of which exactly one must be there.
    pub const fn either(
        name: &'static str,
        form: Form,
        other: &'static str,
        about: &'static str,
    ) -> Self {
        Key::new(name, form, Need::Either(other), about)
    }

    /// A key that a later version will know.
    pub const fn planned(name: &'static str, about: &'static str) -> Self {
        Key {
            built: false,
            ..Key::optional(name, Form::Flag, about)
        }
    }

    /// With a unit.
    pub const fn unit(self, unit: &'static str) -> Self {
        Key {
            unit: Some(unit),
            ..self
        }
    }

    /// Used under these conditions alone.
    pub const fn when(self, when: &'static [When]) -> Self {
        Key { when, ..self }
    }

    /// Used together with another key alone.
    pub const fn with(self, other: &'static str) -> Self {
        Key {
            with: Some(other),
            ..self
        }
    }

    /// With the likely mistake behind a value out of range.
    pub const fn hint(self, hint: &'static str) -> Self {
        Key {
            hint: Some(hint),
            ..self
        }
    }

    /// The default as JSON text.
    pub fn default_text(&self) -> Option<&'static str> {
        match self.need {
            Need::Default(text) => Some(text),
            Need::Required | Need::Optional | Need::Either(_) => None,
        }
    }
}

impl Choice {
    /// A word that this version knows.
    pub const fn built(name: &'static str, about: &'static str) -> Self {
        Choice {
            name,
            built: true,
            about,
        }
    }

    /// A word that a later version will know.
    pub const fn planned(name: &'static str, about: &'static str) -> Self {
        Choice {
            built: false,
            ..Choice::built(name, about)
        }
    }
}

impl Section {
    /// The key of a name.
    pub fn key(&self, name: &str) -> Option<&'static Key> {
        self.keys.iter().find(|key| key.name == name)
    }

    /// The keys that this version knows.
    pub fn built_keys(&self) -> impl Iterator<Item = &'static Key> {
        self.keys.iter().filter(|key| key.built)
    }
}

impl Form {
    /// The section that a value of this form (or each item of the list) is.
    pub fn section(&self) -> Option<&'static Section> {
        match self {
            Form::Section(section) | Form::OptionalSection(section) => Some(section),
            Form::Models(section) => Some(section()),
            Form::List(of, _) => of.section(),
            _ => None,
        }
    }

    /// What is allowed, in words, without the unit.
    pub fn words(&self) -> String {
        match self {
            Form::Number(range) => format!("a number {}", range.words()),
            Form::Count(least, most) => format!("an integer from {least} to {most}"),
            Form::Flag => "true or false".to_owned(),
            Form::Choice(choices) => {
                let built = choices.iter().filter(|choice| choice.built);
                one_of(built.map(|choice| choice.name))
            }
            Form::Parton => one_of(Species::names().iter().copied()),
            Form::Direction => {
                "\"transverse\" or a vector [x, y, z] of numbers that is not zero".to_owned()
            }
            Form::File => "the path of a file, relative to the folder of the config".to_owned(),
            Form::Files(most) => format!(
                "a list of 1 to {most} paths of files, or one pattern like \"fields/*.h5\" (sorted by name), relative to \
                 the folder of the config"
            ),
            Form::SchemaAddress => "a string".to_owned(),
            Form::List(of, length) => length.words(&of.words()),
            Form::EmptyList => "an empty list, [], in this version".to_owned(),
            Form::Section(_) | Form::Models(_) => "an object { ... }".to_owned(),
            Form::OptionalSection(_) => "an object { ... } or null".to_owned(),
        }
    }
}

impl Length {
    /// From the first to the second, both included.
    pub const fn of(least: usize, most: usize) -> Self {
        Length { least, most }
    }

    fn words(&self, of: &str) -> String {
        let Length { least, most } = self;
        if least == most {
            format!("a list of {least}, each {of}")
        } else {
            format!("a list of {least} to {most}, each {of}")
        }
    }
}

fn one_of<'a>(words: impl Iterator<Item = &'a str>) -> String {
    let quoted: Vec<_> = words.map(|word| format!("\"{word}\"")).collect();
    quoted.join(", ")
}

/// The checked parameters of one model, by name.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Values(Vec<(&'static str, Setting)>);

/// One checked parameter.
#[derive(Clone, Debug, PartialEq)]
pub enum Setting {
    /// A number in its range.
    Number(f64),
    /// `true` or `false`.
    Flag(bool),
    /// One of the words of a choice.
    Word(&'static str),
}

impl Values {
    /// Sets a parameter; a second value replaces the first.
    pub fn set(&mut self, name: &'static str, setting: Setting) {
        match self.0.iter_mut().find(|(known, _)| *known == name) {
            Some((_, old)) => *old = setting,
            None => self.0.push((name, setting)),
        }
    }

    /// A number that the chosen kinds use.
    pub fn number(&self, name: &str) -> f64 {
        match self.get(name) {
            Setting::Number(number) => *number,
            other => panic!("{name} is no number but {other:?}"),
        }
    }

    /// A flag that the chosen kinds use.
    pub fn flag(&self, name: &str) -> bool {
        match self.get(name) {
            Setting::Flag(flag) => *flag,
            other => panic!("{name} is no flag but {other:?}"),
        }
    }

    /// A word that the chosen kinds use.
    pub fn word(&self, name: &str) -> &'static str {
        match self.get(name) {
            Setting::Word(word) => word,
            other => panic!("{name} is no word but {other:?}"),
        }
    }

    fn get(&self, name: &str) -> &Setting {
        let found = self.0.iter().find(|(known, _)| *known == name);
        &found
            .expect("the checker fills in every parameter that the chosen kinds use")
            .1
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn range_ends() {
        let range = Range::above(0.0, 1.0);
        assert!(!range.contains(0.0) && range.contains(1.0) && range.contains(f64::MIN_POSITIVE));
        assert!(!Range::between(0.0, 1.0).contains(1.0));
        assert!(Range::from(0.0, 1.0).contains(0.0));
        assert!(!range.contains(f64::NAN) && !range.contains(f64::INFINITY));
        assert_eq!(range.words(), "above 0 and at most 1");
    }
}
