//! The entries of the table: the medium.

use std::sync::LazyLock;

use super::{Choice, Form, Key, Length, Range, Section, When};
use crate::medium::effects::{MODELS, Model};

/// Hotter than any collision makes; beyond it a temperature is most likely not in GeV.
const HOTTEST_GEV: f64 = 5.0;

/// Far beyond the size and lifetime of any medium.
const LONGEST_FM: f64 = 1000.0;

/// Far beyond any transport coefficient, as a multiple of T^3 and in GeV^2/fm.
const LARGEST_TRANSPORT: f64 = 1000.0;

const LARGEST_ENERGY_GEV: f64 = 1e6;

/// Effects that a later version will know.
const PLANNED_EFFECTS: &[Choice] = &[
    Choice::planned("multiple-soft", "induced emission by many soft scatterings"),
    Choice::planned(
        "single-hard",
        "induced emission by a single hard scattering",
    ),
];

/// More effects than there are models.
const MOST_EFFECTS: usize = 16;

const GEV_NOT_MEV: &str = "temperatures are in GeV: write 0.3 for 300 MeV";

const TEMPERATURE: Form = Form::Number(Range::above(0.0, HOTTEST_GEV));
const TIME: Form = Form::Number(Range::above(0.0, LONGEST_FM));
const POSITION: Form = Form::Number(Range::from(-LONGEST_FM, LONGEST_FM));
const TRANSPORT_NUMBER: Form = Form::Number(Range::from(0.0, LARGEST_TRANSPORT));

pub static MEDIUM: Section = Section {
    about: "The hot medium: a temperature field, where jets are born in it, its transport coefficient, and the models \
            of what it does to the jet.",
    keys: &[
        Key::required("field", Form::Section(&FIELD), "The temperature field."),
        Key::default(
            "origin",
            Form::Section(&ORIGIN),
            "{ \"kind\": \"fixed\" }",
            "Where jets are born in the transverse plane.",
        ),
        Key::required(
            "transport",
            Form::Section(&TRANSPORT),
            "The transport coefficient qhat.",
        ),
        Key::required(
            "effects",
            Form::List(&Form::Models(effect), Length::of(0, MOST_EFFECTS)),
            "What the medium does, composed; an empty list is vacuum to the last bit.",
        ),
        Key::default(
            "limit_to_small_angles",
            Form::Flag,
            "true",
            "Induced emissions obey z(1-z) t <= min(z, 1-z)^2 E^2, where the models hold.",
        ),
        Key::default(
            "min_energy_GeV",
            Form::Number(Range::from(0.0, LARGEST_ENERGY_GEV)),
            "2.0",
            "A parton below this lab energy sees no medium.",
        )
        .unit("GeV"),
    ],
};

const BRICK: &[When] = &[When {
    key: "kind",
    is: &["brick"],
}];
const BRICK_OR_LONGITUDINAL: &[When] = &[When {
    key: "kind",
    is: &["brick", "longitudinal"],
}];
const LONGITUDINAL: &[When] = &[When {
    key: "kind",
    is: &["longitudinal"],
}];
const GRID: &[When] = &[When {
    key: "kind",
    is: &["grid"],
}];

static FIELD: Section = Section {
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
                Choice::built("grid", "a temperature field file (HDF5 or netCDF-4)"),
                Choice::planned(
                    "radial",
                    "the exact conformal solution with radial expansion",
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
        Key::required("start_fm", TIME, "Proper time at which the medium starts.")
            .unit("fm")
            .when(LONGITUDINAL),
        Key::required("file", Form::File, "The field file.").when(GRID),
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
                Choice::planned(
                    "hold",
                    "the first temperature holds before the first proper time",
                ),
            ]),
            "\"none\"",
            "The medium before the first proper time of the field.",
        ),
        Key::planned("amplitude", "Amplitude of the radial field."),
        Key::planned("q_per_fm", "Inverse size of the radial field."),
        Key::planned("files", "Several field files, a list or a pattern."),
        Key::planned(
            "events_per_field",
            "How many events in a row belong to one of several fields.",
        ),
        Key::planned("rotation_rad", "Rotation of the field about the beam."),
        Key::planned("shift_fm", "Shift of the field in the transverse plane."),
    ],
};

