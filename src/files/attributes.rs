//! Attributes: scalars, texts and lists of texts, put and got.

use std::str::FromStr;

use hdf5::types::{FixedAscii, FixedUnicode, TypeDescriptor, VarLenAscii, VarLenUnicode};
use hdf5::{Attribute, H5Type, Location};

/// The longest fixed-length text read from an attribute, in bytes.
const LONGEST_FIXED_TEXT: usize = 4096;
/// The longest list read from an attribute.
const LONGEST_LIST: usize = 4096;

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

/// Opens an attribute, `None` where there is none of that name.
pub(super) fn find(place: &Location, name: &str) -> Result<Option<Attribute>, String> {
    let names = place.attr_names().map_err(|error| error.to_string())?;
    if !names.iter().any(|other| other == name) {
        return Ok(None);
    }
    place
        .attr(name)
        .map(Some)
        .map_err(|error| error.to_string())
}

/// The type of an attribute's or dataset's elements.
pub(super) fn element_type(place: &hdf5::Container) -> Result<TypeDescriptor, String> {
    place
        .dtype()
        .and_then(|element| element.to_descriptor())
        .map_err(|error| error.to_string())
}

/// True for integers and floating-point numbers.
pub(super) fn is_number(element: &TypeDescriptor) -> bool {
    matches!(
        element,
        TypeDescriptor::Integer(_) | TypeDescriptor::Unsigned(_) | TypeDescriptor::Float(_)
    )
}

/// Gets a number, converted to `T`; `None` where there is no such attribute.
pub(super) fn get_number<T: H5Type + Copy>(
    place: &Location,
    name: &str,
) -> Result<Option<T>, String> {
    let Some(attribute) = find(place, name)? else {
        return Ok(None);
    };
    let element = element_type(&attribute)?;
    if !is_number(&element) || attribute.size() != 1 {
        return Err(format!(
            "one number was expected, found {} of {element}",
            attribute.size()
        ));
    }
    let values = attribute
        .read_raw::<T>()
        .map_err(|error| error.to_string())?;
    Ok(values.first().copied())
}

/// Gets a text of any of HDF5's four kinds; `None` where there is no such attribute.
pub(super) fn get_text(place: &Location, name: &str) -> Result<Option<String>, String> {
    let Some(attribute) = find(place, name)? else {
        return Ok(None);
    };
    if attribute.size() != 1 {
        return Err(format!("one text was expected, found {}", attribute.size()));
    }
    Ok(read_texts(&attribute)?.pop())
}

/// Gets a list of texts; `None` where there is no such attribute.
pub(super) fn get_texts(place: &Location, name: &str) -> Result<Option<Vec<String>>, String> {
    find(place, name)?
        .map(|attribute| read_texts(&attribute))
        .transpose()
}

/// Reads texts of any of HDF5's four kinds.
pub(super) fn read_texts(place: &hdf5::Container) -> Result<Vec<String>, String> {
    if place.size() > LONGEST_LIST {
        return Err(format!("a list of {} texts", place.size()));
    }
    match element_type(place)? {
        TypeDescriptor::VarLenUnicode => read_as::<VarLenUnicode>(place),
        TypeDescriptor::VarLenAscii => read_as::<VarLenAscii>(place),
        TypeDescriptor::FixedUnicode(bytes) if bytes <= LONGEST_FIXED_TEXT => {
            read_as::<FixedUnicode<LONGEST_FIXED_TEXT>>(place)
        }
        TypeDescriptor::FixedAscii(bytes) if bytes <= LONGEST_FIXED_TEXT => {
            read_as::<FixedAscii<LONGEST_FIXED_TEXT>>(place)
        }
        other => Err(format!("a text was expected, found {other}")),
    }
}

fn read_as<T: H5Type + AsRef<[u8]>>(place: &hdf5::Container) -> Result<Vec<String>, String> {
    let texts: Vec<T> = place.read_raw().map_err(|error| error.to_string())?;
    // the binding's own conversion trusts the file to hold UTF-8
    let own = |text: &T| String::from_utf8_lossy(text.as_ref()).into_owned();
    Ok(texts.iter().map(own).collect())
}
