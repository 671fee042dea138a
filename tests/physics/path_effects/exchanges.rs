//! Exchanges with the medium: order of several effects, rows, and conservation with everything on.
//!
//! Deterministic, on every event of 7 samples (single and pair, quark and gluon, ordering `virtuality` and `angular`,
//! brick and longitudinal expansion, effects in two orders, two seeds) with all effects on together, full and final
//! history: `check_event` finds nothing; final = primary - sum(4) + sum(5), written out here apart from it; both
//! histories hold the same final partons and exchanges. Rows: status 5 if the energy is positive, else 4; `parent` the
//! parton concerned (the hard parton in final history), which stands before; the effects in config order, each acting
//! on what the last one left. Broken copies must be found.

use spindrift::event::{CheckRules, Parton, Status, check_event};
use spindrift::medium::effects::EffectSettings;
use spindrift::medium::{FieldKind, TransportKind};
use spindrift::numerics::vectors::invariant_square;
use spindrift::qcd::Species;
use spindrift::shower::Ordering;

use super::super::support::effects::{enhancement, fluctuating_drag, plain};
use super::super::support::setup::{Setup, brick_with, up};
use super::super::support::ways::{along_z, gain, plus, ways};
use super::FIRST_CHANNEL;

const MOMENTUM_TOLERANCE: f64 = 1e-9;
const EVENTS: i64 = 600;

/// Every effect that composes without weights far from 1, path effects between those on rates.
fn everything() -> Vec<EffectSettings> {
    vec![
        plain("collinear-expansion"),
        fluctuating_drag(),
        enhancement(0.5),
        plain("virtuality-diffusion"),
        plain("resolved-only"),
        plain("broadening"),
    ]
}

fn samples() -> Vec<Setup> {
    let mut reversed = everything();
    reversed.reverse();
    let all = || brick_with(4.0, 1.0, everything());
    let mut longitudinal = all();
    longitudinal.field.kind = FieldKind::Longitudinal {
        temperature_gev: 0.45,
        start_fm: 0.6,
    };
    longitudinal.transport.kind = TransportKind::Cubic { coefficient: 4.0 };
    let mut samples = vec![
        Setup::single(up(), 100.0, 60.0).with_medium(all()),
        Setup::single(Species::GLUON, 100.0, 40.0)
            .with_medium(brick_with(4.0, 1.0, reversed))
            .with_seed(2),
        Setup::pair([up(), up().conjugate()], 160.0, 60.0).with_medium(all()),
        Setup::pair([Species::GLUON; 2], 120.0, 60.0)
            .with_medium(longitudinal.clone())
            .with_seed(3),
        Setup::single(Species::GLUON, 100.0, 100.0).with_medium(longitudinal),
    ];
    for place in [1, 2] {
        let mut angular = samples[place].clone().with_seed(4);
        angular.shower.ordering = Ordering::Angular;
        samples.push(angular);
    }
    samples
}

fn rules(setup: &Setup) -> CheckRules {
    CheckRules {
        full_history: setup.full_history,
        exact_kinematics: true,
        open_colour_lines: setup.generator().source.open_colour_lines() as i32,
        momentum_tolerance: MOMENTUM_TOLERANCE,
    }
}

fn is_exchange(row: &Parton) -> bool {
    matches!(row.status, Status::GivenToMedium | Status::TakenFromMedium)
}

