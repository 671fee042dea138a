//! Limits of the effects whose R is a formula, and symmetry of all.

use std::sync::Arc;

use spindrift::medium::Medium;
use spindrift::medium::effects::collinear_expansion::{
    CollinearExpansion, PhaseSettings, wave_number_per_fm,
};
use spindrift::medium::field::Brick;
use spindrift::qcd::{HBAR_C_GEV_FM, Species};

use super::super::support::effects::{enhancement, enhancement_along_the_path, phase, plain};
use super::super::support::setup::{brick, up};
use super::{TEMPERATURE_GEV, Traced};

/// R z(1-z) t of the collinear expansion in a brick of qhat 1 GeV^2/fm.
fn strength(phase: PhaseSettings, length_fm: f64, t: f64, energy_gev: f64) -> f64 {
    let settings = brick(length_fm, 1.0, phase);
    let medium = Medium::new(&settings, Arc::new(Brick::new(TEMPERATURE_GEV, length_fm)));
    let traced = Traced::new(medium);
    CollinearExpansion::new("tested".into(), phase, false)
        .strength_gev2(&traced.trace.path, wave_number_per_fm(t, energy_gev))
}

#[test]
fn collinear_expansion() {
    let (t, energy) = (10.0, 50.0);
    let formation_fm = 2.0 * energy / t * HBAR_C_GEV_FM;
    for x in [1e-3, 1e-2, 0.05] {
        for (phase, sign) in [
            (PhaseSettings::Interference, 1.0),
            (PhaseSettings::Rescattering { window: 1.0 }, 1.0),
            (PhaseSettings::SoftGradient, -1.0),
        ] {
            let found = strength(phase, x * formation_fm, t, energy);
            let expected = sign * formation_fm * x * x * x / 3.0;
            assert!((found / expected - 1.0).abs() < x * x, "{phase:?}, X = {x}");
        }
    }
    for x in [50.0, 500.0, 5000.0] {
        let length = x * formation_fm;
        let found = strength(PhaseSettings::Interference, length, t, energy);
        assert!((found / (2.0 * length) - 1.0).abs() < 1.01 / x, "X = {x}");
        let window = PhaseSettings::Rescattering { window: 1.2 };
        let (long, short) = (
            strength(window, length, t, energy),
            strength(window, 1.2 * formation_fm, t, energy),
        );
        assert!((long / short - 1.0).abs() < 1e-9);
    }
}

#[test]
fn singular_enhancement() {
    for species in [up(), Species::GLUON] {
        let constant = Traced::brick(&enhancement(0.7), 2.0, 1.0);
        for t in [1.0, 30.0, 2000.0] {
            let soft = constant.change(species, 50.0, t, 1.0 - 1e-7, false);
            assert!((soft / 0.7 - 1.0).abs() < 1e-6);
        }
        let change = |length, qhat| {
            Traced::brick(&enhancement_along_the_path(0.1), length, qhat)
                .change(species, 50.0, 9.0, 0.4, false)
        };
        let one = change(1.0, 1.0);
        for factor in [1e-6, 1e-2, 5.0] {
            assert!((change(factor, 1.0) / one / factor - 1.0).abs() < 1e-12);
            assert!((change(1.0, factor) / one / factor - 1.0).abs() < 1e-12);
        }
    }
}

#[test]
fn resolved_only() {
    let energy = 50.0;
    let grid = || {
        (0..60).flat_map(|i| {
            let t = 1.0 * 1.15_f64.powi(i);
            [0.5, 0.3, 0.1, 0.01, 1e-3].map(|fraction| (t, fraction))
        })
    };
    let vetoed = |length, qhat| {
        let traced = Traced::brick(&plain("resolved-only"), length, qhat);
        let mut count = 0;
        for (t, fraction) in grid() {
            let [left, mirrored] =
                [fraction, 1.0 - fraction].map(|z| traced.vacuum_factor(energy, t, z));
            assert_eq!(left, mirrored);
            assert!(left == 0.0 || left == 1.0);
            let formation_fm = 2.0 * energy / t * HBAR_C_GEV_FM;
            let resolving_fm = (2.0 * fraction * energy / qhat * HBAR_C_GEV_FM).sqrt();
            let veto = resolving_fm < formation_fm && formation_fm < length;
            assert_eq!(left == 0.0, veto, "{t} {fraction}");
            count += veto as u32;
        }
        count
    };
    assert_eq!(vetoed(1e-4, 1.0), 0);
    assert_eq!(vetoed(4.0, 1e-9), 0);
    let strengths = [0.01, 0.1, 1.0, 10.0].map(|qhat| vetoed(4.0, qhat));
    let lengths = [0.1, 1.0, 4.0, 100.0].map(|length| vetoed(length, 1.0));
    println!("vetoed {strengths:?}, {lengths:?}");
    assert!(strengths.is_sorted_by(|a, b| a < b) && lengths.is_sorted_by(|a, b| a < b));
}

#[test]
fn gluons_are_symmetric() {
    let effects = [
        enhancement(0.5),
        enhancement_along_the_path(0.1),
        plain("multiple-soft"),
        plain("single-hard"),
        phase("soft-gradient"),
    ];
    for chosen in effects {
        let traced = Traced::brick(&chosen, 3.0, 1.0);
        let images = ["multiple-soft", "single-hard"].contains(&chosen.model.kind);
        for t in [1.5, 10.0, 80.0] {
            for z in [0.02, 0.2, 0.41] {
                let [one, other] =
                    [z, 1.0 - z].map(|z| traced.change(Species::GLUON, 70.0, t, z, images));
                let scale = one.abs() + 1e-9;
                assert!(
                    (one - other).abs() < 1e-7 * scale,
                    "{chosen:?}: {one} {other}"
                );
            }
        }
    }
}
