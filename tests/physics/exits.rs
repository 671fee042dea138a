//! Proves: the exit that is recorded for a final parton is the last hot point of its path, and recording it changes
//! nothing else.
//!
//! Deterministic. Fields of every kind: 2000 rays each, against the samples that the engine's paths are made of. Whole
//! events: 300 of each set-up, every final parton against a closed form worked out here from its row (the longitudinal
//! solution ends at tau_0 (T_0/T_end)^3, a brick at its length); tolerances are those of bisection (10^-6 of the
//! distance) and of single precision.

use std::sync::Arc;

use spindrift::event::{CheckRules, EventBlock, MediumExit, Parton, Status, check_exits};
use spindrift::medium::effects::collinear_expansion::PhaseSettings;
use spindrift::medium::exit::exit;
use spindrift::medium::field::{Brick, Longitudinal, TemperatureField};
use spindrift::medium::{FieldKind, MediumSettings};
use spindrift::qcd::Species;
use spindrift::random::{Key, Purpose};
use spindrift::run::EventGenerator;
use spindrift::run::exits::MediumExits;

use super::fields::{END_TEMPERATURE_GEV, all_fields, random_ray};
use super::support::setup::{Setup, brick};

const RAYS: u64 = 2000;
const EVENTS: i64 = 300;
/// Of bisection, relative to the distance from birth.
const CLOSE: f64 = 1e-6;
/// A few roundings of single precision, relative.
const SINGLE: f64 = 4.0 * f32::EPSILON as f64;

/// An exit lies between the last hot sample of a path and the next one, where the fluid is hot by both of the field's
/// tales; without a hot sample there is none.
#[test]
fn exits_are_the_last_hot_points_of_paths() {
    for (name, field) in all_fields() {
        let mut stream = Key::event(11, 3).stream(Purpose::SOURCE);
        let mut samples = Vec::new();
        let (mut left, mut hotter) = (0, 0);
        for _ in 0..RAYS {
            let ray = random_ray(&mut stream);
            let found = exit(&*field, &ray, END_TEMPERATURE_GEV);
            let Some(stretch) = field.stretch(&ray, END_TEMPERATURE_GEV) else {
                assert_eq!(found, None);
                continue;
            };
            let count = 2 * stretch.cells + 1;
            let step = (stretch.last_fm - stretch.first_fm) / (count - 1) as f64;
            field.sample(&ray, stretch.first_fm, step, count, &mut samples);
            // A sample at the very end may be hot or not by rounding.
            let hot = |sample: &usize| samples[*sample].temperature_gev >= END_TEMPERATURE_GEV;
            let last_hot = (0..count).rev().find(hot);
            let Some(found) = found else {
                assert!(last_hot.is_none(), "{name}: {ray:?}");
                continue;
            };
            left += 1;
            let l = found.point_fm[0] - ray.birth_fm[0];
            let from = stretch.first_fm + last_hot.unwrap_or(0) as f64 * step;
            let slack = CLOSE * stretch.last_fm + f64::EPSILON * found.point_fm[0].abs();
            assert!(
                l >= from - slack && l <= (from + step).min(stretch.last_fm) + slack,
                "{name}: {l} after {from}, step {step}, {ray:?}"
            );
            let temperature = found.fluid.temperature_gev;
            assert!(temperature >= END_TEMPERATURE_GEV, "{name}: {ray:?}");
            assert_eq!(found.fluid, field.fluid(found.point_fm));
            // At an edge of the data a rounding decides, so a hair before it.
            let inside = (l - 1e-3 * slack).max(stretch.first_fm);
            let local = field.local(&ray, inside).temperature_gev;
            assert!(
                (local / temperature - 1.0).abs() < CLOSE,
                "{name}: {local} for {temperature} at {l}, {ray:?} {stretch:?}"
            );
            hotter += u32::from(temperature > END_TEMPERATURE_GEV * (1.0 + 1e-4));
            // A little further on it is cold, unless the way leaves the stretch there.
            let beyond = l + 4.0 * slack;
            if beyond < stretch.last_fm {
                let next = field.fluid(ray.at(beyond)).temperature_gev;
                assert!(
                    next < END_TEMPERATURE_GEV,
                    "{name}: {next} at {beyond}, {ray:?}"
                );
            }
        }
        println!("{name}: {left} exits, {hotter} of them hotter than the end temperature");
        assert!(left > RAYS / 20, "{name}: {left} exits");
    }
}

