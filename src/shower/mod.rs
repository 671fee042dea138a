//! The parton shower: a Sudakov-veto engine ordered in virtuality.
//!
//! A parton evolves down from its largest virtuality with the no-branching probability
//!
//! Delta(t_max, t) = exp( - int_t^{t_max} dt'/t' int_{z-}^{z+} dz alpha_s/(2 pi) sum P ),
//!
//! drawn by the veto algorithm (leading logarithm; Ellis, Stirling & Webber, "QCD and Collider Physics", chapter 5).
//! Read in this order: `leg` (one parton), `ordering` (a pair), `tree` (a jet); `proposal` makes trials, `accept`
//! judges them, `kinematics` turns fractions into momenta.

pub mod accept;
pub mod counters;
pub mod evolution;
pub mod kinematics;
pub mod leg;
pub mod ordering;
pub mod proposal;
pub mod tree;

use crate::medium::effects::{PathEffect, RateEffect};
use crate::medium::field::TemperatureField;
use crate::medium::{Medium, Placed};
use crate::qcd::{Coupling, CouplingError, CouplingSettings};
use crate::random::{Key, Purpose};
use crate::source::HardProcess;
use evolution::{Evolution, Tools};
use leg::Branching;
use proposal::FractionRange;
use proposal::staircase::{FlavourRule, Staircase, VacuumRate};
use tree::{Record, TooManyBranchings, Walker};

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
    /// As `Virtuality`, and a vacuum emission's angle lies below that of the branching its parton was born in.
    Angular,
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

/// A shower ready to run: immutable, shared by all workers.
pub struct Shower {
    evolution: Evolution,
    settings: ShowerSettings,
}

impl Shower {
    /// Prepares envelopes for start virtualities (not squared) up to `largest_virtuality_gev`.
    ///
    /// # Errors
    /// [`CouplingError`] where the coupling cannot be had down to its freezing scale.
    pub fn new(
        settings: &ShowerSettings,
        coupling: &CouplingSettings,
        medium: Option<Medium>,
        largest_virtuality_gev: f64,
    ) -> Result<Shower, CouplingError> {
        let end_t_gev2 = settings.virtuality_cutoff_gev * settings.virtuality_cutoff_gev;
        let range = FractionRange {
            end_t_gev2,
            kind: settings.z_range,
        };
        let flavours = FlavourRule::new(settings, coupling.quark_masses_gev);
        let rate = VacuumRate::new(Coupling::new(coupling)?, range, flavours);
        let largest_t = largest_virtuality_gev * largest_virtuality_gev;
        let stairs =
            [false, true].map(|is_gluon| Staircase::new(&rate, settings, is_gluon, largest_t));
        // Without effects nothing of the medium can act: the vacuum to the last bit.
        let medium = medium.filter(|medium| !medium.effect_names().is_empty());
        let (mut effect_purposes, mut path_purposes) = (Vec::new(), Vec::new());
        if let Some(medium) = &medium {
            let named = |rate: &Placed<dyn RateEffect>| Purpose::named(rate.effect.name());
            effect_purposes.extend(medium.rates().iter().map(named));
            let named = |path: &Placed<dyn PathEffect>| Purpose::named(path.effect.name());
            path_purposes.extend(medium.paths().iter().map(named));
        }
        let evolution = Evolution {
            rate,
            stairs,
            medium,
            emits: [settings.kernels.q_qg, settings.kernels.g_gg],
            makes_pairs: settings.kernels.g_qq,
            effect_purposes,
            path_purposes,
            envelope_factor: settings.envelope_factor,
        };
        Ok(Shower {
            evolution,
            settings: settings.clone(),
        })
    }

    /// Working memory for one worker.
    pub fn walker(&self) -> Walker {
        Walker::new(
            self.evolution
                .medium
                .as_ref()
                .map_or(0, |medium| medium.effect_names().len()),
        )
    }

    /// Showers a hard process born at `origin_fm` (`[t, x, y, z]`); returns the shower's weight.
    ///
    /// # Errors
    /// [`TooManyBranchings`] where the event would not end.
    pub fn shower(
        &self,
        walker: &mut Walker,
        hard: &HardProcess,
        key: Key,
        origin_fm: [f64; 4],
        record: &mut Record,
    ) -> Result<f64, TooManyBranchings> {
        let field = walker.field.clone();
        walker.walk(self.tools(field.as_deref()), hard, key, origin_fm, record)
    }

    /// The first branchings alone of what [`Shower::shower`] makes of the same arguments, `None` for a hard parton that
    /// never branches (and for a missing second one), and the shower's weight up to there. What follows in the whole
    /// event has the mean weight 1, so distributions of first branchings may be taken with this one.
    pub fn first_branchings(
        &self,
        walker: &mut Walker,
        hard: &HardProcess,
        key: Key,
        origin_fm: [f64; 4],
    ) -> ([Option<Branching>; 2], f64) {
        let field = walker.field.clone();
        walker.first_branchings(self.tools(field.as_deref()), hard, key, origin_fm)
    }

    fn tools<'a>(&'a self, field: Option<&'a dyn TemperatureField>) -> Tools<'a> {
        Tools {
            field,
            evolution: &self.evolution,
            settings: &self.settings,
        }
    }
}
