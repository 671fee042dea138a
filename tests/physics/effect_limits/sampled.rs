//! Sampled branchings: fractions of gluons are symmetric, and places are where the medium is.

use spindrift::event::Parton;
use spindrift::medium::{FieldKind, TransportKind};
use spindrift::qcd::{HBAR_C_GEV_FM, Species};

use super::super::support::effects::{centres, enhancement, phase, plain};
use super::super::support::setup::{Setup, brick_with, up};
use super::super::support::statistics::{
    LARGEST_DISTANCE, SIGNIFICANCE, binomial_p_value, distance, distance_between,
};

/// Sampled fractions of g -> g g from the medium's channel: as many below one half as above, and the same on both sides.
#[test]
fn sampled_gluons_are_symmetric() {
    for (place, chosen) in [
        plain("collinear-expansion"),
        phase("soft-gradient"),
        enhancement(0.5),
        plain("multiple-soft"),
        centres(0.3, 0.6),
    ]
    .into_iter()
    .enumerate()
    {
        let setup = Setup::single(Species::GLUON, 100.0, 15.0)
            .with_medium(brick_with(3.0, 1.0, vec![chosen.clone()]))
            .with_seed(60 + place as u64);
        let mut sides: [Vec<f64>; 2] = Default::default();
        setup.first_branchings(150_000, |branching, _| {
            if let Some(branching) = branching.filter(|branching| branching.channel > 0) {
                let z = branching.z;
                sides[(z > 0.5) as usize].push(z.min(1.0 - z).ln());
            }
        });
        let [low, high] = [sides[0].len() as u64, sides[1].len() as u64];
        let tail = binomial_p_value(low, low + high, 0.5);
        let [one, other] = &mut sides;
        let found = distance_between(one, other);
        println!("{chosen:?}: {low} and {high}, tail {tail:.3}, distance {found:.2}");
        assert!(low > 3000);
        assert!(tail > SIGNIFICANCE && found < LARGEST_DISTANCE);
        // One in thirty exchanged.
        let moved = (low + high) / 30;
        if low > 8000 {
            assert!(binomial_p_value(low - moved, low + high, 0.5) < SIGNIFICANCE);
        }
    }
}

/// Uniform numbers, if the daughters of induced first branchings of primaries are born where `below` says.
fn places(setup: &Setup, below: impl Fn(f64, &Parton) -> f64) -> Vec<f64> {
    let mut uniform = Vec::new();
    setup.events(0..40_000, |_, rows| {
        let induced = rows[2..]
            .iter()
            .find(|row| row.parent == 1 && row.channel == 2);
        if let Some(daughter) = induced {
            uniform.push(below(f64::from(daughter.birth_fm[0]), &rows[1]));
        }
    });
    uniform
}

#[test]
fn induced_branchings_happen_where_the_medium_is() {
    const LENGTH_FM: f64 = 3.0;
    let (start_gev, start_fm, end_gev): (f64, f64, f64) = (0.45, 0.6, 0.15);
    let ln_ends = 3.0 * (start_gev / end_gev).ln();
    for chosen in [plain("multiple-soft"), centres(0.3, 0.6)] {
        let brick = Setup::single(Species::GLUON, 100.0, 15.0).with_medium(brick_with(
            LENGTH_FM,
            1.0,
            vec![chosen.clone()],
        ));
        let mut expanding = brick.clone();
        let medium = expanding.medium.as_mut().expect("a medium");
        medium.transport.kind = TransportKind::Cubic { coefficient: 4.0 };
        medium.field.end_temperature_gev = end_gev;
        medium.field.kind = FieldKind::Longitudinal {
            temperature_gev: start_gev,
            start_fm,
        };
        // qhat is constant, and falls with 1/tau.
        let mut in_brick = places(&brick, |t_fm, _| t_fm / LENGTH_FM);
        let mut in_field = places(&expanding, |t_fm, _| (t_fm / start_fm).ln() / ln_ends);
        let found = [&mut in_brick, &mut in_field].map(|u| distance(u, |u| u.clamp(0.0, 1.0)));
        println!(
            "{chosen:?}: {} and {}, distances {found:.2?}",
            in_brick.len(),
            in_field.len()
        );
        assert!(in_brick.len() > 1000 && in_field.len() > 1000);
        assert!(found.iter().all(|found| *found < LARGEST_DISTANCE));
        // Places by the square of the way must fail.
        let mut wrong: Vec<f64> = in_brick.iter().map(|u| u.powi(3)).collect();
        assert!(distance(&mut wrong, |u| u) > LARGEST_DISTANCE);
    }
    let enhanced = Setup::single(up(), 100.0, 15.0).with_medium(brick_with(
        LENGTH_FM,
        1.0,
        vec![enhancement(1.0)],
    ));
    let mut lives = places(&enhanced, |t_fm, primary| {
        let mean_fm = 2.0 * primary.momentum_gev[3] / f64::from(primary.virtuality_squared_gev2)
            * HBAR_C_GEV_FM;
        1.0 - (-t_fm / mean_fm).exp()
    });
    let found = distance(&mut lives, |u| u.clamp(0.0, 1.0));
    println!(
        "enhancement: {} lifetimes, distance {found:.2}",
        lives.len()
    );
    assert!(lives.len() > 5000 && found < LARGEST_DISTANCE);
}
