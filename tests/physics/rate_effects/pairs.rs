//! Pairs that the medium thins.

use spindrift::parameters::Setting;
use spindrift::qcd::{C_A, HBAR_C_GEV_FM, Species, T_R};
use spindrift::shower::ZRange;

use super::super::support::effects::effect;
use super::super::support::setup::{ALPHA_S, Setup, brick_with, fixed};
use super::super::support::statistics::{SIGNIFICANCE, binomial_p_value};

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
