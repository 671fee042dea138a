//! Proves: the path integrals of qhat are those of the analytic fields (for grids see `grids`).
//!
//! Deterministic; tolerances are stated where they are used. Outside truth: longitudinal.json (quadrature in arbitrary
//! precision) and closed forms. The linear cells converge with the fourth power of their size (Simpson's mean).

use std::sync::Arc;

use spindrift::medium::effects::collinear_expansion::{CollinearExpansion, PhaseSettings};
use spindrift::medium::field::{
    Brick, Fluid, Local, Longitudinal, Radial, Ray, Stretch, TemperatureField,
};
use spindrift::medium::path::Path;
use spindrift::medium::trace::{Outcome, Trace};
use spindrift::medium::{Medium, MediumSettings, TransportKind};
use spindrift::qcd::HBAR_C_GEV_FM;

use super::support::reference::{self, number};
use super::support::setup::brick;

const START_TEMPERATURE_GEV: f64 = 0.45;
const START_FM: f64 = 0.6;
pub const END_TEMPERATURE_GEV: f64 = 0.15;
pub const COEFFICIENT: f64 = 4.0;

pub fn settings(flow: bool) -> MediumSettings {
    let mut settings = brick(1.0, 1.0, PhaseSettings::Interference);
    // Without effects the path is traced whole.
    settings.effects.clear();
    settings.transport.kind = TransportKind::Cubic {
        coefficient: COEFFICIENT,
    };
    settings.transport.flow = flow;
    settings.field.end_temperature_gev = END_TEMPERATURE_GEV;
    settings
}

/// The path of a ray, `None` without a medium on it.
pub fn trace(
    settings: &MediumSettings,
    field: Arc<dyn TemperatureField>,
    ray: &Ray,
) -> Option<Path> {
    let mut trace = Trace::default();
    let medium = Medium::new(settings, field);
    match medium.trace(medium.field(), ray, 100.0, &mut trace) {
        Outcome::Empty => None,
        Outcome::Medium { .. } => Some(trace.path),
    }
}

pub fn ray(birth_fm: [f64; 4], direction: [f64; 3]) -> Ray {
    let size = direction.iter().map(|c| c * c).sum::<f64>().sqrt();
    Ray {
        birth_fm,
        direction: direction.map(|c| c / size),
    }
}

/// A field cut into more cells than it asks for.
pub struct Refined<F> {
    pub field: F,
    pub factor: usize,
}

impl<F: TemperatureField> TemperatureField for Refined<F> {
    fn stretch(&self, ray: &Ray, end_temperature_gev: f64) -> Option<Stretch> {
        let stretch = self.field.stretch(ray, end_temperature_gev)?;
        Some(Stretch {
            cells: stretch.cells * self.factor,
            ..stretch
        })
    }

    fn local(&self, ray: &Ray, l_fm: f64) -> Local {
        self.field.local(ray, l_fm)
    }

    fn fluid(&self, point_fm: [f64; 4]) -> Fluid {
        self.field.fluid(point_fm)
    }

    fn first_tau_fm(&self) -> f64 {
        self.field.first_tau_fm()
    }
}

/// int qhat K(l/formation) dl of a path, GeV^2: the relative change times z(1-z) t.
fn phase_integral(path: &Path, phase: PhaseSettings, formation_fm: f64) -> f64 {
    CollinearExpansion::new("collinear-expansion".into(), phase, false)
        .strength_gev2(path, 1.0 / formation_fm)
}

