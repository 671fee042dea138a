//! Proves: in a brick the first branching has the rate f (1 + R) of the collinear expansion, for each phase factor.
//!
//! Hypothesis: the tables of medium.json (quadrature over t and z, apart from the engine). Where 1 + R is nowhere
//! negative all weights are 1 and: unbranched primaries are binomial; ln t given a branching and logit z of each kind
//! follow the tables (interpolation error 10^-5 added to the threshold); the number of first branchings from the
//! induced channel is binomial with the table's expectation. Quark and gluon, with and without the limit to small
//! angles, coupling fixed and at k_T. Where the density changes sign see `medium_sign`.
//! N = 4 x 10^5 primaries a set-up. Statistics: exact binomial tails, Kolmogorov-Smirnov; 10^-6 each.
//! Checks: 25 cases x (4 quark or 5 gluon) = 107. Limits and vertices: see `medium_limits`.
//! Smallest visible bias: 0.4 % of a cumulative distribution; of the probability of an induced first branching p,
//! 4.9 sqrt(p(1-p)/N), 2 % of it at p = .14.

use std::sync::Arc;

use serde_json::Value;

use spindrift::medium::effects::collinear_expansion::{
    CollinearExpansion, PhaseSettings, wave_number_per_fm,
};
use spindrift::medium::field::{Brick, Ray};
use spindrift::medium::trace::{Outcome, Trace};
use spindrift::medium::{FieldKind, Medium, MediumSettings, TransportKind};
use spindrift::qcd::HBAR_C_GEV_FM;

use super::support::first_branching::Sample;
use super::support::reference::{self, number};
use super::support::setup::brick;

const EVENTS: u64 = 400_000;

fn check(phase: &str) {
    let cases = reference::cases("medium");
    let chosen = cases.iter().filter(|case| {
        case["medium"]["effect"]["phase"] == phase && case["density_changes_sign"] == false
    });
    let mut count = 0;
    for (place, case) in chosen.enumerate() {
        let setup = reference::setup(case).with_seed(500 + place as u64);
        let found = Sample::of(&setup, EVENTS).over_limits(case);
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
        Sample::of(&setup, EVENTS)
            .over_limits(case)
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
        let medium = Medium::new(&settings, Arc::new(Brick::new(temperature_gev, length_fm)));
        let mut trace = Trace::default();
        let ray = Ray {
            birth_fm: [0.0; 4],
            direction: [0.6, 0.0, 0.8],
        };
        assert_eq!(
            medium.trace(medium.field(), &ray, 100.0, &mut trace),
            Outcome::Medium { left_hot: false }
        );
        let effect = CollinearExpansion::new(
            "tested".into(),
            reference::phase(&case["medium"]["effect"]),
            false,
        );
        for row in case["samples"].as_array().expect("a list") {
            let (t, z) = (number(row, "t_GeV2"), number(row, "z"));
            let expected = number(row, "ratio_without_limit");
            let found = effect.strength_gev2(&trace.path, wave_number_per_fm(t, energy_gev))
                / (z * (1.0 - z) * t);
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
        let medium = Medium::new(&settings, Arc::new(Brick::new(0.3, length_fm)));
        let mut trace = Trace::default();
        let ray = Ray {
            birth_fm: [0.0; 4],
            direction: [1.0, 0.0, 0.0],
        };
        medium.trace(medium.field(), &ray, 100.0, &mut trace);
        let effect = CollinearExpansion::new("collinear-expansion".into(), phase, false);
        let found = effect.strength_gev2(&trace.path, wave_number_per_fm(t, 100.0)) / (0.25 * t);
        // Half of the last digit quoted.
        assert!(
            (found / expected - 1.0).abs() < 5e-6,
            "{found} against {expected}"
        );
    }
}
