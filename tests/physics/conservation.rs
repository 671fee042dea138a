//! Proves: events balance, at every vertex and as a whole, and stand in space and time as the rules say.
//!
//! Deterministic, on every row of 2000 events of each of 14 samples (single and pair; quark, antiquark, gluon; vacuum
//! and medium, three phase factors; cutoffs 1 and 2 GeV): four-momentum at each vertex and of the event to 10^-9 of
//! the event's energy; invariant masses; fractions; light-cone fractions against momenta; k_T^2 >= 0 and M1 + M2 <=
//! sqrt(s); daughters born where the parent ended, on its world line; colour lines closed. Positions, t and fractions
//! are kept in f32, so they are compared within a few of its roundings. A broken copy of an event must fail each check.
//!
//! Statistical: lifetimes of vacuum branchings are exponential with mean 2E/t (Kolmogorov-Smirnov, 4 x 10^5
//! and more lifetimes), azimuths are uniform and independent of the parent's (5 x 10^5); 4 checks at 10^-6; smallest
//! visible bias 0.5 % of a cumulative distribution.

use std::collections::HashMap;

use spindrift::event::{CheckRules, Parton, Status, check_event};
use spindrift::medium::effects::collinear_expansion::PhaseSettings;
use spindrift::numerics::vectors::invariant_square;
use spindrift::qcd::{HBAR_C_GEV_FM, Species};
use spindrift::run::EventGenerator;
use spindrift::shower::Lifetime;
use spindrift::source::{Direction, SourceSettings};

use super::support::setup::{Setup, brick, up};
use super::support::statistics::{LARGEST_DISTANCE, distance};

/// Largest imbalance of a four-momentum over the energy of the event.
const MOMENTUM_TOLERANCE: f64 = 1e-9;
/// A few roundings of single precision, relative.
const SINGLE: f64 = 4.0 * f32::EPSILON as f64;

fn samples() -> Vec<Setup> {
    let phases = [
        PhaseSettings::Interference,
        PhaseSettings::Rescattering { window: 1.0 },
        PhaseSettings::SoftGradient,
    ];
    let mut samples = Vec::new();
    for parton in [up(), up().conjugate(), Species::GLUON] {
        samples.push(Setup::single(parton, 100.0, 100.0));
        samples.push(Setup::pair([parton, parton.conjugate()], 150.0, 75.0));
        samples.push(
            Setup::pair([parton, parton.conjugate()], 100.0, 30.0)
                .with_medium(brick(4.0, 2.0, phases[0])),
        );
    }
    for phase in phases {
        samples
            .push(Setup::single(Species::GLUON, 100.0, 60.0).with_medium(brick(3.0, 1.0, phase)));
    }
    let mut coarse = Setup::single(Species::quark(4), 60.0, 50.0);
    coarse.shower.virtuality_cutoff_gev = 2.0;
    samples.push(coarse.clone());
    coarse.shower.lifetime = Lifetime::Mean;
    samples.push(coarse);
    samples
}

fn open_lines(setup: &Setup) -> i32 {
    setup.generator().source.open_colour_lines() as i32
}

