//! What valid configs resolve to: defaults, digests, choices, the schema, and the examples in `configs/`.

use std::fs;
use std::path::{Path, PathBuf};

use proptest::prelude::*;
use serde_json::{Value, json};
use spindrift::config::{History, Overrides, RunPlan, load_text, schema};
use spindrift::medium::effects::collinear_expansion::PhaseSettings;
use spindrift::medium::{ColourCharge, FieldKind, TransportKind};
use spindrift::qcd::{CouplingLaw, Loops, ScaleArgument, Species};
use spindrift::shower::{FlavourOpening, Kernels, Lifetime, Ordering, ZRange};
use spindrift::source::{Direction, SourceSettings};

const LEAST: &str = r#"{ "events": 2e4, "source":
    { "kind": "single", "parton": "g", "energy_GeV": 100, "start_virtuality_GeV": 100 } }"#;

fn plan(text: &str) -> RunPlan {
    load_text(text, Path::new("run.json"), &Overrides::default())
        .unwrap_or_else(|errors| panic!("{text}\n{errors}"))
}

fn least_with(key: &str, value: Value) -> Value {
    let mut config: Value = serde_json::from_str(LEAST).unwrap();
    config[key] = value;
    config
}

fn least_with_medium(medium: Value) -> Value {
    let mut whole = json!({
        "field": { "kind": "brick", "temperature_GeV": 0.3, "length_fm": 4 },
        "transport": { "kind": "cubic", "coefficient": 4, "for": "gluon" },
        "effects": [{ "kind": "collinear-expansion" }],
    });
    for (key, value) in medium.as_object().unwrap() {
        whole[key] = value.clone();
    }
    least_with("medium", whole)
}

fn examples() -> Vec<PathBuf> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("configs");
    let mut files: Vec<_> = fs::read_dir(folder)
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .collect();
    files.sort();
    assert!(files.len() >= 4);
    files
}

#[test]
fn defaults_are_those_of_the_interface() {
    let plan = plan(LEAST);
    assert_eq!((plan.events, plan.seed), (20_000, 1));
    let SourceSettings::Single(source) = &plan.source else {
        panic!()
    };
    assert_eq!(source.direction, Direction::Transverse);
    assert_eq!(source.parton, Species::GLUON);
    assert_eq!(
        plan.coupling.law,
        CouplingLaw::Running {
            loops: Loops::One,
            alpha_s_mz: 0.118,
            freeze_gev: 1.0
        }
    );
    assert_eq!(plan.coupling.argument, ScaleArgument::TransverseMomentum);
    assert_eq!(plan.coupling.quark_masses_gev, [1.5, 4.75]);
    let shower = &plan.shower;
    assert_eq!(shower.virtuality_cutoff_gev, 1.0);
    assert_eq!(shower.ordering, Ordering::Virtuality);
    assert_eq!(shower.z_range, ZRange::Kinematic);
    assert_eq!(shower.lifetime, Lifetime::Exponential);
    assert_eq!(shower.flavours, 5);
    assert_eq!(shower.flavour_opening, FlavourOpening::PairThreshold);
    assert_eq!(shower.envelope_factor, 1.0);
    assert!(shower.kernels.q_qg && shower.kernels.g_gg && shower.kernels.g_qq);
    assert!(plan.medium.is_none());
    assert_eq!(plan.record.history, History::Final);
    assert_eq!(plan.record.compression, 1);
    assert_eq!(plan.record.momentum_bits, None);
    assert!(plan.warnings.is_empty());
}

#[test]
fn defaults_of_the_medium() {
    let medium = plan(&least_with_medium(json!({})).to_string())
        .medium
        .unwrap();
    assert_eq!(medium.field.end_temperature_gev, 0.15);
    assert!(medium.limit_to_small_angles && medium.transport.flow);
    assert_eq!(medium.min_energy_gev, 2.0);
    assert_eq!(medium.transport.stated_for, ColourCharge::Gluon);
    assert_eq!(medium.effects[0], PhaseSettings::Interference.into());
}

