//! `spindrift field make`: writes a temperature field from an analytic flow.

use std::path::{Path, PathBuf};
use std::process::ExitCode;

use anyhow::{Context, bail};

use super::output::is_same;
use super::words::{bytes, say};
use crate::config::load;
use crate::files::field_file::{FieldOutline, PlanePoint, write_field};
use crate::medium::field::{Frame, TemperatureField, analytic};
use crate::medium::{FieldKind, FieldSettings};

/// More points than this along an axis are a mistake.
const MOST_POINTS: f64 = 10_000.0;
/// More points than this in all would make a file that nothing reads.
const MOST_POINTS_IN_ALL: f64 = 1e9;

/// What to write, and on which grid.
#[derive(Clone, Debug, clap::Args)]
pub struct MakeArgs {
    /// A config whose medium.field is longitudinal or radial; rotation_rad and shift_fm are applied
    #[arg(value_name = "CONFIG")]
    config: PathBuf,
    /// The field file to write
    #[arg(long, value_name = "FILE")]
    out: PathBuf,
    /// The grid reaches from -FM to FM in x and y
    #[arg(long, value_name = "FM", default_value_t = 10.0)]
    extent_fm: f64,
    /// Distance of the points in x and y
    #[arg(long, value_name = "FM", default_value_t = 0.25)]
    spacing_fm: f64,
    /// Distance of the slices in proper time
    #[arg(long, value_name = "FM", default_value_t = 0.1)]
    tau_step_fm: f64,
    /// Proper time of the last slice [default: the first after all is colder than the end temperature]
    #[arg(long, value_name = "FM")]
    last_tau_fm: Option<f64>,
    /// Replaces an existing file
    #[arg(long)]
    overwrite: bool,
}

/// Writes the field.
///
/// # Errors
/// A config without an analytic flow, a grid of absurd size, a file that exists or cannot be written.
pub(super) fn run(args: &MakeArgs) -> anyhow::Result<ExitCode> {
    let plan = load(&args.config)?;
    let Some(medium) = &plan.medium else {
        bail!(
            "{}: medium is null: there is no field to write",
            args.config.display()
        );
    };
    let settings = &medium.field;
    let field = flow(settings)?;
    check_output(&args.out, args.overwrite)?;
    if is_same(&args.config, &args.out) {
        bail!(
            "{} is the config itself; give another --out",
            args.out.display()
        );
    }
    let side_fm = args.extent_fm;
    let [x_fm, y_fm] = [(); 2].map(|()| steps(-side_fm, side_fm, args.spacing_fm, "--spacing-fm"));
    let mut frame = Frame {
        x_fm: x_fm?,
        y_fm: y_fm?,
        ..Frame::default()
    };
    frame.tau_fm = proper_times(args, settings, &*field, &frame)?;
    let points: f64 = frame
        .lengths()
        .iter()
        .map(|length| *length as f64)
        .product();
    if points > MOST_POINTS_IN_ALL {
        bail!(
            "{points:.0} points are more than {MOST_POINTS_IN_ALL:e}: take larger steps or less of the field"
        );
    }
    let title = format!("temperature field \"{}\", boost-invariant", kind(settings));
    let history = format!(
        "spindrift {} field make, medium.field = {}",
        env!("CARGO_PKG_VERSION"),
        plan.resolved["medium"]["field"]
    );
    let outline = FieldOutline {
        frame: &frame,
        title: &title,
        history: &history,
    };
    write_field(&args.out, &outline, |tau_fm| slice(&*field, &frame, tau_fm))
        .map_err(|error| std::io::Error::other(error.to_string()))
        .context("the field was not written")?;
    tell(args, &frame);
    Ok(ExitCode::SUCCESS)
}

fn kind(settings: &FieldSettings) -> &'static str {
    match settings.kind {
        FieldKind::Brick { .. } => "brick",
        FieldKind::Longitudinal { .. } => "longitudinal",
        FieldKind::Radial { .. } => "radial",
        FieldKind::Grid { .. } => "grid",
    }
}

