//! Proves: in a brick the first branching has the rate f (1 + R) of the collinear expansion, for each phase factor.
//!
//! Hypothesis: the tables of medium.json (quadrature over t and z, apart from the engine). Where 1 + R is nowhere
//! negative all weights are 1 and: unbranched primaries are binomial; ln t given a branching and logit z of each kind
//! follow the tables (interpolation error 10^-5 added to the threshold); the number of first branchings from the
//! induced channel is binomial with the table's expectation. Quark and gluon, with and without the limit to small
//! angles, coupling fixed and at k_T. Where the density changes sign see `medium_sign`.
//! N = 4 x 10^5 primaries a set-up. Statistics: exact binomial tails, Kolmogorov-Smirnov; 10^-6 each.
//! Checks: 25 cases x (4 quark or 5 gluon) = 107 at most, 8 for the strength, 3 for vertices.
//! Smallest visible bias: 0.4 % of a cumulative distribution; of the probability of an induced first branching p,
//! 4.9 sqrt(p(1-p)/N), 2 % of it at p = .14.

use serde_json::Value;

use spindrift::event::{EventSummary, Parton};
use spindrift::medium::effects::collinear_expansion::CollinearExpansion;
use spindrift::medium::effects::{Passage, RateEffect};
use spindrift::medium::field::{Brick, Ray};
use spindrift::medium::trace::{Outcome, Trace};
use spindrift::medium::{FieldKind, Medium, MediumSettings, PhaseSettings, TransportKind};
use spindrift::qcd::{HBAR_C_GEV_FM, Species};
use spindrift::shower::FlavourOpening;

use super::support::reference::{self, Cumulative, logit, number};
use super::support::setup::{ALPHA_S, Setup, brick, fixed, up};
use super::support::statistics::{
    LARGEST_DISTANCE, SIGNIFICANCE, binomial_p_value, binomial_pull, distance,
};

const EVENTS: u64 = 400_000;
const INTERPOLATION_ERROR: f64 = 1e-5;

#[derive(Default)]
struct Sample {
    unbranched: u64,
    induced: u64,
    ln_t: Vec<f64>,
    logit_z: [Vec<f64>; 2],
}

fn sample(setup: &Setup) -> Sample {
    let mut sample = Sample::default();
    setup.first_branchings(EVENTS, |branching, weight| {
        assert_eq!(weight, 1.0, "the density lies between 0 and its envelope");
        let Some(branching) = branching else {
            sample.unbranched += 1;
            return;
        };
        sample.induced += (branching.channel > 0) as u64;
        sample.ln_t.push(branching.t.ln());
        let pair = !branching.daughters[1].is_gluon();
        sample.logit_z[pair as usize].push(logit(branching.z));
    });
    sample
}

/// How far each statistic lies over its limit; the first is the probability of no branching, the second the induced
/// share, then t and z.
fn verdicts(case: &Value, mut sample: Sample) -> Vec<f64> {
    let tail = |count, p| binomial_p_value(count, EVENTS, p).ln() / SIGNIFICANCE.ln();
    let unbranched = number(case, "no_branching_probability");
    let mut found = vec![
        tail(sample.unbranched, unbranched),
        tail(sample.induced, number(case, "induced_first_branchings")),
    ];
    let mut follow = |draws: &mut Vec<f64>, table: Cumulative| {
        let limit = LARGEST_DISTANCE + INTERPOLATION_ERROR * (draws.len() as f64).sqrt();
        found.push(distance(draws, |x| table.at(x)) / limit);
    };
    let t = &case["t"];
    let table = Cumulative::new(&t["ln_t"], &t["cumulative"], 1.0 - unbranched);
    follow(&mut sample.ln_t, table);
    let kinds: &[&str] = if case["parton"] == "gluon" {
        &["g-gg", "g-qq"]
    } else {
        &["q-qg"]
    };
    for (kind, draws) in kinds.iter().zip(&mut sample.logit_z) {
        let entry = &case["z"][*kind];
        let total = number(entry, "total");
        follow(
            draws,
            Cumulative::new(&entry["logit_z"], &entry["cumulative"], total),
        );
    }
    found
}

fn check(phase: &str) {
    let cases = reference::cases("medium");
    let chosen = cases.iter().filter(|case| {
        case["medium"]["effect"]["phase"] == phase && case["density_changes_sign"] == false
    });
    let mut count = 0;
    for (place, case) in chosen.enumerate() {
        let setup = reference::setup(case).with_seed(500 + place as u64);
        let found = verdicts(case, sample(&setup));
        println!("{}: over limit {found:.2?}", reference::name(case));
        assert!(
            found.iter().all(|value| *value < 1.0),
            "{}: {found:?}",
            reference::name(case)
        );
        count += 1;
    }
    assert!(count > 2, "{phase} has {count} cases");
}

