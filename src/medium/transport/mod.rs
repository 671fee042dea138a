//! Models of the transport coefficient qhat, the mean transverse momentum squared that a parton picks up per length.
//!
//! | kind | qhat in the rest frame of the fluid |
//! | --- | --- |
//! | `cubic` | c T^3 (natural units; published coefficients near 4 are usually a quark's) |
//! | `constant` | the same wherever there is a medium |
//! | `thermal` | perturbative hot QCD, see [`thermal`] |
//! | `table` | numbers over temperature and energy, see [`table`] |
//!
//! A number stated for a quark is multiplied by C_A/C_F for a gluon; `thermal` computes the gluon's. Per lab length
//! qhat is multiplied by p.u/E (Baier, Mueller & Schiff 2007, nucl-th/0612068), which `Medium` does. Energies here are
//! the parton's in the rest frame of the fluid, p.u.

pub mod table;
pub mod thermal;

use super::{ColourCharge, TransportKind, TransportSettings};
use crate::qcd::{C_A, C_F, HBAR_C_GEV_FM};
pub use table::{TransportTable, TransportTableError};
use thermal::Thermal;
pub use thermal::debye_mass_gev;

/// Drag by fluctuation and dissipation: dE/dl = qhat/(4 T).
const DRAG_DIVISOR: f64 = 4.0;

/// A gluon's transport coefficient in the rest frame of the fluid.
#[derive(Clone, Debug, PartialEq)]
pub struct Transport {
    kind: Gluon,
    /// Whether the flow factor applies.
    pub flow: bool,
}

#[derive(Clone, Debug, PartialEq)]
enum Gluon {
    /// GeV^2/fm per GeV^3.
    Cubic(f64),
    /// GeV^2/fm.
    Constant(f64),
    Thermal(Thermal),
    Table(Box<Tables>),
}

/// A gluon's table, and what bounds it.
#[derive(Clone, Debug, PartialEq)]
struct Tables {
    value: TransportTable,
    ceiling: TransportTable,
}

impl Transport {
    /// The model of the settings.
    pub fn new(settings: &TransportSettings) -> Transport {
        let to_gluon = match settings.stated_for {
            ColourCharge::Gluon => 1.0,
            ColourCharge::Quark => C_A / C_F,
        };
        let kind = match &settings.kind {
            TransportKind::Cubic { coefficient } => {
                Gluon::Cubic(to_gluon * coefficient / HBAR_C_GEV_FM)
            }
            TransportKind::Constant { qhat_gev2_per_fm } => {
                Gluon::Constant(to_gluon * qhat_gev2_per_fm)
            }
            TransportKind::Thermal { alpha_s, flavours } => {
                Gluon::Thermal(Thermal::new(*alpha_s, *flavours))
            }
            TransportKind::Table(table) => {
                let value = table.scaled(to_gluon);
                let ceiling = value.ceiling();
                Gluon::Table(Box::new(Tables { value, ceiling }))
            }
        };
        Transport {
            kind,
            flow: settings.flow,
        }
    }

    /// qhat of a gluon at a temperature and an energy in the rest frame of the fluid, GeV^2/fm. The energy matters to
    /// `thermal` and `table` alone ([`Transport::depends_on_energy`]).
    #[inline]
    pub fn gluon_qhat_gev2_per_fm(&self, temperature_gev: f64, rest_energy_gev: f64) -> f64 {
        match &self.kind {
            Gluon::Cubic(scale) => scale * temperature_gev * temperature_gev * temperature_gev,
            Gluon::Constant(value) => *value,
            Gluon::Thermal(thermal) => {
                thermal.gluon_qhat_gev2_per_fm(temperature_gev, rest_energy_gev)
            }
            Gluon::Table(tables) => tables.value.at(temperature_gev, rest_energy_gev),
        }
    }

    /// A bound on [`Transport::gluon_qhat_gev2_per_fm`] over all temperatures and energies up to the given ones, GeV^2/fm.
    #[inline]
    pub fn gluon_qhat_ceiling_gev2_per_fm(
        &self,
        temperature_gev: f64,
        rest_energy_gev: f64,
    ) -> f64 {
        match &self.kind {
            Gluon::Cubic(_) | Gluon::Constant(_) => {
                self.gluon_qhat_gev2_per_fm(temperature_gev, rest_energy_gev)
            }
            Gluon::Thermal(thermal) => {
                thermal.gluon_qhat_ceiling_gev2_per_fm(temperature_gev, rest_energy_gev)
            }
            Gluon::Table(tables) => tables.ceiling.at(temperature_gev, rest_energy_gev),
        }
    }

    /// Whether qhat depends on the parton's energy.
    pub fn depends_on_energy(&self) -> bool {
        match &self.kind {
            Gluon::Cubic(_) | Gluon::Constant(_) => false,
            Gluon::Thermal(_) => true,
            Gluon::Table(tables) => tables.value.energy_gev().len() > 1,
        }
    }

    /// A gluon's mean energy loss to the medium per length in the rest frame of the fluid, ehat = qhat/(4 T), GeV/fm; the
    /// temperature must be positive. (Fluctuation and dissipation: qhat/2 is the momentum diffusion per transverse
    /// direction, taken equal along the parton, and E drag = diffusion/(2 T) for a light-like parton; form from common
    /// practice.)
    #[inline]
    pub fn gluon_drag_gev_per_fm(&self, temperature_gev: f64, rest_energy_gev: f64) -> f64 {
        self.gluon_qhat_gev2_per_fm(temperature_gev, rest_energy_gev)
            / (DRAG_DIVISOR * temperature_gev)
    }

