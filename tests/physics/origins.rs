//! Birth places: thickness, overlap integrals and moments against the table of validation/references/overlap.py, and
//! every sampler against its own density.
//!
//! Draws: 2 x 10^5 a case. Marginals by Kolmogorov and Smirnov, places on a grid of bins by chi-square (bins with fewer
//! than 25 expected draws are one bin), second moments by their pulls; 1e-6 a check, about 70 checks. Seen is a bias of
//! 0.6 % of the range in a marginal, of 0.8 % in a length (1.6 % in a second moment), of 2 % in a bin that holds a tenth.
//! Samplers that are biased by little more than that must fail.

use spindrift::medium::field::FieldData;
use spindrift::medium::origin::thickness::Thickness;
use spindrift::medium::origin::{
    CollisionDensity, FieldWeighted, Nucleus, Origin, OriginError, Overlap, PlaceList, Placement,
    TemperatureSlice,
};
use spindrift::random::{Key, Purpose};

use super::support::reference::{self, number, numbers};
use super::support::statistics::{LARGEST_DISTANCE, LARGEST_PULL, Mean, distance};

const DRAWS: u64 = 200_000;
/// Fewer expected draws make no bin of their own.
const LEAST_EXPECTED: f64 = 25.0;
/// One-sided 10^-6 quantile of a normal variable.
const ONE_SIDED: f64 = 4.7534;

/// Draws of events 0, 1, ..., each from its own stream.
fn draws(origin: &dyn Origin) -> Vec<[f64; 2]> {
    (0..DRAWS)
        .map(|id| origin.draw(&mut Key::event(11, id).stream(Purpose::ORIGIN)))
        .collect()
}

/// Chi-square over its 10^-6 quantile (Wilson & Hilferty 1931; to a per cent beyond ten degrees of freedom) for counts in
/// bins of these probabilities; what is missing to probability 1 is a bin too. Must be below 1.
fn chi_square_ratio(counts: &[u64], probabilities: &[f64]) -> f64 {
    let total = DRAWS as f64;
    let (mut sum, mut bins) = (0.0, 0.0);
    let mut add = |count: f64, expected: f64| {
        sum += (count - expected).powi(2) / expected;
        bins += 1.0;
    };
    let (mut rest, mut rest_expected) = (total, total);
    for (count, probability) in counts.iter().zip(probabilities) {
        let expected = total * probability;
        if expected >= LEAST_EXPECTED {
            add(*count as f64, expected);
            rest -= *count as f64;
            rest_expected -= expected;
        }
    }
    if rest_expected >= LEAST_EXPECTED {
        add(rest, rest_expected);
    } else if rest > 4.0 * LEAST_EXPECTED {
        // Four times what could be a bin is beyond 10^-6 of Poisson's law.
        return f64::INFINITY;
    }
    let freedom: f64 = bins - 1.0;
    let spread = 2.0 / (9.0 * freedom);
    sum / (freedom * (1.0 - spread + ONE_SIDED * spread.sqrt()).powi(3))
}

/// Counts on equal bins over a square of half-width `half`, `bins` a side; index [x][y].
fn histogram(places: &[[f64; 2]], half: f64, bins: usize) -> Vec<u64> {
    let mut counts = vec![0; bins * bins];
    for place in places {
        let bin = place.map(|value| ((value / half + 1.0) * 0.5 * bins as f64).floor());
        if bin.iter().all(|bin| (0.0..bins as f64).contains(bin)) {
            counts[bin[0] as usize * bins + bin[1] as usize] += 1;
        }
    }
    counts
}

/// Probabilities of such bins from a density, by the rectangle rule on `fine` points a side of a bin, divided by `norm`.
fn integrals(
    density: impl Fn([f64; 2]) -> f64,
    half: f64,
    bins: usize,
    fine: usize,
    norm: f64,
) -> Vec<f64> {
    let step = 2.0 * half / (bins * fine) as f64;
    let at = |bin: usize, point: usize| ((bin * fine + point) as f64 + 0.5) * step - half;
    (0..bins * bins)
        .map(|bin| {
            let points = (0..fine * fine)
                .map(|point| density([at(bin / bins, point / fine), at(bin % bins, point % fine)]));
            points.sum::<f64>() * step * step / norm
        })
        .collect()
}

