//! Proves: what a temperature field says of a point, of a segment and of a whole path fits together, for every kind of
//! field, turned, shifted and held.
//!
//! Deterministic; tolerances are rounding unless stated.

use std::sync::Arc;

use spindrift::files::field_file::read_field;
use spindrift::medium::field::{
    Brick, Ceiling, FieldData, Fluid, Grid, Longitudinal, Placed, Radial, Ray, TemperatureField,
};
use spindrift::random::{Key, Purpose, Stream};

use rand::RngExt;

pub const END_TEMPERATURE_GEV: f64 = 0.15;
/// 80^(1/4), the amplitude of check-values.
fn amplitude() -> f64 {
    80.0_f64.sqrt().sqrt()
}
const Q_PER_FM: f64 = 1.0 / 4.3;

fn uniform(stream: &mut Stream, low: f64, high: f64) -> f64 {
    low + (high - low) * stream.random::<f64>()
}

/// A ray born inside the light cone of the hard vertex, or (one in eight) at it, often towards the beam.
pub fn random_ray(stream: &mut Stream) -> Ray {
    let azimuth = uniform(stream, 0.0, std::f64::consts::TAU);
    let nz = uniform(stream, -1.0, 1.0).powi(3);
    let sine = (1.0 - nz * nz).sqrt();
    let direction = [sine * azimuth.cos(), sine * azimuth.sin(), nz];
    let [x, y] = [0, 1].map(|_| uniform(stream, -7.0, 7.0));
    if uniform(stream, 0.0, 1.0) < 0.125 {
        return Ray {
            birth_fm: [0.0, x, y, 0.0],
            direction,
        };
    }
    let t = uniform(stream, 0.0, 5.0);
    let z = 0.95 * t * uniform(stream, -1.0, 1.0);
    Ray {
        birth_fm: [t, x, y, z],
        direction,
    }
}

/// A field of random numbers: nothing is smooth, so that every corner matters.
fn random_grid(stream: &mut Stream, with_eta: bool, with_flow: bool, hold: bool) -> Grid {
    let mut axis = |first: f64, step: f64, count: usize| {
        let mut place = first;
        let mut points = vec![place];
        for _ in 1..count {
            place += step * uniform(stream, 0.3, 1.7);
            points.push(place);
        }
        points
    };
    let mut data = FieldData {
        tau_fm: axis(0.7, 0.5, 20),
        x_fm: axis(-8.0, 0.8, 21),
        y_fm: axis(-8.0, 0.8, 19),
        eta: with_eta.then(|| axis(-3.0, 0.5, 13)),
        ..FieldData::default()
    };
    let points = data.shape().iter().product();
    let mut column = |low: f64, high: f64| -> Vec<f32> {
        (0..points)
            .map(|_| uniform(stream, low, high) as f32)
            .collect()
    };
    data.temperature_gev = column(0.0, 0.4);
    data.flow = with_flow.then(|| [column(-1.0, 2.0), column(-2.0, 1.0), column(-0.7, 0.7)]);
    Grid::held(data, END_TEMPERATURE_GEV, hold)
}

fn demo_field() -> Grid {
    let path = concat!(env!("CARGO_MANIFEST_DIR"), "/demo-data/lumpy-fireball.h5");
    Grid::new(read_field(path.as_ref()).unwrap(), END_TEMPERATURE_GEV)
}

