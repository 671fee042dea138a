//! A generator of made-up events for tests of the driver and the files: reproducible, balanced, without physics.

#![allow(dead_code)] // each test file uses part of this

pub mod field_maker;

use rand::{RngExt, SeedableRng};
use rand_pcg::Pcg64;

use spindrift::config::History;
use spindrift::event::{
    CHANNEL_HARD_PROCESS, CHANNEL_VACUUM, EventBlock, EventSummary, MediumExit, NO_PARENT, Parton,
    Status,
};
use spindrift::files::event_file::{FieldEntry, Kinematics, Provenance};
use spindrift::run::{EventError, EventGenerator, RunCounters};

pub const ENERGY_GEV: f64 = 100.0;

/// Events in which a gluon pair at rest splits into massless partons by successive two-body decays.
#[derive(Clone, Copy)]
pub struct FakeGenerator {
    pub history: History,
    pub mean_branchings: u64,
    /// Gives final partons an exit from a made-up medium.
    pub exits: bool,
    /// Panics at this event.
    pub panic_at: Option<i64>,
}

impl Default for FakeGenerator {
    fn default() -> Self {
        FakeGenerator {
            history: History::Final,
            mean_branchings: 8,
            exits: false,
            panic_at: None,
        }
    }
}

#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct FakeCounters {
    pub trials: u64,
}

impl RunCounters for FakeCounters {
    fn merge(&mut self, other: &Self) {
        self.trials += other.trials;
    }

    fn named(&self) -> Vec<(String, u64)> {
        vec![("trials".to_owned(), self.trials)]
    }
}

impl EventGenerator for FakeGenerator {
    type Worker = FakeCounters;
    type Counters = FakeCounters;

    fn worker(&self) -> FakeCounters {
        FakeCounters::default()
    }

    fn generate(
        &self,
        worker: &mut FakeCounters,
        id: i64,
        out: &mut EventBlock,
    ) -> Result<(), EventError> {
        assert_ne!(self.panic_at, Some(id), "told to panic");
        let mut random = Pcg64::seed_from_u64(id.unsigned_abs());
        let branchings = random.random_range(0..=2 * self.mean_branchings);
        worker.trials += branchings;
        let rows = event_rows(&mut random, branchings, self.history);
        out.events.push(EventSummary {
            id,
            source_weight: 1.0,
            weight: 0.5 + random.random::<f64>(),
            hard_scale_gev: ENERGY_GEV / 2.0,
            origin_fm: [0.0, random.random(), random.random(), 0.0],
            field: if self.exits { 0 } else { -1 },
            partons_count: rows.len() as i32,
        });
        if self.exits {
            out.exits.extend(rows.iter().map(made_up_exit));
        }
        out.partons.extend(rows);
        Ok(())
    }

    fn counters(&self, worker: &FakeCounters) -> FakeCounters {
        *worker
    }
}

/// The whole record of one event, or its hard and final rows.
fn event_rows(random: &mut Pcg64, branchings: u64, history: History) -> Vec<Parton> {
    let mut rows = hard_rows();
    let masses = [
        random.random::<f64>() * ENERGY_GEV / 2.0,
        random.random::<f64>() * ENERGY_GEV / 2.0,
    ];
    let total = [0.0, 0.0, 0.0, 2.0 * ENERGY_GEV];
    let momenta = decay(random, total, masses);
    for side in 0..2 {
        rows.push(Parton {
            momentum_gev: momenta[side],
            virtuality_squared_gev2: (masses[side] * masses[side]) as f32,
            parent: side as i32,
            status: Status::Final,
            ..rows[side]
        });
    }
    let mut exact_masses = vec![0.0, 0.0, masses[0], masses[1]];
    let mut next_tag = 503;
    for _ in 0..branchings {
        let heaviest = (2..rows.len())
            .filter(|row| rows[*row].status == Status::Final)
            .max_by(|a, b| exact_masses[*a].total_cmp(&exact_masses[*b]))
            .expect("two primaries at least");
        branch(
            random,
            &mut rows,
            &mut exact_masses,
            heaviest,
            &mut next_tag,
        );
    }
    settle_finals(random, &mut rows, &mut exact_masses, &mut next_tag);
    match history {
        History::Full => rows,
        History::Final => only_hard_and_final(&rows),
    }
}