/// Errors of one refinement over all cases of longitudinal.json, over I0: of the moments (relative), of the phases.
fn longitudinal_errors(factor: usize) -> [Vec<f64>; 2] {
    let mut errors = [Vec::new(), Vec::new()];
    for case in reference::cases("longitudinal") {
        let cosine = number(&case, "direction_cosine_to_beam");
        let birth = [
            number(&case, "birth_t_fm"),
            1.0,
            -2.0,
            number(&case, "birth_z_fm"),
        ];
        let sine = (1.0 - cosine * cosine).sqrt();
        let ray = Ray {
            birth_fm: birth,
            direction: [0.6 * sine, 0.8 * sine, cosine],
        };
        let field = Refined {
            field: Longitudinal::new(START_TEMPERATURE_GEV, START_FM),
            factor,
        };
        let path = trace(&settings(case["flow"] == true), Arc::new(field), &ray);
        let total = number(&case, "I0_GeV2");
        let Some(path) = path else {
            assert_eq!(total, 0.0, "{case}");
            continue;
        };
        let moments = [
            (path.qhat_integral_gev2(), total),
            (path.first_moment_gev2_fm(), number(&case, "I1_GeV2_fm")),
            (path.second_moment_gev2_fm2(), number(&case, "I2_GeV2_fm2")),
        ];
        errors[0].extend(moments.map(|(found, expected)| found / expected - 1.0));
        for row in case["phase_integrals_GeV2"].as_array().expect("a list") {
            let formation = number(row, "formation_fm");
            for (key, phase) in [
                ("interference", PhaseSettings::Interference),
                ("rescattering", PhaseSettings::Rescattering { window: 1.0 }),
                ("soft_gradient", PhaseSettings::SoftGradient),
            ] {
                let found = phase_integral(&path, phase, formation);
                errors[1].push((found - number(row, key)) / total);
            }
        }
    }
    errors
}

fn largest(errors: &[f64]) -> f64 {
    errors
        .iter()
        .fold(0.0, |largest, error| error.abs().max(largest))
}

pub fn root_mean_square(errors: &[f64]) -> f64 {
    (errors.iter().map(|error| error * error).sum::<f64>() / errors.len() as f64).sqrt()
}

/// With the cells that the engine takes: moments to 10^-3, phase integrals to 0.5 % of I0, far below what a sample of
/// 10^5 events sees. With more cells the errors fall with the fourth power (a factor 16 each time; at least 10 asked
/// for), down to 10^-6 and less.
#[test]
fn longitudinal_expansion() {
    let rounds = [1, 2, 4, 8].map(longitudinal_errors);
    for (factor, errors) in [1, 2, 4, 8].iter().zip(&rounds) {
        println!(
            "cells x {factor}: moments {:.1e} (largest {:.1e}), phases {:.1e} (largest {:.1e})",
            root_mean_square(&errors[0]),
            largest(&errors[0]),
            root_mean_square(&errors[1]),
            largest(&errors[1])
        );
    }
    assert_eq!(rounds[0][0].len(), 22 * 3);
    assert_eq!(rounds[0][1].len(), 22 * 15);
    assert!(largest(&rounds[0][0]) < 1e-3);
    assert!(largest(&rounds[0][1]) < 5e-3);
    for (place, pair) in rounds.windows(2).enumerate() {
        for (kind, (coarse, fine)) in pair[0].iter().zip(&pair[1]).enumerate() {
            // The first cells may be longer than the wavelength: phases are not yet on their power law there.
            if kind == 1 && place == 0 {
                continue;
            }
            let (coarse, fine) = (root_mean_square(coarse), root_mean_square(fine));
            assert!(coarse > 10.0 * fine, "{coarse} to {fine}");
        }
    }
    assert!(largest(&rounds[3][0]) < 1e-6 && largest(&rounds[3][1]) < 1e-5);
}

