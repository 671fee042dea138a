//! The few HDF5 calls that the safe binding lacks: finished chunks and dimension scales.

use std::ffi::{CString, c_char, c_int, c_uint, c_void};
use std::ops::Range;
use std::path::Path;

use hdf5::H5Type;
use hdf5::sync::sync;
use hdf5_sys::h5::{herr_t, hsize_t};
use hdf5_sys::h5d::{H5Dread, H5Dwrite, H5Dwrite_chunk};
use hdf5_sys::h5i::hid_t;
use hdf5_sys::h5p::H5P_DEFAULT;
use hdf5_sys::h5s::{H5S_seloper_t, H5Sselect_hyperslab};

use super::global_heap::check_global_heaps;

unsafe extern "C" {
    fn H5DSset_scale(dataset: hid_t, name: *const c_char) -> herr_t;
    fn H5DSattach_scale(dataset: hid_t, scale: hid_t, axis: c_uint) -> herr_t;
    fn H5DSset_label(dataset: hid_t, axis: c_uint, label: *const c_char) -> herr_t;
    fn H5DSget_num_scales(dataset: hid_t, axis: c_uint) -> c_int;
    fn H5DSiterate_scales(
        dataset: hid_t,
        axis: c_uint,
        start: *mut c_int,
        visit: extern "C" fn(hid_t, c_uint, hid_t, *mut c_void) -> herr_t,
        data: *mut c_void,
    ) -> herr_t;
}

/// Every filter of the pipeline was applied.
const NO_FILTER_SKIPPED: u32 = 0;

/// Writes one chunk that has gone through the dataset's filters already; `offset` is its first element.
pub(super) fn write_chunk(
    dataset: &hdf5::Dataset,
    offset: &[hsize_t],
    bytes: &[u8],
) -> hdf5::Result<()> {
    debug_assert_eq!(offset.len(), dataset.ndim());
    // SAFETY: the dataset is open, `offset` has one entry an axis, `bytes` is readable for its length.
    sync(|| unsafe {
        hdf5::h5check(H5Dwrite_chunk(
            dataset.id(),
            H5P_DEFAULT,
            NO_FILTER_SKIPPED,
            offset.as_ptr(),
            bytes.len(),
            bytes.as_ptr().cast(),
        ))
    })
    .map(drop)
}

/// Makes a dataset a dimension scale.
pub(super) fn set_scale(dataset: &hdf5::Dataset, name: &str) -> hdf5::Result<()> {
    let name = CString::new(name).map_err(|_| "a scale's name holds a zero byte")?;
    // SAFETY: the dataset is open and `name` ends with zero.
    sync(|| unsafe { hdf5::h5check(H5DSset_scale(dataset.id(), name.as_ptr())) }).map(drop)
}

/// Names an axis of a dataset by a dimension scale, and labels it with the scale's link name.
pub(super) fn attach_scale(
    dataset: &hdf5::Dataset,
    scale: &hdf5::Dataset,
    axis: u32,
) -> hdf5::Result<()> {
    let link = scale.name();
    let label =
        CString::new(link.trim_start_matches('/')).map_err(|_| "a name holds a zero byte")?;
    // SAFETY: both datasets are open, `label` ends with zero; HDF5 checks the axis.
    sync(|| unsafe {
        hdf5::h5check(H5DSattach_scale(dataset.id(), scale.id(), axis))?;
        hdf5::h5check(H5DSset_label(dataset.id(), axis, label.as_ptr()))
    })
    .map(drop)
}

/// The dimension scales attached to an axis of a dataset.
pub(super) fn attached_scales(
    dataset: &hdf5::Dataset,
    axis: u32,
) -> hdf5::Result<Vec<hdf5::Dataset>> {
    extern "C" fn visit(_: hid_t, _: c_uint, scale: hid_t, data: *mut c_void) -> herr_t {
        // SAFETY: `data` is the vector below, which outlives the call; nobody else holds it meanwhile.
        let found = unsafe { &mut *data.cast::<Vec<hid_t>>() };
        // SAFETY: HDF5 closes its own handle after the visit, so this one is counted up for us.
        unsafe { hdf5_sys::h5i::H5Iinc_ref(scale) };
        found.push(scale);
        0
    }
    // SAFETY: the dataset is open; HDF5 checks the axis.
    let count = sync(|| unsafe { hdf5::h5check(H5DSget_num_scales(dataset.id(), axis)) })?;
    if count == 0 {
        // visiting none would be an error
        return Ok(Vec::new());
    }
    let mut found: Vec<hid_t> = Vec::new();
    let mut start: c_int = 0;
    // SAFETY: the dataset is open, `start` and `found` live through the call, and `visit` matches the signature.
    sync(|| unsafe {
        hdf5::h5check(H5DSiterate_scales(
            dataset.id(),
            axis,
            &mut start,
            visit,
            (&raw mut found).cast(),
        ))
    })?;
    // SAFETY: each id was counted up in `visit`, so the handle made here owns it.
    found
        .into_iter()
        .map(|id| unsafe { hdf5::from_id(id) })
        .collect()
}

