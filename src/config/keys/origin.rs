//! The entries of the table: where jets are born.

use std::sync::LazyLock;

use super::field::{LONGEST_FM, POSITION};
use super::{Choice, Form, Key, Range, Section, When};
use crate::medium::origin::field_weighted::LARGEST_POWER;
use crate::medium::origin::nucleus::{DIFFUSENESS_FM, NAMED, RADIUS_FM};

/// The nucleus that the config describes itself.
pub const CUSTOM: &str = "custom";

const fn from_to([low, high]: [f64; 2]) -> Form {
    Form::Number(Range::from(low, high))
}

const FIXED: &[When] = &[When {
    key: "kind",
    is: &["fixed"],
}];
const OVERLAP: &[When] = &[When {
    key: "kind",
    is: &["overlap"],
}];
const CUSTOM_NUCLEUS: &[When] = &[
    When {
        key: "kind",
        is: &["overlap"],
    },
    When {
        key: "nucleus",
        is: &[CUSTOM],
    },
];
const FIELD_WEIGHTED: &[When] = &[When {
    key: "kind",
    is: &["field-weighted"],
}];
const LIST: &[When] = &[When {
    key: "kind",
    is: &["list"],
}];

const KINDS: &[Choice] = &[
    Choice::built("fixed", "always at the same place"),
    Choice::built("overlap", "as two smooth nuclei overlap"),
    Choice::built(
        "field-weighted",
        "as a power of the first temperature of the field",
    ),
    Choice::built(
        "collision-density",
        "as the collision density in the field file; of several files each counts by its integral",
    ),
    Choice::built("list", "from a list of weighted places"),
];

/// The section, with the nuclei that have a name: made once, and kept.
pub fn origin() -> &'static Section {
    static ORIGIN: LazyLock<Section> = LazyLock::new(|| Section {
        about: "Where jets are born in the transverse plane.",
        keys: keys().leak(),
    });
    &ORIGIN
}

fn keys() -> Vec<Key> {
    vec![
        Key::required("kind", Form::Choice(KINDS), "Which distribution."),
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
        Key::required(
            "nucleus",
            Form::Choice(nuclei().leak()),
            "Both nuclei, with a Woods-Saxon profile.",
        )
        .when(OVERLAP),
        Key::required(
            "radius_fm",
            from_to(RADIUS_FM),
            "Half-density radius of the nucleus.",
        )
        .unit("fm")
        .when(CUSTOM_NUCLEUS),
        Key::required(
            "diffuseness_fm",
            from_to(DIFFUSENESS_FM),
            "Diffuseness of the nucleus.",
        )
        .unit("fm")
        .when(CUSTOM_NUCLEUS),
        Key::required(
            "impact_parameter_fm",
            Form::Number(Range::from(0.0, LONGEST_FM)),
            "Distance of the centres of the two nuclei, along +x.",
        )
        .unit("fm")
        .when(OVERLAP),
        Key::default(
            "power",
            Form::Number(Range::above(0.0, LARGEST_POWER)),
            "4.0",
            "Power of the temperature that weights places; 4 is an energy density.",
        )
        .when(FIELD_WEIGHTED),
        Key::required(
            "file",
            Form::File,
            "List of places, CSV with the columns x_fm, y_fm, weight.",
        )
        .when(LIST),
    ]
}

fn nuclei() -> Vec<Choice> {
    let named = NAMED.iter().map(|(name, nucleus)| {
        let about = format!(
            "radius {} fm, diffuseness {} fm",
            nucleus.radius_fm, nucleus.diffuseness_fm
        );
        Choice::built(name, about.leak())
    });
    let custom = Choice::built(CUSTOM, "with radius_fm and diffuseness_fm");
    named.chain([custom]).collect()
}
