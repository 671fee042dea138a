//! Envelopes of the emission channels and their inverses: where trial splittings come from.
//!
//! Every density here is per unit of ln t and of z, times alpha_s/(2 pi). A channel proposes trials in falling t, each
//! inside the exact z range at its own t; the accept rule turns them into branchings.

pub mod induced;
pub mod staircase;

use crate::qcd::kernels::Splitting;
use crate::shower::ZRange;

/// A proposed splitting.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Trial {
    /// Virtuality squared, GeV^2.
    pub t: f64,
    /// Light-cone fraction of the first daughter.
    pub z: f64,
    /// Into what.
    pub splitting: Splitting,
    /// The uniform number in [0, 1) that the accept rule compares.
    pub uniform: f64,
    /// One over the envelope's density at (t, z).
    pub inverse_envelope: f64,
}

impl Trial {
    /// kappa^2 = z(1-z) t, the transverse momentum squared of massless daughters, GeV^2.
    #[inline]
    pub fn kappa2_gev2(&self) -> f64 {
        self.z * (1.0 - self.z) * self.t
    }
}

/// The exact range of the light-cone fraction, and where branching ends.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct FractionRange {
    /// t0 = cutoff^2 in GeV^2: no branching below.
    pub end_t_gev2: f64,
    /// Which range.
    pub kind: ZRange,
}

impl FractionRange {
    /// The smallest fraction at `t` (the largest is its mirror), 1/2 where the range is empty.
    #[inline]
    pub fn smallest(&self, t_gev2: f64) -> f64 {
        match self.kind {
            ZRange::Constant { epsilon } => epsilon,
            ZRange::Kinematic => {
                let root = (1.0 - self.end_t_gev2 / t_gev2).max(0.0).sqrt();
                // The product of both ends is t0/(4t): dividing avoids the cancellation in 1 - root.
                self.end_t_gev2 / (2.0 * t_gev2 * (1.0 + root))
            }
        }
    }

    /// Whether a fraction is allowed at `t`, given z(1-z) t.
    #[inline]
    pub fn allows(&self, z: f64, kappa2_gev2: f64) -> bool {
        match self.kind {
            ZRange::Kinematic => kappa2_gev2 >= self.smallest_kappa2_gev2(),
            ZRange::Constant { epsilon } => z >= epsilon && 1.0 - z >= epsilon,
        }
    }

    /// The smallest kappa^2 that any branching can have, GeV^2: t0/4 (kinematic) or epsilon (1-epsilon) t0 (constant).
    pub fn smallest_kappa2_gev2(&self) -> f64 {
        match self.kind {
            // The least value of z(1-z) t is a quarter of t0 by the definition of the range.
            ZRange::Kinematic => 0.25 * self.end_t_gev2,
            ZRange::Constant { epsilon } => epsilon * (1.0 - epsilon) * self.end_t_gev2,
        }
    }
}
