//! Makes one event from its number: source, origin and shower put together.

use super::exits::MediumExits;
use super::{EventGenerator, EventTooLarge, RunCounters};
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
    /// Where jets are born; `None` without a medium.
    pub origin: Option<Box<dyn Origin>>,
    /// Keep branched partons.
    pub full_history: bool,
    /// The medium whose exits are recorded; `None` where they are not.
    pub exits: Option<MediumExits>,
}

impl EventGenerator for Generator {
    type Worker = Walker;
    type Counters = ShowerCounters;

    fn worker(&self) -> Walker {
        self.shower.walker()
    }

    fn generate(
        &self,
        walker: &mut Walker,
        id: i64,
        block: &mut EventBlock,
    ) -> Result<(), EventTooLarge> {
        let key = Key::event(self.seed, id as u64);
        let hard = self.source.draw(&mut key.stream(Purpose::SOURCE));
        let origin_fm = self.origin_fm(key);
        let first_row = block.partons.len();
        let mut record = Record {
            rows: &mut block.partons,
            full_history: self.full_history,
        };
        let weight = self
            .shower
            .shower(walker, &hard, key, origin_fm, &mut record)
            .map_err(|reason| EventTooLarge { id, reason })?;
        if let Some(exits) = &self.exits {
            exits.append(
                walker.field.as_deref(),
                &block.partons[first_row..],
                &mut block.exits,
            );
        }
        block.events.push(EventSummary {
            id,
            source_weight: hard.weight,
            weight: hard.weight * weight,
            hard_scale_gev: hard.hard_scale_gev,
            origin_fm: origin_fm.map(|component| component as f32),
            field: if self.origin.is_some() { 0 } else { NO_FIELD },
            partons_count: (block.partons.len() - first_row) as i32,
        });
        Ok(())
    }

    fn counters(&self, walker: &Walker) -> ShowerCounters {
        walker.tally.counters.clone()
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
    fn origin_fm(&self, key: Key) -> [f64; 4] {
        let Some(origin) = &self.origin else {
            return [0.0; 4];
        };
        let [x, y] = origin.draw(&mut key.stream(Purpose::ORIGIN));
        [0.0, x, y, 0.0]
    }
}