#[test]
fn interference() {
    check("interference");
}

#[test]
fn rescattering() {
    check("rescattering");
}

#[test]
fn soft_gradient_where_the_density_stays_positive() {
    check("soft-gradient");
}

#[test]
fn biased_media_fail() {
    let cases = reference::cases("medium");
    let find = |phase: &str, small_angles: bool| {
        let found = cases.iter().find(|case| {
            case["medium"]["effect"]["phase"] == phase
                && case["medium"]["limit_to_small_angles"] == small_angles
        });
        found.expect("the table has this case")
    };
    let worst = |case: &Value, change: &dyn Fn(&mut MediumSettings)| {
        let mut setup = reference::setup(case).with_seed(600);
        change(setup.medium.as_mut().expect("a medium"));
        verdicts(case, sample(&setup))
            .into_iter()
            .fold(0.0, f64::max)
    };
    let stronger = |factor: f64| {
        move |medium: &mut MediumSettings| {
            if let TransportKind::Constant { qhat_gev2_per_fm } = &mut medium.transport.kind {
                *qhat_gev2_per_fm *= factor;
            }
        }
    };
    let free = find("interference", false);
    let limited = find("interference", true);
    assert!(worst(free, &|_| {}) < 1.0);
    assert!(worst(free, &stronger(1.02)) > 1.0);
    // The quark's qhat in place of the gluon's.
    assert!(worst(free, &stronger(4.0 / 9.0)) > 1.0);
    assert!(worst(limited, &|medium| medium.limit_to_small_angles = false) > 1.0);
    // hbar c left out of the formation time is a path longer by 1/(hbar c).
    assert!(
        worst(free, &|medium| medium.field.kind = FieldKind::Brick {
            temperature_gev: 0.3,
            length_fm: 2.0 / HBAR_C_GEV_FM,
        }) > 1.0
    );
    let window = find("rescattering", false);
    assert!(
        worst(window, &|medium| medium.effects =
            brick(2.0, 1.0, PhaseSettings::Interference).effects)
            > 1.0
    );
}

/// R itself, with every phase factor, at the table's sample points (arbitrary precision path integrals): 10^-9.
#[test]
fn relative_changes_are_those_of_the_table() {
    let mut points = 0;
    for case in &reference::cases("medium") {
        let setup = reference::setup(case);
        let settings = setup.medium.expect("a medium");
        let energy_gev = number(&case["medium"], "energy_GeV");
        let FieldKind::Brick {
            temperature_gev,
            length_fm,
        } = settings.field.kind
        else {
            panic!("a brick");
        };
        let medium = Medium::new(&settings, Box::new(Brick::new(temperature_gev, length_fm)));
        let mut trace = Trace::default();
        let ray = Ray {
            birth_fm: [0.0; 4],
            direction: [0.6, 0.0, 0.8],
        };
        assert_eq!(
            medium.trace(&ray, &mut trace),
            Outcome::Medium { left_hot: false }
        );
        let passage = Passage {
            species: up(),
            energy_gev,
            path: &trace.path,
        };
        for row in case["samples"].as_array().expect("a list") {
            let (t, z) = (number(row, "t_GeV2"), number(row, "z"));
            let expected = number(row, "ratio_without_limit");
            let found = medium.effects()[0].relative_change(&passage, t, z);
            // The table has 12 digits.
            let scale = 1e-9 * (1.0 + expected.abs());
            assert!(
                (found - expected).abs() < scale,
                "{t} {z}: {found} against {expected}"
            );
            let allowed = medium.allows_angle(t, z, energy_gev);
            assert_eq!(
                allowed || expected == 0.0,
                number(row, "ratio") != 0.0 || expected == 0.0
            );
            points += 1;
        }
    }
    assert!(points > 300, "{points}");
}

