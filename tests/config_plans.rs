//! What valid configs resolve to: defaults, digests, choices, the schema, and the examples in `configs/`.

use std::fs;
use std::path::{Path, PathBuf};
use std::sync::LazyLock;

use proptest::prelude::*;
use serde_json::{Value, json};
use spindrift::config::{History, Overrides, RunPlan, load_text, schema};
use spindrift::medium::effects::collinear_expansion::PhaseSettings;
use spindrift::medium::effects::{MODELS, Model};
use spindrift::medium::{
    ColourCharge, FieldKind, FieldSettings, Nucleus, OriginSettings, TransportKind,
};
use spindrift::parameters::Form;
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
        .filter(|path| path.extension().is_some_and(|ending| ending == "json"))
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
    let effect = &medium.effects[0];
    assert_eq!(effect.model.kind, "collinear-expansion");
    assert_eq!(effect.values.word("phase"), "interference");
    assert!(!effect.values.flag("pair_production"));
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
    let plain = plan(&least_with_medium(json!({ "field": field("radial") })).to_string());
    let mut spelt = field("radial");
    spelt["pre_equilibrium"] = json!("none");
    spelt["rotation_rad"] = json!(-0.0);
    spelt["shift_fm"] = json!([0, 0]);
    let spelt = plan(&least_with_medium(json!({ "field": spelt })).to_string());
    assert_eq!(plain.digest, spelt.digest);
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
    let turned = |change: Value| {
        let mut field = field("brick");
        field
            .as_object_mut()
            .unwrap()
            .extend(change.as_object().unwrap().clone());
        least_with_medium(json!({ "field": field }))
    };
    warned(&turned(json!({ "rotation_rad": 1 })), "makes no difference");
    warned(
        &turned(json!({ "shift_fm": [0, 1] })),
        "makes no difference",
    );
    // T at the centre: 0.1973 * 9 * 0.5^(2/3) * 0.6^(-1/3) * (1 + 0.0225)^(-2/3).
    let hot = json!({ "kind": "radial", "amplitude": 9, "q_per_fm": 0.25, "start_fm": 0.6 });
    warned(
        &least_with_medium(json!({ "field": hot })),
        "1.3069 GeV in the centre",
    );
    let twice = |one: &str, other: &str| {
        let with = |kind: &str| {
            let mut all = effects().into_iter();
            all.find(|effect| effect["kind"] == kind).unwrap()
        };
        least_with_medium(json!({ "effects": [with(one), with(other)] }))
    };
    warned(
        &twice("collinear-expansion", "singular-enhancement"),
        "collinear-expansion and singular-enhancement both describe branchings that the medium induces",
    );
    let apart = plan(&twice("collinear-expansion", "drag").to_string());
    assert_eq!(apart.warnings, [""; 0]);
    warned(
        &least_with("record", json!({ "medium_exit": true })),
        "no medium to leave",
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

/// In a list the order counts, a pattern is sorted, and the digest sees content and order alone.
#[test]
fn the_digest_of_many_fields_sees_their_order() {
    let folder = tempfile::tempdir().unwrap();
    for (name, content) in [("b.h5", "B"), ("a.h5", "A"), ("c.h5", "A")] {
        fs::write(folder.path().join(name), content).unwrap();
    }
    let plan = |files: Value| {
        let text = several_fields(files).to_string();
        load_text(
            &text,
            &folder.path().join("run.json"),
            &Overrides::default(),
        )
        .unwrap()
    };
    let names = |plan: &RunPlan| -> Vec<String> {
        let FieldKind::Grid {
            files,
            events_per_field,
        } = &plan.medium.as_ref().unwrap().field.kind
        else {
            panic!()
        };
        assert_eq!(*events_per_field, 1000);
        let inputs: Vec<_> = plan.inputs.iter().map(|input| &input.path).collect();
        assert_eq!(files.iter().collect::<Vec<_>>(), inputs);
        let name = |path: &PathBuf| path.file_name().unwrap().to_str().unwrap().to_owned();
        files.iter().map(name).collect()
    };
    let listed = plan(json!(["b.h5", "a.h5"]));
    assert_eq!(names(&listed), ["b.h5", "a.h5"]);
    assert_eq!(
        listed.resolved["medium"]["field"]["files"],
        json!(["b.h5", "a.h5"])
    );
    let turned = plan(json!(["a.h5", "b.h5"]));
    assert_ne!(listed.digest, turned.digest);
    let matched = plan(json!("[ab].h5"));
    assert_eq!(names(&matched), ["a.h5", "b.h5"]);
    assert_eq!(matched.digest, turned.digest);
    assert_eq!(plan(json!(["b.h5", "c.h5"])).digest, listed.digest);
    assert_ne!(plan(json!("*.h5")).digest, turned.digest);
}

#[test]
fn places_and_tables_belong_to_the_digest() {
    let folder = tempfile::tempdir().unwrap();
    let digest = |places: &str, qhat: &str| {
        fs::write(folder.path().join("places.csv"), places).unwrap();
        let table = format!("temperature_GeV,qhat_GeV2_per_fm\n0.1,0.1\n0.5,{qhat}\n");
        fs::write(folder.path().join("qhat.csv"), table).unwrap();
        let medium = json!({
            "origin": { "kind": "list", "file": "places.csv" },
            "transport": { "kind": "table", "file": "qhat.csv", "for": "gluon" },
        });
        let text = least_with_medium(medium).to_string();
        let path = folder.path().join("run.json");
        let plan = load_text(&text, &path, &Overrides::default()).unwrap();
        assert_eq!(plan.inputs.len(), 2);
        plan.digest
    };
    let base = digest("1", "8");
    assert_ne!(digest("2", "8"), base);
    assert_ne!(digest("1", "9"), base);
    assert_eq!(digest("1", "8"), base);
}

/// Every value of the new kinds reaches the plan.
#[test]
fn kinds_of_the_medium_reach_the_plan() {
    let medium = |change: Value| plan(&least_with_medium(change).to_string()).medium.unwrap();
    let mut radial = field("radial");
    radial["pre_equilibrium"] = json!("hold");
    radial["rotation_rad"] = json!(0.5);
    radial["shift_fm"] = json!([1, -2]);
    let found = medium(json!({ "field": radial, "origin": origin("field-weighted") }));
    assert_eq!(
        found.field,
        FieldSettings {
            kind: FieldKind::Radial {
                amplitude: 3.0,
                q_per_fm: 0.25,
                start_fm: 0.6
            },
            end_temperature_gev: 0.15,
            hold_before_start: true,
            rotation_rad: 0.5,
            shift_fm: [1.0, -2.0],
        }
    );
    assert_eq!(found.origin, OriginSettings::FieldWeighted { power: 4.0 });
    let found = medium(json!({ "field": field("grid"), "origin": origin("collision-density") }));
    assert_eq!(found.origin, OriginSettings::CollisionDensity);
    assert!(!found.field.hold_before_start);
    let overlap = |nucleus| OriginSettings::Overlap {
        nucleus,
        impact_parameter_fm: 7.0,
    };
    let custom = Nucleus {
        radius_fm: 6.6,
        diffuseness_fm: 0.55,
    };
    assert_eq!(
        medium(json!({ "origin": origin("overlap") })).origin,
        overlap(custom)
    );
    let lead = json!({ "kind": "overlap", "nucleus": "Pb208", "impact_parameter_fm": 7 });
    let found = medium(json!({ "origin": lead })).origin;
    assert_eq!(found, overlap(Nucleus::named("Pb208").unwrap()));
    let found = medium(json!({ "origin": origin("list") })).origin;
    assert_eq!(
        found,
        OriginSettings::List {
            file: input("places.csv").into()
        }
    );
    let thermal = json!({ "kind": "thermal", "alpha_s": 0.3, "flavours": 2, "flow": false });
    let found = medium(json!({ "transport": thermal })).transport;
    assert_eq!(
        found.kind,
        TransportKind::Thermal {
            alpha_s: 0.3,
            flavours: 2
        }
    );
    assert!(!found.flow);
    let found = medium(json!({ "transport": transport("thermal") })).transport;
    assert_eq!(
        found.kind,
        TransportKind::Thermal {
            alpha_s: 0.3,
            flavours: 3
        }
    );
    let found = medium(json!({ "transport": transport("table") })).transport;
    let TransportKind::Table(table) = &found.kind else {
        panic!()
    };
    assert_eq!(table.qhat_gev2_per_fm(), [0.1, 8.0]);
    assert_eq!(found.stated_for, ColourCharge::Gluon);
    let angular = plan(&least_with("shower", json!({ "ordering": "angular" })).to_string());
    assert_eq!(angular.shower.ordering, Ordering::Angular);
    let record = plan(&least_with("record", json!({})).to_string()).record;
    assert!(!record.medium_exit);
    let mut config = least_with_medium(json!({}));
    config["record"] = json!({ "medium_exit": true });
    assert!(plan(&config.to_string()).record.medium_exit);
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

fn words(section: &Value, key: &str) -> Vec<String> {
    let words = section["properties"][key]["enum"].as_array().unwrap();
    words
        .iter()
        .map(|word| word.as_str().unwrap().to_owned())
        .collect()
}

/// The kinds of a section of the medium, found in the schema.
fn words_of(section: &str) -> impl Iterator<Item = String> {
    words(
        &schema()["properties"]["medium"]["properties"][section],
        "kind",
    )
    .into_iter()
}

fn field(kind: &str) -> Value {
    match kind {
        "brick" => json!({ "kind": kind, "temperature_GeV": 0.3, "length_fm": 4 }),
        "longitudinal" => json!({ "kind": kind, "temperature_GeV": 0.4, "start_fm": 0.6 }),
        "radial" => json!({ "kind": kind, "amplitude": 3, "q_per_fm": 0.25, "start_fm": 0.6 }),
        "grid" => json!({ "kind": kind, "file": "demo-data/lumpy-fireball.h5" }),
        _ => panic!("a new kind of field: {kind}"),
    }
}

fn several_fields(files: Value) -> Value {
    let field = json!({ "kind": "grid", "files": files, "events_per_field": 1000,
        "rotation_rad": 0.5, "shift_fm": [1, -2] });
    least_with_medium(json!({ "field": field }))
}

fn origin(kind: &str) -> Value {
    match kind {
        "fixed" => json!({ "kind": kind, "x_fm": 1, "y_fm": -2 }),
        "overlap" => {
            json!({ "kind": kind, "nucleus": "custom", "radius_fm": 6.6, "diffuseness_fm": 0.55,
            "impact_parameter_fm": 7 })
        }
        "field-weighted" | "collision-density" => json!({ "kind": kind }),
        "list" => json!({ "kind": kind, "file": input("places.csv") }),
        _ => panic!("a new kind of origin: {kind}"),
    }
}

fn transport(kind: &str) -> Value {
    match kind {
        "cubic" => json!({ "kind": kind, "coefficient": 4, "for": "quark" }),
        "constant" => json!({ "kind": kind, "qhat_GeV2_per_fm": 1, "for": "gluon" }),
        "thermal" => json!({ "kind": kind, "alpha_s": 0.3 }),
        "table" => json!({ "kind": kind, "file": input("qhat.csv"), "for": "gluon" }),
        _ => panic!("a new kind of transport: {kind}"),
    }
}

/// The path of a small input file.
fn input(name: &str) -> String {
    static FOLDER: LazyLock<tempfile::TempDir> = LazyLock::new(|| {
        let folder = tempfile::tempdir().unwrap();
        let write = |name: &str, text: &str| fs::write(folder.path().join(name), text).unwrap();
        write("places.csv", "x_fm,y_fm,weight\n0,0,1\n1,2,0.5\n");
        write(
            "qhat.csv",
            "temperature_GeV,qhat_GeV2_per_fm\n0.1,0.1\n0.5,8\n",
        );
        folder
    });
    FOLDER.path().join(name).to_str().unwrap().to_owned()
}

/// Every model of the registry with every word of its choices.
fn effects() -> Vec<Value> {
    let mut effects = Vec::new();
    for model in MODELS {
        let mut worlds = vec![vec![]];
        for key in model.keys {
            if let Form::Choice(choices) = key.form {
                let with = |world: &Vec<_>, word| [&world[..], &[(key.name, word)]].concat();
                worlds = worlds
                    .iter()
                    .flat_map(|world| choices.iter().map(move |choice| with(world, choice.name)))
                    .collect();
            }
        }
        effects.extend(worlds.iter().map(|world| effect(model, world)));
    }
    assert!(effects.len() > MODELS.len());
    effects
}

/// A model with some words, and a value for every other key that they use.
fn effect(model: &Model, words: &[(&str, &'static str)]) -> Value {
    let mut effect = json!({ "kind": model.kind });
    for key in model.keys {
        let word = |name: &str| words.iter().find(|(key, _)| *key == name).unwrap().1;
        if !key
            .when
            .iter()
            .all(|when| when.is.contains(&word(when.key)))
        {
            continue;
        }
        effect[key.name] = match (key.form, key.default_text()) {
            (Form::Choice(_), _) => json!(word(key.name)),
            (_, Some(text)) => serde_json::from_str(text).unwrap(),
            (Form::Number(range), None) => json!(0.5 * (range.low + range.high)),
            (form, None) => panic!("{} {}: {form:?}", model.kind, key.name),
        };
    }
    effect
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
    configs
        .extend(words_of("field").map(|kind| least_with_medium(json!({ "field": field(&kind) }))));
    configs.push(several_fields(json!("demo-data/*.h5")));
    configs.extend(
        words_of("origin").map(|kind| {
            least_with_medium(json!({ "field": field("grid"), "origin": origin(&kind) }))
        }),
    );
    for nucleus in words(
        &schema()["properties"]["medium"]["properties"]["origin"],
        "nucleus",
    ) {
        let mut overlap = origin("overlap");
        overlap["nucleus"] = json!(nucleus);
        if nucleus != "custom" {
            let members = overlap.as_object_mut().unwrap();
            members.retain(|key, _| key != "radius_fm" && key != "diffuseness_fm");
        }
        configs.push(least_with_medium(json!({ "origin": overlap })));
    }
    configs.extend(
        words_of("transport")
            .map(|kind| least_with_medium(json!({ "transport": transport(&kind) }))),
    );
    let held = json!({ "kind": "longitudinal", "temperature_GeV": 0.4, "start_fm": 0.6, "pre_equilibrium": "hold" });
    configs.push(least_with_medium(json!({ "field": held })));
    configs.extend(
        effects()
            .into_iter()
            .map(|effect| least_with_medium(json!({ "effects": [effect] }))),
    );
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
            ["GeV", "_fm", "_rad", "_per_GeV2"]
                .iter()
                .any(|ending| path.ends_with(ending)),
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
    // The address of the schema is not part of a run.
    resolved.insert(".$schema".to_owned());
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
        "\"files\": \"*.toml\",",
        "\"files\": [\"Cargo.toml\"], \"events_per_field\": 5,",
        "\"kind\": \"overlap\", \"nucleus\": \"custom\",",
        "\"kind\": \"radial\", \"amplitude\": 1e4, \"q_per_fm\": 1e-3,",
        "\"kind\": \"table\",",
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
        example in 0..=examples().len(),
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
