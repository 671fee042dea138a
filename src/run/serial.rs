//! The driver on one thread: make a block, pack what it fills, write it.

use std::ops::Range;
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use super::block::{block_count, block_ids, event_count, fill, settle};
use super::{EventGenerator, Progress, RunError, RunTotals, Sink, close, keep, panic_message};
use crate::event::EventBlock;
use crate::files::event_file::{EventFileWriter, PackedGroup, Packer, RowGroup, RowGrouper};

pub(super) fn run<G: EventGenerator>(
    generator: &G,
    ids: Range<i64>,
    mut sink: Sink,
    progress: &dyn Progress,
    stop: &AtomicBool,
) -> Result<RunTotals<G::Counters>, RunError> {
    let mut totals = RunTotals::default();
    let made = catch_unwind(AssertUnwindSafe(|| {
        let mut worker = generator.worker();
        match &mut sink {
            Sink::Discard => discard(generator, &mut worker, &ids, &mut totals, progress, stop),
            Sink::File(writer) => stream(
                generator,
                &mut worker,
                &ids,
                writer,
                &mut totals,
                progress,
                stop,
            ),
        }?;
        totals.counters = generator.counters(&worker);
        Ok::<_, RunError>(())
    }));
    let made = made.unwrap_or_else(|panic| Err(RunError::Defect(panic_message(panic))));
    if let Err(error) = made {
        return Err(keep(sink, error));
    }
    totals.completed = totals.events == event_count(&ids);
    close(sink, &mut totals)?;
    Ok(totals)
}

fn discard<G: EventGenerator>(
    generator: &G,
    worker: &mut G::Worker,
    ids: &Range<i64>,
    totals: &mut RunTotals<G::Counters>,
    progress: &dyn Progress,
    stop: &AtomicBool,
) -> Result<(), RunError> {
    let mut block = EventBlock::default();
    for index in 0..block_count(ids) {
        if stop.load(Ordering::Relaxed) {
            break;
        }
        block.clear();
        let finals = fill(generator, worker, block_ids(ids, index), &mut block)?;
        settle(&block, &finals, block_ids(ids, index), totals)?;
        progress.events_done(totals.events, event_count(ids));
    }
    Ok(())
}

fn stream<G: EventGenerator>(
    generator: &G,
    worker: &mut G::Worker,
    ids: &Range<i64>,
    writer: &mut EventFileWriter,
    totals: &mut RunTotals<G::Counters>,
    progress: &dyn Progress,
    stop: &AtomicBool,
) -> Result<(), RunError> {
    let mut output = PackingOutput::new(writer);
    let mut grouper = RowGrouper::default();
    let mut filled = Vec::new();
    for index in 0..block_count(ids) {
        if stop.load(Ordering::Relaxed) {
            totals.packed_bytes = output.packed_bytes;
            return Ok(());
        }
        let mut block = output.spare.pop().unwrap_or_default();
        let finals = fill(generator, worker, block_ids(ids, index), &mut block)?;
        settle(&block, &finals, block_ids(ids, index), totals)?;
        let block = Arc::new(block);
        grouper.push(&block, |group| filled.push(group));
        output.reclaim(block);
        for group in filled.drain(..) {
            output.write(group)?;
        }
        progress.events_done(totals.events, event_count(ids));
    }
    for group in grouper.finish() {
        output.write(group)?;
    }
    totals.packed_bytes = output.packed_bytes;
    Ok(())
}

/// Packs and writes in the same thread, with one set of buffers.
struct PackingOutput<'a> {
    writer: &'a mut EventFileWriter,
    packer: Packer,
    packed: PackedGroup,
    packed_bytes: u64,
    /// Emptied blocks, for their memory.
    spare: Vec<EventBlock>,
}

impl<'a> PackingOutput<'a> {
    fn new(writer: &'a mut EventFileWriter) -> Self {
        PackingOutput {
            packer: Packer::new(&writer.record()),
            writer,
            packed: PackedGroup::default(),
            packed_bytes: 0,
            spare: Vec::new(),
        }
    }

    fn write(&mut self, group: RowGroup) -> Result<(), RunError> {
        self.packer.pack(&group, &mut self.packed);
        for (block, _) in group.segments {
            self.reclaim(block);
        }
        self.packed_bytes += self.packed.packed_bytes() as u64;
        self.writer.write(&self.packed)?;
        Ok(())
    }

    fn reclaim(&mut self, block: Arc<EventBlock>) {
        if let Some(mut block) = Arc::into_inner(block) {
            block.clear();
            self.spare.push(block);
        }
    }
}
