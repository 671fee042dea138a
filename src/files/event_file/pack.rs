//! Packing: rows in memory to finished chunks, as HDF5's shuffle, deflate and fletcher32 filters would make them.

use std::ops::Range;

use super::checksum::fletcher32;
use super::layout::{
    Column, ColumnSet, EVENT_COLUMNS, EXIT_COLUMNS, Element, FULL_MANTISSA_BITS, PARTON_COLUMNS,
    PLACE_COMPONENTS, Table,
};
use super::planes::PlaneEncoder;
use super::provenance::columns_of;
use super::row_groups::RowGroup;
use crate::config::RecordSettings;
use crate::event::{EventSummary, MediumExit, Parton};

/// Rows of which all columns are gathered before the next ones are looked at: few enough to stay in the cache.
const TILE_ROWS: usize = 256;
/// Words that are transposed at once.
const TRANSPOSED: usize = size_of::<u64>();

/// The finished chunks of one row group, one a column.
#[derive(Debug, Default)]
pub struct PackedGroup {
    /// Place of the group in its table; groups of a table are written in this order.
    pub index: u64,
    /// Rows that count; the chunks are padded to full length.
    pub rows: usize,
    pub(super) bytes: Vec<u8>,
    pub(super) chunk_ends: Vec<usize>,
    pub(super) parton_row_ends: Vec<i64>,
    table: Option<Table>,
}

impl PackedGroup {
    /// The table, `None` before anything was packed.
    pub fn table(&self) -> Option<Table> {
        self.table
    }

    /// Size of all chunks together in bytes.
    pub fn packed_bytes(&self) -> usize {
        self.bytes.len()
    }

    /// The chunk of each column, in the order of the table's columns.
    pub fn chunks(&self) -> impl Iterator<Item = &[u8]> {
        let starts = std::iter::once(0).chain(self.chunk_ends.iter().copied());
        starts
            .zip(&self.chunk_ends)
            .map(|(start, end)| &self.bytes[start..*end])
    }

    fn restart(&mut self, group: &RowGroup) {
        self.table = Some(group.table);
        self.index = group.index;
        self.rows = group.rows;
        self.bytes.clear();
        self.chunk_ends.clear();
        self.parton_row_ends.clear();
    }
}

/// Packs row groups; every worker owns one.
#[derive(Debug)]
pub struct Packer {
    encoder: Option<PlaneEncoder>,
    momentum_bits: Option<u8>,
    columns: ColumnSet,
    /// Byte planes of all columns of a group, one column after another.
    planes: Vec<u8>,
}

impl Packer {
    /// A packer for the compression, the momentum rounding and the columns of a run.
    pub fn new(record: &RecordSettings) -> Self {
        Packer {
            encoder: (record.compression > 0).then(|| PlaneEncoder::new(record.compression)),
            momentum_bits: record.momentum_bits,
            columns: columns_of(record),
            planes: Vec::new(),
        }
    }

    /// Packs a group into `packed`, whose memory is reused and whose content is lost. Its blocks hold exits where the
    /// file keeps them.
    pub fn pack(&mut self, group: &RowGroup, packed: &mut PackedGroup) {
        packed.restart(group);
        let columns = self.columns.columns(group.table);
        let lengths = columns.iter().map(|column| column.chunk_bytes(group.table));
        let total = lengths.clone().sum();
        if group.rows < group.table.chunk_rows() {
            self.planes.clear();
        }
        self.planes.resize(total, 0);
        match group.table {
            Table::Events => self.gather_events(group, packed),
            Table::Partons => {
                self.gather_partons(group);
                if self.columns.medium_exit {
                    self.gather_exits(group);
                }
            }
        }
        let mut start = 0;
        for (column, length) in columns.iter().zip(lengths) {
            self.append_chunk(start..start + length, column.element, packed);
            start += length;
        }
    }

    fn append_chunk(&mut self, planes: Range<usize>, element: Element, packed: &mut PackedGroup) {
        let start = packed.bytes.len();
        let planes = &self.planes[planes];
        match &mut self.encoder {
            Some(encoder) => encoder.encode(planes, element.bytes(), &mut packed.bytes),
            None => packed.bytes.extend_from_slice(planes),
        }
        let checksum = fletcher32(&packed.bytes[start..]);
        packed.bytes.extend_from_slice(&checksum.to_le_bytes());
        packed.chunk_ends.push(packed.bytes.len());
    }

    fn gather_events(&mut self, group: &RowGroup, packed: &mut PackedGroup) {
        let mut first_parton_row = group.first_parton_row;
        let mut filled = 0;
        for (block, rows) in &group.segments {
            for tile in block.events[rows.clone()].chunks(TILE_ROWS) {
                let mut planes = &mut self.planes[..];
                for column in &EVENT_COLUMNS {
                    let (own, others) = planes.split_at_mut(column.chunk_bytes(Table::Events));
                    planes = others;
                    scatter_events(column.name, tile, first_parton_row, own, filled);
                }
                for event in tile {
                    first_parton_row += i64::from(event.partons_count);
                    packed.parton_row_ends.push(first_parton_row);
                }
                filled += tile.len();
            }
        }
    }