/// Reads rows `start..start + count` (along the first axis, all of the others) into `values`, whose content is lost.
///
/// The caller has checked that the rows exist, that their number is reasonable, and that the elements are numbers.
pub(super) fn read_rows<T: H5Type + Copy>(
    dataset: &hdf5::Dataset,
    start: usize,
    count: usize,
    values: &mut Vec<T>,
) -> hdf5::Result<()> {
    let mut part: Vec<Range<usize>> = dataset.shape().iter().map(|length| 0..*length).collect();
    match part.first_mut() {
        Some(rows) => *rows = start..start + count,
        None => return Err("a single number has no rows".into()),
    }
    read_box(dataset, &part, values)
}

/// Reads a part (a range along each axis) into `values`, whose content is lost.
///
/// The caller has checked that its size is reasonable, and that the elements are numbers.
pub(super) fn read_box<T: H5Type + Copy>(
    dataset: &hdf5::Dataset,
    part: &[Range<usize>],
    values: &mut Vec<T>,
) -> hdf5::Result<()> {
    values.clear();
    let shape = dataset.shape();
    let inside = part.len() == shape.len()
        && part
            .iter()
            .zip(&shape)
            .all(|(range, length)| range.start <= range.end && range.end <= *length);
    if !inside {
        return Err("a part beyond the end of a dataset".into());
    }
    let lengths: Vec<usize> = part.iter().map(Range::len).collect();
    let elements: usize = lengths.iter().product();
    if elements == 0 {
        return Ok(());
    }
    values.reserve_exact(elements);
    let file_space = dataset.space()?;
    let memory_space = hdf5::Dataspace::try_new(&lengths[..])?;
    let memory_type = hdf5::Datatype::from_type::<T>()?;
    let offset: Vec<hsize_t> = part.iter().map(|range| range.start as hsize_t).collect();
    let counts: Vec<hsize_t> = lengths.iter().map(|length| *length as hsize_t).collect();
    // SAFETY: all handles are open, the selection has `elements` elements as has the memory space, and that many of
    // the memory type fit into the reserved room.
    sync(|| unsafe {
        hdf5::h5check(H5Sselect_hyperslab(
            file_space.id(),
            H5S_seloper_t::H5S_SELECT_SET,
            offset.as_ptr(),
            std::ptr::null(),
            counts.as_ptr(),
            std::ptr::null(),
        ))?;
        hdf5::h5check(H5Dread(
            dataset.id(),
            memory_type.id(),
            memory_space.id(),
            file_space.id(),
            H5P_DEFAULT,
            values.as_mut_ptr().cast(),
        ))
    })?;
    // SAFETY: HDF5 has written every selected element.
    unsafe { values.set_len(elements) };
    Ok(())
}

/// Writes plane `index` along the first axis of a dataset; `values` are all of it.
pub(super) fn write_plane<T: H5Type>(
    dataset: &hdf5::Dataset,
    index: usize,
    values: &[T],
) -> hdf5::Result<()> {
    let mut lengths = dataset.shape();
    match lengths.first_mut() {
        Some(length) if index < *length => *length = 1,
        _ => return Err("a plane beyond the end of a dataset".into()),
    }
    if lengths.iter().product::<usize>() != values.len() {
        return Err("a plane of another size".into());
    }
    let mut offset: Vec<hsize_t> = vec![0; lengths.len()];
    offset[0] = index as hsize_t;
    let counts: Vec<hsize_t> = lengths.iter().map(|length| *length as hsize_t).collect();
    let file_space = dataset.space()?;
    let memory_space = hdf5::Dataspace::try_new(&lengths[..])?;
    let memory_type = hdf5::Datatype::from_type::<T>()?;
    // SAFETY: all handles are open, the selection lies inside the dataset and has as many elements as `values`.
    sync(|| unsafe {
        hdf5::h5check(H5Sselect_hyperslab(
            file_space.id(),
            H5S_seloper_t::H5S_SELECT_SET,
            offset.as_ptr(),
            std::ptr::null(),
            counts.as_ptr(),
            std::ptr::null(),
        ))?;
        hdf5::h5check(H5Dwrite(
            dataset.id(),
            memory_type.id(),
            memory_space.id(),
            file_space.id(),
            H5P_DEFAULT,
            values.as_ptr().cast(),
        ))
    })
    .map(drop)
}

/// The part of a file in which global heaps are looked for before it is opened, in bytes. Event files have theirs
/// within the first few hundred thousand, fields seldom are larger.
const HEAP_SEARCH_BYTES: u64 = 16 << 20;

/// Refuses what is no regular file: a pipe or a device may never answer.
pub(super) fn expect_regular(path: &Path) -> Result<(), String> {
    let about = path.metadata().map_err(|error| error.to_string())?;
    if about.is_file() {
        Ok(())
    } else {
        Err("it is not a regular file".to_owned())
    }
}

/// Opens a file for reading; what is wrong comes back in words.
pub(super) fn open_to_read(path: &Path) -> Result<hdf5::File, String> {
    check_global_heaps(path, HEAP_SEARCH_BYTES).map_err(|error| error.to_string())?;
    hdf5::File::open(path).map_err(|error| reason(&error))
}

/// What HDF5 says, reduced to the system's own message where there is one.
pub(super) fn reason(error: &hdf5::Error) -> String {
    const SYSTEM_MESSAGE: &str = "error message = '";
    let whole = error.to_string();
    let message = whole
        .split_once(SYSTEM_MESSAGE)
        .and_then(|(_, rest)| rest.split_once('\''));
    match message {
        Some((message, _)) => message.to_owned(),
        None => whole,
    }
}
