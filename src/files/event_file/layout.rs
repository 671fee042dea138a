//! What stands where in an event file: tables, columns, types, units, chunk lengths.

use crate::event::MediumExit;

/// The `format` attribute of an event file.
pub const FORMAT_NAME: &str = "spindrift events";
/// The `format_version` attribute that this program writes and reads.
pub const FORMAT_VERSION: i32 = 1;

/// Rows in a chunk of every event column.
pub const EVENT_CHUNK_ROWS: usize = 2048;
/// Rows in a chunk of every parton column.
pub const PARTON_CHUNK_ROWS: usize = 32_768;

/// Most temperature fields of a file.
pub const MOST_FIELDS: usize = 4096;

/// Bits of a double's mantissa, the value of the `momentum_bits` attribute of a lossless file.
pub(super) const FULL_MANTISSA_BITS: u8 = 52;

/// One of the two growing tables.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Table {
    /// `/events`, one row an event.
    Events,
    /// `/partons`, one row a parton or an exchange.
    Partons,
}

impl Table {
    /// The group that holds the columns.
    pub const fn group(self) -> &'static str {
        match self {
            Table::Events => "events",
            Table::Partons => "partons",
        }
    }

    /// The dimension scale that names the row axis.
    pub const fn scale(self) -> &'static str {
        match self {
            Table::Events => "event",
            Table::Partons => "parton",
        }
    }

    /// What an index along the row axis means.
    pub(super) const fn scale_description(self) -> &'static str {
        match self {
            Table::Events => "row of an event in the events table",
            Table::Partons => "row of a parton in the partons table",
        }
    }

    /// Rows in a chunk.
    pub const fn chunk_rows(self) -> usize {
        match self {
            Table::Events => EVENT_CHUNK_ROWS,
            Table::Partons => PARTON_CHUNK_ROWS,
        }
    }
}

/// Which columns a file has: a property of the file.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct ColumnSet {
    /// `/partons` has [`EXIT_COLUMNS`] too.
    pub medium_exit: bool,
}

impl ColumnSet {
    /// The columns of a table, in the order in which packed groups hold their chunks.
    pub const fn columns(self, table: Table) -> &'static [Column] {
        match table {
            Table::Events => &EVENT_COLUMNS,
            Table::Partons if self.medium_exit => &PARTON_COLUMNS_WITH_EXITS,
            Table::Partons => &PARTON_COLUMNS,
        }
    }
}

/// Type of a column's elements; little-endian in the file.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Element {
    /// Signed byte.
    I8,
    /// Unsigned byte.
    U8,
    /// 32-bit integer.
    I32,
    /// 64-bit integer.
    I64,
    /// Single precision.
    F32,
    /// Double precision.
    F64,
}

impl Element {
    /// Bytes an element.
    pub const fn bytes(self) -> usize {
        match self {
            Element::I8 | Element::U8 => 1,
            Element::I32 | Element::F32 => size_of::<u32>(),
            Element::I64 | Element::F64 => size_of::<u64>(),
        }
    }
}

/// One dataset of a table.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Column {
    /// Name within the table's group.
    pub name: &'static str,
    /// Element type.
    pub element: Element,
    /// Elements a row; more than one makes the dataset two-dimensional.
    pub width: usize,
    /// The `units` attribute.
    pub units: &'static str,
    /// The `description` attribute.
    pub description: &'static str,
}

impl Column {
    /// Bytes of one whole chunk before compression.
    pub const fn chunk_bytes(&self, table: Table) -> usize {
        table.chunk_rows() * self.width * self.element.bytes()
    }
}

const fn column(
    name: &'static str,
    element: Element,
    units: &'static str,
    description: &'static str,
) -> Column {
    Column {
        name,
        element,
        width: 1,
        units,
        description,
    }
}

/// Components of a place: t, x, y, z.
pub(super) const PLACE_COMPONENTS: usize = 4;
/// The dimension scale that names the component axis of `/events/origin`.
pub(super) const PLACE_SCALE: &str = "component";

