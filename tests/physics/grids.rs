//! Proves: a field on a grid gives the path integrals of the flow that it was made from.
//!
//! Deterministic; tolerances are stated where they are used. Outside truth: closed forms, and the same flow sampled
//! finely along the ray with a flow factor worked out here. The error of linear interpolation falls with the square of
//! the spacing.

use std::sync::Arc;

use spindrift::medium::Medium;
use spindrift::medium::field::{
    FieldData, Fluid, Grid, Local, Radial, Ray, Stretch, TemperatureField,
};
use spindrift::medium::trace::{Outcome, Trace};
use spindrift::qcd::HBAR_C_GEV_FM;

use super::paths::{
    COEFFICIENT, END_TEMPERATURE_GEV, Refined, ray, root_mean_square, settings, trace,
};

/// Temperature and flow (u^x, u^y, tau u^eta) as functions of tau, x, y, eta.
#[derive(Clone, Copy)]
struct Flow {
    temperature_gev: fn([f64; 4]) -> f64,
    velocity: fn([f64; 4]) -> [f64; 3],
    first_tau_fm: f64,
}

/// The same as a field of its own, sampled finely; the flow factor is worked out here, apart from the engine's.
struct Fine {
    flow: Flow,
    last_fm: f64,
}

impl TemperatureField for Fine {
    fn stretch(&self, ray: &Ray, _end_temperature_gev: f64) -> Option<Stretch> {
        let first_fm = ray.distance_to_proper_time(self.flow.first_tau_fm)?;
        Some(Stretch {
            first_fm,
            last_fm: self.last_fm,
            cells: 4000,
        })
    }

    fn local(&self, ray: &Ray, l_fm: f64) -> Local {
        let [t, x, y, z] = ray.at(l_fm);
        let eta = 0.5 * ((t + z) / (t - z)).ln();
        let milne = [(t * t - z * z).sqrt(), x, y, eta];
        let [ux, uy, ueta] = (self.flow.velocity)(milne);
        let utau = (1.0 + ux * ux + uy * uy + ueta * ueta).sqrt();
        let ut = utau * eta.cosh() + ueta * eta.sinh();
        let uz = utau * eta.sinh() + ueta * eta.cosh();
        let [nx, ny, nz] = ray.direction;
        Local {
            temperature_gev: (self.flow.temperature_gev)(milne),
            flow_factor: ut - nx * ux - ny * uy - nz * uz,
        }
    }

    fn fluid(&self, _point_fm: [f64; 4]) -> Fluid {
        Fluid::EMPTY
    }

    fn first_tau_fm(&self) -> f64 {
        0.0
    }
}

impl Flow {
    /// The flow on a grid of a spacing in fm (and a tenth of it in eta), tau up to 12, x and y up to 8, eta up to 2.
    fn grid(&self, spacing_fm: f64, with_eta: bool, with_flow: bool) -> Grid {
        let axis = |from: f64, to: f64, step: f64| -> Vec<f64> {
            let count = ((to - from) / step).round() as usize;
            (0..=count)
                .map(|place| from + (to - from) * place as f64 / count as f64)
                .collect()
        };
        let eta = with_eta.then(|| axis(-2.0, 2.0, 0.4 * spacing_fm));
        let mut data = FieldData {
            tau_fm: axis(self.first_tau_fm, 12.0 + self.first_tau_fm, spacing_fm),
            x_fm: axis(-8.0, 8.0, spacing_fm),
            y_fm: axis(-8.0, 8.0, spacing_fm),
            eta: eta.clone(),
            ..FieldData::default()
        };
        let mut velocity = [const { Vec::new() }; 3];
        for tau in &data.tau_fm {
            for x in &data.x_fm {
                for y in &data.y_fm {
                    for eta in eta.as_ref().unwrap_or(&vec![0.0]) {
                        let place = [*tau, *x, *y, *eta];
                        data.temperature_gev
                            .push((self.temperature_gev)(place) as f32);
                        for (column, u) in velocity.iter_mut().zip((self.velocity)(place)) {
                            column.push(u as f32);
                        }
                    }
                }
            }
        }
        data.flow = with_flow.then_some(velocity);
        Grid::new(data, END_TEMPERATURE_GEV)
    }
}

