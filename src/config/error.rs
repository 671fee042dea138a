//! What is wrong with a config: every error with its place, what was found, what is allowed and the remedy.

use std::fmt;
use std::path::PathBuf;

/// Errors beyond this number are counted, not kept.
const MAX_ERRORS_KEPT: usize = 100;

/// Longest piece of a config that a message quotes, in characters.
const MAX_QUOTED_CHARS: usize = 60;

/// What kind of error it is.
#[derive(Clone, Copy, Debug, PartialEq, Eq, thiserror::Error)]
pub enum Problem {
    /// The config file cannot be read.
    #[error("the config cannot be read")]
    Unreadable,
    /// The text is no JSON that the reader takes.
    #[error("this is not a JSON config")]
    Syntax,
    /// No section of the config has such a key here.
    #[error("unknown key")]
    UnknownKey,
    /// The same key stands twice in one section.
    #[error("duplicate key")]
    DuplicateKey,
    /// The key exists, but the chosen kinds do not use it.
    #[error("key that is not used here")]
    UnusedKey,
    /// A required key is absent.
    #[error("missing key")]
    MissingKey,
    /// The value has the wrong type.
    #[error("wrong type")]
    WrongType,
    /// The value lies outside its range.
    #[error("value out of range")]
    OutOfRange,
    /// The word is not among the choices.
    #[error("unknown choice")]
    UnknownChoice,
    /// A key or choice that a later version will know.
    #[error("known to a later version of spindrift, not built yet")]
    Planned,
    /// Two values do not go together.
    #[error("values that do not go together")]
    Conflict,
    /// An input file cannot be used.
    #[error("input file that cannot be used")]
    InputFile,
}

/// One error of a config.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct ConfigError {
    /// What kind of error it is.
    pub problem: Problem,
    /// Line of the file, from 1; `None` where the error belongs to no line (a command-line option, an unreadable file).
    pub line: Option<usize>,
    /// JSON path like `medium.effects[0].window`; empty for the whole file.
    pub path: String,
    /// What was found.
    pub found: String,
    /// What is allowed.
    pub allowed: String,
    /// What to do about it.
    pub remedy: String,
    /// The nearest valid key or word, where a misspelling is likely.
    pub nearest: Option<String>,
}

impl fmt::Display for ConfigError {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        if !self.path.is_empty() {
            write!(out, "{}: ", self.path)?;
        }
        writeln!(out, "{}", self.problem)?;
        writeln!(out, "    found:   {}", self.found)?;
        writeln!(out, "    allowed: {}", self.allowed)?;
        write!(out, "    remedy:  {}", self.remedy)
    }
}

/// Everything that is wrong with a config.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct ConfigErrors {
    /// The config file as it was named.
    pub file: PathBuf,
    /// The errors, in the order of the file as far as they have a line.
    pub errors: Vec<ConfigError>,
    /// Further errors that were counted but not kept.
    pub omitted: usize,
}

impl fmt::Display for ConfigErrors {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        for (number, error) in self.errors.iter().enumerate() {
            if number > 0 {
                writeln!(out)?;
            }
            write!(out, "{}:", self.file.display())?;
            if let Some(line) = error.line {
                write!(out, "{line}:")?;
            }
            write!(out, " {error}")?;
        }
        if self.omitted > 0 {
            write!(out, "\nand {} more errors", self.omitted)?;
        }
        Ok(())
    }
}

impl std::error::Error for ConfigErrors {}

/// Collects errors, with a bound on how many are kept.
#[derive(Debug, Default)]
pub(super) struct Report {
    errors: Vec<ConfigError>,
    omitted: usize,
}

impl Report {
    /// Adds an error; it is only made if there is room for it.
    pub fn add(&mut self, error: impl FnOnce() -> ConfigError) {
        if self.errors.len() < MAX_ERRORS_KEPT {
            self.errors.push(error());
        } else {
            self.omitted += 1;
        }
    }

    pub fn is_empty(&self) -> bool {
        self.errors.is_empty()
    }

    /// The errors of a file, sorted by line.
    pub fn finish(mut self, file: PathBuf) -> ConfigErrors {
        self.errors.sort_by_key(|error| error.line);
        ConfigErrors {
            file,
            errors: self.errors,
            omitted: self.omitted,
        }
    }
}

/// A piece of a config for a message: shortened, control characters escaped.
pub(super) fn quote(text: &str) -> String {
    let mut quoted = String::new();
    for character in text.chars().take(MAX_QUOTED_CHARS) {
        if character.is_control() {
            quoted.extend(character.escape_default());
        } else {
            quoted.push(character);
        }
    }
    if text.chars().nth(MAX_QUOTED_CHARS).is_some() {
        quoted.push_str("...");
    }
    quoted
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn quoting_shortens_and_escapes() {
        assert_eq!(quote("plain"), "plain");
        assert_eq!(quote("a\u{1b}[31m"), "a\\u{1b}[31m");
        let long = quote(&"x".repeat(1000));
        assert_eq!(long.chars().count(), MAX_QUOTED_CHARS + 3);
        assert!(long.ends_with("..."));
    }

    #[test]
    fn the_report_keeps_a_bounded_number() {
        let mut report = Report::default();
        for line in 0..MAX_ERRORS_KEPT + 7 {
            report.add(|| ConfigError {
                problem: Problem::UnknownKey,
                line: Some(line),
                path: String::new(),
                found: String::new(),
                allowed: String::new(),
                remedy: String::new(),
                nearest: None,
            });
        }
        let errors = report.finish(PathBuf::from("x.json"));
        assert_eq!(errors.errors.len(), MAX_ERRORS_KEPT);
        assert_eq!(errors.omitted, 7);
        assert!(errors.to_string().ends_with("and 7 more errors"));
    }
}