fn nucleus(case: &serde_json::Value) -> Nucleus {
    Nucleus {
        radius_fm: number(case, "radius_fm"),
        diffuseness_fm: number(case, "diffuseness_fm"),
    }
}

#[test]
fn thickness_is_that_of_the_table_and_falls() {
    for case in reference::load("overlap")["nuclei"].as_array().unwrap() {
        let nucleus = nucleus(case);
        let thickness = Thickness::new(&nucleus);
        // The promise of the module.
        let allowed = if nucleus.radius_fm > 5.0 * nucleus.diffuseness_fm {
            3e-8
        } else {
            1e-6
        };
        for row in case["thickness"].as_array().unwrap() {
            let found = thickness.at(number(row, "s_fm"));
            let off = found / number(row, "thickness_per_fm2") - 1.0;
            assert!(off.abs() < allowed, "{case} {row}: {off:e}");
        }
        // A unit integral over the plane, by Simpson's rule.
        let (last, steps) = (nucleus.radius_fm + 40.0 * nucleus.diffuseness_fm, 4000);
        let sum: f64 = (0..=steps)
            .map(|step| {
                let s = last * f64::from(step) / f64::from(steps);
                let weight = match step {
                    0 => 1.0,
                    step if step == steps => 1.0,
                    step if step % 2 == 1 => 4.0,
                    _ => 2.0,
                };
                weight * std::f64::consts::TAU * s * thickness.at(s)
            })
            .sum();
        let norm = sum * last / f64::from(steps) / 3.0;
        assert!((norm - 1.0).abs() < 1e-7, "{case}: {norm}");
        // The envelope of the overlap rests on it.
        let far = nucleus.radius_fm + 70.0 * nucleus.diffuseness_fm;
        let values: Vec<f64> = (0..=100_000)
            .map(|step| thickness.ln_at(far * f64::from(step) / 1e5))
            .collect();
        assert!(values.windows(2).all(|pair| pair[1] <= pair[0] + 1e-13));
    }
}

#[test]
fn overlaps_have_the_integrals_and_moments_of_the_table() {
    for case in reference::cases("overlap") {
        let overlap = Overlap::new(&nucleus(&case), number(&case, "impact_parameter_fm")).unwrap();
        // Cusps in the middle of light nuclei cost the rectangle rule its exponential convergence.
        let allowed = match case["nucleus"].as_str() {
            Some("heavy") => 1e-7,
            Some("light") => 1e-5,
            _ => 2e-3,
        };
        let integral = overlap.integral_per_fm2() / number(&case, "integral_per_fm2") - 1.0;
        assert!(integral.abs() < allowed, "{case}: {integral:e}");
        let plane = overlap.plane();
        let off = plane.ellipticity - number(&case, "ellipticity");
        assert!(off.abs() < allowed, "{case}: {off:e}");
        assert!(plane.centroid_fm.iter().all(|place| place.abs() < 1e-9));
        // The short axis: along the impact parameter, but for light nuclei that barely meet across it.
        let across = number(&case, "mean_x2_fm2") > number(&case, "mean_y2_fm2");
        if number(&case, "impact_parameter_fm") == 0.0 {
            assert!(plane.ellipticity < 1e-9);
        } else if across {
            let off = plane.event_plane_rad.abs() - std::f64::consts::FRAC_PI_2;
            assert!(off.abs() < 1e-6, "{plane:?}");
        } else {
            assert!(plane.event_plane_rad.abs() < 1e-6, "{plane:?}");
        }
    }
}

