//! The columns of a table, checked once and read in ranges of rows.

use std::path::{Path, PathBuf};

use hdf5::{Dataset, File, H5Type};

use super::error::EventFileError;
use super::layout::{Column, ColumnSet, EXIT_COLUMNS, Element, PLACE_COMPONENTS, Table};
use crate::event::{EventBlock, EventSummary, MediumExit, Parton, Status};
use crate::files::attributes::element_type;
use crate::files::hdf5_calls::read_rows;
use hdf5::types::{FloatSize, IntSize, TypeDescriptor};

/// Largest chunk of a column that is unpacked, in bytes.
const LARGEST_CHUNK_BYTES: u128 = 1 << 28;

/// Summaries of a run of events with their place in the partons table.
#[derive(Debug, Default)]
pub(super) struct EventRows {
    pub(super) events: Vec<EventSummary>,
    pub(super) partons_start: Vec<i64>,
}

/// All columns of one table.
#[derive(Debug)]
pub(super) struct TableReader {
    path: PathBuf,
    table: Table,
    set: ColumnSet,
    columns: Vec<Dataset>,
}

impl TableReader {
    /// Opens the columns and checks type, shape and that `rows` rows are really stored.
    pub(super) fn open(
        path: &Path,
        file: &File,
        table: Table,
        set: ColumnSet,
        rows: usize,
    ) -> Result<TableReader, EventFileError> {
        let mut columns = Vec::new();
        for column in set.columns(table) {
            let place = place_of(table, column.name);
            let damaged = |reason: String| EventFileError::Damaged {
                path: path.to_owned(),
                place: place.clone(),
                reason,
            };
            let dataset = file
                .dataset(&place)
                .map_err(|error| damaged(error.to_string()))?;
            check_column(&dataset, column, rows).map_err(damaged)?;
            columns.push(dataset);
        }
        Ok(TableReader {
            path: path.to_owned(),
            table,
            set,
            columns,
        })
    }

    /// Stored rows of each column.
    pub(super) fn extents(&self) -> Vec<(&'static str, usize)> {
        let columns = self.set.columns(self.table).iter();
        let names = columns.map(|column| column.name);
        let rows = self.columns.iter().map(|dataset| dataset.shape()[0]);
        names.zip(rows).collect()
    }

    /// Reads `count` events from row `first` on.
    pub(super) fn read_events(
        &self,
        first: usize,
        count: usize,
        rows: &mut EventRows,
    ) -> Result<(), EventFileError> {
        let range = (first, count);
        rows.partons_start = self.column("partons_start", range)?;
        let source_weights: Vec<f64> = self.column("source_weight", range)?;
        let weights: Vec<f64> = self.column("weight", range)?;
        let hard_scales: Vec<f64> = self.column("hard_scale", range)?;
        let origins: Vec<f32> = self.column("origin", range)?;
        let fields: Vec<i32> = self.column("field", range)?;
        let counts: Vec<i32> = self.column("partons_count", range)?;
        let ids: Vec<i64> = self.column("id", range)?;
        rows.events.clear();
        rows.events.extend((0..count).map(|row| EventSummary {
            id: ids[row],
            source_weight: source_weights[row],
            weight: weights[row],
            hard_scale_gev: hard_scales[row],
            origin_fm: std::array::from_fn(|i| origins[PLACE_COMPONENTS * row + i]),
            field: fields[row],
            partons_count: counts[row],
        }));
        Ok(())
    }

    /// Appends `count` parton rows from row `first` on, with their exits where the file has them, to a block.
    pub(super) fn read_rows(
        &self,
        first: usize,
        count: usize,
        block: &mut EventBlock,
    ) -> Result<(), EventFileError> {
        self.read_partons((first, count), &mut block.partons)?;
        if self.set.medium_exit {
            self.read_exits((first, count), &mut block.exits)?;
        }
        Ok(())
    }

    fn read_exits(
        &self,
        range: (usize, usize),
        exits: &mut Vec<MediumExit>,
    ) -> Result<(), EventFileError> {
        let mut columns = [const { Vec::new() }; MediumExit::NUMBERS];
        for (values, column) in columns.iter_mut().zip(&EXIT_COLUMNS) {
            *values = self.column::<f32>(column.name, range)?;
        }
        exits.extend((0..range.1).map(|row| {
            MediumExit::from_numbers(std::array::from_fn(|number| columns[number][row]))
        }));
        Ok(())
    }

