//! One event's branching history as a tree.

use std::fmt::Write;

use super::numbers::significant;
use crate::event::{EventSummary, Parton, Status};
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
/// their hard parton). `effects` names the channels from 2 on.
pub fn event_tree(event: &EventSummary, rows: &[Parton], effects: &[String]) -> String {
    let mut text = heading(event, rows.len());
    let number = |name: &str| format!("{name:>NUMBER_WIDTH$}");
    let columns = ["energy", "virtuality", "fraction", "birth t", "x", "y", "z"].map(number);
    let _ = writeln!(
        text,
        "{:TREE_WIDTH$}{}  channel",
        "parton",
        columns.concat()
    );
    let units = ["GeV", "GeV", "", "fm", "fm", "fm", "fm"].map(number);
    let _ = writeln!(text, "{:TREE_WIDTH$}{}", "", units.concat());
    let daughters = daughters(rows);
    let mut open: Vec<(usize, String, &str)> = roots(rows)
        .into_iter()
        .rev()
        .map(|row| (row, String::new(), ""))
        .collect();
    while let Some((row, indent, joint)) = open.pop() {
        let _ = writeln!(text, "{}", line(row, &rows[row], &indent, joint, effects));
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

fn line(row: usize, parton: &Parton, indent: &str, joint: &str, effects: &[String]) -> String {
    let name = format!(
        "{indent}{joint}{row} {} {}",
        name(parton),
        status(parton.status)
    );
    let squared = f64::from(parton.virtuality_squared_gev2);
    let virtuality = squared.abs().sqrt().copysign(squared);
    let [t, x, y, z] = parton.birth_fm.map(f64::from);
    let numbers = [
        parton.momentum_gev[3],
        virtuality,
        f64::from(parton.splitting_fraction),
        t,
        x,
        y,
        z,
    ];
    let numbers = numbers.map(|value| format!("{:>NUMBER_WIDTH$}", significant(value, DIGITS)));
    format!(
        "{name:TREE_WIDTH$}{}  {}",
        numbers.concat(),
        channel(parton.channel, effects)
    )
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
