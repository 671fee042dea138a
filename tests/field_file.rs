//! Temperature fields: read as they are meant, refused in words where they cannot be used, never a panic.

mod common;

use std::path::{Path, PathBuf};

use common::field_maker::{FieldMaker, number, text};
use spindrift::files::field_file::{FieldProblem, read_field};
use spindrift::medium::field::FieldData;

const TAU: [f64; 2] = [0.6, 1.0];
const X: [f64; 3] = [-1.0, 0.0, 2.0];
const Y: [f64; 4] = [-3.0, -1.0, 1.0, 3.0];
const ETA: [f64; 2] = [-0.5, 0.5];
const PLANE: [&str; 3] = ["tau", "x", "y"];
const POINTS: usize = TAU.len() * X.len() * Y.len();
const HBAR_C_GEV_FM: f64 = 0.197_326_980_4;

/// A temperature that tells its place: tau, x, y in the digits.
fn value(tau: usize, x: usize, y: usize) -> f64 {
    0.2 + 0.1 * tau as f64 + 0.01 * x as f64 + 0.001 * y as f64
}

fn values() -> Vec<f64> {
    let mut values = Vec::new();
    for tau in 0..TAU.len() {
        for x in 0..X.len() {
            for y in 0..Y.len() {
                values.push(value(tau, x, y));
            }
        }
    }
    values
}

struct Place {
    _folder: tempfile::TempDir,
    path: PathBuf,
}

fn place() -> Place {
    let folder = tempfile::tempdir().unwrap();
    Place {
        path: folder.path().join("field.nc"),
        _folder: folder,
    }
}

fn with_axes(path: &Path) -> FieldMaker {
    let maker = FieldMaker::new(path);
    maker
        .axis("tau", &TAU, Some("fm/c"))
        .axis("x", &X, Some("fm"))
        .axis("y", &Y, Some("fm"));
    maker
}

/// Reads what `make` adds to a file with the three axes.
fn read_made(make: impl Fn(&FieldMaker)) -> Result<FieldData, FieldProblem> {
    let place = place();
    let maker = with_axes(&place.path);
    make(&maker);
    drop(maker);
    read_field(&place.path).map_err(|error| *error.problem)
}

/// Reads a sound field with something added or changed by `make`.
fn read_with(make: impl Fn(&FieldMaker)) -> Result<FieldData, FieldProblem> {
    read_made(|maker| {
        maker.variable("temperature", &PLANE, &values(), Some("GeV"));
        make(maker);
    })
}

fn refused(outcome: Result<FieldData, FieldProblem>) -> String {
    outcome.expect_err("must be refused").to_string()
}

#[test]
fn a_plain_field_is_read() {
    let data = read_with(|_| {}).unwrap();
    assert_eq!(
        (&data.tau_fm[..], &data.x_fm[..], &data.y_fm[..]),
        (&TAU[..], &X[..], &Y[..])
    );
    assert_eq!(data.eta, None);
    assert_eq!(data.flow, None);
    assert_eq!(data.warnings, [""; 0]);
    for (tau, x, y) in [(0, 0, 0), (1, 0, 2), (1, 2, 3)] {
        assert_eq!(
            data.temperature_gev[data.index(tau, x, y, 0)],
            value(tau, x, y) as f32
        );
    }
}

#[test]
fn axes_may_stand_in_any_order() {
    let orders = [
        ["y", "tau", "x"],
        ["x", "y", "tau"],
        ["tau", "y", "x"],
        ["y", "x", "tau"],
    ];
    let expected = read_with(|_| {}).unwrap();
    for order in orders {
        let length = |axis: &str| {
            [TAU.len(), X.len(), Y.len()][PLANE.iter().position(|a| *a == axis).unwrap()]
        };
        let mut shuffled = Vec::new();
        for first in 0..length(order[0]) {
            for second in 0..length(order[1]) {
                for third in 0..length(order[2]) {
                    let index = |axis: &str| {
                        [first, second, third][order.iter().position(|a| *a == axis).unwrap()]
                    };
                    shuffled.push(value(index("tau"), index("x"), index("y")));
                }
            }
        }
        let data = read_made(|maker| {
            maker.variable("temperature", &order, &shuffled, Some("GeV"));
        });
        assert_eq!(data.unwrap(), expected, "{order:?}");
    }
}

