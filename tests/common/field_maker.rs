//! Small temperature field files as xarray and netCDF-4 lay them out, made with HDF5 alone.

use std::ffi::{CString, c_char, c_uint};
use std::path::Path;
use std::str::FromStr;

use hdf5::types::VarLenUnicode;
use hdf5::{Dataset, File, H5Type};
use hdf5_sys::h5::herr_t;
use hdf5_sys::h5d::H5Dwrite;
use hdf5_sys::h5i::hid_t;
use hdf5_sys::h5p::H5P_DEFAULT;
use hdf5_sys::h5s::{H5S_seloper_t, H5Sselect_hyperslab};

unsafe extern "C" {
    fn H5DSset_scale(dataset: hid_t, name: *const c_char) -> herr_t;
    fn H5DSattach_scale(dataset: hid_t, scale: hid_t, axis: c_uint) -> herr_t;
}

/// A file under construction.
pub struct FieldMaker {
    pub file: File,
}

impl FieldMaker {
    pub fn new(path: &Path) -> Self {
        FieldMaker {
            file: File::create(path).unwrap(),
        }
    }

    /// A coordinate: a one-dimensional dimension scale.
    pub fn axis(&self, name: &str, values: &[f64], units: Option<&str>) -> &Self {
        let scale = self
            .file
            .new_dataset_builder()
            .with_data(values)
            .create(name)
            .unwrap();
        self.make_scale(&scale, name);
        if let Some(units) = units {
            text(&scale, "units", units);
        }
        self
    }

    /// A dimension that has a name and a length but no coordinate.
    pub fn bare_axis(&self, name: &str, length: usize) -> &Self {
        let scale = self
            .file
            .new_dataset::<f32>()
            .shape([length])
            .create(name)
            .unwrap();
        self.make_scale(
            &scale,
            "This is a netCDF dimension but not a netCDF variable.         3",
        );
        self
    }

    fn make_scale(&self, scale: &Dataset, name: &str) {
        let name = CString::new(name).unwrap();
        // SAFETY: the dataset is open and the name ends with zero.
        let outcome = hdf5::sync::sync(|| unsafe { H5DSset_scale(scale.id(), name.as_ptr()) });
        assert!(outcome >= 0);
    }

    /// A variable over named axes.
    pub fn variable<T: H5Type>(
        &self,
        name: &str,
        axes: &[&str],
        values: &[T],
        units: Option<&str>,
    ) -> Dataset {
        let length = |axis: &&str| self.file.dataset(axis).unwrap().size();
        let shape: Vec<usize> = axes.iter().map(length).collect();
        let dataset = self
            .file
            .new_dataset::<T>()
            .shape(shape)
            .create(name)
            .unwrap();
        dataset.as_writer().write_raw(values).unwrap();
        for (place, axis) in axes.iter().enumerate() {
            self.attach(&dataset, axis, place);
        }
        if let Some(units) = units {
            text(&dataset, "units", units);
        }
        dataset
    }

    pub fn attach(&self, dataset: &Dataset, axis: &str, place: usize) {
        let scale = self.file.dataset(axis).unwrap();
        // SAFETY: both datasets are open.
        let outcome = hdf5::sync::sync(|| unsafe {
            H5DSattach_scale(dataset.id(), scale.id(), place as c_uint)
        });
        assert!(outcome >= 0);
    }
}

pub fn text(place: &Dataset, name: &str, value: &str) {
    let value = VarLenUnicode::from_str(value).unwrap();
    let attribute = place.new_attr::<VarLenUnicode>().create(name).unwrap();
    attribute.write_scalar(&value).unwrap();
}

pub fn number<T: H5Type>(place: &Dataset, name: &str, value: T) {
    // netCDF writes numbers as lists of one
    let attribute = place.new_attr::<T>().shape([1]).create(name).unwrap();
    attribute.write_raw(&[value]).unwrap();
}

/// Writes whole planes along the first axis of a three-dimensional dataset of single precision.
pub fn write_planes(dataset: &Dataset, first: usize, count: usize, values: &[f32]) {
    let shape = dataset.shape();
    assert!(values.len() == count * shape[1] * shape[2] && first + count <= shape[0]);
    let lengths = [count, shape[1], shape[2]];
    let offset = [first as u64, 0, 0];
    let counts = lengths.map(|length| length as u64);
    let file_space = dataset.space().unwrap();
    let memory_space = hdf5::Dataspace::try_new(&lengths[..]).unwrap();
    let memory_type = hdf5::Datatype::from_type::<f32>().unwrap();
    // SAFETY: all handles are open, the selection lies inside and has as many elements as `values`.
    let outcome = hdf5::sync::sync(|| unsafe {
        H5Sselect_hyperslab(
            file_space.id(),
            H5S_seloper_t::H5S_SELECT_SET,
            offset.as_ptr(),
            std::ptr::null(),
            counts.as_ptr(),
            std::ptr::null(),
        );
        H5Dwrite(
            dataset.id(),
            memory_type.id(),
            memory_space.id(),
            file_space.id(),
            H5P_DEFAULT,
            values.as_ptr().cast(),
        )
    });
    assert!(outcome >= 0);
}
