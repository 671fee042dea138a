//! Reading and writing a temperature field: HDF5 as `xarray.Dataset.to_netcdf(engine="h5netcdf")` and netCDF-4 write it.
//!
//! [`read_field`] takes all of a field into memory, to look at it. [`read_grid`] keeps its hot part alone, for use: a
//! first pass over the temperatures finds where the field is hot, a second reads that part, both in blocks of about 4 MB
//! (or of a chunk, where that is larger). Peak memory is the kept part, 4 bytes a point (16 with flow), and two blocks.

mod axes;
mod blocks;
mod error;
mod flow;
pub(super) mod units;
pub(super) mod variable;
mod write;

use std::io::Read;
use std::ops::Range;
use std::path::Path;

use hdf5::File;

pub use error::{FieldFileError, FieldProblem};
pub use write::{FieldOutline, FieldWriteError, PlanePoint, write_field};

use crate::files::hdf5_calls::{expect_regular, open_to_read};
use crate::medium::field::{FieldData, Frame, Grid, GridBuilder, HotScan};
use units::{AREA_DENSITY, Quantity, TEMPERATURE};
use variable::{Refusal, Variable};

/// Memory that the numbers of a field may take.
const MEMORY_LIMIT_BYTES: u128 = 4 << 30;
/// Hotter than any collision: the unit must be wrong.
const LARGEST_TEMPERATURE_GEV: f64 = 5.0;
/// Hotter than expected: worth a warning.
const UNUSUAL_TEMPERATURE_GEV: f64 = 1.0;

/// First bytes of an HDF5 file (without a user block).
pub(super) const HDF5_SIGNATURE: [u8; 8] = *b"\x89HDF\r\n\x1a\n";
/// First bytes of the classic netCDF formats.
pub(super) const NETCDF3_SIGNATURE: [u8; 3] = *b"CDF";

/// Reads and checks all of a temperature field.
///
/// Variable `temperature` over dimensions `tau`, `x`, `y` and perhaps `eta` (recognised by dimension name, in any
/// order), perhaps flow (`ux`, `uy`, `ueta` or `vx`, `vy`, `veta`) and `collision_density`. Packed values are
/// unpacked and units converted.
///
/// # Errors
/// [`FieldFileError`] with the first problem found and its remedy. Memory is taken only after declared sizes are
/// checked; damaged and foreign files are refused.
pub fn read_field(path: &Path) -> Result<FieldData, FieldFileError> {
    read_whole(path).map_err(|problem| FieldFileError::new(path, problem))
}

/// Checks everything about a temperature field but the values of temperature and flow, which are not read and stay empty
/// in what is returned.
///
/// # Errors
/// As [`read_field`].
pub fn read_outline(path: &Path) -> Result<FieldData, FieldFileError> {
    let outline = Opened::new(path).and_then(|opened| {
        flow::check(&opened.file, opened.axes, &opened.frame.lengths())?;
        opened.outline()
    });
    outline.map_err(|problem| FieldFileError::new(path, problem))
}

/// A field ready for use, with what places of birth need to know of it.
#[derive(Clone, Debug)]
pub struct LoadedGrid {
    /// The hot part.
    pub grid: Grid,
    /// The axes of the whole field, its collision density and warnings; of the temperatures the first slice alone, of the
    /// flow nothing.
    pub first_slice: FieldData,
}

/// Reads the part of a temperature field that is at least as hot as `end_temperature_gev`; with `hold_before_start` its
/// first slice stands for what was before it.
///
/// # Errors
/// As [`read_field`]; of the flow, the hot part alone is looked at.
pub fn read_grid(
    path: &Path,
    end_temperature_gev: f64,
    hold_before_start: bool,
) -> Result<LoadedGrid, FieldFileError> {
    read_hot(path, end_temperature_gev, hold_before_start)
        .map_err(|problem| FieldFileError::new(path, problem))
}

fn read_whole(path: &Path) -> Result<FieldData, FieldProblem> {
    let opened = Opened::new(path)?;
    let names = flow::names(&opened.file)?;
    let lengths = opened.frame.lengths();
    let points = lengths.iter().product();
    check_memory(points, names.is_some())?;
    let mut data = opened.outline()?;
    data.temperature_gev = vec![0.0; points];
    let whole = opened.whole();
    let mut largest = 0.0;
    opened.read_temperature(&whole, |place, temperature| {
        data.temperature_gev[place] = temperature;
        largest = temperature.max(largest);
    })?;
    if let Some(names) = names {
        let mut flow = [0, 1, 2].map(|_| vec![0.0; points]);
        flow::read(
            &opened.file,
            names,
            opened.axes,
            &lengths,
            &whole,
            &mut flow,
        )?;
        data.flow = Some(flow);
    }
    data.warnings = temperature_warnings(largest);
    Ok(data)
}

