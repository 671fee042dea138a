//! The axes of a field file: their lengths, which must make a grid of a reasonable size, and their coordinates.

use hdf5::File;

use super::error::FieldProblem;
use super::names_in;
use super::units::{LENGTH, NUMBER, Quantity};
use super::variable::Variable;
use crate::files::attributes::get_text;
use crate::medium::field::Frame;

/// Axes without space-time rapidity, in the order of [`Frame`].
pub(super) const PLANE_AXES: [&str; 3] = ["tau", "x", "y"];
/// Axes with space-time rapidity, in the order of [`Frame`].
const FULL_AXES: [&str; 4] = ["tau", "x", "y", "eta"];
/// Grid points that a file may declare: more would take minutes to look through.
const MOST_POINTS: u128 = 1 << 31;

/// Names of the axes of a temperature, in the order of [`Frame`].
pub(super) fn names(temperature: &Variable) -> &'static [&'static str] {
    if temperature.axes.iter().any(|axis| axis == "eta") {
        &FULL_AXES
    } else {
        &PLANE_AXES
    }
}

/// Reads and checks the coordinates.
pub(super) fn read(file: &File, temperature: &Variable) -> Result<Frame, FieldProblem> {
    let lengths = axis_lengths(temperature, names(temperature))?;
    check_size(&lengths)?;
    let frame = Frame {
        tau_fm: read_axis(file, "tau", lengths[0], &LENGTH)?,
        x_fm: read_axis(file, "x", lengths[1], &LENGTH)?,
        y_fm: read_axis(file, "y", lengths[2], &LENGTH)?,
        eta: match lengths.get(3) {
            Some(length) => Some(read_axis(file, "eta", *length, &NUMBER)?),
            None => None,
        },
    };
    check_start(frame.tau_fm[0])?;
    Ok(frame)
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

fn check_size(lengths: &[usize]) -> Result<(), FieldProblem> {
    let points: u128 = lengths.iter().map(|length| *length as u128).product();
    if points > MOST_POINTS {
        return Err(FieldProblem::TooManyPoints {
            points,
            limit: MOST_POINTS,
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
        matches!(get_text(&scale, "NAME"), Ok(Some(text)) if text.starts_with("This is a netCDF dimension but not"))
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
