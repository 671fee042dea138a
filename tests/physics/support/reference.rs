//! The reference tables of validation/references: their cases as set-ups, their distributions as functions.

use std::path::Path;

use serde_json::Value;

use spindrift::medium::effects::collinear_expansion::PhaseSettings;
use spindrift::medium::effects::{EffectSettings, model};
use spindrift::parameters::{Form, Setting};
use spindrift::qcd::{CouplingSettings, Loops, ScaleArgument, Species};
use spindrift::shower::{FlavourOpening, ZRange};

use super::effects;
use super::setup::{self, Setup};

/// A table by its name.
pub fn load(name: &str) -> Value {
    let path = Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("validation/references")
        .join(format!("{name}.json"));
    let text = std::fs::read_to_string(&path)
        .unwrap_or_else(|error| panic!("{}: {error}", path.display()));
    serde_json::from_str(&text).expect("a reference table is JSON")
}

/// The cases of a table.
pub fn cases(name: &str) -> Vec<Value> {
    load(name)["cases"]
        .as_array()
        .expect("cases are a list")
        .clone()
}

pub fn number(value: &Value, key: &str) -> f64 {
    value[key]
        .as_f64()
        .unwrap_or_else(|| panic!("no number {key} in {value}"))
}

pub fn numbers(value: &Value) -> Vec<f64> {
    let list = value.as_array().expect("a list of numbers");
    list.iter().map(|v| v.as_f64().expect("a number")).collect()
}

/// The set-up of a case, with its medium if it has one.
pub fn setup(case: &Value) -> Setup {
    let is_gluon = case["parton"] == "gluon";
    let parton = if is_gluon {
        Species::GLUON
    } else {
        setup::up()
    };
    let start = number(case, "start_virtuality_GeV");
    let medium = &case["medium"];
    let energy = if medium.is_null() {
        start
    } else {
        number(medium, "energy_GeV")
    };
    let mut setup = Setup::single(parton, energy, start).with_coupling(coupling(&case["coupling"]));
    setup.shower.virtuality_cutoff_gev = number(case, "virtuality_cutoff_GeV");
    setup.shower.z_range = match case["z_range"]["kind"].as_str() {
        Some("kinematic") => ZRange::Kinematic,
        Some("constant") => ZRange::Constant {
            epsilon: number(&case["z_range"], "epsilon"),
        },
        other => panic!("unknown z range {other:?}"),
    };
    if is_gluon {
        setup.shower.flavours = number(case, "flavours") as u8;
        setup.shower.flavour_opening = match case["flavour_opening"].as_str() {
            Some("always") => FlavourOpening::Always,
            Some("pair-threshold") => FlavourOpening::PairThreshold,
            other => panic!("unknown opening {other:?}"),
        };
    }
    if medium.is_null() {
        return setup;
    }
    let length = number(medium, "length_fm");
    let qhat = number(medium, "gluon_qhat_GeV2_per_fm");
    let chosen = match medium["effects"].as_array() {
        None => vec![phase(&medium["effect"]).into()],
        Some(list) => list.iter().map(|words| effect(words, length)).collect(),
    };
    let mut brick = setup::brick_with(length, qhat, chosen);
    brick.limit_to_small_angles = medium["limit_to_small_angles"] == true;
    setup.with_medium(brick)
}

/// The phase factor of an effect.
pub fn phase(effect: &Value) -> PhaseSettings {
    match effect["phase"].as_str() {
        Some("interference") => PhaseSettings::Interference,
        Some("soft-gradient") => PhaseSettings::SoftGradient,
        Some("rescattering") => PhaseSettings::Rescattering {
            window: number(effect, "window"),
        },
        other => panic!("unknown phase {other:?}"),
    }
}

/// The kinds of a case's effects.
pub fn effect_kinds(case: &Value) -> Vec<&str> {
    let list = case["medium"]["effects"].as_array();
    let kind = |effect| string(effect, "kind");
    list.expect("a list of effects").iter().map(kind).collect()
}

fn string<'a>(value: &'a Value, key: &str) -> &'a str {
    value[key]
        .as_str()
        .unwrap_or_else(|| panic!("no word {key} in {value}"))
}