/// A fireball that cools, spreads out, and is dragged along eta.
const FIREBALL: Flow = Flow {
    temperature_gev: |[tau, x, y, eta]| {
        0.42 * (1.0 / tau).cbrt() * (-(x * x / 40.0 + y * y / 25.0 + eta * eta / 8.0)).exp()
    },
    velocity: |[tau, x, y, eta]| [0.06 * x * tau / 2.0, 0.09 * y * tau / 2.0, 0.2 * eta],
    first_tau_fm: 1.0,
};

const BOOST_INVARIANT_FIREBALL: Flow = Flow {
    temperature_gev: |[tau, x, y, _]| (FIREBALL.temperature_gev)([tau, x, y, 0.0]),
    velocity: |[tau, x, y, _]| (FIREBALL.velocity)([tau, x, y, 0.0]),
    first_tau_fm: 1.0,
};

/// Rays from many places in many directions.
fn rays() -> Vec<Ray> {
    let mut rays = Vec::new();
    for place in 0..60 {
        let u = |salt: f64| ((place as f64 + 1.0) * salt).fract() * 2.0 - 1.0;
        let (azimuth, nz) = (3.2 * u(0.618_033_99), 0.8 * u(0.414_213_56));
        let t = 1.5 + u(0.732_050_81);
        let birth = [
            t,
            3.0 * u(0.236_067_98),
            3.0 * u(0.645_751_31),
            0.7 * t * u(0.162_277_66),
        ];
        let sine = (1.0_f64 - nz * nz).sqrt();
        rays.push(ray(birth, [sine * azimuth.cos(), sine * azimuth.sin(), nz]));
    }
    rays
}

/// Root mean square over rays of the relative errors of I0 and of I1.
fn grid_errors(
    flow: Flow,
    spacing_fm: f64,
    [with_eta, with_flow]: [bool; 2],
    cells: usize,
) -> [f64; 2] {
    let settings = settings(with_flow);
    let grid = Refined {
        field: flow.grid(spacing_fm, with_eta, with_flow),
        factor: cells,
    };
    let medium = Medium::new(&settings, Arc::new(grid));
    let fine = Medium::new(
        &settings,
        Arc::new(Fine {
            flow,
            last_fm: 12.0,
        }),
    );
    let (mut on_grid, mut expected) = (Trace::default(), Trace::default());
    let mut errors = [Vec::new(), Vec::new()];
    for ray in rays() {
        let outcomes = [
            medium.trace(medium.field(), &ray, 100.0, &mut on_grid),
            fine.trace(fine.field(), &ray, 100.0, &mut expected),
        ];
        // Rays that leave the grid hot are another matter.
        if outcomes != [Outcome::Medium { left_hot: false }; 2] {
            continue;
        }
        let (found, wanted) = (&on_grid.path, &expected.path);
        errors[0].push(found.qhat_integral_gev2() / wanted.qhat_integral_gev2() - 1.0);
        errors[1].push(found.first_moment_gev2_fm() / wanted.first_moment_gev2_fm() - 1.0);
    }
    assert!(errors[0].len() > 20, "{}", errors[0].len());
    errors.map(|errors| root_mean_square(&errors))
}

