//! Reading a temperature field: HDF5 as `xarray.Dataset.to_netcdf(engine="h5netcdf")` and netCDF-4 write it.

mod error;
mod flow;
pub(super) mod units;
pub(super) mod variable;

use std::io::Read;
use std::path::Path;

use hdf5::File;

pub use error::{FieldFileError, FieldProblem};

use crate::files::hdf5_calls::{expect_regular, open_to_read};
use crate::medium::field::FieldData;
use units::{AREA_DENSITY, LENGTH, NUMBER, Quantity, TEMPERATURE};
use variable::Variable;

/// Memory that a field may take.
const MEMORY_LIMIT_BYTES: u128 = 2 << 30;
/// Arrays of the grid's size that a field with flow needs: temperature and three components.
const LARGEST_ARRAY_COUNT: u128 = 4;
/// Hotter than any collision: the unit must be wrong.
const LARGEST_TEMPERATURE_GEV: f64 = 5.0;
/// Hotter than expected: worth a warning.
const UNUSUAL_TEMPERATURE_GEV: f64 = 1.0;

/// First bytes of an HDF5 file (without a user block).
pub(super) const HDF5_SIGNATURE: [u8; 8] = *b"\x89HDF\r\n\x1a\n";
/// First bytes of the classic netCDF formats.
pub(super) const NETCDF3_SIGNATURE: [u8; 3] = *b"CDF";

/// Axes without space-time rapidity, in the order of [`FieldData`].
const PLANE_AXES: [&str; 3] = ["tau", "x", "y"];
/// Axes with space-time rapidity, in the order of [`FieldData`].
const FULL_AXES: [&str; 4] = ["tau", "x", "y", "eta"];

/// Reads and checks a temperature field.
///
/// Variable `temperature` over dimensions `tau`, `x`, `y` and perhaps `eta` (recognised by dimension name, in any
/// order), perhaps flow (`ux`, `uy`, `ueta` or `vx`, `vy`, `veta`) and `collision_density`. Packed values are
/// unpacked and units converted.
///
/// # Errors
/// [`FieldFileError`] with the first problem found and its remedy. Memory is taken only after declared sizes are
/// checked; damaged and foreign files are refused.
pub fn read_field(path: &Path) -> Result<FieldData, FieldFileError> {
    read_checked(path).map_err(|problem| FieldFileError {
        path: path.to_owned(),
        problem: Box::new(problem),
    })
}

/// Checks everything about a temperature field but the values of temperature and flow, which are not read and stay empty
/// in what is returned.
///
/// # Errors
/// As [`read_field`].
pub fn read_outline(path: &Path) -> Result<FieldData, FieldFileError> {
    let outline = open(path).and_then(|opened| {
        flow::check(&opened.file, opened.axes, &opened.lengths)?;
        outline(&opened)
    });
    outline.map_err(|problem| FieldFileError {
        path: path.to_owned(),
        problem: Box::new(problem),
    })
}

fn read_checked(path: &Path) -> Result<FieldData, FieldProblem> {
    let opened = open(path)?;
    let mut data = outline(&opened)?;
    let Opened {
        file,
        temperature,
        axes,
        lengths,
    } = opened;
    data.temperature_gev = read_temperature(&temperature, axes, &lengths)?;
    data.flow = flow::read(&file, axes, &lengths)?;
    warn_about_temperature(&mut data);
    Ok(data)
}

/// A file whose temperature has the right shape.
struct Opened {
    file: File,
    temperature: Variable,
    axes: &'static [&'static str],
    lengths: Vec<usize>,
}

fn open(path: &Path) -> Result<Opened, FieldProblem> {
    expect_regular(path).map_err(FieldProblem::Unreadable)?;
    check_signature(path)?;
    let file = open_to_read(path).map_err(FieldProblem::Unreadable)?;
    let temperature = require(&file, "temperature", &TEMPERATURE)?;
    let axes: &'static [&'static str] = if temperature.axes.iter().any(|axis| axis == "eta") {
        &FULL_AXES
    } else {
        &PLANE_AXES
    };
    let lengths = axis_lengths(&temperature, axes)?;
    check_memory(&lengths)?;
    Ok(Opened {
        file,
        temperature,
        axes,
        lengths,
    })
}

