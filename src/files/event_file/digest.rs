//! A digest of what an event file holds, whatever its chunks, compression and the threads that wrote it.

use sha2::{Digest, Sha256};

use super::layout::{ColumnSet, Table, exit_number};
use crate::event::{EventBlock, EventSummary, MediumExit, Parton};

/// SHA-256 of the content: every column's little-endian bytes hashed on its own, then the list of all of them.
///
/// The digest is the SHA-256 of one line a column, `/table/column` and the column's SHA-256 in hexadecimal with a
/// space between and a newline after, in the order of the layout (events first). In Python, for one column:
/// `hashlib.sha256(file["partons/px"][...].tobytes()).hexdigest()`.
#[derive(Debug)]
pub struct ContentDigest {
    set: ColumnSet,
    events: Vec<Sha256>,
    partons: Vec<Sha256>,
    next_parton_row: i64,
}

impl ContentDigest {
    /// The digest of a file with such columns, before its first event.
    pub fn new(set: ColumnSet) -> Self {
        let hashers = |table| set.columns(table).iter().map(|_| Sha256::new()).collect();
        ContentDigest {
            set,
            events: hashers(Table::Events),
            partons: hashers(Table::Partons),
            next_parton_row: 0,
        }
    }

    /// Adds the events of a block, which holds exits where the file has them.
    pub fn add(&mut self, block: &EventBlock) {
        let mut starts = Vec::with_capacity(block.events.len());
        for event in &block.events {
            starts.push(self.next_parton_row);
            self.next_parton_row += i64::from(event.partons_count);
        }
        for (column, hasher) in self.set.columns(Table::Events).iter().zip(&mut self.events) {
            let mut bytes = Vec::new();
            for (event, start) in block.events.iter().zip(&starts) {
                append_event_value(column.name, event, *start, &mut bytes);
            }
            hasher.update(&bytes);
        }
        let mut bytes = Vec::new();
        for (column, hasher) in self
            .set
            .columns(Table::Partons)
            .iter()
            .zip(&mut self.partons)
        {
            bytes.clear();
            match exit_number(column.name) {
                Some(number) => append_exit_column(number, &block.exits, &mut bytes),
                None => append_parton_column(column.name, &block.partons, &mut bytes),
            }
            hasher.update(&bytes);
        }
    }

    /// The digest in hexadecimal.
    pub fn finish(self) -> String {
        let mut all = Sha256::new();
        for (table, hashers) in [(Table::Events, self.events), (Table::Partons, self.partons)] {
            for (column, hasher) in self.set.columns(table).iter().zip(hashers) {
                let line = format!(
                    "/{}/{} {}\n",
                    table.group(),
                    column.name,
                    hexadecimal(&hasher.finalize())
                );
                all.update(line);
            }
        }
        hexadecimal(&all.finalize())
    }
}

fn append_event_value(name: &str, event: &EventSummary, start: i64, bytes: &mut Vec<u8>) {
    match name {
        "id" => bytes.extend(event.id.to_le_bytes()),
        "source_weight" => bytes.extend(event.source_weight.to_le_bytes()),
        "weight" => bytes.extend(event.weight.to_le_bytes()),
        "partons_start" => bytes.extend(start.to_le_bytes()),
        "partons_count" => bytes.extend(event.partons_count.to_le_bytes()),
        "hard_scale" => bytes.extend(event.hard_scale_gev.to_le_bytes()),
        "origin" => bytes.extend(event.origin_fm.map(f32::to_le_bytes).as_flattened()),
        "field" => bytes.extend(event.field.to_le_bytes()),
        name => unreachable!("no rule to hash event column {name}"),
    }
}

fn append_parton_column(name: &str, partons: &[Parton], bytes: &mut Vec<u8>) {
    match name {
        "pdg" => append(partons, bytes, |parton| parton.pdg.to_le_bytes()),
        "status" => append(partons, bytes, |parton| (parton.status as i8).to_le_bytes()),
        "parent" => append(partons, bytes, |parton| parton.parent.to_le_bytes()),
        "colour" => append(partons, bytes, |parton| parton.colour.to_le_bytes()),
        "anticolour" => append(partons, bytes, |parton| parton.anticolour.to_le_bytes()),
        "px" => append(partons, bytes, |parton| {
            parton.momentum_gev[0].to_le_bytes()
        }),
        "py" => append(partons, bytes, |parton| {
            parton.momentum_gev[1].to_le_bytes()
        }),
        "pz" => append(partons, bytes, |parton| {
            parton.momentum_gev[2].to_le_bytes()
        }),
        "energy" => append(partons, bytes, |parton| {
            parton.momentum_gev[3].to_le_bytes()
        }),
        "virtuality_squared" => append(partons, bytes, |parton| {
            parton.virtuality_squared_gev2.to_le_bytes()
        }),
        "splitting_fraction" => append(partons, bytes, |parton| {
            parton.splitting_fraction.to_le_bytes()
        }),
        "jet_fraction" => append(partons, bytes, |parton| parton.jet_fraction.to_le_bytes()),
        "birth_t" => append(partons, bytes, |parton| parton.birth_fm[0].to_le_bytes()),
        "birth_x" => append(partons, bytes, |parton| parton.birth_fm[1].to_le_bytes()),
        "birth_y" => append(partons, bytes, |parton| parton.birth_fm[2].to_le_bytes()),
        "birth_z" => append(partons, bytes, |parton| parton.birth_fm[3].to_le_bytes()),
        "channel" => append(partons, bytes, |parton| [parton.channel]),
        name => unreachable!("no rule to hash parton column {name}"),
    }
}

fn append_exit_column(number: usize, exits: &[MediumExit], bytes: &mut Vec<u8>) {
    append(exits, bytes, |exit| exit.numbers()[number].to_le_bytes());
}

fn append<R, const N: usize>(rows: &[R], bytes: &mut Vec<u8>, value: impl Fn(&R) -> [u8; N]) {
    for row in rows {
        bytes.extend_from_slice(&value(row));
    }
}

fn hexadecimal(bytes: &[u8]) -> String {
    bytes.iter().map(|byte| format!("{byte:02x}")).collect()
}
