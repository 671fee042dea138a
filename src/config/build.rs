//! From the checked values to the settings of the physics modules.

use serde_json::Value;

use super::inputs::{FIELD, Inputs, PLACES};
use super::keys::CUSTOM;
use super::plan::{History, RecordSettings};
use crate::medium::effects::model;
use crate::medium::field::Radial;
use crate::medium::{
    ColourCharge, EffectSettings, FieldKind, FieldSettings, MediumSettings, Nucleus,
    OriginSettings, TransportKind, TransportSettings,
};
use crate::parameters::{Form, Key, Setting, Values};
use crate::qcd::{CouplingLaw, CouplingSettings, Loops, ScaleArgument, Species};
use crate::shower::{FlavourOpening, Kernels, Lifetime, Ordering, ShowerSettings, ZRange};
use crate::source::{Direction, PairSettings, SingleSettings, SourceSettings};

/// A checked section: every key that its kinds use is there, unless optional.
#[derive(Clone, Copy)]
pub struct Checked<'a>(pub &'a Value);

impl<'a> Checked<'a> {
    fn value(self, key: &str) -> &'a Value {
        self.0
            .get(key)
            .expect("the checker fills in every key that the chosen kinds use")
    }

    /// A section in it.
    pub fn section(self, key: &str) -> Checked<'a> {
        Checked(self.value(key))
    }

    fn number(self, key: &str) -> f64 {
        self.value(key)
            .as_f64()
            .expect("the checker gives a number")
    }

    /// A count in it.
    pub fn count(self, key: &str) -> u64 {
        self.value(key).as_u64().expect("the checker gives a count")
    }

    /// A count whose range in the table fits a byte.
    fn small_count(self, key: &str) -> u8 {
        u8::try_from(self.count(key)).expect("the table bounds this count")
    }

    fn flag(self, key: &str) -> bool {
        self.value(key).as_bool().expect("the checker gives a flag")
    }

    fn text(self, key: &str) -> &'a str {
        self.value(key)
            .as_str()
            .expect("the checker gives a string")
    }

    fn list(self, key: &str) -> &'a [Value] {
        self.value(key)
            .as_array()
            .expect("the checker gives a list")
    }

    fn pick<T: Copy>(self, key: &str, choices: &[(&str, T)]) -> T {
        let word = self.text(key);
        let choice = choices.iter().find(|(name, _)| *name == word);
        choice.expect("a test resolves every choice of the table").1
    }
}

/// The hard process.
pub fn source(section: Checked) -> SourceSettings {
    let start_virtuality_gev = section.number("start_virtuality_GeV");
    let direction = direction(section.value("direction"));
    if section.text("kind") == "single" {
        SourceSettings::Single(SingleSettings {
            parton: species(section.text("parton")),
            energy_gev: section.number("energy_GeV"),
            start_virtuality_gev,
            direction,
        })
    } else {
        let partons = section.list("partons");
        let parton = |place: usize| species(partons[place].as_str().expect("checked as a parton"));
        SourceSettings::Pair(PairSettings {
            partons: [parton(0), parton(1)],
            sqrt_s_gev: section.number("sqrt_s_GeV"),
            start_virtuality_gev,
            direction,
        })
    }
}

fn species(name: &str) -> Species {
    Species::from_name(name).expect("the checker knows the names of partons")
}

fn direction(value: &Value) -> Direction {
    match value.as_array() {
        None => Direction::Transverse,
        Some(list) => {
            let component = |place: usize| list[place].as_f64().expect("checked as a number");
            let vector = [component(0), component(1), component(2)];
            Direction::Along(unit_vector(vector).expect("a rule refuses the zero vector"))
        }
    }
}

/// The unit vector along a vector, `None` for zero; scaled first, so that squares neither overflow nor vanish.
pub fn unit_vector(vector: [f64; 3]) -> Option<[f64; 3]> {
    let largest = vector.iter().fold(0.0_f64, |most, x| most.max(x.abs()));
    // A subnormal scale would lose the direction to rounding.
    if largest < f64::MIN_POSITIVE {
        return None;
    }
    let scaled = vector.map(|x| x / largest);
    let length = scaled.iter().map(|x| x * x).sum::<f64>().sqrt();
    Some(scaled.map(|x| x / length))
}

