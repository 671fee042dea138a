//! The perturbative transport coefficient against the table of validation/references/thermal.py.

use spindrift::medium::transport::{Transport, debye_mass_gev};
use spindrift::medium::{ColourCharge, TransportKind, TransportSettings};

use super::support::reference::{cases, number};

/// The table has twelve digits.
const TOLERANCE: f64 = 1e-11;

#[test]
fn qhat_and_debye_mass_are_those_of_the_table() {
    for case in cases("thermal") {
        let (alpha_s, flavours) = (number(&case, "alpha_s"), number(&case, "flavours") as u8);
        let temperature = number(&case, "temperature_GeV");
        let transport = Transport::new(&TransportSettings {
            kind: TransportKind::Thermal { alpha_s, flavours },
            stated_for: ColourCharge::Gluon,
            flow: true,
        });
        let qhat = transport.gluon_qhat_gev2_per_fm(temperature, number(&case, "energy_GeV"));
        let off = qhat / number(&case, "gluon_qhat_GeV2_per_fm") - 1.0;
        assert!(off.abs() < TOLERANCE, "{case}: {off:e}");
        let mass = number(&case, "debye_mass_GeV");
        for found in [
            debye_mass_gev(temperature, alpha_s, flavours),
            transport.debye_mass_gev(temperature).unwrap(),
        ] {
            assert!((found / mass - 1.0).abs() < TOLERANCE, "{case}");
        }
        // The form stays near the integral of the published rates: a forgotten factor of the prefactor would not.
        let ratio = number(&case, "full_over_form");
        assert!((1.0..1.2).contains(&ratio), "{case}");
    }
}
