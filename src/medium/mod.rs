//! The hot medium: a temperature field, a transport model, path integrals, and effects on branching rates.

pub mod effects;
pub mod field;
pub mod origin;
pub mod path;
pub mod trace;
pub mod transport;

use effects::RateEffect;
use effects::collinear_expansion::CollinearExpansion;
use field::TemperatureField;
pub use origin::{Nucleus, OriginSettings};
use transport::{Transport, TransportTable};

/// Everything a medium is made of.
#[derive(Clone, Debug, PartialEq)]
pub struct MediumSettings {
    /// The temperature field.
    pub field: FieldSettings,
    /// Where jets are born.
    pub origin: OriginSettings,
    /// The transport coefficient.
    pub transport: TransportSettings,
    /// The effects, in config order; empty is vacuum to the last bit.
    pub effects: Vec<EffectSettings>,
    /// Induced emissions obey z(1-z) t <= min(z, 1-z)^2 E^2.
    pub limit_to_small_angles: bool,
    /// A parton below this lab energy in GeV sees no medium.
    pub min_energy_gev: f64,
}

/// The temperature field with what all kinds share.
#[derive(Clone, Debug, PartialEq)]
pub struct FieldSettings {
    /// Which field.
    pub kind: FieldKind,
    /// Temperature in GeV below which the medium has no effect.
    pub end_temperature_gev: f64,
}

/// Which temperature field.
#[derive(Clone, Debug, PartialEq)]
pub enum FieldKind {
    /// Uniform everywhere for lab time 0 to `length_fm`.
    Brick {
        /// Temperature in GeV.
        temperature_gev: f64,
        /// Duration in fm/c, the path length of a parton born at lab time 0.
        length_fm: f64,
    },
    /// Boost-invariant longitudinal expansion.
    Longitudinal {
        /// Temperature in GeV at the start.
        temperature_gev: f64,
        /// Proper time of the start in fm/c.
        start_fm: f64,
    },
    /// A field file.
    Grid {
        /// The file, its path already resolved against the config's folder.
        file: std::path::PathBuf,
    },
}

/// The transport coefficient qhat.
#[derive(Clone, Debug, PartialEq)]
pub struct TransportSettings {
    /// The model and its number.
    pub kind: TransportKind,
    /// Whose qhat the number is; `Thermal` computes both.
    pub stated_for: ColourCharge,
    /// Multiply by p.u/E where the field has flow.
    pub flow: bool,
}

/// Models of qhat.
#[derive(Clone, Debug, PartialEq)]
pub enum TransportKind {
    /// qhat = coefficient * T^3 in natural units.
    Cubic {
        /// Without dimension.
        coefficient: f64,
    },
    /// The same qhat wherever there is a medium.
    Constant {
        /// GeV^2 per fm.
        qhat_gev2_per_fm: f64,
    },
    /// Perturbative hot plasma.
    Thermal {
        /// The coupling, in (0, 1); it does not run.
        alpha_s: f64,
        /// Number of massless flavours in the plasma.
        flavours: u8,
    },
    /// Numbers over temperature and energy.
    Table(TransportTable),
}

/// A quark or a gluon, as bearer of colour charge.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ColourCharge {
    /// C_F.
    Quark,
    /// C_A.
    Gluon,
}

/// One effect of the medium with its numbers.
#[derive(Clone, Debug, PartialEq)]
pub enum EffectSettings {
    /// Medium-induced rate of the collinear (higher-twist) expansion.
    CollinearExpansion {
        /// The phase factor.
        phase: PhaseSettings,
    },
}

/// Phase factors of the collinear expansion.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum PhaseSettings {
    /// K_a = 2 - 2 cos phi.
    Interference,
    /// K_b = K_a - 2 phi sin phi + 2 phi^2 cos phi, cut at phi = `window`.
    Rescattering {
        /// In units of the formation time, at most 1.2417.
        window: f64,
    },
    /// K_c = K_a - 2 phi sin phi.
    SoftGradient,
}

impl EffectSettings {
    /// The name of the effect's kind in a config.
    pub fn name(&self) -> &'static str {
        match self {
            EffectSettings::CollinearExpansion { .. } => "collinear-expansion",
        }
    }
}

/// A medium ready for use: field, transport and effects put together.
pub struct Medium {
    field: Box<dyn TemperatureField>,
    end_temperature_gev: f64,
    transport: Transport,
    effects: Vec<Box<dyn RateEffect>>,
    limit_to_small_angles: bool,
    min_energy_gev: f64,
}

impl Medium {
    /// Puts a medium together around a field that is already in memory.
    pub fn new(settings: &MediumSettings, field: Box<dyn TemperatureField>) -> Medium {
        Medium {
            field,
            end_temperature_gev: settings.field.end_temperature_gev,
            transport: Transport::new(&settings.transport),
            effects: effect_names(&settings.effects)
                .into_iter()
                .zip(&settings.effects)
                .map(build)
                .collect(),
            limit_to_small_angles: settings.limit_to_small_angles,
            min_energy_gev: settings.min_energy_gev,
        }
    }

    /// The effects in config order.
    pub fn effects(&self) -> &[Box<dyn RateEffect>] {
        &self.effects
    }

    /// A parton below this lab energy in GeV sees no medium.
    pub fn min_energy_gev(&self) -> f64 {
        self.min_energy_gev
    }

    /// Whether induced emissions are limited to small angles.
    pub fn limits_angles(&self) -> bool {
        self.limit_to_small_angles
    }

    /// Whether an induced emission is inside the small-angle limit kappa < omega:
    /// z(1-z) t <= min(z, 1-z)^2 E^2 (always true when the limit is off).
    #[inline]
    pub fn allows_angle(&self, t_gev2: f64, z: f64, energy_gev: f64) -> bool {
        let omega = z.min(1.0 - z) * energy_gev;
        !self.limit_to_small_angles || z * (1.0 - z) * t_gev2 <= omega * omega
    }
}

/// Names of the effects' channels: the kind, with a number from the second of the same kind on.
pub fn effect_names(effects: &[EffectSettings]) -> Vec<String> {
    let name = |place: usize| {
        let kind = effects[place].name();
        let earlier = effects[..place]
            .iter()
            .filter(|other| other.name() == kind)
            .count();
        if earlier == 0 {
            kind.to_string()
        } else {
            format!("{kind}-{}", earlier + 1)
        }
    };
    (0..effects.len()).map(name).collect()
}

/// The registry of effects.
fn build((name, settings): (String, &EffectSettings)) -> Box<dyn RateEffect> {
    match settings {
        EffectSettings::CollinearExpansion { phase } => {
            Box::new(CollinearExpansion::new(name, *phase))
        }
    }
}
