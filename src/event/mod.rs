//! The event record in memory: what a shower makes and what the event file holds, row by row.

mod checks;

pub use checks::{
    CheckRules, Imbalance, check_colour, check_event, check_exits, check_fractions,
    check_mass_shell, check_momentum, check_structure,
};

/// What a row of the record stands for (the event file's `status` column).
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[repr(i8)]
pub enum Status {
    /// A parton that no longer branches.
    Final = 1,
    /// A parton that branched.
    Branched = 2,
    /// A hard parton as the source supplied it, on shell.
    Hard = 3,
    /// Four-momentum given to the medium.
    GivenToMedium = 4,
    /// Four-momentum taken from the medium.
    TakenFromMedium = 5,
}

impl Status {
    /// The status of a code in the file, `None` for an unknown code.
    pub fn from_code(code: i8) -> Option<Self> {
        Some(match code {
            1 => Status::Final,
            2 => Status::Branched,
            3 => Status::Hard,
            4 => Status::GivenToMedium,
            5 => Status::TakenFromMedium,
            _ => return None,
        })
    }
}

/// Row index for "no parent".
pub const NO_PARENT: i32 = -1;

/// The channel number of partons that the hard process made; 1 is vacuum, 2.. are the effects in config order.
pub const CHANNEL_HARD_PROCESS: u8 = 0;
/// The channel number of vacuum branchings.
pub const CHANNEL_VACUUM: u8 = 1;
/// The channel number of the first effect's branchings.
pub const CHANNEL_FIRST_EFFECT: u8 = 2;

/// One row of the event record: a parton, or (status 4, 5) an exchange with the medium.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Parton {
    /// Four-momentum `[px, py, pz, energy]` in GeV.
    pub momentum_gev: [f64; 4],
    /// Time and place of birth `[t, x, y, z]` in fm.
    pub birth_fm: [f32; 4],
    /// Virtuality squared t in GeV^2 (the mass squared of a final parton).
    pub virtuality_squared_gev2: f32,
    /// Light-cone fraction taken from the immediate parent.
    pub splitting_fraction: f32,
    /// Product of the splitting fractions since the hard parton.
    pub jet_fraction: f32,
    /// Standard Monte Carlo particle number (0 in exchange rows).
    pub pdg: i32,
    /// Row of the parent within the event, [`NO_PARENT`] for none.
    pub parent: i32,
    /// Colour-line tag, 0 for none.
    pub colour: i32,
    /// Anticolour-line tag, 0 for none.
    pub anticolour: i32,
    /// What the row stands for.
    pub status: Status,
    /// What produced it: 0 hard process, 1 vacuum, 2.. the effects in config order.
    pub channel: u8,
}

/// Where a final parton left the medium, and the fluid that it left: the last point of its straight way from birth at
/// which the temperature reaches the end temperature.
#[derive(Clone, Copy, Debug)]
pub struct MediumExit {
    /// Time and place `[t, x, y, z]` in fm.
    pub place_fm: [f32; 4],
    /// Temperature of the fluid at rest in GeV: the end temperature, or higher where the way leaves the field's data.
    pub temperature_gev: f32,
    /// Lab four-velocity components u^x, u^y, u^z of the fluid.
    pub velocity: [f32; 3],
}

impl MediumExit {
    /// Numbers of an exit.
    pub const NUMBERS: usize = 8;

    /// Of a parton that never was in the medium, and of every row that is not a final parton: not a number throughout.
    pub const NONE: MediumExit = MediumExit {
        place_fm: [f32::NAN; 4],
        temperature_gev: f32::NAN,
        velocity: [f32::NAN; 3],
    };

    /// All its numbers, in the order t, x, y, z, temperature, u^x, u^y, u^z.
    pub fn numbers(&self) -> [f32; Self::NUMBERS] {
        let [t, x, y, z] = self.place_fm;
        let [ux, uy, uz] = self.velocity;
        [t, x, y, z, self.temperature_gev, ux, uy, uz]
    }

    /// The exit of such numbers.
    pub fn from_numbers([t, x, y, z, temperature_gev, ux, uy, uz]: [f32; Self::NUMBERS]) -> Self {
        MediumExit {
            place_fm: [t, x, y, z],
            temperature_gev,
            velocity: [ux, uy, uz],
        }
    }

    /// Whether none of its numbers is one.
    pub fn is_none(&self) -> bool {
        self.numbers().iter().all(|number| number.is_nan())
    }
}

/// Equal to the last bit, so that no exit equals no exit.
impl PartialEq for MediumExit {
    fn eq(&self, other: &Self) -> bool {
        self.numbers().map(f32::to_bits) == other.numbers().map(f32::to_bits)
    }
}

/// The event-level columns of one event.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct EventSummary {
    /// Number of the event in the whole sample.
    pub id: i64,
    /// Weight of the hard process.
    pub source_weight: f64,
    /// Nominal weight: the source's times the shower's.
    pub weight: f64,
    /// Start virtuality of the hard process in GeV.
    pub hard_scale_gev: f64,
    /// Time and place of the hard vertex `[t, x, y, z]` in fm.
    pub origin_fm: [f32; 4],
    /// Index of the temperature field in the file's list, -1 without a medium.
    pub field: i32,
    /// Number of rows in the parton record.
    pub partons_count: i32,
}

/// A run of consecutive events: their summaries, and all their rows one event after another.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct EventBlock {
    /// One entry an event, ascending in id.
    pub events: Vec<EventSummary>,
    /// The rows of all events, in the order of `events`.
    pub partons: Vec<Parton>,
    /// Where each row left the medium; empty where that is not recorded.
    pub exits: Vec<MediumExit>,
}

impl EventBlock {
    /// Each event with its rows.
    pub fn iter(&self) -> impl Iterator<Item = (&EventSummary, &[Parton])> {
        self.iter_with_exits().map(|(event, rows, _)| (event, rows))
    }

    /// Each event with its rows and their exits, no exits where they are not recorded.
    pub fn iter_with_exits(
        &self,
    ) -> impl Iterator<Item = (&EventSummary, &[Parton], &[MediumExit])> {
        let mut start = 0;
        self.events.iter().map(move |event| {
            let range = start..start + event.partons_count as usize;
            start = range.end;
            let exits = self.exits.get(range.clone()).unwrap_or_default();
            (event, &self.partons[range], exits)
        })
    }

    /// Empties the block, keeping its memory.
    pub fn clear(&mut self) {
        self.events.clear();
        self.partons.clear();
        self.exits.clear();
    }
}