/// The exit from a medium that ends at a time, on the path of a final parton.
pub fn made_up_exit(row: &Parton) -> MediumExit {
    const END_FM: f64 = 2.5;
    let birth = row.birth_fm.map(f64::from);
    let length = END_FM - birth[0];
    if row.status != Status::Final || length <= 0.0 {
        return MediumExit::NONE;
    }
    let [px, py, pz, _] = row.momentum_gev;
    let size = (px * px + py * py + pz * pz).sqrt();
    let along = |axis: usize| (birth[axis] + row.momentum_gev[axis - 1] / size * length) as f32;
    MediumExit {
        place_fm: [END_FM as f32, along(1), along(2), along(3)],
        temperature_gev: 0.15,
        velocity: [along(1) / 9.0, along(2) / 9.0, along(3)],
    }
}

fn hard_rows() -> Vec<Parton> {
    let hard = |sign: f64, colour, anticolour| Parton {
        momentum_gev: [sign * ENERGY_GEV, 0.0, 0.0, ENERGY_GEV],
        birth_fm: [0.0; 4],
        virtuality_squared_gev2: 0.0,
        splitting_fraction: 1.0,
        jet_fraction: 1.0,
        pdg: 21,
        parent: NO_PARENT,
        colour,
        anticolour,
        status: Status::Hard,
        channel: CHANNEL_HARD_PROCESS,
    };
    vec![hard(1.0, 501, 502), hard(-1.0, 502, 501)]
}

/// Splits a row into two of given or drawn masses.
fn branch(
    random: &mut Pcg64,
    rows: &mut Vec<Parton>,
    masses: &mut Vec<f64>,
    parent: usize,
    next_tag: &mut i32,
) {
    let mass = masses[parent];
    let first = mass * random.random::<f64>() * 0.7;
    let second = (mass - first) * random.random::<f64>() * 0.5;
    branch_into(random, rows, masses, parent, [first, second], next_tag);
}

/// Partons that still have a mass end in two massless ones.
fn settle_finals(
    random: &mut Pcg64,
    rows: &mut Vec<Parton>,
    masses: &mut Vec<f64>,
    next_tag: &mut i32,
) {
    for row in 2..rows.len() {
        if rows[row].status == Status::Final && masses[row] > 0.0 {
            branch_into(random, rows, masses, row, [0.0; 2], next_tag);
        }
    }
}

fn branch_into(
    random: &mut Pcg64,
    rows: &mut Vec<Parton>,
    masses: &mut Vec<f64>,
    parent: usize,
    daughters: [f64; 2],
    next_tag: &mut i32,
) {
    let mother = rows[parent];
    let z: f64 = random.random();
    let momenta = decay(random, mother.momentum_gev, daughters);
    let flavour = random.random_range(1..=5);
    let new = *next_tag;
    // first and second daughter: particle, colour, anticolour
    let [first, second] = match mother.pdg {
        21 if random.random_bool(0.1) => [
            (flavour, mother.colour, 0),
            (-flavour, 0, mother.anticolour),
        ],
        21 => [(21, mother.colour, new), (21, new, mother.anticolour)],
        quark if quark > 0 => [(quark, new, 0), (21, mother.colour, new)],
        antiquark => [(antiquark, 0, new), (21, new, mother.anticolour)],
    };
    *next_tag += 1;
    rows[parent].status = Status::Branched;
    let step: f32 = random.random();
    for (((pdg, colour, anticolour), fraction), side) in
        [first, second].into_iter().zip([z, 1.0 - z]).zip(0..)
    {
        let direction = |axis: usize| (mother.momentum_gev[axis] / mother.momentum_gev[3]) as f32;
        rows.push(Parton {
            momentum_gev: momenta[side],
            birth_fm: [
                mother.birth_fm[0] + step,
                mother.birth_fm[1] + step * direction(0),
                mother.birth_fm[2] + step * direction(1),
                mother.birth_fm[3] + step * direction(2),
            ],
            virtuality_squared_gev2: (daughters[side] * daughters[side]) as f32,
            splitting_fraction: fraction as f32,
            jet_fraction: (f64::from(mother.jet_fraction) * fraction) as f32,
            pdg,
            parent: parent as i32,
            colour,
            anticolour,
            status: Status::Final,
            channel: CHANNEL_VACUUM,
        });
        masses.push(daughters[side]);
    }
}

