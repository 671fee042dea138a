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
        .filter(|key| key.need == Need::Required && key.when.is_empty())
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
    let conditions = conditions(section);
    if !conditions.is_empty() {
        members.insert("allOf".to_owned(), Value::Array(conditions));
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

/// One condition for each word of each key that others depend on: what it requires and what it forbids.
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
            } else if key.need == Need::Required {
                required.push(key.name);
            }
        }
    }
    let is_default = selector
        .default_text()
        .is_some_and(|text| text.trim_matches('"') == word);
    let needed: &[&str] = if is_default { &[] } else { &[selector.name] };
    json!({
        "if": { "properties": { selector.name: { "const": word } }, "required": needed },
        "then": { "required": required, "properties": forbidden },
    })
}

fn object(value: Value) -> Map<String, Value> {
    match value {
        Value::Object(members) => members,
        _ => unreachable!("called with object literals only"),
    }
}