/// I0 of a transverse ray from the origin: c T0^3 tau0/(hbar c) ln(tau_end/tau0), tau_end = tau0 (T0/T_end)^3; nothing
/// where the medium never reaches the end temperature. To 3 x 10^-4 (the engine's own
/// cells; a long path has coarse ones).
#[test]
fn the_end_temperature_ends_the_path() {
    let along = ray([0.0; 4], [1.0, 2.0, 0.0]);
    for end in [0.1, 0.15, 0.2, 0.3, 0.44] {
        let mut settings = settings(true);
        settings.field.end_temperature_gev = end;
        let field = Longitudinal::new(START_TEMPERATURE_GEV, START_FM);
        let path = trace(&settings, Arc::new(field), &along).expect("a medium");
        let cooling = START_TEMPERATURE_GEV / end;
        let scale = COEFFICIENT * START_TEMPERATURE_GEV.powi(3) * START_FM / HBAR_C_GEV_FM;
        let expected = scale * 3.0 * cooling.ln();
        let found = path.qhat_integral_gev2();
        assert!((path.end_fm() - START_FM * cooling.powi(3)).abs() < 1e-9 * path.end_fm());
        println!("end {end} GeV: {found:.6} against {expected:.6}");
        assert!(
            (found / expected - 1.0).abs() < 3e-4,
            "{end}: {found} against {expected}"
        );
    }
    let mut cold = settings(true);
    cold.field.end_temperature_gev = 0.46;
    let field = Longitudinal::new(START_TEMPERATURE_GEV, START_FM);
    assert!(trace(&cold, Arc::new(field), &along).is_none());
}

/// Rays from the centre and from elsewhere, into all directions, through the radial solution: I0 and I1 against the
/// midpoint rule with 200 000 points, with temperatures and a flow factor written out here, to 10^-3 with the engine's
/// cells and to 10^-4 with more (the rule here knows the ends of the medium to 2 x 10^-4 fm). The engine's own error
/// falls with the fourth power of the cells' size: a factor 16 from one refinement to the next, at least 10 asked for.
#[test]
fn the_radial_solution() {
    const POINTS: usize = 200_000;
    let (amplitude, q, start_fm) = (80.0_f64.sqrt().sqrt(), 1.0 / 4.3, START_FM);
    let rays = [
        ray([0.0; 4], [1.0, 0.0, 0.0]),
        ray([0.0, 1.0, -2.0, 0.0], [0.6, 0.8, 0.4]),
        ray([0.0, 4.0, 0.0, 0.0], [-1.0, 0.1, 0.0]),
        ray([2.0, -1.0, 2.0, 1.1], [0.3, 0.5, -0.6]),
        ray([1.0, 0.5, 0.5, -0.3], [0.0, 1.0, -2.0]),
    ];
    for flow in [false, true] {
        for ray in &rays {
            let mut expected = [0.0; 2];
            let last_fm = 40.0;
            for point in 0..POINTS {
                let l = last_fm * (point as f64 + 0.5) / POINTS as f64;
                let [t, x, y, z] = ray.at(l);
                let (tau, r2) = ((t * t - z * z).sqrt(), x * x + y * y);
                let (a, b) = (q * q * tau * tau, q * q * r2);
                let spread = 1.0 + 2.0 * (a + b) + (a - b) * (a - b);
                let temperature = amplitude * HBAR_C_GEV_FM * (4.0 * q * q / (tau * spread)).cbrt();
                if tau < start_fm || temperature < END_TEMPERATURE_GEV {
                    continue;
                }
                // The fluid moves with v = 2 q^2 tau r/(1 + a + b) in the frame that moves along the beam with z/t.
                let gamma = (1.0 + a + b) / spread.sqrt();
                let [nx, ny, nz] = ray.direction;
                let beam = (t - nz * z) / tau;
                let across = 2.0 * q * q * tau * (nx * x + ny * y) / (1.0 + a + b);
                let factor = if flow { gamma * (beam - across) } else { 1.0 };
                let qhat = COEFFICIENT * temperature.powi(3) / HBAR_C_GEV_FM * factor;
                expected[0] += qhat * last_fm / POINTS as f64;
                expected[1] += l * qhat * last_fm / POINTS as f64;
            }
            let errors = [1, 2, 4, 8].map(|factor| {
                let field = Radial::new(amplitude, q, start_fm);
                let field = Refined { field, factor };
                let path = trace(&settings(flow), Arc::new(field), ray).expect("a medium");
                let found = [path.qhat_integral_gev2(), path.first_moment_gev2_fm()];
                [0, 1].map(|order| found[order] / expected[order] - 1.0)
            });
            println!("flow {flow}, {ray:?}: {errors:?}");
            let within = |errors: &[f64], limit: f64| errors.iter().all(|e| e.abs() < limit);
            assert!(within(&errors[0], 1e-3) && within(&errors[3], 1e-4));
            for order in [0, 1] {
                let left = [0, 1].map(|round| (errors[round][order] - errors[3][order]).abs());
                assert!(left[0] > 10.0 * left[1], "{left:?}");
            }
        }
    }
}