/// As the strength goes to zero the vacuum comes back in proportion to it: of the primaries that the vacuum leaves
/// unbranched (same streams) the medium leaves exp(-c qhat), c the exponent of one unit of strength, and none that it
/// makes branch comes back. Binomial; at qhat = .01 a bias of c by 7 % would be seen, at 1 by 1 %.
#[test]
fn the_vacuum_comes_back_in_proportion_to_the_strength() {
    // Quark, 10 to 1 GeV, energy 100 GeV, 2 fm, fixed coupling; table of the medium and of the vacuum.
    let table = reference::cases("medium");
    let case = &table[0];
    assert_eq!(case["medium"]["effect"]["phase"], "interference");
    assert_eq!(number(&case["medium"], "gluon_qhat_GeV2_per_fm"), 1.0);
    let vacuum_exponent = number(&reference::cases("no_branching")[0], "exponent");
    let per_strength = number(case, "exponent") - vacuum_exponent;
    let mut setup = reference::setup(case).with_seed(700);
    let medium = setup.medium.take();
    let mut in_vacuum = Vec::new();
    setup.first_branchings(EVENTS, |branching, _| in_vacuum.push(branching));
    let unbranched = in_vacuum
        .iter()
        .filter(|branching| branching.is_none())
        .count() as u64;
    for qhat in [1.0, 0.3, 0.1, 0.03, 0.01, 0.003, 0.001] {
        let mut medium = medium.clone().expect("a medium");
        medium.transport.kind = TransportKind::Constant {
            qhat_gev2_per_fm: qhat,
        };
        let (mut left, mut same, mut event) = (0, 0, 0);
        setup
            .clone()
            .with_medium(medium)
            .first_branchings(EVENTS, |branching, _| {
                let vacuum = in_vacuum[event];
                event += 1;
                left += branching.is_none() as u64;
                same += (branching == vacuum) as u64;
                // A branching differs from the vacuum's only by coming from the medium, at a higher t.
                let made = branching.is_some_and(|made| {
                    made.channel == 1 && vacuum.is_none_or(|vacuum| made.t > vacuum.t)
                });
                assert!(made || branching == vacuum);
            });
        let expected = (-per_strength * qhat).exp();
        println!(
            "qhat {qhat}: unbranched {left} of {unbranched}, pull {:.2}; changed {:.5} of all, over qhat {:.4}",
            binomial_pull(left, unbranched, expected),
            1.0 - same as f64 / EVENTS as f64,
            (1.0 - same as f64 / EVENTS as f64) / qhat,
        );
        assert!(binomial_p_value(left, unbranched, expected) > SIGNIFICANCE);
    }
}

/// Every column of every row, bit for bit.
fn bits(event: &EventSummary, rows: &[Parton]) -> Vec<u64> {
    let mut bits = vec![
        event.id as u64,
        event.weight.to_bits(),
        event.partons_count as u64,
    ];
    for row in rows {
        bits.extend(row.momentum_gev.map(f64::to_bits));
        let singles = [
            row.virtuality_squared_gev2,
            row.splitting_fraction,
            row.jet_fraction,
        ];
        bits.extend(
            row.birth_fm
                .iter()
                .chain(&singles)
                .map(|value| u64::from(value.to_bits())),
        );
        let whole = [row.pdg, row.parent, row.colour, row.anticolour];
        bits.extend(whole.map(|value| value as u64));
        bits.extend([row.status as u64, u64::from(row.channel)]);
    }
    bits
}

/// Without effects, without strength, without heat, without length, and below the minimum energy: the vacuum, to the
/// last bit of every column.
#[test]
fn a_medium_that_cannot_act_is_the_vacuum_to_the_last_bit() {
    const EVENTS: i64 = 20_000;
    let all = |setup: &Setup| {
        let mut all = Vec::new();
        setup.events(0..EVENTS, |event, rows| all.push(bits(event, rows)));
        all
    };
    let hot = brick(4.0, 1.0, PhaseSettings::Interference);
    let changed = |change: &dyn Fn(&mut MediumSettings)| {
        let mut medium = hot.clone();
        change(&mut medium);
        medium
    };
    let kind = |temperature_gev, length_fm| FieldKind::Brick {
        temperature_gev,
        length_fm,
    };
    for setup in [
        Setup::single(up(), 100.0, 60.0),
        Setup::pair([Species::GLUON; 2], 120.0, 60.0),
    ] {
        let vacuum = all(&setup);
        let idle = [
            changed(&|medium| medium.effects.clear()),
            changed(&|medium| {
                medium.transport.kind = TransportKind::Constant {
                    qhat_gev2_per_fm: 0.0,
                };
            }),
            changed(&|medium| medium.field.kind = kind(0.149, 4.0)),
            changed(&|medium| medium.field.kind = kind(0.3, 0.0)),
            changed(&|medium| medium.min_energy_gev = 1e9),
        ];
        for medium in idle {
            assert!(
                all(&setup.clone().with_medium(medium.clone())) == vacuum,
                "{medium:?}"
            );
        }
        assert!(all(&setup.clone().with_medium(hot.clone())) != vacuum);
    }
}

