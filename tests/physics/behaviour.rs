//! Proves: effects behave as a medium must: more of it does more, none of it does nothing, envelopes do not matter.
//!
//! - Longer path, hotter field, stronger transport: each effect on rates makes more branchings and softer leading partons
//!   from medium to medium; `resolved-only` makes fewer, and harder ones; virtuality diffusion makes more, drag softer ones
//!   of the same number. Three media a knob; mean difference of the same events (twins) over its error: for the number of
//!   partons at 4.9 a step, for the leading share at 4.9 from the first to the last and no step at 4.9 the other way.
//!   7 effects x 3 knobs x 6 checks = 126; N = 12000 events a medium.
//! - A medium of no strength, for every effect: the vacuum to the last bit of every column. With a strength of 10^-12 the
//!   vacuum's branchings, and momenta that differ by no more than the square root of it (deterministic).
//! - Effects on paths that leave virtuality alone leave every branching of the vacuum twin as it is.
//! - Twice the envelope: for every effect on rates the same number of partons, leading fraction and number of induced
//!   branchings (two-sample Kolmogorov-Smirnov) and their means; 5 effects x 5 checks; N = 3 x 10^4 events each; smallest
//!   visible bias 2 % of a cumulative distribution. A channel that is halved must be seen.
//!
//! 10^-6 each.

use spindrift::event::{Parton, Status};
use spindrift::medium::effects::EffectSettings;
use spindrift::medium::{FieldKind, MediumSettings, TransportKind};
use spindrift::parameters::Setting;
use spindrift::qcd::Species;

use super::support::setup::{Setup, brick_with, effect, up};
use super::support::statistics::{
    LARGEST_DISTANCE, LARGEST_PULL, Mean, distance_between, pull_between,
};

fn plain(kind: &str) -> EffectSettings {
    effect(kind, &[])
}

fn number(kind: &str, key: &'static str, value: f64) -> EffectSettings {
    effect(kind, &[(key, Setting::Number(value))])
}

/// f along the path: `law` constant does not know the medium's size.
fn along_the_path(slope: f64) -> EffectSettings {
    effect(
        "singular-enhancement",
        &[
            ("law", Setting::Word("path")),
            ("slope_per_GeV2", Setting::Number(slope)),
        ],
    )
}

fn fluctuating_drag() -> EffectSettings {
    effect("drag", &[("fluctuations", Setting::Flag(true))])
}

/// What one event shows: number of final partons, and the largest energy of one over the jet's.
fn observe(rows: &[Parton]) -> [f64; 2] {
    let finals = || rows.iter().filter(|row| row.status == Status::Final);
    let leading = finals().map(|row| row.momentum_gev[3]).fold(0.0, f64::max);
    [finals().count() as f64, leading / rows[0].momentum_gev[3]]
}

/// Brick of length, temperature, and coefficient of cubic transport.
fn cubic(
    effect: &EffectSettings,
    [length_fm, temperature_gev, coefficient]: [f64; 3],
) -> MediumSettings {
    let mut medium = brick_with(length_fm, 1.0, vec![effect.clone()]);
    medium.field.kind = FieldKind::Brick {
        temperature_gev,
        length_fm,
    };
    medium.transport.kind = TransportKind::Cubic { coefficient };
    medium
}

/// Events of a medium: weight and observables.
fn sample(setup: &Setup, medium: MediumSettings, events: i64) -> Vec<(f64, [f64; 2])> {
    let mut all = Vec::new();
    let mut setup = setup.clone().with_medium(medium);
    setup.full_history = false;
    setup.events(0..events, |event, rows| {
        all.push((event.weight, observe(rows)))
    });
    all
}

