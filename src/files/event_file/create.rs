//! A new event file: every group, dataset, scale and attribute, before the first row.

use std::str::FromStr;

use hdf5::types::{FixedAscii, FixedUnicode};
use hdf5::{Dataset, File, Group, H5Type};

use super::layout::{
    Column, Element, FORMAT_NAME, FORMAT_VERSION, FULL_MANTISSA_BITS, PLACE_COMPONENTS,
    PLACE_SCALE, Table,
};
use super::provenance::{FieldEntry, Provenance, history_name};
use crate::files::attributes::{put, put_text, put_texts};
use crate::files::hdf5_calls::{attach_scale, set_scale};

/// Attributes up to this many are kept in the object's header, where an update overwrites in place.
const ATTRIBUTES_IN_HEADER: u32 = 128;
/// Rows in a chunk of the small lists.
const LIST_CHUNK_ROWS: usize = 64;
/// The longest name of a file, in bytes, on the usual file systems.
const LONGEST_FILE_NAME: usize = 255;
/// Hexadecimal digits of a SHA-256.
const SHA256_DIGITS: usize = 64;
/// The netCDF-4 convention for an axis that has a name and a length but no values of its own.
const SCALE_WITHOUT_VALUES: &str = "This is a netCDF dimension but not a netCDF variable.";

/// The growing datasets of one table.
#[derive(Debug)]
pub(super) struct TableDatasets {
    pub(super) columns: Vec<Dataset>,
    pub(super) scale: Dataset,
}

/// Opens a new HDF5 file at `path`, replacing what is there.
pub(super) fn create_file(path: &std::path::Path) -> hdf5::Result<File> {
    File::with_options()
        // the version whose files survived every kill; newer ones mark a file that was not closed
        .with_fapl(|access| access.libver_v18())
        .with_fcpl(|creation| creation.attr_phase_change(ATTRIBUTES_IN_HEADER, 0))
        .create(path)
}

/// Writes everything that is known before the first event.
pub(super) fn create_content(
    file: &File,
    provenance: &Provenance,
) -> hdf5::Result<(TableDatasets, TableDatasets)> {
    create_attributes(file, provenance)?;
    let component = create_scale(file, PLACE_SCALE, PLACE_COMPONENTS, "t, x, y, z")?;
    let events = create_table(file, Table::Events, &component, provenance)?;
    let partons = create_table(file, Table::Partons, &component, provenance)?;
    create_fields(file, &provenance.fields)?;
    Ok((events, partons))
}

fn create_attributes(file: &File, provenance: &Provenance) -> hdf5::Result<()> {
    put_text(file, "format", FORMAT_NAME)?;
    put(file, "format_version", FORMAT_VERSION)?;
    put_text(file, "program_version", &provenance.program_version)?;
    put_text(file, "commit", &provenance.commit)?;
    put_text(file, "command_line", &provenance.command_line)?;
    put_text(file, "host", &provenance.host)?;
    put_text(file, "created", &provenance.created)?;
    put_text(file, "config", &provenance.config)?;
    put_text(file, "config_digest", &provenance.config_digest)?;
    put(file, "seed", provenance.seed)?;
    put(file, "first_id", provenance.first_id)?;
    put(file, "last_id", provenance.last_id)?;
    put(file, "complete", 0i32)?;
    put(file, "events_committed", 0i64)?;
    put(file, "partons_committed", 0i64)?;
    put_text(file, "kinematics", provenance.kinematics.name())?;
    put(file, "open_colour_lines", provenance.open_colour_lines)?;
    put_text(file, "history", history_name(provenance.history))?;
    put(file, "compression", i32::from(provenance.compression))?;
    let momentum_bits = provenance.momentum_bits.unwrap_or(FULL_MANTISSA_BITS);
    put(file, "momentum_bits", i32::from(momentum_bits))?;
    // without a cross section, the ratio of weights it multiplies is per hard event
    let (cross_section, unit) = match &provenance.cross_section {
        Some(cross_section) => (cross_section.value, cross_section.unit.as_str()),
        None => (1.0, "none"),
    };
    put(file, "cross_section", cross_section)?;
    put_text(file, "cross_section_unit", unit)?;
    put(file, "sum_of_source_weights", 0f64)?;
    put(file, "sum_of_weights", 0f64)?;
    put(file, "sum_of_squared_weights", 0f64)?;
    for counter in &provenance.counters {
        put(file, counter, 0u64)?;
    }
    Ok(())
}

/// A named axis without values.
fn create_scale(
    file: &File,
    name: &str,
    length: usize,
    description: &str,
) -> hdf5::Result<Dataset> {
    let scale = file
        .new_dataset::<f32>()
        .chunk([LIST_CHUNK_ROWS.max(length)])
        .fletcher32()
        .shape(hdf5::SimpleExtents::resizable([length]))
        .create(name)?;
    set_scale(&scale, SCALE_WITHOUT_VALUES)?;
    put_text(&scale, "units", "1")?;
    put_text(&scale, "description", description)?;
    Ok(scale)
}