/// The coupling, with the quark masses of the top level.
pub fn coupling(root: Checked) -> CouplingSettings {
    let section = root.section("coupling");
    let argument = section.text("argument");
    let law = if argument == "fixed" {
        CouplingLaw::Fixed {
            alpha_s: section.number("alpha_s"),
        }
    } else {
        CouplingLaw::Running {
            loops: if section.count("loops") == 1 {
                Loops::One
            } else {
                Loops::Two
            },
            alpha_s_mz: section.number("alpha_s_mz"),
            freeze_gev: section.number("freeze_GeV"),
        }
    };
    let masses = root.list("quark_masses_GeV");
    let mass = |place: usize| masses[place].as_f64().expect("checked as a number");
    CouplingSettings {
        law,
        argument: if argument == "virtuality" {
            ScaleArgument::Virtuality
        } else {
            ScaleArgument::TransverseMomentum
        },
        quark_masses_gev: [mass(0), mass(1)],
    }
}

/// The settings of a running coupling, where all of them are there and the masses ascend (before errors are told).
pub fn running_coupling(root: Checked) -> Option<CouplingSettings> {
    let section = root.0.get("coupling")?;
    let keys = ["argument", "loops", "alpha_s_mz", "freeze_GeV"];
    let masses = root.0.get("quark_masses_GeV")?.as_array()?;
    let complete = keys.iter().all(|key| section.get(key).is_some());
    let ascending = masses[0].as_f64()? < masses[1].as_f64()?;
    (complete && ascending).then(|| coupling(root))
}

/// The shower's choices.
pub fn shower(section: Checked) -> ShowerSettings {
    let kernels = section.list("kernels");
    let on = |name: &str| kernels.iter().any(|kernel| kernel == name);
    ShowerSettings {
        virtuality_cutoff_gev: section.number("virtuality_cutoff_GeV"),
        ordering: section.pick(
            "ordering",
            &[
                ("virtuality", Ordering::Virtuality),
                ("collinear", Ordering::Collinear),
                ("angular", Ordering::Angular),
            ],
        ),
        z_range: z_range(section.section("z_range")),
        lifetime: section.pick(
            "lifetime",
            &[
                ("exponential", Lifetime::Exponential),
                ("mean", Lifetime::Mean),
            ],
        ),
        kernels: Kernels {
            q_qg: on("q-qg"),
            g_gg: on("g-gg"),
            g_qq: on("g-qq"),
        },
        flavours: section.small_count("flavours"),
        flavour_opening: section.pick(
            "flavour_opening",
            &[
                ("pair-threshold", FlavourOpening::PairThreshold),
                ("always", FlavourOpening::Always),
            ],
        ),
        envelope_factor: 1.0,
    }
}

fn z_range(section: Checked) -> ZRange {
    if section.text("kind") == "kinematic" {
        ZRange::Kinematic
    } else {
        ZRange::Constant {
            epsilon: section.number("epsilon"),
        }
    }
}

/// The medium, `None` for null.
pub fn medium(section: Checked, inputs: &Inputs) -> Option<MediumSettings> {
    if section.0.is_null() {
        return None;
    }
    Some(MediumSettings {
        field: field(section.section("field"), inputs),
        origin: origin(section.section("origin"), inputs),
        transport: transport(section.section("transport"), inputs),
        effects: section
            .list("effects")
            .iter()
            .map(|value| effect(Checked(value)))
            .collect(),
        limit_to_small_angles: section.flag("limit_to_small_angles"),
        min_energy_gev: section.number("min_energy_GeV"),
    })
}

fn field(section: Checked, inputs: &Inputs) -> FieldSettings {
    let kind = match section.text("kind") {
        "brick" => FieldKind::Brick {
            temperature_gev: section.number("temperature_GeV"),
            length_fm: section.number("length_fm"),
        },
        "longitudinal" => FieldKind::Longitudinal {
            temperature_gev: section.number("temperature_GeV"),
            start_fm: section.number("start_fm"),
        },
        "radial" => radial(section),
        _ => FieldKind::Grid {
            files: inputs.paths(FIELD),
            events_per_field: section
                .0
                .get("events_per_field")
                .map_or(u64::MAX, |_| section.count("events_per_field")),
        },
    };
    FieldSettings {
        kind,
        end_temperature_gev: section.number("end_temperature_GeV"),
        hold_before_start: section
            .0
            .get("pre_equilibrium")
            .is_some_and(|word| word == "hold"),
        rotation_rad: section.number("rotation_rad"),
        shift_fm: [0, 1].map(|place| {
            section.list("shift_fm")[place]
                .as_f64()
                .expect("checked as a number")
        }),
    }
}