#[test]
fn every_value_reaches_the_plan() {
    let config = json!({
        "events": 3, "seed": u64::MAX,
        "source": { "kind": "pair", "partons": ["b", "bbar"], "sqrt_s_GeV": 91, "start_virtuality_GeV": 45,
                    "direction": [0, 3, -4] },
        "coupling": { "argument": "virtuality", "loops": 2, "alpha_s_mz": 0.12, "freeze_GeV": 1.25 },
        "quark_masses_GeV": [1.4, 4.5],
        "shower": { "virtuality_cutoff_GeV": 2, "z_range": { "kind": "constant", "epsilon": 0.01 },
                    "lifetime": "mean", "kernels": ["g-gg"], "flavours": 4, "flavour_opening": "always" },
        "medium": {
            "field": { "kind": "longitudinal", "temperature_GeV": 0.45, "start_fm": 0.6, "end_temperature_GeV": 0.16 },
            "origin": { "kind": "fixed", "x_fm": 1, "y_fm": -2 },
            "transport": { "kind": "constant", "qhat_GeV2_per_fm": 1.5, "for": "quark", "flow": false },
            "effects": [{ "kind": "collinear-expansion", "phase": "rescattering", "window": 0.9 }],
            "limit_to_small_angles": false, "min_energy_GeV": 3 },
        "record": { "history": "full", "compression": 4, "momentum_bits": 30 },
    });
    let plan = plan(&config.to_string());
    assert_eq!((plan.events, plan.seed), (3, u64::MAX));
    let SourceSettings::Pair(source) = &plan.source else {
        panic!()
    };
    assert_eq!(
        source.partons,
        [Species::quark(5), Species::quark(5).conjugate()]
    );
    assert_eq!(
        (source.sqrt_s_gev, source.start_virtuality_gev),
        (91.0, 45.0)
    );
    let Direction::Along(direction) = source.direction else {
        panic!()
    };
    for (found, expected) in direction.iter().zip([0.0, 0.6, -0.8]) {
        assert!((found - expected).abs() < 1e-15);
    }
    assert_eq!(
        plan.coupling.law,
        CouplingLaw::Running {
            loops: Loops::Two,
            alpha_s_mz: 0.12,
            freeze_gev: 1.25
        }
    );
    assert_eq!(plan.coupling.argument, ScaleArgument::Virtuality);
    assert_eq!(plan.coupling.quark_masses_gev, [1.4, 4.5]);
    assert_eq!(plan.shower.virtuality_cutoff_gev, 2.0);
    assert_eq!(plan.shower.z_range, ZRange::Constant { epsilon: 0.01 });
    assert_eq!(plan.shower.lifetime, Lifetime::Mean);
    let only_gluons = Kernels {
        q_qg: false,
        g_gg: true,
        g_qq: false,
    };
    assert_eq!(plan.shower.kernels, only_gluons);
    assert_eq!(plan.shower.flavours, 4);
    assert_eq!(plan.shower.flavour_opening, FlavourOpening::Always);
    let medium = plan.medium.unwrap();
    assert_eq!(
        medium.field.kind,
        FieldKind::Longitudinal {
            temperature_gev: 0.45,
            start_fm: 0.6
        }
    );
    assert_eq!(medium.field.end_temperature_gev, 0.16);
    assert_eq!(
        medium.transport.kind,
        TransportKind::Constant {
            qhat_gev2_per_fm: 1.5
        }
    );
    assert_eq!(medium.transport.stated_for, ColourCharge::Quark);
    assert!(!medium.transport.flow && !medium.limit_to_small_angles);
    assert_eq!(
        medium.effects[0],
        PhaseSettings::Rescattering { window: 0.9 }.into()
    );
    assert_eq!(medium.min_energy_gev, 3.0);
    assert_eq!(plan.record.history, History::Full);
    assert_eq!(
        (plan.record.compression, plan.record.momentum_bits),
        (4, Some(30))
    );
}

#[test]
fn fixed_coupling_and_collinear_ordering() {
    let mut config = least_with("coupling", json!({ "argument": "fixed", "alpha_s": 0.15 }));
    config["shower"] = json!({ "ordering": "collinear" });
    let plan = plan(&config.to_string());
    assert_eq!(plan.coupling.law, CouplingLaw::Fixed { alpha_s: 0.15 });
    assert_eq!(plan.shower.ordering, Ordering::Collinear);
}