#[test]
fn rapidity_is_a_fourth_axis() {
    let place = place();
    let maker = with_axes(&place.path);
    maker.axis("eta", &ETA, None);
    let mut all = Vec::new();
    for eta in 0..ETA.len() {
        all.extend(values().iter().map(|value| value + 0.5 * eta as f64));
    }
    maker.variable("temperature", &["eta", "tau", "x", "y"], &all, Some("GeV"));
    drop(maker);
    let data = read_field(&place.path).unwrap();
    assert_eq!(data.shape(), [2, 3, 4, 2]);
    assert_eq!(data.eta.as_deref(), Some(&ETA[..]));
    assert_eq!(
        data.temperature_gev[data.index(1, 2, 3, 1)],
        (value(1, 2, 3) + 0.5) as f32
    );
}

#[test]
fn units_are_converted() {
    for (units, factor) in [
        ("GeV", 1.0),
        ("MeV", 1e3),
        ("1/fm", 1.0 / HBAR_C_GEV_FM),
        ("fm^-1", 1.0 / HBAR_C_GEV_FM),
        ("fm-1", 1.0 / HBAR_C_GEV_FM),
    ] {
        let scaled: Vec<f64> = values().iter().map(|value| value * factor).collect();
        let data = read_made(|maker| {
            maker.variable("temperature", &PLANE, &scaled, Some(units));
        })
        .unwrap();
        for (found, expected) in data.temperature_gev.iter().zip(values()) {
            assert!((f64::from(*found) - expected).abs() < 1e-7, "{units}");
        }
    }
    let unknown = read_made(|maker| {
        maker.variable("temperature", &PLANE, &values(), Some("K"));
    });
    assert!(refused(unknown).contains("\"K\" are not understood; allowed: \"GeV\", \"MeV\""));
    let missing = read_made(|maker| {
        maker.variable("temperature", &PLANE, &values(), None);
    });
    assert!(refused(missing).contains("units are missing"));
}

#[test]
fn packed_integers_are_unpacked() {
    let stored: Vec<i16> = values()
        .iter()
        .map(|value| ((value - 0.3) / 1e-4).round() as i16)
        .collect();
    let data = read_made(|maker| {
        let variable = maker.variable("temperature", &PLANE, &stored, Some("MeV"));
        // stored number -> MeV
        number(&variable, "scale_factor", 0.1f64);
        number(&variable, "add_offset", 300.0f64);
        number(&variable, "_FillValue", i16::MIN);
    })
    .unwrap();
    for (found, expected) in data.temperature_gev.iter().zip(values()) {
        assert!((f64::from(*found) - expected).abs() < 1e-4);
    }
    let single: Vec<f32> = values().iter().map(|value| *value as f32).collect();
    let data = read_made(|maker| {
        maker.variable("temperature", &PLANE, &single, Some("GeV"));
    });
    assert_eq!(data.unwrap().temperature_gev, single);
}

#[test]
fn holes_are_refused_with_the_remedy() {
    let with_hole = |hole: f64, attribute: Option<&'static str>| {
        read_made(move |maker| {
            let mut holed = values();
            holed[13] = hole;
            let variable = maker.variable("temperature", &PLANE, &holed, Some("GeV"));
            if let Some(attribute) = attribute {
                number(&variable, attribute, hole);
            }
        })
    };
    for outcome in [
        with_hole(f64::NAN, None),
        with_hole(f64::INFINITY, None),
        with_hole(f64::NAN, Some("_FillValue")),
        with_hole(-999.0, Some("_FillValue")),
        with_hole(-999.0, Some("missing_value")),
        with_hole(9.969_209_968_386_869e36, None),
    ] {
        let message = refused(outcome);
        assert!(message.contains("fillna(0)"), "{message}");
        assert!(message.contains("tau[1] x[0] y[1]"), "{message}");
    }
}