    /// The Debye mass at a temperature, GeV, where the model has one (`thermal`).
    pub fn debye_mass_gev(&self, temperature_gev: f64) -> Option<f64> {
        match &self.kind {
            Gluon::Thermal(thermal) => Some(thermal.debye_mass_gev(temperature_gev)),
            _ => None,
        }
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    fn transport(kind: TransportKind, stated_for: ColourCharge) -> Transport {
        Transport::new(&TransportSettings {
            kind,
            stated_for,
            flow: true,
        })
    }

    #[test]
    fn a_quarks_number_is_scaled_to_a_gluon() {
        let cubic = |stated_for| {
            transport(TransportKind::Cubic { coefficient: 4.0 }, stated_for)
                .gluon_qhat_gev2_per_fm(0.3, 10.0)
        };
        let (quark, gluon) = (cubic(ColourCharge::Quark), cubic(ColourCharge::Gluon));
        assert!((quark / gluon - 9.0 / 4.0).abs() < 1e-12);
        // 4 * 0.3^3 / 0.1973269804 by hand.
        assert!((gluon - 0.547_315_0).abs() < 1e-6);
        let table = |stated_for| {
            let table = TransportTable::new(vec![0.1, 0.5], vec![1.0], vec![0.2, 1.0]).unwrap();
            transport(TransportKind::Table(table), stated_for).gluon_qhat_gev2_per_fm(0.3, 10.0)
        };
        assert!((table(ColourCharge::Gluon) - 0.6).abs() < 1e-12);
        assert!((table(ColourCharge::Quark) - 0.6 * 9.0 / 4.0).abs() < 1e-12);
    }

    /// `thermal` computes the gluon's value whatever the settings say a number is for.
    #[test]
    fn thermal_is_not_scaled_again() {
        let thermal = |stated_for| {
            let kind = TransportKind::Thermal {
                alpha_s: 0.3,
                flavours: 3,
            };
            transport(kind, stated_for).gluon_qhat_gev2_per_fm(0.3, 100.0)
        };
        assert_eq!(thermal(ColourCharge::Quark), thermal(ColourCharge::Gluon));
    }

    #[test]
    fn drag_is_qhat_over_four_temperatures() {
        let constant = TransportKind::Constant {
            qhat_gev2_per_fm: 1.2,
        };
        let drag = transport(constant, ColourCharge::Gluon).gluon_drag_gev_per_fm(0.3, 10.0);
        assert!((drag - 1.0).abs() < 1e-12);
    }

    fn rising(start: f64) -> impl Strategy<Value = Vec<f64>> {
        prop::collection::vec(0.01..1.0_f64, 1..6).prop_map(move |steps| {
            let mut next = start;
            let step = |step: f64| {
                next += step;
                next
            };
            steps.into_iter().map(step).collect()
        })
    }

    fn any_kind() -> impl Strategy<Value = TransportKind> {
        let table = (rising(0.0), rising(1.0))
            .prop_flat_map(|(temperatures, energies)| {
                let count = temperatures.len() * energies.len();
                let values = prop::collection::vec(0.0..10.0_f64, count);
                (Just(temperatures), Just(energies), values)
            })
            .prop_map(|(temperatures, energies, values)| {
                TransportKind::Table(TransportTable::new(temperatures, energies, values).unwrap())
            });
        prop_oneof![
            (0.0..10.0_f64).prop_map(|coefficient| TransportKind::Cubic { coefficient }),
            (0.0..10.0_f64)
                .prop_map(|qhat_gev2_per_fm| TransportKind::Constant { qhat_gev2_per_fm }),
            (0.01..0.99_f64, 0..=6_u8)
                .prop_map(|(alpha_s, flavours)| TransportKind::Thermal { alpha_s, flavours }),
            table,
        ]
    }

    proptest! {
        #![proptest_config(ProptestConfig { cases: 4000, failure_persistence: None, ..ProptestConfig::default() })]

        /// Not by a rounding is the ceiling passed at any lower temperature and energy, and it is finite.
        #[test]
        fn the_ceiling_bounds_the_value(
            kind in any_kind(),
            (temperature, cooler) in (0.0..5.0_f64, 0.0..=1.0_f64),
            (energy, softer) in (0.01..8.0_f64, 0.0..=1.0_f64),
        ) {
            let transport = transport(kind, ColourCharge::Quark);
            let ceiling = transport.gluon_qhat_ceiling_gev2_per_fm(temperature, energy);
            let value = transport.gluon_qhat_gev2_per_fm(temperature * cooler, energy * softer);
            prop_assert!(ceiling.is_finite() && value >= 0.0);
            prop_assert!(value <= ceiling, "{} above {}", value, ceiling);
        }

        /// The ceiling is reached somewhere, within what steps of 0.23 % in T can miss: a smaller bound would fail.
        #[test]
        fn the_thermal_ceiling_is_the_largest_value(
            alpha_s in 0.05..0.9_f64,
            temperature in 0.05..5.0_f64,
            energy in 0.05..8.0_f64,
        ) {
            let kind = TransportKind::Thermal { alpha_s, flavours: 3 };
            let transport = transport(kind, ColourCharge::Gluon);
            let ceiling = transport.gluon_qhat_ceiling_gev2_per_fm(temperature, energy);
            let largest = (0..=4000)
                .map(|step| temperature * 10.0_f64.powf(-1e-3 * f64::from(step)))
                .map(|temperature| transport.gluon_qhat_gev2_per_fm(temperature, energy))
                .fold(0.0, f64::max);
            prop_assert!(largest >= ceiling * (1.0 - 1e-5), "{} far below {}", largest, ceiling);
        }
    }
}