pub fn all_fields() -> Vec<(String, Box<dyn TemperatureField>)> {
    let mut fields: Vec<(String, Box<dyn TemperatureField>)> = vec![
        ("brick".into(), Box::new(Brick::new(0.3, 4.0))),
        ("demo".into(), Box::new(demo_field())),
        (
            "turned demo".into(),
            Box::new(Placed::new(Arc::new(demo_field()), 0.8, [1.5, -0.7])),
        ),
    ];
    for hold in [false, true] {
        let longitudinal = Longitudinal::new(0.45, 0.6).hold_before_start(hold);
        fields.push((format!("longitudinal, hold {hold}"), Box::new(longitudinal)));
        for (start_fm, q) in [(0.6, Q_PER_FM), (0.2, 1.0), (1.5, 0.1), (1.2, 1.0)] {
            let radial = Radial::new(amplitude(), q, start_fm).hold_before_start(hold);
            fields.push((
                format!("radial {start_fm} {q}, hold {hold}"),
                Box::new(radial),
            ));
        }
        let mut stream = Key::event(3, 0).stream(Purpose::SOURCE);
        for (with_eta, with_flow) in [(false, false), (false, true), (true, false), (true, true)] {
            let grid = random_grid(&mut stream, with_eta, with_flow, hold);
            let name = format!("random, eta {with_eta}, flow {with_flow}, hold {hold}");
            fields.push((name, Box::new(grid)));
        }
    }
    fields
}

/// No point of a segment lies above its ceiling: 2000 rays a field, 40 points a segment.
#[test]
fn nothing_lies_above_its_ceiling() {
    const RAYS: u64 = 2000;
    const POINTS: usize = 40;
    for (name, field) in all_fields() {
        let mut stream = Key::event(4, 1).stream(Purpose::SOURCE);
        let (mut met, mut sums) = (0, [0.0; 2]);
        let mut ceilings: Vec<Ceiling> = Vec::new();
        for _ in 0..RAYS {
            let ray = random_ray(&mut stream);
            let Some(stretch) = field.stretch(&ray, END_TEMPERATURE_GEV) else {
                continue;
            };
            assert!(field.ceilings(&ray, &stretch, &mut ceilings), "{name}");
            assert!(!ceilings.is_empty() && ceilings.len() <= 12);
            met += 1;
            let width = (stretch.last_fm - stretch.first_fm) / ceilings.len() as f64;
            for (segment, ceiling) in ceilings.iter().enumerate() {
                for point in 0..=POINTS {
                    let l =
                        stretch.first_fm + (segment as f64 + point as f64 / POINTS as f64) * width;
                    let local = field.local(&ray, l.min(stretch.last_fm));
                    assert!(
                        local.temperature_gev <= ceiling.temperature_gev
                            && (local.temperature_gev == 0.0
                                || local.flow_factor <= ceiling.flow_factor),
                        "{name}: {local:?} above {ceiling:?}, {ray:?} segment {segment} of {} at {l}",
                        ceilings.len()
                    );
                    if local.temperature_gev > END_TEMPERATURE_GEV {
                        sums[0] += local.temperature_gev.powi(3) * local.flow_factor * width;
                    }
                    if ceiling.temperature_gev > END_TEMPERATURE_GEV {
                        sums[1] += ceiling.temperature_gev.powi(3) * ceiling.flow_factor * width;
                    }
                }
            }
        }
        println!(
            "{name}: {met} rays, ceilings {:.2} times what they bound",
            sums[1] / sums[0]
        );
        assert!(met > RAYS / 10, "{name}: {met}");
    }
}

/// Outside its stretch a ray meets nothing as hot as the end temperature.
#[test]
fn nothing_hot_lies_outside_the_stretch() {
    const POINTS: usize = 400;
    const FARTHEST_FM: f64 = 25.0;
    for (name, field) in all_fields() {
        if name.starts_with("brick") {
            continue;
        }
        let mut stream = Key::event(5, 1).stream(Purpose::SOURCE);
        for _ in 0..1000 {
            let ray = random_ray(&mut stream);
            let stretch = field.stretch(&ray, END_TEMPERATURE_GEV);
            let [first, last] = stretch.map_or([f64::INFINITY, f64::NEG_INFINITY], |stretch| {
                [stretch.first_fm, stretch.last_fm]
            });
            for point in 0..=POINTS {
                let l = FARTHEST_FM * point as f64 / POINTS as f64;
                if l < first - 1e-6 || l > last + 1e-6 {
                    let fluid = field.fluid(ray.at(l));
                    assert!(
                        fluid.temperature_gev < END_TEMPERATURE_GEV,
                        "{name}: {fluid:?} at {l} outside {first} to {last}, {ray:?}"
                    );
                }
            }
        }
    }
}

