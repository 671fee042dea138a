//! Proves: in a brick the first branching has the rate of every effect on rates, alone and composed with others.
//!
//! Hypothesis: the tables of rate_effects.json (quadrature over t and z, apart from the engine). Where the vacuum's
//! channel, f_vac Theta + sum min(D_i, 0), is nowhere negative all weights are 1 and: unbranched primaries are
//! binomial, branchings from the medium's channels are binomial for each kind of splitting, ln t given a branching and
//! logit z of each kind follow the tables (Kolmogorov-Smirnov; interpolation error 10^-5 added). Where it is negative
//! (the density changes sign, or a veto leaves nothing of the vacuum under a negative change) <w> = 1, and the
//! weighted share of unbranched primaries and weighted distributions are those of the tables: pulls of means at 10^-6
//! (4.9), 20 points a distribution at 10^-6/20 each (5.5).
//! N = 2 x 10^5 primaries a set-up, 3 x 10^5 where they are weighted. Checks: 30 cases x at most 6, and 2 of pairs.
//! Smallest visible bias: .6 % of a cumulative distribution; of an induced share p, 4.9 sqrt(p(1-p)/N), 2 % at p = .2.
//!
//! So that this can fail: 24 wrong samplers, each against a case that must see it.

use std::collections::BTreeSet;

use serde_json::Value;

use spindrift::medium::effects::model;
use spindrift::medium::{FieldKind, MediumSettings, TransportKind};
use spindrift::parameters::Setting;
use spindrift::qcd::{C_A, HBAR_C_GEV_FM, Species, T_R};

use spindrift::shower::ZRange;

use super::support::first_branching::{Sample, weighted_pulls};
use super::support::reference::{self, effect_kinds, number};
use super::support::setup::{ALPHA_S, Setup, brick_with, effect, fixed};
use super::support::statistics::{LARGEST_PULL, SIGNIFICANCE, binomial_p_value};

const EVENTS: u64 = 200_000;
const WEIGHTED_EVENTS: u64 = 300_000;
/// Wide envelopes keep weights near 1, see `medium_sign`.
const ENVELOPE_FACTOR: f64 = 4.0;

/// For gluons the spectra draw the positive part of each gluon's emission, not of their sum: by quadrature 0.3 to 0.8 % more
/// than the table's share in its cases, and as much less from the vacuum.
const LARGEST_SURPLUS_OF_IMAGES: f64 = 0.01;

fn is_spectrum(kind: &&str) -> bool {
    matches!(*kind, "multiple-soft" | "single-hard")
}

fn draws_images(case: &Value) -> bool {
    case["parton"] == "gluon" && effect_kinds(case).iter().any(is_spectrum)
}

/// Whether the vacuum's channel turns negative, so that weights carry it.
fn is_weighted(case: &Value) -> bool {
    let kinds = effect_kinds(case);
    let vetoes = kinds.contains(&"resolved-only");
    case["density_changes_sign"] == true || vetoes && kinds.iter().any(is_spectrum)
}

