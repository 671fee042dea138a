//! Bounds, means, draws, and their speed.

use super::*;
use crate::medium::effects::multiple_soft::table::MultipleSoftTable;
use crate::medium::effects::single_hard::table::SingleHardTable;
use crate::random::{Key, Purpose};

fn stream(number: u64) -> Stream {
    Key::event(11, number).stream(Purpose::named("test"))
}

/// omega from 1 to 100 GeV, omega_c = 63 GeV, qhat L = 5 GeV^2, kappa > 0.5 GeV, start virtuality 100 GeV, kappa < omega.
fn strong_brick() -> Region {
    Region {
        ln_x: [-4.14, 0.46],
        ln_y_floor: -3.0,
        ceilings: [
            Line {
                at_zero: 7.14,
                slope: 1.0,
            },
            Line {
                at_zero: 6.68,
                slope: 2.0,
            },
        ],
    }
}

/// omega_c = 3 GeV, qhat L = 0.6 GeV^2, start virtuality 20 GeV.
fn weak_brick() -> Region {
    Region {
        ln_x: [-1.1, 3.5],
        ln_y_floor: -0.9,
        ceilings: [
            Line {
                at_zero: 3.0,
                slope: 1.0,
            },
            Line {
                at_zero: 2.7,
                slope: 2.0,
            },
        ],
    }
}

/// Partly beyond the tabulated cells on every side.
fn vast() -> [Region; 4] {
    let level = |at_zero| {
        [Line {
            at_zero,
            slope: 0.0,
        }; 2]
    };
    [
        Region {
            ln_x: [-13.1, -11.3],
            ln_y_floor: -1.0,
            ceilings: level(2.1),
        },
        Region {
            ln_x: [11.4, 12.9],
            ln_y_floor: 11.0,
            ceilings: level(16.0),
        },
        Region {
            ln_x: [-3.0, -2.0],
            ln_y_floor: -15.3,
            ceilings: level(-13.2),
        },
        Region {
            ln_x: [1.0, 1.5],
            ln_y_floor: 17.1,
            ceilings: level(19.0),
        },
    ]
}

/// The bound holds at random points of random cells and on their borders.
fn bound_holds<S: ScaledSpectrum>(spectrum: &S) {
    let mut stream = stream(1);
    for place in 0..100_000 {
        let row = -52 + (104.0 * stream.random::<f64>()) as i64;
        let column = -4 + (136.0 * stream.random::<f64>()) as i64;
        let cell = cell(row, column);
        let bound = spectrum.bound(cell);
        let mut within = |[low, high]: [f64; 2], border: bool| {
            let share: f64 = stream.random();
            if border {
                [low, high][(share < 0.5) as usize]
            } else {
                low + share * (high - low)
            }
        };
        let ln_x = within(cell.ln_x, place % 3 == 0);
        let ln_y = within(cell.ln_y, place % 5 == 0);
        // Below the table the exact spectrum costs microseconds.
        if ln_x < -9.25 && place % 8 != 0 {
            continue;
        }
        let h = spectrum.value(ln_x, ln_y);
        assert!(h.is_finite() && bound >= 0.0);
        assert!(h <= bound, "h({ln_x}, {ln_y}) = {h} above {bound}");
    }
}

#[test]
fn bounds_hold_everywhere() {
    bound_holds(&MultipleSoftTable::new());
    bound_holds(&SingleHardTable::new());
}

/// Pull of chi-square for drawn points in cells (hypothesis: density bound/mean), over cells with 20 or more expected,
/// the rest as one; `bias` multiplies the expectation in every other cell.
fn pull<S: ScaledSpectrum>(plane: &Plane<S>, region: &Region, draws: usize, bias: f64) -> f64 {
    let mut stream = stream(2);
    let whole = plane.mean(region);
    let mut counts = std::collections::BTreeMap::new();
    for _ in 0..draws {
        let point = plane.draw(region, whole, &mut stream);
        let row = (point.ln_x / STEP).floor() as i64;
        let column = (point.ln_y / STEP).floor() as i64 - FIRST_COLUMN;
        assert!(point.bound > 0.0 && point.ln_y >= region.ln_y_floor - 1e-12);
        assert_eq!(point.bound, plane.bound(row, column));
        *counts.entry((row, column)).or_insert(0u64) += 1;
    }
    let mut expected = Vec::new();
    for strip in strips(region) {
        for (column, share) in pieces(&strip) {
            let weight = if (strip.row + column) % 2 == 0 {
                bias
            } else {
                1.0
            };
            let mean = strip.width() * share * STEP * plane.bound(strip.row, column);
            expected.push(((strip.row, column), weight * mean));
        }
    }
    let total: f64 = expected.iter().map(|(_, mean)| mean).sum();
    let (mut chi_square, mut cells) = (0.0, 0.0);
    let (mut rest_found, mut rest_expected) = (0.0, 0.0);
    for (place, mean) in expected {
        let mean = mean / total * draws as f64;
        let found = counts.get(&place).copied().unwrap_or(0) as f64;
        if mean < 20.0 {
            rest_found += found;
            rest_expected += mean;
            continue;
        }
        chi_square += (found - mean).powi(2) / mean;
        cells += 1.0;
    }
    if rest_expected > 20.0 {
        chi_square += (rest_found - rest_expected).powi(2) / rest_expected;
        cells += 1.0;
    }
    let freedom: f64 = cells - 1.0;
    // Wilson & Hilferty 1931: the cube root of chi-square is nearly normal.
    let spread = 2.0 / (9.0 * freedom);
    ((chi_square / freedom).cbrt() - (1.0 - spread)) / spread.sqrt()
}

