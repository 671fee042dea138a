//! Models of the transport coefficient qhat, the mean transverse momentum squared that a parton picks up per length.
//!
//! `cubic`: qhat = c T^3 (natural units; published coefficients near 4 are usually a quark's). `constant`: the same
//! wherever there is a medium. A number stated for a quark is multiplied by C_A/C_F for a gluon. Per lab length qhat
//! is multiplied by p.u/E (Baier, Mueller & Schiff 2007, nucl-th/0612068), which `Medium` does.

use super::{ColourCharge, TransportKind, TransportSettings};
use crate::qcd::{C_A, C_F, HBAR_C_GEV_FM};

/// A gluon's transport coefficient in the rest frame of the fluid.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Transport {
    kind: Gluon,
    /// Whether the flow factor applies.
    pub flow: bool,
}

#[derive(Clone, Copy, Debug, PartialEq)]
enum Gluon {
    /// GeV^2/fm per GeV^3.
    Cubic(f64),
    /// GeV^2/fm.
    Constant(f64),
}

impl Transport {
    /// The model of the settings.
    pub fn new(settings: &TransportSettings) -> Transport {
        let to_gluon = match settings.stated_for {
            ColourCharge::Gluon => 1.0,
            ColourCharge::Quark => C_A / C_F,
        };
        let kind = match settings.kind {
            TransportKind::Cubic { coefficient } => {
                Gluon::Cubic(to_gluon * coefficient / HBAR_C_GEV_FM)
            }
            TransportKind::Constant { qhat_gev2_per_fm } => {
                Gluon::Constant(to_gluon * qhat_gev2_per_fm)
            }
        };
        Transport {
            kind,
            flow: settings.flow,
        }
    }

    /// A bound on the transport coefficient at all lower temperatures and energies, GeV^2/fm.
    #[inline]
    pub fn gluon_qhat_ceiling_gev2_per_fm(
        &self,
        temperature_gev: f64,
        rest_energy_gev: f64,
    ) -> f64 {
        self.gluon_qhat_gev2_per_fm(temperature_gev, rest_energy_gev)
    }

    /// qhat of a gluon at a temperature, GeV^2/fm.
    #[inline]
    pub fn gluon_qhat_gev2_per_fm(&self, temperature_gev: f64, _rest_energy_gev: f64) -> f64 {
        match self.kind {
            Gluon::Cubic(scale) => scale * temperature_gev * temperature_gev * temperature_gev,
            Gluon::Constant(value) => value,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_quarks_number_is_scaled_to_a_gluon() {
        let settings = |stated_for| TransportSettings {
            kind: TransportKind::Cubic { coefficient: 4.0 },
            stated_for,
            flow: true,
        };
        let quark =
            Transport::new(&settings(ColourCharge::Quark)).gluon_qhat_gev2_per_fm(0.3, 10.0);
        let gluon =
            Transport::new(&settings(ColourCharge::Gluon)).gluon_qhat_gev2_per_fm(0.3, 10.0);
        assert!((quark / gluon - 9.0 / 4.0).abs() < 1e-12);
        // 4 * 0.3^3 / 0.1973269804 by hand.
        assert!((gluon - 0.547_315_0).abs() < 1e-6);
    }
}
