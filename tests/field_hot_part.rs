//! Proves: a field read for use is the field read as a whole, and takes no more memory than its hot part.
//!
//! Deterministic.

mod common;

use std::path::Path;

use common::field_maker::{FieldMaker, number, text, write_planes};
use spindrift::files::field_file::{FieldProblem, read_field, read_grid};
use spindrift::medium::field::{Grid, Ray, TemperatureField};

const END_TEMPERATURE_GEV: f64 = 0.15;

const TAU: [f64; 7] = [0.5, 0.8, 1.2, 2.0, 2.5, 4.0, 6.0];
const X: [f64; 9] = [-6.0, -4.5, -3.0, -1.0, 0.0, 1.0, 3.0, 4.5, 6.0];
const Y: [f64; 8] = [-7.0, -5.0, -3.0, -1.0, 1.0, 3.0, 5.0, 7.0];
const ETA: [f64; 5] = [-2.0, -1.0, 0.0, 1.0, 2.0];

fn temperature([tau, x, y, eta]: [f64; 4]) -> f64 {
    let place = (x - 0.7).powi(2) / 20.0 + (y + 0.5).powi(2) / 12.0 + eta * eta / 8.0;
    0.45 * (0.5 / tau).cbrt() * (-place).exp()
}

/// Values over axes in an order of the file's.
fn values(order: &[&str], of: impl Fn([f64; 4]) -> f64) -> Vec<f64> {
    let axis = |name: &str| -> &[f64] {
        match name {
            "tau" => &TAU,
            "x" => &X,
            "y" => &Y,
            _ => &ETA,
        }
    };
    let lengths: Vec<usize> = order.iter().map(|name| axis(name).len()).collect();
    let point = |number: usize| {
        let (mut rest, mut point) = (number, [0.0; 4]);
        for (name, length) in order.iter().zip(&lengths).rev() {
            let slot = ["tau", "x", "y", "eta"]
                .iter()
                .position(|slot| slot == name)
                .unwrap();
            point[slot] = axis(name)[rest % length];
            rest /= length;
        }
        of(point)
    };
    (0..lengths.iter().product()).map(point).collect()
}

fn rays() -> Vec<Ray> {
    let ray = |place: i32| {
        let (azimuth, nz) = (0.7 * f64::from(place), 0.05 * f64::from(place % 16) - 0.4);
        let sine = (1.0 - nz * nz).sqrt();
        Ray {
            birth_fm: [0.0, 0.4 * f64::from(place % 9) - 1.6, 0.9, 0.0],
            direction: [sine * azimuth.cos(), sine * azimuth.sin(), nz],
        }
    };
    (0..60).map(ray).collect()
}

fn expect_same(grid: &Grid, whole: &Grid) {
    let mut met = 0;
    for ray in rays() {
        let stretch = whole.stretch(&ray, END_TEMPERATURE_GEV);
        assert_eq!(grid.stretch(&ray, END_TEMPERATURE_GEV), stretch);
        let Some(stretch) = stretch else { continue };
        let (mut one, mut other) = (Vec::new(), Vec::new());
        assert_eq!(
            grid.ceilings(&ray, &stretch, &mut one),
            whole.ceilings(&ray, &stretch, &mut other)
        );
        assert_eq!(one, other);
        for step in 0..=20 {
            let l =
                stretch.first_fm + f64::from(step) / 20.0 * (stretch.last_fm - stretch.first_fm);
            assert_eq!(grid.local(&ray, l), whole.local(&ray, l));
            assert_eq!(grid.fluid(ray.at(l)), whole.fluid(ray.at(l)));
            met += 1;
        }
    }
    assert!(met > 500);
}

/// With and without eta and flow, four- and three-velocities, the slowest axis being any.
#[test]
fn the_hot_part_is_that_of_the_whole() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("field.nc");
    let orders: [&[&str]; 5] = [
        &["tau", "x", "y"],
        &["y", "tau", "x"],
        &["x", "y", "tau"],
        &["eta", "x", "tau", "y"],
        &["tau", "x", "y", "eta"],
    ];
    for order in orders {
        for flow in [None, Some(["ux", "uy", "ueta"]), Some(["vx", "vy", "veta"])] {
            let maker = FieldMaker::new(&path);
            maker
                .axis("tau", &TAU, Some("fm"))
                .axis("x", &X, Some("fm"))
                .axis("y", &Y, Some("fm"))
                .axis("eta", &ETA, None);
            maker.variable(
                "temperature",
                order,
                &values(order, temperature),
                Some("GeV"),
            );
            if let Some([x, y, eta]) = flow {
                let column = |of: fn([f64; 4]) -> f64| values(order, of);
                maker.variable(x, order, &column(|[tau, x, ..]| 0.015 * tau * x), None);
                maker.variable(y, order, &column(|[tau, _, y, _]| 0.01 * tau * y), None);
                maker.variable(eta, order, &column(|[.., eta]| 0.1 * eta), None);
            }
            drop(maker);
            let data = read_field(&path).unwrap();
            assert_eq!(data.flow.is_some(), flow.is_some());
            let points = data.temperature_gev.len();
            for hold in [false, true] {
                let loaded = read_grid(&path, END_TEMPERATURE_GEV, hold).unwrap();
                assert!(loaded.grid.bytes() < points * if flow.is_some() { 16 } else { 4 });
                assert_eq!(loaded.first_slice.tau_fm, TAU);
                let slice = &loaded.first_slice.temperature_gev;
                assert_eq!(slice[..], data.temperature_gev[..slice.len()]);
                assert_eq!(slice.len(), points / TAU.len());
                expect_same(
                    &loaded.grid,
                    &Grid::held(data.clone(), END_TEMPERATURE_GEV, hold),
                );
            }
        }
    }
}