/// Axes and collision density.
fn outline(opened: &Opened) -> Result<FieldData, FieldProblem> {
    let Opened { file, lengths, .. } = opened;
    let mut data = FieldData {
        tau_fm: read_axis(file, "tau", lengths[0], &LENGTH)?,
        x_fm: read_axis(file, "x", lengths[1], &LENGTH)?,
        y_fm: read_axis(file, "y", lengths[2], &LENGTH)?,
        ..FieldData::default()
    };
    if let Some(length) = lengths.get(3) {
        data.eta = Some(read_axis(file, "eta", *length, &NUMBER)?);
    }
    check_start(data.tau_fm[0])?;
    data.collision_density_per_fm2 = read_collision_density(file, lengths)?;
    Ok(data)
}

fn check_signature(path: &Path) -> Result<(), FieldProblem> {
    let unreadable = |error: std::io::Error| FieldProblem::Unreadable(error.to_string());
    let mut start = Vec::new();
    std::fs::File::open(path)
        .map_err(unreadable)?
        .take(HDF5_SIGNATURE.len() as u64)
        .read_to_end(&mut start)
        .map_err(unreadable)?;
    if start.starts_with(&NETCDF3_SIGNATURE) {
        return Err(FieldProblem::NetCdf3);
    }
    if start != HDF5_SIGNATURE {
        return Err(FieldProblem::NotHdf5);
    }
    Ok(())
}

fn require(file: &File, name: &'static str, quantity: &Quantity) -> Result<Variable, FieldProblem> {
    Variable::find(file, name, quantity)?.ok_or_else(|| FieldProblem::Missing {
        name,
        found: names_in(file),
        remedy: format!("call the variable \"{name}\""),
    })
}

pub(super) fn names_in(file: &File) -> String {
    match file.member_names() {
        Ok(names) if names.is_empty() => "nothing".into(),
        Ok(names) => names.join(", "),
        Err(error) => error.to_string(),
    }
}

fn axis_lengths(temperature: &Variable, axes: &[&str]) -> Result<Vec<usize>, FieldProblem> {
    let lengths: Vec<usize> = axes
        .iter()
        .map(|axis| temperature.length(axis).unwrap_or(0))
        .collect();
    let shape_problem = |problem: String| FieldProblem::Shape {
        name: temperature.name.clone(),
        problem,
    };
    if temperature.axes.len() != axes.len() || lengths.contains(&0) {
        return Err(shape_problem(format!(
            "has dimensions ({}) with lengths {lengths:?} along ({}); must be over tau, x, y and perhaps eta, in any order, none of them empty",
            temperature.axes.join(", "),
            axes.join(", "),
        )));
    }
    match axes.iter().zip(&lengths).find(|(_, length)| **length == 1) {
        Some((axis, _)) => Err(shape_problem(format!(
            "dimension {axis} has one point, at least two are needed to interpolate; repeat the slice at a second {axis}, or (for eta) drop the dimension: dataset.isel({axis}=0)"
        ))),
        None => Ok(lengths),
    }
}

fn check_memory(lengths: &[usize]) -> Result<(), FieldProblem> {
    let points: u128 = lengths.iter().map(|length| *length as u128).product();
    let bytes = points * LARGEST_ARRAY_COUNT * size_of::<f32>() as u128;
    if bytes > MEMORY_LIMIT_BYTES {
        return Err(FieldProblem::TooLarge {
            points,
            bytes,
            limit: MEMORY_LIMIT_BYTES,
        });
    }
    Ok(())
}

