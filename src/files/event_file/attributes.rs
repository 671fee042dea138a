//! Attributes: scalars, texts and lists of texts, put and got.

use std::str::FromStr;

use hdf5::types::VarLenUnicode;
use hdf5::{Attribute, H5Type, Location};

/// Puts a number.
pub(super) fn put<T: H5Type>(place: &Location, name: &str, value: T) -> hdf5::Result<Attribute> {
    let attribute = place.new_attr::<T>().create(name)?;
    attribute.write_scalar(&value)?;
    Ok(attribute)
}

/// Puts a text.
pub(super) fn put_text(place: &Location, name: &str, value: &str) -> hdf5::Result<()> {
    put(place, name, text(value)).map(drop)
}

/// Puts a list of texts.
pub(super) fn put_texts(place: &Location, name: &str, values: &[&str]) -> hdf5::Result<()> {
    let values: Vec<VarLenUnicode> = values.iter().map(|value| text(value)).collect();
    let attribute = place
        .new_attr::<VarLenUnicode>()
        .shape(values.len())
        .create(name)?;
    attribute.write_raw(&values)
}

/// HDF5's texts end at a zero byte, which a command line or host name may not hold anyway.
fn text(value: &str) -> VarLenUnicode {
    VarLenUnicode::from_str(&value.replace('\0', "")).expect("zero bytes were removed")
}
