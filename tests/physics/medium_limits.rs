//! Proves: the medium's effect vanishes as it should, and induced branchings happen where the path integrand says.
//!
//! - A medium that cannot act is the vacuum to the last bit of every column (deterministic, 5 ways not to act).
//! - With weak strength the change is proportional to it: binomial, exact tails at 10^-6, 7 checks.
//! - Vertices of induced first branchings: Kolmogorov-Smirnov at 10^-6, 3 checks.

use spindrift::event::{EventSummary, Parton};
use spindrift::medium::effects::collinear_expansion::PhaseSettings;
use spindrift::medium::{FieldKind, MediumSettings, TransportKind};
use spindrift::qcd::{HBAR_C_GEV_FM, Species};
use spindrift::shower::FlavourOpening;

use super::support::reference::{self, number};
use super::support::setup::{ALPHA_S, Setup, brick, fixed, up};
use super::support::statistics::{
    LARGEST_DISTANCE, SIGNIFICANCE, binomial_p_value, binomial_pull, distance,
};

const EVENTS: u64 = 400_000;

/// As the strength goes to zero the vacuum comes back in proportion to it: of the primaries that the vacuum leaves
/// unbranched (same streams) the medium leaves exp(-c qhat), c the exponent of one unit of strength, and none that it
/// makes branch comes back. Binomial; at qhat = .01 a bias of c by 7 % would be seen, at 1 by 1 %.
#[test]
fn the_vacuum_comes_back_in_proportion_to_the_strength() {
    // Quark, 10 to 1 GeV, energy 100 GeV, 2 fm, fixed coupling; table of the medium and of the vacuum.
    let table = reference::cases("medium");
    let case = &table[0];
    assert_eq!(case["medium"]["effect"]["phase"], "interference");
    assert_eq!(number(&case["medium"], "gluon_qhat_GeV2_per_fm"), 1.0);
    let vacuum_exponent = number(&reference::cases("no_branching")[0], "exponent");
    let per_strength = number(case, "exponent") - vacuum_exponent;
    let mut setup = reference::setup(case).with_seed(700);
    let medium = setup.medium.take();
    let mut in_vacuum = Vec::new();
    setup.first_branchings(EVENTS, |branching, _| in_vacuum.push(branching));
    let unbranched = in_vacuum
        .iter()
        .filter(|branching| branching.is_none())
        .count() as u64;
    for qhat in [1.0, 0.3, 0.1, 0.03, 0.01, 0.003, 0.001] {
        let mut medium = medium.clone().expect("a medium");
        medium.transport.kind = TransportKind::Constant {
            qhat_gev2_per_fm: qhat,
        };
        let (mut left, mut same, mut event) = (0, 0, 0);
        setup
            .clone()
            .with_medium(medium)
            .first_branchings(EVENTS, |branching, _| {
                let vacuum = in_vacuum[event];
                event += 1;
                left += branching.is_none() as u64;
                same += (branching == vacuum) as u64;
                // A branching differs from the vacuum's only by coming from the medium, at a higher t.
                let made = branching.is_some_and(|made| {
                    made.channel == 1 && vacuum.is_none_or(|vacuum| made.t > vacuum.t)
                });
                assert!(made || branching == vacuum);
            });
        let expected = (-per_strength * qhat).exp();
        println!(
            "qhat {qhat}: unbranched {left} of {unbranched}, pull {:.2}; changed {:.5} of all, over qhat {:.4}",
            binomial_pull(left, unbranched, expected),
            1.0 - same as f64 / EVENTS as f64,
            (1.0 - same as f64 / EVENTS as f64) / qhat,
        );
        assert!(binomial_p_value(left, unbranched, expected) > SIGNIFICANCE);
    }
}

/// Every column of every row, bit for bit.
fn bits(event: &EventSummary, rows: &[Parton]) -> Vec<u64> {
    let mut bits = vec![
        event.id as u64,
        event.weight.to_bits(),
        event.partons_count as u64,
    ];
    for row in rows {
        bits.extend(row.momentum_gev.map(f64::to_bits));
        let singles = [
            row.virtuality_squared_gev2,
            row.splitting_fraction,
            row.jet_fraction,
        ];
        bits.extend(
            row.birth_fm
                .iter()
                .chain(&singles)
                .map(|value| u64::from(value.to_bits())),
        );
        let whole = [row.pdg, row.parent, row.colour, row.anticolour];
        bits.extend(whole.map(|value| value as u64));
        bits.extend([row.status as u64, u64::from(row.channel)]);
    }
    bits
}