/// Reads one coordinate: as long as its axis, finite, strictly increasing.
fn read_axis(
    file: &File,
    name: &'static str,
    length: usize,
    quantity: &Quantity,
) -> Result<Vec<f64>, FieldProblem> {
    let shape_problem = |problem: String| FieldProblem::Shape {
        name: name.to_owned(),
        problem,
    };
    let missing = FieldProblem::Missing {
        name,
        found: names_in(file),
        remedy: format!("give the dimension coordinates: dataset.assign_coords({name}=...)"),
    };
    // a dimension that has only a name is stored as a scale without values
    let bare = file.dataset(name).is_ok_and(|scale| {
        matches!(crate::files::attributes::get_text(&scale, "NAME"), Ok(Some(text)) if text.starts_with("This is a netCDF dimension but not"))
    });
    if bare {
        return Err(missing);
    }
    let coordinate = Variable::find(file, name, quantity)?.ok_or(missing)?;
    coordinate.expect_axes(&[name], &[length])?;
    let mut values = vec![0.0; length];
    coordinate.read(&[name], |place, value| {
        values[place] = value;
        Ok(())
    })?;
    match values.windows(2).position(|pair| pair[0] >= pair[1]) {
        Some(place) => Err(shape_problem(format!(
            "must be strictly increasing, but {name}[{place}] = {} is followed by {}; dataset.sortby(\"{name}\")",
            values[place],
            values[place + 1]
        ))),
        None => Ok(values),
    }
}

fn check_start(tau_fm: f64) -> Result<(), FieldProblem> {
    if tau_fm >= 0.0 {
        return Ok(());
    }
    Err(FieldProblem::Value {
        name: "tau".into(),
        value: format!("{tau_fm} fm"),
        place: "tau[0]".into(),
        problem: "proper time is not negative".into(),
    })
}

fn read_temperature(
    variable: &Variable,
    axes: &[&str],
    lengths: &[usize],
) -> Result<Vec<f32>, FieldProblem> {
    let mut values = vec![0.0; lengths.iter().product()];
    variable.read(axes, |place, value| {
        let problem = if value < 0.0 {
            "a temperature is not negative; write 0 where there is no medium".to_owned()
        } else if value > LARGEST_TEMPERATURE_GEV {
            format!(
                "at most {LARGEST_TEMPERATURE_GEV} GeV is believed; are the units right (MeV given as GeV)?"
            )
        } else {
            values[place] = value as f32;
            return Ok(());
        };
        Err(FieldProblem::Value {
            name: variable.name.clone(),
            value: format!("{value} GeV"),
            place: grid_place(place, axes, lengths),
            problem,
        })
    })?;
    Ok(values)
}

/// A place in C order, in words.
fn grid_place(place: usize, axes: &[&str], lengths: &[usize]) -> String {
    let mut rest = place;
    let mut parts: Vec<_> = axes
        .iter()
        .zip(lengths)
        .rev()
        .map(|(axis, length)| {
            let index = rest % length;
            rest /= length;
            format!("{axis}[{index}]")
        })
        .collect();
    parts.reverse();
    parts.join(" ")
}

fn read_collision_density(
    file: &File,
    lengths: &[usize],
) -> Result<Option<Vec<f64>>, FieldProblem> {
    let Some(variable) = Variable::find(file, "collision_density", &AREA_DENSITY)? else {
        return Ok(None);
    };
    let (axes, lengths) = (&PLANE_AXES[1..], &lengths[1..3]);
    variable.expect_axes(axes, lengths)?;
    let mut values = vec![0.0; lengths.iter().product()];
    variable.read(axes, |place, value| {
        if value < 0.0 {
            return Err(FieldProblem::Value {
                name: variable.name.clone(),
                value: format!("{value} fm^-2"),
                place: grid_place(place, axes, lengths),
                problem: "a density is not negative".into(),
            });
        }
        values[place] = value;
        Ok(())
    })?;
    Ok(Some(values))
}

fn warn_about_temperature(data: &mut FieldData) {
    let largest = data.temperature_gev.iter().copied().fold(0.0, f32::max);
    if f64::from(largest) > UNUSUAL_TEMPERATURE_GEV {
        data.warnings.push(format!(
            "the largest temperature is {largest} GeV, above {UNUSUAL_TEMPERATURE_GEV} GeV; are the units right?"
        ));
    }
    if largest == 0.0 {
        data.warnings
            .push("the temperature is 0 everywhere: there is no medium".into());
    }
}