/// What is wrong with the event as a whole and with its exchange rows, written apart from the library's checks.
fn faults(rows: &[Parton], full_history: bool) -> Vec<String> {
    let mut faults = Vec::new();
    let hard: Vec<&Parton> = rows
        .iter()
        .filter(|row| row.status == Status::Hard)
        .collect();
    let energy: f64 = hard.iter().map(|row| row.momentum_gev[3]).sum();
    let mut balance = [0.0; 4];
    for row in rows {
        let (sign, momentum) = match row.status {
            Status::Final => (1.0, row.momentum_gev),
            Status::Hard => (-1.0, row.momentum_gev),
            Status::Branched => continue,
            Status::GivenToMedium | Status::TakenFromMedium => (-1.0, gain(row)),
        };
        for (sum, component) in balance.iter_mut().zip(momentum) {
            *sum += sign * component;
        }
    }
    if let [only] = hard[..] {
        // A single parton conserves energy and what lies across its direction.
        let axis = only.momentum_gev.map(|component| component / energy);
        let along: f64 = (0..3).map(|i| balance[i] * axis[i]).sum();
        (0..3).for_each(|i| balance[i] -= along * axis[i]);
    }
    if balance
        .iter()
        .any(|sum| sum.abs() > MOMENTUM_TOLERANCE * energy)
    {
        faults.push(format!(
            "final = primary - given + taken fails by {balance:?}"
        ));
    }
    let mut last: Option<(i32, u8)> = None;
    for (place, row) in rows.iter().enumerate() {
        if !is_exchange(row) {
            last = None;
            continue;
        }
        let mut wrong = |good: bool, what: &str| {
            if !good {
                faults.push(format!("row {place}: {what}"));
            }
        };
        let e = row.momentum_gev[3];
        wrong(e >= 0.0, "negative energy");
        wrong(
            row.status == Status::GivenToMedium || e > 0.0,
            "nothing taken",
        );
        wrong(
            row.pdg == 0 && row.colour == 0 && row.anticolour == 0,
            "a parton",
        );
        wrong(row.channel >= FIRST_CHANNEL, "no effect");
        let t = f64::from(row.virtuality_squared_gev2);
        let square = invariant_square(row.momentum_gev);
        let momentum2: f64 = row.momentum_gev.iter().map(|p| p * p).sum();
        wrong(
            (square - t).abs() < 1e-6 * momentum2 + 1e-30,
            "invariant square",
        );
        let parent = &rows[row.parent as usize];
        wrong((row.parent as usize) < place, "parent behind");
        let expected = if full_history {
            matches!(parent.status, Status::Final | Status::Branched)
        } else {
            parent.status == Status::Hard
        };
        wrong(expected, "parent");
        if full_history {
            wrong(
                row.birth_fm == parent.birth_fm,
                "born elsewhere than its parton",
            );
            if let Some((same, channel)) = last.filter(|(same, _)| *same == row.parent) {
                wrong(
                    channel < row.channel && same == row.parent,
                    "not in config order",
                );
            }
        }
        last = Some((row.parent, row.channel));
    }
    faults
}

#[test]
fn everything_on_balances() {
    for mut setup in samples() {
        let ordering = setup.shower.ordering;
        let mut finals = [Vec::new(), Vec::new()];
        let mut exchanged = [Vec::new(), Vec::new()];
        let mut counts = [0; 2];
        for full_history in [true, false] {
            setup.full_history = full_history;
            let rules = rules(&setup);
            setup.events(0..EVENTS, |event, rows| {
                let found = check_event(rows, &rules);
                assert!(found.is_empty(), "event {}: {found:?}", event.id);
                let found = faults(rows, full_history);
                assert!(found.is_empty(), "event {}: {found:?}", event.id);
                for row in rows {
                    let bits = row.momentum_gev.map(f64::to_bits);
                    match row.status {
                        Status::Final => finals[full_history as usize].push(bits),
                        Status::GivenToMedium | Status::TakenFromMedium => {
                            exchanged[full_history as usize].push((bits, row.status, row.channel));
                            counts[(row.status == Status::TakenFromMedium) as usize] += 1;
                        }
                        _ => {}
                    }
                }
            });
        }
        println!("{ordering:?} {:?}: {counts:?} given, taken", setup.source);
        assert!(counts.iter().all(|count| *count > 1000));
        assert!(finals[0] == finals[1] && exchanged[0] == exchanged[1]);
    }
}

