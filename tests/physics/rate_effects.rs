//! Proves: in a brick the first branching has the rate of every effect on rates, alone and composed with others.
//!
//! Hypothesis: the tables of rate_effects.json (quadrature over t and z, apart from the engine). Where the vacuum's
//! channel, f_vac Theta + sum min(D_i, 0), is nowhere negative all weights are 1 and: unbranched primaries are
//! binomial, branchings from the medium's channels are binomial for each kind of splitting, ln t given a branching and
//! logit z of each kind follow the tables (Kolmogorov-Smirnov; interpolation error 10^-5 added). Where it is negative
//! (the density changes sign, or a veto leaves nothing of the vacuum under a negative change) <w> = 1, and the
//! weighted share of unbranched primaries and weighted distributions are those of the tables: pulls of means at 10^-6
//! (4.9), 20 points a distribution at 10^-6/20 each (5.5).
//! N = 3 x 10^5 primaries a set-up, 6 x 10^5 where they are weighted. Checks: 30 cases x at most 6 = 151.
//! Smallest visible bias: 0.5 % of a cumulative distribution; of an induced share p, 4.9 sqrt(p(1-p)/N), 2 % at p = .2.
//!
//! So that this can fail: 16 wrong samplers, each against a case that must see it.

use std::collections::BTreeSet;

use serde_json::Value;

use spindrift::medium::effects::model;
use spindrift::medium::{FieldKind, MediumSettings, TransportKind};
use spindrift::parameters::Setting;
use spindrift::qcd::HBAR_C_GEV_FM;

use super::support::first_branching::{Sample, weighted_pulls};
use super::support::reference::{self, effect_kinds};
use super::support::setup::{Setup, effect};
use super::support::statistics::LARGEST_PULL;

const EVENTS: u64 = 300_000;
const WEIGHTED_EVENTS: u64 = 600_000;
/// Wide envelopes keep weights near 1, see `medium_sign`.
const ENVELOPE_FACTOR: f64 = 4.0;

fn known(case: &Value) -> bool {
    effect_kinds(case).iter().all(|kind| model(kind).is_some())
}

/// Whether the vacuum's channel turns negative, so that weights carry it.
fn is_weighted(case: &Value) -> bool {
    let kinds = effect_kinds(case);
    let thins = |kind: &&str| matches!(*kind, "multiple-soft" | "single-hard");
    let vetoes = kinds.contains(&"resolved-only");
    case["density_changes_sign"] == true || vetoes && kinds.iter().any(thins)
}

fn check(kind: &str) {
    let cases = reference::cases("rate_effects");
    let mut count = 0;
    for (place, case) in cases.iter().enumerate() {
        let seed = 1500 + place as u64;
        // A case belongs to its first effect.
        if effect_kinds(case)[0] != kind || !known(case) {
            continue;
        }
        let mut setup = reference::setup(case).with_seed(seed);
        let name = reference::name(case);
        if is_weighted(case) {
            setup.shower.envelope_factor = ENVELOPE_FACTOR;
            let found = weighted_pulls(case, &setup, WEIGHTED_EVENTS, |weight| weight);
            println!("{name}: pulls {:.2?}, {}", found.pulls, found.weights);
            let worst = found.pulls.iter().fold(0.0, |a: f64, b| a.max(b.abs()));
            assert!(worst < LARGEST_PULL, "{name}: {:?}", found.pulls);
        } else {
            let found = Sample::of(&setup, EVENTS).over_limits(case);
            println!("{name}: over limit {found:.2?}");
            assert!(found.iter().all(|value| *value < 1.0), "{name}: {found:?}");
        }
        count += 1;
    }
    assert!(count > 0 || model(kind).is_none(), "{kind} has no case");
}

#[test]
fn singular_enhancement() {
    check("singular-enhancement");
}

#[test]
fn multiple_soft() {
    check("multiple-soft");
}

#[test]
fn single_hard() {
    check("single-hard");
}

#[test]
fn resolved_only() {
    check("resolved-only");
}

#[test]
fn collinear_expansion_with_pairs_and_composed() {
    check("collinear-expansion");
}

#[test]
fn every_effect_on_rates_has_a_case() {
    let cases = reference::cases("rate_effects");
    assert_eq!(cases.len(), 30);
    let kinds: BTreeSet<_> = cases.iter().flat_map(effect_kinds).collect();
    let expected = [
        "collinear-expansion",
        "multiple-soft",
        "resolved-only",
        "single-hard",
        "singular-enhancement",
    ];
    assert_eq!(kinds, BTreeSet::from(expected));
    let unknown: Vec<_> = kinds.iter().filter(|kind| model(kind).is_none()).collect();
    assert!(unknown.is_empty(), "not in the registry: {unknown:?}");
}

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
    let stronger = effect(
        "singular-enhancement",
        &[("factor", Setting::Number(0.3 * 1.05))],
    );
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
fn biased_pair_production_fails() {
    for phase in ["interference", "soft-gradient"] {
        let cases = reference::cases("rate_effects");
        let case = cases.iter().find(|case| {
            let effect = &case["medium"]["effects"][0];
            effect["phase"] == phase && effect["pair_production"] == true
        });
        let case = case.expect("the table has this case");
        assert!(worst(case, |_| {}) < 1.0, "{phase}");
        let without = effect("collinear-expansion", &[("phase", Setting::Word(phase))]);
        assert!(
            worst(
                case,
                medium(|medium| medium.effects = vec![without.clone()])
            ) > 1.0,
            "{phase}"
        );
    }
}