fn flow(settings: &FieldSettings) -> anyhow::Result<std::sync::Arc<dyn TemperatureField>> {
    match (&settings.kind, analytic(settings)) {
        (FieldKind::Longitudinal { .. } | FieldKind::Radial { .. }, Some(field)) => Ok(field),
        (FieldKind::Brick { .. }, _) => bail!(
            "medium.field is a brick, which ends at a lab time and does not expand: a grid of proper time cannot hold it; take \"longitudinal\" or \"radial\""
        ),
        _ => bail!("medium.field is a grid already; take \"longitudinal\" or \"radial\""),
    }
}

fn check_output(out: &Path, overwrite: bool) -> anyhow::Result<()> {
    if out.is_dir() {
        bail!(
            "{} is a folder; give the name of a file with --out",
            out.display()
        );
    }
    if out.symlink_metadata().is_ok() && !overwrite {
        bail!(
            "{} exists; give another --out, or --overwrite",
            out.display()
        );
    }
    let folder = match out.parent() {
        Some(parent) if !parent.as_os_str().is_empty() => parent,
        _ => Path::new("."),
    };
    if !folder.is_dir() {
        bail!(
            "there is no folder {}; make it, or give another --out",
            folder.display()
        );
    }
    Ok(())
}

/// Even points from `first` to `last`, no farther apart than `step`.
fn steps(first: f64, last: f64, step: f64, option: &str) -> anyhow::Result<Vec<f64>> {
    let cells = ((last - first) / step).ceil();
    if !(1.0..MOST_POINTS).contains(&cells) || step <= 0.0 {
        bail!(
            "{option} {step}: from {first} to {last} fm this makes no grid of 2 to {MOST_POINTS} points"
        );
    }
    let width = (last - first) / cells;
    Ok((0..=cells as usize)
        .map(|place| first + width * place as f64)
        .collect())
}

/// Slices from the field's first proper time on: to the one asked for, or until all of the plane is cold.
fn proper_times(
    args: &MakeArgs,
    settings: &FieldSettings,
    field: &dyn TemperatureField,
    frame: &Frame,
) -> anyhow::Result<Vec<f64>> {
    let (first, step) = (field.first_tau_fm(), args.tau_step_fm);
    if let Some(last) = args.last_tau_fm {
        return steps(first, last, step, "--tau-step-fm");
    }
    if step.is_nan() || step <= 0.0 {
        bail!("--tau-step-fm {step}: must be above 0");
    }
    let mut taus = vec![first];
    loop {
        let tau_fm = first + step * taus.len() as f64;
        taus.push(tau_fm);
        let hot = |point: &PlanePoint| f64::from(point[0]) >= settings.end_temperature_gev;
        if !slice(field, frame, tau_fm).iter().any(hot) {
            return Ok(taus);
        }
        if taus.len() as f64 > MOST_POINTS {
            bail!(
                "the field is still hot after {tau_fm} fm; give --last-tau-fm, or a larger --tau-step-fm"
            );
        }
    }
}

fn slice(field: &dyn TemperatureField, frame: &Frame, tau_fm: f64) -> Vec<PlanePoint> {
    let point = |x: f64, y: f64| {
        let fluid = field.fluid([tau_fm, x, y, 0.0]);
        let [ux, uy, _] = fluid.velocity;
        [fluid.temperature_gev as f32, ux as f32, uy as f32]
    };
    let column = |x: &f64| frame.y_fm.iter().map(|y| point(*x, *y)).collect::<Vec<_>>();
    frame.x_fm.iter().flat_map(column).collect()
}

fn tell(args: &MakeArgs, frame: &Frame) {
    let [taus, xs, ys, _] = frame.lengths();
    let size = args.out.metadata().map_or(0, |about| about.len());
    say(&format!(
        "{}: {taus} slices of {xs} x {ys} points, tau {:.4} to {:.4} fm, {}",
        args.out.display(),
        frame.tau_fm[0],
        frame.tau_fm[taus - 1],
        bytes(size as f64)
    ));
}
