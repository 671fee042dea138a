//! The tree of branchings, walked depth first: each pair of daughters is settled together, gets its momenta, and is
//! recorded; daughters that branched wait on a stack.

mod settle;

use thiserror::Error;

use std::sync::Arc;

use super::Ordering;
use super::evolution::Tools;
use super::kinematics::{Frame, Place, direction, relative_transverse_gev2};
use super::leg::{AngularOrder, Branching, Entrance, Leg, Tally};
use super::ordering::{Constraint, settle};
use crate::event::{CHANNEL_HARD_PROCESS, CHANNEL_VACUUM, NO_PARENT, Parton, Status};
use crate::medium::field::{Ray, TemperatureField};
use crate::qcd::kernels::Splitting;
use crate::qcd::{FIRST_COLOUR_TAG, Species};
use crate::random::Key;
use crate::source::{HardProcess, Topology};

/// More branchings than this in one event are a runaway: a coupling or a medium too strong for the cutoff.
pub const MOST_BRANCHINGS: u32 = 1 << 16;

/// More trials than this in the medium in one event are a runaway too.
pub const MOST_MEDIUM_TRIALS: u32 = 1 << 20;

/// An event that would not end.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Error)]
#[error(
    "passes {MOST_BRANCHINGS} branchings or {MOST_MEDIUM_TRIALS} trials in the medium: raise shower.virtuality_cutoff_GeV, or weaken the coupling or the medium"
)]
pub struct TooManyBranchings;

/// Where the rows of an event go, and which of them are kept.
pub struct Record<'a> {
    /// The rows, those of earlier events first.
    pub rows: &'a mut Vec<Parton>,
    /// Keep branched partons too.
    pub full_history: bool,
}

/// A parton that branched and whose daughters are not made yet.
#[derive(Clone, Copy)]
struct Node {
    species: Species,
    key: Key,
    branching: Branching,
    /// At the vertex, and so with the virtuality `branching.t`.
    place: Place,
    jet_fraction: f64,
    jet: usize,
    vertex_fm: [f64; 4],
    azimuth: [f64; 2],
    colours: [i32; 2],
    row: i32,
}

/// A parton whose virtuality is settled.
struct Settled {
    species: Species,
    key: Key,
    /// At birth.
    place: Place,
    jet_fraction: f64,
    jet: usize,
    birth_fm: [f64; 4],
    colours: [i32; 2],
    parent: i32,
    splitting_fraction: f64,
    channel: u8,
}

/// The working memory of one worker's showers.
pub struct Walker {
    legs: [Leg; 2],
    stack: Vec<Node>,
    frames: [Option<Frame>; 2],
    next_colour: i32,
    /// Place of the effect and four-momentum gained (GeV), of the parton that was settled last.
    exchanges: Vec<(usize, [f64; 4])>,
    /// Row of the event's first parton in the record.
    first_row: usize,
    /// What judging changes.
    pub tally: Tally,
    /// The temperature field of the event, where a run has several.
    pub field: Option<Arc<dyn TemperatureField>>,
}

impl Walker {
    /// A walker for a number of effects.
    pub fn new(effects: usize) -> Walker {
        Walker {
            legs: [Leg::idle(), Leg::idle()],
            stack: Vec::new(),
            frames: [None; 2],
            next_colour: FIRST_COLOUR_TAG,
            exchanges: Vec::new(),
            first_row: 0,
            tally: Tally {
                weight: 1.0,
                counters: super::counters::ShowerCounters::new(effects),
                trials_left: MOST_MEDIUM_TRIALS,
            },
            field: None,
        }
    }

    /// Showers one hard process and appends its rows; returns the shower's weight.
    ///
    /// # Errors
    /// [`TooManyBranchings`] where the event passes [`MOST_BRANCHINGS`] or [`MOST_MEDIUM_TRIALS`]; its rows are then not whole.
    pub fn walk(
        &mut self,
        tools: Tools,
        hard: &HardProcess,
        key: Key,
        origin_fm: [f64; 4],
        record: &mut Record,
    ) -> Result<f64, TooManyBranchings> {
        self.tally.weight = 1.0;
        self.tally.trials_left = MOST_MEDIUM_TRIALS;
        self.stack.clear();
        self.first_row = record.rows.len();
        self.next_colour = hard.next_colour();
        self.primaries(tools, hard, key, origin_fm, record);
        let mut branchings = 0;
        while let Some(node) = self.stack.pop() {
            branchings += 1;
            if branchings > MOST_BRANCHINGS || self.tally.trials_left == 0 {
                return Err(TooManyBranchings);
            }
            self.daughters(tools, &node, record);
        }
        match self.tally.trials_left {
            0 => Err(TooManyBranchings),
            _ => Ok(self.tally.weight),
        }
    }