/// What is wrong is found in the cold part too as long as it is the temperature, and told with its place in the file.
#[test]
fn problems_are_told_with_their_place() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("field.nc");
    let order = ["y", "x", "tau"];
    let read = |variable: &str, place: usize, hole: f64| {
        let maker = FieldMaker::new(&path);
        maker
            .axis("tau", &TAU, Some("fm"))
            .axis("x", &X, Some("fm"))
            .axis("y", &Y, Some("fm"));
        for name in ["temperature", "vx", "vy"] {
            let mut column = values(&order, |point| {
                if name == "temperature" {
                    temperature(point)
                } else {
                    0.1
                }
            });
            if name == variable {
                column[place] = hole;
            }
            maker.variable(
                name,
                &order,
                &column,
                (name == "temperature").then_some("GeV"),
            );
        }
        drop(maker);
        match read_grid(&path, END_TEMPERATURE_GEV, false) {
            Err(error) => match *error.problem {
                FieldProblem::Value { name, place, .. } => format!("{name} {place}"),
                other => panic!("{other}"),
            },
            Ok(_) => "read".into(),
        }
    };
    let cold = X.len() * TAU.len() - 1;
    let hot = (4 * X.len() + 5) * TAU.len() + 1;
    assert_eq!(
        read("temperature", cold, f64::NAN),
        "temperature y[0] x[8] tau[6]"
    );
    assert_eq!(
        read("temperature", hot, -0.1),
        "temperature y[4] x[5] tau[1]"
    );
    assert_eq!(read("vx", hot, f64::NAN), "vx y[4] x[5] tau[1]");
    assert_eq!(read("vy", hot, 101.0), "vy y[4] x[5] tau[1]");
    assert_eq!(read("vy", hot, 0.999), "vx, vy, veta tau[1] x[5] y[4]");
    assert_eq!(read("vx", cold, f64::NAN), "read");
}

/// The largest resident memory of this process so far, in bytes; `None` where the system does not tell.
fn peak_memory_bytes() -> Option<u64> {
    let status = std::fs::read_to_string("/proc/self/status").ok()?;
    let line = status.lines().find(|line| line.starts_with("VmHWM:"))?;
    let kilobytes: u64 = line.split_whitespace().nth(1)?.parse().ok()?;
    Some(kilobytes << 10)
}

/// A field with flow of 300 MB as declared, deflated, of which a thousandth is hot: reading it takes a few tens of MB,
/// whichever axis is the slowest.
#[test]
fn a_large_cold_field_takes_little_memory() {
    const LIMIT_BYTES: u64 = 64 << 20;
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("large.nc");
    let layouts = [
        (["tau", "x", "y"], [40, 800, 800], [1, 800, 800]),
        (["x", "y", "tau"], [800, 800, 40], [80, 100, 10]),
    ];
    for (order, lengths, chunk) in layouts {
        write_large(&path, order, lengths, chunk);
        let loaded = read_grid(&path, END_TEMPERATURE_GEV, false).unwrap();
        assert!(loaded.grid.bytes() > 16 * 20_000 && loaded.grid.bytes() < 4_000_000);
        let [ray, ..] = rays()[..] else { panic!() };
        let stretch = loaded.grid.stretch(&ray, END_TEMPERATURE_GEV).unwrap();
        let middle = loaded
            .grid
            .local(&ray, 0.5 * (stretch.first_fm + stretch.last_fm));
        assert_eq!(middle.temperature_gev, f64::from(0.3_f32));
    }
    if let Some(peak) = peak_memory_bytes() {
        println!("peak memory {} MB", peak >> 20);
        assert!(peak < LIMIT_BYTES, "{peak} bytes");
    }
}

/// Hot in a box of 36 x 36 columns around the middle while tau < 5 fm; planes along the first axis written one by one.
fn write_large(path: &Path, order: [&str; 3], lengths: [usize; 3], chunk: [usize; 3]) {
    let maker = FieldMaker::new(path);
    for (name, length) in order.iter().zip(lengths) {
        let even = |first: f64, last: f64| -> Vec<f64> {
            let share = |place: usize| place as f64 / (length - 1) as f64;
            (0..length)
                .map(|place| first + (last - first) * share(place))
                .collect()
        };
        let points = if *name == "tau" {
            even(0.5, 10.5)
        } else {
            even(-40.0, 40.0)
        };
        maker.axis(name, &points, Some("fm"));
    }
    for name in ["temperature", "ux", "uy"] {
        let dataset = maker
            .file
            .new_dataset::<f32>()
            .chunk(chunk)
            .deflate(1)
            .shape(lengths)
            .create(name)
            .unwrap();
        if name == "temperature" {
            text(&dataset, "units", "GeV");
            number(&dataset, "_FillValue", f32::NAN);
        }
        for (place, axis) in order.iter().enumerate() {
            maker.attach(&dataset, axis, place);
        }
        let value = if name == "temperature" { 0.3_f32 } else { 0.2 };
        let hot = |axis: usize, index: usize| match order[axis] {
            "tau" => index < lengths[axis] / 2,
            _ => index.abs_diff(lengths[axis] / 2) < 18,
        };
        let [_, rows, columns] = lengths;
        let rows_at_once = chunk[0];
        for first in (0..lengths[0]).step_by(rows_at_once) {
            let mut slab = vec![0.0_f32; rows_at_once * rows * columns];
            for (element, number) in slab.iter_mut().enumerate() {
                let index = [
                    first + element / (rows * columns),
                    element / columns % rows,
                    element % columns,
                ];
                if (0..3).all(|axis| hot(axis, index[axis])) {
                    *number = value;
                }
            }
            write_planes(&dataset, first, rows_at_once, &slab);
        }
    }
}
