//! Nuclei as a radius and a diffuseness: the Woods-Saxon profile rho ~ 1/(1 + exp((r - R)/a)).

use super::OriginError;

/// Radii that are taken for nuclei, fm.
pub const RADIUS_FM: [f64; 2] = [0.0, 15.0];
/// Diffusenesses that are taken for nuclei, fm.
pub const DIFFUSENESS_FM: [f64; 2] = [0.05, 2.0];

/// A spherical nucleus.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Nucleus {
    /// Half-density radius R in fm.
    pub radius_fm: f64,
    /// Diffuseness a in fm.
    pub diffuseness_fm: f64,
}

/// Spherical nuclei by name. The numbers are those of charge densities from elastic electron scattering as commonly used
/// in Glauber calculations (De Vries, De Jager & De Vries 1987, At. Data Nucl. Data Tables 36:495; for xenon scaled from a
/// neighbour), quoted from memory.
pub const NAMED: [(&str, Nucleus); 4] = [
    ("Pb208", of(6.62, 0.546)),
    ("Au197", of(6.38, 0.535)),
    ("Xe129", of(5.36, 0.59)),
    ("Cu63", of(4.2, 0.596)),
];

const fn of(radius_fm: f64, diffuseness_fm: f64) -> Nucleus {
    Nucleus {
        radius_fm,
        diffuseness_fm,
    }
}

impl Nucleus {
    /// A nucleus of the table [`NAMED`].
    pub fn named(name: &str) -> Option<Nucleus> {
        let found = NAMED.iter().find(|(other, _)| *other == name);
        found.map(|(_, nucleus)| *nucleus)
    }

    /// Checks radius (0 to 15 fm) and diffuseness (0.05 to 2 fm).
    ///
    /// # Errors
    /// [`OriginError::Nucleus`].
    pub fn check(&self) -> Result<(), OriginError> {
        let numbers = [
            ("radius", self.radius_fm, RADIUS_FM),
            ("diffuseness", self.diffuseness_fm, DIFFUSENESS_FM),
        ];
        for (quantity, value_fm, [least_fm, most_fm]) in numbers {
            if !(least_fm..=most_fm).contains(&value_fm) {
                return Err(OriginError::Nucleus {
                    quantity,
                    value_fm,
                    least_fm,
                    most_fm,
                });
            }
        }
        Ok(())
    }
}
