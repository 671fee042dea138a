//! Conservation and colour checks, used by tests and by `audit`.
//!
//! The rules are those of the event record: hard rows (status 3) on shell as the source supplied them, parents before
//! daughters, leading colour. Each check appends what it finds; nothing found means that the event is sound.

mod colour;
mod exits;
mod fractions;
mod momentum;
mod structure;

pub use colour::check_colour;
pub use exits::check_exits;
pub use fractions::check_fractions;
pub use momentum::{check_mass_shell, check_momentum};
pub use structure::check_structure;

use super::{Parton, Status};

/// Rounding of doubles that a conserved four-momentum may show, relative to the energy of the event.
pub const MOMENTUM_TOLERANCE: f64 = 1e-9;

/// What an event of a sample must satisfy.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct CheckRules {
    /// Every parton is recorded, not only hard and final ones.
    pub full_history: bool,
    /// Rows carry settled four-momenta; else collinear fractions, of which no conservation is asked.
    pub exact_kinematics: bool,
    /// Colour lines that a source without recoiler leaves open; 0 for sources that conserve four-momentum.
    pub open_colour_lines: i32,
    /// Largest imbalance of a four-momentum, relative to the energy of the event.
    pub momentum_tolerance: f64,
}

impl CheckRules {
    /// The tolerance for momenta kept with so many mantissa bits, `None` for all of them.
    ///
    /// Each component is off by at most 2^-(bits+1) of itself, so a sum over partons by at most that times the sum of
    /// their energies; both sides of a vertex together give 2^-bits.
    pub fn tolerance_of_bits(momentum_bits: Option<u8>) -> f64 {
        let rounding = momentum_bits.map_or(0.0, |bits| (-f64::from(bits)).exp2());
        MOMENTUM_TOLERANCE + rounding
    }
}

/// What does not balance in an event.
#[derive(Clone, Debug, PartialEq)]
pub struct Imbalance {
    /// The row within the event, `None` for the event as a whole.
    pub row: Option<usize>,
    /// What is wrong.
    pub what: String,
    /// By how much, in the unit that `what` names; 0 where there is no measure.
    pub by: f64,
}

impl Imbalance {
    fn of_row(row: usize, what: impl Into<String>, by: f64) -> Self {
        Imbalance {
            row: Some(row),
            what: what.into(),
            by,
        }
    }

    fn of_event(what: impl Into<String>, by: f64) -> Self {
        Imbalance {
            row: None,
            what: what.into(),
            by,
        }
    }
}

/// Everything that is wrong with the rows of one event.
///
/// Where the structure is broken (a parent that does not stand before its daughter, say) only that is reported: the
/// other checks follow parents.
pub fn check_event(rows: &[Parton], rules: &CheckRules) -> Vec<Imbalance> {
    let mut found = Vec::new();
    check_structure(rows, rules, &mut found);
    if !found.is_empty() {
        return found;
    }
    if rules.exact_kinematics {
        check_mass_shell(rows, rules, &mut found);
        check_momentum(rows, rules, &mut found);
    }
    check_fractions(rows, rules, &mut found);
    check_colour(rows, rules, &mut found);
    found
}

/// True for rows that stand for four-momentum exchanged with the medium.
fn is_exchange(row: &Parton) -> bool {
    matches!(row.status, Status::GivenToMedium | Status::TakenFromMedium)
}

/// Energy of the hard partons in GeV, the scale of tolerances.
fn hard_energy_gev(rows: &[Parton]) -> f64 {
    rows.iter()
        .filter(|row| row.status == Status::Hard)
        .map(|row| row.momentum_gev[3])
        .sum()
}

/// The two daughters (or the one primary) of each row, by parent; exchanges are no daughters.
fn daughters_by_parent(rows: &[Parton]) -> Vec<Vec<usize>> {
    let mut daughters = vec![Vec::new(); rows.len()];
    for (row, parton) in rows.iter().enumerate() {
        if !is_exchange(parton)
            && let Ok(parent) = usize::try_from(parton.parent)
        {
            daughters[parent].push(row);
        }
    }
    daughters
}