/// Pulls of the differences between the first and second, second and third, first and last of three media, for the number
/// of partons and the leading share.
fn steps(effect: &EffectSettings, media: [[f64; 3]; 3]) -> [[f64; 2]; 3] {
    const EVENTS: i64 = 12_000;
    let setup = Setup::single(up(), 100.0, 20.0);
    let samples = media.map(|numbers| sample(&setup, cubic(effect, numbers), EVENTS));
    [[0, 1], [1, 2], [0, 2]].map(|[less, more]| {
        std::array::from_fn(|place| {
            let mut difference = Mean::default();
            for ((w0, less), (w1, more)) in samples[less].iter().zip(&samples[more]) {
                difference.add(w1 * more[place] - w0 * less[place]);
            }
            // Nothing at all where no event differs.
            if difference.variance() > 0.0 {
                difference.pull(0.0)
            } else {
                0.0
            }
        })
    })
}

#[test]
fn more_medium_does_more() {
    // Number of partons: up, down, as it is; leading share likewise.
    let cases = [
        (plain("collinear-expansion"), [1.0, -1.0]),
        (along_the_path(0.05), [1.0, -1.0]),
        (plain("multiple-soft"), [1.0, -1.0]),
        (plain("single-hard"), [1.0, -1.0]),
        (plain("resolved-only"), [-1.0, 1.0]),
        (plain("virtuality-diffusion"), [1.0, -1.0]),
        (plain("drag"), [0.0, -1.0]),
    ];
    let lengths = [1.0, 3.0, 9.0].map(|length| [length, 0.3, 6.0]);
    let temperatures = [0.2, 0.3, 0.45].map(|temperature| [4.0, temperature, 6.0]);
    let strengths = [1.0, 5.0, 25.0].map(|coefficient| [4.0, 0.3, coefficient]);
    for (effect, direction) in cases {
        for (knob, media) in [
            ("length", lengths),
            ("temperature", temperatures),
            ("strength", strengths),
        ] {
            let pulls = steps(&effect, media);
            println!("{effect:?}, {knob}: {pulls:.1?}");
            let towards = |place: usize| pulls.map(|pulls| pulls[place] * direction[place]);
            let [number, leading] = [towards(0), towards(1)];
            let what = format!("{effect:?}, {knob}");
            if direction[0] == 0.0 {
                assert_eq!(pulls.map(|pulls| pulls[0]), [0.0; 3], "{what}");
            } else {
                assert!(number.iter().all(|pull| *pull > LARGEST_PULL), "{what}");
            }
            assert!(leading[2] > LARGEST_PULL, "{what}");
            assert!(leading.iter().all(|pull| *pull > -LARGEST_PULL), "{what}");
        }
    }
}

fn opacity(per_fm: f64) -> EffectSettings {
    effect(
        "single-hard",
        &[
            ("centres", Setting::Word("given")),
            ("opacity_per_fm", Setting::Number(per_fm)),
            ("debye_mass_GeV", Setting::Number(0.5)),
        ],
    )
}

/// Every effect, with the strength of its own where that is not qhat.
fn effects(strength: f64) -> Vec<EffectSettings> {
    let word = |phase| effect("collinear-expansion", &[("phase", Setting::Word(phase))]);
    vec![
        word("interference"),
        word("rescattering"),
        word("soft-gradient"),
        number("singular-enhancement", "factor", strength),
        along_the_path(1.0),
        plain("multiple-soft"),
        plain("single-hard"),
        opacity(strength),
        plain("resolved-only"),
        plain("broadening"),
        plain("drag"),
        fluctuating_drag(),
        plain("virtuality-diffusion"),
    ]
}

fn jets() -> Setup {
    Setup::pair([up(), Species::GLUON], 120.0, 60.0)
}

/// Rows of all events but exchanges.
fn partons(setup: &Setup, events: i64) -> Vec<Vec<Parton>> {
    let mut all = Vec::new();
    setup.events(0..events, |_, rows| {
        let is_parton =
            |row: &&Parton| !matches!(row.status, Status::GivenToMedium | Status::TakenFromMedium);
        all.push(rows.iter().filter(is_parton).copied().collect());
    });
    all
}