/// With eight times the engine's cells, so that interpolation alone errs, the error falls with the square of the spacing
/// (an order of 1.6 to 2.4 allowed on finitely many rays: where a path ends moves in steps of its own). With the
/// engine's cells it is below 0.5 % at 0.25 fm.
fn check_order(flow: Flow, spacings: &[f64], kind: [bool; 2]) {
    let errors = |cells| -> Vec<[f64; 2]> {
        let of = |spacing: &f64| grid_errors(flow, *spacing, kind, cells);
        spacings.iter().map(of).collect()
    };
    let (own, fine) = (errors(1), errors(8));
    for (place, spacing) in spacings.iter().enumerate() {
        let [own, fine] = [own[place], fine[place]];
        println!(
            "[eta, flow] {kind:?}, {spacing} fm: I0 {:.1e} ({:.1e} fine), I1 {:.1e} ({:.1e})",
            own[0], fine[0], own[1], fine[1]
        );
        assert!(*spacing > 0.25 || own[0] < 5e-3);
    }
    for (spacings, errors) in spacings.windows(2).zip(fine.windows(2)) {
        for (coarse, fine) in errors[0].iter().zip(errors[1]) {
            let order = (coarse / fine).ln() / (spacings[0] / spacings[1]).ln();
            assert!((1.6..2.4).contains(&order), "order {order:.2}");
        }
    }
}

#[test]
fn a_grid_converges_with_the_square_of_its_spacing() {
    for with_flow in [false, true] {
        check_order(
            BOOST_INVARIANT_FIREBALL,
            &[0.5, 0.25, 0.125],
            [false, with_flow],
        );
    }
}

#[test]
fn a_grid_with_rapidity_converges_too() {
    for with_flow in [false, true] {
        check_order(FIREBALL, &[0.5, 0.25], [true, with_flow]);
    }
}

/// The longitudinal solution read from a grid, against the same in closed form, at rest in (tau, x, y, eta).
#[test]
fn the_longitudinal_solution_on_a_grid() {
    let flow = Flow {
        temperature_gev: |[tau, ..]| 0.3 * (1.0 / tau).cbrt(),
        velocity: |_| [0.0; 3],
        first_tau_fm: 1.0,
    };
    let start = ray([0.0; 4], [1.0, 0.0, 0.3]);
    let expected = COEFFICIENT * 0.027 / HBAR_C_GEV_FM * 3.0 * 2.0_f64.ln();
    let mut last = f64::INFINITY;
    for spacing in [0.8, 0.4, 0.2] {
        let path = trace(
            &settings(true),
            Arc::new(flow.grid(spacing, false, true)),
            &start,
        );
        let found = path.expect("a medium").qhat_integral_gev2();
        let error = (found / expected - 1.0).abs();
        println!("spacing {spacing} fm: {found:.6} against {expected:.6}, {error:.1e}");
        assert!(error < 0.5 * last, "{error} after {last}");
        last = error;
    }
    assert!(last < 5e-3);
}

/// The radial solution read from a grid, against the same in closed form: with eight times the engine's cells the error
/// falls with the square of the spacing.
#[test]
fn the_radial_solution_on_a_grid() {
    const Q2: f64 = 1.0 / (4.3 * 4.3);
    let flow = Flow {
        temperature_gev: |[tau, x, y, _]| {
            let (a, b) = (Q2 * tau * tau, Q2 * (x * x + y * y));
            let spread = 1.0 + 2.0 * (a + b) + (a - b) * (a - b);
            80.0_f64.sqrt().sqrt() * HBAR_C_GEV_FM * (4.0 * Q2 / (tau * spread)).cbrt()
        },
        velocity: |[tau, x, y, _]| {
            let (a, b) = (Q2 * tau * tau, Q2 * (x * x + y * y));
            let slope = 2.0 * Q2 * tau / (1.0 + 2.0 * (a + b) + (a - b) * (a - b)).sqrt();
            [slope * x, slope * y, 0.0]
        },
        first_tau_fm: 1.0,
    };
    let exact = || Radial::new(80.0_f64.sqrt().sqrt(), Q2.sqrt(), 1.0);
    for with_flow in [false, true] {
        let settings = settings(with_flow);
        let fine = Medium::new(
            &settings,
            Arc::new(Refined {
                field: exact(),
                factor: 8,
            }),
        );
        let errors = [0.5, 0.25, 0.125].map(|spacing_fm| {
            let grid = Refined {
                field: flow.grid(spacing_fm, false, true),
                factor: 8,
            };
            let medium = Medium::new(&settings, Arc::new(grid));
            let (mut on_grid, mut expected) = (Trace::default(), Trace::default());
            let mut errors = Vec::new();
            for ray in rays() {
                let outcomes = [
                    medium.trace(medium.field(), &ray, 100.0, &mut on_grid),
                    fine.trace(fine.field(), &ray, 100.0, &mut expected),
                ];
                if outcomes == [Outcome::Medium { left_hot: false }; 2] {
                    let (found, wanted) = (&on_grid.path, &expected.path);
                    errors.push(found.qhat_integral_gev2() / wanted.qhat_integral_gev2() - 1.0);
                }
            }
            assert!(errors.len() > 20, "{}", errors.len());
            root_mean_square(&errors)
        });
        println!("flow {with_flow}: {errors:?}");
        for pair in errors.windows(2) {
            let order = (pair[0] / pair[1]).log2();
            assert!((1.6..2.4).contains(&order), "order {order:.2}");
        }
        assert!(errors[2] < 3e-3);
    }
}

