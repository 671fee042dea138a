//! Proves: the first branching of a parton has the right t, z and kind, whatever the envelope.
//!
//! Hypothesis: given a branching, t and (for each kind) z follow the tables of first_branching.json (quadrature;
//! linear interpolation errs by less than 10^-5, which is added to the threshold), and the share of each kind is
//! binomial. 12 set-ups: quark and gluon, all three couplings, kinematic and constant range.
//! N = 10^6 primaries a set-up and an envelope factor (1 and 2). Statistics: Kolmogorov-Smirnov for ln t and
//! logit z, exact binomial tails for shares; 10^-6 each. Checks: 2 (6 x 2 quark + 6 x 4 gluon) = 72.
//! Smallest visible bias: 2.7/sqrt(N) = 0.3 % of the cumulative distribution anywhere.
//!
//! Whole events under doubled envelopes: two-sample Kolmogorov-Smirnov of the number of partons, of the largest
//! fraction, of the transverse momentum spread, and of the mean number of partons; vacuum and medium, N = 2 x 10^5
//! each; 8 checks; smallest visible bias 0.9 % of a cumulative distribution, 1 % of the mean number.

use serde_json::Value;

use spindrift::event::{Parton, Status};
use spindrift::medium::effects::collinear_expansion::PhaseSettings;
use spindrift::qcd::Species;

use super::support::reference::{self, Cumulative, logit, number};
use super::support::setup::{Setup, brick, fixed, up};
use super::support::statistics::{
    LARGEST_DISTANCE, LARGEST_PULL, Mean, SIGNIFICANCE, binomial_p_value, distance,
    distance_between, pull_between,
};

const EVENTS: u64 = 1_000_000;
/// Largest error of linear interpolation in the tables.
const INTERPOLATION_ERROR: f64 = 1e-5;

/// ln t of all first branchings, logit z of each kind: q-qg and g-gg, g-qq.
struct Sample {
    ln_t: Vec<f64>,
    logit_z: [Vec<f64>; 2],
}

fn sample(setup: &Setup) -> Sample {
    let mut sample = Sample {
        ln_t: Vec::new(),
        logit_z: [Vec::new(), Vec::new()],
    };
    let is_gluon = matches!(&setup.source,
        spindrift::source::SourceSettings::Single(single) if single.parton.is_gluon());
    setup.first_branchings(EVENTS, |branching, _weight| {
        let Some(branching) = branching else { return };
        let [first, second] = branching.daughters;
        let pair = is_gluon && !first.is_gluon();
        let expected = match (is_gluon, pair) {
            (false, _) => [up(), Species::GLUON],
            (true, false) => [Species::GLUON; 2],
            (true, true) => [first, first.conjugate()],
        };
        assert_eq!([first, second], expected);
        assert!(!pair || !first.is_antiquark());
        sample.ln_t.push(branching.t.ln());
        sample.logit_z[pair as usize].push(logit(branching.z));
    });
    sample
}

/// Distances over their thresholds, all below 1 if the sample follows the table: t, z of each kind, share of pairs.
fn verdicts(case: &Value, mut sample: Sample) -> Vec<f64> {
    let allowed = |draws: usize| LARGEST_DISTANCE + INTERPOLATION_ERROR * (draws as f64).sqrt();
    let table = Cumulative::new(&case["t"]["ln_t"], &case["t"]["cdf"], 1.0);
    let branched = sample.ln_t.len();
    let mut found = vec![distance(&mut sample.ln_t, |x| table.at(x)) / allowed(branched)];
    let kinds: &[&str] = if case["parton"] == "gluon" {
        &["g-gg", "g-qq"]
    } else {
        &["q-qg"]
    };
    for (kind, draws) in kinds.iter().zip(&mut sample.logit_z) {
        let entry = &case["z"][*kind];
        let table = Cumulative::new(&entry["logit_z"], &entry["cdf"], 1.0);
        let count = draws.len();
        found.push(distance(draws, |x| table.at(x)) / allowed(count));
    }
    if kinds.len() == 2 {
        let pairs = sample.logit_z[1].len() as u64;
        let share = number(&case["z"]["g-qq"], "share");
        let tail = binomial_p_value(pairs, branched as u64, share);
        found.push(tail.ln() / SIGNIFICANCE.ln());
    }
    found
}

fn check(envelope_factor: f64, seed: u64) {
    for (place, case) in reference::cases("first_branching").iter().enumerate() {
        let mut setup = reference::setup(case).with_seed(seed + place as u64);
        setup.shower.envelope_factor = envelope_factor;
        let found = verdicts(case, sample(&setup));
        println!("{}: over threshold {found:.2?}", reference::name(case));
        assert!(
            found.iter().all(|value| *value < 1.0),
            "{}: {found:?}",
            reference::name(case)
        );
    }
}