/// Columns of `/events`.
pub const EVENT_COLUMNS: [Column; 8] = [
    column(
        "id",
        Element::I64,
        "1",
        "number of the event in the whole sample, the same in any sharding",
    ),
    column(
        "source_weight",
        Element::F64,
        "1",
        "weight of the hard process",
    ),
    column(
        "weight",
        Element::F64,
        "1",
        "nominal weight: the hard process's times the shower's",
    ),
    column(
        "partons_start",
        Element::I64,
        "1",
        "first row of the event in the partons table",
    ),
    column(
        "partons_count",
        Element::I32,
        "1",
        "number of rows of the event in the partons table",
    ),
    column(
        "hard_scale",
        Element::F64,
        "GeV",
        "start virtuality of the hard process",
    ),
    Column {
        name: "origin",
        element: Element::F32,
        width: PLACE_COMPONENTS,
        units: "fm",
        description: "time and place of the hard vertex: t, x, y, z",
    },
    column(
        "field",
        Element::I32,
        "1",
        "row of the temperature field in the fields table, -1 without a medium",
    ),
];

/// Columns of `/partons` that every file has.
pub const PARTON_COLUMNS: [Column; 17] = [
    column(
        "pdg",
        Element::I32,
        "1",
        "standard Monte Carlo particle number, 0 in exchange rows",
    ),
    column(
        "status",
        Element::I8,
        "1",
        "1 final, 2 branched, 3 hard parton as supplied, 4 given to the medium, 5 taken from the medium",
    ),
    column(
        "parent",
        Element::I32,
        "1",
        "row of the parent within the event, -1 for none",
    ),
    column(
        "colour",
        Element::I32,
        "1",
        "colour-line tag, 0 for none (leading colour)",
    ),
    column(
        "anticolour",
        Element::I32,
        "1",
        "anticolour-line tag, 0 for none (leading colour)",
    ),
    column("px", Element::F64, "GeV", "momentum along x"),
    column("py", Element::F64, "GeV", "momentum along y"),
    column("pz", Element::F64, "GeV", "momentum along z, the beam axis"),
    column("energy", Element::F64, "GeV", "energy"),
    column(
        "virtuality_squared",
        Element::F32,
        "GeV^2",
        "virtuality squared, the mass squared of a final parton; may be negative in exchange rows",
    ),
    column(
        "splitting_fraction",
        Element::F32,
        "1",
        "light-cone fraction taken from the immediate (perhaps unrecorded) parent",
    ),
    column(
        "jet_fraction",
        Element::F32,
        "1",
        "product of the splitting fractions since the hard parton",
    ),
    column("birth_t", Element::F32, "fm", "time of birth"),
    column("birth_x", Element::F32, "fm", "place of birth, x"),
    column("birth_y", Element::F32, "fm", "place of birth, y"),
    column("birth_z", Element::F32, "fm", "place of birth, z"),
    column(
        "channel",
        Element::U8,
        "1",
        "what produced it: 0 hard process, 1 vacuum branching, 2.. the effects in config order",
    ),
];

/// Columns of `/partons` where the run recorded the exits of final partons, after [`PARTON_COLUMNS`].
pub const EXIT_COLUMNS: [Column; MediumExit::NUMBERS] = [
    column(
        "exit_t",
        Element::F32,
        "fm",
        "time at which a final parton left the medium; not a number where it never was in it",
    ),
    column("exit_x", Element::F32, "fm", "place of the exit, x"),
    column("exit_y", Element::F32, "fm", "place of the exit, y"),
    column("exit_z", Element::F32, "fm", "place of the exit, z"),
    column(
        "exit_temperature",
        Element::F32,
        "GeV",
        "temperature of the fluid at the exit; above the end temperature where the path leaves the field's data",
    ),
    column(
        "exit_ux",
        Element::F32,
        "1",
        "four-velocity of the fluid at the exit in the lab, u^x",
    ),
    column(
        "exit_uy",
        Element::F32,
        "1",
        "four-velocity of the fluid at the exit in the lab, u^y",
    ),
    column(
        "exit_uz",
        Element::F32,
        "1",
        "four-velocity of the fluid at the exit in the lab, u^z",
    ),
];

/// All columns that `/partons` may have.
const PARTON_COLUMNS_WITH_EXITS: [Column; PARTON_COLUMNS.len() + EXIT_COLUMNS.len()] = {
    let mut all = [PARTON_COLUMNS[0]; PARTON_COLUMNS.len() + EXIT_COLUMNS.len()];
    let mut place = 0;
    while place < all.len() {
        all[place] = if place < PARTON_COLUMNS.len() {
            PARTON_COLUMNS[place]
        } else {
            EXIT_COLUMNS[place - PARTON_COLUMNS.len()]
        };
        place += 1;
    }
    all
};

/// Place of an exit's number among [`MediumExit::numbers`], `None` for another column.
pub(super) fn exit_number(column: &str) -> Option<usize> {
    EXIT_COLUMNS.iter().position(|exit| exit.name == column)
}
