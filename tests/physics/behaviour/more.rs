//! More medium does more.

use spindrift::medium::effects::EffectSettings;
use spindrift::medium::{FieldKind, MediumSettings, TransportKind};

use super::super::support::effects::{enhancement_along_the_path, plain};
use super::super::support::setup::{Setup, brick_with, up};
use super::super::support::statistics::{LARGEST_PULL, Mean};
use super::observe;

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
        (enhancement_along_the_path(0.05), [1.0, -1.0]),
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