/// Each effect acts on what the one before it left: step by step along the rows, broadening keeps plus momentum and
/// virtuality, drag virtuality and q/p+, diffusion plus and transverse momentum; energies are on their shells.
#[test]
fn effects_act_in_config_order() {
    let kinds = ["broadening", "drag", "virtuality-diffusion"];
    let orders = [[0, 1, 2], [2, 1, 0], [1, 2, 0], [1, 0, 2]];
    for order in orders {
        let names = order.map(|place| kinds[place]);
        let effects = names.map(|name| match name {
            "drag" => fluctuating_drag(),
            other => plain(other),
        });
        let setup = along_z(Species::GLUON, 100.0, 30.0, 3.0, 1.5, effects.to_vec());
        let mut steps = [0; 3];
        setup.events(0..1000, |_, rows| {
            for way in ways(rows) {
                let channels: Vec<u8> = way.gains.iter().map(|(channel, _)| *channel).collect();
                assert!(channels.is_sorted_by(|a, b| a < b), "{channels:?}");
                for (place, (channel, _)) in way.gains.iter().enumerate() {
                    let effect = usize::from(*channel - FIRST_CHANNEL);
                    steps[effect] += 1;
                    let (before, after) = (way.before(place), way.before(place + 1));
                    if let Some(fault) = step_fault(names[effect], before, after) {
                        panic!("{names:?}, {}: {fault}", names[effect]);
                    }
                    // The other laws must not hold as well.
                    let others = kinds.iter().filter(|kind| **kind != names[effect]);
                    let wide = before[0].hypot(before[1]) > 0.1;
                    for other in others.filter(|_| wide) {
                        assert!(step_fault(other, before, after).is_some(), "{other}");
                    }
                }
            }
        });
        println!("{names:?}: {steps:?} steps");
        assert!(steps.iter().all(|count| *count > 1000));
    }
}

fn step_fault(kind: &str, before: [f64; 4], after: [f64; 4]) -> Option<String> {
    let loose = 1e-10 * (before[3] + after[3]);
    let mass = |p: [f64; 4]| invariant_square(p);
    let off_mass = (mass(after) - mass(before)).abs();
    let off_plus = (plus(after) - plus(before)).abs();
    let off_q = (after[0] - before[0]).hypot(after[1] - before[1]);
    let turn = [0, 1].map(|i| after[i] / plus(after) - before[i] / plus(before));
    let off_turn = turn[0].hypot(turn[1]);
    let fine = match kind {
        "broadening" => off_plus < loose && off_mass < 1e-8 * before[3].max(after[3]),
        "drag" => off_turn < 1e-9 && off_mass < 1e-8 * before[3].max(after[3]),
        _ => off_plus < loose && off_q < loose,
    };
    (!fine).then(|| {
        format!("plus {off_plus:.1e}, q {off_q:.1e}, turn {off_turn:.1e}, mass {off_mass:.1e}")
    })
}

#[test]
fn broken_exchanges_are_found() {
    for full_history in [true, false] {
        for mut setup in samples().into_iter().take(3) {
            setup.full_history = full_history;
            let rules = rules(&setup);
            let mut sound = Vec::new();
            setup.events(5..6, |_, rows| sound = rows.to_vec());
            assert!(check_event(&sound, &rules).is_empty());
            let largest = |status| {
                let rows = sound
                    .iter()
                    .enumerate()
                    .filter(|(_, row)| row.status == status);
                let energy = |row: &Parton| row.momentum_gev[3];
                rows.max_by(|a, b| energy(a.1).total_cmp(&energy(b.1)))
                    .map(|(place, _)| place)
            };
            for status in [Status::GivenToMedium, Status::TakenFromMedium] {
                let place = largest(status).expect("an exchange");
                let other = match status {
                    Status::GivenToMedium => Status::TakenFromMedium,
                    _ => Status::GivenToMedium,
                };
                type Break<'a> = &'a dyn Fn(&mut Vec<Parton>);
                let breaks: [(&str, Break); 4] = [
                    ("status", &|rows| rows[place].status = other),
                    ("sign", &|rows| {
                        rows[place].momentum_gev = rows[place].momentum_gev.map(|p| -p);
                    }),
                    ("size", &|rows| rows[place].momentum_gev[1] += 1e-5),
                    ("forgotten", &|rows| {
                        rows[place].momentum_gev = [0.0; 4];
                    }),
                ];
                for (what, change) in breaks {
                    let mut broken = sound.clone();
                    change(&mut broken);
                    assert!(
                        !check_event(&broken, &rules).is_empty(),
                        "{what}, {status:?}"
                    );
                    assert!(
                        !faults(&broken, full_history).is_empty(),
                        "{what}, {status:?}"
                    );
                }
            }
        }
    }
}
