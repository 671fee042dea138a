//! The entries of the table: the transport coefficient.

use super::{Choice, Form, Key, Range, Section, When};

/// Far beyond any transport coefficient, as a multiple of T^3 and in GeV^2/fm.
const LARGEST_TRANSPORT: f64 = 1000.0;
const TRANSPORT_NUMBER: Form = Form::Number(Range::from(0.0, LARGEST_TRANSPORT));

/// Flavours that may be light beside the temperature.
const MOST_FLAVOURS: u64 = 6;

const CUBIC: &[When] = &[When {
    key: "kind",
    is: &["cubic"],
}];
const CONSTANT: &[When] = &[When {
    key: "kind",
    is: &["constant"],
}];
const THERMAL: &[When] = &[When {
    key: "kind",
    is: &["thermal"],
}];
const TABLE: &[When] = &[When {
    key: "kind",
    is: &["table"],
}];
/// Kinds whose number belongs to a quark or a gluon; `thermal` computes both.
const STATED: &[When] = &[When {
    key: "kind",
    is: &["cubic", "constant", "table"],
}];

pub static TRANSPORT: Section = Section {
    about: "The transport coefficient qhat.",
    keys: &[
        Key::required(
            "kind",
            Form::Choice(&[
                Choice::built("cubic", "qhat = coefficient * T^3"),
                Choice::built("constant", "the same qhat wherever there is a medium"),
                Choice::built(
                    "thermal",
                    "perturbative hot plasma, alpha_s^2 T^3 ln(2 E T / m_D^2)",
                ),
                Choice::built("table", "numbers over temperature, and perhaps energy"),
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
            "alpha_s",
            Form::Number(Range::between(0.0, 1.0)),
            "Coupling in the plasma; it does not run.",
        )
        .when(THERMAL),
        Key::default(
            "flavours",
            Form::Count(0, MOST_FLAVOURS),
            "3",
            "Number of massless flavours in the plasma.",
        )
        .when(THERMAL),
        Key::required(
            "file",
            Form::File,
            "The table: CSV with the columns temperature_GeV, qhat_GeV2_per_fm and perhaps energy_GeV, or HDF5 with qhat \
             over temperature and perhaps energy.",
        )
        .when(TABLE),
        Key::required(
            "for",
            Form::Choice(&[
                Choice::built("quark", "the number is a quark's qhat"),
                Choice::built("gluon", "the number is a gluon's qhat, 9/4 of a quark's"),
            ]),
            "Whose qhat the number is (published coefficients near 4 for cubic are usually a quark's).",
        )
        .when(STATED),
        Key::default(
            "flow",
            Form::Flag,
            "true",
            "Multiply qhat per lab length by p.u/E where the field has flow.",
        ),
    ],
};