const FIXED: &[When] = &[When {
    key: "kind",
    is: &["fixed"],
}];

static ORIGIN: Section = Section {
    about: "Where jets are born in the transverse plane.",
    keys: &[
        Key::required(
            "kind",
            Form::Choice(&[
                Choice::built("fixed", "always at the same place"),
                Choice::planned("overlap", "as two smooth nuclei overlap"),
                Choice::planned(
                    "field-weighted",
                    "as a power of the first slice of the field",
                ),
                Choice::planned(
                    "collision-density",
                    "as the collision density in the field file",
                ),
                Choice::planned("list", "from a list of weighted places"),
            ]),
            "Which distribution.",
        ),
        Key::default(
            "x_fm",
            POSITION,
            "0.0",
            "Place along x, the direction of the impact parameter.",
        )
        .unit("fm")
        .when(FIXED),
        Key::default("y_fm", POSITION, "0.0", "Place along y.")
            .unit("fm")
            .when(FIXED),
        Key::planned("nucleus", "Which nucleus overlaps with its like."),
        Key::planned("impact_parameter_fm", "Impact parameter of the two nuclei."),
        Key::planned("power", "Power of the temperature that weights places."),
        Key::planned(
            "file",
            "List of places, CSV with the columns x_fm, y_fm, weight.",
        ),
    ],
};

const CUBIC: &[When] = &[When {
    key: "kind",
    is: &["cubic"],
}];
const CONSTANT: &[When] = &[When {
    key: "kind",
    is: &["constant"],
}];

static TRANSPORT: Section = Section {
    about: "The transport coefficient qhat.",
    keys: &[
        Key::required(
            "kind",
            Form::Choice(&[
                Choice::built("cubic", "qhat = coefficient * T^3"),
                Choice::built("constant", "the same qhat wherever there is a medium"),
                Choice::planned("thermal", "perturbative hot QCD"),
                Choice::planned("table", "a table over temperature and energy"),
            ]),
            "Which model.",
        ),
        Key::required(
            "coefficient",
            TRANSPORT_NUMBER,
            "qhat over T^3, in natural units.",
        )
        .when(CUBIC),
        Key::required("qhat_GeV2_per_fm", TRANSPORT_NUMBER, "qhat at rest.")
            .unit("GeV^2/fm")
            .when(CONSTANT),
        Key::required(
            "for",
            Form::Choice(&[
                Choice::built("quark", "the number is a quark's qhat"),
                Choice::built("gluon", "the number is a gluon's qhat, 9/4 of a quark's"),
            ]),
            "Whose qhat the number is (published coefficients near 4 for cubic are usually a quark's).",
        ),
        Key::default(
            "flow",
            Form::Flag,
            "true",
            "Multiply qhat per lab length by p.u/E where the field has flow.",
        ),
        Key::planned(
            "flavours",
            "Number of light flavours of the thermal medium.",
        ),
        Key::planned("alpha_s", "Coupling of the thermal medium."),
        Key::planned("file", "Table of qhat."),
    ],
};

/// The section of an effect, put together from what each model of the registry says of itself: made once, and kept.
fn effect() -> &'static Section {
    static EFFECT: LazyLock<Section> = LazyLock::new(|| Section {
        about: "One model of what the medium does.",
        keys: effect_keys(MODELS).leak(),
    });
    &EFFECT
}

fn effect_keys(models: &[&'static Model]) -> Vec<Key> {
    let choices = models
        .iter()
        .map(|model| Choice::built(model.kind, model.about))
        .chain(PLANNED_EFFECTS.iter().copied());
    let choices: Vec<Choice> = choices.collect();
    let kind = Form::Choice(choices.leak());
    let mut keys = vec![Key::required("kind", kind, "Which model.")];
    for model in models {
        keys.extend(model.keys.iter().map(|key| of_model(model, key)));
    }
    keys
}

/// A parameter of a model is used with that model's kind alone.
fn of_model(model: &'static Model, key: &Key) -> Key {
    let kind = When {
        key: "kind",
        is: vec![model.kind].leak(),
    };
    let when: Vec<When> = std::iter::once(kind)
        .chain(key.when.iter().copied())
        .collect();
    key.when(when.leak())
}
