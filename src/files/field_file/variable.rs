//! One variable of a field file: its axes by name, its packing attributes, its values in a settled axis order.

use std::ops::Range;

use hdf5::types::{FloatSize, TypeDescriptor};
use hdf5::{Dataset, File, H5Type};

use super::blocks::blocks;
use super::error::FieldProblem;
use super::units::Quantity;
use crate::files::attributes::{element_type, get_number, get_text, is_number};
use crate::files::hdf5_calls::{attached_scales, read_box};

/// What netCDF writes where nothing was written (its default fill value for floating-point numbers).
const NETCDF_DEFAULT_FILL: f64 = 9.969_209_968_386_869e36;
/// Largest chunk that is unpacked at once, in bytes.
const LARGEST_CHUNK_BYTES: u128 = 1 << 30;

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
    /// Stored as numbers of single precision.
    single: bool,
}

/// A value that is not taken: in words, and why.
pub(in crate::files) struct Refusal {
    pub(in crate::files) value: String,
    pub(in crate::files) problem: String,
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
            single: element_type(&dataset).map_err(shape_problem)?
                == TypeDescriptor::Float(FloatSize::U4),
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

    /// Reads all values and hands each, unpacked and converted, to `take` with its place in C order over `axes` (a
    /// permutation of the variable's own).
    pub(in crate::files) fn read(
        &self,
        axes: &[&str],
        take: impl FnMut(usize, f64) -> Result<(), Refusal>,
    ) -> Result<(), FieldProblem> {
        let whole = |axis: &&str| 0..self.length(axis).expect("axes were checked");
        let whole: Vec<_> = axes.iter().map(whole).collect();
        self.read_part(axes, &whole, take)
    }

    /// The same of a part, a range along each of `axes`, block by block; places are in C order over the part.
    pub(in crate::files) fn read_part(
        &self,
        axes: &[&str],
        part: &[Range<usize>],
        take: impl FnMut(usize, f64) -> Result<(), Refusal>,
    ) -> Result<(), FieldProblem> {
        if self.single {
            self.read_stored::<f32>(axes, part, take)
        } else {
            self.read_stored::<f64>(axes, part, take)
        }
    }

    fn read_stored<T: H5Type + Copy + Into<f64>>(
        &self,
        axes: &[&str],
        part: &[Range<usize>],
        mut take: impl FnMut(usize, f64) -> Result<(), Refusal>,
    ) -> Result<(), FieldProblem> {
        let own = self.own_ranges(axes, part);
        let strides = self.strides(axes, part);
        let chunk = self.dataset.chunk();
        let mut values: Vec<T> = Vec::new();
        for block in blocks(&self.shape, chunk.as_deref(), &own) {
            read_box(&self.dataset, &block, &mut values).map_err(|error| FieldProblem::Shape {
                name: self.name.clone(),
                problem: format!("cannot be read: {error}"),
            })?;
            let last = block.len() - 1;
            for (row, stored) in values.chunks(block[last].len().max(1)).enumerate() {
                let index = self.index_of_row(&block, row);
                let start: usize = (0..=last)
                    .map(|axis| (index[axis] - own[axis].start) * strides[axis])
                    .sum();
                for (step, stored) in stored.iter().enumerate() {
                    let refuse = |refusal| self.refuse(&index, step, refusal);
                    let value = self.unpack((*stored).into()).map_err(refuse)?;
                    take(start + step * strides[last], value).map_err(refuse)?;
                }
            }
        }
        Ok(())
    }

    /// The part along the variable's own axes.
    fn own_ranges(&self, axes: &[&str], part: &[Range<usize>]) -> Vec<Range<usize>> {
        let range = |own: &String| {
            let place = axes.iter().position(|axis| own == axis);
            part[place.expect("axes were checked")].clone()
        };
        self.axes.iter().map(range).collect()
    }

    /// For each axis of the variable, the step it makes in C order over the part.
    fn strides(&self, axes: &[&str], part: &[Range<usize>]) -> Vec<usize> {
        let stride = |own: &String| {
            let ranges = axes.iter().zip(part);
            let later = ranges.skip_while(|(axis, _)| own != **axis).skip(1);
            later.map(|(_, range)| range.len()).product()
        };
        self.axes.iter().map(stride).collect()
    }

    /// Index of the first element of a row (along the last axis) of a block.
    fn index_of_row(&self, block: &[Range<usize>], row: usize) -> Vec<usize> {
        let mut index: Vec<usize> = block.iter().map(|range| range.start).collect();
        let mut rest = row;
        for axis in (0..block.len() - 1).rev() {
            index[axis] += rest % block[axis].len();
            rest /= block[axis].len();
        }
        index
    }

    #[inline]
    fn unpack(&self, stored: f64) -> Result<f64, Refusal> {
        let value = stored * self.scale + self.offset;
        let is_fill = self.fill.contains(&stored) || stored == NETCDF_DEFAULT_FILL;
        if value.is_finite() && !is_fill {
            return Ok(value);
        }
        Err(Refusal {
            value: if is_fill {
                format!("the fill value {stored}")
            } else {
                stored.to_string()
            },
            problem:
                "every point needs a number; where there is no medium write 0: dataset.fillna(0)"
                    .into(),
        })
    }

    fn refuse(&self, row: &[usize], step: usize, refusal: Refusal) -> FieldProblem {
        let last = row.len() - 1;
        let place: Vec<_> = self
            .axes
            .iter()
            .enumerate()
            .map(|(axis, name)| {
                let step = if axis == last { step } else { 0 };
                format!("{name}[{}]", row[axis] + step)
            })
            .collect();
        FieldProblem::Value {
            name: self.name.clone(),
            value: refusal.value,
            place: place.join(" "),
            problem: refusal.problem,
        }
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
