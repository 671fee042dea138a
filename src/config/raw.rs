//! JSON with places: every value knows where in the text it stands, and duplicate keys are kept.

use std::fmt;

use serde::de::{Deserialize, Deserializer, MapAccess, SeqAccess, Visitor};
use serde_json::value::RawValue;

/// Deepest nesting that is read; a config needs five levels.
const MAX_DEPTH: usize = 32;

/// Most values that are read, which bounds memory.
const MAX_VALUES: usize = 200_000;

/// A JSON value and where it stands.
#[derive(Clone, Debug)]
pub struct Node {
    /// Byte offset of its first character.
    pub at: usize,
    /// What it holds.
    pub shape: Shape,
}

/// What a JSON value holds.
#[derive(Clone, Debug)]
pub enum Shape {
    /// `null`.
    Null,
    /// `true` or `false`.
    Flag(bool),
    /// A number as it is written.
    Number(String),
    /// A string, unescaped.
    Text(String),
    /// A list.
    List(Vec<Node>),
    /// An object, members in the order of the text, duplicates kept.
    Object(Vec<Member>),
}

/// One `"name": value` of an object.
#[derive(Clone, Debug)]
pub struct Member {
    /// The key, unescaped.
    pub name: String,
    /// Byte offset of the key.
    pub at: usize,
    /// The value.
    pub value: Node,
}

impl Node {
    /// The same value at another place of another text (for defaults, which stand where their section does).
    pub fn moved_to(mut self, at: usize) -> Self {
        self.move_to(at);
        self
    }

    fn move_to(&mut self, at: usize) {
        self.at = at;
        match &mut self.shape {
            Shape::List(items) => items.iter_mut().for_each(|item| item.move_to(at)),
            Shape::Object(members) => members.iter_mut().for_each(|member| {
                member.at = at;
                member.value.move_to(at);
            }),
            Shape::Null | Shape::Flag(_) | Shape::Number(_) | Shape::Text(_) => {}
        }
    }
}

/// Why a text is no JSON that this reader takes.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct SyntaxError {
    /// Line from 1.
    pub line: usize,
    /// What was found.
    pub found: String,
    /// What is allowed.
    pub allowed: &'static str,
    /// What to do about it.
    pub remedy: &'static str,
}

/// Reads a text.
pub fn parse(text: &str) -> Result<Node, SyntaxError> {
    let raw: &RawValue = serde_json::from_str(text).map_err(|error| syntax_error(text, &error))?;
    Reader { text, values: 0 }.node(raw, 0)
}

/// Finds the line of a byte offset.
pub struct Lines(Vec<usize>);

impl Lines {
    /// Prepares a text.
    pub fn of(text: &str) -> Self {
        Lines(text.match_indices('\n').map(|(at, _)| at).collect())
    }

    /// Line, from 1, of a byte offset.
    pub fn line(&self, at: usize) -> usize {
        1 + self.0.partition_point(|newline| *newline < at)
    }
}

struct Reader<'a> {
    text: &'a str,
    values: usize,
}

impl<'a> Reader<'a> {
    fn node(&mut self, raw: &'a RawValue, depth: usize) -> Result<Node, SyntaxError> {
        let text = raw.get();
        let at = self.offset(text);
        self.values += 1;
        if self.values > MAX_VALUES {
            return Err(self.limit(at, "more than 200000 values", "at most 200000 values"));
        }
        if depth > MAX_DEPTH {
            return Err(self.limit(at, "nesting deeper than 32 levels", "at most 32 levels"));
        }
        let shape = match text.as_bytes()[0] {
            b'n' => Shape::Null,
            b't' => Shape::Flag(true),
            b'f' => Shape::Flag(false),
            b'"' => Shape::Text(self.string(text)?),
            b'[' => Shape::List(self.list(text, depth)?),
            b'{' => Shape::Object(self.object(text, depth)?),
            _ => Shape::Number(text.to_owned()),
        };
        Ok(Node { at, shape })
    }

    fn list(&mut self, text: &'a str, depth: usize) -> Result<Vec<Node>, SyntaxError> {
        let Items(items) = self.inner(text)?;
        items
            .into_iter()
            .map(|item| self.node(item, depth + 1))
            .collect()
    }

    fn object(&mut self, text: &'a str, depth: usize) -> Result<Vec<Member>, SyntaxError> {
        let Members(members) = self.inner(text)?;
        members
            .into_iter()
            .map(|(key, value)| {
                Ok(Member {
                    at: self.offset(key.get()),
                    name: self.string(key.get())?,
                    value: self.node(value, depth + 1)?,
                })
            })
            .collect()
    }

    fn string(&self, text: &str) -> Result<String, SyntaxError> {
        serde_json::from_str(text).map_err(|_| SyntaxError {
            line: Lines::of(self.text).line(self.offset(text)),
            found: "a string with an invalid escape".to_owned(),
            allowed: "strings of valid Unicode; surrogates only in pairs",
            remedy: "write the character itself instead of its \\u escape",
        })
    }

    /// Reads a piece whose syntax has been checked with the whole text.
    fn inner<T: Deserialize<'a>>(&self, text: &'a str) -> Result<T, SyntaxError> {
        serde_json::from_str(text).map_err(|error| {
            let mut inner = syntax_error(text, &error);
            inner.line += Lines::of(self.text).line(self.offset(text)) - 1;
            inner
        })
    }

    /// Where a piece of the text stands in it.
    fn offset(&self, piece: &str) -> usize {
        piece.as_ptr().addr() - self.text.as_ptr().addr()
    }

    fn limit(&self, at: usize, found: &str, allowed: &'static str) -> SyntaxError {
        SyntaxError {
            line: Lines::of(self.text).line(at),
            found: found.to_owned(),
            allowed,
            remedy: "check that this is a config of spindrift: none needs as much",
        }
    }
}

