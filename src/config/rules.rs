//! Rules that tie several keys together, and warnings. Each rule looks at values that are valid by themselves and
//! says nothing where one of them is missing.

use serde_json::Value;

use super::build::{self, Checked};
use super::check::Places;
use super::error::{ConfigError, Problem, Report};
use super::inputs::{FIELD, Inputs};
use super::keys::HOTTEST_GEV;
use crate::medium::effects::{Physics, model};
use crate::medium::field::TemperatureField;
use crate::medium::origin::Overlap;
use crate::qcd::coupling::CouplingError;
use crate::qcd::{Coupling, HBAR_C_GEV_FM, Species};

/// From here on a temperature is worth a warning.
const WARM_GEV: f64 = 1.0;

/// Longest time that an expanding medium may take to cool.
const LONGEST_COOLING_FM: f64 = 1000.0;

/// Checks all rules.
pub fn check(resolved: &Value, places: &Places, report: &mut Report) -> Vec<String> {
    let mut rules = Rules {
        resolved,
        places,
        report,
        warnings: Vec::new(),
    };
    rules.start_virtuality();
    rules.cutoff();
    rules.pair();
    rules.direction();
    rules.quark_masses();
    rules.coupling();
    rules.kernels();
    rules.collinear_in_medium();
    rules.temperatures();
    rules.cooling_time();
    rules.radial_field();
    rules.uniform_field();
    rules.origin_in_field();
    rules.impact_parameter();
    rules.effects();
    rules.physics_counted_twice();
    rules.medium_that_never_acts();
    rules.exit_from_no_medium();
    rules.warnings
}

/// Warnings about the files that were found.
pub fn warn_of_inputs(resolved: &Value, inputs: &Inputs, warnings: &mut Vec<String>) {
    let number = |pointer: &str| resolved.pointer(pointer).and_then(Value::as_u64);
    let (Some(events), Some(in_a_row)) =
        (number("/events"), number("/medium/field/events_per_field"))
    else {
        return;
    };
    let fields = inputs.paths(FIELD).len() as u64;
    let round = in_a_row.saturating_mul(fields);
    if events < round {
        warnings.push(format!(
            "medium.field.events_per_field: {events} events use {} of {fields} fields; {round} would use each equally",
            events.div_ceil(in_a_row)
        ));
    } else if !events.is_multiple_of(round) {
        warnings.push(format!(
            "medium.field.events_per_field: {events} events use {fields} fields unequally; a multiple of {round} would \
             use each equally"
        ));
    }
}

struct Rules<'a, 'p> {
    resolved: &'a Value,
    places: &'a Places<'p>,
    report: &'a mut Report,
    warnings: Vec<String>,
}

