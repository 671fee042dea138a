//! Units that a field file may use, with their factors.

use super::error::FieldProblem;
use crate::qcd::HBAR_C_GEV_FM;

/// GeV in an MeV.
const MEV_GEV: f64 = 1e-3;

/// A kind of quantity with the units understood for it.
pub(in crate::files) struct Quantity {
    /// Spellings with the factor to this program's unit.
    spellings: &'static [(&'static str, f64)],
    /// Whether `units` may be absent.
    optional: bool,
}

/// Temperature, to GeV.
pub(in crate::files) const TEMPERATURE: Quantity = Quantity {
    spellings: &[
        ("GeV", 1.0),
        ("MeV", MEV_GEV),
        ("1/fm", HBAR_C_GEV_FM),
        ("fm^-1", HBAR_C_GEV_FM),
        ("fm-1", HBAR_C_GEV_FM),
        ("fm**-1", HBAR_C_GEV_FM),
    ],
    optional: false,
};

/// Lengths and times, to fm.
pub(in crate::files) const LENGTH: Quantity = Quantity {
    spellings: &[("fm", 1.0), ("fm/c", 1.0)],
    optional: false,
};

/// Rapidity, flow components: no dimension.
pub(in crate::files) const NUMBER: Quantity = Quantity {
    spellings: &[
        ("1", 1.0),
        ("", 1.0),
        ("dimensionless", 1.0),
        ("none", 1.0),
        ("c", 1.0),
    ],
    optional: true,
};

/// Density of collision points in the transverse plane, to fm^-2.
pub(in crate::files) const AREA_DENSITY: Quantity = Quantity {
    spellings: &[
        ("1/fm^2", 1.0),
        ("fm^-2", 1.0),
        ("fm-2", 1.0),
        ("1/fm2", 1.0),
        ("fm**-2", 1.0),
        ("1/fm**2", 1.0),
    ],
    optional: false,
};

/// Energy, to GeV.
pub(in crate::files) const ENERGY: Quantity = Quantity {
    spellings: &[("GeV", 1.0), ("MeV", MEV_GEV)],
    optional: false,
};

/// Transport coefficient, to GeV^2/fm.
pub(in crate::files) const TRANSPORT: Quantity = Quantity {
    spellings: &[
        ("GeV^2/fm", 1.0),
        ("GeV2/fm", 1.0),
        ("GeV**2/fm", 1.0),
        ("GeV^2 fm^-1", 1.0),
        ("GeV2 fm-1", 1.0),
    ],
    optional: false,
};

impl Quantity {
    /// The factor from the units found to this program's.
    pub(in crate::files) fn factor(
        &self,
        name: &str,
        found: Option<&str>,
    ) -> Result<f64, FieldProblem> {
        let Some(found) = found else {
            return if self.optional {
                Ok(1.0)
            } else {
                Err(self.refuse(name, "are missing".into()))
            };
        };
        let plain = found.trim();
        self.spellings
            .iter()
            .find(|(spelling, _)| *spelling == plain)
            .map(|(_, factor)| *factor)
            .ok_or_else(|| self.refuse(name, format!("\"{plain}\" are not understood")))
    }

    fn refuse(&self, name: &str, found: String) -> FieldProblem {
        let spellings: Vec<_> = self
            .spellings
            .iter()
            .filter(|(spelling, _)| !spelling.is_empty())
            .map(|(spelling, _)| format!("\"{spelling}\""))
            .collect();
        FieldProblem::Units {
            name: name.to_owned(),
            found,
            allowed: spellings.join(", "),
        }
    }
}
