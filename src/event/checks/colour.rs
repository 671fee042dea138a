//! Colour lines at leading colour: each has two ends.

use super::super::{Parton, Status};
use super::{CheckRules, Imbalance, daughters_by_parent, is_exchange};
use crate::qcd::Species;

/// Checks that partons carry the tags of their species, that every line of the final partons ends in one colour and
/// one anticolour, and (`full` history) that lines go on through every vertex.
///
/// A source without recoiler leaves the lines of its hard parton open: final partons then must end in just these.
pub fn check_colour(rows: &[Parton], rules: &CheckRules, found: &mut Vec<Imbalance>) {
    for (row, parton) in rows.iter().enumerate().filter(|(_, row)| !is_exchange(row)) {
        check_species(row, parton, found);
    }
    let mut ends = LineEnds::default();
    for parton in rows.iter().filter(|row| row.status == Status::Final) {
        ends.add(parton);
    }
    if rules.open_colour_lines > 0 {
        let mut open = 0;
        for parton in rows.iter().filter(|row| row.status == Status::Hard) {
            ends.add_opposite(parton);
            open += i32::from(parton.colour != 0) + i32::from(parton.anticolour != 0);
        }
        if open != rules.open_colour_lines {
            found.push(Imbalance::of_event(
                format!(
                    "the hard parton opens {open} colour lines, the file says {}",
                    rules.open_colour_lines
                ),
                f64::from(open - rules.open_colour_lines),
            ));
        }
    }
    if let Some(tag) = ends.unbalanced() {
        found.push(Imbalance::of_event(
            format!("colour line {tag} of the final partons has no two ends"),
            0.0,
        ));
    }
    if rules.full_history {
        check_vertices(rows, found);
    }
}

fn check_species(row: usize, parton: &Parton, found: &mut Vec<Imbalance>) {
    let Some(species) = Species::from_pdg(parton.pdg) else {
        return;
    };
    let colour_due = !species.is_antiquark();
    let anticolour_due = species.is_gluon() || species.is_antiquark();
    let (colour, anticolour) = (parton.colour, parton.anticolour);
    let closed_on_itself = colour != 0 && colour == anticolour;
    if (colour != 0) != colour_due
        || (anticolour != 0) != anticolour_due
        || colour < 0
        || anticolour < 0
        || closed_on_itself
    {
        found.push(Imbalance::of_row(
            row,
            format!(
                "colour tags {colour}, {anticolour} do not fit a {}",
                species.name()
            ),
            0.0,
        ));
    }
}

fn check_vertices(rows: &[Parton], found: &mut Vec<Imbalance>) {
    for (row, daughters) in daughters_by_parent(rows).iter().enumerate() {
        if daughters.is_empty() {
            continue;
        }
        let mut ends = LineEnds::default();
        ends.add_opposite(&rows[row]);
        for daughter in daughters {
            ends.add(&rows[*daughter]);
        }
        if let Some(tag) = ends.unbalanced() {
            found.push(Imbalance::of_row(
                row,
                format!("colour line {tag} does not go on through the vertex"),
                0.0,
            ));
        }
    }
}

/// Ends of colour lines: a tag with +1 for a colour, -1 for an anticolour.
#[derive(Default)]
struct LineEnds(Vec<(i32, i32)>);

impl LineEnds {
    fn add(&mut self, parton: &Parton) {
        self.push(parton.colour, 1);
        self.push(parton.anticolour, -1);
    }

    fn add_opposite(&mut self, parton: &Parton) {
        self.push(parton.colour, -1);
        self.push(parton.anticolour, 1);
    }

    fn push(&mut self, tag: i32, end: i32) {
        if tag != 0 {
            self.0.push((tag, end));
        }
    }

    /// The first tag that does not occur exactly once with each sign.
    fn unbalanced(mut self) -> Option<i32> {
        self.0.sort_unstable();
        self.0
            .chunk_by(|a, b| a.0 == b.0)
            .find(|ends| !matches!(ends, [(_, -1), (_, 1)]))
            .map(|ends| ends[0].0)
    }
}