/// The largest of the checks of draws against the table, each over its threshold.
fn overlap_checks(case: &serde_json::Value, places: &[[f64; 2]]) -> f64 {
    let mut worst: f64 = 0.0;
    let axis = numbers(&case["marginals"]["place_fm"]);
    for (component, name, moment) in [(0, "below_x", "mean_x2_fm2"), (1, "below_y", "mean_y2_fm2")]
    {
        let below = numbers(&case["marginals"][name]);
        let cumulative = |place: f64| {
            let cell = axis[1..axis.len() - 1].partition_point(|point| *point <= place);
            let share = (place - axis[cell]) / (axis[cell + 1] - axis[cell]);
            (1.0 - share) * below[cell] + share * below[cell + 1]
        };
        let mut values: Vec<f64> = places.iter().map(|place| place[component]).collect();
        worst = worst.max(distance(&mut values, cumulative) / LARGEST_DISTANCE);
        let mut mean = Mean::default();
        values.iter().for_each(|value| mean.add(value * value));
        worst = worst.max(mean.pull(number(case, moment)).abs() / LARGEST_PULL);
    }
    worst
}

#[test]
fn overlaps_are_drawn_as_their_density_says() {
    for case in reference::cases("overlap") {
        let overlap = Overlap::new(&nucleus(&case), number(&case, "impact_parameter_fm")).unwrap();
        let places = draws(&overlap);
        let worst = overlap_checks(&case, &places);
        assert!(worst < 1.0, "{case}: {worst}");
        // Both coordinates together: 24 x 24 bins over three root mean squares.
        let half = 3.0 * number(&case, "mean_r2_fm2").sqrt();
        let expected = integrals(
            |place| overlap.density_per_fm4(place),
            half,
            24,
            24,
            number(&case, "integral_per_fm2"),
        );
        let ratio = chi_square_ratio(&histogram(&places, half, 24), &expected);
        assert!(ratio < 1.0, "{case}: {ratio}");
        // One per cent too far out, a tenth of a fermi to the side, or turned by a quarter, and it shows.
        let longer: Vec<_> = places.iter().map(|place| place.map(|x| 1.01 * x)).collect();
        assert!(overlap_checks(&case, &longer) > 1.0, "{case}");
        let moved: Vec<_> = places.iter().map(|[x, y]| [x + 0.1, *y]).collect();
        assert!(overlap_checks(&case, &moved) > 1.0, "{case}");
        if number(&case, "ellipticity") > 0.05 {
            let turned: Vec<_> = places.iter().map(|[x, y]| [-y, *x]).collect();
            assert!(overlap_checks(&case, &turned) > 1.0, "{case}");
        }
    }
}

#[test]
fn nuclei_out_of_range_and_out_of_reach_are_refused() {
    let lead = Nucleus::named("Pb208").unwrap();
    assert!(Nucleus::named("Pb").is_none());
    let refused = |nucleus: Nucleus, b| Overlap::new(&nucleus, b).unwrap_err().to_string();
    assert!(refused(lead, -0.1).contains("impact parameter -0.1 fm; allowed: 0 to 35.08 fm"));
    assert!(refused(lead, f64::NAN).contains("impact parameter NaN fm"));
    assert!(refused(lead, 35.1).contains("do not meet"));
    let with = |radius_fm, diffuseness_fm| Nucleus {
        radius_fm,
        diffuseness_fm,
    };
    assert!(refused(with(16.0, 0.5), 1.0).contains("radius 16 fm; allowed: 0 to 15 fm"));
    assert!(refused(with(6.0, 0.0), 1.0).contains("diffuseness 0 fm; allowed: 0.05 to 2 fm"));
    // As far apart as allowed: a ridge between the centres, along which the product of two tails is flat.
    let far = Overlap::new(&lead, 35.0).unwrap();
    let places = draws(&far);
    let beyond = places.iter().filter(|[x, _]| x.abs() > 17.5).count();
    assert!(beyond < places.len() / 10, "{beyond}");
    // Extremes of the allowed range can be had.
    for (radius, diffuseness) in [(0.0, 0.05), (0.0, 2.0), (15.0, 0.05), (15.0, 2.0)] {
        let overlap = Overlap::new(&with(radius, diffuseness), 1.0).unwrap();
        let place = overlap.draw(&mut Key::event(1, 1).stream(Purpose::ORIGIN));
        assert!(place.iter().all(|value| value.abs() < 70.0));
    }
}