const START_TEMPERATURE_GEV: f64 = 0.3;
const START_FM: f64 = 0.6;
const BRICK_FM: f64 = 4.0;

fn longitudinal() -> MediumSettings {
    let mut settings = brick(BRICK_FM, 1.0, PhaseSettings::Interference);
    settings.field.kind = FieldKind::Longitudinal {
        temperature_gev: START_TEMPERATURE_GEV,
        start_fm: START_FM,
    };
    settings
}

fn longitudinal_field() -> Arc<dyn TemperatureField> {
    Arc::new(Longitudinal::new(START_TEMPERATURE_GEV, START_FM))
}

fn brick_field() -> Arc<dyn TemperatureField> {
    Arc::new(Brick::new(START_TEMPERATURE_GEV, BRICK_FM))
}

fn gluons() -> Setup {
    let mut setup = Setup::pair([Species::GLUON; 2], 200.0, 100.0);
    // Late partons too, and some along the beam.
    setup.shower.virtuality_cutoff_gev = 0.7;
    setup
}

/// The events of a set-up, with the exits from `exits`; `own` is the field that each event brings along.
fn events(
    setup: &Setup,
    exits: Option<MediumExits>,
    own: Option<Arc<dyn TemperatureField>>,
) -> EventBlock {
    let mut generator = setup.generator();
    generator.exits = exits;
    let mut worker = generator.worker();
    worker.walker.field = own;
    let mut block = EventBlock::default();
    for id in 0..EVENTS {
        generator.generate(&mut worker, id, &mut block).unwrap();
    }
    block
}

fn exits_from(field: Option<Arc<dyn TemperatureField>>) -> Option<MediumExits> {
    Some(MediumExits {
        field,
        end_temperature_gev: END_TEMPERATURE_GEV,
    })
}

/// Distance from birth at which a final parton reaches the end of the longitudinal solution, `None` where it is born
/// later.
fn longitudinal_end_fm(row: &Parton) -> Option<f64> {
    let last_tau = START_FM * (START_TEMPERATURE_GEV / END_TEMPERATURE_GEV).powi(3);
    let [t, _, _, z] = row.birth_fm.map(f64::from);
    let nz = cosine(row);
    // (t + l)^2 - (z + nz l)^2 = tau^2.
    let (a, b, c) = (
        1.0 - nz * nz,
        t - nz * z,
        t * t - z * z - last_tau * last_tau,
    );
    (c < 0.0).then(|| -c / (b + (b * b - a * c).sqrt()))
}

fn brick_end_fm(row: &Parton) -> Option<f64> {
    let left = BRICK_FM - f64::from(row.birth_fm[0]);
    (left > 0.0).then_some(left)
}

fn size(row: &Parton) -> f64 {
    let [px, py, pz, _] = row.momentum_gev;
    (px * px + py * py + pz * pz).sqrt()
}

fn cosine(row: &Parton) -> f64 {
    row.momentum_gev[2] / size(row)
}

/// Every final parton has the exit that a closed form says and every other row none; returns how many have one, how
/// many of these lie below the least energy that the medium acts on, and how many final partons have none.
fn compare(block: &EventBlock, end_fm: impl Fn(&Parton) -> Option<f64>) -> [usize; 3] {
    let mut counts = [0; 3];
    assert_eq!(block.exits.len(), block.partons.len());
    for (row, exit) in block.partons.iter().zip(&block.exits) {
        let expected = end_fm(row).filter(|_| row.status == Status::Final);
        let Some(l) = expected else {
            assert_eq!(*exit, MediumExit::NONE, "{row:?}");
            counts[2] += usize::from(row.status == Status::Final);
            continue;
        };
        counts[0] += 1;
        counts[1] += usize::from(row.momentum_gev[3] < 2.0);
        let [px, py, pz, _] = row.momentum_gev;
        let direction = [1.0, px / size(row), py / size(row), pz / size(row)];
        for ((birth, direction), found) in row.birth_fm.iter().zip(direction).zip(exit.place_fm) {
            let place = f64::from(*birth) + direction * l;
            let found = f64::from(found);
            let allowed = 2.0 * CLOSE * l + SINGLE * place.abs();
            assert!(
                (found - place).abs() <= allowed,
                "{found} for {place}: {row:?}"
            );
        }
    }
    counts
}

