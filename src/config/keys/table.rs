//! The entries of the table: everything but the medium.

use super::medium::MEDIUM;
use super::{Choice, Form, Key, Length, Range, Section, When};
use crate::qcd::Z_MASS_GEV;

/// Largest count that every JSON reader holds exactly (2^53).
const LARGEST_COUNT: u64 = 1 << 53;

/// Far beyond any collider.
const LARGEST_ENERGY_GEV: f64 = 1e6;

/// Fractions closer to 0 or 1 than this drown in rounding.
const SMALLEST_EPSILON: f64 = 1e-9;
/// Below this, transverse momenta down to half of it are deep in the non-perturbative region.
const SMALLEST_CUTOFF_GEV: f64 = 0.1;

/// Bits of the mantissa of a double.
const MANTISSA_BITS: u64 = 52;

/// Strongest deflate level.
const STRONGEST_COMPRESSION: u64 = 9;

const GEV_NOT_MEV: &str = "energies are in GeV: write 100.0 for 100 GeV, 5000.0 for 5 TeV";

const ENERGY: Form = Form::Number(Range::above(0.0, LARGEST_ENERGY_GEV));
const COUPLING_VALUE: Form = Form::Number(Range::between(0.0, 1.0));
/// The reference value of the coupling belongs to five flavours, so thresholds lie below the Z mass.
const THRESHOLD: Form = Form::Number(Range::between(0.0, Z_MASS_GEV));

/// The whole config.
pub static CONFIG: Section = Section {
    about: "A run of spindrift: the hard process, the coupling, the shower, the medium, and what the event file keeps. \
            Paths are relative to the folder of the config.",
    keys: &[
        Key::optional(
            "$schema",
            Form::SchemaAddress,
            "Address of the JSON Schema of this config, for editors; not looked at.",
        ),
        Key::required(
            "events",
            Form::Count(1, LARGEST_COUNT),
            "Number of events of the whole sample (all shards together).",
        ),
        Key::default(
            "seed",
            Form::Count(0, u64::MAX),
            "1",
            "Seed of all random streams: the same config and seed give the same events on any number of threads.",
        ),
        Key::required("source", Form::Section(&SOURCE), "The hard process."),
        Key::default("coupling", Form::Section(&COUPLING), "{}", "The strong coupling."),
        Key::default(
            "quark_masses_GeV",
            Form::List(&THRESHOLD, Length::of(2, 2)),
            "[1.5, 4.75]",
            "Masses of charm and bottom, ascending: thresholds of the coupling and opening of pairs.",
        )
        .unit("GeV"),
        Key::default("shower", Form::Section(&SHOWER), "{}", "The shower's choices."),
        Key::default(
            "medium",
            Form::OptionalSection(&MEDIUM),
            "null",
            "The hot medium; null for vacuum. The vacuum twin of a medium sample is the same config with no effects.",
        ),
        Key::default(
            "variations",
            Form::EmptyList,
            "[]",
            "Other parameters for which each event carries a weight; none in this version.",
        ),
        Key::planned("variations_file", "Variations as a CSV file, one column a path of a numeric key."),
        Key::default("record", Form::Section(&RECORD), "{}", "What the event file keeps."),
    ],
};

const SINGLE: &[When] = &[When {
    key: "kind",
    is: &["single"],
}];
const PAIR: &[When] = &[When {
    key: "kind",
    is: &["pair"],
}];
const SINGLE_OR_PAIR: &[When] = &[When {
    key: "kind",
    is: &["single", "pair"],
}];

static SOURCE: Section = Section {
    about: "The hard process.",
    keys: &[
        Key::required(
            "kind",
            Form::Choice(&[
                Choice::built("single", "one parton without a recoiler"),
                Choice::built("pair", "two partons back to back in their rest frame"),
                Choice::planned("annihilation", "electron-positron annihilation to quark pairs at leading order"),
                Choice::planned("spectrum", "a falling transverse-momentum spectrum of quarks and gluons, weighted"),
                Choice::planned("lhef", "hard events from a Les Houches Event File"),
            ]),
            "Which hard process.",
        ),
        Key::required("parton", Form::Parton, "The parton.").when(SINGLE),
        Key::required(
            "partons",
            Form::List(&Form::Parton, Length::of(2, 2)),
            "The two partons, a quark with its antiquark or two gluons; the first flies along the direction.",
        )
        .when(PAIR),
        Key::required("energy_GeV", ENERGY, "Energy of the parton.").unit("GeV").hint(GEV_NOT_MEV).when(SINGLE),
        Key::required("sqrt_s_GeV", ENERGY, "Invariant mass of the pair.").unit("GeV").hint(GEV_NOT_MEV).when(PAIR),
        Key::required(
            "start_virtuality_GeV",
            ENERGY,
            "Largest virtuality (not squared) of a hard parton: at most the energy, in a pair at most sqrt(s).",
        )
        .unit("GeV")
        .when(SINGLE_OR_PAIR),
        Key::default(
            "direction",
            Form::Direction,
            "\"transverse\"",
            "Direction of the (first) parton; the beam is z. \"transverse\": uniform azimuth at rapidity 0; else a \
             vector, whose length has no meaning.",
        )
        .when(SINGLE_OR_PAIR),
    ],
};

const FIXED: &[When] = &[When {
    key: "argument",
    is: &["fixed"],
}];
const RUNNING: &[When] = &[When {
    key: "argument",
    is: &["transverse-momentum", "virtuality"],
}];

