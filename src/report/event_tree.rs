//! One event's branching history as a tree.

use std::fmt::Write;

use super::numbers::significant;
use crate::event::{EventSummary, MediumExit, Parton, Status};
use crate::qcd::Species;

/// Levels that are indented; deeper ones stand below each other.
const INDENTED_LEVELS: usize = 64;
/// Significant digits of every number.
const DIGITS: i32 = 4;
/// Width of a column of numbers.
const NUMBER_WIDTH: usize = 11;
/// Width of the column that holds the tree.
const TREE_WIDTH: usize = 36;

/// The event in words, then its rows as a tree: daughters under their parent (`final` history: final partons under
/// their hard parton). `exits` holds an exit from the medium for every row, or nothing; `effects` names the channels
/// from 2 on.
pub fn event_tree(
    event: &EventSummary,
    rows: &[Parton],
    exits: &[MediumExit],
    effects: &[String],
) -> String {
    let mut text = heading(event, rows.len());
    let number = |name: &str| format!("{name:>NUMBER_WIDTH$}");
    let mut columns = vec!["energy", "virtuality", "fraction", "birth t", "x", "y", "z"];
    let mut units = vec!["GeV", "GeV", "", "fm", "fm", "fm", "fm"];
    if !exits.is_empty() {
        columns.extend(["exit t", "x", "y", "z", "exit T"]);
        units.extend(["fm", "fm", "fm", "fm", "GeV"]);
    }
    let [columns, units] = [columns, units].map(|words| words.into_iter().map(number));
    let columns: String = columns.collect();
    let _ = writeln!(text, "{:TREE_WIDTH$}{columns}  channel", "parton");
    let units: String = units.collect();
    let _ = writeln!(text, "{:TREE_WIDTH$}{units}", "");
    let daughters = daughters(rows);
    let mut open: Vec<(usize, String, &str)> = roots(rows)
        .into_iter()
        .rev()
        .map(|row| (row, String::new(), ""))
        .collect();
    while let Some((row, indent, joint)) = open.pop() {
        let named = format!(
            "{indent}{joint}{row} {} {}",
            name(&rows[row]),
            status(rows[row].status)
        );
        let numbers = numbers(&rows[row], exits.get(row));
        let channel = channel(rows[row].channel, effects);
        let _ = writeln!(text, "{named:TREE_WIDTH$}{numbers}  {channel}");
        let below = match joint {
            "" => String::new(),
            _ if indent.chars().count() >= 2 * INDENTED_LEVELS => indent,
            "└ " => indent + "  ",
            _ => indent + "│ ",
        };
        for (place, daughter) in daughters[row].iter().rev().enumerate() {
            let joint = if place == 0 { "└ " } else { "├ " };
            open.push((*daughter, below.clone(), joint));
        }
    }
    text
}

fn heading(event: &EventSummary, rows: usize) -> String {
    let [t, x, y, z] = event
        .origin_fm
        .map(|value| significant(value.into(), DIGITS));
    let medium = if event.field < 0 {
        "no medium".to_owned()
    } else {
        format!("temperature field {}", event.field)
    };
    format!(
        "event {}: weight {} (hard process {}), hard scale {} GeV, {rows} rows\nhard vertex at t {t}, x {x}, y {y}, z {z} fm; {medium}\n",
        event.id,
        significant(event.weight, DIGITS),
        significant(event.source_weight, DIGITS),
        significant(event.hard_scale_gev, DIGITS),
    )
}

/// Rows whose parent does not stand before them.
fn roots(rows: &[Parton]) -> Vec<usize> {
    (0..rows.len())
        .filter(|row| parent(rows, *row).is_none())
        .collect()
}

fn parent(rows: &[Parton], row: usize) -> Option<usize> {
    let parent = usize::try_from(rows[row].parent).ok()?;
    (parent < row).then_some(parent)
}

fn daughters(rows: &[Parton]) -> Vec<Vec<usize>> {
    let mut daughters = vec![Vec::new(); rows.len()];
    for row in 0..rows.len() {
        if let Some(parent) = parent(rows, row) {
            daughters[parent].push(row);
        }
    }
    daughters
}

/// The columns of numbers of a row; a dash stands for an exit that is not there.
fn numbers(parton: &Parton, exit: Option<&MediumExit>) -> String {
    let squared = f64::from(parton.virtuality_squared_gev2);
    let virtuality = squared.abs().sqrt().copysign(squared);
    let [t, x, y, z] = parton.birth_fm.map(f64::from);
    let mut numbers = vec![
        parton.momentum_gev[3],
        virtuality,
        f64::from(parton.splitting_fraction),
        t,
        x,
        y,
        z,
    ];
    if let Some(exit) = exit {
        numbers.extend(exit.place_fm.map(f64::from));
        numbers.push(exit.temperature_gev.into());
    }
    let words = numbers.into_iter().map(|value| match value {
        _ if value.is_nan() => "-".to_owned(),
        _ => significant(value, DIGITS),
    });
    words.map(|word| format!("{word:>NUMBER_WIDTH$}")).collect()
}

fn name(parton: &Parton) -> String {
    match Species::from_pdg(parton.pdg) {
        Some(species) => species.name().to_owned(),
        None if parton.pdg == 0 => "momentum".to_owned(),
        None => parton.pdg.to_string(),
    }
}

fn status(status: Status) -> &'static str {
    match status {
        Status::Final => "final",
        Status::Branched => "branched",
        Status::Hard => "hard",
        Status::GivenToMedium => "given to the medium",
        Status::TakenFromMedium => "taken from the medium",
    }
}

fn channel(channel: u8, effects: &[String]) -> &str {
    match channel {
        crate::event::CHANNEL_HARD_PROCESS => "hard process",
        crate::event::CHANNEL_VACUUM => "vacuum",
        effect => effects
            .get(usize::from(effect - crate::event::CHANNEL_FIRST_EFFECT))
            .map_or("unknown", String::as_str),
    }
}