    fn read_partons(
        &self,
        range: (usize, usize),
        partons: &mut Vec<Parton>,
    ) -> Result<(), EventFileError> {
        let (first, count) = range;
        let statuses: Vec<i8> = self.column("status", range)?;
        let momenta = self.four_columns::<f64>(["px", "py", "pz", "energy"], range)?;
        let births =
            self.four_columns::<f32>(["birth_t", "birth_x", "birth_y", "birth_z"], range)?;
        let virtualities: Vec<f32> = self.column("virtuality_squared", range)?;
        let splitting_fractions: Vec<f32> = self.column("splitting_fraction", range)?;
        let jet_fractions: Vec<f32> = self.column("jet_fraction", range)?;
        let numbers: Vec<i32> = self.column("pdg", range)?;
        let parents: Vec<i32> = self.column("parent", range)?;
        let colours: Vec<i32> = self.column("colour", range)?;
        let anticolours: Vec<i32> = self.column("anticolour", range)?;
        let channels: Vec<u8> = self.column("channel", range)?;
        partons.reserve(count);
        for row in 0..count {
            let status = Status::from_code(statuses[row]).ok_or_else(|| {
                self.damaged(
                    "status",
                    format!("is {} in row {}", statuses[row], first + row),
                )
            })?;
            partons.push(Parton {
                momentum_gev: std::array::from_fn(|i| momenta[i][row]),
                birth_fm: std::array::from_fn(|i| births[i][row]),
                virtuality_squared_gev2: virtualities[row],
                splitting_fraction: splitting_fractions[row],
                jet_fraction: jet_fractions[row],
                pdg: numbers[row],
                parent: parents[row],
                colour: colours[row],
                anticolour: anticolours[row],
                status,
                channel: channels[row],
            });
        }
        Ok(())
    }

    fn four_columns<T: H5Type + Copy>(
        &self,
        names: [&str; 4],
        range: (usize, usize),
    ) -> Result<[Vec<T>; 4], EventFileError> {
        let [a, b, c, d] = names.map(|name| self.column(name, range));
        Ok([a?, b?, c?, d?])
    }

    fn column<T: H5Type + Copy>(
        &self,
        name: &str,
        (first, count): (usize, usize),
    ) -> Result<Vec<T>, EventFileError> {
        let mut columns = self.set.columns(self.table).iter();
        let place = columns.position(|column| column.name == name);
        let dataset = &self.columns[place.expect("a column of this table")];
        let mut values = Vec::new();
        read_rows(dataset, first, count, &mut values).map_err(|error| {
            self.damaged(
                name,
                format!("rows {first} to {} cannot be read: {error}", first + count),
            )
        })?;
        Ok(values)
    }

    fn damaged(&self, column: &str, reason: String) -> EventFileError {
        EventFileError::Damaged {
            path: self.path.clone(),
            place: place_of(self.table, column),
            reason,
        }
    }
}

fn place_of(table: Table, column: &str) -> String {
    format!("/{}/{column}", table.group())
}

fn check_column(dataset: &Dataset, column: &Column, rows: usize) -> Result<(), String> {
    let found = element_type(dataset)?;
    let expected = descriptor(column.element);
    if found != expected {
        return Err(format!("holds {found}, must hold {expected}"));
    }
    let shape = dataset.shape();
    let fits = match shape[..] {
        [_] => column.width == 1,
        [_, width] => width == column.width,
        _ => false,
    };
    if !fits {
        return Err(format!(
            "has shape {shape:?}, must have {} wide rows",
            column.width
        ));
    }
    if shape[0] < rows {
        return Err(format!("holds {} rows, {rows} are declared", shape[0]));
    }
    let Some(chunk) = dataset.chunk() else {
        return Err("is not chunked".into());
    };
    let chunk_elements: u128 = chunk.iter().map(|length| *length as u128).product();
    if chunk_elements * column.element.bytes() as u128 > LARGEST_CHUNK_BYTES {
        return Err(format!("has chunks of {chunk:?} elements"));
    }
    // declared rows without chunks behind them would read as endless zeros
    let needed = rows.div_ceil(chunk[0]);
    match dataset.num_chunks() {
        Some(stored) if stored >= needed => Ok(()),
        stored => Err(format!(
            "{rows} rows are declared, which take {needed} chunks, but {} are stored",
            stored.unwrap_or(0)
        )),
    }
}

fn descriptor(element: Element) -> TypeDescriptor {
    match element {
        Element::I8 => TypeDescriptor::Integer(IntSize::U1),
        Element::U8 => TypeDescriptor::Unsigned(IntSize::U1),
        Element::I32 => TypeDescriptor::Integer(IntSize::U4),
        Element::I64 => TypeDescriptor::Integer(IntSize::U8),
        Element::F32 => TypeDescriptor::Float(FloatSize::U4),
        Element::F64 => TypeDescriptor::Float(FloatSize::U8),
    }
}
