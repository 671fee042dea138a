//! Wrong samplers, each against a case that must see it.

use serde_json::Value;

use spindrift::medium::{FieldKind, MediumSettings, TransportKind};
use spindrift::qcd::HBAR_C_GEV_FM;

use super::super::support::effects;
use super::super::support::first_branching::Sample;
use super::super::support::reference::{self, effect_kinds, number};
use super::super::support::setup::Setup;
use super::EVENTS;

/// The first case of effects, and whether it limits angles.
fn find(kinds: &[&str], parton: &str, small_angles: bool) -> Value {
    let cases = reference::cases("rate_effects").into_iter();
    let mut fitting = cases.filter(|case| {
        effect_kinds(case) == kinds
            && case["parton"] == parton
            && case["medium"]["limit_to_small_angles"] == small_angles
    });
    fitting.next().expect("the table has this case")
}

fn worst(case: &Value, change: impl Fn(&mut Setup)) -> f64 {
    let mut setup = reference::setup(case).with_seed(1600);
    change(&mut setup);
    let found = Sample::of(&setup, EVENTS).over_limits(case);
    found.into_iter().fold(0.0, f64::max)
}

fn medium(change: impl Fn(&mut MediumSettings)) -> impl Fn(&mut Setup) {
    move |setup| change(setup.medium.as_mut().expect("a medium"))
}

fn scale_strength(medium: &mut MediumSettings, factor: f64) {
    let TransportKind::Constant { qhat_gev2_per_fm } = &mut medium.transport.kind else {
        panic!("a constant qhat")
    };
    *qhat_gev2_per_fm *= factor;
}

fn scale_length(medium: &mut MediumSettings, factor: f64) {
    let FieldKind::Brick { length_fm, .. } = &mut medium.field.kind else {
        panic!("a brick")
    };
    *length_fm *= factor;
}

#[test]
fn biased_enhancements_fail() {
    let free = find(&["singular-enhancement"], "quark", false);
    let limited = find(&["singular-enhancement"], "quark", true);
    assert!(worst(&free, |_| {}) < 1.0);
    // 5 % more of it.
    let stronger = effects::enhancement(0.3 * 1.05);
    assert!(
        worst(
            &free,
            medium(|medium| medium.effects = vec![stronger.clone()])
        ) > 1.0
    );
    assert!(
        worst(
            &limited,
            medium(|medium| medium.limit_to_small_angles = false)
        ) > 1.0
    );
    assert!(worst(&free, medium(|medium| medium.limit_to_small_angles = true)) > 1.0);
    // Along the path: the quark's qhat in place of the gluon's.
    let cases = reference::cases("rate_effects");
    let along = cases.iter().find(|case| {
        let effect = &case["medium"]["effects"][0];
        !effect["slope_per_GeV2"].is_null() && case["parton"] == "gluon"
    });
    let along = along.expect("the table has this case");
    assert!(worst(along, |_| {}) < 1.0);
    assert!(worst(along, medium(|medium| scale_strength(medium, 4.0 / 9.0))) > 1.0);
    assert!(worst(along, medium(|medium| scale_length(medium, 1.05))) > 1.0);
}

#[test]
fn biased_vetoes_fail() {
    let case = find(&["resolved-only"], "quark", true);
    assert!(worst(&case, |_| {}) < 1.0);
    // The veto ignored.
    assert!(worst(&case, medium(|medium| medium.effects.clear())) > 1.0);
    // hbar c left out of the formation time: L and qhat as they would have to be for the same.
    let forgotten = medium(|medium| {
        scale_length(medium, HBAR_C_GEV_FM);
        scale_strength(medium, 1.0 / HBAR_C_GEV_FM);
    });
    assert!(worst(&case, forgotten) > 1.0);
    // sqrt(omega/qhat) for sqrt(2 omega/qhat).
    assert!(worst(&case, medium(|medium| scale_strength(medium, 2.0))) > 1.0);
    assert!(worst(&case, medium(|medium| scale_strength(medium, 4.0 / 9.0))) > 1.0);
    assert!(worst(&case, medium(|medium| scale_length(medium, 0.9))) > 1.0);
    // In a composition the veto must act too.
    let composed = find(&["singular-enhancement", "resolved-only"], "quark", true);
    assert!(worst(&composed, |_| {}) < 1.0);
    assert!(worst(&composed, medium(|medium| medium.effects.truncate(1))) > 1.0);
    assert!(worst(&composed, medium(|medium| drop(medium.effects.remove(0)))) > 1.0);
}

#[test]
fn biased_spectra_fail() {
    // The cases with the longest path: much is induced, and much thinned.
    let longest = |kind: &str| {
        let cases = reference::cases("rate_effects").into_iter();
        let own = cases.filter(|case| effect_kinds(case) == [kind] && case["parton"] == "quark");
        let length = |case: &Value| number(&case["medium"], "length_fm");
        own.max_by(|one, other| length(one).total_cmp(&length(other)))
            .expect("the table has a case")
    };
    let soft = longest("multiple-soft");
    assert!(worst(&soft, |_| {}) < 1.0);
    assert!(worst(&soft, medium(|medium| scale_strength(medium, 1.1))) > 1.0);
    assert!(worst(&soft, medium(|medium| scale_strength(medium, 4.0 / 9.0))) > 1.0);
    assert!(worst(&soft, medium(|medium| scale_length(medium, 1.05))) > 1.0);
    assert!(worst(&soft, medium(|medium| medium.limit_to_small_angles = false)) > 1.0);
    // hbar c left out of omega_c: the length that gives the same qhat L^2/2 without it, at the same qhat L.
    let forgotten = medium(|medium| {
        scale_length(medium, HBAR_C_GEV_FM);
        scale_strength(medium, 1.0 / HBAR_C_GEV_FM);
    });
    assert!(worst(&soft, forgotten) > 1.0);
    let hard = longest("single-hard");
    assert!(worst(&hard, |_| {}) < 1.0);
    let with = |opacity_per_fm: f64, debye_mass_gev: f64| {
        let wrong = effects::centres(opacity_per_fm, debye_mass_gev);
        worst(&hard, medium(|medium| medium.effects = vec![wrong.clone()]))
    };
    assert!(with(0.6, 0.7) < 1.0);
    assert!(with(0.6 * 1.05, 0.7) > 1.0);
    assert!(with(0.6 * 4.0 / 9.0, 0.7) > 1.0);
    assert!(with(0.6, 0.75) > 1.0);
    assert!(worst(&hard, medium(|medium| scale_length(medium, 1.05))) > 1.0);
}

#[test]
fn biased_pair_production_fails() {
    for phase in ["interference", "soft-gradient"] {
        let cases = reference::cases("rate_effects");
        let case = cases.iter().find(|case| {
            let effect = &case["medium"]["effects"][0];
            effect["phase"] == phase && effect["pair_production"] == true
        });
        let case = case.expect("the table has this case");
        assert!(worst(case, |_| {}) < 1.0, "{phase}");
        let without = effects::phase(phase);
        assert!(
            worst(
                case,
                medium(|medium| medium.effects = vec![without.clone()])
            ) > 1.0,
            "{phase}"
        );
    }
}
