//! Proves: a parton reaches the cutoff unbranched with the probability Delta(Q, Q0) of its rate.
//!
//! Hypothesis: the number of unbranched primaries among N is binomial with the probability of no_branching.json
//! (quadrature, 10^-9). Quark and gluon; coupling fixed, at t and at k_T, one and two loops; kinematic and constant
//! range; both rules of flavour opening; start 7 to 200 GeV.
//! N = 10^6 a case, 141 cases. Statistic: the count, exact binomial tails, 10^-6 two-sided; so 141 checks here, and 1
//! of all cases together.
//! Smallest visible bias of the exponent: 4.9 sqrt((1-Delta)/(Delta N)): 0.006 (Delta = .43) to 0.02 (.047) absolute;
//! in a common relative bias of all rates, 0.1 % (the combined check).

use serde_json::Value;

use super::support::reference::{self, number};
use super::support::setup::{Setup, fixed};
use super::support::statistics::{LARGEST_PULL, SIGNIFICANCE, binomial_p_value, binomial_pull};
use spindrift::qcd::{Loops, ScaleArgument};
use spindrift::shower::FlavourOpening;

const EVENTS: u64 = 1_000_000;

fn unbranched(setup: &Setup) -> u64 {
    let mut count = 0;
    setup.first_branchings(EVENTS, |branching, weight| {
        assert_eq!(weight, 1.0, "nothing lies outside its envelope in vacuum");
        count += branching.is_none() as u64;
    });
    count
}

/// Estimates a common relative bias of the exponents, with its error, from many cases.
#[derive(Default)]
struct Common {
    information: f64,
    sum: f64,
}

impl Common {
    fn add(&mut self, count: u64, exponent: f64) {
        // The count tells the exponent to within sqrt((1-p)/(p N)); to first order its bias is (p - count/N)/p.
        let p = (-exponent).exp();
        let bias = (1.0 - count as f64 / EVENTS as f64 / p) / exponent;
        let weight = exponent * exponent * p / (1.0 - p) * EVENTS as f64;
        self.information += weight;
        self.sum += weight * bias;
    }

    fn bias(&self) -> f64 {
        self.sum / self.information
    }

    fn error(&self) -> f64 {
        1.0 / self.information.sqrt()
    }
}

fn check(chosen: impl Fn(&Value) -> bool, expected_cases: usize) {
    let cases: Vec<Value> = reference::cases("no_branching")
        .into_iter()
        .filter(chosen)
        .collect();
    assert_eq!(cases.len(), expected_cases);
    let mut common = Common::default();
    let mut worst = 0.0_f64;
    for (place, case) in cases.iter().enumerate() {
        let probability = number(case, "no_branching_probability");
        // A seed a case: with the same streams the cases would not be independent.
        let count = unbranched(&reference::setup(case).with_seed(place as u64));
        let tail = binomial_p_value(count, EVENTS, probability);
        worst = worst.max(binomial_pull(count, EVENTS, probability).abs());
        assert!(
            tail > SIGNIFICANCE,
            "{}: {count} of {EVENTS} unbranched against {probability}, probability {tail:.1e}",
            reference::name(case)
        );
        common.add(count, number(case, "exponent"));
    }
    println!(
        "{} cases, largest pull {worst:.2}, common bias of the rate {:+.1e} +- {:.1e}",
        cases.len(),
        common.bias(),
        common.error()
    );
    assert!(common.bias().abs() < LARGEST_PULL * common.error());
}

fn argument(case: &Value) -> &str {
    case["coupling"]["argument"].as_str().unwrap_or_default()
}

#[test]
fn fixed_coupling() {
    check(|case| argument(case) == "fixed", 21 + 18);
}

#[test]
fn coupling_at_virtuality() {
    check(|case| argument(case) == "virtuality", 42);
}

#[test]
fn one_loop_coupling_at_transverse_momentum() {
    let chosen =
        |case: &Value| argument(case) == "transverse-momentum" && case["coupling"]["loops"] == 1;
    check(chosen, 21 + 18);
}

#[test]
fn two_loop_coupling_at_transverse_momentum() {
    let chosen =
        |case: &Value| argument(case) == "transverse-momentum" && case["coupling"]["loops"] == 2;
    check(chosen, 21);
}

/// Wrong samplers against the right probability: each must fail the test that the right one passes.
#[test]
fn biased_samplers_fail() {
    let cases = reference::cases("no_branching");
    let find = |parton: &str, start: f64, law: &str, opening: Option<&str>| {
        let found = cases.iter().find(|case| {
            case["parton"] == parton
                && number(case, "start_virtuality_GeV") == start
                && number(case, "virtuality_cutoff_GeV") == 1.0
                && argument(case) == law
                && case["flavour_opening"].as_str() == opening
        });
        found.expect("the table has this case")
    };
    let fails = |case: &Value, change: &dyn Fn(&mut Setup)| {
        let mut setup = reference::setup(case);
        change(&mut setup);
        let mut count = 0;
        setup.first_branchings(EVENTS, |branching, _weight| {
            count += branching.is_none() as u64
        });
        binomial_p_value(count, EVENTS, number(case, "no_branching_probability")) < SIGNIFICANCE
    };
    let quark = find("quark", 10.0, "fixed", None);
    let gluon = find("gluon", 10.0, "fixed", Some("pair-threshold"));
    let running = find("quark", 10.0, "transverse-momentum", None);
    assert!(!fails(quark, &|_| {}));
    assert!(fails(quark, &|setup| setup.coupling = fixed(0.15 * 1.01)));
    assert!(fails(quark, &|setup| setup.shower.virtuality_cutoff_gev = 1.02));
    assert!(fails(gluon, &|setup| setup.shower.flavour_opening =
        FlavourOpening::Always));
    assert!(fails(running, &|setup| {
        setup.coupling.argument = ScaleArgument::Virtuality;
    }));
    assert!(fails(running, &|setup| {
        setup.coupling =
            super::support::setup::running(ScaleArgument::TransverseMomentum, Loops::Two);
    }));
    // An envelope that is too low, its weights thrown away.
    assert!(fails(quark, &|setup| setup.shower.envelope_factor = 0.8));
}

/// The accept rule stays exact under an envelope that is too low by a fifth: weighted, the same probability.
///
/// Each trial with f > g multiplies the weight's size by 2f/g - 1 < 1.5, so the variance is finite and small.
#[test]
fn a_low_envelope_is_carried_by_the_weight() {
    use super::support::statistics::Mean;
    let cases = reference::cases("no_branching");
    for case in cases
        .iter()
        .filter(|case| argument(case) == "fixed")
        .take(3)
    {
        let mut setup = reference::setup(case);
        setup.shower.envelope_factor = 0.8;
        let (mut all, mut kept) = (Mean::default(), Mean::default());
        setup.first_branchings(EVENTS, |branching, weight| {
            all.add(weight);
            kept.add(if branching.is_none() { weight } else { 0.0 });
        });
        let probability = number(case, "no_branching_probability");
        println!(
            "{}: <w> - 1 = {:+.1e}, pull {:.2}; pull of the probability {:.2}; <w^2> = {:.3}",
            reference::name(case),
            all.value() - 1.0,
            all.pull(1.0),
            kept.pull(probability),
            all.variance() + 1.0,
        );
        assert!(all.variance() > 0.01, "the envelope was not low");
        assert!(all.pull(1.0).abs() < LARGEST_PULL);
        assert!(kept.pull(probability).abs() < LARGEST_PULL);
    }
}