    fn gather_partons(&mut self, group: &RowGroup) {
        let mut filled = 0;
        for (block, rows) in &group.segments {
            for tile in block.partons[rows.clone()].chunks(TILE_ROWS) {
                let mut planes = &mut self.planes[..];
                for column in &PARTON_COLUMNS {
                    let (own, others) = planes.split_at_mut(column.chunk_bytes(Table::Partons));
                    planes = others;
                    scatter_partons(column.name, tile, self.momentum_bits, own, filled);
                }
                filled += tile.len();
            }
        }
    }

    fn gather_exits(&mut self, group: &RowGroup) {
        let mut filled = 0;
        let planes = &mut self.planes[parton_planes_bytes()..];
        for (block, rows) in &group.segments {
            let exits = block.exits.get(rows.clone());
            let exits = exits.expect("a run whose file keeps exits makes one for each row");
            for tile in exits.chunks(TILE_ROWS) {
                let columns = planes.chunks_exact_mut(EXIT_COLUMNS[0].chunk_bytes(Table::Partons));
                for (number, own) in columns.enumerate() {
                    scatter_exits(number, tile, own, filled);
                }
                filled += tile.len();
            }
        }
    }
}

/// Bytes of the planes of [`PARTON_COLUMNS`], after which those of [`EXIT_COLUMNS`] stand.
fn parton_planes_bytes() -> usize {
    let bytes = |column: &Column| column.chunk_bytes(Table::Partons);
    PARTON_COLUMNS.iter().map(bytes).sum()
}

/// Puts one column of some events, whose first parton row is given, into its planes.
fn scatter_events(
    column: &str,
    events: &[EventSummary],
    first_parton_row: i64,
    planes: &mut [u8],
    filled: usize,
) {
    let to = (planes, filled);
    match column {
        "id" => scatter::<8, 1, _>(events, to, |event| [event.id as u64]),
        "source_weight" => scatter::<8, 1, _>(events, to, |event| [event.source_weight.to_bits()]),
        "weight" => scatter::<8, 1, _>(events, to, |event| [event.weight.to_bits()]),
        "partons_start" => {
            let mut next = first_parton_row;
            scatter::<8, 1, _>(events, to, |event| {
                let start = next;
                next += i64::from(event.partons_count);
                [start as u64]
            });
        }
        "partons_count" => scatter::<4, 1, _>(events, to, |event| [bits(event.partons_count)]),
        "hard_scale" => scatter::<8, 1, _>(events, to, |event| [event.hard_scale_gev.to_bits()]),
        "origin" => scatter::<4, PLACE_COMPONENTS, _>(events, to, |event| {
            event.origin_fm.map(|component| component.to_bits().into())
        }),
        "field" => scatter::<4, 1, _>(events, to, |event| [bits(event.field)]),
        name => unreachable!("no rule to gather event column {name}"),
    }
}

/// Puts one column of some partons into its planes.
fn scatter_partons(
    column: &str,
    rows: &[Parton],
    momentum_bits: Option<u8>,
    planes: &mut [u8],
    filled: usize,
) {
    let to = (planes, filled);
    match column {
        "pdg" => scatter::<4, 1, _>(rows, to, |row| [bits(row.pdg)]),
        "status" => scatter::<1, 1, _>(rows, to, |row| [row.status as u64]),
        "parent" => scatter::<4, 1, _>(rows, to, |row| [bits(row.parent)]),
        "colour" => scatter::<4, 1, _>(rows, to, |row| [bits(row.colour)]),
        "anticolour" => scatter::<4, 1, _>(rows, to, |row| [bits(row.anticolour)]),
        "px" => scatter_momentum(rows, to, 0, momentum_bits),
        "py" => scatter_momentum(rows, to, 1, momentum_bits),
        "pz" => scatter_momentum(rows, to, 2, momentum_bits),
        "energy" => scatter_momentum(rows, to, 3, momentum_bits),
        "virtuality_squared" => scatter_single(rows, to, |row| row.virtuality_squared_gev2),
        "splitting_fraction" => scatter_single(rows, to, |row| row.splitting_fraction),
        "jet_fraction" => scatter_single(rows, to, |row| row.jet_fraction),
        "birth_t" => scatter_single(rows, to, |row| row.birth_fm[0]),
        "birth_x" => scatter_single(rows, to, |row| row.birth_fm[1]),
        "birth_y" => scatter_single(rows, to, |row| row.birth_fm[2]),
        "birth_z" => scatter_single(rows, to, |row| row.birth_fm[3]),
        "channel" => scatter::<1, 1, _>(rows, to, |row| [row.channel.into()]),
        name => unreachable!("no rule to gather parton column {name}"),
    }
}

