//! From one JSON value to the checked value of a key.

use serde_json::Value;

use super::complaint::{Complaint, allowed, describe, out_of_range, wrong_type};
use super::error::Problem;
use super::keys::{Choice, Form, Key, Range};
use super::nearest::nearest;
use super::raw::{Node, Shape};
use crate::qcd::Species;

/// Largest integer below which every integer is a double (2^53).
const LARGEST_EXACT: f64 = 9_007_199_254_740_992.0;

/// A finite number in a range.
pub fn number(key: &Key, range: Range, node: &Node) -> Result<Value, Complaint> {
    let allowed = || allowed(key, &Form::Number(range));
    let written = number_text(node, allowed)?;
    let value: f64 = written
        .parse()
        .expect("JSON numbers are numbers of Rust's grammar");
    if !range.contains(value) {
        return Err(out_of_range(key, node, allowed()));
    }
    // Adding zero turns -0.0, which is the same number with another digest, into 0.0.
    Ok(Value::from(value + 0.0))
}

/// An integer in a range, in any notation.
pub fn count(key: &Key, least: u64, most: u64, node: &Node) -> Result<Value, Complaint> {
    let allowed = || allowed(key, &Form::Count(least, most));
    let written = number_text(node, allowed)?;
    let value = match written.parse::<u64>() {
        Ok(value) => value,
        Err(_) => integral(written, node, allowed)?,
    };
    if !(least..=most).contains(&value) {
        return Err(out_of_range(key, node, allowed()));
    }
    Ok(Value::from(value))
}

/// An integer in another notation, like `2e4`.
fn integral(written: &str, node: &Node, allowed: impl Fn() -> String) -> Result<u64, Complaint> {
    let value: f64 = written
        .parse()
        .expect("JSON numbers are numbers of Rust's grammar");
    let complaint = |problem, remedy| Complaint::new(problem, describe(node), allowed(), remedy);
    if value.is_finite() && value.fract() != 0.0 {
        Err(complaint(Problem::WrongType, "write an integer"))
    } else if value < 0.0 {
        Err(complaint(
            Problem::OutOfRange,
            "choose a value in this range",
        ))
    } else if value > LARGEST_EXACT {
        let remedy = "choose a value in this range, with all its digits and no exponent";
        Err(complaint(Problem::OutOfRange, remedy))
    } else {
        Ok(value as u64)
    }
}

fn number_text(node: &Node, allowed: impl Fn() -> String) -> Result<&str, Complaint> {
    let remedy = match &node.shape {
        Shape::Number(text) => return Ok(text),
        Shape::Text(text) => match text.trim().parse::<f64>() {
            Ok(number) if number.is_finite() => "write the number without quotes",
            Ok(_) => "write a finite number",
            Err(_) => "write a number",
        },
        _ => "write a number",
    };
    Err(Complaint::new(
        Problem::WrongType,
        describe(node),
        allowed(),
        remedy,
    ))
}

/// `true` or `false`.
pub fn flag(node: &Node) -> Result<Value, Complaint> {
    match node.shape {
        Shape::Flag(flag) => Ok(Value::Bool(flag)),
        _ => Err(wrong_type(&Form::Flag, node)),
    }
}

/// One of some words.
pub fn choice(choices: &'static [Choice], node: &Node) -> Result<Value, Complaint> {
    let form = Form::Choice(choices);
    let Shape::Text(word) = &node.shape else {
        return Err(wrong_type(&form, node));
    };
    let complaint = |problem, remedy| Complaint::new(problem, describe(node), form.words(), remedy);
    match choices.iter().find(|choice| choice.name == word) {
        Some(choice) if choice.built => Ok(Value::from(choice.name)),
        Some(_) => Err(complaint(
            Problem::Planned,
            "choose another, or use a later version",
        )),
        None => {
            let near = nearest(word, choices.iter().map(|choice| choice.name));
            Err(complaint(Problem::UnknownChoice, "choose one of these").nearest(near))
        }
    }
}

/// The name of a parton.
pub fn parton(node: &Node) -> Result<Value, Complaint> {
    let Shape::Text(word) = &node.shape else {
        return Err(wrong_type(&Form::Parton, node));
    };
    if Species::from_name(word).is_some() {
        return Ok(Value::from(word.as_str()));
    }
    let complaint = Complaint::new(
        Problem::UnknownChoice,
        describe(node),
        Form::Parton.words(),
        "choose one of these; antiquarks end in bar",
    );
    Err(complaint.nearest(nearest(word, Species::names().iter().copied())))
}

/// A string, not empty where it names a file.
pub fn text(form: &Form, node: &Node) -> Result<Value, Complaint> {
    let may_be_empty = matches!(form, Form::SchemaAddress);
    match &node.shape {
        Shape::Text(text) if may_be_empty || !text.is_empty() => Ok(Value::from(text.as_str())),
        _ => Err(wrong_type(form, node)),
    }
}

/// An empty list.
pub fn empty_list(key: &Key, node: &Node) -> Result<Value, Complaint> {
    match &node.shape {
        Shape::List(items) if items.is_empty() => Ok(Value::Array(Vec::new())),
        Shape::List(_) => Err(Complaint::new(
            Problem::Planned,
            format!("{} for \"{}\"", describe(node), key.name),
            Form::EmptyList.words(),
            "remove it, or use a later version",
        )),
        _ => Err(wrong_type(&Form::EmptyList, node)),
    }
}
