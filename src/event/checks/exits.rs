//! Exits from the medium: there for final partons alone, and on their way.

use super::super::{EventSummary, MediumExit, Parton, Status};
use super::{CheckRules, Imbalance};

/// Allowance for the rounding of an exit's time and place to single precision, relative to their sizes: twice the largest.
const PLACE_TOLERANCE: f64 = f32::EPSILON as f64;

/// Checks that an exit is whole or absent, absent where it must be, and on the straight, light-like way from birth of
/// its parton. `exits` holds one for every row, or nothing where exits are not recorded.
pub fn check_exits(
    event: &EventSummary,
    rows: &[Parton],
    exits: &[MediumExit],
    rules: &CheckRules,
    found: &mut Vec<Imbalance>,
) {
    for (row, (parton, exit)) in rows.iter().zip(exits).enumerate() {
        if exit.is_none() {
            continue;
        }
        if let Some(what) = misplaced(event, parton, exit) {
            found.push(Imbalance::of_row(row, what, 0.0));
            continue;
        }
        let early_fm = exit.place_fm[0] - parton.birth_fm[0];
        if early_fm < 0.0 {
            let what = "it left the medium before its birth (fm)";
            found.push(Imbalance::of_row(row, what, early_fm.into()));
        } else if let Some(miss_fm) = miss_fm(parton, exit, rules) {
            let what = "the exit from the medium does not lie on its path (fm)";
            found.push(Imbalance::of_row(row, what, miss_fm));
        }
    }
}

/// Why there should be no exit, or another.
fn misplaced(event: &EventSummary, parton: &Parton, exit: &MediumExit) -> Option<&'static str> {
    if parton.status != Status::Final {
        Some("it has an exit from the medium, but is no final parton")
    } else if event.field < 0 {
        Some("it has an exit from the medium in an event without one")
    } else if !exit.numbers().iter().all(|number| number.is_finite()) {
        Some("the exit from the medium is there in part, or not finite")
    } else if exit.temperature_gev <= 0.0 {
        Some("the exit from the medium is cold")
    } else {
        None
    }
}

/// The largest distance along an axis between an exit and the path at its time, where rounding does not explain it.
fn miss_fm(parton: &Parton, exit: &MediumExit, rules: &CheckRules) -> Option<f64> {
    let [px, py, pz, _] = parton.momentum_gev;
    let momentum_gev = (px * px + py * py + pz * pz).sqrt();
    let birth = parton.birth_fm.map(f64::from);
    let place = exit.place_fm.map(f64::from);
    let length = place[0] - birth[0];
    (1..4)
        .map(|axis| {
            let direction = parton.momentum_gev[axis - 1] / momentum_gev;
            let off = (place[axis] - birth[axis] - direction * length).abs();
            let rounding = PLACE_TOLERANCE * (place[axis].abs() + place[0].abs());
            // A direction is as good as its momentum.
            (off, rounding + rules.momentum_tolerance * length)
        })
        .filter(|(off, allowed)| off > allowed)
        .map(|(off, _)| off)
        .reduce(f64::max)
}
