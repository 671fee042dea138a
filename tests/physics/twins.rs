//! Proves: the same seed and event number give a vacuum and a medium event that differ only where the medium acted.
//!
//! Both trees are walked side by side from the hard partons on. Partons made together are settled together, so the
//! unit that may change is the pair: the first pair (or primaries) in which a virtuality, a fraction or a channel
//! differs is a changed one, and everything below it may differ (energies and positions do, and with them what the
//! medium does there). Deterministic, on every event of the samples:
//!
//! - outside the changed pairs and what descends from them all rows are the same to the last bit;
//! - an event in which no induced trial was accepted and none thinned is the vacuum event to the last bit;
//! - for a `single` source and a phase factor that only adds, the primary changes only by an induced branching at a
//!   higher virtuality; a changed pair has an induced branching, or one of its members lies lower than in vacuum (the
//!   constraint resumed it because of an induced branching that was discarded later);
//! - an effect that thins or vetoes unmakes branchings: then a vacuum branching may be missing instead, also one that the
//!   constraint would have discarded after it had made the sibling resume: the sibling then lies higher (relieved). The
//!   set-ups keep 1 + R positive: no trial is accepted that the vacuum rejected.
//!
//! So that the test can fail: twins of different seeds must show differences that the medium did not make.
//!
//! Runs: one event alone, in a run, on one, two or three threads gives the same totals.

use std::sync::atomic::AtomicBool;

use spindrift::event::{EventBlock, Parton, Status};
use spindrift::medium::effects::EffectSettings;
use spindrift::medium::effects::collinear_expansion::PhaseSettings;
use spindrift::qcd::Species;
use spindrift::run::{EventGenerator, Sink, run};
use spindrift::shower::Ordering;

use super::support::effects::{centres, enhancement, plain};
use super::support::setup::{Setup, brick, brick_with, up};

/// What a walk through two trees found.
#[derive(Debug, Default)]
struct Comparison {
    /// Changed pairs and primaries with an induced branching among them.
    made: usize,
    /// Changed ones without: a vacuum branching lower or missing.
    unmade: usize,
    /// Pairs in which one lies higher without an induced branching: relieved of a resume.
    relieved: usize,
    /// Changes that the medium cannot have made.
    unexplained: usize,
    /// Pairs that are the same to the last bit.
    same: usize,
}

impl Comparison {
    fn changed(&self) -> usize {
        self.made + self.unmade + self.relieved + self.unexplained
    }
}

fn children(rows: &[Parton], parent: usize) -> Vec<usize> {
    (parent + 1..rows.len())
        .filter(|row| rows[*row].parent == parent as i32)
        .collect()
}

/// The channel of a parton's branching, `None` for a final one.
fn channel(rows: &[Parton], row: usize) -> Option<u8> {
    children(rows, row)
        .first()
        .map(|child| rows[*child].channel)
}

/// The row without what only numbers it: parent's row and colour tags.
fn content(row: &Parton) -> (Vec<u64>, [i32; 3]) {
    let singles = [
        row.virtuality_squared_gev2,
        row.splitting_fraction,
        row.jet_fraction,
    ];
    let mut bits: Vec<u64> = row.momentum_gev.iter().map(|p| p.to_bits()).collect();
    bits.extend(
        row.birth_fm
            .iter()
            .chain(&singles)
            .map(|value| u64::from(value.to_bits())),
    );
    (bits, [row.pdg, row.status as i32, i32::from(row.channel)])
}

/// What a branching is: virtuality, fraction and kinds of the daughters, channel.
fn branching(rows: &[Parton], row: usize) -> Option<(u32, u32, [i32; 2], u8)> {
    let daughters = children(rows, row);
    let [first, second] = daughters.as_slice() else {
        return None;
    };
    let (first, second) = (&rows[*first], &rows[*second]);
    Some((
        rows[row].virtuality_squared_gev2.to_bits(),
        first.splitting_fraction.to_bits(),
        [first.pdg, second.pdg],
        first.channel,
    ))
}

/// Compares partons that were settled together, `[vacuum, medium]` rows of each, and what descends from them.
fn compare(
    vacuum: &[Parton],
    medium: &[Parton],
    together: &[[usize; 2]],
    adds_only: bool,
    found: &mut Comparison,
) {
    let same = |[v, m]: &[usize; 2]| branching(vacuum, *v) == branching(medium, *m);
    if together.iter().all(same) {
        for [v, m] in together {
            assert_eq!(
                content(&vacuum[*v]),
                content(&medium[*m]),
                "settled alike, recorded unlike"
            );
        }
        found.same += 1;
        for [v, m] in together {
            let below: Vec<[usize; 2]> = children(vacuum, *v)
                .into_iter()
                .zip(children(medium, *m))
                .map(|(v, m)| [v, m])
                .collect();
            if !below.is_empty() {
                compare(vacuum, medium, &below, adds_only, found);
            }
        }
        return;
    }
    let t = |rows: &[Parton], row: usize| rows[row].virtuality_squared_gev2;
    let induced = together
        .iter()
        .any(|[_, m]| channel(medium, *m).is_some_and(|c| c > 1));
    let lower = together.iter().any(|[v, m]| t(medium, *m) < t(vacuum, *v));
    if let ([[v, m]], true) = (together, adds_only) {
        let made = channel(medium, *m) == Some(2) && t(medium, *m) > t(vacuum, *v);
        found.unexplained += !made as usize;
        found.made += made as usize;
    } else if induced {
        found.made += 1;
    } else if lower {
        found.unmade += 1;
    } else if together.len() == 2 && !adds_only {
        found.relieved += 1;
    } else {
        found.unexplained += 1;
    }
}

