//! Reading a list of birth places: comma-separated values with the header `x_fm,y_fm,weight`.

use std::path::Path;

use super::number_table::{
    Fault, TableFileError, TableProblem, has_columns, lines_of, quote, read_text, rows_of,
};
use crate::medium::origin::PlaceList;

const COLUMNS: [&str; 3] = ["x_fm", "y_fm", "weight"];
/// Places further out than this are taken for a mistake of units.
const LARGEST_FM: f64 = 100.0;

/// Reads and checks a list of places.
///
/// Lengths in fm, weights not negative, at least one of them above 0; the same place may stand in several rows.
///
/// # Errors
/// [`TableFileError`] with the first problem found, its line and its remedy.
pub fn read_place_list(path: &Path) -> Result<PlaceList, TableFileError> {
    read_checked(path).map_err(|fault| fault.of(path))
}

fn read_checked(path: &Path) -> Result<PlaceList, Fault> {
    let text = read_text(path)?;
    let mut lines = lines_of(&text);
    let (header_line, header) = lines.next().unwrap_or((1, ""));
    if !has_columns(header, &COLUMNS) {
        let problem = TableProblem::Header {
            found: quote(header),
            allowed: format!("\"{}\"", COLUMNS.join(",")),
            remedy: "name the columns in the first line; lengths are in fm".to_owned(),
        };
        return Err(problem.on(header_line));
    }
    let table = rows_of(header, lines, COLUMNS)?;
    for (line, [x, y, weight]) in table.lines.iter().zip(&table.rows) {
        check(*x, *y, *weight).map_err(|problem| problem.on(*line))?;
    }
    let places = table.rows.iter().map(|[x, y, _]| [*x, *y]).collect();
    let weights: Vec<f64> = table.rows.iter().map(|[_, _, weight]| *weight).collect();
    let empty = |error| TableProblem::Grid(format!("{error}"));
    Ok(PlaceList::new(places, &weights).map_err(empty)?)
}

fn check(x: f64, y: f64, weight: f64) -> Result<(), TableProblem> {
    for (column, value) in [("x_fm", x), ("y_fm", y)] {
        if value.abs() > LARGEST_FM {
            return Err(TableProblem::Value {
                column: column.to_owned(),
                found: value.to_string(),
                allowed: format!("-{LARGEST_FM} to {LARGEST_FM} fm"),
                remedy: "give lengths in fm".to_owned(),
            });
        }
    }
    if weight < 0.0 {
        return Err(TableProblem::Value {
            column: "weight".to_owned(),
            found: weight.to_string(),
            allowed: "0 or more".to_owned(),
            remedy: "drop the row or correct the weight".to_owned(),
        });
    }
    Ok(())
}
