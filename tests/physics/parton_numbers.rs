//! Proves: the mean number of final partons with the joint constraint is that of independent simulations.
//!
//! Hypothesis: start 100 GeV, cutoff 1 GeV, all flavours always open; mean numbers with the standard error of their
//! last digits as another program found them (no published source; a closed form does not exist). N = 10^6 (quark) and
//! 4 x 10^5 (gluon) events. Statistic: pull of the difference with both errors, 10^-6. 4 checks; smallest visible bias
//! 0.8 %, limited by the quoted errors.
//!
//! Without the constraint, daughters starting at z t and (1-z) t, the mean is known exactly by solving its integral
//! equation; walking the tree with the engine's legs alone must give it. 2 checks; smallest visible bias 0.5 %.

use spindrift::event::Status;
use spindrift::qcd::{CouplingSettings, Loops, ScaleArgument, Species};
use spindrift::random::Key;
use spindrift::shower::FlavourOpening;
use spindrift::shower::counters::ShowerCounters;
use spindrift::shower::evolution::Tools;
use spindrift::shower::leg::{AngularOrder, Leg, Tally};

use super::support::setup::{ALPHA_S, Setup, fixed, running, up};
use super::support::statistics::{LARGEST_PULL, Mean};

fn setup(parton: Species, coupling: CouplingSettings) -> Setup {
    let mut setup = Setup::single(parton, 100.0, 100.0).with_coupling(coupling);
    setup.shower.flavour_opening = FlavourOpening::Always;
    setup.full_history = false;
    setup
}

#[test]
fn with_the_joint_constraint() {
    let of_kt = running(ScaleArgument::TransverseMomentum, Loops::One);
    for (parton, coupling, events, expected, error) in [
        (up(), fixed(ALPHA_S), 1_000_000, 6.031, 0.009),
        (Species::GLUON, fixed(ALPHA_S), 400_000, 10.390, 0.012),
        (up(), of_kt, 1_000_000, 10.378, 0.013),
        (Species::GLUON, of_kt, 400_000, 17.299, 0.016),
    ] {
        let mut number = Mean::default();
        setup(parton, coupling).events(0..events, |_, rows| {
            number.add(
                rows.iter()
                    .filter(|row| row.status == Status::Final)
                    .count() as f64,
            );
        });
        let pull = (number.value() - expected) / number.error().hypot(error);
        println!(
            "{}: {:.4} +- {:.4} against {expected} +- {error}, pull {pull:.2}",
            parton.name(),
            number.value(),
            number.error()
        );
        assert!(pull.abs() < LARGEST_PULL);
    }
}

fn unconstrained(parton: Species, start_shares: fn(f64) -> [f64; 2], events: u64) -> Mean {
    let setup = setup(parton, fixed(ALPHA_S));
    let evolution = setup.evolution();
    let largest = 1e4;
    let tools = Tools {
        field: None,
        evolution: &evolution,
        settings: &setup.shower,
    };
    let mut tally = Tally {
        trials_left: u32::MAX,
        weight: 1.0,
        counters: ShowerCounters::new(0),
    };
    let (mut number, mut leg, mut waiting) = (Mean::default(), Leg::idle(), Vec::new());
    for id in 0..events {
        let mut finals = 0.0;
        waiting.push((parton, Key::event(3, id), largest));
        while let Some((species, key, start)) = waiting.pop() {
            leg.start(&evolution, species, key, start, AngularOrder::NONE);
            let Some(branching) = leg.evolve(tools, &mut tally) else {
                finals += 1.0;
                continue;
            };
            let shares = start_shares(branching.z);
            let daughters = branching.daughters.into_iter().zip(shares);
            for (place, (daughter, share)) in daughters.enumerate() {
                waiting.push((daughter, key.daughter(place as u64), share * branching.t));
            }
        }
        number.add(finals);
    }
    number
}

#[test]
fn without_the_constraint() {
    for (parton, expected) in [(up(), 6.85094), (Species::GLUON, 12.8973)] {
        let number = unconstrained(parton, |z| [z, 1.0 - z], 400_000);
        let pull = number.pull(expected);
        println!(
            "{}: {:.4} against {expected}, pull {pull:.2}",
            parton.name(),
            number.value()
        );
        assert!(pull.abs() < LARGEST_PULL);
    }
    // Starting scales exchanged must fail.
    let exchanged = unconstrained(up(), |z| [1.0 - z, z], 100_000);
    assert!(exchanged.pull(6.85094).abs() > LARGEST_PULL);
}
