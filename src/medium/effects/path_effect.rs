//! Changes of the momenta of settled partons, from birth to their vertex, or to the medium's end if they are final.

use crate::medium::path::Path;
use crate::qcd::{C_A, C_F, Species};
use crate::random::Stream;

/// The way of a settled parton through the medium.
#[derive(Clone, Copy, Debug)]
pub struct Journey<'a> {
    /// The parton.
    pub species: Species,
    /// The gluon's transport coefficient along its path.
    pub path: &'a Path,
    /// The gluon's energy loss per length qhat/(4 T) along the same path (units GeV/fm in place of GeV^2/fm); empty
    /// where no effect asks for it.
    pub loss: &'a Path,
    /// The variance that a gluon's energy gains per length along the same path, GeV^2/fm.
    pub spread: &'a Path,
    /// How far it flies from birth, fm; infinite for a final parton.
    pub length_fm: f64,
    /// It does not branch any more.
    pub is_final: bool,
    /// No effect takes a parton below this lab energy, GeV.
    pub min_energy_gev: f64,
}

impl Journey<'_> {
    /// C_R/C_A: what turns a gluon's transport coefficient into the parton's.
    pub fn colour_ratio(&self) -> f64 {
        if self.species.is_gluon() {
            1.0
        } else {
            C_F / C_A
        }
    }

    /// int qhat dl of the parton over its way, GeV^2.
    pub fn qhat_integral_gev2(&self) -> f64 {
        self.colour_ratio() * self.path.integral_to(self.length_fm)
    }

    /// The variance of the loss over its way, GeV^2.
    pub fn loss_variance_gev2(&self) -> f64 {
        self.colour_ratio() * self.spread.integral_to(self.length_fm)
    }

    /// int ehat dl of the parton over its way, GeV.
    pub fn mean_loss_gev(&self) -> f64 {
        self.colour_ratio() * self.loss.integral_to(self.length_fm)
    }
}

/// The momentum of a parton in its jet's light-cone frame.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Flight {
    /// x P+, GeV.
    pub plus_gev: f64,
    /// q, GeV.
    pub transverse_gev: [f64; 2],
    /// Virtuality squared, GeV^2.
    pub t_gev2: f64,
}

impl Flight {
    /// q^2, GeV^2.
    pub fn transverse2_gev2(&self) -> f64 {
        let [x, y] = self.transverse_gev;
        x * x + y * y
    }

    /// Lab energy, GeV: half of p+ + p-.
    pub fn energy_gev(&self) -> f64 {
        0.5 * (self.plus_gev + (self.t_gev2 + self.transverse2_gev2()) / self.plus_gev)
    }
}

/// A change of the momentum of a settled parton.
pub trait PathEffect: Send + Sync {
    /// Its name, unique in a run: the key of its random streams and its channel's name in the event file.
    fn name(&self) -> &str;

    /// Changes the momentum over the journey; returns whether the journey lies inside the effect's regime.
    fn act(&self, journey: &Journey, flight: &mut Flight, stream: &mut Stream) -> bool;

    /// Whether it needs the energy loss along the path.
    fn needs_loss(&self) -> bool {
        false
    }
}