#[test]
fn absurd_temperatures_are_refused() {
    let with = |temperature: f64| {
        read_made(move |maker| {
            let mut changed = values();
            changed[5] = temperature;
            maker.variable("temperature", &PLANE, &changed, Some("GeV"));
        })
    };
    assert!(refused(with(-1e-3)).contains("not negative"));
    assert!(refused(with(300.0)).contains("units"));
    let hot = with(1.5).unwrap();
    assert!(hot.warnings[0].contains("1.5 GeV"), "{:?}", hot.warnings);
    assert!(with(0.0).unwrap().warnings.is_empty());
}

#[test]
fn four_velocities_are_kept() {
    let ux: Vec<f64> = values().iter().map(|value| value * 10.0).collect();
    let data = read_with(|maker| {
        maker.variable("ux", &PLANE, &ux, Some("1"));
        maker.variable("uy", &PLANE, &[0.5f32; POINTS], None);
        maker.variable("ueta", &PLANE, &[0.25f64; POINTS], None);
    })
    .unwrap();
    let [found_x, found_y, found_eta] = data.flow.unwrap();
    assert_eq!(found_x[7], ux[7] as f32);
    assert_eq!((found_y[7], found_eta[7]), (0.5, 0.25));
}

#[test]
fn three_velocities_are_converted() {
    let data = read_with(|maker| {
        maker.variable("vx", &PLANE, &[0.6f64; POINTS], Some("c"));
        maker.variable("vy", &PLANE, &[0.0f64; POINTS], None);
        maker.variable("veta", &PLANE, &[0.0f64; POINTS], None);
    })
    .unwrap();
    // gamma of 0.6 is 1.25
    let [ux, uy, ueta] = data.flow.unwrap();
    assert!(ux.iter().all(|u| (u - 0.75).abs() < 1e-6));
    assert!(uy.iter().chain(&ueta).all(|u| *u == 0.0));
    let superluminal = read_with(|maker| {
        maker.variable("vx", &PLANE, &[0.8f64; POINTS], None);
        maker.variable("vy", &PLANE, &[0.7f64; POINTS], None);
        maker.variable("veta", &PLANE, &[0.0f64; POINTS], None);
    });
    assert!(refused(superluminal).contains("stays below 1"));
}

#[test]
fn incomplete_or_contradicting_flow_is_refused() {
    let still = vec![0.0f64; POINTS];
    let partial = read_with(|maker| {
        maker.variable("ux", &PLANE, &still, None);
    });
    assert!(refused(partial).contains("flow needs all of ux, uy, ueta"));
    let both = read_with(|maker| {
        maker.variable("ux", &PLANE, &still, None);
        maker.variable("vy", &PLANE, &still, None);
    });
    assert!(refused(both).contains("both"));
    let boost_invariant = read_with(|maker| {
        maker.variable("ux", &PLANE, &still, None);
        maker.variable("uy", &PLANE, &still, None);
    })
    .unwrap();
    assert!(boost_invariant.warnings.is_empty());
    let [_, _, longitudinal] = boost_invariant.flow.unwrap();
    assert!(longitudinal.iter().all(|u| *u == 0.0));
    let place = place();
    let maker = with_axes(&place.path);
    maker.axis("eta", &ETA, None);
    let axes = ["tau", "x", "y", "eta"];
    let (warm, calm) = (vec![0.3; 2 * POINTS], vec![0.0; 2 * POINTS]);
    maker.variable("temperature", &axes, &warm, Some("GeV"));
    maker.variable("ux", &axes, &calm, None);
    maker.variable("uy", &axes, &calm, None);
    drop(maker);
    let with_rapidity = read_field(&place.path).map_err(|error| *error.problem);
    assert!(refused(with_rapidity).contains("flow needs all of ux, uy, ueta"));
    let other_shape = read_with(|maker| {
        maker.variable("ux", &["tau", "x"], &still[..6], None);
        maker.variable("uy", &PLANE, &still, None);
        maker.variable("ueta", &PLANE, &still, None);
    });
    assert!(refused(other_shape).contains("dimensions (tau = 2, x = 3)"));
}