/// Without effects, without strength, without heat, without length, and below the minimum energy: the vacuum, to the
/// last bit of every column.
#[test]
fn a_medium_that_cannot_act_is_the_vacuum_to_the_last_bit() {
    const EVENTS: i64 = 20_000;
    let all = |setup: &Setup| {
        let mut all = Vec::new();
        setup.events(0..EVENTS, |event, rows| all.push(bits(event, rows)));
        all
    };
    let hot = brick(4.0, 1.0, PhaseSettings::Interference);
    let changed = |change: &dyn Fn(&mut MediumSettings)| {
        let mut medium = hot.clone();
        change(&mut medium);
        medium
    };
    let kind = |temperature_gev, length_fm| FieldKind::Brick {
        temperature_gev,
        length_fm,
    };
    for setup in [
        Setup::single(up(), 100.0, 60.0),
        Setup::pair([Species::GLUON; 2], 120.0, 60.0),
    ] {
        let vacuum = all(&setup);
        let idle = [
            changed(&|medium| medium.effects.clear()),
            changed(&|medium| {
                medium.transport.kind = TransportKind::Constant {
                    qhat_gev2_per_fm: 0.0,
                };
            }),
            changed(&|medium| medium.field.kind = kind(0.149, 4.0)),
            changed(&|medium| medium.field.kind = kind(0.3, 0.0)),
            changed(&|medium| medium.min_energy_gev = 1e9),
        ];
        for medium in idle {
            assert!(
                all(&setup.clone().with_medium(medium.clone())) == vacuum,
                "{medium:?}"
            );
        }
        assert!(all(&setup.clone().with_medium(hot.clone())) != vacuum);
    }
}

/// K(phi), written here apart from the engine; 0 where the induced channel has nothing.
fn positive_phase_factor(phase: PhaseSettings, phi: f64) -> f64 {
    let plain = 2.0 - 2.0 * phi.cos();
    let value = match phase {
        PhaseSettings::Interference => plain,
        PhaseSettings::SoftGradient => plain - 2.0 * phi * phi.sin(),
        PhaseSettings::Rescattering { window } if phi > window => 0.0,
        PhaseSettings::Rescattering { .. } => {
            plain - 2.0 * phi * phi.sin() + 2.0 * phi * phi * phi.cos()
        }
    };
    value.max(0.0)
}

/// Induced first branchings happen at l with the density max(K(l t/(2 E hbar c)), 0) on the brick: with the t of each,
/// the cumulative function at its l is uniform. Kolmogorov-Smirnov, 1 check a phase.
#[test]
fn induced_branchings_happen_where_the_integrand_says() {
    const LENGTH_FM: f64 = 3.0;
    const ENERGY_GEV: f64 = 80.0;
    const STEPS: usize = 400;
    let phases = [
        PhaseSettings::Interference,
        PhaseSettings::Rescattering { window: 1.0 },
        PhaseSettings::SoftGradient,
    ];
    for phase in phases {
        let mut setup = Setup::single(up(), ENERGY_GEV, 15.0)
            .with_coupling(fixed(ALPHA_S))
            .with_medium(brick(LENGTH_FM, 1.0, phase));
        setup.shower.flavour_opening = FlavourOpening::Always;
        let mut uniform = Vec::new();
        setup.events(0..60_000, |_, rows| {
            // Rows: hard parton, primary, its daughters.
            let Some(daughter) = rows[2..]
                .iter()
                .find(|row| row.parent == 1 && row.channel == 2)
            else {
                return;
            };
            let l = f64::from(daughter.birth_fm[0]);
            assert!(l > 0.0 && l <= LENGTH_FM + 1e-6);
            let k = f64::from(rows[1].virtuality_squared_gev2) / (2.0 * ENERGY_GEV * HBAR_C_GEV_FM);
            // Midpoint rule; the kernel is smooth but for the ends of its positive parts.
            let integral = |end: f64| -> f64 {
                let step = end / STEPS as f64;
                let at = |place: usize| (place as f64 + 0.5) * step;
                (0..STEPS)
                    .map(|place| positive_phase_factor(phase, k * at(place)) * step)
                    .sum()
            };
            uniform.push(integral(l) / integral(LENGTH_FM));
        });
        let found = distance(&mut uniform, |u| u.clamp(0.0, 1.0));
        println!("{phase:?}: {} induced, distance {found:.2}", uniform.len());
        assert!(uniform.len() > 2000);
        assert!(found < LARGEST_DISTANCE);
        // Uniform places along the brick must fail.
        let mut wrong: Vec<f64> = uniform.iter().map(|u| u.sqrt()).collect();
        assert!(distance(&mut wrong, |u| u.clamp(0.0, 1.0)) > LARGEST_DISTANCE);
    }
}