/// Everything that is wrong with an event; written apart from `event::checks`.
fn faults(rows: &[Parton], open_lines: i32) -> Vec<String> {
    let mut faults = Vec::new();
    let mut wrong = |good: bool, what: String| {
        if !good {
            faults.push(what);
        }
    };
    let hard: Vec<usize> = (0..rows.len())
        .filter(|row| rows[*row].status == Status::Hard)
        .collect();
    let energy: f64 = hard.iter().map(|row| rows[*row].momentum_gev[3]).sum();
    let children = |parent: usize| -> Vec<usize> {
        (0..rows.len())
            .filter(|row| rows[*row].parent == parent as i32)
            .collect()
    };
    for (place, row) in rows.iter().enumerate() {
        let t = f64::from(row.virtuality_squared_gev2);
        let square = invariant_square(row.momentum_gev);
        let e = row.momentum_gev[3];
        wrong(
            (square - t).abs() < SINGLE * t + 1e-12 * e * e,
            format!("row {place}: p^2 {square}, t {t}"),
        );
        wrong(
            row.status == Status::Branched || t == 0.0,
            format!("row {place}: off shell at the end"),
        );
        let daughters = children(place);
        match (row.status, daughters.as_slice()) {
            (Status::Hard, [_]) | (Status::Final, []) => {}
            (Status::Branched, [first, second]) => {
                for fault in vertex_faults(row, &rows[*first], &rows[*second], energy) {
                    wrong(false, format!("row {place}: {fault}"));
                }
            }
            (status, daughters) => {
                wrong(false, format!("row {place}: {status:?} with {daughters:?}"))
            }
        }
    }
    let finals = || rows.iter().filter(|row| row.status == Status::Final);
    // A single parton keeps its energy and its direction; a pair keeps all four components.
    let sums: [f64; 4] = std::array::from_fn(|i| finals().map(|row| row.momentum_gev[i]).sum());
    let given: [f64; 4] =
        std::array::from_fn(|i| hard.iter().map(|row| rows[*row].momentum_gev[i]).sum());
    wrong(
        (sums[3] - energy).abs() < MOMENTUM_TOLERANCE * energy,
        format!("energy {sums:?}"),
    );
    if let [only] = hard.as_slice() {
        let axis = rows[*only].momentum_gev.map(|component| component / energy);
        let along: f64 = (0..3).map(|i| sums[i] * axis[i]).sum();
        let aside = (0..3)
            .map(|i| (sums[i] - along * axis[i]).abs())
            .fold(0.0, f64::max);
        wrong(
            aside < MOMENTUM_TOLERANCE * energy,
            format!("across {aside}"),
        );
        let t = f64::from(rows[1].virtuality_squared_gev2);
        let off = along * along - (energy * energy - t);
        wrong(
            off.abs() < SINGLE * energy * energy,
            format!("along {along}"),
        );
    } else {
        let off = (0..3)
            .map(|i| (sums[i] - given[i]).abs())
            .fold(0.0, f64::max);
        wrong(
            off < MOMENTUM_TOLERANCE * energy,
            format!("momentum {sums:?}"),
        );
        let masses = hard.iter().flat_map(|row| children(*row));
        let masses: f64 = masses
            .map(|row| f64::from(rows[row].virtuality_squared_gev2).sqrt())
            .sum();
        wrong(
            masses <= energy * (1.0 + SINGLE),
            format!("masses {masses} of {energy}"),
        );
    }
    let mut lines: HashMap<i32, [i32; 2]> = HashMap::new();
    for row in finals() {
        for (side, tag) in [row.colour, row.anticolour].into_iter().enumerate() {
            if tag != 0 {
                lines.entry(tag).or_default()[side] += 1;
            }
        }
        let is_gluon = row.pdg == Species::GLUON.pdg();
        let ends = [row.colour != 0, row.anticolour != 0];
        let expected = [is_gluon || row.pdg > 0, is_gluon || row.pdg < 0];
        wrong(
            ends == expected,
            format!("colours of {}: {ends:?}", row.pdg),
        );
    }
    let open = lines.values().filter(|ends| **ends != [1, 1]);
    wrong(
        open.clone().all(|ends| ends[0] + ends[1] == 1),
        "a line with many ends".into(),
    );
    wrong(open.count() as i32 == open_lines, "open lines".into());
    faults
}

fn vertex_faults(parent: &Parton, first: &Parton, second: &Parton, energy: f64) -> Vec<String> {
    let mut faults = Vec::new();
    let mut wrong = |good: bool, what: &str| {
        if !good {
            faults.push(what.to_string());
        }
    };
    let balance = (0..4)
        .map(|i| (parent.momentum_gev[i] - first.momentum_gev[i] - second.momentum_gev[i]).abs());
    wrong(
        balance.fold(0.0, f64::max) < MOMENTUM_TOLERANCE * energy,
        "four-momentum",
    );
    let [t, t1, t2] = [parent, first, second].map(|row| f64::from(row.virtuality_squared_gev2));
    let [z, rest] = [first, second].map(|row| f64::from(row.splitting_fraction));
    wrong((z + rest - 1.0).abs() < SINGLE, "fractions do not add up");
    let x = f64::from(parent.jet_fraction);
    for daughter in [first, second] {
        let product = x * f64::from(daughter.splitting_fraction);
        wrong(
            (f64::from(daughter.jet_fraction) - product).abs() < SINGLE * product,
            "jet fraction",
        );
    }
    wrong(
        t1 <= z * t * (1.0 + SINGLE) && t2 <= rest * t * (1.0 + SINGLE),
        "starting scale",
    );
    wrong(
        z * rest * t - rest * t1 - z * t2 >= -SINGLE * t,
        "joint constraint",
    );
    wrong(first.birth_fm == second.birth_fm, "two vertices");
    // From birth along p/E for as long as the times say; f32 places.
    let step: [f64; 4] =
        std::array::from_fn(|i| f64::from(first.birth_fm[i]) - f64::from(parent.birth_fm[i]));
    wrong(
        step[0] > 0.0 || first.birth_fm[0] == parent.birth_fm[0],
        "time runs backwards",
    );
    for axis in 0..3 {
        let way = step[0] * parent.momentum_gev[axis] / parent.momentum_gev[3];
        let scale = f64::from(first.birth_fm[axis + 1].abs().max(first.birth_fm[0].abs()));
        wrong(
            (step[axis + 1] - way).abs() < SINGLE * scale,
            "off the world line",
        );
    }
    let quark_line = match (parent.pdg, first.pdg, second.pdg) {
        (21, 21, 21) => true,
        (21, quark, antiquark) => quark > 0 && quark == -antiquark,
        (quark, same, 21) => quark == same,
        _ => false,
    };
    wrong(quark_line, "flavour");
    faults
}