fn scatter_momentum(
    rows: &[Parton],
    to: (&mut [u8], usize),
    component: usize,
    kept_bits: Option<u8>,
) {
    match kept_bits {
        None => scatter::<8, 1, _>(rows, to, |row| [row.momentum_gev[component].to_bits()]),
        Some(kept) => scatter::<8, 1, _>(rows, to, |row| {
            [round_mantissa(row.momentum_gev[component], kept).to_bits()]
        }),
    }
}

fn scatter_single(rows: &[Parton], to: (&mut [u8], usize), value: impl Fn(&Parton) -> f32) {
    scatter::<4, 1, _>(rows, to, |row| [value(row).to_bits().into()]);
}

/// Puts one number of some exits into its planes.
fn scatter_exits(number: usize, exits: &[MediumExit], planes: &mut [u8], filled: usize) {
    scatter::<4, 1, _>(exits, (planes, filled), |exit| {
        [exit.numbers()[number].to_bits().into()]
    });
}

fn bits(value: i32) -> u64 {
    (value as u32).into()
}

/// Takes `W` values a row apart into `BYTES` byte planes: all lowest bytes first, the highest last (HDF5's shuffle).
/// The first `filled` rows of the planes are there already.
fn scatter<const BYTES: usize, const W: usize, R>(
    rows: &[R],
    (planes, filled): (&mut [u8], usize),
    mut values: impl FnMut(&R) -> [u64; W],
) {
    let stride = planes.len() / BYTES;
    let mut place = filled * W;
    let whole = rows.chunks_exact(TRANSPOSED / W);
    let rest = whole.remainder();
    for rows in whole {
        let mut square = [0; TRANSPOSED];
        for (words, row) in square.chunks_exact_mut(W).zip(rows) {
            words.copy_from_slice(&values(row));
        }
        transpose_bytes(&mut square);
        for (plane, eight) in planes.chunks_exact_mut(stride).zip(square) {
            plane[place..place + TRANSPOSED].copy_from_slice(&eight.to_le_bytes());
        }
        place += TRANSPOSED;
    }
    for value in rest.iter().flat_map(values) {
        for (plane, byte) in planes.chunks_exact_mut(stride).zip(value.to_le_bytes()) {
            plane[place] = byte;
        }
        place += 1;
    }
}

/// Transposes eight times eight bytes: byte j of word i changes places with byte i of word j.
fn transpose_bytes(words: &mut [u64; TRANSPOSED]) {
    const HALVES: [(usize, u64); 3] = [
        (4, 0x0000_0000_ffff_ffff),
        (2, 0x0000_ffff_0000_ffff),
        (1, 0x00ff_00ff_00ff_00ff),
    ];
    for (distance, mask) in HALVES {
        let shift = u8::BITS * distance as u32;
        for low in (0..TRANSPOSED).filter(|word| word & distance == 0) {
            let swapped = ((words[low] >> shift) ^ words[low + distance]) & mask;
            words[low + distance] ^= swapped;
            words[low] ^= swapped << shift;
        }
    }
}

/// Rounds to the nearest double with `kept_bits` mantissa bits, ties to even; the relative error is at most
/// 2^-(kept_bits + 1). Infinities and NaN pass unchanged.
pub(super) fn round_mantissa(value: f64, kept_bits: u8) -> f64 {
    if kept_bits >= FULL_MANTISSA_BITS || !value.is_finite() {
        return value;
    }
    let dropped = u32::from(FULL_MANTISSA_BITS - kept_bits);
    let bits = value.to_bits();
    let half = 1u64 << (dropped - 1);
    let odd = (bits >> dropped) & 1;
    f64::from_bits((bits + half - 1 + odd) >> dropped << dropped)
}

#[cfg(test)]
mod tests {
    use super::{round_mantissa, transpose_bytes};

    #[test]
    fn bytes_change_places_with_words() {
        let mut words = std::array::from_fn(|word| {
            u64::from_le_bytes(std::array::from_fn(|byte| (10 * word + byte) as u8))
        });
        transpose_bytes(&mut words);
        for (word, value) in words.iter().enumerate() {
            let expected: [u8; 8] = std::array::from_fn(|byte| (10 * byte + word) as u8);
            assert_eq!(value.to_le_bytes(), expected);
        }
    }

    #[test]
    fn rounding_is_to_nearest_even_and_carries_into_the_exponent() {
        assert_eq!(round_mantissa(1.0 + 0.25, 1), 1.0);
        assert_eq!(round_mantissa(1.5 + 0.25, 1), 2.0);
        assert_eq!(round_mantissa(-1.75, 1), -2.0);
        assert_eq!(round_mantissa(1.3, 52), 1.3);
        assert!(round_mantissa(f64::NAN, 3).is_nan());
        assert_eq!(round_mantissa(f64::INFINITY, 3), f64::INFINITY);
    }

    #[test]
    fn rounding_error_is_at_most_half_a_step() {
        let mut value = 1.0;
        for _ in 0..1000 {
            value *= 1.0137;
            let error = (round_mantissa(value, 20) - value).abs() / value;
            assert!(error <= 2f64.powi(-21), "{error}");
        }
    }
}
