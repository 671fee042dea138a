//! The entries of the table: the temperature field.

use std::f64::consts::TAU;

use super::{Choice, Form, Key, Length, Range, Section, When};
use crate::files::event_file::MOST_FIELDS;

/// Hotter than any collision makes; beyond it a temperature is most likely not in GeV.
pub const HOTTEST_GEV: f64 = 5.0;

/// Far beyond the size and lifetime of any medium.
pub const LONGEST_FM: f64 = 1000.0;

/// Far beyond what keeps a radial field below [`HOTTEST_GEV`].
const LARGEST_AMPLITUDE: f64 = 1e4;

/// An inverse size: from far larger than any medium to far smaller than a nucleon.
const INVERSE_SIZE: Form = Form::Number(Range::from(1e-3, 10.0));

/// Largest count that every JSON reader holds exactly (2^53).
const LARGEST_COUNT: u64 = 1 << 53;

const GEV_NOT_MEV: &str = "temperatures are in GeV: write 0.3 for 300 MeV";
const RADIANS: &str = "angles are in radians: write 1.5707963 for 90 degrees";

const TEMPERATURE: Form = Form::Number(Range::above(0.0, HOTTEST_GEV));
const TIME: Form = Form::Number(Range::above(0.0, LONGEST_FM));
pub const POSITION: Form = Form::Number(Range::from(-LONGEST_FM, LONGEST_FM));

const BRICK: &[When] = &[When {
    key: "kind",
    is: &["brick"],
}];
const BRICK_OR_LONGITUDINAL: &[When] = &[When {
    key: "kind",
    is: &["brick", "longitudinal"],
}];
const LONGITUDINAL_OR_RADIAL: &[When] = &[When {
    key: "kind",
    is: &["longitudinal", "radial"],
}];
const RADIAL: &[When] = &[When {
    key: "kind",
    is: &["radial"],
}];
const GRID: &[When] = &[When {
    key: "kind",
    is: &["grid"],
}];
/// Kinds that have a first proper time.
const EXPANDING: &[When] = &[When {
    key: "kind",
    is: &["longitudinal", "radial", "grid"],
}];

pub static FIELD: Section = Section {
    about: "The temperature field.",
    keys: &[
        Key::required(
            "kind",
            Form::Choice(&[
                Choice::built("brick", "uniform everywhere, from lab time 0 to the length"),
                Choice::built(
                    "longitudinal",
                    "boost-invariant longitudinal expansion, T ~ tau^(-1/3)",
                ),
                Choice::built(
                    "radial",
                    "the exact conformal solution with longitudinal and radial expansion",
                ),
                Choice::built(
                    "grid",
                    "one or several temperature field files (HDF5 or netCDF-4)",
                ),
            ]),
            "Which field.",
        ),
        Key::required(
            "temperature_GeV",
            TEMPERATURE,
            "Temperature; of a longitudinal expansion, at its start.",
        )
        .unit("GeV")
        .hint(GEV_NOT_MEV)
        .when(BRICK_OR_LONGITUDINAL),
        Key::required(
            "length_fm",
            TIME,
            "Path length of a parton born at lab time 0.",
        )
        .unit("fm")
        .when(BRICK),
        Key::required(
            "amplitude",
            Form::Number(Range::above(0.0, LARGEST_AMPLITUDE)),
            "A in T = hbar c A (2q)^(2/3) tau^(-1/3) [1 + 2 q^2 (tau^2 + r^2) + q^4 (tau^2 - r^2)^2]^(-1/3).",
        )
        .when(RADIAL),
        Key::required(
            "q_per_fm",
            INVERSE_SIZE,
            "q in the same formula, the inverse transverse size.",
        )
        .unit("1/fm")
        .when(RADIAL),
        Key::required("start_fm", TIME, "Proper time at which the medium starts.")
            .unit("fm")
            .when(LONGITUDINAL_OR_RADIAL),
        Key::either("file", Form::File, "files", "The field file.").when(GRID),
        Key::either(
            "files",
            Form::Files(MOST_FIELDS),
            "file",
            "Several field files, which events use in turn: a list in the order of use, or a pattern like \
             \"fields/*.h5\", sorted by name. Two of them are in memory at a time.",
        )
        .when(GRID),
        Key::required(
            "events_per_field",
            Form::Count(1, LARGEST_COUNT),
            "How many events in a row use the same field: event i has field floor(i / events_per_field) modulo their \
             number.",
        )
        .when(GRID)
        .with("files"),
        Key::default(
            "end_temperature_GeV",
            Form::Number(Range::from(0.0, HOTTEST_GEV)),
            "0.15",
            "Temperature below which the medium has no effect.",
        )
        .unit("GeV")
        .hint(GEV_NOT_MEV),
        Key::default(
            "pre_equilibrium",
            Form::Choice(&[
                Choice::built(
                    "none",
                    "no medium before the first proper time of the field",
                ),
                Choice::built(
                    "hold",
                    "the first temperature and flow hold before the first proper time",
                ),
            ]),
            "\"none\"",
            "The medium before the first proper time of the field.",
        )
        .when(EXPANDING),
        Key::default(
            "rotation_rad",
            Form::Number(Range::from(-TAU, TAU)),
            "0.0",
            "The field is turned by this angle about the beam, from x to y, before it is shifted.",
        )
        .unit("rad")
        .hint(RADIANS),
        Key::default(
            "shift_fm",
            Form::List(&POSITION, Length::of(2, 2)),
            "[0.0, 0.0]",
            "The turned field is shifted by this, [x, y].",
        )
        .unit("fm"),
    ],
};
