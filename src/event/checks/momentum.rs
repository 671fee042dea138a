//! Four-momentum at every vertex and over the event.

use super::super::{Parton, Status};
use super::{CheckRules, Imbalance, daughters_by_parent, hard_energy_gev};

/// Rounding of a virtuality squared to single precision, with a factor 2 to spare.
const SINGLE_ROUNDING: f64 = 2.0 * f32::EPSILON as f64;

/// Checks E^2 - p^2 against the virtuality squared of every parton (0 for a massless final one).
///
/// A daughter is often the difference of its parent and its sister, hence off by a rounding of the event's energy:
/// the tolerance is that of the event times the parton's own energy.
pub fn check_mass_shell(rows: &[Parton], rules: &CheckRules, found: &mut Vec<Imbalance>) {
    let energy = hard_energy_gev(rows);
    for (row, parton) in rows.iter().enumerate() {
        if super::is_exchange(parton) {
            continue;
        }
        let [px, py, pz, own_energy] = parton.momentum_gev;
        let stated = f64::from(parton.virtuality_squared_gev2);
        let excess = (own_energy - pz) * (own_energy + pz) - px * px - py * py - stated;
        let allowed =
            2.0 * rules.momentum_tolerance * energy * own_energy + SINGLE_ROUNDING * stated.abs();
        if excess.abs() > allowed {
            found.push(Imbalance::of_row(
                row,
                "E^2 - p^2 differs from the virtuality squared (GeV^2)",
                excess,
            ));
        }
    }
}

/// Checks that four-momentum is conserved.
///
/// `full` history: daughters add up to their parent at every vertex, and primaries to the hard partons. Every history:
/// final partons add up to the hard ones (plus what was taken from the medium, minus what was given to it). A source
/// without recoiler conserves energy and, along its hard parton's direction only, not the longitudinal momentum.
pub fn check_momentum(rows: &[Parton], rules: &CheckRules, found: &mut Vec<Imbalance>) {
    let allowed = rules.momentum_tolerance * hard_energy_gev(rows);
    if rules.full_history {
        check_vertices(rows, allowed, found);
        let at_birth = primaries_at_birth(rows);
        check_against_hard(rows, at_birth, rules, allowed, "primaries", found);
    }
    let mut finals = sum(rows.iter().filter(|row| row.status == Status::Final));
    for exchange in rows.iter().filter(|row| super::is_exchange(row)) {
        add(&mut finals, exchange, -gain_sign(exchange));
    }
    check_against_hard(rows, finals, rules, allowed, "final partons", found);
}

fn primaries_at_birth(rows: &[Parton]) -> [f64; 4] {
    let mut total = sum(primaries(rows));
    for exchange in rows.iter().filter(|row| super::is_exchange(row)) {
        let owner = &rows[exchange.parent as usize];
        let is_primary =
            usize::try_from(owner.parent).is_ok_and(|parent| rows[parent].status == Status::Hard);
        if is_primary {
            add(&mut total, exchange, -gain_sign(exchange));
        }
    }
    total
}

fn primaries(rows: &[Parton]) -> impl Iterator<Item = &Parton> {
    rows.iter().filter(|row| {
        !super::is_exchange(row)
            && usize::try_from(row.parent).is_ok_and(|parent| rows[parent].status == Status::Hard)
    })
}

/// Daughters at birth add up to their parent at its vertex: what a daughter exchanged with the medium on its way is in
/// its row, and is taken out again.
fn check_vertices(rows: &[Parton], allowed: f64, found: &mut Vec<Imbalance>) {
    let mut gained = vec![[0.0; 4]; rows.len()];
    for row in rows.iter().filter(|row| super::is_exchange(row)) {
        add(&mut gained[row.parent as usize], row, gain_sign(row));
    }
    for (row, daughters) in daughters_by_parent(rows).iter().enumerate() {
        if rows[row].status != Status::Branched {
            continue;
        }
        let mut excess = sum(daughters.iter().map(|daughter| &rows[*daughter]));
        add(&mut excess, &rows[row], -1.0);
        for daughter in daughters {
            for (component, gain) in excess.iter_mut().zip(gained[*daughter]) {
                *component -= gain;
            }
        }
        let largest = largest_component(&excess);
        if largest > allowed {
            found.push(Imbalance::of_row(
                row,
                "daughters do not add up to their parent (GeV)",
                largest,
            ));
        }
    }
}

/// The sign with which an exchange row counts as a gain of the partons; 0 for other rows.
fn gain_sign(row: &Parton) -> f64 {
    match row.status {
        Status::GivenToMedium => -1.0,
        Status::TakenFromMedium => 1.0,
        _ => 0.0,
    }
}

fn check_against_hard(
    rows: &[Parton],
    total: [f64; 4],
    rules: &CheckRules,
    allowed: f64,
    who: &str,
    found: &mut Vec<Imbalance>,
) {
    let mut excess = total;
    for hard in rows.iter().filter(|row| row.status == Status::Hard) {
        add(&mut excess, hard, -1.0);
        if rules.open_colour_lines > 0 {
            remove_along(&mut excess, hard);
        }
    }
    let largest = largest_component(&excess);
    if largest > allowed {
        found.push(Imbalance::of_event(
            format!("{who} do not add up to the hard partons (GeV)"),
            largest,
        ));
    }
}

/// Takes away the part of a momentum along the direction of a parton.
fn remove_along(momentum: &mut [f64; 4], parton: &Parton) {
    let [px, py, pz, _] = parton.momentum_gev;
    let square = px * px + py * py + pz * pz;
    if square > 0.0 {
        let along = (momentum[0] * px + momentum[1] * py + momentum[2] * pz) / square;
        for (component, direction) in momentum.iter_mut().zip([px, py, pz]) {
            *component -= along * direction;
        }
    }
}

fn sum<'a>(rows: impl IntoIterator<Item = &'a Parton>) -> [f64; 4] {
    let mut total = [0.0; 4];
    for row in rows {
        add(&mut total, row, 1.0);
    }
    total
}

fn add(total: &mut [f64; 4], row: &Parton, sign: f64) {
    for (component, value) in total.iter_mut().zip(row.momentum_gev) {
        *component += sign * value;
    }
}

fn largest_component(momentum: &[f64; 4]) -> f64 {
    momentum
        .iter()
        .fold(0.0, |largest, value| value.abs().max(largest))
}
