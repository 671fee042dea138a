//! Small tables of numbers: their errors, and comma-separated values (a header that names the columns, then numbers).
//!
//! Blank lines and lines that start with '#' are skipped; columns may stand in any order; spaces around fields do not
//! count. Nothing is quoted, and a decimal point is a point.

use std::fs::File;
use std::io::Read;
use std::path::{Path, PathBuf};

use thiserror::Error;

use super::field_file::FieldProblem;
use super::hdf5_calls::expect_regular;

/// Larger files are not read.
pub(super) const LARGEST_BYTES: u64 = 64 << 20;
/// Longest piece of a file that is shown in a message, in characters.
const LONGEST_QUOTE: usize = 40;
const BYTE_ORDER_MARK: char = '\u{feff}';

/// Why a table of numbers cannot be used: the file, the line and the problem.
#[derive(Debug, Error)]
#[error("{}{}: {problem}", path.display(), at(*line))]
pub struct TableFileError {
    /// The file.
    pub path: PathBuf,
    /// The line, from 1, where it is one line's fault.
    pub line: Option<usize>,
    /// What is wrong.
    pub problem: Box<TableProblem>,
}

fn at(line: Option<usize>) -> String {
    line.map_or_else(String::new, |line| format!(":{line}"))
}

/// What is wrong with a table of numbers.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum TableProblem {
    /// No such file, no permission, not text.
    #[error("cannot be read: {0}")]
    Unreadable(String),
    /// A file that is too large to be meant.
    #[error("has {bytes} bytes; at most {LARGEST_BYTES} are read; thin the table")]
    TooLarge {
        /// Its size.
        bytes: u64,
    },
    /// Columns other than those wanted.
    #[error("the header is \"{found}\"; allowed: {allowed}; {remedy}")]
    Header {
        /// The first line that counts.
        found: String,
        /// The headers that are understood.
        allowed: String,
        /// What to do.
        remedy: String,
    },
    /// A line with more or fewer fields than the header.
    #[error(
        "has {found} fields, the header has {wanted}; separate fields by commas and leave none out"
    )]
    Fields {
        /// Number of fields.
        found: usize,
        /// Number of columns.
        wanted: usize,
    },
    /// A number that is none, or out of range.
    #[error("{column} is \"{found}\"; allowed: {allowed}; {remedy}")]
    Value {
        /// The column or variable.
        column: String,
        /// What stands there.
        found: String,
        /// What may.
        allowed: String,
        /// What to do.
        remedy: String,
    },
    /// Rows, or arrays, that do not fit together.
    #[error("{0}")]
    Grid(String),
    /// A variable of an HDF5 file.
    #[error(transparent)]
    Variable(#[from] FieldProblem),
}

/// A problem and its line, before the file is named.
#[derive(Debug)]
pub(super) struct Fault {
    line: Option<usize>,
    problem: Box<TableProblem>,
}

impl TableProblem {
    /// The fault of a line.
    pub(super) fn on(self, line: usize) -> Fault {
        Fault {
            line: Some(line),
            problem: Box::new(self),
        }
    }
}

impl<P: Into<TableProblem>> From<P> for Fault {
    /// The fault of a file as a whole.
    fn from(problem: P) -> Fault {
        Fault {
            line: None,
            problem: Box::new(problem.into()),
        }
    }
}

impl Fault {
    /// The fault as an error of a file.
    pub(super) fn of(self, path: &Path) -> TableFileError {
        TableFileError {
            path: path.to_owned(),
            line: self.line,
            problem: self.problem,
        }
    }
}

/// Numbers of a table: for each row its line in the file and its numbers in the order of the columns asked for.
pub(super) struct NumberTable<const N: usize> {
    pub(super) lines: Vec<usize>,
    pub(super) rows: Vec<[f64; N]>,
}

/// The text of a regular file of moderate size.
pub(super) fn read_text(path: &Path) -> Result<String, TableProblem> {
    let unreadable = |error: std::io::Error| TableProblem::Unreadable(error.to_string());
    expect_regular(path).map_err(TableProblem::Unreadable)?;
    let file = File::open(path).map_err(unreadable)?;
    let bytes = file.metadata().map_err(unreadable)?.len();
    if bytes > LARGEST_BYTES {
        return Err(TableProblem::TooLarge { bytes });
    }
    let mut text = Vec::new();
    // The file may grow meanwhile.
    file.take(LARGEST_BYTES)
        .read_to_end(&mut text)
        .map_err(unreadable)?;
    String::from_utf8(text).map_err(|_| {
        TableProblem::Unreadable(
            "it is not text in UTF-8; save it as comma-separated values".into(),
        )
    })
}

/// The lines of a text that count, with their numbers from 1.
pub(super) fn lines_of(text: &str) -> impl Iterator<Item = (usize, &str)> {
    text.trim_start_matches(BYTE_ORDER_MARK)
        .lines()
        .enumerate()
        .map(|(place, line)| (place + 1, line.trim()))
        .filter(|(_, line)| !line.is_empty() && !line.starts_with('#'))
}

/// Names of the columns in a header.
pub(super) fn names_of(header: &str) -> Vec<&str> {
    header.split(',').map(str::trim).collect()
}

/// Reads the rows below a header whose columns are these, in any order.
pub(super) fn rows_of<'a, const N: usize>(
    header: &str,
    lines: impl Iterator<Item = (usize, &'a str)>,
    columns: [&'static str; N],
) -> Result<NumberTable<N>, Fault> {
    let names = names_of(header);
    let places = columns.map(|column| {
        let place = names.iter().position(|name| *name == column);
        place.expect("the header was matched with the columns")
    });
    let mut table = NumberTable {
        lines: Vec::new(),
        rows: Vec::new(),
    };
    for (number, line) in lines {
        let row = row_of(line, &places, columns).map_err(|problem| problem.on(number))?;
        table.lines.push(number);
        table.rows.push(row);
    }
    Ok(table)
}

fn row_of<const N: usize>(
    line: &str,
    places: &[usize; N],
    columns: [&'static str; N],
) -> Result<[f64; N], TableProblem> {
    let fields: Vec<&str> = line.split(',').map(str::trim).collect();
    if fields.len() != N {
        return Err(TableProblem::Fields {
            found: fields.len(),
            wanted: N,
        });
    }
    let mut row = [0.0; N];
    for ((value, place), column) in row.iter_mut().zip(places).zip(columns) {
        *value = number(fields[*place], column)?;
    }
    Ok(row)
}

/// A finite number.
fn number(field: &str, column: &str) -> Result<f64, TableProblem> {
    match field.parse::<f64>() {
        Ok(value) if value.is_finite() => Ok(value),
        _ => Err(TableProblem::Value {
            column: column.to_owned(),
            found: quote(field),
            allowed: "a finite number such as 0.25 or 2.5e-1".to_owned(),
            remedy: "every row needs all its numbers; drop the row or fill it in".to_owned(),
        }),
    }
}

/// The beginning of a text, short enough for a message.
pub(super) fn quote(text: &str) -> String {
    let start: String = text.chars().take(LONGEST_QUOTE).collect();
    if start.len() < text.len() {
        format!("{start}...")
    } else {
        start
    }
}

/// Whether a header has exactly these columns, in any order.
pub(super) fn has_columns(header: &str, columns: &[&str]) -> bool {
    let names = names_of(header);
    names.len() == columns.len() && columns.iter().all(|column| names.contains(column))
}