/// An isotropic decay of `total` into two bodies of the given masses.
pub fn decay(random: &mut Pcg64, total: [f64; 4], masses: [f64; 2]) -> [[f64; 4]; 2] {
    let square = total[3] * total[3] - (0..3).map(|axis| total[axis] * total[axis]).sum::<f64>();
    let mass = square.max(0.0).sqrt();
    let (plus, minus) = (masses[0] + masses[1], masses[0] - masses[1]);
    let momentum = ((square - plus * plus) * (square - minus * minus))
        .max(0.0)
        .sqrt()
        / (2.0 * mass).max(f64::MIN_POSITIVE);
    let cosine = 2.0 * random.random::<f64>() - 1.0;
    let sine = (1.0 - cosine * cosine).sqrt();
    let azimuth = std::f64::consts::TAU * random.random::<f64>();
    let at_rest = [
        momentum * sine * azimuth.cos(),
        momentum * sine * azimuth.sin(),
        momentum * cosine,
        momentum.hypot(masses[0]),
    ];
    let first = boost(at_rest, total, mass);
    [first, std::array::from_fn(|i| total[i] - first[i])]
}

/// Boosts from the rest frame of `frame` (of mass `mass`).
fn boost(momentum: [f64; 4], frame: [f64; 4], mass: f64) -> [f64; 4] {
    let gamma = frame[3] / mass;
    let along: f64 = (0..3).map(|axis| frame[axis] / mass * momentum[axis]).sum();
    let energy = gamma * momentum[3] + along;
    let factor = (momentum[3] + energy) / (1.0 + gamma) / mass;
    [
        momentum[0] + factor * frame[0],
        momentum[1] + factor * frame[1],
        momentum[2] + factor * frame[2],
        energy,
    ]
}

fn only_hard_and_final(rows: &[Parton]) -> Vec<Parton> {
    let hard_ancestor = |row: usize| {
        let mut row = row;
        while rows[row].status != Status::Hard {
            row = rows[row].parent as usize;
        }
        row as i32
    };
    rows.iter()
        .enumerate()
        .filter(|(_, parton)| matches!(parton.status, Status::Hard | Status::Final))
        .map(|(row, parton)| Parton {
            parent: if parton.status == Status::Hard {
                NO_PARENT
            } else {
                hard_ancestor(row)
            },
            ..*parton
        })
        .collect()
}

/// What a run of [`FakeGenerator`] says about itself.
pub fn provenance(events: i64) -> Provenance {
    Provenance {
        program_version: "0.1.0".into(),
        commit: "unknown".into(),
        command_line: "spindrift generate test.json".into(),
        host: "testhost".into(),
        created: "2026-01-01T00:00:00Z".into(),
        config: r#"{ "events": 1 }"#.into(),
        config_digest: "ab".repeat(32),
        seed: 1,
        first_id: 0,
        last_id: events - 1,
        kinematics: Kinematics::Exact,
        open_colour_lines: 0,
        cross_section: None,
        history: History::Final,
        compression: 1,
        momentum_bits: None,
        medium_exit: false,
        effects: vec!["collinear-expansion".into()],
        fields: vec![FieldEntry {
            name: "fireball.h5".into(),
            sha256: "cd".repeat(32),
            weight: 1.0,
        }],
        counters: vec!["trials".into()],
    }
}