#[test]
fn a_density_of_collisions_is_read() {
    let density: Vec<f64> = (0..12).map(f64::from).collect();
    let data = read_with(|maker| {
        maker.variable("collision_density", &["x", "y"], &density, Some("fm^-2"));
    })
    .unwrap();
    assert_eq!(data.collision_density_per_fm2, Some(density));
    let negative = read_with(|maker| {
        maker.variable("collision_density", &["x", "y"], &[-1.0; 12], Some("fm^-2"));
    });
    assert!(refused(negative).contains("not negative"));
}

#[test]
fn a_density_of_collisions_may_be_transposed() {
    let mut transposed = Vec::new();
    for y in 0..Y.len() {
        transposed.extend((0..X.len()).map(|x| (10 * x + y) as f64));
    }
    let data = read_with(|maker| {
        maker.variable(
            "collision_density",
            &["y", "x"],
            &transposed,
            Some("1/fm^2"),
        );
    })
    .unwrap();
    let density = data.collision_density_per_fm2.unwrap();
    assert_eq!((density[1], density[Y.len()]), (1.0, 10.0));
    let without_units = read_with(|maker| {
        maker.variable("collision_density", &["y", "x"], &transposed, None);
    });
    assert!(refused(without_units).contains("units are missing"));
}

#[test]
fn absurd_flow_is_refused() {
    let with = |component: f64| {
        read_with(move |maker| {
            let mut flow = vec![0.1f64; POINTS];
            flow[4] = component;
            maker.variable("ux", &PLANE, &flow, None);
            maker.variable("uy", &PLANE, &[0.0f64; POINTS], None);
        })
    };
    assert!(with(-3.0).is_ok());
    assert!(refused(with(101.0)).contains("between -100 and 100"));
    assert!(refused(with(f64::NAN)).contains("fillna(0)"));
    let wrong_units = read_with(|maker| {
        maker.variable("ux", &PLANE, &[0.0f64; POINTS], Some("fm"));
        maker.variable("uy", &PLANE, &[0.0f64; POINTS], None);
    });
    assert!(refused(wrong_units).contains("\"fm\" are not understood"));
}

#[test]
fn bad_rapidity_axes_are_refused() {
    let with = |eta: &[f64]| {
        let place = place();
        let maker = with_axes(&place.path);
        maker.axis("eta", eta, None);
        let warm = vec![0.3; POINTS * eta.len()];
        maker.variable("temperature", &["tau", "x", "y", "eta"], &warm, Some("GeV"));
        drop(maker);
        read_field(&place.path).map_err(|error| *error.problem)
    };
    assert!(with(&[-1.0, 0.5]).is_ok());
    assert!(refused(with(&[0.5, -1.0])).contains("strictly increasing"));
    assert!(refused(with(&[0.0])).contains("dataset.isel(eta=0)"));
}

#[test]
fn bad_axes_are_refused() {
    let with = |tau: &[f64], units: Option<&str>| {
        let place = place();
        let maker = FieldMaker::new(&place.path);
        maker
            .axis("tau", tau, units)
            .axis("x", &X, Some("fm"))
            .axis("y", &Y, Some("fm"));
        maker.variable(
            "temperature",
            &PLANE,
            &vec![0.2; tau.len() * 12],
            Some("GeV"),
        );
        drop(maker);
        read_field(&place.path).map_err(|error| *error.problem)
    };
    assert!(with(&[0.6, 1.0, 1.5], Some("fm")).is_ok());
    assert!(refused(with(&[1.0, 0.6], Some("fm"))).contains("strictly increasing"));
    assert!(refused(with(&[0.6, 0.6], Some("fm"))).contains("strictly increasing"));
    assert!(refused(with(&[0.6, f64::NAN], Some("fm"))).contains("tau[1]"));
    assert!(refused(with(&[-0.6, 0.6], Some("fm"))).contains("not negative"));
    assert!(refused(with(&[0.6], Some("fm"))).contains("one point"));
    assert!(refused(with(&[0.6, 1.0], Some("s"))).contains("\"fm\", \"fm/c\""));
    assert!(refused(with(&[0.6, 1.0], None)).contains("missing"));
}