/// A uniform fluid in constant motion: I0 = qhat L (u^tau cosh(eta - y) ...)/E in closed form. For a transverse ray
/// from z = 0 it is qhat L (u^tau - n.u); tau u^eta adds to u^tau alone there.
#[test]
fn constant_flow() {
    let flow = Flow {
        temperature_gev: |_| 0.3,
        velocity: |_| [0.5, -0.3, 0.4],
        first_tau_fm: 0.5,
    };
    let rest = COEFFICIENT * 0.027 / HBAR_C_GEV_FM;
    let utau = (1.0_f64 + 0.25 + 0.09 + 0.16).sqrt();
    for with_eta in [false, true] {
        for direction in [
            [1.0, 0.0, 0.0],
            [0.0, -1.0, 0.0],
            [0.6, 0.8, 0.0],
            [-0.8, 0.6, 0.0],
        ] {
            let born = ray([0.5, 0.0, 0.0, 0.0], direction);
            let grid = || Arc::new(flow.grid(1.0, with_eta, true));
            let path = trace(&settings(true), grid(), &born).expect("a medium");
            // Until the ray leaves the grid in x, y, or tau (12.5 fm).
            let reach = |n: f64| {
                if n == 0.0 {
                    f64::INFINITY
                } else {
                    8.0 / n.abs()
                }
            };
            let length = 12.0_f64.min(reach(direction[0])).min(reach(direction[1]));
            let along = 0.5 * direction[0] - 0.3 * direction[1];
            let expected = rest * length * (utau - along);
            let found = path.qhat_integral_gev2();
            // f32 values.
            assert!(
                (found / expected - 1.0).abs() < 1e-5,
                "{found} against {expected}"
            );
            // Without the flow factor.
            let still = trace(&settings(false), grid(), &born).expect("a medium");
            assert!((still.qhat_integral_gev2() / (rest * length) - 1.0).abs() < 1e-5);
        }
        // From the origin at any angle cosh and sinh of (eta - y) are 1 and 0: sqrt(1 - nz^2) (u^tau - n_perp.u/...).
        let tilted = ray([0.0; 4], [0.6, 0.0, 0.8]);
        let path = trace(
            &settings(true),
            Arc::new(flow.grid(1.0, with_eta, true)),
            &tilted,
        );
        let (first, last): (f64, f64) = (0.5 / 0.6, 8.0 / 0.6);
        let expected = rest * (last - first) * (0.6 * utau - 0.6 * 0.5);
        let found = path.expect("a medium").qhat_integral_gev2();
        assert!(
            (found / expected - 1.0).abs() < 1e-5,
            "{found} against {expected}"
        );
    }
}