/// Inside its stretch a ray meets the fluid of the points on it: T, and p.u/E = u^t - n.u.
#[test]
fn fluids_and_rays_tell_the_same() {
    for (name, field) in all_fields() {
        let mut stream = Key::event(6, 1).stream(Purpose::SOURCE);
        for _ in 0..500 {
            let ray = random_ray(&mut stream);
            let Some(stretch) = field.stretch(&ray, END_TEMPERATURE_GEV) else {
                continue;
            };
            for share in [0.01, 0.3, 0.5, 0.99] {
                let l = stretch.first_fm + share * (stretch.last_fm - stretch.first_fm);
                let (local, fluid) = (field.local(&ray, l), field.fluid(ray.at(l)));
                let Fluid {
                    temperature_gev,
                    velocity: [ux, uy, uz],
                } = fluid;
                if temperature_gev == 0.0 && local.temperature_gev == 0.0 {
                    continue;
                }
                let [nx, ny, nz] = ray.direction;
                let ut = (1.0 + ux * ux + uy * uy + uz * uz).sqrt();
                let factor = ut - nx * ux - ny * uy - nz * uz;
                assert_eq!(local.temperature_gev, temperature_gev, "{name}");
                // f32 flow, and ut - n.u cancels for fast fluids.
                assert!(
                    (local.flow_factor - factor).abs() < 1e-6 * (1.0 + ut),
                    "{name}: {local:?} against {fluid:?}, {ray:?} at {l}"
                );
            }
        }
    }
}

/// A path sampled in one go is the same path point by point.
#[test]
fn samples_are_points() {
    for (name, field) in all_fields() {
        let mut stream = Key::event(7, 1).stream(Purpose::SOURCE);
        let mut samples = Vec::new();
        for _ in 0..100 {
            let ray = random_ray(&mut stream);
            let Some(stretch) = field.stretch(&ray, END_TEMPERATURE_GEV) else {
                continue;
            };
            let step = (stretch.last_fm - stretch.first_fm) / 40.0;
            field.sample(&ray, stretch.first_fm, step, 41, &mut samples);
            for (place, sample) in samples.iter().enumerate() {
                let alone = field.local(&ray, stretch.first_fm + place as f64 * step);
                let close = |a: f64, b: f64| (a - b).abs() < 1e-5 * (1.0 + a.abs());
                assert!(
                    close(alone.temperature_gev, sample.temperature_gev)
                        && close(alone.flow_factor, sample.flow_factor),
                    "{name}: {alone:?} against {sample:?}"
                );
            }
        }
    }
}