fn read_hot(
    path: &Path,
    end_temperature_gev: f64,
    hold_before_start: bool,
) -> Result<LoadedGrid, FieldProblem> {
    let opened = Opened::new(path)?;
    let names = flow::names(&opened.file)?;
    let lengths = opened.frame.lengths();
    let mut scan = HotScan::new(lengths, end_temperature_gev);
    let mut first_slice = opened.outline()?;
    first_slice.temperature_gev = vec![0.0; lengths[1..].iter().product()];
    let mut largest = 0.0;
    opened.read_temperature(&opened.whole(), |place, temperature| {
        scan.see(place, temperature);
        largest = temperature.max(largest);
        if let Some(slot) = first_slice.temperature_gev.get_mut(place) {
            *slot = temperature;
        }
    })?;
    first_slice.warnings = temperature_warnings(largest);
    check_memory(kept_points(&scan, &lengths), names.is_some())?;
    let mut builder = GridBuilder::new(opened.frame.clone(), scan, names.is_some());
    if let Some(kept) = builder.kept() {
        let kept = &kept[..opened.axes.len()];
        opened.read_temperature(kept, |place, temperature| {
            builder.set_temperature(place, temperature);
        })?;
        if let Some(names) = names {
            flow::read(
                &opened.file,
                names,
                opened.axes,
                &lengths,
                kept,
                &mut builder,
            )?;
        }
    }
    Ok(LoadedGrid {
        grid: builder.finish(hold_before_start),
        first_slice,
    })
}

/// A file whose axes are checked.
struct Opened {
    file: File,
    temperature: Variable,
    axes: &'static [&'static str],
    frame: Frame,
}

impl Opened {
    fn new(path: &Path) -> Result<Opened, FieldProblem> {
        expect_regular(path).map_err(FieldProblem::Unreadable)?;
        check_signature(path)?;
        let file = open_to_read(path).map_err(FieldProblem::Unreadable)?;
        let temperature = require(&file, "temperature", &TEMPERATURE)?;
        let frame = axes::read(&file, &temperature)?;
        Ok(Opened {
            axes: axes::names(&temperature),
            file,
            temperature,
            frame,
        })
    }

    /// Axes and collision density.
    fn outline(&self) -> Result<FieldData, FieldProblem> {
        let frame = self.frame.clone();
        Ok(FieldData {
            collision_density_per_fm2: read_collision_density(&self.file, &frame)?,
            tau_fm: frame.tau_fm,
            x_fm: frame.x_fm,
            y_fm: frame.y_fm,
            eta: frame.eta,
            ..FieldData::default()
        })
    }

    fn whole(&self) -> Vec<Range<usize>> {
        let lengths = &self.frame.lengths()[..self.axes.len()];
        lengths.iter().map(|length| 0..*length).collect()
    }

    fn read_temperature(
        &self,
        part: &[Range<usize>],
        mut take: impl FnMut(usize, f32),
    ) -> Result<(), FieldProblem> {
        self.temperature.read_part(self.axes, part, |place, value| {
            if (0.0..=LARGEST_TEMPERATURE_GEV).contains(&value) {
                take(place, value as f32);
                return Ok(());
            }
            Err(Refusal {
                value: format!("{value} GeV"),
                problem: if value < 0.0 {
                    "a temperature is not negative; write 0 where there is no medium".to_owned()
                } else {
                    format!(
                        "at most {LARGEST_TEMPERATURE_GEV} GeV is believed; are the units right (MeV given as GeV)?"
                    )
                },
            })
        })
    }
}

fn kept_points(scan: &HotScan, lengths: &[usize; 4]) -> usize {
    let length = |[first, last]: [usize; 2]| last - first + 1;
    let kept = scan.kept().map(|kept| kept.map(length));
    kept.map_or(0, |kept| kept.iter().product::<usize>() * lengths[3])
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

fn check_memory(points: usize, with_flow: bool) -> Result<(), FieldProblem> {
    let numbers = if with_flow { 4 } else { 1 };
    let bytes = points as u128 * numbers * size_of::<f32>() as u128;
    if bytes > MEMORY_LIMIT_BYTES {
        return Err(FieldProblem::TooLarge {
            points: points as u128,
            bytes,
            limit: MEMORY_LIMIT_BYTES,
        });
    }
    Ok(())
}

fn read_collision_density(file: &File, frame: &Frame) -> Result<Option<Vec<f64>>, FieldProblem> {
    let Some(variable) = Variable::find(file, "collision_density", &AREA_DENSITY)? else {
        return Ok(None);
    };
    let (axes, lengths) = (&axes::PLANE_AXES[1..], &frame.lengths()[1..3]);
    variable.expect_axes(axes, lengths)?;
    let mut values = vec![0.0; lengths.iter().product()];
    variable.read(axes, |place, value| {
        if value < 0.0 {
            return Err(Refusal {
                value: format!("{value} fm^-2"),
                problem: "a density is not negative".into(),
            });
        }
        values[place] = value;
        Ok(())
    })?;
    Ok(Some(values))
}

fn temperature_warnings(largest_gev: f32) -> Vec<String> {
    let mut warnings = Vec::new();
    if f64::from(largest_gev) > UNUSUAL_TEMPERATURE_GEV {
        warnings.push(format!(
            "the largest temperature is {largest_gev} GeV, above {UNUSUAL_TEMPERATURE_GEV} GeV; are the units right?"
        ));
    }
    if largest_gev == 0.0 {
        warnings.push("the temperature is 0 everywhere: there is no medium".into());
    }
    warnings
}
