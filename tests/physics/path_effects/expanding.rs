//! Longitudinal expansion: the temperature falls along the way, and away from rapidity 0 the medium flows with the parton.
//!
//! Unbranched primaries from the hard vertex against path_effects.json, at rapidity 0 and along (.6, 0, .8). A ray from the
//! hard vertex stays at its own rapidity, so its fluid has p.u/E = sqrt(1 - nz^2) = .6 = f everywhere and tau = f l. The
//! transverse momentum is an invariant: int qhat_rest dtau, as at rapidity 0. Per lab length the loss is that at rest (the
//! parton loses the same share of its energy in both frames: ehat dl* over f E, dl* = f dl), so 1/f times the one at rapidity
//! 0; its variance in the fluid, qhat_rest/2 dl*, is 1/f^2 times that.
//!
//! Mean square of the kick and variance of the fluctuating loss: pulls at 10^-6, 2 partons x 2 directions x 3 = 12 checks,
//! N = 5000 events; smallest visible bias 7 % (kicks), 10 % (variance). The loss without fluctuations to 10^-4.

use spindrift::event::Status;
use spindrift::medium::effects::EffectSettings;
use spindrift::medium::{FieldKind, TransportKind};
use spindrift::qcd::Species;
use spindrift::source::{Direction, SourceSettings};

use super::super::support::effects::{fluctuating_drag, plain};
use super::super::support::reference::{self, number};
use super::super::support::setup::{Setup, up};
use super::super::support::statistics::{LARGEST_PULL, Mean};
use super::super::support::ways::{along_z, gain};

/// Few of them branch.
fn primaries(
    field: &serde_json::Value,
    parton: Species,
    direction: [f64; 3],
    effect: EffectSettings,
) -> Setup {
    let mut setup = along_z(parton, 100.0, 1.2, 1.0, 1.0, vec![effect]);
    let SourceSettings::Single(single) = &mut setup.source else {
        panic!("a single parton")
    };
    single.direction = Direction::Along(direction);
    let medium = setup.medium.as_mut().expect("a medium");
    medium.field.kind = FieldKind::Longitudinal {
        temperature_gev: number(field, "temperature_GeV"),
        start_fm: number(field, "start_fm"),
    };
    medium.field.end_temperature_gev = number(field, "end_temperature_GeV");
    medium.transport.kind = TransportKind::Cubic {
        coefficient: number(field, "gluon_cubic_coefficient"),
    };
    setup
}

/// What unbranched primaries gained.
fn gains(setup: &Setup) -> Vec<[f64; 4]> {
    let mut gains = Vec::new();
    setup.events(0..5000, |_, rows| {
        if let [_, primary, exchange] = rows {
            assert_eq!(primary.status, Status::Final);
            gains.push(gain(exchange));
        }
    });
    assert!(gains.len() > 4000);
    gains
}

#[test]
fn kicks_and_losses_follow_temperature_and_flow() {
    let table = reference::load("path_effects");
    let field = &table["longitudinal"]["setup"];
    for (parton, name) in [(up(), "quark"), (Species::GLUON, "gluon")] {
        let paths = table["longitudinal"]["paths"].as_array().expect("a list");
        // The whole way at rapidity 0, from the hard vertex.
        let path = paths.iter().find(|path| {
            path["parton"] == name && path["time_fm"] == 40.0 && path["birth_t_fm"] == 0.0
        });
        let path = path.expect("the table has this path");
        for direction in [[1.0, 0.0, 0.0], [0.6, 0.0, 0.8]] {
            let [flow, _, nz] = direction;
            let of = |effect| gains(&primaries(field, parton, direction, effect));
            let mut square = Mean::default();
            for [x, y, z, _] in of(plain("broadening")) {
                // Across the direction of flight; the jet's light-cone frame is along it.
                let along = flow * x + nz * z;
                square.add(x * x + y * y + z * z - along * along);
            }
            let expected_loss = number(path, "mean_loss_GeV") / flow;
            for [x, y, z, energy] in of(plain("drag")) {
                assert!((-energy / expected_loss - 1.0).abs() < 1e-4, "{energy}");
                assert!((x - flow * energy).hypot(z - nz * energy) < 1e-9 && y.abs() < 1e-9);
            }
            let (mut mean, mut variance) = (Mean::default(), Mean::default());
            for [.., energy] in of(fluctuating_drag()) {
                mean.add(-energy);
                variance.add((-energy - expected_loss).powi(2));
            }
            let expected_variance = number(path, "loss_variance_GeV2") / (flow * flow);
            let pulls = [
                square.pull(number(path, "mean_kt_squared_GeV2")),
                mean.pull(expected_loss),
                variance.pull(expected_variance),
            ];
            println!("{name} along {direction:?}: pulls {pulls:.2?}");
            assert!(pulls.iter().all(|pull| pull.abs() < LARGEST_PULL));
            // With p.u/E in the wrong place.
            if flow < 1.0 {
                assert!(
                    square
                        .pull(number(path, "mean_kt_squared_GeV2") / flow)
                        .abs()
                        > LARGEST_PULL
                );
                assert!(variance.pull(expected_variance * flow).abs() > LARGEST_PULL);
                assert!(mean.pull(expected_loss * flow).abs() > LARGEST_PULL);
            }
        }
    }
}
