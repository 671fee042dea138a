//! placeholder

/// Settings of the coupling.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct CouplingSettings {
    /// How it runs.
    pub law: CouplingLaw,
    /// At what scale it is taken; without meaning when fixed.
    pub argument: ScaleArgument,
    /// Thresholds in GeV, charm and bottom, ascending.
    pub quark_masses_gev: [f64; 2],
}

/// Fixed or running.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum CouplingLaw {
    /// The same value everywhere.
    Fixed {
        /// In (0, 1).
        alpha_s: f64,
    },
    /// Running from the Z mass.
    Running {
        /// One or two loops.
        loops: Loops,
        /// alpha_s(91.1876 GeV), in (0, 1).
        alpha_s_mz: f64,
        /// Scale in GeV below which it stays constant.
        freeze_gev: f64,
    },
}

/// Order of the running.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Loops {
    /// One loop.
    One,
    /// Two loops.
    Two,
}

/// Argument of the coupling.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ScaleArgument {
    /// kappa^2 = z(1-z) t.
    TransverseMomentum,
    /// t.
    Virtuality,
}

/// The coupling.
pub struct Coupling;