/// An effect of the registry from the words of a table, in a brick of a length.
fn effect(words: &Value, length_fm: f64) -> EffectSettings {
    let kind = string(words, "kind");
    let keys = model(kind).unwrap_or_else(|| panic!("no {kind}")).keys;
    let mut given = Vec::new();
    for (name, value) in words.as_object().expect("an object") {
        if name == "kind" {
            continue;
        }
        let name = parameter(kind, name);
        let key = keys.iter().find(|key| key.name == name);
        let key = key.unwrap_or_else(|| panic!("{kind} has no {name}"));
        let setting = match (value, key.form) {
            (Value::Bool(flag), _) => Setting::Flag(*flag),
            (Value::String(word), Form::Choice(choices)) => {
                let choice = choices.iter().find(|choice| choice.name == word);
                Setting::Word(choice.expect("a word of the key").name)
            }
            _ => Setting::Number(value.as_f64().expect("a number")),
        };
        let setting = match (setting, name) {
            // The table states the opacity of the whole brick.
            (Setting::Number(opacity), "opacity_per_fm") => Setting::Number(opacity / length_fm),
            (setting, _) => setting,
        };
        given.push((key.name, setting));
        // The table states the number alone, a config also the law that it belongs to.
        for condition in key.when {
            given.push((condition.key, Setting::Word(condition.is[0])));
        }
    }
    effects::effect(kind, &given)
}

/// The name of a config for a number of a table.
fn parameter<'a>(kind: &str, name: &'a str) -> &'a str {
    match (kind, name) {
        ("singular-enhancement", "enhancement") => "factor",
        ("single-hard", "gluon_opacity") => "opacity_per_fm",
        ("single-hard", "mu_GeV") => "debye_mass_GeV",
        _ => name,
    }
}

fn coupling(words: &Value) -> CouplingSettings {
    let argument = match words["argument"].as_str() {
        Some("fixed") => return setup::fixed(number(words, "alpha_s")),
        Some("virtuality") => ScaleArgument::Virtuality,
        Some("transverse-momentum") => ScaleArgument::TransverseMomentum,
        other => panic!("unknown argument {other:?}"),
    };
    let loops = if words["loops"] == 2 {
        Loops::Two
    } else {
        Loops::One
    };
    assert_eq!(number(words, "alpha_s_mz"), setup::ALPHA_S_MZ);
    assert_eq!(number(words, "freeze_GeV"), 1.0);
    setup::running(argument, loops)
}

/// A few words that tell a case from the others.
pub fn name(case: &Value) -> String {
    let mut words = format!(
        "{} {} -> {}, {}",
        case["parton"].as_str().unwrap_or("?"),
        case["start_virtuality_GeV"],
        case["virtuality_cutoff_GeV"],
        case["coupling"]["argument"].as_str().unwrap_or("?"),
    );
    for value in [
        &case["coupling"]["loops"],
        &case["z_range"]["epsilon"],
        &case["flavour_opening"],
        &case["medium"]["effect"]["phase"],
        &case["medium"]["effect"]["window"],
        &case["medium"]["length_fm"],
    ] {
        if !value.is_null() {
            words += &format!(" {value}");
        }
    }
    for effect in case["medium"]["effects"].as_array().into_iter().flatten() {
        for value in effect.as_object().expect("an object").values() {
            words += &format!(" {value}");
        }
    }
    words
}

/// A tabulated cumulative distribution, linear between its points.
pub struct Cumulative {
    x: Vec<f64>,
    below: Vec<f64>,
}

impl Cumulative {
    /// From two lists of a case, divided by `norm`.
    pub fn new(x: &Value, below: &Value, norm: f64) -> Cumulative {
        Cumulative {
            x: numbers(x),
            below: numbers(below).iter().map(|value| value / norm).collect(),
        }
    }

    pub fn at(&self, x: f64) -> f64 {
        let right = self.x.partition_point(|point| *point <= x);
        if right == 0 {
            return self.below[0];
        }
        if right == self.x.len() {
            return self.below[right - 1];
        }
        let left = right - 1;
        let share = (x - self.x[left]) / (self.x[right] - self.x[left]);
        self.below[left] + share * (self.below[right] - self.below[left])
    }

    /// Inner points of the table, about `count` of them.
    pub fn some_points(&self, count: usize) -> Vec<f64> {
        let step = (self.x.len() / (count + 1)).max(1);
        self.x[step..self.x.len() - 1]
            .iter()
            .step_by(step)
            .copied()
            .collect()
    }
}

/// ln(z/(1-z)), the variable of the tables in z.
pub fn logit(z: f64) -> f64 {
    (z / (1.0 - z)).ln()
}
