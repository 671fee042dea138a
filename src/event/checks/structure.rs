//! Rows that refer to each other as the record promises.

use super::super::{NO_PARENT, Parton, Status};
use super::{CheckRules, Imbalance, daughters_by_parent, is_exchange};
use crate::qcd::Species;

/// Checks parents, numbers of daughters, species and that every number is finite.
pub fn check_structure(rows: &[Parton], rules: &CheckRules, found: &mut Vec<Imbalance>) {
    for (row, parton) in rows.iter().enumerate() {
        check_numbers(row, parton, found);
        check_parent(rows, row, parton, rules, found);
    }
    if found.is_empty() && rules.full_history {
        check_daughters(rows, found);
    }
}

fn check_numbers(row: usize, parton: &Parton, found: &mut Vec<Imbalance>) {
    let momentum = parton.momentum_gev.iter().all(|value| value.is_finite());
    let birth = parton.birth_fm.iter().all(|value| value.is_finite());
    let scalars = [
        parton.virtuality_squared_gev2,
        parton.splitting_fraction,
        parton.jet_fraction,
    ];
    if !momentum || !birth || !scalars.iter().all(|value| value.is_finite()) {
        found.push(Imbalance::of_row(row, "a number is not finite", 0.0));
    }
    if is_exchange(parton) {
        return;
    }
    if Species::from_pdg(parton.pdg).is_none() {
        found.push(Imbalance::of_row(
            row,
            format!("particle number {} is no parton of a jet", parton.pdg),
            0.0,
        ));
    }
    let energy = parton.momentum_gev[3];
    if energy < 0.0 {
        found.push(Imbalance::of_row(row, "energy is negative (GeV)", energy));
    }
}

fn check_parent(
    rows: &[Parton],
    row: usize,
    parton: &Parton,
    rules: &CheckRules,
    found: &mut Vec<Imbalance>,
) {
    let parent = usize::try_from(parton.parent)
        .ok()
        .filter(|parent| *parent < row)
        .map(|parent| &rows[parent]);
    let problem = match (parton.status, parent) {
        (Status::Hard, _) if parton.parent == NO_PARENT => return,
        (Status::Hard, _) => "a hard parton has no parent",
        (_, None) => "the parent does not stand before its daughter",
        (Status::GivenToMedium | Status::TakenFromMedium, Some(_)) => return,
        (_, Some(parent)) if parent.status == Status::Hard => return,
        (_, Some(_)) if !rules.full_history => "the parent is no hard parton",
        (_, Some(parent)) if parent.status == Status::Branched => return,
        (_, Some(_)) => "the parent did not branch",
    };
    found.push(Imbalance::of_row(row, problem, f64::from(parton.parent)));
}

fn check_daughters(rows: &[Parton], found: &mut Vec<Imbalance>) {
    for (row, daughters) in daughters_by_parent(rows).iter().enumerate() {
        let expected = match rows[row].status {
            Status::Hard => 1,
            Status::Branched => 2,
            Status::Final | Status::GivenToMedium | Status::TakenFromMedium => 0,
        };
        if daughters.len() != expected {
            found.push(Imbalance::of_row(
                row,
                format!(
                    "{expected} daughters are due, there are {}",
                    daughters.len()
                ),
                daughters.len() as f64 - expected as f64,
            ));
        }
    }
}
