//! Envelopes do not matter.

use spindrift::medium::effects::EffectSettings;
use spindrift::qcd::Species;

use super::super::support::effects::{centres, enhancement, plain};
use super::super::support::setup::{Setup, brick_with};
use super::super::support::statistics::{
    LARGEST_DISTANCE, LARGEST_PULL, Mean, distance_between, pull_between,
};
use super::observe;

/// Number of final partons, leading share and number of branchings from the medium's channel.
#[derive(Default)]
struct Distributions {
    values: [Vec<f64>; 3],
    means: [Mean; 2],
}

fn distributions(setup: &Setup, chosen: &EffectSettings, factor: f64, seed: u64) -> Distributions {
    let medium = brick_with(4.0, 2.0, vec![chosen.clone()]);
    let mut setup = setup.clone().with_medium(medium).with_seed(seed);
    setup.shower.envelope_factor = factor;
    let mut found = Distributions::default();
    setup.events(0..30_000, |event, rows| {
        assert_eq!(event.weight, 1.0, "{chosen:?}");
        let [number, leading] = observe(rows);
        let induced = rows.iter().filter(|row| row.channel > 1).count() / 2;
        for (list, value) in found
            .values
            .iter_mut()
            .zip([number, leading, induced as f64])
        {
            list.push(value);
        }
        found.means[0].add(number);
        found.means[1].add(leading);
    });
    found
}

fn over_limits(one: &mut Distributions, other: &mut Distributions) -> Vec<f64> {
    let lists = one.values.iter_mut().zip(&mut other.values);
    let mut found: Vec<f64> = lists
        .map(|(one, other)| distance_between(one, other) / LARGEST_DISTANCE)
        .collect();
    let means = one.means.iter().zip(&other.means);
    found.extend(means.map(|(one, other)| pull_between(one, other).abs() / LARGEST_PULL));
    found
}

#[test]
fn twice_the_envelope_changes_nothing() {
    let setup = Setup::single(Species::GLUON, 100.0, 20.0);
    for (place, chosen) in [
        plain("collinear-expansion"),
        enhancement(1.0),
        plain("multiple-soft"),
        centres(0.2, 0.5),
        plain("resolved-only"),
    ]
    .into_iter()
    .enumerate()
    {
        let seed = 40 + 10 * place as u64;
        let mut plain = distributions(&setup, &chosen, 1.0, seed);
        let mut doubled = distributions(&setup, &chosen, 2.0, seed + 1);
        let found = over_limits(&mut plain, &mut doubled);
        println!("{chosen:?}: over limits {found:.2?}");
        assert!(found.iter().all(|value| *value < 1.0), "{chosen:?}");
        // As if the medium's channel were halved under the wider envelope: half of the events from the vacuum.
        let mut mixed = distributions(&setup, &chosen, 2.0, seed + 2);
        let mut vacuum = setup.clone().with_seed(seed + 2);
        vacuum.full_history = true;
        let mut event = 0;
        vacuum.events(0..30_000, |_, rows| {
            if event % 2 == 0 {
                let [number, leading] = observe(rows);
                for (list, value) in mixed.values.iter_mut().zip([number, leading, 0.0]) {
                    list[event] = value;
                }
            }
            event += 1;
        });
        let found = over_limits(&mut plain, &mut mixed);
        assert!(
            found.iter().any(|value| *value > 1.0),
            "{chosen:?}: {found:.2?}"
        );
    }
}