/// Pairs of vacuum and medium rows of the primaries; the hard rows must agree.
fn primaries(vacuum: &[Parton], medium: &[Parton]) -> Vec<[usize; 2]> {
    let hard = |rows: &[Parton]| -> Vec<usize> {
        (0..rows.len())
            .filter(|row| rows[*row].status == Status::Hard)
            .collect()
    };
    let (in_vacuum, in_medium) = (hard(vacuum), hard(medium));
    assert_eq!(in_vacuum.len(), in_medium.len());
    let mut pairs = Vec::new();
    for (v, m) in in_vacuum.into_iter().zip(in_medium) {
        assert_eq!(content(&vacuum[v]), content(&medium[m]));
        pairs.push([children(vacuum, v)[0], children(medium, m)[0]]);
    }
    pairs
}

struct Totals {
    events: usize,
    with_change: usize,
    made: usize,
    unmade: usize,
    relieved: usize,
    unexplained: usize,
    same: usize,
    idle: usize,
    overshoots: u64,
}

/// Twins of a set-up that has a medium; `other_seed` for the vacuum member, to break the twins.
fn twins(setup: &Setup, adds_only: bool, other_seed: Option<u64>) -> Totals {
    const EVENTS: i64 = 3000;
    let mut vacuum_setup = setup.clone();
    vacuum_setup
        .medium
        .as_mut()
        .expect("a medium")
        .effects
        .clear();
    vacuum_setup.seed = other_seed.unwrap_or(setup.seed);
    let (vacuum, medium) = (vacuum_setup.generator(), setup.generator());
    let (mut vacuum_worker, mut medium_worker) = (vacuum.worker(), medium.worker());
    let mut blocks = [EventBlock::default(), EventBlock::default()];
    let mut totals = Totals {
        events: 0,
        with_change: 0,
        made: 0,
        unmade: 0,
        relieved: 0,
        unexplained: 0,
        same: 0,
        idle: 0,
        overshoots: 0,
    };
    let mut acted = 0;
    for id in 0..EVENTS {
        blocks.iter_mut().for_each(EventBlock::clear);
        vacuum
            .generate(&mut vacuum_worker, id, &mut blocks[0])
            .unwrap();
        medium
            .generate(&mut medium_worker, id, &mut blocks[1])
            .unwrap();
        let [before, after] = [&blocks[0].partons, &blocks[1].partons];
        let mut found = Comparison::default();
        compare(
            before,
            after,
            &primaries(before, after),
            adds_only,
            &mut found,
        );
        let accepted = medium_worker.walker.tally.counters.channels[1].accepted;
        if adds_only && accepted == acted {
            assert!(
                before == after || other_seed.is_some(),
                "event {id} changed without a cause"
            );
            totals.idle += 1;
        }
        acted = accepted;
        assert!(found.changed() > 0 || before == after);
        totals.events += 1;
        totals.with_change += (found.changed() > 0) as usize;
        totals.made += found.made;
        totals.unmade += found.unmade;
        totals.relieved += found.relieved;
        totals.unexplained += found.unexplained;
        totals.same += found.same;
    }
    totals.overshoots = medium_worker.walker.tally.counters.channels[0].overshoots;
    println!(
        "{:?}: of {} events {} changed, {} met no accepted induced trial; pairs: {} same, {} with an induced branching, \
         {} with a lower or missing vacuum branching, {} relieved, {} unexplained",
        setup.medium.as_ref().map(|medium| &medium.effects),
        totals.events,
        totals.with_change,
        totals.idle,
        totals.same,
        totals.made,
        totals.unmade,
        totals.relieved,
        totals.unexplained
    );
    totals
}

fn setups(phase: PhaseSettings) -> [Setup; 3] {
    [
        Setup::single(up(), 100.0, 100.0).with_medium(brick(4.0, 0.04, phase)),
        Setup::single(Species::GLUON, 100.0, 40.0).with_medium(brick(3.0, 0.05, phase)),
        Setup::pair([Species::GLUON; 2], 160.0, 60.0).with_medium(brick(4.0, 0.04, phase)),
    ]
}

/// The same jets in bricks with other effects; the last one ordered in angle.
fn setups_with(qhat: f64, effects: &[EffectSettings]) -> [Setup; 4] {
    let medium = |length| brick_with(length, qhat, effects.to_vec());
    let mut angular = Setup::single(Species::GLUON, 100.0, 60.0).with_medium(medium(4.0));
    angular.shower.ordering = Ordering::Angular;
    [
        Setup::single(up(), 100.0, 100.0).with_medium(medium(4.0)),
        Setup::single(Species::GLUON, 100.0, 40.0).with_medium(medium(3.0)),
        Setup::pair([Species::GLUON; 2], 160.0, 60.0).with_medium(medium(4.0)),
        angular,
    ]
}