/// The medium of the shower, the medium of a vacuum twin, and the field that an event brings along.
#[test]
fn exits_of_events_are_those_of_closed_forms() {
    let mut vacuum = longitudinal();
    vacuum.effects.clear();
    for (setup, exits, own) in [
        (
            gluons().with_medium(longitudinal()),
            longitudinal_field(),
            None,
        ),
        (gluons().with_medium(vacuum), longitudinal_field(), None),
        (
            gluons().with_medium(longitudinal()),
            brick_field(),
            Some(longitudinal_field()),
        ),
    ] {
        let block = events(&setup, exits_from(Some(exits)), own);
        let counts = compare(&block, longitudinal_end_fm);
        println!("exits, those below 2 GeV, final partons without: {counts:?}");
        assert!(counts.iter().all(|count| *count > 30), "{counts:?}");
        let expected = |row: &Parton, exit: &MediumExit| {
            let [t, .., z] = exit.place_fm.map(f64::from);
            let tau = (t * t - z * z).sqrt();
            let temperature = f64::from(exit.temperature_gev);
            let uz = f64::from(exit.velocity[2]);
            assert_eq!(exit.velocity[..2], [0.0; 2]);
            assert!((temperature / END_TEMPERATURE_GEV - 1.0).abs() < 1e-5);
            // tau is the root of a difference, which the file's single precision rounds.
            let allowed = 1e-5 + SINGLE * (t / tau).powi(2) * uz.abs();
            assert!(
                (uz - z / tau).abs() <= allowed,
                "{uz} for {}: {row:?}",
                z / tau
            );
        };
        for (row, exit) in block.partons.iter().zip(&block.exits) {
            if !exit.is_none() {
                expected(row, exit);
            }
        }
    }
    let brick = gluons().with_medium(brick(BRICK_FM, 1.0, PhaseSettings::Interference));
    let counts = compare(
        &events(&brick, exits_from(Some(brick_field())), None),
        brick_end_fm,
    );
    assert!(counts.iter().all(|count| *count > 30), "{counts:?}");
}

#[test]
fn there_is_no_exit_from_the_vacuum() {
    let block = events(&gluons(), exits_from(None), None);
    assert_eq!(compare(&block, |_| None)[0], 0);
}

/// With and without exits: the same events to the last bit, and no exits where none are asked for.
#[test]
fn recording_exits_changes_nothing_else() {
    let setup = gluons().with_medium(longitudinal());
    let without = events(&setup, None, None);
    let mut with = events(&setup, exits_from(Some(longitudinal_field())), None);
    assert!(without.exits.is_empty() && !with.exits.is_empty());
    with.exits.clear();
    assert_eq!(with, without);
}

/// The rules of the audit hold for real events, and fail for a parton's neighbour.
#[test]
fn exits_lie_on_the_paths_of_their_partons() {
    let setup = gluons().with_medium(longitudinal());
    let block = events(&setup, exits_from(Some(longitudinal_field())), None);
    let rules = CheckRules {
        full_history: true,
        exact_kinematics: true,
        open_colour_lines: 0,
        momentum_tolerance: CheckRules::tolerance_of_bits(None),
    };
    let faults = |turn: usize| {
        let mut found = Vec::new();
        for (event, rows, exits) in block.iter_with_exits() {
            let mut exits = exits.to_vec();
            exits.rotate_left(turn);
            check_exits(event, rows, &exits, &rules, &mut found);
        }
        found
    };
    assert_eq!(faults(0), []);
    assert!(faults(1).len() > EVENTS as usize);
}
