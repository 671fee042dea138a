//! The perturbative transport coefficient, Debye mass, drag and ceiling against the tables of
//! validation/references/thermal_transport.py and thermal.py, which are written apart from the program and each other.

use serde_json::Value;

use spindrift::medium::transport::{Transport, debye_mass_gev};
use spindrift::medium::{ColourCharge, TransportKind, TransportSettings};

use super::support::reference::{cases, load, number};

/// The tables have twelve digits.
const TOLERANCE: f64 = 1e-11;

fn transport(case: &Value) -> Transport {
    Transport::new(&TransportSettings {
        kind: TransportKind::Thermal {
            alpha_s: number(case, "alpha_s"),
            flavours: number(case, "flavours") as u8,
        },
        stated_for: ColourCharge::Gluon,
        flow: true,
    })
}

fn expect(found: f64, expected: f64, case: &Value) {
    let off = (found - expected).abs();
    assert!(off <= TOLERANCE * expected, "{case}: {found} {expected}");
}

#[test]
fn qhat_debye_mass_and_drag_are_those_of_the_tables() {
    for case in [cases("thermal_transport"), cases("thermal")].concat() {
        let transport = transport(&case);
        let place = [
            number(&case, "temperature_GeV"),
            number(&case, "energy_GeV"),
        ];
        let qhat = transport.gluon_qhat_gev2_per_fm(place[0], place[1]);
        expect(qhat, number(&case, "gluon_qhat_GeV2_per_fm"), &case);
        if !case["gluon_drag_GeV_per_fm"].is_null() {
            let drag = transport.gluon_drag_gev_per_fm(place[0], place[1]);
            expect(drag, number(&case, "gluon_drag_GeV_per_fm"), &case);
        }
        let mass = number(&case, "debye_mass_GeV");
        let (alpha_s, flavours) = (number(&case, "alpha_s"), number(&case, "flavours") as u8);
        expect(debye_mass_gev(place[0], alpha_s, flavours), mass, &case);
        expect(transport.debye_mass_gev(place[0]).unwrap(), mass, &case);
    }
}

/// Beyond the temperature at which qhat is largest the ceiling stays at that largest value.
#[test]
fn the_ceiling_is_the_value_at_the_peak() {
    for peak in load("thermal_transport")["peaks"].as_array().unwrap() {
        let transport = transport(peak);
        let (temperature, energy) = (number(peak, "temperature_GeV"), number(peak, "energy_GeV"));
        let largest = transport.gluon_qhat_gev2_per_fm(temperature, energy);
        for hotter in [1.0, 1.5, 20.0] {
            let ceiling = transport.gluon_qhat_ceiling_gev2_per_fm(hotter * temperature, energy);
            expect(ceiling, largest, peak);
        }
        let ceiling = transport.gluon_qhat_ceiling_gev2_per_fm(0.7 * temperature, energy);
        let value = transport.gluon_qhat_gev2_per_fm(0.7 * temperature, energy);
        expect(ceiling, value, peak);
    }
}
