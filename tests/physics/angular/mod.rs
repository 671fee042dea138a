//! Proves: ordering `angular` keeps each vacuum emission's angle below that of the branching its parton was born in.
//!
//! Angles squared are t/(z(1-z) x^2), x the parton's fraction: with a = t/(z(1-z)) an emission of a daughter of fraction z
//! must have a' < a z^2.
//!
//! Deterministic, on every row of 9 samples (1500 events each; single and pair, vacuum, an emitting medium, path effects):
//! every vacuum emission is ordered, also below an induced branching; first branchings are those of `virtuality` to the
//! last bit. `virtuality` breaks the order often. With `resolved-only` an emission breaks it only if tau_f > L and its
//! parton was born inside with an angle above theta_c = 2/sqrt(qhat L^3), and some do; without that effect none does.
//!
//! Statistical:
//! - legs started by hand below an angle: number of unbranched ones (binomial), t given a branching, z given t
//!   (Kolmogorov-Smirnov) against the rate integrated here (Gauss over ln t, closed forms in z). 2 x 3 x 10^5 legs, 6
//!   checks;
//! - in whole events both daughters of a primary stay unbranched with the product of their own probabilities, given t and
//!   z of their branching: under the joint constraint a branching is only discarded in favour of another that stays, so
//!   neither branches exactly if neither had any candidate. The number of such events against the sum of the
//!   probabilities, in four bins of z; quark and gluon, with and without `resolved-only` (its vetoes included), both
//!   orderings: 36 checks. N = 4 x 10^4 events and more each;
//! - mean numbers of final partons: `angular` below `virtuality`, 4 set-ups at 4.9 sigma.
//!
//! 10^-6 each. Smallest visible bias: .5 % of a cumulative distribution, 5 to 25 % of a share in a bin.
//!
//! See `order` for the rows, `rate` for legs, `shares` for daughters.

mod order;
mod rate;
mod shares;

use spindrift::medium::effects::EffectSettings;
use spindrift::numerics::vectors::invariant_square;
use spindrift::qcd::{HBAR_C_GEV_FM, Species};
use spindrift::shower::Ordering;

use super::support::effects::effect;
use super::support::setup::{ALPHA_S, Setup, fixed};
use super::support::ways::{Way, along_z, massless_energies, ways};

/// Channel number of vacuum branchings.
const VACUUM: u8 = 1;
/// t and z are kept in f32: angles are known to a few of its roundings.
const LOOSE: f64 = 1e-6;
const LENGTH_FM: f64 = 3.0;
const QHAT: f64 = 2.0;
const LEAST_GEV: f64 = 2.0;
const CUTOFF_T_GEV2: f64 = 1.0;

fn plain(kinds: &[&str]) -> Vec<EffectSettings> {
    kinds.iter().map(|kind| effect(kind, &[])).collect()
}

fn angular(mut setup: Setup) -> Setup {
    setup.shower.ordering = Ordering::Angular;
    setup
}

/// A daughter that branched in turn, with its mother.
struct Step<'a> {
    mother: &'a Way,
    daughter: &'a Way,
    /// 0 or 1: which daughter it is.
    which: usize,
    pair: [&'a Way; 2],
    /// What made its own branching.
    channel: u8,
    /// a' over a z^2.
    angle2_over_most: f64,
}

/// t/(z(1-z)) of a branched parton at its vertex.
fn spread(way: &Way, pair: [&Way; 2]) -> f64 {
    let [z, rest] = pair.map(|daughter| f64::from(daughter.parton.splitting_fraction));
    f64::from(way.parton.virtuality_squared_gev2) / (z * rest)
}

/// The same as its evolution found it, before the medium gave it virtuality.
fn own_spread(way: &Way, pair: [&Way; 2]) -> f64 {
    let grown = f64::from(way.parton.virtuality_squared_gev2);
    spread(way, pair) * (invariant_square(way.at_birth()) / grown)
}

fn pair<'a>(all: &'a [Way], way: &Way) -> Option<[&'a Way; 2]> {
    let rows = way.daughters?;
    Some(rows.map(|row| all.iter().find(|other| other.row == row).expect("a row")))
}

fn steps(all: &[Way], mut visit: impl FnMut(&Step)) {
    for mother in all {
        let Some(daughters) = pair(all, mother) else {
            continue;
        };
        for (which, daughter) in daughters.into_iter().enumerate() {
            let Some(below) = pair(all, daughter) else {
                continue;
            };
            let z = f64::from(daughter.parton.splitting_fraction);
            let most = spread(mother, daughters) * z * z;
            visit(&Step {
                mother,
                daughter,
                which,
                pair: daughters,
                channel: below[0].parton.channel,
                angle2_over_most: own_spread(daughter, below) / most,
            });
        }
    }
}

/// Vacuum emissions of daughters: inside the order and outside.
fn count_order(setup: &Setup, events: i64) -> [u32; 2] {
    let mut counts = [0; 2];
    setup.events(0..events, |_, rows| {
        steps(&ways(rows), |step| {
            if step.channel == VACUUM {
                counts[(step.angle2_over_most > 1.0 + LOOSE) as usize] += 1;
            }
        });
    });
    counts
}

/// A parton born in the brick, as `resolved-only` sees it.
struct Inside {
    /// 2 E/L hbar c: emissions below this t form outside.
    first_t_gev2: f64,
    /// sqrt(2 omega/qhat) < tau_f is min(z, 1-z) t^2 below this, GeV^4.
    softness_gev4: f64,
    wide: bool,
}

fn inside(mother: &Way, daughters: [&Way; 2], which: usize) -> Option<Inside> {
    let rest_fm = LENGTH_FM - f64::from(daughters[0].parton.birth_fm[0]);
    let energy_gev = massless_energies(mother, daughters)[which];
    if rest_fm <= 0.0 || energy_gev < LEAST_GEV {
        return None;
    }
    let birth_angle2 = spread(mother, daughters) / mother.parton.momentum_gev[3].powi(2);
    let critical = 2.0 * HBAR_C_GEV_FM / (QHAT * rest_fm.powi(3)).sqrt();
    Some(Inside {
        first_t_gev2: 2.0 * energy_gev * HBAR_C_GEV_FM / rest_fm,
        softness_gev4: 2.0 * QHAT * energy_gev * HBAR_C_GEV_FM,
        wide: birth_angle2 > critical * critical,
    })
}

fn primaries(parton: Species, scales_gev: [f64; 2], ordered: bool, resolved_only: bool) -> Setup {
    let [energy_gev, start_gev] = scales_gev;
    let effects = if resolved_only {
        plain(&["resolved-only"])
    } else {
        Vec::new()
    };
    let jet = along_z(parton, energy_gev, start_gev, LENGTH_FM, QHAT, effects)
        .with_coupling(fixed(ALPHA_S));
    if ordered { angular(jet) } else { jet }
}
