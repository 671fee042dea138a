//! qhat of a hot perturbative plasma:
//!
//! qhat_R = C_R (2 zeta(3)/pi) (12 + 3 n_f) alpha_s^2 T^3 max(0, ln(2 E T/m_D^2)),
//! m_D^2 = 4 pi alpha_s T^2 (1 + n_f/6),
//!
//! which is C_R (42 zeta(3)/pi) alpha_s^2 T^3 ln for n_f = 3. The prefactor follows from elastic scattering
//! at small angles: qhat = sum over species of n_s int dq^2 q^2 dsigma/dq^2 with dsigma/dq^2 = 4 pi alpha_s^2 C_R
//! (T_s/d_s)/q^4, densities n_g = 16 zeta(3) T^3/pi^2 and n_q = 9 n_f zeta(3) T^3/pi^2, T_g/d_g = 3/8, T_q/d_q = 1/6,
//! so qhat = (4 alpha_s^2 C_R zeta(3)/pi) (6 + 3 n_f/2) T^3 ln(q_max^2/q_min^2). That is the behaviour at q_T >> T (Arnold
//! & Xiao 2008, arXiv:0810.1026); at q_T << T the soft rate g^2 C_R T m_D^2/(q_T^2 (q_T^2 + m_D^2)) (Aurenche, Gelis &
//! Zaraket 2002, hep-ph/0204146) screens at m_D. The form takes the first one's coefficient all the way from q_min^2 =
//! m_D^2 to q_max^2 = 2 E T. `validation/references/thermal.py` integrates the two rates, joined as published, up to
//! the same q_max: at alpha_s = 0.3, n_f = 3 the form is smaller by 0.6 to 0.8 % at E = 100 GeV, 1.5 to 3 % at 20 GeV,
//! and 6 to 18 % at 5 GeV (T = 0.2 to 0.45 GeV).
//!
//! The coupling is the model's own number; it does not run.

use std::f64::consts::PI;

use crate::numerics::elementary::ln;
use crate::qcd::{C_A, HBAR_C_GEV_FM};

/// Riemann's zeta at 3 (Apery's constant).
const ZETA_3: f64 = 1.202_056_903_159_594_3;
/// Ceilings are lifted by this share, so that no rounding of the logarithm passes them.
const ROUNDING: f64 = 1e-12;

/// A gluon in the plasma.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Thermal {
    /// qhat/(T^3 ln), GeV^2/fm per GeV^3.
    scale: f64,
    /// 2 T^2/m_D^2: the logarithm is that of this times E/T.
    inside: f64,
    /// m_D/T.
    debye: f64,
    /// e^(-1/3): T^3 ln(c/T) is largest at T = c e^(-1/3).
    hottest: f64,
}

/// The Debye mass in GeV at leading order, m_D = T sqrt(4 pi alpha_s (1 + n_f/6)).
pub fn debye_mass_gev(temperature_gev: f64, alpha_s: f64, flavours: u8) -> f64 {
    temperature_gev * (4.0 * PI * alpha_s * (1.0 + f64::from(flavours) / 6.0)).sqrt()
}

impl Thermal {
    /// The plasma with a coupling and a number of massless flavours.
    pub(super) fn new(alpha_s: f64, flavours: u8) -> Thermal {
        let debye = debye_mass_gev(1.0, alpha_s, flavours);
        let particles = 12.0 + 3.0 * f64::from(flavours);
        Thermal {
            scale: C_A * 2.0 * ZETA_3 / PI * particles * alpha_s * alpha_s / HBAR_C_GEV_FM,
            inside: 2.0 / (debye * debye),
            debye,
            hottest: libm::exp(-1.0 / 3.0),
        }
    }

    pub(super) fn debye_mass_gev(&self, temperature_gev: f64) -> f64 {
        self.debye * temperature_gev
    }

    /// 0 where 2 E T <= m_D^2.
    pub(super) fn gluon_qhat_gev2_per_fm(&self, temperature_gev: f64, rest_energy_gev: f64) -> f64 {
        let energy = self.inside * rest_energy_gev;
        if temperature_gev <= 0.0 || energy <= temperature_gev {
            return 0.0;
        }
        let cube = temperature_gev * temperature_gev * temperature_gev;
        self.scale * cube * ln(energy / temperature_gev)
    }

    /// The value grows with E, and with T up to c e^(-1/3), c = 2 E T^2/m_D^2: beyond, its value there bounds it.
    pub(super) fn gluon_qhat_ceiling_gev2_per_fm(
        &self,
        temperature_gev: f64,
        rest_energy_gev: f64,
    ) -> f64 {
        let hottest = self.inside * rest_energy_gev * self.hottest;
        let largest = self.gluon_qhat_gev2_per_fm(temperature_gev.min(hottest), rest_energy_gev);
        largest * (1.0 + ROUNDING)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::qcd::C_F;

    /// Quark values at alpha_s = 0.3, n_f = 3, E = 100 GeV, computed apart from the program to six digits: T, qhat, m_D.
    const CHECK_VALUES: [[f64; 3]; 3] = [
        [0.2, 0.404_613, 0.475_599],
        [0.3, 1.258_58, 0.713_399],
        [0.45, 3.886_62, 1.070_10],
    ];

    #[test]
    fn check_values_of_a_quark() {
        let thermal = Thermal::new(0.3, 3);
        for [temperature, qhat, mass] in CHECK_VALUES {
            let found = thermal.gluon_qhat_gev2_per_fm(temperature, 100.0) * C_F / C_A;
            assert!((found / qhat - 1.0).abs() < 2e-6, "{found} {qhat}");
            let found = thermal.debye_mass_gev(temperature);
            assert!((found / mass - 1.0).abs() < 2e-6, "{found} {mass}");
        }
    }

    #[test]
    fn no_flavours_and_cold_or_soft_ends() {
        let thermal = Thermal::new(0.3, 0);
        // C_A (24 zeta(3)/pi) alpha_s^2 T^3 ln(2 E T/(4 pi alpha_s T^2)).
        let log = (2.0_f64 * 50.0 / (4.0 * PI * 0.3 * 0.25)).ln();
        let expected = 3.0 * 24.0 * ZETA_3 / PI * 0.09 * 0.25_f64.powi(3) * log / HBAR_C_GEV_FM;
        let found = thermal.gluon_qhat_gev2_per_fm(0.25, 50.0);
        assert!((found / expected - 1.0).abs() < 1e-12);
        for (temperature, energy) in [(0.0, 10.0), (0.3, 0.0), (0.3, 0.1), (0.0, 0.0)] {
            assert_eq!(thermal.gluon_qhat_gev2_per_fm(temperature, energy), 0.0);
        }
        // The logarithm opens at E = m_D^2/(2 T).
        let opening = thermal.debye_mass_gev(0.3).powi(2) / 0.6;
        assert_eq!(
            thermal.gluon_qhat_gev2_per_fm(0.3, 0.999_999 * opening),
            0.0
        );
        assert!(thermal.gluon_qhat_gev2_per_fm(0.3, 1.000_001 * opening) > 0.0);
    }
}