    /// The first step of [`Walker::walk`] alone: the branchings of the hard partons, and the weight up to there.
    pub fn first_branchings(
        &mut self,
        tools: Tools,
        hard: &HardProcess,
        key: Key,
        origin_fm: [f64; 4],
    ) -> ([Option<Branching>; 2], f64) {
        self.tally.weight = 1.0;
        self.tally.trials_left = MOST_MEDIUM_TRIALS;
        let branchings = self.evolve_primaries(tools, hard, key, origin_fm);
        (branchings, self.tally.weight)
    }

    fn primaries(
        &mut self,
        tools: Tools,
        hard: &HardProcess,
        key: Key,
        origin_fm: [f64; 4],
        record: &mut Record,
    ) {
        let branchings = self.evolve_primaries(tools, hard, key, origin_fm);
        let virtualities =
            branchings.map(|branching| branching.map_or(0.0, |branching| branching.t));
        for (jet, parton) in hard.partons().iter().enumerate() {
            let plus_gev = match tools.settings.ordering {
                Ordering::Collinear => 2.0 * parton.energy_gev,
                Ordering::Virtuality | Ordering::Angular => {
                    hard.plus_momentum_gev(jet, virtualities)
                }
            };
            self.frames[jet] = Some(Frame::new(parton.direction, plus_gev));
            let row = self.record_hard(hard, jet, origin_fm, record);
            let settled = Settled {
                species: parton.species,
                key: key.daughter(jet as u64),
                place: Place::PRIMARY,
                jet_fraction: 1.0,
                jet,
                birth_fm: origin_fm,
                colours: parton.colours,
                parent: row,
                splitting_fraction: 1.0,
                channel: CHANNEL_HARD_PROCESS,
            };
            self.settle_one(tools, settled, branchings[jet], jet, record);
        }
    }

    /// The first branchings of the hard partons, settled together; a missing second parton counts as final.
    fn evolve_primaries(
        &mut self,
        tools: Tools,
        hard: &HardProcess,
        key: Key,
        origin_fm: [f64; 4],
    ) -> [Option<Branching>; 2] {
        let partons = hard.partons();
        let largest_t = hard.start_virtuality_gev * hard.start_virtuality_gev;
        for (place, parton) in partons.iter().enumerate() {
            let key = key.daughter(place as u64);
            let leg = &mut self.legs[place];
            leg.start(
                tools.evolution,
                parton.species,
                key,
                largest_t,
                AngularOrder::NONE,
            );
            let entrance = Entrance {
                key,
                largest_t_gev2: largest_t,
                energy_gev: parton.energy_gev,
                ray: Ray {
                    birth_fm: origin_fm,
                    direction: parton.direction,
                },
            };
            leg.enter_medium(tools, &entrance, &mut self.tally);
        }
        let constraint = match (tools.settings.ordering, hard.topology) {
            (Ordering::Collinear, _) | (_, Topology::Single) => Constraint::None,
            (_, Topology::Pair { sqrt_s_gev }) => Constraint::TwoBody { sqrt_s_gev },
        };
        settle(
            tools,
            &mut self.legs[..partons.len()],
            [largest_t; 2],
            constraint,
            &mut self.tally,
        )
    }

    fn record_hard(
        &self,
        hard: &HardProcess,
        jet: usize,
        origin_fm: [f64; 4],
        record: &mut Record,
    ) -> i32 {
        let parton = &hard.partons()[jet];
        let [nx, ny, nz] = parton.direction;
        let e = parton.energy_gev;
        record.rows.push(Parton {
            momentum_gev: [e * nx, e * ny, e * nz, e],
            birth_fm: origin_fm.map(|component| component as f32),
            virtuality_squared_gev2: 0.0,
            splitting_fraction: 1.0,
            jet_fraction: 1.0,
            pdg: parton.species.pdg(),
            parent: NO_PARENT,
            colour: parton.colours[0],
            anticolour: parton.colours[1],
            status: Status::Hard,
            channel: CHANNEL_HARD_PROCESS,
        });
        (record.rows.len() - 1 - self.first_row) as i32
    }