/// K(phi), written here apart from the engine; 0 where the induced channel has nothing.
fn positive_phase_factor(phase: PhaseSettings, phi: f64) -> f64 {
    let plain = 2.0 - 2.0 * phi.cos();
    let value = match phase {
        PhaseSettings::Interference => plain,
        PhaseSettings::SoftGradient => plain - 2.0 * phi * phi.sin(),
        PhaseSettings::Rescattering { window } if phi > window => 0.0,
        PhaseSettings::Rescattering { .. } => {
            plain - 2.0 * phi * phi.sin() + 2.0 * phi * phi * phi.cos()
        }
    };
    value.max(0.0)
}

/// Induced first branchings happen at l with the density max(K(l t/(2 E hbar c)), 0) on the brick: with the t of each,
/// the cumulative function at its l is uniform. Kolmogorov-Smirnov, 1 check a phase.
#[test]
fn induced_branchings_happen_where_the_integrand_says() {
    const LENGTH_FM: f64 = 3.0;
    const ENERGY_GEV: f64 = 80.0;
    const STEPS: usize = 400;
    let phases = [
        PhaseSettings::Interference,
        PhaseSettings::Rescattering { window: 1.0 },
        PhaseSettings::SoftGradient,
    ];
    for phase in phases {
        let mut setup = Setup::single(up(), ENERGY_GEV, 15.0)
            .with_coupling(fixed(ALPHA_S))
            .with_medium(brick(LENGTH_FM, 1.0, phase));
        setup.shower.flavour_opening = FlavourOpening::Always;
        let mut uniform = Vec::new();
        setup.events(0..60_000, |_, rows| {
            // Rows: hard parton, primary, its daughters.
            let Some(daughter) = rows[2..]
                .iter()
                .find(|row| row.parent == 1 && row.channel == 2)
            else {
                return;
            };
            let l = f64::from(daughter.birth_fm[0]);
            assert!(l > 0.0 && l <= LENGTH_FM + 1e-6);
            let k = f64::from(rows[1].virtuality_squared_gev2) / (2.0 * ENERGY_GEV * HBAR_C_GEV_FM);
            // Midpoint rule; the kernel is smooth but for the ends of its positive parts.
            let integral = |end: f64| -> f64 {
                let step = end / STEPS as f64;
                let at = |place: usize| (place as f64 + 0.5) * step;
                (0..STEPS)
                    .map(|place| positive_phase_factor(phase, k * at(place)) * step)
                    .sum()
            };
            uniform.push(integral(l) / integral(LENGTH_FM));
        });
        let found = distance(&mut uniform, |u| u.clamp(0.0, 1.0));
        println!("{phase:?}: {} induced, distance {found:.2}", uniform.len());
        assert!(uniform.len() > 2000);
        assert!(found < LARGEST_DISTANCE);
        // Uniform places along the brick must fail.
        let mut wrong: Vec<f64> = uniform.iter().map(|u| u.sqrt()).collect();
        assert!(distance(&mut wrong, |u| u.clamp(0.0, 1.0)) > LARGEST_DISTANCE);
    }
}

/// check-values that were quoted with the formulas: R at z = 1/2, E = 100 GeV, qhat = 1 GeV^2/fm.
#[test]
fn quoted_values_of_the_relative_change() {
    let quoted = [
        (5.0, 25.0, PhaseSettings::Interference, 1.61300),
        (5.0, 25.0, PhaseSettings::SoftGradient, 0.0265316),
        (2.0, 100.0, PhaseSettings::Interference, 0.189600),
    ];
    for (length_fm, t, phase, expected) in quoted {
        let settings = brick(length_fm, 1.0, phase);
        let medium = Medium::new(&settings, Box::new(Brick::new(0.3, length_fm)));
        let mut trace = Trace::default();
        let ray = Ray {
            birth_fm: [0.0; 4],
            direction: [1.0, 0.0, 0.0],
        };
        medium.trace(&ray, &mut trace);
        let passage = Passage {
            species: Species::GLUON,
            energy_gev: 100.0,
            path: &trace.path,
        };
        let effect = CollinearExpansion::new("collinear-expansion".into(), phase);
        let found = effect.relative_change(&passage, t, 0.5);
        // Half of the last digit quoted.
        assert!(
            (found / expected - 1.0).abs() < 5e-6,
            "{found} against {expected}"
        );
    }
}
