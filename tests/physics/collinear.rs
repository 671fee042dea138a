//! Proves: with `collinear` ordering the shower is leading-order timelike evolution.
//!
//! Hypothesis: at fixed coupling the mean over events of the sum of x^(N-1) over final quarks (Sigma), gluons, and
//! u minus ubar (valence) is the matrix exponential of collinear_moments.json with the same cut epsilon; as epsilon
//! falls the moments approach those of the textbook anomalous dimensions (Ellis, Stirling & Webber, chapter 4) in
//! proportion to epsilon.
//! N events: 4 x 10^5 (epsilon = .01), 6 x 10^4 (.003), 2 x 10^4 (.001), for quark and gluon. Statistic: pull of the
//! mean, 10^-6 two-sided. Moments 2, 3, 4, 6; the first moment (parton numbers) too, wide as it is.
//! Checks: 3 x 2 x 14 = 84, and 16 for the approach.
//! Smallest visible bias at epsilon = .01: 0.3 % of a quark's Sigma at N = 2, 0.5 % at N = 6; 0.4 % of parton numbers.
//!
//! Momentum is conserved event by event: the fractions sum to 1 within the rounding of the record's f32.

use serde_json::Value;

use spindrift::event::Status;
use spindrift::qcd::Species;
use spindrift::shower::{FlavourOpening, Ordering, ZRange};

use super::support::reference::{self, number};
use super::support::setup::{ALPHA_S, Setup, fixed, up};
use super::support::statistics::{LARGEST_PULL, Mean};

const POWERS: [i32; 5] = [1, 2, 3, 4, 6];

/// Means of Sigma, gluons, valence for each N.
type Moments = [[Mean; 3]; POWERS.len()];

fn setup(parton: Species, epsilon: f64, alpha_s: f64) -> Setup {
    let mut setup = Setup::single(parton, 100.0, 100.0).with_coupling(fixed(alpha_s));
    setup.shower.ordering = Ordering::Collinear;
    setup.shower.virtuality_cutoff_gev = 2.0;
    setup.shower.z_range = ZRange::Constant { epsilon };
    setup.shower.flavour_opening = FlavourOpening::Always;
    setup.full_history = false;
    setup
}

fn moments(setup: &Setup, events: i64) -> Moments {
    let mut means = Moments::default();
    let up = up().pdg();
    setup.events(0..events, |_, rows| {
        let mut sums = [[0.0; 3]; POWERS.len()];
        for row in rows.iter().filter(|row| row.status == Status::Final) {
            let x = f64::from(row.jet_fraction);
            let is_gluon = row.pdg == Species::GLUON.pdg();
            for (sum, n) in sums.iter_mut().zip(POWERS) {
                let term = x.powi(n - 1);
                sum[is_gluon as usize] += term;
                sum[2] += f64::from(i8::from(row.pdg == up) - i8::from(row.pdg == -up)) * term;
            }
        }
        // Rounding of each fraction to f32.
        assert!((sums[1][0] + sums[1][1] - 1.0).abs() < 1e-6);
        for (mean, sum) in means.iter_mut().flatten().zip(sums.iter().flatten()) {
            mean.add(*sum);
        }
    });
    means
}

/// Pulls of all moments against an entry's.
fn pulls(found: &Moments, expected: &Value, parton: &str) -> Vec<f64> {
    let mut pulls = Vec::new();
    for (means, row) in found
        .iter()
        .zip(expected.as_array().expect("a list of moments"))
    {
        for (mean, key) in means.iter().zip(["Sigma", "g", "valence"]) {
            let expected = number(&row[parton], key);
            // Number of valence quarks and momentum are conserved event by event: no width to measure by.
            if mean.variance() < 1e-9 {
                assert!((mean.value() - expected).abs() < 1e-6);
            } else {
                pulls.push(mean.pull(expected));
            }
        }
    }
    pulls
}

fn check(place: usize, epsilon: f64, events: i64) {
    let case = &reference::cases("collinear_moments")[place];
    assert_eq!(number(case, "epsilon"), epsilon);
    for (parton, name) in [(up(), "quark"), (Species::GLUON, "gluon")] {
        let found = moments(
            &setup(parton, epsilon, ALPHA_S).with_seed(place as u64),
            events,
        );
        let pulls = pulls(&found, &case["moments"], name);
        println!("epsilon {epsilon} {name}: pulls {pulls:.1?}");
        let sigma = &found[1][0];
        println!(
            "  Sigma N = 2: {:.6} +- {:.1e}",
            sigma.value(),
            sigma.error()
        );
        assert!(pulls.iter().all(|pull| pull.abs() < LARGEST_PULL));
    }
}

#[test]
fn moments_with_a_cut_of_one_percent() {
    check(0, 0.01, 400_000);
}

#[test]
fn moments_with_a_cut_of_three_permille() {
    check(1, 0.003, 60_000);
}

#[test]
fn moments_with_a_cut_of_one_permille() {
    check(2, 0.001, 20_000);
}

#[test]
fn a_coupling_off_by_one_percent_fails() {
    let case = &reference::cases("collinear_moments")[0];
    for (parton, name) in [(up(), "quark"), (Species::GLUON, "gluon")] {
        let found = moments(&setup(parton, 0.01, 1.01 * ALPHA_S), 200_000);
        let pulls = pulls(&found, &case["moments"], name);
        println!("alpha_s 1 % high, {name}: pulls {pulls:.1?}");
        assert!(pulls.iter().any(|pull| pull.abs() > LARGEST_PULL));
    }
}

/// The difference to the textbook's moments is visible at epsilon = .01 and falls in proportion to epsilon:
/// |d(.001)| <= |d(.01)|/10 + 4.9 sigma, and the tables with the cut say by how much.
#[test]
fn the_cut_fades_away() {
    let table = reference::load("collinear_moments");
    for (parton, name) in [(up(), "quark"), (Species::GLUON, "gluon")] {
        let wide = moments(&setup(parton, 0.01, ALPHA_S).with_seed(11), 100_000);
        let narrow = moments(&setup(parton, 0.001, ALPHA_S).with_seed(12), 20_000);
        for (place, row) in table["without_cut"]
            .as_array()
            .expect("a list")
            .iter()
            .enumerate()
        {
            // The textbook's list starts at N = 2.
            let place = place + 1;
            for (kind, key) in [(0, "Sigma"), (1, "g")] {
                let textbook = number(&row[name], key);
                let (wide, narrow) = (&wide[place][kind], &narrow[place][kind]);
                let [far, near] = [wide, narrow].map(|mean| mean.value() - textbook);
                println!(
                    "{name} N = {} {key}: {far:+.5} ({:.0} sigma) to {near:+.5} ({:.1} sigma)",
                    POWERS[place],
                    wide.pull(textbook),
                    narrow.pull(textbook)
                );
                let error = narrow.error().hypot(0.1 * wide.error());
                assert!((near - 0.1 * far).abs() < LARGEST_PULL * error + 0.02 * far.abs());
            }
        }
    }
}