static COUPLING: Section = Section {
    about: "The strong coupling.",
    keys: &[
        Key::default(
            "argument",
            Form::Choice(&[
                Choice::built("transverse-momentum", "running, at kappa^2 = z(1-z) t"),
                Choice::built("virtuality", "running, at t"),
                Choice::built("fixed", "the same value everywhere"),
            ]),
            "\"transverse-momentum\"",
            "The squared scale at which the coupling is taken.",
        ),
        Key::default("loops", Form::Count(1, 2), "1", "Order of the running.").when(RUNNING),
        Key::default(
            "alpha_s_mz",
            COUPLING_VALUE,
            "0.118",
            "Value at the Z mass, 91.1876 GeV, with five flavours.",
        )
        .when(RUNNING),
        Key::default(
            "freeze_GeV",
            THRESHOLD,
            "1.0",
            "Scale below which the coupling stays constant; must lie above the Landau pole.",
        )
        .unit("GeV")
        .when(RUNNING),
        Key::required("alpha_s", COUPLING_VALUE, "The value everywhere.").when(FIXED),
    ],
};

static SHOWER: Section = Section {
    about: "The shower's choices.",
    keys: &[
        Key::default(
            "virtuality_cutoff_GeV",
            Form::Number(Range::from(SMALLEST_CUTOFF_GEV, LARGEST_ENERGY_GEV)),
            "1.0",
            "Virtuality (not squared) at which branching ends; below the start virtuality.",
        )
        .unit("GeV"),
        Key::default(
            "ordering",
            Form::Choice(&[
                Choice::built(
                    "virtuality",
                    "daughters start at z t and (1-z) t, with the exact joint constraint",
                ),
                Choice::built(
                    "collinear",
                    "daughters start at t, no constraint: leading-log evolution of fractions, for validation, in vacuum only",
                ),
                Choice::built(
                    "angular",
                    "as virtuality, and a vacuum emission's angle lies below that of the branching that made its parent",
                ),
            ]),
            "\"virtuality\"",
            "Where daughters start and what constrains them.",
        ),
        Key::default(
            "z_range",
            Form::Section(&Z_RANGE),
            "{ \"kind\": \"kinematic\" }",
            "Range of the light-cone momentum fraction z.",
        ),
        Key::default(
            "lifetime",
            Form::Choice(&[
                Choice::built("exponential", "exponential of mean 2E/t"),
                Choice::built("mean", "always the mean"),
            ]),
            "\"exponential\"",
            "How long a virtual parton lives.",
        ),
        Key::default(
            "kernels",
            Form::List(
                &Form::Choice(&[
                    Choice::built("q-qg", "quark to quark and gluon"),
                    Choice::built("g-gg", "gluon to two gluons"),
                    Choice::built("g-qq", "gluon to quark and antiquark"),
                ]),
                Length::of(0, 3),
            ),
            "[\"q-qg\", \"g-gg\", \"g-qq\"]",
            "Which splittings are on, for studies.",
        ),
        Key::default(
            "flavours",
            Form::Count(3, 5),
            "5",
            "How many flavours a gluon may split to: 3 (d, u, s), 4 (and c) or 5 (and b).",
        ),
        Key::default(
            "flavour_opening",
            Form::Choice(&[
                Choice::built("pair-threshold", "c and b when t > 4 m^2"),
                Choice::built(
                    "always",
                    "always, for comparison with references at a fixed number of flavours",
                ),
            ]),
            "\"pair-threshold\"",
            "When a gluon may split to heavy flavours.",
        ),
        Key::default(
            "quark_masses",
            Form::Choice(&[
                Choice::built("massless", "quarks are massless in kernels and kinematics"),
                Choice::planned("massive", "heavy-quark kernels and masses in kinematics"),
            ]),
            "\"massless\"",
            "Whether charm and bottom have their masses in kernels and kinematics.",
        ),
    ],
};

const CONSTANT: &[When] = &[When {
    key: "kind",
    is: &["constant"],
}];

static Z_RANGE: Section = Section {
    about: "Range of the light-cone momentum fraction z.",
    keys: &[
        Key::required(
            "kind",
            Form::Choice(&[
                Choice::built(
                    "kinematic",
                    "z(1-z) t >= cutoff^2/4: the smallest transverse momentum is half the virtuality cutoff",
                ),
                Choice::built("constant", "from epsilon to 1 - epsilon"),
            ]),
            "Which range.",
        ),
        Key::required(
            "epsilon",
            Form::Number(Range::between(SMALLEST_EPSILON, 0.5)),
            "Smallest z and smallest 1 - z.",
        )
        .when(CONSTANT),
    ],
};

static RECORD: Section = Section {
    about: "What the event file keeps.",
    keys: &[
        Key::default(
            "history",
            Form::Choice(&[
                Choice::built(
                    "final",
                    "hard and final partons (and exchanges with the medium)",
                ),
                Choice::built("full", "every parton, parents before daughters"),
            ]),
            "\"final\"",
            "Which rows of an event are kept.",
        ),
        Key::default(
            "compression",
            Form::Count(0, STRONGEST_COMPRESSION),
            "1",
            "Deflate level, 0 (none) to 9, of the bytes that compress.",
        ),
        Key::optional(
            "momentum_bits",
            Form::Count(1, MANTISSA_BITS),
            "Mantissa bits kept in momenta, stated in the file; absent: lossless.",
        ),
        Key::default(
            "medium_exit",
            Form::Flag,
            "false",
            "Where each final parton left the medium, with temperature and flow there, as further columns.",
        ),
        Key::planned(
            "variation_weights",
            "Precision of the weights of variations, f64 or f32.",
        ),
    ],
};
