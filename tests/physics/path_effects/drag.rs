//! Drag: each parton loses C_R/C_A int qhat/(4 T) dl over its true lifetime, down to a floor, in its own direction.
//!
//! Deterministic, for every parton of 2 x 2000 events (quark and gluon jets): the energy lost is the mean to what f32
//! leaves of the times, unless the floor max(sqrt(t (1 + q^2/p+^2)), minimum energy) stops it, to which it is then
//! brought; virtuality and q/p+ stay, so massless partons keep their direction; a parton below the floor loses
//! nothing; a gain is never booked. For a field whose temperature falls see `expanding`.
//!
//! Statistical: with fluctuations the loss of partons that the floor cannot reach is Gaussian with the variance
//! int qhat/2 dl (Kolmogorov-Smirnov, mean and mean square, for quarks and gluons; 6 checks), and the mean loss and its
//! square are those of path_effects.json (5 x 2 without, 5 x 4 with fluctuations; 30 checks); slow partons, 1 check; 10^-6 each.
//! Smallest visible bias: 2 % of the variance.

use spindrift::parameters::Setting;
use spindrift::qcd::Species;

use super::super::support::effects::effect;
use super::super::support::reference::{self, number};
use super::super::support::setup::{Setup, up};
use super::super::support::statistics::{LARGEST_DISTANCE, LARGEST_PULL, Mean, distance};
use super::super::support::ways::{Way, along_z, massless_energies, plus, ways};
use super::broadening::path_setup;
use super::{TEMPERATURE_GEV, rounding};

const LENGTH_FM: f64 = 3.0;
const QHAT: f64 = 1.0;
const LEAST_GEV: f64 = 2.0;

fn jets(parton: Species, fluctuations: bool) -> Setup {
    let drag = effect("drag", &[("fluctuations", Setting::Flag(fluctuations))]);
    along_z(parton, 100.0, 40.0, LENGTH_FM, QHAT, vec![drag])
}

fn mean_loss_gev(way: &Way) -> f64 {
    way.colour() * QHAT / (4.0 * TEMPERATURE_GEV) * way.inside_fm(LENGTH_FM)
}

fn floor_gev(way: &Way, least_gev: f64) -> f64 {
    let before = way.at_birth();
    let tilt = (before[0].powi(2) + before[1].powi(2)) / plus(before).powi(2);
    let t = f64::from(way.parton.virtuality_squared_gev2);
    (t * (1.0 + tilt)).sqrt().max(least_gev)
}

/// What is wrong with a parton's loss if the mean is `loss_gev`.
fn fault(way: &Way, loss_gev: f64) -> Option<String> {
    let (before, after) = (way.at_birth(), way.parton.momentum_gev);
    let t = f64::from(way.parton.virtuality_squared_gev2);
    let floor = floor_gev(way, LEAST_GEV);
    let expected = (before[3] - loss_gev).max(floor).min(before[3]);
    // Births are f32, up to some 10 fm; sqrt(t) too.
    let loose = 4.0 * QHAT * rounding(10.0) + rounding(floor) + 1e-9;
    if (after[3] - expected).abs() > loose {
        return Some(format!("{} after {}, not {expected}", after[3], before[3]));
    }
    for axis in [0, 1] {
        let turn = after[axis] / plus(after) - before[axis] / plus(before);
        if turn.abs() > 1e-7 {
            return Some(format!("turned by {turn}"));
        }
    }
    let square = |p: [f64; 4]| p[3] * p[3] - p[0] * p[0] - p[1] * p[1] - p[2] * p[2];
    let off = square(before) - t;
    if off.abs() > 1e-6 * t + 1e-9 * before[3] * before[3] {
        return Some(format!("virtuality off by {off}"));
    }
    None
}

#[test]
fn every_parton_loses_the_mean_down_to_the_floor() {
    let (mut free, mut stopped, mut idle) = (0, 0, 0);
    for parton in [up(), Species::GLUON] {
        jets(parton, false).events(0..2000, |event, rows| {
            for way in ways(rows) {
                if way.gains.is_empty() {
                    idle += 1;
                    continue;
                }
                assert_eq!(way.gains.len(), 1);
                assert!(way.gains[0].1[3] < 0.0, "drag gave energy");
                if let Some(fault) = fault(&way, mean_loss_gev(&way)) {
                    panic!("event {}, row {}: {fault}", event.id, way.row);
                }
                if way.at_birth()[3] - mean_loss_gev(&way) > floor_gev(&way, LEAST_GEV) {
                    free += 1;
                } else {
                    stopped += 1;
                }
            }
        });
    }
    println!("{free} free, {stopped} stopped, {idle} without exchange");
    assert!(free > 10_000 && stopped > 1000 && idle > 1000);
}

