//! No medium does nothing, and a vanishing one next to nothing.

use spindrift::event::{Parton, Status};
use spindrift::medium::effects::EffectSettings;
use spindrift::qcd::Species;

use super::super::support::effects::{
    centres, enhancement, enhancement_along_the_path, fluctuating_drag, phase, plain,
};
use super::super::support::setup::{Setup, brick_with, up};

/// Every effect, with the strength of its own where that is not qhat.
fn effects(strength: f64) -> Vec<EffectSettings> {
    vec![
        phase("interference"),
        phase("rescattering"),
        phase("soft-gradient"),
        enhancement(strength),
        enhancement_along_the_path(1.0),
        plain("multiple-soft"),
        plain("single-hard"),
        centres(strength, 0.5),
        plain("resolved-only"),
        plain("broadening"),
        plain("drag"),
        fluctuating_drag(),
        plain("virtuality-diffusion"),
    ]
}

fn jets() -> Setup {
    Setup::pair([up(), Species::GLUON], 120.0, 60.0)
}

/// Rows of all events but exchanges.
fn partons(setup: &Setup, events: i64) -> Vec<Vec<Parton>> {
    let mut all = Vec::new();
    setup.events(0..events, |_, rows| {
        let is_parton =
            |row: &&Parton| !matches!(row.status, Status::GivenToMedium | Status::TakenFromMedium);
        all.push(rows.iter().filter(is_parton).copied().collect());
    });
    all
}

#[test]
fn a_medium_without_strength_is_the_vacuum_to_the_last_bit() {
    let mut setup = jets();
    let vacuum = partons(&setup, 1500);
    setup.medium = Some(brick_with(4.0, 1.0, Vec::new()));
    assert!(partons(&setup, 1500) == vacuum);
    let (nothing, hot) = (effects(0.0), effects(1.0));
    for (without, with) in nothing.into_iter().zip(hot) {
        let of = |qhat: f64, effect: &EffectSettings| {
            let medium = brick_with(4.0, qhat, vec![effect.clone()]);
            partons(&jets().with_medium(medium), 1500)
        };
        // Strength of the transport, then of the effect.
        assert!(of(0.0, &with) == vacuum, "{with:?}");
        if without != with {
            assert!(of(1.0, &without) == vacuum, "{without:?}");
        }
        assert!(of(1.0, &with) != vacuum, "{with:?}");
    }
    // All of them at once.
    let all = brick_with(4.0, 0.0, effects(0.0));
    assert!(partons(&jets().with_medium(all), 1500) == vacuum);
}

/// As the strength goes to nothing the vacuum's branchings come back, and its momenta as the square root of the strength
/// (broadening and fluctuating drag) or faster.
#[test]
fn a_vanishing_medium_is_the_vacuum() {
    const STRENGTH: f64 = 1e-12;
    let vacuum = partons(&jets(), 1500);
    for chosen in effects(STRENGTH) {
        let medium = brick_with(4.0, STRENGTH, vec![chosen.clone()]);
        let mut largest = 0.0_f64;
        for (rows, twins) in partons(&jets().with_medium(medium), 1500)
            .iter()
            .zip(&vacuum)
        {
            assert_eq!(rows.len(), twins.len(), "{chosen:?}");
            for (row, twin) in rows.iter().zip(twins) {
                let kept =
                    |row: &Parton| (row.pdg, row.status, row.channel, row.splitting_fraction);
                assert_eq!(kept(row), kept(twin), "{chosen:?}");
                let t = row.virtuality_squared_gev2 - twin.virtuality_squared_gev2;
                assert!(t.abs() <= 1e-6 * twin.virtuality_squared_gev2, "{chosen:?}");
                for (one, other) in row.momentum_gev.iter().zip(twin.momentum_gev) {
                    largest = largest.max((one - other).abs());
                }
            }
        }
        println!("{chosen:?}: momenta off by {largest:.1e} GeV");
        // Some ten sigma of sqrt(qhat L), many times over along a jet.
        assert!(largest < 1e3 * (4.0 * STRENGTH).sqrt());
        let is_path = ["broadening", "drag", "virtuality-diffusion"].contains(&chosen.model.kind);
        assert_eq!(largest > 0.0, is_path, "{chosen:?}");
    }
}

/// Broadening and drag leave every branching of the vacuum twin as it is, and move its momenta.
#[test]
fn kicks_and_drag_change_no_branching() {
    let vacuum = partons(&jets(), 1500);
    for chosen in [plain("broadening"), plain("drag"), fluctuating_drag()] {
        let medium = brick_with(4.0, 1.0, vec![chosen.clone()]);
        let mut moved = 0;
        for (rows, twins) in partons(&jets().with_medium(medium), 1500)
            .iter()
            .zip(&vacuum)
        {
            assert_eq!(rows.len(), twins.len());
            for (row, twin) in rows.iter().zip(twins) {
                let kept = |row: &Parton| {
                    let fractions = [row.splitting_fraction, row.jet_fraction];
                    let t = row.virtuality_squared_gev2;
                    let lines = [row.colour, row.anticolour, row.pdg, row.parent];
                    (fractions, t, lines, row.status, row.channel)
                };
                // Parents are numbered with the exchange rows between.
                let without_parent = |row: &Parton| kept(&Parton { parent: 0, ..*row });
                assert_eq!(without_parent(row), without_parent(twin), "{chosen:?}");
                moved += (row.momentum_gev != twin.momentum_gev) as u32;
            }
        }
        println!("{chosen:?}: {moved} partons moved");
        assert!(moved > 5000);
    }
}