#[test]
fn twins_differ_only_where_the_medium_added() {
    for phase in [
        PhaseSettings::Interference,
        PhaseSettings::Rescattering { window: 1.0 },
    ] {
        for setup in setups(phase) {
            let totals = twins(&setup, true, None);
            assert!(totals.with_change > 20 && totals.with_change < totals.events);
            assert!(totals.idle > 20 && totals.same > totals.events);
            assert_eq!(totals.unexplained, 0);
        }
    }
}

#[test]
fn twins_differ_only_where_the_medium_acted() {
    for setup in setups(PhaseSettings::SoftGradient) {
        let totals = twins(&setup, false, None);
        assert!(totals.with_change > 20 && totals.same > totals.events);
        assert!(totals.unmade > 0);
        assert!(totals.relieved < totals.unmade);
        assert_eq!((totals.unexplained, totals.overshoots), (0, 0));
    }
}

#[test]
fn twins_with_an_enhancement_differ_only_where_it_added() {
    let enhanced = enhancement(0.02);
    for setup in setups_with(1.0, &[enhanced]) {
        let totals = twins(&setup, true, None);
        assert!(totals.with_change > 20 && totals.with_change < totals.events);
        assert!(totals.idle > 20 && totals.same > totals.events);
        assert_eq!((totals.unexplained, totals.overshoots), (0, 0));
    }
}

#[test]
fn twins_with_spectra_differ_only_where_they_acted() {
    let hard = centres(0.05, 0.5);
    for effects in [vec![plain("multiple-soft")], vec![hard]] {
        for setup in setups_with(0.2, &effects) {
            let totals = twins(&setup, false, None);
            assert!(totals.with_change > 20 && totals.same > totals.events);
            assert!(totals.made > 0 && totals.unmade > 0);
            assert!(totals.relieved < totals.unmade);
            assert_eq!(totals.unexplained, 0);
            // Where the order leaves nothing of the vacuum a negative change is the whole density, and weights carry it.
            let angular = setup.shower.ordering == Ordering::Angular;
            assert_eq!(totals.overshoots > 0, angular);
        }
    }
}

/// A veto makes nothing; with angles ordered it lifts the order, and then it does.
#[test]
fn twins_with_a_veto_differ_only_where_it_unmade() {
    for setup in setups_with(0.5, &[plain("resolved-only")]) {
        let totals = twins(&setup, false, None);
        assert!(totals.with_change > 20 && totals.same > totals.events);
        assert!(totals.unmade > 0);
        assert_eq!((totals.made, totals.overshoots), (0, 0));
        if setup.shower.ordering != Ordering::Angular {
            assert!(totals.relieved < totals.unmade);
            assert_eq!(totals.unexplained, 0);
        }
    }
}

#[test]
fn twins_of_a_composition_differ_only_where_it_acted() {
    let effects = [
        PhaseSettings::Interference.into(),
        enhancement(0.02),
        plain("resolved-only"),
    ];
    for setup in &setups_with(0.1, &effects)[..3] {
        let totals = twins(setup, false, None);
        assert!(totals.with_change > 20 && totals.same > totals.events);
        assert!(totals.made > 0 && totals.unmade > 0);
        assert_eq!((totals.unexplained, totals.overshoots), (0, 0));
    }
}

#[test]
fn strangers_are_no_twins() {
    let [setup, ..] = setups(PhaseSettings::Interference);
    let mut along = setup.clone();
    // A fixed direction, so that the hard partons agree.
    let spindrift::source::SourceSettings::Single(single) = &mut along.source else {
        panic!("a single parton")
    };
    single.direction = spindrift::source::Direction::Along([1.0, 0.0, 0.0]);
    let totals = twins(&along, true, Some(2));
    assert!(totals.unexplained > totals.events / 2);
}

/// Rows, weights and counters of a run do not depend on the threads: sums are over ascending events, counts whole.
#[test]
fn totals_do_not_depend_on_threads() {
    let [_, _, setup] = setups(PhaseSettings::SoftGradient);
    let generator = setup.generator();
    let stop = AtomicBool::new(false);
    let totals = |ids: std::ops::Range<i64>, threads| {
        run(&generator, ids, threads, Sink::Discard, &(), &stop).expect("nothing is written")
    };
    let one = totals(0..3000, 1);
    for threads in [2, 3, 5] {
        assert_eq!(one, totals(0..3000, threads), "{threads} threads");
    }
    // Shards: partons and counts add up to those of the whole.
    let shards = [0..1000, 1000..1001, 1001..3000].map(|ids| totals(ids, 2));
    assert_eq!(
        one.partons,
        shards.iter().map(|shard| shard.partons).sum::<u64>()
    );
    let branchings: u64 = shards.iter().map(|shard| shard.counters.branchings).sum();
    assert_eq!(one.counters.branchings, branchings);
    assert_ne!(totals(0..1000, 1).partons, totals(1..1001, 1).partons);
}