fn check(kind: &str) {
    let cases = reference::cases("rate_effects");
    let mut count = 0;
    for (place, case) in cases.iter().enumerate() {
        let seed = 1500 + place as u64;
        // A case belongs to its first effect.
        if effect_kinds(case)[0] != kind {
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
            let surplus = if draws_images(case) {
                LARGEST_SURPLUS_OF_IMAGES
            } else {
                0.0
            };
            let found = Sample::of(&setup, EVENTS).over_limits_with_surplus(case, surplus);
            println!("{name}: over limit {found:.2?}");
            assert!(found.iter().all(|value| *value < 1.0), "{name}: {found:?}");
        }
        count += 1;
    }
    assert!(count > 2, "{kind} has {count} cases");
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
    let centres = |opacity_per_fm: f64, debye_mass_gev: f64| {
        let given = [
            ("centres", Setting::Word("given")),
            ("opacity_per_fm", Setting::Number(opacity_per_fm)),
            ("debye_mass_GeV", Setting::Number(debye_mass_gev)),
        ];
        let wrong = effect("single-hard", &given);
        worst(&hard, medium(|medium| medium.effects = vec![wrong.clone()]))
    };
    assert!(centres(0.6, 0.7) < 1.0);
    assert!(centres(0.6 * 1.05, 0.7) > 1.0);
    assert!(centres(0.6 * 4.0 / 9.0, 0.7) > 1.0);
    assert!(centres(0.6, 0.75) > 1.0);
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

/// Where `soft-gradient` is negative it thins pairs too if it makes them: no branching and the share of pairs among first
/// branchings of a gluon against the rate integrated here (fixed coupling, closed forms in z, Gauss over ln t), with a
/// strength that leaves the density positive. Binomial, 2 checks, N = 3 x 10^5; without the thinning of pairs both must fail.
#[test]
fn pairs_are_thinned_where_the_change_is_negative() {
    const PRIMARIES: u64 = 300_000;
    let soft_gradient = effect(
        "collinear-expansion",
        &[
            ("phase", Setting::Word("soft-gradient")),
            ("pair_production", Setting::Flag(true)),
        ],
    );
    let mut brick = brick_with(2.0, 5.0, vec![soft_gradient]);
    brick.limit_to_small_angles = false;
    let mut setup = Setup::single(Species::GLUON, 100.0, 4.0)
        .with_coupling(fixed(ALPHA_S))
        .with_medium(brick)
        .with_seed(1650);
    // Away from the ends, where the change is largest and gluons would turn negative.
    setup.shower.z_range = ZRange::Constant { epsilon: 0.2 };
    let (mut unbranched, mut pairs) = (0, 0);
    setup.first_branchings(PRIMARIES, |branching, weight| {
        assert_eq!(weight, 1.0);
        unbranched += branching.is_none() as u64;
        pairs += branching.is_some_and(|branching| !branching.daughters[0].is_gluon()) as u64;
    });
    let tails = |thinned| {
        let (none, pair) = first_of_gluon(5.0, 2.0, 100.0, 16.0, thinned);
        [
            binomial_p_value(unbranched, PRIMARIES, none),
            binomial_p_value(pairs, PRIMARIES, pair),
        ]
    };
    let (with, without) = (tails(true), tails(false));
    println!("tails {with:?}, without the thinning of pairs {without:?}");
    assert!(tails(true).iter().all(|tail| *tail > SIGNIFICANCE));
    assert!(tails(false).iter().all(|tail| *tail < SIGNIFICANCE));
}

/// The probabilities of no branching down to 1 GeV^2, and of a first branching into a pair.
fn first_of_gluon(
    qhat: f64,
    length_fm: f64,
    energy_gev: f64,
    start_t: f64,
    thinned: bool,
) -> (f64, f64) {
    const STEPS: usize = 20_000;
    let step = start_t.ln() / STEPS as f64;
    let (mut exponent, mut pairs) = (0.0_f64, 0.0);
    for place in 0..STEPS {
        // Midpoints, from the start down.
        let t = (start_t.ln() - (place as f64 + 0.5) * step).exp();
        let low: f64 = 0.2;
        let high: f64 = 1.0 - low;
        let x = length_fm * t / (2.0 * energy_gev * HBAR_C_GEV_FM);
        // S_c of physics.md, section 7.
        let phase = 2.0 * x - 4.0 * x.sin() + 2.0 * x * x.cos();
        let change = qhat * length_fm / x / t * phase;
        let logarithm = (high / low).ln();
        let width = high - low;
        let cubes = high.powi(3) - low.powi(3);
        // Kernels, and kernels over z(1-z), over z.
        let gluons = [
            2.0 * logarithm - 2.0 * width + 0.5 * width - cubes / 3.0,
            2.0 * (1.0 / low - 1.0 / high) + width,
        ];
        let quarks = [
            width - (high * high - low * low) + 2.0 * cubes / 3.0,
            2.0 * logarithm - 2.0 * width,
        ];
        let open = 3.0 + f64::from(t > 9.0);
        let factor = ALPHA_S / std::f64::consts::TAU * step;
        let gluon_rate = C_A * (gluons[0] + change * gluons[1]);
        let change = if thinned || change > 0.0 { change } else { 0.0 };
        let quark_rate = open * T_R * (quarks[0] + change * quarks[1]);
        let whole = factor * (gluon_rate + quark_rate);
        pairs += factor * quark_rate * (-exponent - 0.5 * whole).exp();
        exponent += whole;
    }
    ((-exponent).exp(), pairs)
}
