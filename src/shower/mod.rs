//! The shower.

/// The shower's choices.
#[derive(Clone, Debug, PartialEq)]
pub struct ShowerSettings {
    /// Smallest virtuality (not squared) of a branching parton in GeV.
    pub virtuality_cutoff_gev: f64,
    /// Where daughters start and what constrains them.
    pub ordering: Ordering,
    /// The allowed momentum fractions.
    pub z_range: ZRange,
    /// How long a virtual parton lives.
    pub lifetime: Lifetime,
    /// Which splittings are on.
    pub kernels: Kernels,
    /// How many flavours g -> q qbar may make: 3, 4 or 5.
    pub flavours: u8,
    /// When heavy flavours open.
    pub flavour_opening: FlavourOpening,
    /// Every envelope is multiplied by this; 1 but in tests of the veto.
    pub envelope_factor: f64,
}

/// Ordering of the shower.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Ordering {
    /// Daughters start at z t and (1-z) t, with the exact joint constraint.
    Virtuality,
    /// Daughters start at t without constraint: leading-log evolution, fractions only.
    Collinear,
}

/// Range of the light-cone fraction.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum ZRange {
    /// z(1-z) t >= cutoff^2/4.
    Kinematic,
    /// epsilon <= z <= 1 - epsilon.
    Constant {
        /// Between 0 and 1/2.
        epsilon: f64,
    },
}

/// Law of lifetimes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Lifetime {
    /// Exponential of mean 2E/t.
    Exponential,
    /// Always the mean.
    Mean,
}

/// Which splittings are on.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Kernels {
    /// q -> q g.
    pub q_qg: bool,
    /// g -> g g.
    pub g_gg: bool,
    /// g -> q qbar.
    pub g_qq: bool,
}

/// When a heavy flavour may be made.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum FlavourOpening {
    /// c and b when t > 4 m^2.
    PairThreshold,
    /// Always.
    Always,
}