/// Those without an exchange are behind the brick, or at or below the floor already.
#[test]
fn who_loses_nothing_had_nothing_to_lose() {
    let mut seen = [0; 2];
    jets(Species::GLUON, false).events(0..2000, |_, rows| {
        for way in ways(rows).iter().filter(|way| way.gains.is_empty()) {
            let behind = way.inside_fm(LENGTH_FM) == 0.0;
            // The minimum energy is asked before the virtualities are settled: the energy is near it then.
            let slow = way.parton.momentum_gev[3] < 1.5 * floor_gev(way, LEAST_GEV);
            seen[0] += behind as u32;
            seen[1] += (!behind && slow) as u32;
            assert!(behind || slow, "{:?}", way.parton);
        }
    });
    println!("behind {}, slow {}", seen[0], seen[1]);
    assert!(seen.iter().all(|count| *count > 100));
}

#[test]
fn wrong_losses_are_seen() {
    let mut seen = [0; 4];
    jets(up(), false).events(0..100, |_, rows| {
        for way in ways(rows).iter().filter(|way| !way.gains.is_empty()) {
            let mean = mean_loss_gev(way);
            let birth_fm = f64::from(way.parton.birth_fm[0]);
            let to_the_end = way.colour() * QHAT / 1.2 * (LENGTH_FM - birth_fm);
            for (place, loss) in [mean / way.colour(), 1.001 * mean, to_the_end, 2.0 * mean]
                .into_iter()
                .enumerate()
            {
                seen[place] += fault(way, loss).is_some() as u32;
            }
        }
    });
    println!("{seen:?}");
    assert!(seen.iter().all(|count| *count > 50));
}

/// (loss - mean)/sigma of partons six sigma away from their floor is a standard normal number.
#[test]
fn fluctuations_are_gaussian() {
    let mut pulls: [Vec<f64>; 2] = Default::default();
    for (parton, seed) in [(up(), 11), (Species::GLUON, 12)] {
        let mut jets = jets(parton, true).with_seed(seed);
        // Nobody is too slow to meet the medium.
        jets.medium.as_mut().expect("a medium").min_energy_gev = 1e-6;
        jets.events(0..15_000, |_, rows| {
            for way in ways(rows) {
                let inside_fm = way.inside_fm(LENGTH_FM);
                let mean = mean_loss_gev(&way);
                let sigma = (0.5 * way.colour() * QHAT * inside_fm).sqrt();
                let energy_gev = way.at_birth()[3];
                if inside_fm < 2e-3 || energy_gev - mean - 6.0 * sigma < floor_gev(&way, 0.0) {
                    continue;
                }
                let [(_, gain)] = way.gains[..] else {
                    panic!("no exchange")
                };
                pulls[way.is_gluon() as usize].push((-gain[3] - mean) / sigma);
            }
        });
    }
    for (name, pulls) in ["quarks", "gluons"].into_iter().zip(&mut pulls) {
        let (mut mean, mut square) = (Mean::default(), Mean::default());
        for pull in pulls.iter() {
            mean.add(*pull);
            square.add(pull * pull);
        }
        let found = [
            distance(pulls, normal_below) / LARGEST_DISTANCE,
            mean.pull(0.0).abs() / LARGEST_PULL,
            square.pull(1.0).abs() / LARGEST_PULL,
        ];
        println!("{} {name}: over limits {found:.2?}", pulls.len());
        assert!(pulls.len() > 30_000);
        assert!(found.iter().all(|value| *value < 1.0));
        // The transverse variance in place of the longitudinal one, and one that is 10 % too large.
        for factor in [0.5_f64, 1.0 / 1.1] {
            let mut wrong: Vec<f64> = pulls.iter().map(|pull| pull * factor.sqrt()).collect();
            assert!(
                distance(&mut wrong, normal_below) > LARGEST_DISTANCE,
                "{factor}"
            );
        }
    }
}

