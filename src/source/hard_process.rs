//! A hard process as the shower takes it: one or two on-shell partons and how they share momentum.

use crate::qcd::{FIRST_COLOUR_TAG, Species};

/// An on-shell hard parton.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct HardParton {
    /// What it is.
    pub species: Species,
    /// Energy in GeV.
    pub energy_gev: f64,
    /// Unit vector.
    pub direction: [f64; 3],
    /// Colour and anticolour tag, 0 for none.
    pub colours: [i32; 2],
}

/// How the primaries conserve momentum when they go off shell.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Topology {
    /// One parton: it keeps energy and direction, its three-momentum shrinks to sqrt(E^2 - t).
    Single,
    /// Two partons back to back in their rest frame.
    Pair {
        /// Invariant mass in GeV.
        sqrt_s_gev: f64,
    },
}

/// A hard process.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct HardProcess {
    partons: [HardParton; 2],
    /// How its partons share momentum.
    pub topology: Topology,
    /// Largest virtuality (not squared) of each parton, GeV.
    pub start_virtuality_gev: f64,
    /// The hard scale for the record, GeV.
    pub hard_scale_gev: f64,
    /// Weight of the source.
    pub weight: f64,
}

impl HardProcess {
    /// One parton without a recoiler: its colour lines stay open.
    pub fn single(
        species: Species,
        energy_gev: f64,
        direction: [f64; 3],
        start_virtuality_gev: f64,
    ) -> HardProcess {
        let colours = match () {
            () if species.is_gluon() => [FIRST_COLOUR_TAG, FIRST_COLOUR_TAG + 1],
            () if species.is_antiquark() => [0, FIRST_COLOUR_TAG],
            () => [FIRST_COLOUR_TAG, 0],
        };
        let parton = HardParton {
            species,
            energy_gev,
            direction,
            colours,
        };
        HardProcess {
            partons: [parton; 2],
            topology: Topology::Single,
            start_virtuality_gev,
            hard_scale_gev: start_virtuality_gev,
            weight: 1.0,
        }
    }

    /// Two partons back to back, a colour singlet: quark and antiquark, or two gluons.
    pub fn pair(
        species: [Species; 2],
        sqrt_s_gev: f64,
        direction: [f64; 3],
        start_virtuality_gev: f64,
    ) -> HardProcess {
        let (one, two) = (FIRST_COLOUR_TAG, FIRST_COLOUR_TAG + 1);
        let colours = match () {
            () if species[0].is_gluon() => [[one, two], [two, one]],
            () if species[0].is_antiquark() => [[0, one], [one, 0]],
            () => [[one, 0], [0, one]],
        };
        let parton = |which: usize, direction| HardParton {
            species: species[which],
            energy_gev: 0.5 * sqrt_s_gev,
            direction,
            colours: colours[which],
        };
        HardProcess {
            partons: [
                parton(0, direction),
                parton(1, direction.map(|component| -component)),
            ],
            topology: Topology::Pair { sqrt_s_gev },
            start_virtuality_gev,
            hard_scale_gev: start_virtuality_gev,
            weight: 1.0,
        }
    }

    /// The hard partons.
    #[inline]
    pub fn partons(&self) -> &[HardParton] {
        match self.topology {
            Topology::Single => &self.partons[..1],
            Topology::Pair { .. } => &self.partons,
        }
    }

    /// The first colour tag that is not in use.
    pub fn next_colour(&self) -> i32 {
        let largest = self
            .partons()
            .iter()
            .flat_map(|parton| parton.colours)
            .max();
        largest.map_or(FIRST_COLOUR_TAG, |tag| tag + 1)
    }

    /// P+ = E + |p| in GeV of a primary once both virtualities squared (GeV^2) are settled.
    pub fn plus_momentum_gev(&self, which: usize, virtualities_gev2: [f64; 2]) -> f64 {
        let t = virtualities_gev2[which];
        let energy = match self.topology {
            Topology::Single => self.partons[which].energy_gev,
            // Two-body decay at rest: E_i = (s + t_i - t_j)/(2 sqrt s).
            Topology::Pair { sqrt_s_gev } => {
                0.5 * (sqrt_s_gev + (t - virtualities_gev2[1 - which]) / sqrt_s_gev)
            }
        };
        // Rounding can push a parton at rest below zero by a bit.
        energy + (energy * energy - t).max(0.0).sqrt()
    }
}