    /// Makes the daughters of a branched parton.
    fn daughters(&mut self, tools: Tools, node: &Node, record: &mut Record) {
        self.tally.counters.branchings += 1;
        let Branching {
            t,
            z,
            daughters,
            channel,
            ..
        } = node.branching;
        let largest_t = match tools.settings.ordering {
            Ordering::Collinear => [t, t],
            Ordering::Virtuality | Ordering::Angular => [z * t, (1.0 - z) * t],
        };
        let keys = [node.key.daughter(0), node.key.daughter(1)];
        let fractions = [z, 1.0 - z];
        for daughter in 0..2 {
            let order = match tools.settings.ordering {
                Ordering::Angular => self.angular_order(node, fractions[daughter]),
                Ordering::Virtuality | Ordering::Collinear => AngularOrder::NONE,
            };
            self.legs[daughter].start(
                tools.evolution,
                daughters[daughter],
                keys[daughter],
                largest_t[daughter],
                order,
            );
        }
        if tools.evolution.medium.is_some() {
            self.enter_medium(tools, node, keys, largest_t);
        }
        let constraint = match tools.settings.ordering {
            Ordering::Collinear => Constraint::None,
            Ordering::Virtuality | Ordering::Angular => Constraint::Daughters { t, z },
        };
        let branchings = settle(
            tools,
            &mut self.legs,
            largest_t,
            constraint,
            &mut self.tally,
        );
        let places = match tools.settings.ordering {
            Ordering::Collinear => node.place.split(z, [0.0; 2]),
            Ordering::Virtuality | Ordering::Angular => {
                let virtualities =
                    branchings.map(|branching| branching.map_or(0.0, |branching| branching.t));
                // The constraint holds to the last bit or the loop would have gone on, so the root exists.
                let k = relative_transverse_gev2(t, z, virtualities).sqrt();
                node.place
                    .split(z, node.azimuth.map(|component| component * k))
            }
        };
        let colours = self.split_colours(node, daughters);
        for daughter in 0..2 {
            let settled = Settled {
                species: daughters[daughter],
                key: keys[daughter],
                place: places[daughter],
                jet_fraction: fractions[daughter] * node.jet_fraction,
                jet: node.jet,
                birth_fm: node.vertex_fm,
                colours: colours[daughter],
                parent: node.row,
                splitting_fraction: fractions[daughter],
                channel: CHANNEL_VACUUM + channel as u8,
            };
            self.settle_one(tools, settled, branchings[daughter], daughter, record);
        }
    }

    /// While a pair evolves, energies and directions are those of massless daughters.
    fn enter_medium(&mut self, tools: Tools, node: &Node, keys: [Key; 2], largest_t: [f64; 2]) {
        let Branching { t, z, .. } = node.branching;
        let kappa = (z * (1.0 - z) * t).sqrt();
        let places = node
            .place
            .split(z, node.azimuth.map(|component| component * kappa));
        for daughter in 0..2 {
            let momentum = self.frame(node.jet).momentum(&places[daughter], 0.0);
            let ray = Ray {
                birth_fm: node.vertex_fm,
                direction: direction(momentum),
            };
            let entrance = Entrance {
                key: keys[daughter],
                largest_t_gev2: largest_t[daughter],
                energy_gev: momentum[3],
                ray,
            };
            self.legs[daughter].enter_medium(tools, &entrance, &mut self.tally);
        }
    }

    fn frame(&self, jet: usize) -> &Frame {
        self.frames[jet]
            .as_ref()
            .expect("a jet has its frame before it has daughters")
    }

    /// Angles of a daughter's emissions lie below that of the branching that made it.
    fn angular_order(&self, node: &Node, fraction: f64) -> AngularOrder {
        let Branching { t, z, .. } = node.branching;
        let spread_gev2 = t / (z * (1.0 - z));
        let energy_gev = self.frame(node.jet).momentum(&node.place, t)[3];
        AngularOrder {
            most_gev2: spread_gev2 * fraction * fraction,
            birth_angle2: spread_gev2 / (energy_gev * energy_gev),
        }
    }

    /// Leading-colour flow: each splitting into a gluon opens one new line.
    fn split_colours(&mut self, node: &Node, daughters: [Species; 2]) -> [[i32; 2]; 2] {
        let [colour, anticolour] = node.colours;
        if splitting(node.species, daughters) == Splitting::GluonToQuarks {
            return [[colour, 0], [0, anticolour]];
        }
        let new = self.next_colour;
        self.next_colour += 1;
        match () {
            () if node.species.is_gluon() => [[colour, new], [new, anticolour]],
            () if node.species.is_antiquark() => [[0, new], [new, anticolour]],
            () => [[new, 0], [colour, new]],
        }
    }
}

fn splitting(parent: Species, daughters: [Species; 2]) -> Splitting {
    match (parent.is_gluon(), daughters[0].is_gluon()) {
        (false, _) => Splitting::QuarkToQuarkGluon,
        (true, true) => Splitting::GluonToGluons,
        (true, false) => Splitting::GluonToQuarks,
    }
}