/// A lumpy field on an uneven grid, with a cold corner and a node of 0, and its collision density.
fn lumpy() -> FieldData {
    let x_fm = vec![-2.0, -1.5, 0.0, 0.25, 2.0];
    let y_fm = vec![-2.0, -0.5, 0.5, 2.0];
    let plane: Vec<f64> = vec![
        0.0, 0.1, 0.16, 0.12, //
        0.14, 0.3, 0.2, 0.0, //
        0.2, 0.45, 0.25, 0.1, //
        0.16, 0.2, 0.5, 0.3, //
        0.1, 0.18, 0.2, 0.0,
    ];
    let density = plane.iter().map(|value| 40.0 * value * value).collect();
    let temperature_gev = [&plane, &plane.iter().map(|value| 0.5 * value).collect()]
        .into_iter()
        .flatten()
        .map(|value| *value as f32)
        .collect();
    FieldData {
        tau_fm: vec![0.6, 1.0],
        x_fm,
        y_fm,
        temperature_gev,
        collision_density_per_fm2: Some(density),
        ..FieldData::default()
    }
}

fn bilinear(x_fm: &[f64], y_fm: &[f64], values: &[f64], [x, y]: [f64; 2]) -> f64 {
    let locate = |axis: &[f64], value: f64| {
        let cell = axis[1..axis.len() - 1].partition_point(|point| *point <= value);
        (cell, (value - axis[cell]) / (axis[cell + 1] - axis[cell]))
    };
    let ((i, u), (j, v)) = (locate(x_fm, x), locate(y_fm, y));
    let at = |i: usize, j: usize| values[i * y_fm.len() + j];
    (1.0 - u) * ((1.0 - v) * at(i, j) + v * at(i, j + 1))
        + u * ((1.0 - v) * at(i + 1, j) + v * at(i + 1, j + 1))
}

const BINS: usize = 16;
/// Fine enough that the end temperature's rim, where the density jumps, is met to 1e-4 of a bin.
const FINE: usize = 60;

#[test]
fn field_weighted_births_follow_the_temperature() {
    let data = lumpy();
    let slice = TemperatureSlice::of_grid(&data).unwrap();
    let density = |power: f64, end: f64, place| {
        let value = bilinear(&slice.x_fm, &slice.y_fm, &slice.temperature_gev, place);
        if value >= end { value.powf(power) } else { 0.0 }
    };
    for (power, end) in [(1.0, 0.15), (4.0, 0.15), (9.5, 0.05), (3.0, 0.26)] {
        let origin = FieldWeighted::new(slice.clone(), power, end, Placement::IDENTITY).unwrap();
        let counts = histogram(&draws(&origin), 2.0, BINS);
        let expected = |power: f64, end: f64| {
            let raw = integrals(|place| density(power, end, place), 2.0, BINS, FINE, 1.0);
            let norm: f64 = raw.iter().sum();
            raw.into_iter()
                .map(|value| value / norm)
                .collect::<Vec<f64>>()
        };
        let ratio = chi_square_ratio(&counts, &expected(power, end));
        assert!(ratio < 1.0, "{power} {end}: {ratio}");
        // A power off by a tenth, or an end temperature off by 10 MeV where it cuts much, and it shows.
        assert!(chi_square_ratio(&counts, &expected(1.1 * power, end)) > 1.0);
        if end > 0.1 && power < 4.0 {
            assert!(chi_square_ratio(&counts, &expected(power, end + 0.01)) > 1.0);
        }
    }
}