#[test]
fn first_branchings_follow_the_rate() {
    check(1.0, 100);
}

#[test]
fn doubled_envelopes_change_nothing() {
    check(2.0, 200);
}

#[test]
fn biased_samplers_fail() {
    let cases = reference::cases("first_branching");
    let quark = &cases[0];
    let gluon = cases
        .iter()
        .find(|case| case["parton"] == "gluon" && case["start_virtuality_GeV"] == 10.0)
        .expect("the table has a gluon near the thresholds");
    let worst = |case: &Value, change: &dyn Fn(&mut Setup), spoil: &dyn Fn(&mut Sample)| {
        let mut setup = reference::setup(case).with_seed(400);
        change(&mut setup);
        let mut found = sample(&setup);
        spoil(&mut found);
        verdicts(case, found)
    };
    let nothing = |_: &mut Setup| {};
    assert!(
        worst(quark, &nothing, &|_| {})
            .iter()
            .all(|value| *value < 1.0)
    );
    // Rates 2 % too high.
    assert!(worst(quark, &|setup| setup.coupling = fixed(0.153), &|_| {})[0] > 1.0);
    // z and 1 - z exchanged in one branching of 150.
    let exchanged = worst(quark, &nothing, &|sample| {
        sample.logit_z[0]
            .iter_mut()
            .step_by(150)
            .for_each(|x| *x = -*x);
    });
    assert!(exchanged[1] > 1.0);
    // Heavy quark pairs open below their thresholds.
    let open = worst(
        gluon,
        &|setup| setup.shower.flavour_opening = spindrift::shower::FlavourOpening::Always,
        &|_| {},
    );
    assert!(open[3] > 1.0);
    // A low envelope without its weights.
    assert!(worst(quark, &|setup| setup.shower.envelope_factor = 0.7, &|_| {})[0] > 1.0);
}

/// Number of final partons, largest fraction of one of them, sum of transverse momenta to the jet's axis.
#[derive(Default)]
struct Observables {
    number: Vec<f64>,
    largest: Vec<f64>,
    spread: Vec<f64>,
    mean_number: Mean,
}

fn observe(setup: &Setup) -> Observables {
    const EVENTS: i64 = 200_000;
    let mut found = Observables::default();
    let mut setup = setup.clone();
    setup.full_history = false;
    setup.events(0..EVENTS, |event, rows| {
        assert_eq!(event.weight, 1.0);
        let axis = rows[0]
            .momentum_gev
            .map(|component| component / rows[0].momentum_gev[3]);
        let finals = || rows.iter().filter(|row| row.status == Status::Final);
        let transverse = |row: &Parton| {
            let along: f64 = (0..3).map(|i| axis[i] * row.momentum_gev[i]).sum();
            let square: f64 = (0..3).map(|i| row.momentum_gev[i].powi(2)).sum();
            (square - along * along).max(0.0).sqrt()
        };
        let number = finals().count() as f64;
        found.number.push(number);
        found.mean_number.add(number);
        found.largest.push(
            finals()
                .map(|row| f64::from(row.jet_fraction))
                .fold(0.0, f64::max),
        );
        found.spread.push(finals().map(transverse).sum());
    });
    found
}

fn compare_whole_events(setup: Setup) {
    let mut doubled = setup.clone().with_seed(2);
    doubled.shower.envelope_factor = 2.0;
    let (mut plain, mut doubled) = (observe(&setup), observe(&doubled));
    let distances = [
        distance_between(&mut plain.number, &mut doubled.number),
        distance_between(&mut plain.largest, &mut doubled.largest),
        distance_between(&mut plain.spread, &mut doubled.spread),
    ];
    let pull = pull_between(&plain.mean_number, &doubled.mean_number);
    println!(
        "distances {distances:.2?}, pull of <n> {pull:.2}, <n> {:.4}",
        plain.mean_number.value()
    );
    assert!(
        distances
            .iter()
            .all(|distance| *distance < LARGEST_DISTANCE)
    );
    assert!(pull.abs() < LARGEST_PULL);
}

#[test]
fn whole_vacuum_events_under_doubled_envelopes() {
    compare_whole_events(Setup::single(up(), 100.0, 100.0));
}

#[test]
fn whole_medium_events_under_doubled_envelopes() {
    let brick = brick(4.0, 1.0, PhaseSettings::Interference);
    compare_whole_events(Setup::single(Species::GLUON, 100.0, 40.0).with_medium(brick));
}
