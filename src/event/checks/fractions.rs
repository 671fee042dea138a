//! Light-cone fractions: shares of a whole.

use super::super::{Parton, Status};
use super::{CheckRules, Imbalance, daughters_by_parent, is_exchange};

/// Rounding of a sum of fractions: a product over some fifty branchings in single precision, 50 x 6e-8, with a
/// factor 3 to spare.
const FRACTION_TOLERANCE: f64 = 1e-5;
/// Below this, single precision loses digits.
const UNDERFLOW: f64 = f32::MIN_POSITIVE as f64;

/// Checks that fractions lie in (0, 1], that final partons share out each hard parton, and (`full` history) that
/// daughters share out their parent.
///
/// Events that exchanged momentum with the medium are exempt from the sums: the exchange rescales fractions.
pub fn check_fractions(rows: &[Parton], rules: &CheckRules, found: &mut Vec<Imbalance>) {
    for (row, parton) in rows.iter().enumerate().filter(|(_, row)| !is_exchange(row)) {
        for (fraction, least) in [
            (parton.splitting_fraction, f32::MIN_POSITIVE),
            (parton.jet_fraction, 0.0),
        ] {
            // The product of many fractions may underflow in the file's single precision.
            if !(fraction >= least && f64::from(fraction) <= 1.0 + FRACTION_TOLERANCE) {
                found.push(Imbalance::of_row(
                    row,
                    "a fraction lies outside (0, 1]",
                    f64::from(fraction),
                ));
            }
        }
    }
    if rows.iter().any(is_exchange) {
        return;
    }
    check_shares_of_hard(rows, found);
    if rules.full_history {
        check_shares_of_parent(rows, found);
    }
}

fn check_shares_of_hard(rows: &[Parton], found: &mut Vec<Imbalance>) {
    let mut hard_of = vec![0; rows.len()];
    let mut shares = vec![0.0; rows.len()];
    for (row, parton) in rows.iter().enumerate() {
        // parents stand first, so theirs is known
        hard_of[row] = usize::try_from(parton.parent).map_or(row, |parent| hard_of[parent]);
        if parton.status == Status::Final {
            shares[hard_of[row]] += f64::from(parton.jet_fraction);
        }
    }
    for (row, parton) in rows.iter().enumerate() {
        let excess = shares[row] - 1.0;
        if parton.status == Status::Hard && excess.abs() > FRACTION_TOLERANCE {
            found.push(Imbalance::of_row(
                row,
                "jet fractions of the final partons do not add up to 1",
                excess,
            ));
        }
    }
}

fn check_shares_of_parent(rows: &[Parton], found: &mut Vec<Imbalance>) {
    for (row, daughters) in daughters_by_parent(rows).iter().enumerate() {
        if daughters.is_empty() {
            continue;
        }
        let parent_fraction = f64::from(rows[row].jet_fraction);
        let mut excess = -1.0;
        for daughter in daughters {
            let splitting = f64::from(rows[*daughter].splitting_fraction);
            excess += splitting;
            let jet = f64::from(rows[*daughter].jet_fraction);
            if (jet - parent_fraction * splitting).abs()
                > FRACTION_TOLERANCE * parent_fraction + UNDERFLOW
            {
                found.push(Imbalance::of_row(
                    *daughter,
                    "the jet fraction is not the parent's times the splitting fraction",
                    jet - parent_fraction * splitting,
                ));
            }
        }
        if excess.abs() > FRACTION_TOLERANCE {
            found.push(Imbalance::of_row(
                row,
                "splitting fractions of the daughters do not add up to 1",
                excess,
            ));
        }
    }
}