/// A parton that met the medium and then settled below the floor loses nothing, and gains what fluctuates in its favour,
/// not the way up to the floor: the mean of its gain is that of max(g, 0), g Gaussian about minus the mean loss. 1 check.
#[test]
fn slow_partons_are_not_lifted_to_the_floor() {
    const FLOOR_GEV: f64 = 6.0;
    let mut setup = jets(Species::GLUON, true).with_seed(13);
    setup.medium.as_mut().expect("a medium").min_energy_gev = FLOOR_GEV;
    let mut excess = Mean::default();
    setup.events(0..6000, |_, rows| {
        let all = ways(rows);
        for mother in &all {
            let Some(pair) = mother.daughters else {
                continue;
            };
            let pair = pair.map(|row| all.iter().find(|way| way.row == row).expect("a row"));
            let evolved = massless_energies(mother, pair);
            for (way, evolved_gev) in pair.into_iter().zip(evolved) {
                let (inside_fm, before_gev) = (way.inside_fm(LENGTH_FM), way.at_birth()[3]);
                let met = evolved_gev > FLOOR_GEV * 1.0001;
                if inside_fm < 2e-3 || !met || before_gev > FLOOR_GEV {
                    continue;
                }
                let gain_gev = way.parton.momentum_gev[3] - before_gev;
                let sigma = (0.5 * way.colour() * QHAT * inside_fm).sqrt();
                let expected = expected_gain(mean_loss_gev(way) / sigma);
                excess.add(gain_gev / sigma - expected);
            }
        }
    });
    println!("{} slow, pull {:.2}", excess.count, excess.pull(0.0));
    assert!(excess.count > 300);
    assert!(excess.pull(0.0).abs() < LARGEST_PULL);
}

/// The mean of max(g, 0) for g of variance 1 about -`mean`.
fn expected_gain(mean: f64) -> f64 {
    let density = (-0.5 * mean * mean).exp() / std::f64::consts::TAU.sqrt();
    density - mean * normal_below(-mean)
}

fn normal_below(x: f64) -> f64 {
    0.5 * libm::erfc(-x / std::f64::consts::SQRT_2)
}

/// Primaries of the reference's set-ups. N = 3 x 10^4 events a case.
#[test]
fn primaries_lose_what_the_table_says() {
    const EVENTS: i64 = 30_000;
    for (place, case) in reference::cases("path_effects").iter().enumerate() {
        for fluctuations in [false, true] {
            let mut setup = path_setup(case, "drag").with_seed(1750 + place as u64);
            let settings = [("fluctuations", Setting::Flag(fluctuations))];
            setup.medium.as_mut().expect("a medium").effects = vec![effect("drag", &settings)];
            let (mut unbranched, mut branched) = (Mean::default(), Mean::default());
            let mut squares = [Mean::default(), Mean::default()];
            setup.events(0..EVENTS, |_, rows| {
                let primary = ways(rows).swap_remove(0);
                let [(_, gain)] = primary.gains[..] else {
                    panic!("no exchange")
                };
                let loss = -gain[3];
                let mean = if primary.is_final() {
                    &mut unbranched
                } else {
                    &mut branched
                };
                mean.add(loss);
                squares[!primary.is_final() as usize].add(loss * loss);
            });
            let words = &case["unbranched"];
            let mean_loss = number(words, "mean_loss_GeV");
            let variance = number(words, "loss_variance_GeV2");
            let words = &case["branched"];
            let with = if fluctuations { "with" } else { "without" };
            let squared = number(words, &format!("mean_loss_squared_{with}_fluctuation_GeV2"));
            let mut pulls = vec![
                branched.pull(number(words, "mean_loss_GeV")),
                squares[1].pull(squared),
            ];
            if fluctuations {
                pulls.push(unbranched.pull(mean_loss));
                pulls.push(squares[0].pull(mean_loss * mean_loss + variance));
            } else {
                // All the same.
                assert!((unbranched.value() / mean_loss - 1.0).abs() < 1e-9);
                assert!(unbranched.variance() < 1e-12 * mean_loss);
            }
            println!("case {place}, {with} fluctuations: pulls {pulls:.2?}");
            assert!(pulls.iter().all(|pull| pull.abs() < LARGEST_PULL));
        }
    }
}
