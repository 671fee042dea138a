//! One variable of a field file: its axes by name, its packing attributes, its values in a settled axis order.

use hdf5::{Dataset, File};

use super::error::FieldProblem;
use super::units::Quantity;
use crate::files::attributes::{element_type, get_number, get_text, is_number};
use crate::files::hdf5_calls::{attached_scales, read_rows};

/// What netCDF writes where nothing was written (its default fill value for floating-point numbers).
const NETCDF_DEFAULT_FILL: f64 = 9.969_209_968_386_869e36;
/// Largest chunk that is unpacked at once, in bytes.
const LARGEST_CHUNK_BYTES: u128 = 1 << 30;

/// Memory for the part of a variable that is read at once, in bytes.
const SLAB_BYTES: usize = 64 << 20;

/// A variable that was found and checked, but not read.
pub(in crate::files) struct Variable {
    pub(in crate::files) name: String,
    dataset: Dataset,
    /// Name of each axis, in the file's order.
    pub(in crate::files) axes: Vec<String>,
    shape: Vec<usize>,
    /// Factor and offset from stored numbers to this program's unit.
    scale: f64,
    offset: f64,
    fill: Vec<f64>,
}

impl Variable {
    /// Finds a variable with its named axes; `None` where the file has none of that name.
    pub(in crate::files) fn find(
        file: &File,
        name: &str,
        quantity: &Quantity,
    ) -> Result<Option<Variable>, FieldProblem> {
        if !file.link_exists(name) {
            return Ok(None);
        }
        let shape_problem = |problem: String| FieldProblem::Shape {
            name: name.to_owned(),
            problem,
        };
        let dataset = file
            .dataset(name)
            .map_err(|error| shape_problem(error.to_string()))?;
        check_storage(&dataset).map_err(shape_problem)?;
        let axes = axis_names(&dataset, name).map_err(shape_problem)?;
        let units = get_text(&dataset, "units").map_err(shape_problem)?;
        let factor = quantity.factor(name, units.as_deref())?;
        let number = |attribute: &str| -> Result<Option<f64>, FieldProblem> {
            get_number(&dataset, attribute)
                .map_err(|problem| shape_problem(format!("attribute \"{attribute}\": {problem}")))
        };
        let scale = number("scale_factor")?.unwrap_or(1.0);
        let offset = number("add_offset")?.unwrap_or(0.0);
        let fill = [number("_FillValue")?, number("missing_value")?];
        Ok(Some(Variable {
            name: name.to_owned(),
            axes,
            shape: dataset.shape(),
            scale: scale * factor,
            offset: offset * factor,
            fill: fill.into_iter().flatten().collect(),
            dataset,
        }))
    }

    /// Number of points along the axis of that name.
    pub(in crate::files) fn length(&self, axis: &str) -> Option<usize> {
        let place = self.axes.iter().position(|name| name == axis)?;
        Some(self.shape[place])
    }

    /// Checks that the axes are exactly these, in any order, and as long as `lengths` says.
    pub(in crate::files) fn expect_axes(
        &self,
        axes: &[&str],
        lengths: &[usize],
    ) -> Result<(), FieldProblem> {
        let fits = self.axes.len() == axes.len()
            && axes
                .iter()
                .zip(lengths)
                .all(|(axis, length)| self.length(axis) == Some(*length));
        if fits {
            return Ok(());
        }
        let list = |names: &[String], lengths: &[usize]| {
            let parts: Vec<_> = names
                .iter()
                .zip(lengths)
                .map(|(name, length)| format!("{name} = {length}"))
                .collect();
            parts.join(", ")
        };
        let wanted: Vec<String> = axes.iter().map(|axis| (*axis).to_owned()).collect();
        Err(FieldProblem::Shape {
            name: self.name.clone(),
            problem: format!(
                "has dimensions ({}), must have ({}) in any order",
                list(&self.axes, &self.shape),
                list(&wanted, lengths)
            ),
        })
    }

