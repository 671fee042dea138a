//! Flow of a field: four-velocity as it stands, three-velocity converted.

use hdf5::File;

use super::error::FieldProblem;
use super::units::NUMBER;
use super::variable::Variable;
use super::{grid_place, names_in};

/// Four-velocity components beyond this (a Lorentz factor of 100) are taken for a mistake.
const LARGEST_FLOW: f32 = 100.0;
/// Four-velocity u^x, u^y, tau u^eta.
const FOUR_VELOCITY: [&str; 3] = ["ux", "uy", "ueta"];
/// Three-velocity dx/dtau, dy/dtau, tau deta/dtau.
const THREE_VELOCITY: [&str; 3] = ["vx", "vy", "veta"];

/// Reads flow as four-velocity, `None` where the file has none.
pub(super) fn read(
    file: &File,
    axes: &[&str],
    lengths: &[usize],
) -> Result<Option<[Vec<f32>; 3]>, FieldProblem> {
    let Some(names) = names(file)? else {
        return Ok(None);
    };
    let mut flow = read_components(file, names, axes, lengths)?;
    if names == THREE_VELOCITY {
        to_four_velocity(&mut flow, axes, lengths)?;
    }
    Ok(Some(flow))
}

/// Checks names, shapes and units, without reading values.
pub(super) fn check(file: &File, axes: &[&str], lengths: &[usize]) -> Result<(), FieldProblem> {
    if let Some(names) = names(file)? {
        for name in names {
            find_component(file, names, name, axes, lengths)?;
        }
    }
    Ok(())
}

/// The names of the components that the file has, `None` where it has no flow.
fn names(file: &File) -> Result<Option<[&'static str; 3]>, FieldProblem> {
    let has = |names: &[&str]| names.iter().any(|name| file.link_exists(name));
    match (has(&FOUR_VELOCITY), has(&THREE_VELOCITY)) {
        (false, false) => Ok(None),
        (true, true) => Err(FieldProblem::Contradiction(
            "holds both a four-velocity (ux, uy, ueta) and a three-velocity (vx, vy, veta); keep one of them".into(),
        )),
        (true, false) => Ok(Some(FOUR_VELOCITY)),
        (false, true) => Ok(Some(THREE_VELOCITY)),
    }
}

/// One component; `None` where it may be absent and is.
fn find_component(
    file: &File,
    names: [&'static str; 3],
    name: &'static str,
    axes: &[&str],
    lengths: &[usize],
) -> Result<Option<Variable>, FieldProblem> {
    let Some(variable) = Variable::find(file, name, &NUMBER)? else {
        let longitudinal = name == names[2];
        // Without an eta axis the field is boost-invariant, and so is its flow.
        if longitudinal && !axes.contains(&"eta") {
            return Ok(None);
        }
        return Err(FieldProblem::Missing {
            name,
            found: names_in(file),
            remedy: format!("flow needs all of {}", names.join(", ")),
        });
    };
    variable.expect_axes(axes, lengths)?;
    Ok(Some(variable))
}

fn read_components(
    file: &File,
    names: [&'static str; 3],
    axes: &[&str],
    lengths: &[usize],
) -> Result<[Vec<f32>; 3], FieldProblem> {
    let points = lengths.iter().product();
    let mut flow = [vec![0f32; points], vec![0f32; points], vec![0f32; points]];
    for (name, component) in names.into_iter().zip(&mut flow) {
        let Some(variable) = find_component(file, names, name, axes, lengths)? else {
            continue;
        };
        variable.read(axes, |place, value| {
            component[place] = value as f32;
            if component[place].abs() <= LARGEST_FLOW {
                return Ok(());
            }
            Err(FieldProblem::Value {
                name: name.to_owned(),
                value: value.to_string(),
                place: grid_place(place, axes, lengths),
                problem: format!("flow components lie between -{LARGEST_FLOW} and {LARGEST_FLOW}"),
            })
        })?;
    }
    Ok(flow)
}

/// u = v / sqrt(1 - v^2), point by point.
fn to_four_velocity(
    flow: &mut [Vec<f32>; 3],
    axes: &[&str],
    lengths: &[usize],
) -> Result<(), FieldProblem> {
    for place in 0..flow[0].len() {
        let velocity = [flow[0][place], flow[1][place], flow[2][place]].map(f64::from);
        let square: f64 = velocity.iter().map(|v| v * v).sum();
        if square >= 1.0 {
            return Err(FieldProblem::Value {
                name: THREE_VELOCITY.join(", "),
                value: format!("{velocity:?} (speed {})", square.sqrt()),
                place: grid_place(place, axes, lengths),
                problem: "a velocity stays below 1; four-velocities are called ux, uy, ueta".into(),
            });
        }
        let gamma = 1.0 / (1.0 - square).sqrt();
        for (component, v) in flow.iter_mut().zip(velocity) {
            component[place] = (gamma * v) as f32;
        }
    }
    Ok(())
}
