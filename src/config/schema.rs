//! The JSON Schema of a config, for editors, made from the table of keys.

use serde_json::{Map, Value, json};

use super::keys::{CONFIG, Form, Key, Need, Range, Section};
use crate::qcd::Species;

const DIALECT: &str = "https://json-schema.org/draft/2020-12/schema";

/// The JSON Schema (draft 2020-12) of a config: descriptions, defaults, ranges, and units (as `x-unit`).
///
/// It states everything that concerns one section; rules that tie sections together are the checker's.
pub fn schema() -> Value {
    let mut root = Map::new();
    root.insert("$schema".to_owned(), DIALECT.into());
    root.insert("title".to_owned(), "spindrift config".into());
    root.extend(section(&CONFIG, false));
    Value::Object(root)
}

fn section(section: &'static Section, nullable: bool) -> Map<String, Value> {
    let properties: Map<_, _> = section
        .built_keys()
        .map(|entry| (entry.name.to_owned(), Value::Object(key(entry))))
        .collect();
    let required: Vec<_> = section
        .built_keys()
        .filter(|key| key.need == Need::Required && key.when.is_empty() && key.with.is_none())
        .map(|key| key.name)
        .collect();
    let kind = if nullable {
        json!(["object", "null"])
    } else {
        json!("object")
    };
    let mut members = object(json!({
        "type": kind,
        "description": section.about,
        "properties": properties,
        "required": required,
        "additionalProperties": false,
    }));
    let mut conditions = conditions(section);
    conditions.extend(
        section
            .built_keys()
            .filter_map(|key| requirement(section, key)),
    );
    if !conditions.is_empty() {
        members.insert("allOf".to_owned(), Value::Array(conditions));
    }
    let companions: Map<_, _> = section
        .built_keys()
        .filter_map(|key| Some((key.name.to_owned(), json!([key.with?]))))
        .collect();
    if !companions.is_empty() {
        members.insert("dependentRequired".to_owned(), Value::Object(companions));
    }
    members
}

fn key(key: &'static Key) -> Map<String, Value> {
    let mut members = form(&key.form);
    members.insert("description".to_owned(), description(key).into());
    if let Some(unit) = key.unit {
        members.insert("x-unit".to_owned(), unit.into());
    }
    if let Some(text) = key.default_text() {
        let default = serde_json::from_str(text).expect("a test parses every default of the table");
        members.insert("default".to_owned(), default);
    }
    members
}

/// What the key means, its unit, what uses it, and its words.
fn description(key: &Key) -> String {
    let mut text = key.about.to_owned();
    if let Some(unit) = key.unit {
        text += &format!(" Unit: {unit}.");
    }
    for when in key.when {
        text += &format!(" Only with {}: {}.", when.key, when.is.join(", "));
    }
    if let Some(other) = key.with {
        text += &format!(" Only together with {other}.");
    }
    if let Need::Either(other) = key.need {
        text += &format!(" Either this or {other}.");
    }
    let choices = match key.form {
        Form::Choice(choices) => choices,
        Form::List(&Form::Choice(choices), _) => choices,
        _ => &[],
    };
    for choice in choices.iter().filter(|choice| choice.built) {
        text += &format!("\n- {}: {}", choice.name, choice.about);
    }
    text
}

fn form(form: &Form) -> Map<String, Value> {
    match form {
        Form::Number(limits) => range(*limits),
        Form::Count(least, most) => {
            object(json!({ "type": "integer", "minimum": least, "maximum": most }))
        }
        Form::Flag => object(json!({ "type": "boolean" })),
        Form::Choice(choices) => {
            let built = choices.iter().filter(|choice| choice.built);
            object(json!({ "enum": built.map(|choice| choice.name).collect::<Vec<_>>() }))
        }
        Form::Parton => object(json!({ "enum": Species::names() })),
        Form::Direction => object(json!({
            "oneOf": [
                { "const": "transverse" },
                { "type": "array", "items": { "type": "number" }, "minItems": 3, "maxItems": 3 },
            ]
        })),
        Form::File => object(json!({ "type": "string", "minLength": 1 })),
        Form::Files(most) => object(json!({
            "oneOf": [
                { "type": "string", "minLength": 1 },
                {
                    "type": "array",
                    "items": { "type": "string", "minLength": 1 },
                    "minItems": 1,
                    "maxItems": most,
                },
            ]
        })),
        Form::SchemaAddress => object(json!({ "type": "string" })),
        Form::List(of, length) => object(json!({
            "type": "array",
            "items": self::form(of),
            "minItems": length.least,
            "maxItems": length.most,
        })),
        Form::EmptyList => object(json!({ "type": "array", "maxItems": 0 })),
        Form::Section(inner) => section(inner, false),
        Form::Models(inner) => section(inner(), false),
        Form::OptionalSection(inner) => section(inner, true),
    }
}