impl<'a> Rules<'a, '_> {
    fn get(&self, path: &str) -> Option<&'a Value> {
        path.split('.')
            .try_fold(self.resolved, |value, key| value.get(key))
    }

    fn number(&self, path: &str) -> Option<f64> {
        self.get(path)?.as_f64()
    }

    fn text(&self, path: &str) -> Option<&'a str> {
        self.get(path)?.as_str()
    }

    fn list(&self, path: &str) -> &'a [Value] {
        self.get(path)
            .and_then(Value::as_array)
            .map_or(&[], Vec::as_slice)
    }

    fn refuse(
        &mut self,
        path: &str,
        found: String,
        allowed: impl Into<String>,
        remedy: impl Into<String>,
    ) {
        let default = if self.places.written(path) {
            ""
        } else {
            " (the default)"
        };
        self.report.add(|| ConfigError {
            problem: Problem::Conflict,
            line: self.places.line(path),
            path: path.to_owned(),
            found: found + default,
            allowed: allowed.into(),
            remedy: remedy.into(),
            nearest: None,
        });
    }

    fn start_virtuality(&mut self) {
        let path = "source.start_virtuality_GeV";
        let Some(start) = self.number(path) else {
            return;
        };
        if let Some(energy) = self.number("source.energy_GeV")
            && start > energy
        {
            self.refuse(
                path,
                format!("{start:?} GeV"),
                format!("at most the energy, {energy:?} GeV"),
                "lower start_virtuality_GeV or raise energy_GeV",
            );
        }
        if let Some(sqrt_s) = self.number("source.sqrt_s_GeV")
            && start > sqrt_s
        {
            self.refuse(
                path,
                format!("{start:?} GeV"),
                format!("at most sqrt_s_GeV, {sqrt_s:?} GeV"),
                "lower start_virtuality_GeV or raise sqrt_s_GeV",
            );
        }
    }

    fn cutoff(&mut self) {
        let path = "shower.virtuality_cutoff_GeV";
        if let (Some(cutoff), Some(start)) = (
            self.number(path),
            self.number("source.start_virtuality_GeV"),
        ) && cutoff >= start
        {
            self.refuse(
                path,
                format!("{cutoff:?} GeV"),
                format!("below the start virtuality, {start:?} GeV"),
                "lower virtuality_cutoff_GeV or raise source.start_virtuality_GeV",
            );
        }
    }

    fn pair(&mut self) {
        let path = "source.partons";
        let names: Vec<_> = self.list(path).iter().filter_map(Value::as_str).collect();
        let species: Vec<_> = names
            .iter()
            .filter_map(|name| Species::from_name(name))
            .collect();
        if let [one, other] = species[..]
            && other != one.conjugate()
        {
            self.refuse(
                path,
                format!("[\"{}\", \"{}\"]", one.name(), other.name()),
                "a quark with its own antiquark, or two gluons",
                format!("write [\"{}\", \"{}\"]", one.name(), one.conjugate().name()),
            );
        }
    }

    fn direction(&mut self) {
        let path = "source.direction";
        let vector: Vec<_> = self.list(path).iter().filter_map(Value::as_f64).collect();
        let [x, y, z] = vector[..] else { return };
        if build::unit_vector([x, y, z]).is_none() {
            self.refuse(
                path,
                format!("[{x:?}, {y:?}, {z:?}]"),
                "a vector that is not zero",
                "give a direction, for instance [1, 0, 0], or \"transverse\"",
            );
        } else if x == 0.0 && y == 0.0 && self.in_boost_invariant_medium() {
            self.warnings.push(format!(
                "{path}: a parton along the beam stays at proper time 0 and never meets this medium"
            ));
        }
    }

    fn in_boost_invariant_medium(&self) -> bool {
        matches!(
            self.text("medium.field.kind"),
            Some("longitudinal" | "radial" | "grid")
        )
    }

    fn quark_masses(&mut self) {
        let path = "quark_masses_GeV";
        let masses: Vec<_> = self.list(path).iter().filter_map(Value::as_f64).collect();
        if let [charm, bottom] = masses[..]
            && charm >= bottom
        {
            self.refuse(
                path,
                format!("[{charm:?}, {bottom:?}]"),
                "charm before bottom, ascending",
                "write the smaller mass first",
            );
        }
    }

    /// The coupling itself refuses to run into its pole.
    fn coupling(&mut self) {
        let settings = build::running_coupling(Checked(self.resolved));
        let Some(Err(error)) = settings.map(|settings| Coupling::new(&settings)) else {
            return;
        };
        let CouplingError::TooStrong {
            freeze_gev,
            scale_gev,
            largest,
        } = error;
        self.refuse(
            "coupling.freeze_GeV",
            format!("{freeze_gev:?} GeV, with alpha_s = {largest:.3} at {scale_gev:.4} GeV"),
            "a scale above the Landau pole, where alpha_s is still below 1",
            "raise freeze_GeV or lower alpha_s_mz",
        );
    }

    fn kernels(&mut self) {
        for (place, name) in self.list("shower.kernels").iter().enumerate() {
            if self.list("shower.kernels")[..place].contains(name) {
                self.refuse(
                    &format!("shower.kernels[{place}]"),
                    format!("{name} a second time"),
                    "each splitting once",
                    "remove it",
                );
            }
        }
    }

    fn collinear_in_medium(&mut self) {
        let in_medium = self.get("medium").is_some_and(|medium| !medium.is_null());
        if in_medium && self.text("shower.ordering") == Some("collinear") {
            self.refuse(
                "shower.ordering",
                "\"collinear\" with a medium".to_owned(),
                "\"collinear\" in vacuum only: it has no four-momenta, so there are no paths through a medium",
                "remove the medium, or set ordering to \"virtuality\"",
            );
        }
    }

    fn temperatures(&mut self) {
        let Some(temperature) = self.number("medium.field.temperature_GeV") else {
            return;
        };
        if temperature > WARM_GEV {
            self.warnings.push(format!(
                "medium.field.temperature_GeV: {temperature:?} GeV is hotter than any collision; is it in GeV?"
            ));
        }
        let path = "medium.field.end_temperature_GeV";
        if let Some(end) = self.number(path)
            && end >= temperature
        {
            self.refuse(
                path,
                format!("{end:?} GeV"),
                format!("below the temperature of the field, {temperature:?} GeV, else there is no medium"),
                "lower end_temperature_GeV or raise temperature_GeV (for vacuum, set effects to [])",
            );
        }
    }

    /// T ~ tau^(-1/3) reaches the end temperature at start (T / T_end)^3; without end, path integrals diverge.
    fn cooling_time(&mut self) {
        let path = "medium.field.end_temperature_GeV";
        let (Some(start), Some(temperature), Some(end)) = (
            self.number("medium.field.start_fm"),
            self.number("medium.field.temperature_GeV"),
            self.number(path),
        ) else {
            return;
        };
        let cooled = start * (temperature / end).powi(3);
        if cooled.is_nan() || cooled > LONGEST_COOLING_FM {
            self.refuse(
                path,
                format!("{end:?} GeV, reached at {cooled:.4} fm"),
                format!("an end temperature that is reached before {LONGEST_COOLING_FM} fm"),
                "raise end_temperature_GeV, or lower temperature_GeV or start_fm",
            );
        }
    }

    /// The hottest point at the start is where r^2 = tau^2 - 1/q^2, else the centre; from tau = 1/q on it is as hot as
    /// A hbar c/tau, so that is when it is cold.
    fn radial_field(&mut self) {
        let section = self.get("medium.field");
        let field = section.and_then(|section| build::radial_field(Checked(section)));
        let (Some(field), Some(amplitude), Some(q), Some(start)) = (
            field,
            self.number("medium.field.amplitude"),
            self.number("medium.field.q_per_fm"),
            self.number("medium.field.start_fm"),
        ) else {
            return;
        };
        let ring = (start * start - 1.0 / (q * q)).max(0.0).sqrt();
        let hottest = field.fluid([start, ring, 0.0, 0.0]).temperature_gev;
        let centre = field.fluid([start, 0.0, 0.0, 0.0]).temperature_gev;
        if hottest > HOTTEST_GEV {
            self.refuse(
                "medium.field.amplitude",
                format!("{amplitude:?}, which makes {hottest:.4} GeV at start_fm"),
                format!("what makes at most {HOTTEST_GEV} GeV"),
                "lower amplitude or q_per_fm, or raise start_fm",
            );
            return;
        }
        if hottest > WARM_GEV {
            self.warnings.push(format!(
                "medium.field.amplitude: {centre:.4} GeV in the centre at start_fm is hotter than any collision"
            ));
        }
        let path = "medium.field.end_temperature_GeV";
        let Some(end) = self.number(path) else {
            return;
        };
        let cooled = amplitude * HBAR_C_GEV_FM / end;
        if end >= hottest {
            self.refuse(
                path,
                format!("{end:?} GeV"),
                format!("below the temperature of the field at start_fm, {hottest:.4} GeV, else there is no medium"),
                "lower end_temperature_GeV or raise amplitude (for vacuum, set effects to [])",
            );
        } else if cooled.is_nan() || cooled > LONGEST_COOLING_FM {
            self.refuse(
                path,
                format!("{end:?} GeV, reached at {cooled:.4} fm"),
                format!("an end temperature that is reached before {LONGEST_COOLING_FM} fm"),
                "raise end_temperature_GeV, or lower amplitude",
            );
        }
    }

    fn field_is_uniform(&self) -> bool {
        matches!(
            self.text("medium.field.kind"),
            Some("brick" | "longitudinal")
        )
    }

    fn uniform_field(&mut self) {
        if !self.field_is_uniform() {
            return;
        }
        let shifted = self.list("medium.field.shift_fm").iter().any(|x| *x != 0.0);
        let turned = self
            .number("medium.field.rotation_rad")
            .is_some_and(|angle| angle != 0.0);
        for (path, is_set) in [
            ("medium.field.rotation_rad", turned),
            ("medium.field.shift_fm", shifted),
        ] {
            if is_set {
                self.warnings.push(format!(
                    "{path}: this field is the same everywhere across the beam, so it makes no difference"
                ));
            }
        }
    }

    fn origin_in_field(&mut self) {
        let path = "medium.origin.kind";
        let Some(field) = self.text("medium.field.kind") else {
            return;
        };
        match self.text(path) {
            Some("field-weighted") if self.field_is_uniform() => self.refuse(
                path,
                format!("\"field-weighted\" with the field \"{field}\", which is the same everywhere across the beam"),
                "\"field-weighted\" with a field \"radial\" or \"grid\"",
                "set kind to \"fixed\", \"overlap\" or \"list\"",
            ),
            Some("collision-density") if field != "grid" => self.refuse(
                path,
                format!("\"collision-density\" with the field \"{field}\""),
                "\"collision-density\" with a field \"grid\", whose file holds the density",
                "set kind to \"fixed\", \"overlap\" or \"list\"",
            ),
            _ => {}
        }
    }

    fn impact_parameter(&mut self) {
        let path = "medium.origin.impact_parameter_fm";
        let origin = self.get("medium.origin");
        let nucleus = origin.and_then(|origin| build::nucleus(Checked(origin)));
        let (Some(nucleus), Some(impact)) = (nucleus, self.number(path)) else {
            return;
        };
        let most = Overlap::largest_impact_fm(&nucleus);
        if impact > most {
            self.refuse(
                path,
                format!("{impact:?} fm"),
                format!("at most {most:.4} fm: beyond, these nuclei do not meet"),
                "lower impact_parameter_fm",
            );
        }
    }

    /// Random streams are keyed by the name of the effect: twice the same would be no two independent channels.
    fn effects(&mut self) {
        let effects = self.list("medium.effects");
        let kind = |effect: &'a Value| effect.get("kind").and_then(Value::as_str);
        for (place, effect) in effects.iter().enumerate() {
            let Some(name) = kind(effect) else { continue };
            if effects[..place]
                .iter()
                .any(|other| kind(other) == Some(name))
            {
                self.refuse(
                    &format!("medium.effects[{place}]"),
                    format!("\"{name}\" a second time"),
                    "each effect once: a second one would count the same emission twice",
                    "remove one of them",
                );
            }
        }
    }

    fn physics_counted_twice(&mut self) {
        let effects = self.list("medium.effects");
        let models = effects
            .iter()
            .filter_map(|effect| model(effect.get("kind")?.as_str()?));
        let models: Vec<_> = models.collect();
        for (place, one) in models.iter().enumerate() {
            for other in models[..place]
                .iter()
                .filter(|other| other.kind != one.kind)
            {
                let shared = |physics: &&Physics| other.describes.contains(physics);
                let shared: Vec<_> = one.describes.iter().filter(shared).collect();
                if shared.is_empty() {
                    continue;
                }
                let words: Vec<_> = shared.into_iter().map(|physics| physics.words()).collect();
                self.warnings.push(format!(
                    "medium.effects: {} and {} both describe {}, which is then counted twice",
                    other.kind,
                    one.kind,
                    words.join(" and ")
                ));
            }
        }
    }

    fn exit_from_no_medium(&mut self) {
        let in_vacuum = self.get("medium").is_some_and(Value::is_null);
        if in_vacuum && self.get("record.medium_exit") == Some(&Value::Bool(true)) {
            self.warnings
                .push("record.medium_exit: there is no medium to leave".to_owned());
        }
    }

    fn medium_that_never_acts(&mut self) {
        if self.list("medium.effects").is_empty() {
            return;
        }
        for path in [
            "medium.transport.coefficient",
            "medium.transport.qhat_GeV2_per_fm",
        ] {
            if self.number(path) == Some(0.0) {
                self.warnings
                    .push(format!("{path}: 0 makes the medium transparent"));
            }
        }
        let energy = self
            .number("source.energy_GeV")
            .or_else(|| Some(self.number("source.sqrt_s_GeV")? / 2.0));
        if let (Some(energy), Some(least)) = (energy, self.number("medium.min_energy_GeV"))
            && energy < least
        {
            self.warnings.push(format!(
                "medium.min_energy_GeV: {least:?} GeV is above the energy of the hard partons, {energy:?} GeV: \
                 the medium never acts"
            ));
        }
    }
}