fn syntax_error(text: &str, error: &serde_json::Error) -> SyntaxError {
    let allowed = "one JSON object: { \"events\": ..., \"source\": { ... } }";
    let rest = rest_of_line(text, error.line(), error.column());
    let remedy = remedy(rest, error);
    SyntaxError {
        line: error.line().max(1),
        found: format!("{error}{}", quoted_rest(rest)),
        allowed,
        remedy,
    }
}

fn quoted_rest(rest: &str) -> String {
    if rest.is_empty() {
        String::new()
    } else {
        format!(", at `{}`", super::error::quote(rest.trim_end()))
    }
}

/// The text from a line and column (both from 1; column in bytes) to the end of the line.
fn rest_of_line(text: &str, line: usize, column: usize) -> &str {
    let line = text.split('\n').nth(line.saturating_sub(1)).unwrap_or("");
    let mut start = column.saturating_sub(1).min(line.len());
    while !line.is_char_boundary(start) {
        start -= 1;
    }
    &line[start..]
}

fn remedy(rest: &str, error: &serde_json::Error) -> &'static str {
    let starts_with = |words: &[&str]| words.iter().any(|word| rest.starts_with(word));
    if error.is_eof() {
        "close every { [ and \" that is open"
    } else if starts_with(&["/", "#"]) {
        "JSON has no comments: remove it"
    } else if starts_with(&["NaN", "nan", "Inf", "inf", "-Inf", "-inf", "-N", "aN", "I"]) {
        "write a finite number"
    } else if starts_with(&["'"]) {
        "write strings and keys in double quotes"
    } else if starts_with(&["+", "."]) {
        "write numbers like 0.5, without a leading + or ."
    } else if starts_with(&["]", "}"]) {
        "remove the comma before the closing bracket, or write the missing value"
    } else if error.to_string().starts_with("trailing characters") {
        "remove what follows the closing bracket of the config"
    } else {
        "correct the JSON here or on the line before: a missing comma, colon, quote or bracket"
    }
}

struct Items<'a>(Vec<&'a RawValue>);

impl<'de> Deserialize<'de> for Items<'de> {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        struct Collect;
        impl<'de> Visitor<'de> for Collect {
            type Value = Items<'de>;
            fn expecting(&self, out: &mut fmt::Formatter) -> fmt::Result {
                out.write_str("a list")
            }
            fn visit_seq<A: SeqAccess<'de>>(self, mut list: A) -> Result<Self::Value, A::Error> {
                let mut items = Vec::new();
                while let Some(item) = list.next_element()? {
                    items.push(item);
                }
                Ok(Items(items))
            }
        }
        deserializer.deserialize_seq(Collect)
    }
}

struct Members<'a>(Vec<(&'a RawValue, &'a RawValue)>);

impl<'de> Deserialize<'de> for Members<'de> {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        struct Collect;
        impl<'de> Visitor<'de> for Collect {
            type Value = Members<'de>;
            fn expecting(&self, out: &mut fmt::Formatter) -> fmt::Result {
                out.write_str("an object")
            }
            fn visit_map<A: MapAccess<'de>>(self, mut map: A) -> Result<Self::Value, A::Error> {
                let mut members = Vec::new();
                while let Some(member) = map.next_entry()? {
                    members.push(member);
                }
                Ok(Members(members))
            }
        }
        deserializer.deserialize_map(Collect)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn members(text: &str) -> Vec<Member> {
        match parse(text).unwrap().shape {
            Shape::Object(members) => members,
            other => panic!("{other:?}"),
        }
    }

    #[test]
    fn values_know_their_place() {
        let text = "{\n \"a\": 1,\n \"b\\u0041\": [true,\n  \"x\"] }";
        let members = members(text);
        let lines = Lines::of(text);
        assert_eq!(members[1].name, "bA");
        assert_eq!(lines.line(members[0].at), 2);
        assert_eq!(lines.line(members[1].at), 3);
        let Shape::List(items) = &members[1].value.shape else {
            panic!()
        };
        assert_eq!(lines.line(items[1].at), 4);
        assert_eq!(&text[items[1].at..items[1].at + 3], "\"x\"");
    }

    #[test]
    fn duplicates_are_kept() {
        let members = members(r#"{"a": 1, "a": 2}"#);
        assert_eq!(members.len(), 2);
        assert!(matches!(&members[1].value.shape, Shape::Number(text) if text == "2"));
    }

    #[test]
    fn syntax_errors_know_line_and_remedy() {
        for (text, line, words) in [
            ("{\n\"a\": 1,\n}", 3, "comma before the closing"),
            ("{\n\"a\": NaN}", 2, "finite number"),
            ("{\n// note\n}", 2, "no comments"),
            ("{\"a\": 1", 1, "close every"),
            ("{} {}", 1, "follows the closing"),
            ("{'a': 1}", 1, "double quotes"),
            ("{\"a\"\n: \"\\ud800\"}", 2, "character itself"),
            ("{\"a\" 1}", 1, "missing comma, colon"),
        ] {
            let error = parse(text).unwrap_err();
            assert_eq!(error.line, line, "{text:?}: {error:?}");
            assert!(error.remedy.contains(words), "{text:?}: {error:?}");
        }
    }

    #[test]
    fn depth_and_number_of_values_are_bounded() {
        let deep = format!("{}{}", "[".repeat(100_000), "]".repeat(100_000));
        assert!(parse(&deep).unwrap_err().found.contains("nesting"));
        let many = format!("[{}0]", "0,".repeat(MAX_VALUES));
        assert!(parse(&many).unwrap_err().found.contains("values"));
    }
}