#[test]
fn axes_without_names_or_values_are_refused() {
    let place = place();
    let maker = FieldMaker::new(&place.path);
    let dataset = maker
        .file
        .new_dataset::<f64>()
        .shape([2, 3, 4])
        .create("temperature")
        .unwrap();
    text(&dataset, "units", "GeV");
    drop((dataset, maker));
    assert!(
        read_field(&place.path)
            .unwrap_err()
            .to_string()
            .contains("no name")
    );
    let maker = FieldMaker::new(&place.path);
    maker
        .bare_axis("tau", 2)
        .axis("x", &X, Some("fm"))
        .axis("y", &Y, Some("fm"));
    maker.variable("temperature", &PLANE, &values(), Some("GeV"));
    drop(maker);
    assert!(
        read_field(&place.path)
            .unwrap_err()
            .to_string()
            .contains("assign_coords(tau=...)")
    );
    let maker = with_axes(&place.path);
    maker.axis("time", &[0.0, 1.0], None);
    maker.variable("temperature", &["time", "x", "y"], &values(), Some("GeV"));
    drop(maker);
    assert!(
        read_field(&place.path)
            .unwrap_err()
            .to_string()
            .contains("time, x, y")
    );
}

#[test]
fn something_else_than_numbers_is_refused() {
    let texts = read_made(|maker| {
        let words: Vec<hdf5::types::FixedAscii<4>> =
            vec![hdf5::types::FixedAscii::from_ascii("warm").unwrap(); POINTS];
        maker.variable("temperature", &PLANE, &words, Some("GeV"));
    });
    assert!(refused(texts).contains("must hold numbers"));
    let group = read_made(|maker| {
        maker.file.create_group("temperature").unwrap();
    });
    assert!(refused(group).contains("temperature"));
    let nothing = read_made(|_| {});
    assert!(refused(nothing).contains("no variable \"temperature\" (found: tau, x, y)"));
}

#[test]
fn huge_declared_sizes_are_refused_before_memory_is_taken() {
    let place = place();
    let maker = FieldMaker::new(&place.path);
    maker
        .bare_axis("tau", 1 << 20)
        .bare_axis("x", 1 << 16)
        .bare_axis("y", 1 << 16);
    let dataset = maker
        .file
        .new_dataset::<f32>()
        .chunk([1, 16, 16])
        .shape([1 << 20, 1 << 16, 1 << 16])
        .create("temperature")
        .unwrap();
    text(&dataset, "units", "GeV");
    for (axis, name) in PLANE.iter().enumerate() {
        maker.attach(&dataset, name, axis);
    }
    drop((dataset, maker));
    let message = read_field(&place.path).unwrap_err().to_string();
    assert!(
        message.contains("grid points; at most 2147483648 are allowed"),
        "{message}"
    );
}

#[test]
fn other_formats_are_refused_with_the_remedy() {
    let place = place();
    std::fs::write(&place.path, b"CDF\x01 and more of it").unwrap();
    assert!(
        read_field(&place.path)
            .unwrap_err()
            .to_string()
            .contains("engine=\"h5netcdf\"")
    );
    std::fs::write(&place.path, b"tau,x,y,T\n").unwrap();
    assert_eq!(
        *read_field(&place.path).unwrap_err().problem,
        FieldProblem::NotHdf5
    );
    std::fs::write(&place.path, b"").unwrap();
    assert_eq!(
        *read_field(&place.path).unwrap_err().problem,
        FieldProblem::NotHdf5
    );
    let absent = place.path.with_file_name("absent.nc");
    assert!(matches!(
        *read_field(&absent).unwrap_err().problem,
        FieldProblem::Unreadable(_)
    ));
}

#[test]
fn truncated_files_are_refused() {
    let place = place();
    let maker = with_axes(&place.path);
    maker.variable("temperature", &PLANE, &values(), Some("GeV"));
    drop(maker);
    let whole = std::fs::read(&place.path).unwrap();
    for length in (0..whole.len()).step_by(97) {
        std::fs::write(&place.path, &whole[..length]).unwrap();
        assert!(
            read_field(&place.path).is_err(),
            "{length} bytes of {}",
            whole.len()
        );
    }
}