    /// Reads all values in C order over `axes` (a permutation of the variable's own) and hands each, unpacked and
    /// converted, to `take` with its place in that order.
    pub(in crate::files) fn read(
        &self,
        axes: &[&str],
        mut take: impl FnMut(usize, f64) -> Result<(), FieldProblem>,
    ) -> Result<(), FieldProblem> {
        let strides = self.target_strides(axes);
        let mut slab: Vec<f64> = Vec::new();
        let mut index = vec![0; self.shape.len()];
        let step = self.rows_at_once();
        for first in (0..self.shape[0]).step_by(step) {
            let rows = step.min(self.shape[0] - first);
            read_rows(&self.dataset, first, rows, &mut slab).map_err(|error| {
                FieldProblem::Shape {
                    name: self.name.clone(),
                    problem: format!("cannot be read: {error}"),
                }
            })?;
            for stored in &slab {
                let place = index
                    .iter()
                    .zip(&strides)
                    .map(|(i, stride)| i * stride)
                    .sum();
                let value = self.unpack(*stored, &index)?;
                take(place, value)?;
                advance(&mut index, &self.shape);
            }
        }
        Ok(())
    }

    /// Rows of whole chunks, so that none is unpacked twice, as long as they fit into the slab.
    fn rows_at_once(&self) -> usize {
        let row_bytes = self.shape[1..].iter().product::<usize>().max(1) * size_of::<f64>();
        let chunk_rows = self.dataset.chunk().map_or(1, |chunk| chunk[0]);
        chunk_rows.min(SLAB_BYTES / row_bytes).max(1)
    }

    /// For each axis of the file, the step it makes in C order over `axes`.
    fn target_strides(&self, axes: &[&str]) -> Vec<usize> {
        self.axes
            .iter()
            .map(|own| {
                let later = axes.iter().skip_while(|axis| own != **axis).skip(1);
                later
                    .map(|axis| self.length(axis).expect("axes were checked"))
                    .product()
            })
            .collect()
    }

    fn unpack(&self, stored: f64, index: &[usize]) -> Result<f64, FieldProblem> {
        let value = stored * self.scale + self.offset;
        let is_fill = self.fill.contains(&stored) || stored == NETCDF_DEFAULT_FILL;
        if value.is_finite() && !is_fill {
            return Ok(value);
        }
        Err(FieldProblem::Value {
            name: self.name.clone(),
            value: if is_fill {
                format!("the fill value {stored}")
            } else {
                stored.to_string()
            },
            place: self.place(index),
            problem:
                "every point needs a number; where there is no medium write 0: dataset.fillna(0)"
                    .into(),
        })
    }

    fn place(&self, index: &[usize]) -> String {
        let parts: Vec<_> = self
            .axes
            .iter()
            .zip(index)
            .map(|(axis, index)| format!("{axis}[{index}]"))
            .collect();
        parts.join(" ")
    }
}

/// Steps an index over `shape` in C order.
fn advance(index: &mut [usize], shape: &[usize]) {
    for axis in (0..shape.len()).rev() {
        index[axis] += 1;
        if index[axis] < shape[axis] {
            return;
        }
        index[axis] = 0;
    }
}

/// Refuses what is no array of numbers, and chunks that would take too much memory to unpack.
fn check_storage(dataset: &Dataset) -> Result<(), String> {
    let element = element_type(dataset)?;
    if !is_number(&element) {
        return Err(format!("holds {element}, must hold numbers"));
    }
    if let Some(chunk) = dataset.chunk() {
        let elements: u128 = chunk.iter().map(|length| *length as u128).product();
        let bytes = elements * element.size() as u128;
        if bytes > LARGEST_CHUNK_BYTES {
            return Err(format!(
                "has chunks of {bytes} bytes, at most {LARGEST_CHUNK_BYTES} are allowed"
            ));
        }
    }
    Ok(())
}

/// The name of each axis: that of the dimension scale attached to it; a coordinate names its own.
fn axis_names(dataset: &Dataset, name: &str) -> Result<Vec<String>, String> {
    (0..dataset.ndim())
        .map(|axis| {
            let scales = attached_scales(dataset, axis as u32).map_err(|error| error.to_string())?;
            match scales.first() {
                Some(scale) => Ok(scale.name().rsplit('/').next().unwrap_or_default().to_owned()),
                None if dataset.ndim() == 1 => Ok(name.to_owned()),
                None => Err(format!(
                    "dimension {axis} has no name (no HDF5 dimension scale is attached); write the file with xarray: dataset.to_netcdf(path, engine=\"h5netcdf\")"
                )),
            }
        })
        .collect()
}