#[test]
fn collision_densities_are_drawn_and_integrated_exactly() {
    let data = lumpy();
    let values = data.collision_density_per_fm2.clone().unwrap();
    let origin = CollisionDensity::new(&data, Placement::IDENTITY).unwrap();
    let density = |place| bilinear(&data.x_fm, &data.y_fm, &values, place);
    let expected = integrals(density, 2.0, BINS, FINE, origin.integral());
    // Bins meet the nodes, and the rectangle rule is exact for a bilinear function.
    let norm: f64 = expected.iter().sum();
    assert!((norm - 1.0).abs() < 1e-12, "{norm}");
    let places = draws(&origin);
    let ratio = chi_square_ratio(&histogram(&places, 2.0, BINS), &expected);
    assert!(ratio < 1.0, "{ratio}");
    // Two per cent of the places drawn evenly over their cell of the file, instead of bilinearly: seen if all are.
    let even: Vec<_> = places
        .iter()
        .enumerate()
        .map(|(number, place)| {
            let mut stream = Key::event(12, number as u64).stream(Purpose::ORIGIN);
            let mut within = |axis: &[f64], value: f64| {
                let cell = axis[1..axis.len() - 1].partition_point(|point| *point <= value);
                let share: f64 = rand::RngExt::random(&mut stream);
                axis[cell] + share * (axis[cell + 1] - axis[cell])
            };
            [within(&data.x_fm, place[0]), within(&data.y_fm, place[1])]
        })
        .collect();
    assert!(chi_square_ratio(&histogram(&even, 2.0, BINS), &expected) > 1.0);
    let missing = FieldData {
        collision_density_per_fm2: None,
        ..data.clone()
    };
    let refused = |data: &FieldData| CollisionDensity::new(data, Placement::IDENTITY).unwrap_err();
    assert_eq!(refused(&missing), OriginError::NoCollisionDensity);
    let empty = FieldData {
        collision_density_per_fm2: Some(vec![0.0; values.len()]),
        ..data
    };
    assert!(matches!(refused(&empty), OriginError::Empty(_)));
}

#[test]
fn lists_are_drawn_by_weight() {
    let weights: Vec<f64> = (0..50).map(|place| f64::from(place % 7) * 1e300).collect();
    let places: Vec<[f64; 2]> = (0..50).map(|place| [f64::from(place), 0.5]).collect();
    let list = PlaceList::new(places, &weights).unwrap();
    let mut counts = vec![0; weights.len()];
    for [x, y] in draws(&list) {
        assert_eq!(y, 0.5);
        counts[x as usize] += 1;
    }
    let norm: f64 = weights.iter().map(|weight| weight / 1e300).sum();
    let expected: Vec<f64> = weights.iter().map(|weight| weight / 1e300 / norm).collect();
    assert!(chi_square_ratio(&counts, &expected) < 1.0);
    assert!(
        counts
            .iter()
            .zip(&weights)
            .all(|(count, weight)| *weight > 0.0 || *count == 0)
    );
    let mut biased = expected;
    // The weight of 6 for one of 5: seven places of 147/50 each.
    for place in (0..50).filter(|place| place % 7 == 5) {
        biased[place] *= 1.05;
    }
    assert!(chi_square_ratio(&counts, &biased) > 1.0);
    let refused = |places: &[[f64; 2]], weights: &[f64]| {
        PlaceList::new(places.to_vec(), weights)
            .unwrap_err()
            .to_string()
    };
    assert!(refused(&[[0.0, f64::NAN]], &[1.0]).contains("place 0: y_fm is NaN"));
    assert!(refused(&[[0.0; 2]; 2], &[1.0, -1.0]).contains("place 1: weight is -1"));
    assert!(refused(&[], &[]).contains("0 everywhere"));
}

