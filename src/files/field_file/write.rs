//! Writing a temperature field as xarray and netCDF-4 lay it out, one slice of proper time after the other.

use std::path::{Path, PathBuf};

use hdf5::{Dataset, File};

use crate::files::attributes::put_text;
use crate::files::hdf5_calls::{attach_scale, reason, set_scale, write_plane};
use crate::medium::field::Frame;

/// Deflate level of the planes.
const COMPRESSION: u8 = 4;

/// What is written at a point: temperature in GeV, u^x, u^y.
pub type PlanePoint = [f32; 3];

/// A boost-invariant field to write.
pub struct FieldOutline<'a> {
    /// Its axes; no eta.
    pub frame: &'a Frame,
    /// What it is, in a line.
    pub title: &'a str,
    /// How it was made.
    pub history: &'a str,
}

/// Why a field was not written.
#[derive(Debug, thiserror::Error)]
#[error("cannot write {}: {reason}", path.display())]
pub struct FieldWriteError {
    /// The file.
    pub path: PathBuf,
    /// What HDF5 or the system says.
    pub reason: String,
}

/// Writes a field: `temperature`, `ux` and `uy` over `tau`, `x` and `y`. `plane` gives the points of a slice, in C order
/// over x and y. The file gets its name when it is complete; what had it is replaced.
///
/// # Errors
/// [`FieldWriteError`]; then nothing is left behind.
pub fn write_field(
    path: &Path,
    outline: &FieldOutline,
    plane: impl FnMut(f64) -> Vec<PlanePoint>,
) -> Result<(), FieldWriteError> {
    let mut partial = path.file_name().unwrap_or_default().to_owned();
    partial.push(format!(".{}.partial", std::process::id()));
    let partial = path.with_file_name(partial);
    let outcome = write(&partial, outline, plane)
        .map_err(|error| reason(&error))
        .and_then(|()| std::fs::rename(&partial, path).map_err(|error| error.to_string()));
    outcome.map_err(|reason| {
        // What is left of it helps nobody; that it cannot be removed changes nothing about the error.
        let _ = std::fs::remove_file(&partial);
        FieldWriteError {
            path: path.to_owned(),
            reason,
        }
    })
}

fn write(
    path: &Path,
    outline: &FieldOutline,
    mut plane: impl FnMut(f64) -> Vec<PlanePoint>,
) -> hdf5::Result<()> {
    let file = File::create(path)?;
    put_text(&file, "title", outline.title)?;
    put_text(&file, "history", outline.history)?;
    let frame = outline.frame;
    let axes = [
        axis(&file, "tau", &frame.tau_fm, "proper time sqrt(t^2 - z^2)")?,
        axis(&file, "x", &frame.x_fm, "place across the beam")?,
        axis(&file, "y", &frame.y_fm, "place across the beam")?,
    ];
    let variables = [
        variable(
            &file,
            "temperature",
            &axes,
            "GeV",
            "temperature of the fluid at rest",
        )?,
        variable(&file, "ux", &axes, "1", "four-velocity component u^x")?,
        variable(&file, "uy", &axes, "1", "four-velocity component u^y")?,
    ];
    for (place, tau) in frame.tau_fm.iter().enumerate() {
        let points = plane(*tau);
        for (component, dataset) in variables.iter().enumerate() {
            let values: Vec<f32> = points.iter().map(|point| point[component]).collect();
            write_plane(dataset, place, &values)?;
        }
    }
    file.flush()
}

/// A coordinate: a one-dimensional dimension scale.
fn axis(file: &File, name: &str, points: &[f64], meaning: &str) -> hdf5::Result<Dataset> {
    let dataset = file.new_dataset_builder().with_data(points).create(name)?;
    set_scale(&dataset, name)?;
    put_text(&dataset, "units", "fm")?;
    put_text(&dataset, "long_name", meaning)?;
    Ok(dataset)
}

/// A variable over the axes, in chunks of a slice.
fn variable(
    file: &File,
    name: &str,
    axes: &[Dataset; 3],
    units: &str,
    meaning: &str,
) -> hdf5::Result<Dataset> {
    let [taus, xs, ys] = [0, 1, 2].map(|axis: usize| axes[axis].size());
    let dataset = file
        .new_dataset::<f32>()
        .chunk([1, xs, ys])
        .shuffle()
        .deflate(COMPRESSION)
        .fletcher32()
        .shape([taus, xs, ys])
        .create(name)?;
    for (place, axis) in axes.iter().enumerate() {
        attach_scale(&dataset, axis, place as u32)?;
    }
    put_text(&dataset, "units", units)?;
    put_text(&dataset, "long_name", meaning)?;
    Ok(dataset)
}
