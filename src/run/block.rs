//! Blocks: fixed runs of event numbers, whatever the number of threads.

use std::ops::Range;

use super::{EventError, EventGenerator, FinalPartons, RunError, RunTotals};
use crate::event::EventBlock;

/// Events in a block: enough that handing it over costs nothing, few enough that memory stays small.
pub const EVENTS_PER_BLOCK: i64 = 128;

/// Number of blocks in a range of event numbers.
pub(super) fn block_count(ids: &Range<i64>) -> u64 {
    event_count(ids).div_ceil(EVENTS_PER_BLOCK.unsigned_abs())
}

/// Number of events in a range of event numbers.
pub(super) fn event_count(ids: &Range<i64>) -> u64 {
    if ids.is_empty() {
        0
    } else {
        ids.end.abs_diff(ids.start)
    }
}

/// The event numbers of block `index`.
pub(super) fn block_ids(ids: &Range<i64>, index: u64) -> Range<i64> {
    let start = ids.start + index as i64 * EVENTS_PER_BLOCK;
    start..ids.end.min(start + EVENTS_PER_BLOCK)
}

/// Fills an empty block with the events `ids`; counts the final partons while their rows are close at hand.
pub(super) fn fill<G: EventGenerator>(
    generator: &G,
    worker: &mut G::Worker,
    ids: Range<i64>,
    block: &mut EventBlock,
) -> Result<FinalPartons, EventError> {
    let filled = make(generator, worker, ids, block);
    generator.rest(worker);
    filled
}

fn make<G: EventGenerator>(
    generator: &G,
    worker: &mut G::Worker,
    ids: Range<i64>,
    block: &mut EventBlock,
) -> Result<FinalPartons, EventError> {
    let mut finals = FinalPartons::default();
    for id in ids {
        let first_row = block.partons.len();
        generator.generate(worker, id, block)?;
        if let Some(event) = block.events.last() {
            finals.add(event.weight, &block.partons[first_row..]);
        }
    }
    Ok(finals)
}

/// Checks a finished block against what was asked for and adds it to the totals.
pub(super) fn settle<C>(
    block: &EventBlock,
    finals: &FinalPartons,
    ids: Range<i64>,
    totals: &mut RunTotals<C>,
) -> Result<(), RunError> {
    let mut rows = 0;
    let mut expected = ids.clone();
    for event in &block.events {
        if expected.next() != Some(event.id) || event.partons_count < 0 {
            return Err(RunError::Defect(format!(
                "events {}..{} were asked for, event {} with {} rows came",
                ids.start, ids.end, event.id, event.partons_count
            )));
        }
        rows += event.partons_count as usize;
        totals.sums.add(event.source_weight, event.weight);
    }
    if expected.next().is_some() || rows != block.partons.len() {
        return Err(RunError::Defect(format!(
            "events {}..{} were asked for: {} came, with {} rows where their summaries say {rows}",
            ids.start,
            ids.end,
            block.events.len(),
            block.partons.len()
        )));
    }
    if !block.exits.is_empty() && block.exits.len() != rows {
        return Err(RunError::Defect(format!(
            "events {}..{} have {rows} rows, but {} exits from the medium",
            ids.start,
            ids.end,
            block.exits.len()
        )));
    }
    totals.events += block.events.len() as u64;
    totals.partons += rows as u64;
    totals.finals.merge(finals);
    Ok(())
}