#[test]
fn every_event_balances() {
    const EVENTS: i64 = 2000;
    for setup in samples() {
        let open = open_lines(&setup);
        let rules = CheckRules {
            full_history: true,
            exact_kinematics: true,
            open_colour_lines: open,
            momentum_tolerance: MOMENTUM_TOLERANCE,
        };
        let (mut rows_seen, mut induced) = (0, 0);
        setup.events(0..EVENTS, |event, rows| {
            let found = faults(rows, open);
            assert!(
                found.is_empty(),
                "event {} of {:?}: {found:?}",
                event.id,
                setup.source
            );
            let found = check_event(rows, &rules);
            assert!(
                found.is_empty(),
                "event {} of {:?}: {found:?}",
                event.id,
                setup.source
            );
            rows_seen += rows.len();
            induced += rows.iter().filter(|row| row.channel > 1).count();
        });
        println!(
            "{:?}: {rows_seen} rows, {induced} of induced branchings",
            setup.source
        );
        assert_eq!(induced > 0, setup.medium.is_some());
    }
}

/// The final rows do not depend on whether the history is kept.
#[test]
fn the_history_leaves_the_final_partons_alone() {
    for mut setup in samples() {
        let finals = |setup: &Setup| {
            let mut all = Vec::new();
            setup.events(0..300, |event, rows| {
                let kept = rows.iter().filter(|row| row.status == Status::Final);
                let kept: Vec<Parton> = kept.map(|row| Parton { parent: 0, ..*row }).collect();
                all.push((event.weight.to_bits(), kept));
            });
            all
        };
        let full = finals(&setup);
        setup.full_history = false;
        assert!(full == finals(&setup));
    }
}

/// Copies of a sound event, each broken in one way, must each be found.
#[test]
fn broken_events_are_found() {
    let setup = Setup::pair([Species::GLUON; 2], 150.0, 75.0);
    let mut sound = Vec::new();
    setup.events(7..8, |_, rows| sound = rows.to_vec());
    let branched = sound
        .iter()
        .rposition(|row| row.status == Status::Branched)
        .expect("one");
    let last = sound.len() - 1;
    assert!(faults(&sound, 0).is_empty());
    type Break<'a> = &'a dyn Fn(&mut Vec<Parton>);
    let breaks: [(&str, Break); 9] = [
        ("energy", &|rows| rows[last].momentum_gev[3] += 1e-5),
        ("component", &|rows| rows[last].momentum_gev[0] += 1e-5),
        ("virtuality", &|rows| {
            rows[branched].virtuality_squared_gev2 *= 1.00001
        }),
        ("fraction", &|rows| rows[last].splitting_fraction *= 1.00001),
        ("jet fraction", &|rows| rows[last].jet_fraction *= 1.00001),
        ("place", &|rows| rows[last].birth_fm[1] *= 1.00001),
        ("colour", &|rows| rows[last].colour += 1000),
        ("missing", &|rows| rows.truncate(last)),
        ("status", &|rows| rows[branched].status = Status::Final),
    ];
    for (what, change) in breaks {
        let mut broken = sound.clone();
        change(&mut broken);
        assert!(!faults(&broken, 0).is_empty(), "{what} was not found");
    }
}