/// Turned and shifted fields take their births along; the draws themselves do not change.
#[test]
fn births_move_with_their_field() {
    let (data, placement) = (lumpy(), Placement::new(0.7, [1.5, -0.25]));
    let slice = TemperatureSlice::of_grid(&data).unwrap();
    let pairs: [[Box<dyn Origin>; 2]; 2] = [
        [Placement::IDENTITY, placement]
            .map(|at| Box::new(CollisionDensity::new(&data, at).unwrap()) as Box<dyn Origin>),
        [Placement::IDENTITY, placement].map(|at| {
            Box::new(FieldWeighted::new(slice.clone(), 4.0, 0.15, at).unwrap()) as Box<dyn Origin>
        }),
    ];
    let (sine, cosine) = 0.7_f64.sin_cos();
    for [unmoved, moved] in pairs {
        for id in 0..1000 {
            let stream = || Key::event(3, id).stream(Purpose::ORIGIN);
            let [x, y] = unmoved.draw(&mut stream());
            let [lab_x, lab_y] = moved.draw(&mut stream());
            assert!((lab_x - (cosine * x - sine * y + 1.5)).abs() < 1e-12);
            assert!((lab_y - (sine * x + cosine * y - 0.25)).abs() < 1e-12);
        }
    }
}

#[test]
fn slices_are_taken_at_mid_rapidity() {
    let flat = lumpy();
    let with_eta = |eta: Vec<f64>, slope: f32| FieldData {
        temperature_gev: flat
            .temperature_gev
            .iter()
            .flat_map(|value| {
                eta.iter()
                    .map(move |eta| value * (1.0 + slope * *eta as f32))
            })
            .collect(),
        eta: Some(eta.clone()),
        ..flat.clone()
    };
    let plain = TemperatureSlice::of_grid(&flat).unwrap();
    for eta in [
        vec![-1.0, 0.5],
        vec![0.0, 2.0],
        vec![-3.0, -1.0, 0.0],
        vec![-2.0, 0.0, 1.0],
    ] {
        let slice = TemperatureSlice::of_grid(&with_eta(eta.clone(), 0.1)).unwrap();
        for (one, other) in slice.temperature_gev.iter().zip(&plain.temperature_gev) {
            assert!((one - other).abs() < 1e-7, "{eta:?}");
        }
    }
    let forward = TemperatureSlice::of_grid(&with_eta(vec![0.5, 2.0], 0.0)).unwrap_err();
    assert!(forward.to_string().contains("eta runs from 0.5 to 2"));
    let cold = FieldWeighted::new(plain.clone(), 4.0, 0.6, Placement::IDENTITY).unwrap_err();
    assert!(
        cold.to_string()
            .contains("nowhere above the end temperature of 0.6 GeV")
    );
    // A field that is hot in next to nothing must not be searched for ever; just a little more, and it is drawn.
    let barely = |end| FieldWeighted::new(plain.clone(), 4.0, end, Placement::IDENTITY);
    assert!(matches!(
        barely(0.5 / 1.0009),
        Err(OriginError::Cold { .. })
    ));
    let peak = barely(0.5 / 1.0011).unwrap();
    for id in 0..1000 {
        let [x, y] = peak.draw(&mut Key::event(1, id).stream(Purpose::ORIGIN));
        assert!((x - 0.25).abs() < 0.01 && (y - 0.5).abs() < 0.01);
    }
    for power in [0.0, -1.0, f64::NAN, 21.0] {
        let refused = FieldWeighted::new(plain.clone(), power, 0.15, Placement::IDENTITY);
        assert!(matches!(refused, Err(OriginError::Power(_))));
    }
    // A field that is known as a function.
    let round =
        TemperatureSlice::tabulated(8.0, 161, |[x, y]| 0.4 * (-(x * x + y * y) / 18.0).exp());
    assert_eq!(round.x_fm.len(), 161);
    assert!((round.largest_gev() - 0.4).abs() < 1e-12);
    assert!(round.plane(4.0, 0.15).unwrap().ellipticity < 1e-9);
    assert_eq!(round.plane(4.0, 0.5), None);
}
