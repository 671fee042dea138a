//! How long a run will take and how much it will write, measured on its first events.

use std::ops::Range;
use std::sync::Arc;
use std::time::{Duration, Instant};

use super::EventGenerator;
use super::block::event_count;
use crate::config::RecordSettings;
use crate::event::EventBlock;
use crate::files::event_file::{PackedGroup, Packer, RowGroup, Table};

/// The sample is this share of the run, so that the forecast costs next to nothing beside it,
const SAMPLE_SHARE: u64 = 50;
/// but at least so many events,
const FEWEST_EVENTS: u64 = 256;
/// and ends when it has filled a chunk of every parton column,
const MOST_ROWS: usize = Table::Partons.chunk_rows();
/// or after this time.
const LONGEST: Duration = Duration::from_millis(200);

/// What a run is expected to take.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Forecast {
    /// Events that were made to measure it.
    pub events_sampled: u64,
    /// Time of the whole run.
    pub seconds: f64,
    /// Size of the columns of the event file; 0 where nothing is written.
    pub bytes: f64,
}

impl Forecast {
    /// Makes the first of the events `ids`, in memory, in this thread, and scales up. `cores` is the number of
    /// threads that will really run at the same time; `record` is `None` where nothing will be written.
    pub fn measure<G: EventGenerator>(
        generator: &G,
        ids: Range<i64>,
        cores: usize,
        record: Option<&RecordSettings>,
    ) -> Forecast {
        let mut block = EventBlock::default();
        let making = make_some(generator, ids.clone(), &mut block);
        let sampled = block.events.len().max(1) as f64;
        let scale = event_count(&ids) as f64 / sampled;
        let mut seconds = scale * making.as_secs_f64();
        let events_sampled = block.events.len() as u64;
        let mut bytes = 0.0;
        if let Some(record) = record {
            let mut packer = Packer::new(record);
            let rows = (scale * block.partons.len() as f64) as u64;
            let block = Arc::new(block);
            for (table, rows) in [(Table::Events, event_count(&ids)), (Table::Partons, rows)] {
                let cost = packing(&mut packer, &block, table, rows);
                seconds += cost.seconds;
                bytes += cost.bytes;
            }
        }
        Forecast {
            events_sampled,
            seconds: seconds / cores.max(1) as f64,
            bytes,
        }
    }
}

fn make_some<G: EventGenerator>(
    generator: &G,
    ids: Range<i64>,
    block: &mut EventBlock,
) -> Duration {
    let wanted = (event_count(&ids) / SAMPLE_SHARE).max(FEWEST_EVENTS);
    let mut worker = generator.worker();
    let start = Instant::now();
    for (id, _) in ids.zip(0..wanted) {
        // The probe before the run hears of events that do not end; here they cost what was made of them.
        if generator.generate(&mut worker, id, block).is_err() {
            break;
        }
        if block.partons.len() >= MOST_ROWS || start.elapsed() > LONGEST {
            break;
        }
    }
    start.elapsed()
}

#[derive(Clone, Copy, Default)]
struct Cost {
    seconds: f64,
    bytes: f64,
}

/// Cost of packing `rows` rows of a table, if they are like those of the block.
///
/// Two chunks are packed, a whole one and the last one of the file, which is padded; where the block holds too few rows
/// they are taken again. (From compression 2 on, that repetition is found and makes a forecast of a short run low.)
fn packing(packer: &mut Packer, block: &Arc<EventBlock>, table: Table, rows: u64) -> Cost {
    let chunk = table.chunk_rows() as u64;
    let mut total = Cost::default();
    for (chunks, rows) in [(rows / chunk, chunk), (1, rows % chunk)] {
        if chunks > 0 && rows > 0 {
            let one = pack(packer, &group(block, table, rows as usize));
            total.seconds += chunks as f64 * one.seconds;
            total.bytes += chunks as f64 * one.bytes;
        }
    }
    total
}

fn group(block: &Arc<EventBlock>, table: Table, rows: usize) -> RowGroup {
    let available = match table {
        Table::Events => block.events.len(),
        Table::Partons => block.partons.len(),
    };
    let mut segments = Vec::new();
    let mut missing = rows;
    while missing > 0 && available > 0 {
        let taken = missing.min(available);
        segments.push((Arc::clone(block), 0..taken));
        missing -= taken;
    }
    RowGroup {
        table,
        index: 0,
        segments,
        rows,
        first_parton_row: 0,
    }
}

fn pack(packer: &mut Packer, group: &RowGroup) -> Cost {
    let mut packed = PackedGroup::default();
    let start = Instant::now();
    packer.pack(group, &mut packed);
    Cost {
        seconds: start.elapsed().as_secs_f64(),
        bytes: packed.packed_bytes() as f64,
    }
}