/// Lifetimes: t_birth of the daughters less that of the parent, over the mean 2E hbar c/t.
fn lifetimes(setup: &Setup, events: i64) -> Vec<f64> {
    let mut found = Vec::new();
    setup.events(0..events, |_, rows| {
        for row in rows
            .iter()
            .filter(|row| row.parent >= 0 && row.channel == 1)
        {
            let parent = &rows[row.parent as usize];
            // One daughter of each pair; births that f32 rounds by less than 10^-4 of the mean.
            if row.birth_fm == [0.0; 4] || std::ptr::eq(row, rows.last().expect("a row")) {
                continue;
            }
            let mean = 2.0 * parent.momentum_gev[3] / f64::from(parent.virtuality_squared_gev2)
                * HBAR_C_GEV_FM;
            if f64::from(row.birth_fm[0]) * SINGLE > 1e-3 * mean {
                continue;
            }
            let life = f64::from(row.birth_fm[0]) - f64::from(parent.birth_fm[0]);
            found.push(life / mean);
        }
    });
    // Both daughters carry the vertex.
    found.dedup();
    found
}

#[test]
fn lifetimes_are_exponential() {
    for (parton, seed) in [(up(), 1), (Species::GLUON, 2)] {
        let setup = Setup::single(parton, 100.0, 100.0).with_seed(seed);
        let mut ratios = lifetimes(&setup, 50_000);
        let mut uniform: Vec<f64> = ratios.iter().map(|ratio| (-ratio).exp()).collect();
        let found = distance(&mut uniform, |u| u.clamp(0.0, 1.0));
        println!(
            "{}: {} lifetimes, distance {found:.2}",
            parton.name(),
            ratios.len()
        );
        assert!(ratios.len() > 300_000);
        assert!(found < LARGEST_DISTANCE);
        // A mean of 2E/t off by 2 % must fail.
        ratios
            .iter_mut()
            .for_each(|ratio| *ratio = (-1.02 * *ratio).exp());
        assert!(distance(&mut ratios, |u| u.clamp(0.0, 1.0)) > LARGEST_DISTANCE);
    }
}

#[test]
fn mean_lifetimes_are_the_mean() {
    let mut setup = Setup::single(up(), 100.0, 100.0);
    setup.shower.lifetime = Lifetime::Mean;
    let ratios = lifetimes(&setup, 2000);
    assert!(ratios.len() > 10_000);
    for ratio in ratios {
        assert!((ratio - 1.0).abs() < 3e-3, "{ratio}");
    }
}

/// k = (1-z) p1 - z p2 across the jet's axis has a uniform azimuth, whatever the parent's was.
#[test]
fn azimuths_are_uniform() {
    let mut setup = Setup::single(Species::GLUON, 100.0, 80.0);
    let SourceSettings::Single(single) = &mut setup.source else {
        panic!("a single parton")
    };
    single.direction = Direction::Along([0.0, 0.0, 1.0]);
    let (mut alone, mut after) = (Vec::new(), Vec::new());
    setup.events(0..40_000, |_, rows| {
        let mut azimuths: HashMap<i32, f64> = HashMap::new();
        for pair in rows[2..].chunks_exact(2) {
            let [first, second] = [&pair[0], &pair[1]];
            assert_eq!(first.parent, second.parent);
            let z = f64::from(first.splitting_fraction);
            let k = [0, 1].map(|i| (1.0 - z) * first.momentum_gev[i] - z * second.momentum_gev[i]);
            let turn = (k[1].atan2(k[0]) / std::f64::consts::TAU).rem_euclid(1.0);
            alone.push(turn);
            if let Some(parents) = azimuths.get(&rows[first.parent as usize].parent) {
                after.push((turn - parents).rem_euclid(1.0));
            }
            azimuths.insert(first.parent, turn);
        }
    });
    let found = [distance(&mut alone, |u| u), distance(&mut after, |u| u)];
    println!(
        "{} azimuths, {} after another: distances {found:.2?}",
        alone.len(),
        after.len()
    );
    assert!(found.iter().all(|distance| *distance < LARGEST_DISTANCE));
    // An azimuth that prefers one side by 2 % must fail.
    let mut leaning: Vec<f64> = alone.iter().map(|u| u + 0.02 * u * (1.0 - u)).collect();
    assert!(distance(&mut leaning, |u| u) > LARGEST_DISTANCE);
}

/// Many events in one block are the same as each alone: nothing is left over from one event to the next.
#[test]
fn events_do_not_know_their_neighbours() {
    for setup in samples() {
        let generator = setup.generator();
        let mut block = spindrift::event::EventBlock::default();
        let mut walker = generator.worker();
        for id in 0..40 {
            generator.generate(&mut walker, id, &mut block).unwrap();
        }
        let together: Vec<_> = block
            .iter()
            .map(|(event, rows)| (*event, rows.to_vec()))
            .collect();
        for id in [17, 3, 39, 0] {
            setup.events(id..id + 1, |event, rows| {
                assert_eq!((*event, rows.to_vec()), together[id as usize]);
            });
        }
    }
}
