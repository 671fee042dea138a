//! The joint constraint on partons that are made together, and the resume rule.
//!
//! If the pair does not fit, the parton with the larger share t_i/t_i,max of its largest virtuality resumes its
//! evolution below its present t_i, until the pair fits (a family of prescriptions published by Bengtsson & Sjostrand
//! 1987, Nucl. Phys. B 289:810; from memory). Redrawing the pair instead would change the no-branching probability.

use super::evolution::Tools;
use super::kinematics::relative_transverse_gev2;
use super::leg::{Branching, Leg, Tally};

/// What two partons made together must obey.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Constraint {
    /// Nothing.
    None,
    /// Daughters of a branching: k_T^2 >= 0.
    Daughters {
        /// The parent's virtuality squared, GeV^2.
        t: f64,
        /// The first daughter's fraction.
        z: f64,
    },
    /// Two primaries at rest together: M1 + M2 <= sqrt(s).
    TwoBody {
        /// Invariant mass, GeV.
        sqrt_s_gev: f64,
    },
}

impl Constraint {
    #[inline]
    fn fits(&self, virtualities: [f64; 2]) -> bool {
        match *self {
            Constraint::None => true,
            Constraint::Daughters { t, z } => relative_transverse_gev2(t, z, virtualities) >= 0.0,
            Constraint::TwoBody { sqrt_s_gev } => {
                virtualities[0].sqrt() + virtualities[1].sqrt() <= sqrt_s_gev
            }
        }
    }
}

/// Evolves one or two legs until they fit together; a missing second leg counts as final.
#[inline]
pub fn settle(
    tools: Tools,
    legs: &mut [Leg],
    largest_t_gev2: [f64; 2],
    constraint: Constraint,
    tally: &mut Tally,
) -> [Option<Branching>; 2] {
    let mut branchings = [None; 2];
    for (branching, leg) in branchings.iter_mut().zip(legs.iter_mut()) {
        *branching = leg.evolve(tools, tally);
    }
    loop {
        let virtualities =
            branchings.map(|branching| branching.map_or(0.0, |branching| branching.t));
        if constraint.fits(virtualities) {
            return branchings;
        }
        let first_is_larger =
            virtualities[0] * largest_t_gev2[1] > virtualities[1] * largest_t_gev2[0];
        let resumed = if first_is_larger { 0 } else { 1 };
        branchings[resumed] = legs[resumed].evolve(tools, tally);
    }
}