/// A uniform grid: birth outside, flight past it, and leaving it hot.
#[test]
fn births_outside_the_grid() {
    let flow = Flow {
        temperature_gev: |_| 0.3,
        velocity: |_| [0.0; 3],
        first_tau_fm: 0.5,
    };
    let rest = COEFFICIENT * 0.027 / HBAR_C_GEV_FM;
    let medium = Medium::new(&settings(true), Arc::new(flow.grid(1.0, false, false)));
    let mut trace = Trace::default();
    // From x = -10 to the grid's edge at -8, then until tau = 12.5.
    let inwards = ray([0.0, -10.0, 3.0, 0.0], [1.0, 0.0, 0.0]);
    assert_eq!(
        medium.trace(medium.field(), &inwards, 100.0, &mut trace),
        Outcome::Medium { left_hot: true }
    );
    let found = trace.path.qhat_integral_gev2();
    assert!((found / (rest * 10.5) - 1.0).abs() < 1e-5, "{found}");
    let lever = trace.path.first_moment_gev2_fm();
    assert!(
        (lever / (rest * 10.5 * (2.0 + 5.25)) - 1.0).abs() < 1e-5,
        "{lever}"
    );
    for (birth, direction) in [
        ([0.0, 12.0, 3.0, 0.0], [1.0, 0.0, 0.0]),
        ([0.0, 12.0, 3.0, 0.0], [0.0, 1.0, 0.0]),
        ([0.0, -9.0, 7.0, 0.0], [1.0, 2.0, 0.0]),
        ([13.0, 0.0, 0.0, 0.0], [1.0, 0.0, 0.0]),
        // Along the beam from the origin tau stays 0.
        ([0.0; 4], [0.0, 0.0, 1.0]),
        ([0.0; 4], [0.0, 0.0, -1.0]),
    ] {
        assert_eq!(
            medium.trace(medium.field(), &ray(birth, direction), 100.0, &mut trace),
            Outcome::Empty,
            "{birth:?}"
        );
    }
    // Along the beam from inside the light cone: tau^2 = t^2 - z^2 + 2 l (t - z).
    let beam = ray([2.0, 1.0, 1.0, 1.5], [0.0, 0.0, 1.0]);
    assert_eq!(
        medium.trace(medium.field(), &beam, 100.0, &mut trace),
        Outcome::Medium { left_hot: true }
    );
    let length = (12.5_f64.powi(2) - 1.75) / (2.0 * 0.5);
    // At rest in Milne coordinates p.u/E = (t - nz z)/tau = dtau/dl, so the path counts as long as tau grows.
    let grown = 12.5 - 1.75_f64.sqrt();
    let found = trace.path.qhat_integral_gev2();
    assert!((found / (rest * grown) - 1.0).abs() < 1e-3, "{found}");
    let still = Medium::new(&settings(false), Arc::new(flow.grid(1.0, false, false)));
    still.trace(still.field(), &beam, 100.0, &mut trace);
    let found = trace.path.qhat_integral_gev2();
    assert!((found / (rest * length) - 1.0).abs() < 1e-5, "{found}");
}

/// A sharp edge between grid planes is known to a spacing: the length of a brick that ends inside the grid.
#[test]
fn a_sharp_edge_is_known_to_a_spacing() {
    let flow = Flow {
        temperature_gev: |[tau, ..]| if tau < 5.03 { 0.3 } else { 0.0 },
        velocity: |_| [0.0; 3],
        first_tau_fm: 1.0,
    };
    let rest = COEFFICIENT * 0.027 / HBAR_C_GEV_FM;
    for spacing in [1.0, 0.5, 0.25] {
        let born = ray([1.0, 0.0, 0.0, 0.0], [0.6, 0.8, 0.0]);
        let path = trace(
            &settings(true),
            Arc::new(flow.grid(spacing, false, false)),
            &born,
        );
        let length = path.expect("a medium").qhat_integral_gev2() / rest;
        println!("spacing {spacing} fm: length {length:.4} of 4.03 fm");
        assert!((length - 4.03).abs() < 2.0 * spacing);
    }
}
