//! The spectra of soft gluons, integrated over the transverse momentum, and what they are made of.

use std::sync::Arc;

use spindrift::medium::effects::EffectSettings;
use spindrift::medium::field::{Longitudinal, TemperatureField};
use spindrift::medium::{Medium, TransportKind};
use spindrift::qcd::{C_F, HBAR_C_GEV_FM, Species};

use super::super::support::effects::{centres, plain};
use super::super::support::setup::{brick_with, up};
use super::{TEMPERATURE_GEV, Traced};

/// The tables of h are exact to 6 x 10^-4 and better; over some units of ln kappa^2 the errors add up and cancel.
const TABLE_ERROR: f64 = 1e-3;

/// int h d ln kappa^2 of a quark's soft gluon of energy `omega_gev`, through R P (1-z)/(4 C_F).
fn integrated(traced: &Traced, omega_gev: f64) -> f64 {
    const STEPS: usize = 6000;
    const LOW: f64 = -16.0;
    const HIGH: f64 = 22.0;
    let fraction = 1e-3;
    let (z, step) = (1.0 - fraction, (HIGH - LOW) / STEPS as f64);
    let kernel = C_F * (1.0 + z * z) / fraction;
    let at = |place: usize| {
        let kappa2 = (LOW + (place as f64 + 0.5) * step).exp();
        let t = kappa2 / (z * fraction);
        traced.change(up(), omega_gev / fraction, t, z, false)
    };
    (0..STEPS).map(at).sum::<f64>() * step * kernel * fraction / (4.0 * C_F)
}

#[test]
fn multiple_soft() {
    let (length, qhat) = (3.0, 1.0);
    let traced = Traced::brick(&plain("multiple-soft"), length, qhat);
    let critical_gev = qhat * length * length / 2.0 / HBAR_C_GEV_FM;
    // Quoted with the formula.
    for (ratio, expected) in [
        (0.1, 1.540261),
        (0.5, 0.2573165),
        (1.0, 0.0772454),
        (2.0, 0.0204229),
    ] {
        let found = integrated(&traced, ratio * critical_gev);
        println!("omega/omega_c {ratio}: {found:.7} against {expected}");
        assert!((found - expected).abs() < TABLE_ERROR, "{ratio}");
    }
    // Thick: sqrt(omega_c/(2 omega)) - ln 2. Thin: (omega_c/omega)^2/12.
    let thick = integrated(&traced, 2e-3 * critical_gev);
    let expected = (500.0_f64 / 2.0).sqrt() - 2.0_f64.ln();
    println!("thick {thick} against {expected}");
    assert!((thick / expected - 1.0).abs() < 1e-3);
    let thin = integrated(&traced, 10.0 * critical_gev);
    println!("thin {thin} against {}", 0.01 / 12.0);
    assert!((thin * 1200.0 - 1.0).abs() < 0.03);
    // Vanishing medium, vanishing length.
    for (length, qhat) in [(3.0, 1e-7), (1e-4, 1.0)] {
        let nearly_nothing = Traced::brick(&plain("multiple-soft"), length, qhat);
        for t in [1.0, 10.0, 100.0] {
            let change = nearly_nothing.change(up(), 100.0, t, 0.8, false);
            assert!(change.abs() < 1e-5, "{change}");
        }
    }
}

/// gamma int dr (r - sin r)/(r^2 (r + gamma)), the tail beyond 4000 closed.
fn opacity_integral(gamma: f64) -> f64 {
    const STEPS: usize = 400_000;
    const LAST: f64 = 4000.0;
    let step = LAST / STEPS as f64;
    let at = |place: usize| {
        let r = (place as f64 + 0.5) * step;
        // (r - sin r)/r^2 = r/6 - ... near 0.
        let body = if r < 1e-3 {
            r / 6.0
        } else {
            (r - r.sin()) / (r * r)
        };
        body / (r + gamma)
    };
    gamma * (0..STEPS).map(at).sum::<f64>() * step + (gamma / LAST).ln_1p()
}

#[test]
fn single_hard() {
    let (length, mass) = (3.0, 0.6);
    let traced = Traced::brick(&centres(0.4, mass), length, 1.0);
    for gamma in [0.1, 1.0, 5.0, 50.0] {
        let omega_gev = mass * mass * length / (2.0 * gamma * HBAR_C_GEV_FM);
        let found = integrated(&traced, omega_gev);
        let expected = 0.4 * length * opacity_integral(gamma);
        println!("gamma {gamma}: {found:.6} against {expected:.6}");
        let tolerance = 0.4 * length * TABLE_ERROR;
        assert!((found - expected).abs() < tolerance, "{gamma}");
    }
    for species in [up(), Species::GLUON] {
        let change = |effect: &EffectSettings, t: f64| {
            Traced::brick(effect, length, 1.3).change(species, 60.0, t, 0.7, true)
        };
        for t in [2.0, 20.0, 200.0] {
            let (once, twice) = (
                change(&centres(0.2, mass), t),
                change(&centres(0.4, mass), t),
            );
            assert!((twice / once - 2.0).abs() < 1e-9);
            // n0 = qhat/mu^2 with the Debye mass of alpha_s = .3 and three flavours.
            let debye =
                TEMPERATURE_GEV * (4.0 * std::f64::consts::PI * 0.3 * (1.0 + 3.0 / 6.0)).sqrt();
            let given = change(&centres(1.3 / (debye * debye), debye), t);
            let transport = change(&plain("single-hard"), t);
            assert!(
                (transport / given - 1.0).abs() < 1e-9,
                "{transport} against {given}"
            );
        }
    }
}

/// In longitudinal expansion across the beam `multiple-soft` is the brick of the same omega_c and length.
#[test]
fn expanding_media_scale() {
    let (start_gev, start_fm, end_gev): (f64, f64, f64) = (0.45, 0.6, 0.15);
    let mut settings = brick_with(1.0, 1.0, vec![plain("multiple-soft")]);
    settings.transport.kind = TransportKind::Cubic { coefficient: 4.0 };
    settings.field.end_temperature_gev = end_gev;
    let field: Arc<dyn TemperatureField> = Arc::new(Longitudinal::new(start_gev, start_fm));
    let expanding = Traced::new(Medium::new(&settings, field));
    // qhat = c T0^3 tau0/tau, so int tau qhat is c T0^3 tau0 (end - tau0).
    let end_fm = start_fm * (start_gev / end_gev).powi(3);
    let moment = 4.0 * start_gev.powi(3) * start_fm * (end_fm - start_fm) / HBAR_C_GEV_FM;
    let equal = Traced::brick(
        &plain("multiple-soft"),
        end_fm,
        2.0 * moment / (end_fm * end_fm),
    );
    let constant = Traced::brick(&plain("multiple-soft"), end_fm, moment / (end_fm * end_fm));
    for (t, z) in [(2.0, 0.9), (10.0, 0.95), (40.0, 0.7), (3.0, 0.3)] {
        for species in [up(), Species::GLUON] {
            let of = |traced: &Traced| traced.change(species, 80.0, t, z, true);
            let (found, expected) = (of(&expanding), of(&equal));
            assert!(
                (found - expected).abs() < 2e-3 * expected.abs() + 1e-6,
                "{t} {z}: {found} against {expected}"
            );
            assert!((found - of(&constant)).abs() > 0.05 * expected.abs());
        }
    }
}
