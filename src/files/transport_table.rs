//! Reading a transport coefficient over temperature and energy.
//!
//! As comma-separated values, with the header `temperature_GeV,qhat_GeV2_per_fm` or
//! `temperature_GeV,energy_GeV,qhat_GeV2_per_fm` (all combinations, sorted by temperature, then energy). As HDF5 or
//! netCDF-4: a variable `qhat` over the dimension `temperature` and perhaps `energy` (dimension scales), each with its
//! `units`.

use std::io::Read;
use std::path::Path;

use hdf5::File;

use super::field_file::units::{ENERGY, Quantity, TEMPERATURE, TRANSPORT};
use super::field_file::variable::Variable;
use super::field_file::{FieldProblem, HDF5_SIGNATURE, NETCDF3_SIGNATURE, names_in};
use super::hdf5_calls::{expect_regular, open_to_read};
use super::number_table::{
    Fault, TableFileError, TableProblem, has_columns, lines_of, quote, read_text, rows_of,
};
use crate::medium::transport::TransportTable;

const TEMPERATURE_COLUMN: &str = "temperature_GeV";
const ENERGY_COLUMN: &str = "energy_GeV";
const QHAT_COLUMN: &str = "qhat_GeV2_per_fm";
/// Hotter than any collision: the unit must be wrong.
const LARGEST_TEMPERATURE_GEV: f64 = 5.0;
/// More energetic than any parton here: the unit must be wrong.
const LARGEST_ENERGY_GEV: f64 = 1e6;
/// Stronger than any estimate by orders of magnitude: the unit must be wrong.
const LARGEST_QHAT_GEV2_PER_FM: f64 = 1e4;
/// More numbers than a table over two smooth variables can need.
const MOST_NUMBERS: usize = 4 << 20;

/// Reads and checks a transport table, as CSV or HDF5 by its first bytes.
///
/// # Errors
/// [`TableFileError`] with the first problem found, its line (CSV) and its remedy.
pub fn read_transport_table(path: &Path) -> Result<TransportTable, TableFileError> {
    read_checked(path).map_err(|fault| fault.of(path))
}

fn read_checked(path: &Path) -> Result<TransportTable, Fault> {
    let start = first_bytes(path)?;
    if start.starts_with(&NETCDF3_SIGNATURE) {
        return Err(FieldProblem::NetCdf3.into());
    }
    if start == HDF5_SIGNATURE {
        return Ok(read_hdf5(path)?);
    }
    read_csv(path)
}

fn first_bytes(path: &Path) -> Result<Vec<u8>, TableProblem> {
    let unreadable = |error: std::io::Error| TableProblem::Unreadable(error.to_string());
    expect_regular(path).map_err(TableProblem::Unreadable)?;
    let mut start = Vec::new();
    std::fs::File::open(path)
        .map_err(unreadable)?
        .take(HDF5_SIGNATURE.len() as u64)
        .read_to_end(&mut start)
        .map_err(unreadable)?;
    Ok(start)
}

/// One row: its line in the file and its numbers.
struct Row {
    line: usize,
    temperature_gev: f64,
    energy_gev: f64,
    qhat_gev2_per_fm: f64,
}

fn read_csv(path: &Path) -> Result<TransportTable, Fault> {
    let rows = read_rows(&read_text(path)?)?;
    for row in &rows {
        check_row(row).map_err(|problem| problem.on(row.line))?;
    }
    let [temperatures, energies] = axes_of(&rows)?;
    let values = rows.iter().map(|row| row.qhat_gev2_per_fm).collect();
    Ok(finish(temperatures, energies, values)?)
}

