//! The hot medium: a temperature field, a transport model, path integrals, and effects on branching rates.

pub mod effects;
pub mod exit;
pub mod field;
pub mod origin;
pub mod path;
pub mod trace;
pub mod transport;

use std::sync::Arc;

use effects::{Effect, PathEffect, RateEffect};
pub use effects::{EffectSettings, effect_names};
use field::{Local, Ray, TemperatureField};
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
    /// Before its first proper time the field holds the values that it has then.
    pub hold_before_start: bool,
    /// The field is turned by this angle about the beam, from x to y.
    pub rotation_rad: f64,
    /// The turned field is shifted by this in x and y.
    pub shift_fm: [f64; 2],
}

impl FieldSettings {
    /// A field that begins with its first proper time, neither turned nor shifted.
    pub fn new(kind: FieldKind, end_temperature_gev: f64) -> FieldSettings {
        FieldSettings {
            kind,
            end_temperature_gev,
            hold_before_start: false,
            rotation_rad: 0.0,
            shift_fm: [0.0; 2],
        }
    }
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
    /// Boost-invariant expansion with transverse flow.
    Radial {
        /// Amplitude of the temperature, without dimension.
        amplitude: f64,
        /// Inverse transverse size in 1/fm.
        q_per_fm: f64,
        /// Proper time of the start in fm/c.
        start_fm: f64,
    },
    /// Field files.
    Grid {
        /// The files, their paths already resolved against the config's folder.
        files: Vec<std::path::PathBuf>,
        /// Events in a row that share a field.
        events_per_field: u64,
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

/// A medium ready for use: field, transport and effects put together.
pub struct Medium {
    field: Arc<dyn TemperatureField>,
    end_temperature_gev: f64,
    transport: Transport,
    names: Vec<String>,
    rates: Vec<Placed<dyn RateEffect>>,
    paths: Vec<Placed<dyn PathEffect>>,
    needs_whole_path: bool,
    needs_loss: bool,
    thins_the_vacuum: bool,
    limit_to_small_angles: bool,
    min_energy_gev: f64,
}

/// An effect and its place in the config's list.
pub struct Placed<E: ?Sized> {
    /// From 0.
    pub place: usize,
    /// The effect.
    pub effect: Box<E>,
}

impl Medium {
    /// Puts a medium together around a field that is already in memory.
    pub fn new(settings: &MediumSettings, field: Arc<dyn TemperatureField>) -> Medium {
        let names = effect_names(&settings.effects);
        let (mut rates, mut paths) = (Vec::new(), Vec::new());
        for (place, (name, chosen)) in names.iter().zip(&settings.effects).enumerate() {
            match (chosen.model.build)(name.clone(), &chosen.values) {
                Effect::Rate(effect) => rates.push(Placed { place, effect }),
                Effect::Path(effect) => paths.push(Placed { place, effect }),
            }
        }
        let whole = |rate: &Placed<dyn RateEffect>| rate.effect.needs_whole_path();
        Medium {
            field,
            end_temperature_gev: settings.field.end_temperature_gev,
            transport: Transport::new(&settings.transport),
            needs_whole_path: !paths.is_empty() || rates.is_empty() || rates.iter().any(whole),
            needs_loss: paths.iter().any(|path| path.effect.needs_loss())
                || rates.iter().any(|rate| rate.effect.needs_loss()),
            thins_the_vacuum: rates.iter().any(|rate| rate.effect.thins_the_vacuum()),
            names,
            rates,
            paths,
            limit_to_small_angles: settings.limit_to_small_angles,
            min_energy_gev: settings.min_energy_gev,
        }
    }

    /// The field, where a run has but one.
    pub fn field(&self) -> &dyn TemperatureField {
        &*self.field
    }

    /// Temperature in GeV below which the medium has no effect.
    pub fn end_temperature_gev(&self) -> f64 {
        self.end_temperature_gev
    }

    /// Names of all effects in config order.
    pub fn effect_names(&self) -> &[String] {
        &self.names
    }

    /// The effects on branching rates.
    pub fn rates(&self) -> &[Placed<dyn RateEffect>] {
        &self.rates
    }

    /// The effects on settled partons.
    pub fn paths(&self) -> &[Placed<dyn PathEffect>] {
        &self.paths
    }

    /// A parton below this lab energy in GeV sees no medium.
    pub fn min_energy_gev(&self) -> f64 {
        self.min_energy_gev
    }

    /// Whether an effect thins the vacuum channel.
    pub fn thins_the_vacuum(&self) -> bool {
        self.thins_the_vacuum
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

    /// The gluon's transport coefficient per lab length at a point of a ray, GeV^2/fm; 0 below the end temperature.
    #[inline]
    pub fn gluon_qhat_gev2_per_fm(
        &self,
        field: &dyn TemperatureField,
        ray: &Ray,
        l_fm: f64,
        energy_gev: f64,
    ) -> f64 {
        let local = field.local(ray, l_fm);
        if local.temperature_gev < self.end_temperature_gev {
            return 0.0;
        }
        self.qhat_of(&local, energy_gev)
    }

    /// The same of what is met at a point, whatever its temperature.
    #[inline]
    fn qhat_of(&self, local: &Local, energy_gev: f64) -> f64 {
        let rest_energy_gev = energy_gev * local.flow_factor;
        let at_rest = self
            .transport
            .gluon_qhat_gev2_per_fm(local.temperature_gev, rest_energy_gev);
        if self.transport.flow {
            at_rest * local.flow_factor
        } else {
            at_rest
        }
    }
}
