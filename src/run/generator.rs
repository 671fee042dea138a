//! Makes one event from its number: source, origin and shower put together.

use std::sync::Arc;

use super::exits::MediumExits;
use super::fields::{Claim, FieldSeries, LostField};
use super::{EventError, EventGenerator, EventTooLarge, RunCounters};
use crate::event::{EventBlock, EventSummary};
use crate::medium::origin::Origin;
use crate::random::{Key, Purpose};
use crate::shower::Shower;
use crate::shower::counters::ShowerCounters;
use crate::shower::tree::{Record, Walker};
use crate::source::HardSource;

/// The `field` column of an event without a medium.
const NO_FIELD: i32 = -1;

/// Everything that turns an event number into an event.
pub struct Generator {
    /// Seed of all streams.
    pub seed: u64,
    /// The hard process.
    pub source: Box<dyn HardSource>,
    /// The shower with its medium.
    pub shower: Shower,
    /// Where jets are born; `None` without a medium, and where each field has its own places of birth.
    pub origin: Option<Arc<dyn Origin>>,
    /// The temperature fields, where a run has several.
    pub fields: Option<FieldSeries>,
    /// Keep branched partons.
    pub full_history: bool,
    /// The medium whose exits are recorded; `None` where they are not.
    pub exits: Option<MediumExits>,
}

/// What one worker owns.
pub struct EventWorker {
    /// Working memory of the showers.
    pub walker: Walker,
    /// The present field, where a run has several.
    claim: Option<Claim>,
}

impl EventWorker {
    /// Gives up the present field.
    fn leave(&mut self) {
        self.walker.field = None;
        self.claim = None;
    }

    /// Goes into the field of an event.
    fn enter(&mut self, fields: &FieldSeries, id: i64) -> Result<(), LostField> {
        if self.claim.as_ref().is_some_and(|claim| claim.covers(id)) {
            return Ok(());
        }
        self.leave();
        self.claim = fields.claim(id)?;
        let claim = self.claim.as_ref();
        self.walker.field = claim.map(|claim| Arc::clone(&claim.surroundings().field));
        Ok(())
    }
}

impl EventGenerator for Generator {
    type Worker = EventWorker;
    type Counters = ShowerCounters;

    fn worker(&self) -> EventWorker {
        EventWorker {
            walker: self.shower.walker(),
            claim: None,
        }
    }

    fn generate(
        &self,
        worker: &mut EventWorker,
        id: i64,
        block: &mut EventBlock,
    ) -> Result<(), EventError> {
        if let Some(fields) = &self.fields {
            worker.enter(fields, id)?;
        }
        let key = Key::event(self.seed, id as u64);
        let hard = self.source.draw(&mut key.stream(Purpose::SOURCE));
        let source_weight = hard.weight * self.field_weight(id);
        let origin_fm = self.origin_fm(worker, key);
        let first_row = block.partons.len();
        let mut record = Record {
            rows: &mut block.partons,
            full_history: self.full_history,
        };
        let weight = self
            .shower
            .shower(&mut worker.walker, &hard, key, origin_fm, &mut record)
            .map_err(|reason| EventTooLarge { id, reason })?;
        if let Some(exits) = &self.exits {
            exits.append(
                worker.walker.field.as_deref(),
                &block.partons[first_row..],
                &mut block.exits,
            );
        }
        block.events.push(EventSummary {
            id,
            source_weight,
            weight: source_weight * weight,
            hard_scale_gev: hard.hard_scale_gev,
            origin_fm: origin_fm.map(|component| component as f32),
            field: self.field(id),
            partons_count: (block.partons.len() - first_row) as i32,
        });
        Ok(())
    }

    fn rest(&self, worker: &mut EventWorker) {
        worker.leave();
    }

    fn counters(&self, worker: &EventWorker) -> ShowerCounters {
        worker.walker.tally.counters.clone()
    }
}

impl RunCounters for ShowerCounters {
    fn merge(&mut self, other: &Self) {
        *self += other;
    }

    fn named(&self) -> Vec<(String, u64)> {
        let mut named = vec![
            ("branchings".to_string(), self.branchings),
            ("partons_in_medium".to_string(), self.legs_in_medium),
            (
                "partons_below_min_energy".to_string(),
                self.legs_below_min_energy,
            ),
            ("paths_left_hot".to_string(), self.paths_left_hot),
        ];
        // Channels are numbered as in the record: 1 is the vacuum.
        for (place, channel) in self.channels.iter().enumerate() {
            let name = |count: &str| format!("channel_{}_{count}", place + 1);
            named.push((name("trials"), channel.trials));
            named.push((name("accepted"), channel.accepted));
            named.push((name("overshoots"), channel.overshoots));
            named.push((name("cut_by_angle_limit"), channel.cut_by_angle_limit()));
            named.push((name("outside_regime"), channel.outside_regime));
        }
        named
    }
}

impl Generator {
    /// The `field` column of an event.
    fn field(&self, id: i64) -> i32 {
        match &self.fields {
            Some(fields) => fields.schedule().field(id) as i32,
            None if self.origin.is_some() => 0,
            None => NO_FIELD,
        }
    }

    fn field_weight(&self, id: i64) -> f64 {
        self.fields
            .as_ref()
            .map_or(1.0, |fields| fields.weights()[fields.schedule().field(id)])
    }

    fn origin_fm(&self, worker: &EventWorker, key: Key) -> [f64; 4] {
        let claim = worker.claim.as_ref();
        let own = claim.and_then(|claim| claim.surroundings().origin.as_ref());
        let Some(origin) = own.or(self.origin.as_ref()) else {
            return [0.0; 4];
        };
        let [x, y] = origin.draw(&mut key.stream(Purpose::ORIGIN));
        [0.0, x, y, 0.0]
    }
}