fn read_rows(text: &str) -> Result<Vec<Row>, Fault> {
    let mut lines = lines_of(text);
    let (header_line, header) = lines.next().unwrap_or((1, ""));
    let full = [TEMPERATURE_COLUMN, ENERGY_COLUMN, QHAT_COLUMN];
    let plain = [TEMPERATURE_COLUMN, QHAT_COLUMN];
    if has_columns(header, &full) {
        let table = rows_of(header, lines, full)?;
        let row =
            |(line, [temperature_gev, energy_gev, qhat_gev2_per_fm]): (usize, [f64; 3])| Row {
                line,
                temperature_gev,
                energy_gev,
                qhat_gev2_per_fm,
            };
        return Ok(table.lines.into_iter().zip(table.rows).map(row).collect());
    }
    if has_columns(header, &plain) {
        let table = rows_of(header, lines, plain)?;
        let row = |(line, [temperature_gev, qhat_gev2_per_fm]): (usize, [f64; 2])| Row {
            line,
            temperature_gev,
            energy_gev: 0.0,
            qhat_gev2_per_fm,
        };
        return Ok(table.lines.into_iter().zip(table.rows).map(row).collect());
    }
    let problem = TableProblem::Header {
        found: quote(header),
        allowed: format!("\"{}\" or \"{}\"", plain.join(","), full.join(",")),
        remedy: "name the columns in the first line and convert the numbers to these units"
            .to_owned(),
    };
    Err(problem.on(header_line))
}

fn check_row(row: &Row) -> Result<(), TableProblem> {
    check_range(
        TEMPERATURE_COLUMN,
        row.temperature_gev,
        LARGEST_TEMPERATURE_GEV,
        "GeV",
    )?;
    check_range(ENERGY_COLUMN, row.energy_gev, LARGEST_ENERGY_GEV, "GeV")?;
    check_range(
        QHAT_COLUMN,
        row.qhat_gev2_per_fm,
        LARGEST_QHAT_GEV2_PER_FM,
        "GeV^2/fm",
    )
}

fn check_range(name: &str, value: f64, largest: f64, unit: &str) -> Result<(), TableProblem> {
    if (0.0..=largest).contains(&value) {
        return Ok(());
    }
    Err(TableProblem::Value {
        column: name.to_owned(),
        found: value.to_string(),
        allowed: format!("0 to {largest} {unit}"),
        remedy: if value < 0.0 {
            "none of these is negative".to_owned()
        } else {
            "are the units right?".to_owned()
        },
    })
}

/// The axes of rows that are sorted by temperature, then energy, and hold all combinations.
fn axes_of(rows: &[Row]) -> Result<[Vec<f64>; 2], Fault> {
    for pair in rows.windows(2) {
        let (before, row) = (&pair[0], &pair[1]);
        let key = |row: &Row| (row.temperature_gev, row.energy_gev);
        if key(before) >= key(row) {
            let words = if key(before) == key(row) {
                "repeats the temperature (and energy) of the row before; keep one of them"
            } else {
                "has a lower temperature (or, at the same one, energy) than the row before; sort the rows by temperature, then energy"
            };
            return Err(TableProblem::Grid(words.to_owned()).on(row.line));
        }
    }
    let mut temperatures: Vec<f64> = rows.iter().map(|row| row.temperature_gev).collect();
    temperatures.dedup();
    let first = temperatures.first().copied();
    let energies: Vec<f64> = rows
        .iter()
        .take_while(|row| Some(row.temperature_gev) == first)
        .map(|row| row.energy_gev)
        .collect();
    // The combinations that should stand here, one after another.
    let mut wanted = temperatures
        .iter()
        .flat_map(|temperature| energies.iter().map(move |energy| (*temperature, *energy)));
    for row in rows {
        let here = (row.temperature_gev, row.energy_gev);
        let lacking = match wanted.next() {
            Some(next) if next == here => continue,
            Some(next) if next < here => next,
            // An energy that the first temperature does not have.
            _ => (first.unwrap_or(0.0), row.energy_gev),
        };
        return Err(missing(lacking).on(row.line));
    }
    match wanted.next() {
        Some(lacking) => Err(missing(lacking).into()),
        None => Ok([temperatures.clone(), energies.clone()]),
    }
}

fn missing((temperature, energy): (f64, f64)) -> TableProblem {
    TableProblem::Grid(format!(
        "all temperatures need the same energies, but there is no row with temperature {temperature} GeV and energy {energy} GeV; add the missing rows, or drop that energy everywhere"
    ))
}