/// A turned and shifted field along a ray is the field along the ray turned and shifted back.
#[test]
fn fields_are_turned_and_shifted() {
    let (angle, shift) = (0.8_f64, [1.5, -0.7]);
    let (field, moved) = (
        demo_field(),
        Placed::new(Arc::new(demo_field()), angle, shift),
    );
    // At a quarter turn, what was on the x axis is on the y axis, and flows along it.
    let quarter = Placed::new(
        Arc::new(demo_field()),
        std::f64::consts::FRAC_PI_2,
        [0.0, 1.0],
    );
    let (was, is) = (
        field.fluid([3.0, 3.0, 0.0, 0.0]),
        quarter.fluid([3.0, 0.0, 4.0, 0.0]),
    );
    assert!((was.temperature_gev - is.temperature_gev).abs() < 1e-7 && was.temperature_gev > 0.1);
    assert!((was.velocity[0] - is.velocity[1]).abs() < 1e-6 && was.velocity[0] > 0.05);
    assert!((was.velocity[1] + is.velocity[0]).abs() < 1e-6);
    let mut stream = Key::event(8, 1).stream(Purpose::SOURCE);
    let turn = |[x, y]: [f64; 2]| {
        let (sin, cos) = angle.sin_cos();
        [cos * x - sin * y, sin * x + cos * y]
    };
    let mut met = 0;
    for _ in 0..500 {
        let ray = random_ray(&mut stream);
        let ([t, x, y, z], [nx, ny, nz]) = (ray.birth_fm, ray.direction);
        let ([x, y], [nx, ny]) = (turn([x, y]), turn([nx, ny]));
        let there = Ray {
            birth_fm: [t, x + shift[0], y + shift[1], z],
            direction: [nx, ny, nz],
        };
        let stretches = [
            field.stretch(&ray, END_TEMPERATURE_GEV),
            moved.stretch(&there, END_TEMPERATURE_GEV),
        ];
        let [Some(one), Some(other)] = stretches else {
            assert_eq!(stretches, [None; 2]);
            continue;
        };
        met += 1;
        assert!((one.first_fm - other.first_fm).abs() < 1e-9);
        assert!((one.last_fm - other.last_fm).abs() < 1e-9);
        let middle = 0.5 * (one.first_fm + one.last_fm);
        let (a, b) = (field.local(&ray, middle), moved.local(&there, middle));
        assert!((a.temperature_gev - b.temperature_gev).abs() < 1e-6);
        assert!((a.flow_factor - b.flow_factor).abs() < 1e-6);
    }
    assert!(met > 200);
}

/// Held fields have, before their start, the temperature and the Milne flow that they have then, at the same x, y, eta;
/// others have nothing.
#[test]
fn fields_are_held_before_their_start() {
    let demo = |hold| {
        let path = concat!(env!("CARGO_MANIFEST_DIR"), "/demo-data/lumpy-fireball.h5");
        Grid::held(
            read_field(path.as_ref()).unwrap(),
            END_TEMPERATURE_GEV,
            hold,
        )
    };
    let kinds: [fn(bool) -> Box<dyn TemperatureField>; 2] = [
        |hold| Box::new(Longitudinal::new(0.45, 0.6).hold_before_start(hold)),
        |hold| Box::new(Radial::new(80.0_f64.sqrt().sqrt(), Q_PER_FM, 0.6).hold_before_start(hold)),
    ];
    let mut pairs: Vec<[Box<dyn TemperatureField>; 2]> =
        kinds.map(|kind| [kind(false), kind(true)]).into();
    pairs.push([Box::new(demo(false)), Box::new(demo(true))]);
    for [plain, held] in &pairs {
        let eta: f64 = 0.4;
        let at = |tau: f64| [tau * eta.cosh(), 1.0, -2.0, tau * eta.sinh()];
        let start = held.first_tau_fm();
        assert_eq!(start, 0.6);
        assert_eq!(plain.fluid(at(0.3)), Fluid::EMPTY);
        let (early, first) = (held.fluid(at(0.3)), held.fluid(at(start)));
        assert_eq!(
            first.temperature_gev,
            plain.fluid(at(start)).temperature_gev
        );
        assert!(first.temperature_gev > 0.2);
        assert!((early.temperature_gev - first.temperature_gev).abs() < 1e-12);
        for (a, b) in early.velocity.iter().zip(first.velocity) {
            assert!((a - b).abs() < 1e-9, "{early:?} {first:?}");
        }
        let ray = Ray {
            birth_fm: [0.0, 1.0, -2.0, 0.0],
            direction: [0.6, 0.8, 0.0],
        };
        let late = plain.stretch(&ray, END_TEMPERATURE_GEV).unwrap();
        let early = held.stretch(&ray, END_TEMPERATURE_GEV).unwrap();
        assert!((late.first_fm - start).abs() < 1e-9 && early.first_fm == 0.0);
        assert_eq!(plain.local(&ray, 2.0), held.local(&ray, 2.0));
    }
}

