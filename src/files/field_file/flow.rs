//! Flow of a field: four-velocity as it stands, three-velocity converted.

use std::ops::Range;

use hdf5::File;

use super::error::FieldProblem;
use super::names_in;
use super::units::NUMBER;
use super::variable::{Refusal, Variable};
use crate::medium::field::GridBuilder;

/// Four-velocity components beyond this (a Lorentz factor of 100) are taken for a mistake.
const LARGEST_FLOW: f64 = 100.0;
/// Four-velocity u^x, u^y, tau u^eta.
const FOUR_VELOCITY: [&str; 3] = ["ux", "uy", "ueta"];
/// Three-velocity dx/dtau, dy/dtau, tau deta/dtau.
const THREE_VELOCITY: [&str; 3] = ["vx", "vy", "veta"];

/// What takes the components of a flow at places in C order over a part of a grid.
pub(super) trait Sink {
    /// Sets a component (0 to 2: u^x, u^y, tau u^eta).
    fn set(&mut self, component: usize, place: usize, value: f32);

    /// Changes the flow at every place.
    fn change(
        &mut self,
        change: impl FnMut(usize, [f32; 3]) -> Result<[f32; 3], FieldProblem>,
    ) -> Result<(), FieldProblem>;
}

impl Sink for GridBuilder {
    fn set(&mut self, component: usize, place: usize, value: f32) {
        self.set_flow(component, place, value);
    }

    fn change(
        &mut self,
        change: impl FnMut(usize, [f32; 3]) -> Result<[f32; 3], FieldProblem>,
    ) -> Result<(), FieldProblem> {
        self.change_flow(change)
    }
}

impl Sink for [Vec<f32>; 3] {
    fn set(&mut self, component: usize, place: usize, value: f32) {
        self[component][place] = value;
    }

    fn change(
        &mut self,
        mut change: impl FnMut(usize, [f32; 3]) -> Result<[f32; 3], FieldProblem>,
    ) -> Result<(), FieldProblem> {
        for place in 0..self[0].len() {
            let changed = change(place, [0, 1, 2].map(|component| self[component][place]))?;
            for (component, value) in self.iter_mut().zip(changed) {
                component[place] = value;
            }
        }
        Ok(())
    }
}

/// Names of the flow's components in a file; `None` where it has no flow.
pub(super) fn names(file: &File) -> Result<Option<[&'static str; 3]>, FieldProblem> {
    let has = |names: &[&str]| names.iter().any(|name| file.link_exists(name));
    match (has(&FOUR_VELOCITY), has(&THREE_VELOCITY)) {
        (false, false) => Ok(None),
        (true, false) => Ok(Some(FOUR_VELOCITY)),
        (false, true) => Ok(Some(THREE_VELOCITY)),
        (true, true) => Err(FieldProblem::Contradiction(
            "holds both a four-velocity (ux, uy, ueta) and a three-velocity (vx, vy, veta); keep one of them".into(),
        )),
    }
}

/// Checks names, shapes and units, without reading values.
pub(super) fn check(file: &File, axes: &[&str], lengths: &[usize; 4]) -> Result<(), FieldProblem> {
    if let Some(names) = names(file)? {
        for name in names {
            find_component(file, names, name, axes, lengths)?;
        }
    }
    Ok(())
}

/// One component; `None` where it may be absent and is.
fn find_component(
    file: &File,
    names: [&'static str; 3],
    name: &'static str,
    axes: &[&str],
    lengths: &[usize; 4],
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
    variable.expect_axes(axes, &lengths[..axes.len()])?;
    Ok(Some(variable))
}

/// Reads the flow of a part of a grid into a sink, as four-velocity.
pub(super) fn read(
    file: &File,
    names: [&'static str; 3],
    axes: &[&str],
    lengths: &[usize; 4],
    part: &[Range<usize>],
    sink: &mut impl Sink,
) -> Result<(), FieldProblem> {
    for (component, name) in names.into_iter().enumerate() {
        let Some(variable) = find_component(file, names, name, axes, lengths)? else {
            continue;
        };
        variable.read_part(axes, part, |place, value| {
            if value.abs() <= LARGEST_FLOW {
                sink.set(component, place, value as f32);
                return Ok(());
            }
            Err(Refusal {
                value: value.to_string(),
                problem: format!("flow components lie between -{LARGEST_FLOW} and {LARGEST_FLOW}"),
            })
        })?;
    }
    if names == THREE_VELOCITY {
        sink.change(|place, velocity| {
            to_four_velocity(velocity).map_err(|refusal| FieldProblem::Value {
                name: THREE_VELOCITY.join(", "),
                value: refusal.value,
                place: grid_place(place, axes, part),
                problem: refusal.problem,
            })
        })?;
    }
    Ok(())
}

/// u = v / sqrt(1 - v^2).
fn to_four_velocity(velocity: [f32; 3]) -> Result<[f32; 3], Refusal> {
    let velocity = velocity.map(f64::from);
    let square: f64 = velocity.iter().map(|v| v * v).sum();
    if square >= 1.0 {
        return Err(Refusal {
            value: format!("{velocity:?} (speed {})", square.sqrt()),
            problem: "a velocity stays below 1; four-velocities are called ux, uy, ueta".into(),
        });
    }
    let gamma = 1.0 / (1.0 - square).sqrt();
    Ok(velocity.map(|v| (gamma * v) as f32))
}

/// A place in C order over a part of a grid, in words.
fn grid_place(place: usize, axes: &[&str], part: &[Range<usize>]) -> String {
    let mut rest = place;
    let mut words: Vec<_> = axes
        .iter()
        .zip(part)
        .rev()
        .map(|(axis, range)| {
            let index = range.start + rest % range.len();
            rest /= range.len();
            format!("{axis}[{index}]")
        })
        .collect();
    words.reverse();
    words.join(" ")
}