/// int qhat dx over the coefficient (GeV^2) from the centre across the beam, tau = 0.6 to 5 fm, values of an
/// independent calculation to six digits: longitudinal expansion from 0.45 GeV, the radial solution (1/q = 4.3 fm,
/// amplitude 80^(1/4)) without and with the flow factor.
#[test]
fn integrals_of_an_independent_calculation() {
    let across = ray([0.0; 4], [0.3, -1.0, 0.0]);
    let radial = || Until(Radial::new(80.0_f64.sqrt().sqrt(), 1.0 / 4.3, START_FM));
    let longitudinal = || Until(Longitudinal::new(START_TEMPERATURE_GEV, START_FM));
    let integral = |flow: bool, field: Arc<dyn TemperatureField>| {
        let mut settings = settings(flow);
        settings.field.end_temperature_gev = 0.01;
        let path = trace(&settings, field, &across).expect("a medium");
        path.qhat_integral_gev2() / COEFFICIENT
    };
    for (found, expected) in [
        (integral(true, Arc::new(longitudinal())), 0.587479),
        (integral(false, Arc::new(radial())), 0.276919),
        (integral(true, Arc::new(radial())), 0.225880),
    ] {
        assert!(
            (found - expected).abs() < 1e-6,
            "{found} against {expected}"
        );
    }
}

/// A field up to a distance of 5 fm along any ray, in many cells.
struct Until<F>(F);

impl<F: TemperatureField> TemperatureField for Until<F> {
    fn stretch(&self, ray: &Ray, end_temperature_gev: f64) -> Option<Stretch> {
        let stretch = self.0.stretch(ray, end_temperature_gev)?;
        Some(Stretch {
            last_fm: 5.0,
            cells: 200,
            ..stretch
        })
    }

    fn local(&self, ray: &Ray, l_fm: f64) -> Local {
        self.0.local(ray, l_fm)
    }

    fn fluid(&self, point_fm: [f64; 4]) -> Fluid {
        self.0.fluid(point_fm)
    }

    fn first_tau_fm(&self) -> f64 {
        self.0.first_tau_fm()
    }
}

/// A brick: I_k = qhat (L - t)^(k+1)/(k+1) for a birth at lab time t, whatever the direction; nothing after its end.
#[test]
fn bricks() {
    let length = 5.0;
    let mut settings = settings(true);
    settings.transport.kind = TransportKind::Constant {
        qhat_gev2_per_fm: 0.7,
    };
    for (t, direction) in [
        (0.0, [1.0, 0.0, 0.0]),
        (1.3, [0.0, 0.6, 0.8]),
        (4.9, [0.0, 0.0, -1.0]),
    ] {
        let born = ray([t, 30.0, -7.0, 0.5 * t], direction);
        let path = trace(&settings, Arc::new(Brick::new(0.3, length)), &born).expect("a medium");
        let l: f64 = length - t;
        for (found, expected) in [
            (path.qhat_integral_gev2(), 0.7 * l),
            (path.first_moment_gev2_fm(), 0.7 * l.powi(2) / 2.0),
            (path.second_moment_gev2_fm2(), 0.7 * l.powi(3) / 3.0),
            (path.fourth_moment_gev2_fm4(), 0.7 * l.powi(5) / 5.0),
        ] {
            assert!(
                (found / expected - 1.0).abs() < 1e-12,
                "{found} against {expected}"
            );
        }
    }
    let late = ray([5.1, 0.0, 0.0, 0.0], [1.0, 0.0, 0.0]);
    assert!(trace(&settings, Arc::new(Brick::new(0.3, length)), &late).is_none());
}
