//! Packing: rows in memory to finished chunks, as HDF5's shuffle, deflate and fletcher32 filters would make them.

use std::ops::Range;
use std::sync::Arc;

use super::checksum::fletcher32;
use super::layout::{Column, Element, FULL_MANTISSA_BITS, Table};
use super::planes::PlaneEncoder;
use super::row_groups::RowGroup;
use crate::config::RecordSettings;
use crate::event::{EventBlock, EventSummary, Parton};

/// Values gathered before they are scattered to byte planes: few enough to stay in the first-level cache.
const TILE_VALUES: usize = 512;

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
    planes: Vec<u8>,
}

impl Packer {
    /// A packer for the compression and the momentum rounding of a run.
    pub fn new(record: &RecordSettings) -> Self {
        Packer {
            encoder: (record.compression > 0).then(|| PlaneEncoder::new(record.compression)),
            momentum_bits: record.momentum_bits,
            planes: Vec::new(),
        }
    }

    /// Packs a group into `packed`, whose memory is reused and whose content is lost.
    pub fn pack(&mut self, group: &RowGroup, packed: &mut PackedGroup) {
        packed.restart(group);
        if group.table == Table::Events {
            let mut end = group.first_parton_row;
            for (block, rows) in &group.segments {
                for event in &block.events[rows.clone()] {
                    end += i64::from(event.partons_count);
                    packed.parton_row_ends.push(end);
                }
            }
        }
        for column in group.table.columns() {
            self.planes.clear();
            self.planes.resize(column.chunk_bytes(group.table), 0);
            match group.table {
                Table::Events => self.gather_event_column(column, group),
                Table::Partons => self.gather_parton_column(column, group),
            }
            self.append_chunk(column.element, packed);
        }
    }

    fn append_chunk(&mut self, element: Element, packed: &mut PackedGroup) {
        let start = packed.bytes.len();
        match &mut self.encoder {
            Some(encoder) => encoder.encode(&self.planes, element.bytes(), &mut packed.bytes),
            None => packed.bytes.extend_from_slice(&self.planes),
        }
        let checksum = fletcher32(&packed.bytes[start..]);
        packed.bytes.extend_from_slice(&checksum.to_le_bytes());
        packed.chunk_ends.push(packed.bytes.len());
    }

    fn gather_event_column(&mut self, column: &Column, group: &RowGroup) {
        let mut sink = ColumnSink::new(group, &mut self.planes);
        match column.name {
            "id" => sink.events(|event| [event.id.to_le_bytes()]),
            "source_weight" => sink.events(|event| [event.source_weight.to_le_bytes()]),
            "weight" => sink.events(|event| [event.weight.to_le_bytes()]),
            "partons_start" => {
                let mut next = group.first_parton_row;
                sink.events(|event| {
                    let start = next;
                    next += i64::from(event.partons_count);
                    [start.to_le_bytes()]
                });
            }
            "partons_count" => sink.events(|event| [event.partons_count.to_le_bytes()]),
            "hard_scale" => sink.events(|event| [event.hard_scale_gev.to_le_bytes()]),
            "origin" => sink.events(|event| event.origin_fm.map(f32::to_le_bytes)),
            "field" => sink.events(|event| [event.field.to_le_bytes()]),
            name => unreachable!("no rule to gather event column {name}"),
        }
    }

    fn gather_parton_column(&mut self, column: &Column, group: &RowGroup) {
        let mut sink = ColumnSink::new(group, &mut self.planes);
        match column.name {
            "pdg" => sink.partons(|parton| [parton.pdg.to_le_bytes()]),
            "status" => sink.partons(|parton| [(parton.status as i8).to_le_bytes()]),
            "parent" => sink.partons(|parton| [parton.parent.to_le_bytes()]),
            "colour" => sink.partons(|parton| [parton.colour.to_le_bytes()]),
            "anticolour" => sink.partons(|parton| [parton.anticolour.to_le_bytes()]),
            "px" => sink.momentum(0, self.momentum_bits),
            "py" => sink.momentum(1, self.momentum_bits),
            "pz" => sink.momentum(2, self.momentum_bits),
            "energy" => sink.momentum(3, self.momentum_bits),
            "virtuality_squared" => {
                sink.partons(|parton| [parton.virtuality_squared_gev2.to_le_bytes()])
            }
            "splitting_fraction" => {
                sink.partons(|parton| [parton.splitting_fraction.to_le_bytes()])
            }
            "jet_fraction" => sink.partons(|parton| [parton.jet_fraction.to_le_bytes()]),
            "birth_t" => sink.partons(|parton| [parton.birth_fm[0].to_le_bytes()]),
            "birth_x" => sink.partons(|parton| [parton.birth_fm[1].to_le_bytes()]),
            "birth_y" => sink.partons(|parton| [parton.birth_fm[2].to_le_bytes()]),
            "birth_z" => sink.partons(|parton| [parton.birth_fm[3].to_le_bytes()]),
            "channel" => sink.partons(|parton| [[parton.channel]]),
            name => unreachable!("no rule to gather parton column {name}"),
        }
    }
}

/// Takes one column of a group apart into byte planes: all lowest bytes first, the highest last (HDF5's shuffle).
struct ColumnSink<'a> {
    segments: &'a [(Arc<EventBlock>, Range<usize>)],
    planes: &'a mut [u8],
    filled: usize,
}

impl<'a> ColumnSink<'a> {
    fn new(group: &'a RowGroup, planes: &'a mut [u8]) -> Self {
        ColumnSink {
            segments: &group.segments,
            planes,
            filled: 0,
        }
    }

    fn events<const N: usize, const W: usize>(
        &mut self,
        mut value: impl FnMut(&EventSummary) -> [[u8; N]; W],
    ) {
        for (block, rows) in self.segments {
            self.append(&block.events[rows.clone()], &mut value);
        }
    }

    fn partons<const N: usize>(&mut self, mut value: impl FnMut(&Parton) -> [[u8; N]; 1]) {
        for (block, rows) in self.segments {
            self.append(&block.partons[rows.clone()], &mut value);
        }
    }

    fn momentum(&mut self, component: usize, kept_bits: Option<u8>) {
        match kept_bits {
            None => self.partons(|parton| [parton.momentum_gev[component].to_le_bytes()]),
            Some(bits) => self.partons(|parton| {
                [round_mantissa(parton.momentum_gev[component], bits).to_le_bytes()]
            }),
        }
    }

    fn append<R, const N: usize, const W: usize>(
        &mut self,
        rows: &[R],
        mut value: impl FnMut(&R) -> [[u8; N]; W],
    ) {
        let stride = self.planes.len() / N;
        let mut tile = [[0; N]; TILE_VALUES];
        for rows in rows.chunks(TILE_VALUES / W) {
            for (place, row) in tile.chunks_exact_mut(W).zip(rows) {
                place.copy_from_slice(&value(row));
            }
            let count = rows.len() * W;
            for (byte, plane) in self.planes.chunks_exact_mut(stride).enumerate() {
                let targets = &mut plane[self.filled..self.filled + count];
                for (target, value) in targets.iter_mut().zip(&tile) {
                    *target = value[byte];
                }
            }
            self.filled += count;
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
    use super::round_mantissa;

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
