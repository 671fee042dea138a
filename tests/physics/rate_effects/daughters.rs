//! Daughters: what they see of the medium is the rest of the path, with their own energy.
//!
//! Events in which both daughters of a primary stay unbranched, against the product of their probabilities given t, z and the
//! vertex of its branching (see `support::rate`): the rates of `singular-enhancement` along the path and of
//! `collinear-expansion` (interference, with the limit to small angles) integrated here. Four bins of z, quark and gluon,
//! 16 checks at 10^-6, N = 4 x 10^4 events each. The whole brick in place of the rest, the primary's energy in place of the
//! daughter's, and no minimum energy must be seen. Smallest visible bias: 5 to 25 % of a share in a bin.

use spindrift::qcd::{HBAR_C_GEV_FM, Species};

use super::super::support::effects::{enhancement_along_the_path, plain};
use super::super::support::rate::{
    Added, Law, Rate, fraction_of, nothing, pulls_of_unbranched_pairs,
};
use super::super::support::setup::{ALPHA_S, fixed, up};
use super::super::support::statistics::LARGEST_PULL;
use super::super::support::ways::{Way, along_z, massless_energies};

const LENGTH_FM: f64 = 2.0;
const QHAT: f64 = 2.0;
/// Minimum energies, for the enhancement (which does not know energies) and for the interference.
const LEAST_GEV: [f64; 2] = [20.0, 12.0];
const SLOPE_PER_GEV2: f64 = 0.4;
const ENERGY_GEV: f64 = 50.0;

/// A law, right or wrong in one thing.
#[derive(Clone, Copy)]
struct Choices {
    enhancement: bool,
    whole_brick: bool,
    energy_of_primary: bool,
    least_gev: f64,
}

/// The probability that a daughter of a primary does not branch.
fn stays(law: Choices, mother: &Way, daughters: [&Way; 2], which: usize) -> f64 {
    let z = f64::from(daughters[which].parton.splitting_fraction);
    let start_t = z * f64::from(mother.parton.virtuality_squared_gev2);
    if start_t <= 1.0 {
        return 1.0;
    }
    let range = |t: f64| fraction_of(0.25 / t);
    let born_fm = f64::from(daughters[0].parton.birth_fm[0]);
    let rest_fm = if law.whole_brick {
        LENGTH_FM
    } else {
        LENGTH_FM - born_fm
    };
    let own_gev = massless_energies(mother, daughters)[which];
    let energy_gev = if law.energy_of_primary {
        ENERGY_GEV
    } else {
        own_gev
    };
    let enhanced = |t: f64| Added {
        singular: SLOPE_PER_GEV2 * QHAT * rest_fm,
        over_fractions: 0.0,
        smallest: range(t),
    };
    let interfering = |t: f64| {
        let formation_fm = 2.0 * energy_gev / t * HBAR_C_GEV_FM;
        let x = rest_fm / formation_fm;
        Added {
            singular: 0.0,
            over_fractions: QHAT * formation_fm / t * 2.0 * (x - x.sin()),
            smallest: range(t).max(t / (energy_gev * energy_gev + t)),
        }
    };
    let rate = Rate {
        is_gluon: daughters[which].is_gluon(),
        smallest: &range,
        jump_t_gev2: 0.0,
        added: match () {
            () if rest_fm <= 0.0 || own_gev < law.least_gev => &nothing,
            () if law.enhancement => &enhanced,
            () => &interfering,
        },
    };
    (-rate.exponent(1.0, start_t)).exp()
}

#[test]
fn daughters_see_the_rest_of_the_path_with_their_own_energy() {
    for (parton, seed) in [(up(), 81), (Species::GLUON, 82)] {
        for enhancement in [true, false] {
            let least_gev = LEAST_GEV[!enhancement as usize];
            let effect = if enhancement {
                enhancement_along_the_path(SLOPE_PER_GEV2)
            } else {
                plain("collinear-expansion")
            };
            let mut jets = along_z(parton, ENERGY_GEV, 12.0, LENGTH_FM, QHAT, vec![effect])
                .with_coupling(fixed(ALPHA_S))
                .with_seed(seed + 2 * enhancement as u64);
            let medium = jets.medium.as_mut().expect("a medium");
            medium.min_energy_gev = least_gev;
            medium.limit_to_small_angles = !enhancement;
            let right = Choices {
                enhancement,
                whole_brick: false,
                energy_of_primary: false,
                least_gev,
            };
            let mut laws = vec![
                right,
                Choices {
                    whole_brick: true,
                    ..right
                },
                Choices {
                    least_gev: 0.0,
                    ..right
                },
            ];
            laws.extend((!enhancement).then_some(Choices {
                energy_of_primary: true,
                ..right
            }));
            let law = |law: Choices| -> Box<Law> {
                Box::new(move |mother, daughters, which| stays(law, mother, daughters, which))
            };
            let laws: Vec<Box<Law>> = laws.into_iter().map(law).collect();
            let laws: Vec<_> = laws.iter().map(|law| &**law).collect();
            let found = pulls_of_unbranched_pairs(&jets, 40_000, &laws);
            println!(
                "{} {}:",
                parton.name(),
                if enhancement {
                    "enhanced"
                } else {
                    "interfering"
                }
            );
            for pulls in &found {
                println!("  pulls {pulls:.2?}");
            }
            let sees = |pulls: &[f64; 4]| pulls.iter().any(|pull| pull.abs() > LARGEST_PULL);
            assert!(!sees(&found[0]));
            // Gluons seldom stay unbranched: of them only the coarsest mistake is asked.
            let asked = if parton.is_gluon() {
                1
            } else {
                found.len() - 1
            };
            assert!(found[1..].iter().take(asked).all(sees));
        }
    }
}