/// N = 10^6 for the two bricks, 10^5 beyond the tables; one-sided 10^-6. A bias b in every other cell adds about
/// N (b/2)^2 to a chi-square of up to 600 cells, so 2.6 % would be seen half of the time; one of 4 % must be.
#[test]
fn drawn_points_have_the_density_of_the_bounds() {
    const LARGEST_PULL: f64 = 4.8;
    let plane = Plane::new(MultipleSoftTable::new());
    for region in [strong_brick(), weak_brick()] {
        let found = pull(&plane, &region, 1_000_000, 1.0);
        assert!(found < LARGEST_PULL, "{found}");
        assert!(pull(&plane, &region, 1_000_000, 1.04) > LARGEST_PULL);
    }
    for region in vast() {
        let found = pull(&plane, &region, 100_000, 1.0);
        assert!(found < LARGEST_PULL, "{region:?}: {found}");
    }
}

/// The mean is the integral over strips of cells, also where tables and computed bounds meet, and adds up.
#[test]
fn the_mean_is_the_integral_of_the_bounds() {
    let plane = Plane::new(SingleHardTable::new());
    for region in vast().into_iter().chain([strong_brick(), weak_brick()]) {
        let direct: f64 = strips(&region)
            .flat_map(|strip| {
                pieces(&strip)
                    .map(move |(column, share)| (strip, column, share))
                    .collect::<Vec<_>>()
            })
            .map(|(strip, column, share)| {
                strip.width() * share * STEP * plane.spectrum().bound(cell(strip.row, column))
            })
            .sum();
        let mean = plane.mean(&region);
        assert!(
            (mean - direct).abs() <= 1e-9 * direct,
            "{mean}, not {direct}"
        );
    }
    let empty = Region {
        ln_x: [1.0, 1.0],
        ..strong_brick()
    };
    let closed = Region {
        ln_y_floor: 30.0,
        ..strong_brick()
    };
    assert_eq!((plane.mean(&empty), plane.mean(&closed)), (0.0, 0.0));
    assert_eq!(plane.draw(&closed, 0.0, &mut stream(4)).bound, 0.0);
}

/// Share of drawn points that the exact spectrum keeps: N = 20000, so one per cent is three standard deviations.
fn acceptance<S: ScaledSpectrum>(plane: &Plane<S>, region: &Region) -> f64 {
    let mut stream = stream(3);
    let mean = plane.mean(region);
    let kept: f64 = (0..20_000)
        .map(|_| plane.draw(region, mean, &mut stream))
        .filter(|point| region.holds(point.ln_x, point.ln_y))
        .map(|point| plane.spectrum().value(point.ln_x, point.ln_y).max(0.0) / point.bound)
        .sum();
    kept / 20_000.0
}

#[test]
fn most_drawn_points_are_kept() {
    let (soft, hard) = (
        Plane::new(MultipleSoftTable::new()),
        Plane::new(SingleHardTable::new()),
    );
    for region in [strong_brick(), weak_brick()] {
        let kept = (acceptance(&soft, &region), acceptance(&hard, &region));
        assert!(kept.0 > 0.4 && kept.1 > 0.4, "{kept:?}");
    }
}

/// Prints times: `cargo test --release speed_of -- --ignored --nocapture`.
#[test]
#[ignore = "a measurement"]
fn speed_of_tables_and_plane() {
    let timed = |name: &str, count: usize, work: &mut dyn FnMut() -> f64| {
        let mut best = f64::INFINITY;
        let mut sum = 0.0;
        for _ in 0..7 {
            let start = std::time::Instant::now();
            sum += work();
            best = best.min(start.elapsed().as_secs_f64());
        }
        println!("{name}: {:.2} ns ({sum:.3e})", best * 1e9 / count as f64);
    };
    timed("build soft", 1, &mut || {
        MultipleSoftTable::new().bytes() as f64
    });
    timed("build hard", 1, &mut || {
        SingleHardTable::new().bytes() as f64
    });
    let (soft, hard) = (MultipleSoftTable::new(), SingleHardTable::new());
    timed("build plane", 1, &mut || {
        Plane::new(soft.clone()).bytes() as f64
    });
    let (soft, hard) = (Plane::new(soft), Plane::new(hard));
    for region in [strong_brick(), weak_brick()] {
        let mut stream = stream(5);
        let mean = soft.mean(&region);
        let points: Vec<Point> = (0..1000)
            .map(|_| soft.draw(&region, mean, &mut stream))
            .collect();
        timed("soft value", 100_000, &mut || {
            (0..100)
                .flat_map(|_| &points)
                .map(|point| soft.spectrum().value(point.ln_x, point.ln_y))
                .sum()
        });
        timed("hard value", 100_000, &mut || {
            (0..100)
                .flat_map(|_| &points)
                .map(|point| hard.spectrum().value(point.ln_x, point.ln_y))
                .sum()
        });
        timed("mean", 10_000, &mut || {
            (0..10_000)
                .map(|n| {
                    soft.mean(&Region {
                        ln_y_floor: region.ln_y_floor + 1e-5 * n as f64,
                        ..region
                    })
                })
                .sum()
        });
        timed("draw", 10_000, &mut || {
            (0..10_000)
                .map(|_| soft.draw(&region, mean, &mut stream).ln_y)
                .sum()
        });
    }
}