/// A grid without flow of the longitudinal solution's temperature is that solution at every rapidity: flow factor
/// (t - nz z)/tau and u^z = z/tau, and the temperature to the interpolation's error (tau0^2/8 T''/T at spacing 0.05).
#[test]
fn a_grid_without_flow_expands_along_the_beam() {
    let axis = |from: f64, step: f64, count: usize| -> Vec<f64> {
        (0..count).map(|place| from + step * place as f64).collect()
    };
    let tau_fm = axis(0.6, 0.05, 400);
    let mut data = FieldData {
        x_fm: axis(-15.0, 15.0, 3),
        y_fm: axis(-15.0, 15.0, 3),
        ..FieldData::default()
    };
    for tau in &tau_fm {
        data.temperature_gev
            .extend([(0.45 * (0.6 / tau).cbrt()) as f32; 9]);
    }
    data.tau_fm = tau_fm;
    let (grid, exact) = (
        Grid::new(data, END_TEMPERATURE_GEV),
        Longitudinal::new(0.45, 0.6),
    );
    let mut stream = Key::event(9, 1).stream(Purpose::SOURCE);
    let mut off_midrapidity: f64 = 0.0;
    for _ in 0..500 {
        let ray = random_ray(&mut stream);
        let stretch = exact.stretch(&ray, END_TEMPERATURE_GEV);
        let Some(stretch) = stretch.filter(|stretch| stretch.last_fm < 1e3) else {
            continue;
        };
        for share in [0.0, 0.1, 0.5, 0.9] {
            let l = stretch.first_fm + share * (stretch.last_fm - stretch.first_fm);
            let (found, expected) = (grid.local(&ray, l), exact.local(&ray, l));
            assert!((found.temperature_gev / expected.temperature_gev - 1.0).abs() < 5e-4);
            let off = (found.flow_factor - expected.flow_factor).abs();
            assert!(off < 1e-9 * expected.flow_factor, "{found:?} {expected:?}");
            let [t, x, y, z] = ray.at(l);
            off_midrapidity = off_midrapidity.max((z / t).abs());
            if x.abs() < 15.0 && y.abs() < 15.0 {
                let (found, expected) = (grid.fluid([t, x, y, z]), exact.fluid([t, x, y, z]));
                assert!((found.velocity[2] - expected.velocity[2]).abs() < 1e-9);
            }
        }
    }
    assert!(off_midrapidity > 0.9);
}

/// The radial solution: temperatures of an independent calculation, to their digits, and a four-velocity whose
/// transverse speed is 2 q^2 tau r/(1 + q^2 tau^2 + q^2 r^2) in the frame that moves along the beam.
#[test]
fn the_radial_solution() {
    let field = Radial::new(amplitude(), Q_PER_FM, 0.6);
    for (tau, r, expected) in [
        (0.6, 0.0, 0.414667),
        (1.0, 4.0, 0.233401),
        (3.0, 2.0, 0.181489),
        (5.0, 6.0, 0.103797),
    ] {
        for azimuth in [0.0_f64, 2.0, 4.4] {
            let (sin, cos) = azimuth.sin_cos();
            for eta in [0.0_f64, 1.2] {
                let point = [tau * eta.cosh(), r * cos, r * sin, tau * eta.sinh()];
                let fluid = field.fluid(point);
                assert!((fluid.temperature_gev - expected).abs() < 6e-7, "{fluid:?}");
                let [ux, uy, uz] = fluid.velocity;
                let q2 = Q_PER_FM * Q_PER_FM;
                let speed = 2.0 * q2 * tau * r / (1.0 + q2 * (tau * tau + r * r));
                let gamma = 1.0 / (1.0 - speed * speed).sqrt();
                assert!((ux - gamma * speed * cos).abs() < 1e-12);
                assert!((uy - gamma * speed * sin).abs() < 1e-12);
                assert!((uz - gamma * eta.sinh()).abs() < 1e-12);
            }
        }
    }
}