fn create_table(
    file: &File,
    table: Table,
    component: &Dataset,
    provenance: &Provenance,
) -> hdf5::Result<TableDatasets> {
    let scale = file
        .new_dataset::<f32>()
        .chunk([table.chunk_rows()])
        .fletcher32()
        .shape(hdf5::SimpleExtents::resizable([0]))
        .create(table.scale())?;
    set_scale(&scale, SCALE_WITHOUT_VALUES)?;
    put_text(&scale, "units", "1")?;
    put_text(&scale, "description", table.scale_description())?;
    let group = file.create_group(table.group())?;
    let mut columns = Vec::new();
    for column in provenance.columns().columns(table) {
        let dataset = create_column(&group, table, column, provenance.compression)?;
        attach_scale(&dataset, &scale, 0)?;
        if column.width > 1 {
            attach_scale(&dataset, component, 1)?;
        }
        if column.name == "channel" {
            put_texts(&dataset, "names", &channel_names(provenance))?;
        }
        columns.push(dataset);
    }
    Ok(TableDatasets { columns, scale })
}

fn channel_names(provenance: &Provenance) -> Vec<&str> {
    ["hard process", "vacuum"]
        .into_iter()
        .chain(provenance.effects.iter().map(String::as_str))
        .collect()
}

fn create_column(
    group: &Group,
    table: Table,
    column: &Column,
    compression: u8,
) -> hdf5::Result<Dataset> {
    let dataset = match column.element {
        Element::I8 => create_growable::<i8>(group, table, column, compression),
        Element::U8 => create_growable::<u8>(group, table, column, compression),
        Element::I32 => create_growable::<i32>(group, table, column, compression),
        Element::I64 => create_growable::<i64>(group, table, column, compression),
        Element::F32 => create_growable::<f32>(group, table, column, compression),
        Element::F64 => create_growable::<f64>(group, table, column, compression),
    }?;
    put_text(&dataset, "units", column.units)?;
    put_text(&dataset, "description", column.description)?;
    Ok(dataset)
}

fn create_growable<T: H5Type>(
    group: &Group,
    table: Table,
    column: &Column,
    compression: u8,
) -> hdf5::Result<Dataset> {
    let mut builder = group.new_dataset::<T>();
    if size_of::<T>() > 1 {
        builder = builder.shuffle();
    }
    if compression > 0 {
        builder = builder.deflate(compression);
    }
    let builder = builder.fletcher32();
    if column.width == 1 {
        builder
            .chunk([table.chunk_rows()])
            .shape(hdf5::SimpleExtents::resizable([0]))
            .create(column.name)
    } else {
        builder
            .chunk([table.chunk_rows(), column.width])
            .shape((0.., column.width))
            .create(column.name)
    }
}

fn create_fields(file: &File, fields: &[FieldEntry]) -> hdf5::Result<()> {
    let scale = create_scale(
        file,
        "field",
        fields.len(),
        "row of a temperature field in the fields table",
    )?;
    let group = file.create_group("fields")?;
    let names: Vec<_> = fields.iter().map(|field| fixed_name(&field.name)).collect();
    let digests: Vec<_> = fields
        .iter()
        .map(|field| fixed_sha256(&field.sha256))
        .collect();
    let weights: Vec<f64> = fields.iter().map(|field| field.weight).collect();
    create_list(&group, &scale, "name", &names, "file or kind of the field")?;
    create_list(
        &group,
        &scale,
        "sha256",
        &digests,
        "SHA-256 of the field's file, empty for an analytic field",
    )?;
    create_list(
        &group,
        &scale,
        "weight",
        &weights,
        "weight of the field in the sample",
    )
}

fn create_list<T: H5Type>(
    group: &Group,
    scale: &Dataset,
    name: &str,
    values: &[T],
    description: &str,
) -> hdf5::Result<()> {
    let list = group
        .new_dataset::<T>()
        .chunk([LIST_CHUNK_ROWS])
        .fletcher32()
        .shape(hdf5::SimpleExtents::resizable([values.len()]))
        .create(name)?;
    list.write_raw(values)?;
    put_text(&list, "units", "1")?;
    put_text(&list, "description", description)?;
    attach_scale(&list, scale, 0)
}

fn fixed_name(name: &str) -> FixedUnicode<LONGEST_FILE_NAME> {
    let mut end = name.len().min(LONGEST_FILE_NAME);
    while !name.is_char_boundary(end) {
        end -= 1;
    }
    FixedUnicode::from_str(&name[..end]).expect("cut to fit")
}

fn fixed_sha256(digest: &str) -> FixedAscii<SHA256_DIGITS> {
    FixedAscii::from_ascii(digest).unwrap_or_default()
}
