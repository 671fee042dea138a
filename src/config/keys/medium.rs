//! The entries of the table: the medium.

use super::effects::effect;
use super::field::FIELD;
use super::origin::origin;
use super::transport::TRANSPORT;
use super::{Form, Key, Length, Range, Section};

/// Far beyond any collider.
const LARGEST_ENERGY_GEV: f64 = 1e6;

/// More effects than there are models.
const MOST_EFFECTS: usize = 16;

pub static MEDIUM: Section = Section {
    about: "The hot medium: a temperature field, where jets are born in it, its transport coefficient, and the models \
            of what it does to the jet.",
    keys: &[
        Key::required("field", Form::Section(&FIELD), "The temperature field."),
        Key::default(
            "origin",
            Form::Models(origin),
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
            "Induced emissions obey z(1-z) t <= min(z, 1-z)^2 E^2, where the models of induced emission hold \
             (singular-enhancement is published without this limit).",
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