#[test]
fn nulls_and_empty_lists_that_mean_the_default() {
    let mut config = least_with("medium", Value::Null);
    config["variations"] = json!([]);
    config["$schema"] = json!("schema.json");
    assert_eq!(plan(&config.to_string()).digest, plan(LEAST).digest);
    let held = json!({ "field": { "kind": "brick", "temperature_GeV": 0.3, "length_fm": 4, "pre_equilibrium": "none" } });
    plan(&least_with_medium(held).to_string());
}

#[test]
fn warnings() {
    let warned = |config: &Value, words: &str| {
        let warnings = plan(&config.to_string()).warnings;
        assert_eq!(warnings.len(), 1, "{warnings:?}");
        assert!(warnings[0].contains(words), "{warnings:?}");
    };
    let hot = json!({ "field": { "kind": "brick", "temperature_GeV": 1.5, "length_fm": 4 } });
    warned(&least_with_medium(hot), "is it in GeV?");
    let clear = json!({ "transport": { "kind": "cubic", "coefficient": 0, "for": "gluon" } });
    warned(&least_with_medium(clear), "transparent");
    warned(
        &least_with_medium(json!({ "min_energy_GeV": 200 })),
        "never acts",
    );
    let expanding =
        json!({ "field": { "kind": "longitudinal", "temperature_GeV": 0.4, "start_fm": 0.6 } });
    let mut along_the_beam = least_with_medium(expanding);
    along_the_beam["source"]["direction"] = json!([0, 0, 1]);
    warned(&along_the_beam, "along the beam");
}

#[test]
fn the_digest_sees_what_makes_the_sample_and_nothing_else() {
    let base = plan(&least_with_medium(json!({})).to_string()).digest;
    let spelt = least_with_medium(json!({}))
        .to_string()
        .replace("\"energy_GeV\":100", "\"energy_GeV\":1.0E2")
        .replace("\"seed\"", " \"seed\"");
    assert_eq!(plan(&spelt).digest, base);
    let mut more = least_with_medium(json!({}));
    more["events"] = json!(1);
    assert_eq!(plan(&more.to_string()).digest, base);
    more["seed"] = json!(2);
    assert_ne!(plan(&more.to_string()).digest, base);
    let stronger = json!({ "transport": { "kind": "cubic", "coefficient": 4.000000000000001, "for": "gluon" } });
    assert_ne!(plan(&least_with_medium(stronger).to_string()).digest, base);
}

#[test]
fn the_digest_holds_the_content_of_the_field_file_not_its_name() {
    let folder = tempfile::tempdir().unwrap();
    fs::create_dir(folder.path().join("configs")).unwrap();
    let write = |name: &str, content: &str| fs::write(folder.path().join(name), content).unwrap();
    write("one.h5", "field");
    write("same.h5", "field");
    write("other.h5", "Field");
    let plan = |name: &str| {
        let field = json!({ "field": { "kind": "grid", "file": format!("../{name}") } });
        let text = least_with_medium(field).to_string();
        load_text(
            &text,
            &folder.path().join("configs/run.json"),
            &Overrides::default(),
        )
        .unwrap()
    };
    let one = plan("one.h5");
    assert_eq!(one.inputs.len(), 1);
    assert_eq!(one.inputs[0].path, folder.path().join("configs/../one.h5"));
    let FieldKind::Grid { files, .. } = &one.medium.as_ref().unwrap().field.kind else {
        panic!()
    };
    assert_eq!(files[..], [one.inputs[0].path.clone()]);
    assert_eq!(one.resolved["medium"]["field"]["file"], "../one.h5");
    assert_eq!(one.digest, plan("same.h5").digest);
    assert_ne!(one.digest, plan("other.h5").digest);
}

#[test]
fn a_resolved_config_is_a_config_that_resolves_to_itself() {
    for config in every_choice() {
        let first = plan(&config.to_string());
        let again = plan(&first.resolved.to_string());
        assert_eq!(again.resolved, first.resolved);
        assert_eq!(again.digest, first.digest);
        assert_eq!(format!("{:?}", again.shower), format!("{:?}", first.shower));
    }
}