fn radial(section: Checked) -> FieldKind {
    FieldKind::Radial {
        amplitude: section.number("amplitude"),
        q_per_fm: section.number("q_per_fm"),
        start_fm: section.number("start_fm"),
    }
}

/// The radial field, where all its numbers are there (before errors are told).
pub fn radial_field(field: Checked) -> Option<Radial> {
    let number = |key: &str| field.0.get(key)?.as_f64();
    Some(Radial::new(
        number("amplitude")?,
        number("q_per_fm")?,
        number("start_fm")?,
    ))
}

fn origin(section: Checked, inputs: &Inputs) -> OriginSettings {
    match section.text("kind") {
        "fixed" => OriginSettings::Fixed {
            x_fm: section.number("x_fm"),
            y_fm: section.number("y_fm"),
        },
        "overlap" => OriginSettings::Overlap {
            nucleus: nucleus(section).expect("a checked nucleus has a name or two numbers"),
            impact_parameter_fm: section.number("impact_parameter_fm"),
        },
        "field-weighted" => OriginSettings::FieldWeighted {
            power: section.number("power"),
        },
        "collision-density" => OriginSettings::CollisionDensity,
        _ => OriginSettings::List {
            file: inputs.path(PLACES),
        },
    }
}

/// The nucleus of an overlap, where all of it is there (before errors are told).
pub fn nucleus(origin: Checked) -> Option<Nucleus> {
    let name = origin.0.get("nucleus")?.as_str()?;
    if name != CUSTOM {
        return Nucleus::named(name);
    }
    let number = |key: &str| origin.0.get(key)?.as_f64();
    Some(Nucleus {
        radius_fm: number("radius_fm")?,
        diffuseness_fm: number("diffuseness_fm")?,
    })
}

fn transport(section: Checked, inputs: &Inputs) -> TransportSettings {
    let kind = match section.text("kind") {
        "cubic" => TransportKind::Cubic {
            coefficient: section.number("coefficient"),
        },
        "constant" => TransportKind::Constant {
            qhat_gev2_per_fm: section.number("qhat_GeV2_per_fm"),
        },
        "thermal" => TransportKind::Thermal {
            alpha_s: section.number("alpha_s"),
            flavours: section.small_count("flavours"),
        },
        _ => TransportKind::Table(inputs.table()),
    };
    let stated_for = match kind {
        // It computes both.
        TransportKind::Thermal { .. } => ColourCharge::Gluon,
        _ => section.pick(
            "for",
            &[
                ("quark", ColourCharge::Quark),
                ("gluon", ColourCharge::Gluon),
            ],
        ),
    };
    TransportSettings {
        kind,
        stated_for,
        flow: section.flag("flow"),
    }
}

fn effect(section: Checked) -> EffectSettings {
    let model = model(section.text("kind")).expect("the checker knows the kinds of the registry");
    let mut values = Values::default();
    for key in model.keys {
        // A key that the chosen words do not use is absent.
        if let Some(value) = section.0.get(key.name) {
            values.set(key.name, setting(key, value));
        }
    }
    EffectSettings { model, values }
}

fn setting(key: &Key, value: &Value) -> Setting {
    match key.form {
        Form::Flag => Setting::Flag(value.as_bool().expect("the checker gives a flag")),
        Form::Choice(choices) => {
            let chosen = choices.iter().find(|choice| value == choice.name);
            Setting::Word(chosen.expect("the checker gives a word of the choice").name)
        }
        _ => Setting::Number(value.as_f64().expect("the checker gives a number")),
    }
}

/// What the event file keeps.
pub fn record(section: Checked) -> RecordSettings {
    RecordSettings {
        history: section.pick(
            "history",
            &[("final", History::Final), ("full", History::Full)],
        ),
        compression: section.small_count("compression"),
        momentum_bits: section
            .0
            .get("momentum_bits")
            .map(|_| section.small_count("momentum_bits")),
        medium_exit: section.flag("medium_exit"),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn unit_vectors_of_any_length() {
        assert_eq!(unit_vector([0.0, 0.0, -3.0]), Some([0.0, 0.0, -1.0]));
        assert_eq!(unit_vector([1e-200, 0.0, 0.0]), Some([1.0, 0.0, 0.0]));
        assert_eq!(unit_vector([0.0; 3]), None);
        assert_eq!(unit_vector([5e-324, 0.0, 0.0]), None);
        let [x, y, z] = unit_vector([3e99, 4e99, 0.0]).unwrap();
        assert!((x - 0.6).abs() < 1e-15 && (y - 0.8).abs() < 1e-15 && z == 0.0);
    }
}