#[test]
fn a_medium_without_strength_is_the_vacuum_to_the_last_bit() {
    let mut setup = jets();
    let vacuum = partons(&setup, 1500);
    setup.medium = Some(brick_with(4.0, 1.0, Vec::new()));
    assert!(partons(&setup, 1500) == vacuum);
    let (nothing, hot) = (effects(0.0), effects(1.0));
    for (without, with) in nothing.into_iter().zip(hot) {
        let of = |qhat: f64, effect: &EffectSettings| {
            let medium = brick_with(4.0, qhat, vec![effect.clone()]);
            partons(&jets().with_medium(medium), 1500)
        };
        // Strength of the transport, then of the effect.
        assert!(of(0.0, &with) == vacuum, "{with:?}");
        if without != with {
            assert!(of(1.0, &without) == vacuum, "{without:?}");
        }
        assert!(of(1.0, &with) != vacuum, "{with:?}");
    }
    // All of them at once.
    let all = brick_with(4.0, 0.0, effects(0.0));
    assert!(partons(&jets().with_medium(all), 1500) == vacuum);
}

/// As the strength goes to nothing the vacuum's branchings come back, and its momenta as the square root of the strength
/// (broadening and fluctuating drag) or faster.
#[test]
fn a_vanishing_medium_is_the_vacuum() {
    const STRENGTH: f64 = 1e-12;
    let vacuum = partons(&jets(), 1500);
    for chosen in effects(STRENGTH) {
        let medium = brick_with(4.0, STRENGTH, vec![chosen.clone()]);
        let mut largest = 0.0_f64;
        for (rows, twins) in partons(&jets().with_medium(medium), 1500)
            .iter()
            .zip(&vacuum)
        {
            assert_eq!(rows.len(), twins.len(), "{chosen:?}");
            for (row, twin) in rows.iter().zip(twins) {
                let kept =
                    |row: &Parton| (row.pdg, row.status, row.channel, row.splitting_fraction);
                assert_eq!(kept(row), kept(twin), "{chosen:?}");
                let t = row.virtuality_squared_gev2 - twin.virtuality_squared_gev2;
                assert!(t.abs() <= 1e-6 * twin.virtuality_squared_gev2, "{chosen:?}");
                for (one, other) in row.momentum_gev.iter().zip(twin.momentum_gev) {
                    largest = largest.max((one - other).abs());
                }
            }
        }
        println!("{chosen:?}: momenta off by {largest:.1e} GeV");
        // Some ten sigma of sqrt(qhat L), many times over along a jet.
        assert!(largest < 1e3 * (4.0 * STRENGTH).sqrt());
        let is_path = ["broadening", "drag", "virtuality-diffusion"].contains(&chosen.model.kind);
        assert_eq!(largest > 0.0, is_path, "{chosen:?}");
    }
}

/// Broadening and drag leave every branching of the vacuum twin as it is, and move its momenta.
#[test]
fn kicks_and_drag_change_no_branching() {
    let vacuum = partons(&jets(), 1500);
    for chosen in [plain("broadening"), plain("drag"), fluctuating_drag()] {
        let medium = brick_with(4.0, 1.0, vec![chosen.clone()]);
        let mut moved = 0;
        for (rows, twins) in partons(&jets().with_medium(medium), 1500)
            .iter()
            .zip(&vacuum)
        {
            assert_eq!(rows.len(), twins.len());
            for (row, twin) in rows.iter().zip(twins) {
                let kept = |row: &Parton| {
                    let fractions = [row.splitting_fraction, row.jet_fraction];
                    let t = row.virtuality_squared_gev2;
                    let lines = [row.colour, row.anticolour, row.pdg, row.parent];
                    (fractions, t, lines, row.status, row.channel)
                };
                // Parents are numbered with the exchange rows between.
                let without_parent = |row: &Parton| kept(&Parton { parent: 0, ..*row });
                assert_eq!(without_parent(row), without_parent(twin), "{chosen:?}");
                moved += (row.momentum_gev != twin.momentum_gev) as u32;
            }
        }
        println!("{chosen:?}: {moved} partons moved");
        assert!(moved > 5000);
    }
}

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
        number("singular-enhancement", "factor", 1.0),
        plain("multiple-soft"),
        opacity(0.2),
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