/// One config for every built choice of every key that is a choice, found in the schema.
fn every_choice() -> Vec<Value> {
    let mut configs = vec![
        least_with_medium(json!({})),
        least_with_medium(json!({ "effects": [] })),
        least_with_medium(
            json!({ "field": { "kind": "longitudinal", "temperature_GeV": 0.4, "start_fm": 0.6 } }),
        ),
        least_with_medium(
            json!({ "transport": { "kind": "constant", "qhat_GeV2_per_fm": 1, "for": "quark" } }),
        ),
        least_with("coupling", json!({ "argument": "fixed", "alpha_s": 0.1 })),
        least_with(
            "shower",
            json!({ "z_range": { "kind": "constant", "epsilon": 0.1 } }),
        ),
        least_with(
            "source",
            json!({ "kind": "pair", "partons": ["g", "g"], "sqrt_s_GeV": 91, "start_virtuality_GeV": 45 }),
        ),
    ];
    for (section, key) in [
        ("coupling", "argument"),
        ("shower", "ordering"),
        ("shower", "lifetime"),
        ("shower", "flavour_opening"),
        ("shower", "quark_masses"),
        ("record", "history"),
    ] {
        let words = &schema()["properties"][section]["properties"][key]["enum"];
        for word in words.as_array().unwrap() {
            if word != "fixed" {
                configs.push(least_with(section, json!({ key: word })));
            }
        }
    }
    let phases = &schema()["properties"]["medium"]["properties"]["effects"]["items"]["properties"]
        ["phase"]["enum"];
    for phase in phases.as_array().unwrap() {
        let effects = json!([{ "kind": "collinear-expansion", "phase": phase }]);
        configs.push(least_with_medium(json!({ "effects": effects })));
    }
    for parton in Species::names() {
        let mut config: Value = serde_json::from_str(LEAST).unwrap();
        config["source"]["parton"] = json!(parton);
        configs.push(config);
    }
    configs
}

#[test]
fn the_examples_are_valid_and_their_twins_are_twins() {
    for file in examples() {
        let text = fs::read_to_string(&file).unwrap();
        load_text(&text, &file, &Overrides::default()).unwrap_or_else(|errors| panic!("{errors}"));
    }
    let read = |name: &str| -> Value {
        let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("configs");
        serde_json::from_str(&fs::read_to_string(folder.join(name)).unwrap()).unwrap()
    };
    let (mut medium, mut vacuum) = (read("first-look.json"), read("first-look-vacuum.json"));
    assert_eq!(vacuum["medium"]["effects"], json!([]));
    assert_ne!(medium["medium"]["effects"], json!([]));
    medium["medium"]["effects"].take();
    vacuum["medium"]["effects"].take();
    assert_eq!(medium, vacuum);
}

/// Every property of the schema, with the path of its section.
fn every_property(schema: &Value, path: &str, visit: &mut impl FnMut(&str, &Value)) {
    if let Some(items) = schema.get("items") {
        every_property(items, &format!("{path}[]"), visit);
    }
    let Some(properties) = schema.get("properties").and_then(Value::as_object) else {
        return;
    };
    assert_eq!(schema["additionalProperties"], false, "{path}");
    for (name, property) in properties {
        let path = format!("{path}.{name}");
        visit(&path, property);
        every_property(property, &path, visit);
    }
}

#[test]
fn the_schema_describes_every_key() {
    let schema = schema();
    assert_eq!(
        schema["$schema"],
        "https://json-schema.org/draft/2020-12/schema"
    );
    let mut count = 0;
    every_property(&schema, "", &mut |path, property| {
        count += 1;
        assert!(
            property["description"].as_str().unwrap().len() > 10,
            "{path}"
        );
        let unit = property.get("x-unit").and_then(Value::as_str);
        assert_eq!(
            unit.is_some(),
            path.ends_with("GeV") || path.ends_with("_fm"),
            "{path}"
        );
    });
    assert!(count > 40, "{count}");
}

