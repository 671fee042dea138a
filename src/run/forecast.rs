//! How long a run will take and how much it will write, measured on its first events.

use std::ops::Range;
use std::sync::Arc;
use std::time::{Duration, Instant};

use super::EventGenerator;
use super::block::event_count;
use crate::config::RecordSettings;
use crate::event::EventBlock;
use crate::files::event_file::{PackedGroup, Packer, RowGroup, RowGrouper, Table};

/// The sample is this share of the run, so that the forecast costs next to nothing beside it,
const SAMPLE_SHARE: u64 = 100;
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
            let cost = packing(record, Arc::new(block), scale);
            seconds += cost.seconds;
            bytes = cost.bytes;
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
        generator.generate(&mut worker, id, block);
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

/// Cost of packing `scale` times the events of a block.
fn packing(record: &RecordSettings, block: Arc<EventBlock>, scale: f64) -> Cost {
    let mut grouper = RowGrouper::default();
    let mut groups = Vec::new();
    grouper.push(&block, |group| groups.push(group));
    groups.extend(grouper.finish());
    let mut packer = Packer::new(record);
    let mut total = Cost::default();
    for table in [Table::Events, Table::Partons] {
        // chunks are padded to full length: what the padding costs is measured on a group without rows
        let empty = pack(&mut packer, &empty_group(table));
        let (mut filled, mut chunks) = (Cost::default(), 0.0);
        for group in groups.iter().filter(|group| group.table == table) {
            let cost = pack(&mut packer, group);
            let padding = 1.0 - share(group);
            filled.seconds += cost.seconds - padding * empty.seconds;
            filled.bytes += cost.bytes - padding * empty.bytes;
            chunks += share(group);
        }
        let padding = (scale * chunks).ceil() - scale * chunks;
        total.seconds += scale * filled.seconds + padding * empty.seconds;
        total.bytes += scale * filled.bytes + padding * empty.bytes;
    }
    total
}

fn share(group: &RowGroup) -> f64 {
    group.rows as f64 / group.table.chunk_rows() as f64
}

fn empty_group(table: Table) -> RowGroup {
    RowGroup {
        table,
        index: 0,
        segments: Vec::new(),
        rows: 0,
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