fn finish(
    temperatures: Vec<f64>,
    energies: Vec<f64>,
    values: Vec<f64>,
) -> Result<TransportTable, TableProblem> {
    if temperatures.len() < 2 {
        return Err(TableProblem::Grid(format!(
            "holds {} temperatures, at least 2 are needed to interpolate; for one number use transport kind \"constant\"",
            temperatures.len()
        )));
    }
    TransportTable::new(temperatures, energies, values)
        .map_err(|error| TableProblem::Grid(error.to_string()))
}

fn read_hdf5(path: &Path) -> Result<TransportTable, TableProblem> {
    let file = open_to_read(path).map_err(TableProblem::Unreadable)?;
    let qhat = require(&file, "qhat", &TRANSPORT)?;
    let names: &[&'static str] = if qhat.axes.iter().any(|axis| axis == "energy") {
        &["temperature", "energy"]
    } else {
        &["temperature"]
    };
    let lengths: Vec<usize> = names
        .iter()
        .map(|axis| qhat.length(axis).unwrap_or(0))
        .collect();
    if qhat.axes.len() != names.len() || lengths.contains(&0) {
        return Err(TableProblem::Grid(format!(
            "variable \"qhat\" has dimensions ({}); must be over temperature and perhaps energy, none of them empty: name them by HDF5 dimension scales, as xarray's Dataset.to_netcdf does",
            qhat.axes.join(", ")
        )));
    }
    let numbers = lengths
        .iter()
        .try_fold(1_usize, |product, length| product.checked_mul(*length));
    if numbers.is_none_or(|numbers| numbers > MOST_NUMBERS) {
        return Err(TableProblem::Grid(format!(
            "variable \"qhat\" has lengths {lengths:?}; at most {MOST_NUMBERS} numbers are read; thin the table"
        )));
    }
    let temperatures = read_axis(
        &file,
        names[0],
        lengths[0],
        &TEMPERATURE,
        LARGEST_TEMPERATURE_GEV,
    )?;
    let energies = match lengths.get(1) {
        Some(length) => read_axis(&file, names[1], *length, &ENERGY, LARGEST_ENERGY_GEV)?,
        None => vec![0.0],
    };
    let values = read_values(&qhat, names, &lengths, LARGEST_QHAT_GEV2_PER_FM, "GeV^2/fm")?;
    finish(temperatures, energies, values)
}

fn require(file: &File, name: &'static str, quantity: &Quantity) -> Result<Variable, FieldProblem> {
    Variable::find(file, name, quantity)?.ok_or_else(|| FieldProblem::Missing {
        name,
        found: names_in(file),
        remedy: format!("call the variable \"{name}\""),
    })
}

fn read_axis(
    file: &File,
    name: &'static str,
    length: usize,
    quantity: &Quantity,
    largest_gev: f64,
) -> Result<Vec<f64>, TableProblem> {
    let coordinate = require(file, name, quantity)?;
    coordinate.expect_axes(&[name], &[length])?;
    read_values(&coordinate, &[name], &[length], largest_gev, "GeV")
}

/// Reads a variable in C order over `axes`; every number from 0 to `largest`.
fn read_values(
    variable: &Variable,
    axes: &[&str],
    lengths: &[usize],
    largest: f64,
    unit: &str,
) -> Result<Vec<f64>, TableProblem> {
    let mut values = vec![0.0; lengths.iter().product()];
    let mut wrong = None;
    let outcome = variable.read(axes, |place, value| {
        values[place] = value;
        if wrong.is_none() {
            wrong = check_range(&variable.name, value, largest, unit).err();
        }
        Ok(())
    });
    match (outcome, wrong) {
        // The remedy for holes in a field does not suit a table.
        (
            Err(FieldProblem::Value {
                name, value, place, ..
            }),
            _,
        ) => Err(TableProblem::Value {
            column: format!("{name} at {place}"),
            found: value,
            allowed: "a finite number".to_owned(),
            remedy: "fill the holes of the table, or cut them off".to_owned(),
        }),
        (Err(problem), _) => Err(problem.into()),
        (Ok(()), Some(problem)) => Err(problem),
        (Ok(()), None) => Ok(values),
    }
}