/// The resolved config of every choice holds exactly the keys that the schema has, taken together.
#[test]
fn the_schema_and_the_resolved_configs_have_the_same_keys() {
    let mut described = std::collections::BTreeSet::new();
    every_property(&schema(), "", &mut |path, _| {
        described.insert(path.to_owned());
    });
    let mut resolved = std::collections::BTreeSet::new();
    let mut configs = every_choice();
    configs.push(least_with("record", json!({ "momentum_bits": 30 })));
    for config in configs {
        paths(&plan(&config.to_string()).resolved, "", &mut resolved);
    }
    // The address of the schema is not part of a run; the grid needs a file.
    resolved.extend([".$schema".to_owned(), ".medium.field.file".to_owned()]);
    assert_eq!(described, resolved);
}

fn paths(value: &Value, path: &str, found: &mut std::collections::BTreeSet<String>) {
    match value {
        Value::Object(members) => {
            for (name, member) in members {
                let path = format!("{path}.{name}");
                found.insert(path.clone());
                paths(member, &path, found);
            }
        }
        Value::Array(items) => {
            for item in items {
                paths(item, &format!("{path}[]"), found);
            }
        }
        _ => {}
    }
}

/// A change of the text of a config.
#[derive(Clone, Debug)]
enum Mutation {
    Delete(usize, usize),
    Insert(usize, String),
    Copy(usize, usize, usize),
}

fn mutation() -> impl Strategy<Value = Mutation> {
    let tokens = prop::sample::select(vec![
        "{",
        "}",
        "[",
        "]",
        "\"",
        ",",
        ":",
        "-",
        "e",
        "1e400",
        "0.5",
        "null",
        "true",
        "\\u00",
        "\u{e9}",
        "\"kind\": \"grid\",",
        "\"file\": \"/dev/zero\",",
        "\"window\": 1,",
        "-0.0",
        "18446744073709551615",
        "\n",
    ]);
    prop_oneof![
        (any::<usize>(), 1..40_usize).prop_map(|(at, length)| Mutation::Delete(at, length)),
        (any::<usize>(), tokens).prop_map(|(at, token)| Mutation::Insert(at, token.to_owned())),
        (any::<usize>(), any::<char>()).prop_map(|(at, c)| Mutation::Insert(at, c.to_string())),
        (any::<usize>(), any::<usize>(), 1..60_usize)
            .prop_map(|(from, to, length)| Mutation::Copy(from, to, length)),
    ]
}

fn mutated(text: &str, mutations: &[Mutation]) -> String {
    let mut text: Vec<char> = text.chars().collect();
    for mutation in mutations {
        let place = |at: usize| at % (text.len() + 1);
        match mutation {
            Mutation::Delete(at, length) => {
                let start = place(*at);
                let end = (start + length).min(text.len());
                text.drain(start..end);
            }
            Mutation::Insert(at, piece) => {
                let at = place(*at);
                text.splice(at..at, piece.chars());
            }
            Mutation::Copy(from, to, length) => {
                let start = place(*from);
                let end = (start + length).min(text.len());
                let piece = text[start..end].to_vec();
                let to = place(*to);
                text.splice(to..to, piece);
            }
        }
    }
    text.into_iter().collect()
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::with_cases(4000) })]

    /// A mutated config gives a plan or errors that can be told, and never a panic.
    #[test]
    fn mutated_configs_never_panic(
        example in 0..5_usize,
        mutations in prop::collection::vec(mutation(), 1..4),
    ) {
        let text = match examples().get(example) {
            Some(file) => fs::read_to_string(file).unwrap(),
            None => LEAST.to_owned(),
        };
        let text = mutated(&text, &mutations);
        match load_text(&text, Path::new("configs/run.json"), &Overrides::default()) {
            Ok(plan) => prop_assert_eq!(plan.digest.len(), 64),
            Err(errors) => {
                prop_assert!(!errors.errors.is_empty());
                let lines = text.lines().count().max(1);
                for error in &errors.errors {
                    prop_assert!(error.line.is_some_and(|line| line <= lines + 1), "{}", errors);
                    prop_assert!(!error.found.is_empty() && !error.allowed.is_empty(), "{}", errors);
                    prop_assert!(!error.remedy.is_empty(), "{}", errors);
                }
            }
        }
    }
}