fn range(range: Range) -> Map<String, Value> {
    let low = if range.low_included {
        "minimum"
    } else {
        "exclusiveMinimum"
    };
    let high = if range.high_included {
        "maximum"
    } else {
        "exclusiveMaximum"
    };
    object(json!({ "type": "number", low: range.low, high: range.high }))
}

/// One condition for each word of each key that others depend on: what it forbids, and what it alone requires.
fn conditions(section: &'static Section) -> Vec<Value> {
    let selectors = section.built_keys().filter(|selector| {
        section
            .built_keys()
            .any(|key| key.when.iter().any(|when| when.key == selector.name))
    });
    selectors
        .flat_map(|selector| {
            let Form::Choice(choices) = selector.form else {
                unreachable!("a test checks that every selector is a choice")
            };
            choices
                .iter()
                .filter(|choice| choice.built)
                .map(move |choice| condition(section, selector, choice.name))
        })
        .collect()
}

fn condition(section: &'static Section, selector: &'static Key, word: &'static str) -> Value {
    let mut required = Vec::new();
    let mut forbidden = Map::new();
    for key in section.built_keys() {
        for when in key.when.iter().filter(|when| when.key == selector.name) {
            if !when.is.contains(&word) {
                forbidden.insert(key.name.to_owned(), Value::Bool(false));
            } else if is_required_by_one_word(key) {
                required.push(key.name);
            }
        }
    }
    json!({
        "if": chosen(selector, &[word]),
        "then": { "required": required, "properties": forbidden },
    })
}

/// That a key has one of some words, written or by default.
fn chosen(selector: &Key, words: &[&str]) -> Value {
    let is_default = selector
        .default_text()
        .is_some_and(|text| words.contains(&text.trim_matches('"')));
    let needed: &[&str] = if is_default { &[] } else { &[selector.name] };
    let word = match words {
        [word] => json!({ "const": word }),
        _ => json!({ "enum": words }),
    };
    json!({ "properties": { selector.name: word }, "required": needed })
}

fn is_required_by_one_word(key: &Key) -> bool {
    key.need == Need::Required && key.when.len() == 1 && key.with.is_none()
}

/// What is required under several conditions at once, or as one of two keys: conditions within conditions.
fn requirement(section: &'static Section, key: &'static Key) -> Option<Value> {
    let innermost = match key.need {
        Need::Required if !key.when.is_empty() && !is_required_by_one_word(key) => {
            json!({ "required": [key.name] })
        }
        Need::Required if key.with.is_some() => json!({ "required": [key.name] }),
        // The two name each other; one statement is enough.
        Need::Either(other) if key.name < other => {
            json!({ "oneOf": [{ "required": [key.name] }, { "required": [other] }] })
        }
        _ => return None,
    };
    let beside = key.with.map(|other| json!({ "required": [other] }));
    let choices = key.when.iter().map(|when| {
        let selector = section.key(when.key).expect("a test finds every selector");
        chosen(selector, when.is)
    });
    let conditions: Vec<_> = choices.chain(beside).collect();
    let nested = conditions.into_iter().rev().fold(
        innermost,
        |then, condition| json!({ "if": condition, "then": then }),
    );
    Some(nested)
}

fn object(value: Value) -> Map<String, Value> {
    match value {
        Value::Object(members) => members,
        _ => unreachable!("called with object literals only"),
    }
}
