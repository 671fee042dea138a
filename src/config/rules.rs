//! Rules that tie several keys together, and warnings. Each rule looks at values that are valid by themselves and
//! says nothing where one of them is missing.

use serde_json::Value;

use super::build::{self, Checked};
use super::check::Places;
use super::error::{ConfigError, Problem, Report};
use crate::qcd::coupling::CouplingError;
use crate::qcd::{Coupling, Species};

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
    rules.effects();
    rules.medium_that_never_acts();
    rules.warnings
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
            Some("longitudinal" | "grid")
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
