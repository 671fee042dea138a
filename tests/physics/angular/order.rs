//! Order in angle on the rows of whole events, and what it does to the number of partons.

use spindrift::event::{Parton, Status};
use spindrift::qcd::Species;

use super::super::support::setup::{Setup, brick_with, up};
use super::super::support::statistics::{LARGEST_PULL, Mean, pull_between};
use super::super::support::ways::ways;
use super::{LOOSE, VACUUM, angular, count_order, inside, plain, primaries, steps};

fn samples() -> Vec<Setup> {
    let emitting = || brick_with(4.0, 2.0, plain(&["collinear-expansion"]));
    let moving = || {
        brick_with(
            4.0,
            1.0,
            plain(&["broadening", "drag", "virtuality-diffusion"]),
        )
    };
    let vacuum = [
        Setup::single(up(), 100.0, 100.0),
        Setup::single(Species::GLUON, 100.0, 40.0),
        Setup::pair([Species::GLUON; 2], 160.0, 80.0),
    ];
    let mut samples = vacuum.to_vec();
    for setup in vacuum {
        samples.push(setup.clone().with_medium(emitting()));
        samples.push(setup.with_medium(moving()));
    }
    samples
}

#[test]
fn every_vacuum_emission_lies_below_its_parents_angle() {
    for setup in samples() {
        let ordered = count_order(&angular(setup.clone()), 1500);
        let free = count_order(&setup, 1500);
        println!(
            "{:?}: [inside, outside] {ordered:?}, `virtuality` {free:?}",
            setup.source
        );
        assert!(ordered[0] > 1000);
        assert_eq!(ordered[1], 0);
        assert!(free[1] > free[0] / 10, "nothing to order");
    }
}

/// Below an induced branching too, whose own angle is free; and induced emissions themselves are.
#[test]
fn induced_branchings_order_what_follows_and_are_free() {
    let medium = brick_with(4.0, 4.0, plain(&["collinear-expansion"]));
    let setup = angular(Setup::single(Species::GLUON, 100.0, 30.0).with_medium(medium));
    let (mut below_induced, mut induced) = ([0; 2], [0; 2]);
    setup.events(0..4000, |_, rows| {
        steps(&ways(rows), |step| {
            let outside = (step.angle2_over_most > 1.0 + LOOSE) as usize;
            if step.channel != VACUUM {
                induced[outside] += 1;
            } else if step.daughter.parton.channel != VACUUM {
                below_induced[outside] += 1;
            }
        });
    });
    println!("vacuum below induced {below_induced:?}, induced {induced:?}");
    assert!(below_induced[0] > 500 && below_induced[1] == 0);
    assert!(induced.iter().all(|count| *count > 500));
}

#[test]
fn the_first_emission_is_free() {
    for setup in samples() {
        let first = |setup: &Setup| {
            let mut all = Vec::new();
            setup.first_branchings(3000, |branching, weight| all.push((branching, weight)));
            all
        };
        assert!(first(&setup) == first(&angular(setup.clone())));
    }
}

#[test]
fn fewer_partons_than_without_angles() {
    let number = |setup: &Setup, seed: u64| {
        let mut mean = Mean::default();
        setup.clone().with_seed(seed).events(0..20_000, |_, rows| {
            let is_final = |row: &&Parton| row.status == Status::Final;
            mean.add(rows.iter().filter(is_final).count() as f64);
        });
        mean
    };
    let medium = brick_with(4.0, 1.0, plain(&["collinear-expansion"]));
    for mut setup in [
        Setup::single(up(), 100.0, 100.0),
        Setup::single(Species::GLUON, 100.0, 100.0),
        Setup::pair([up(), up().conjugate()], 200.0, 100.0),
        Setup::single(Species::GLUON, 100.0, 40.0).with_medium(medium),
    ] {
        setup.full_history = false;
        let (with, without) = (number(&angular(setup.clone()), 1), number(&setup, 2));
        let pull = pull_between(&without, &with);
        println!(
            "{:?}: {:.3} +- {:.3} with angles, {:.3} +- {:.3} without, {pull:.0} sigma",
            setup.source,
            with.value(),
            with.error(),
            without.value(),
            without.error()
        );
        assert!(pull > LARGEST_PULL);
    }
}

/// With `resolved-only`, an emission outside the order forms outside and its parton was born inside at a wide angle.
#[test]
fn resolved_only_lifts_the_order_where_it_says() {
    let setup = |resolved_only| {
        let mut jets = primaries(Species::GLUON, [200.0, 15.0], true, resolved_only);
        jets.coupling = Setup::single(up(), 1.0, 1.0).coupling;
        jets
    };
    let (mut outside, mut inside_order, mut could) = (0, 0, 0);
    setup(true).events(0..20_000, |_, rows| {
        steps(&ways(rows), |step| {
            let t = f64::from(step.daughter.parton.virtuality_squared_gev2);
            let place = inside(step.mother, step.pair, step.which);
            let lifted = place.is_some_and(|it| t < it.first_t_gev2 * (1.0 + LOOSE) && it.wide);
            if step.angle2_over_most > 1.0 + LOOSE {
                assert!(lifted, "outside the order, t = {t}");
                outside += 1;
            } else {
                inside_order += 1;
                could += lifted as u32;
            }
        });
    });
    let without = count_order(&setup(false), 20_000);
    println!(
        "{outside} outside the order, {inside_order} inside it, {could} of these where it is lifted; without {without:?}"
    );
    assert!(outside > 500 && could > 500);
    assert_eq!(without[1], 0);
}
