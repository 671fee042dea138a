//! What all legs of a shower share, and what a walk reads but never changes.

use super::ShowerSettings;
use super::proposal::staircase::{Staircase, VacuumRate};
use crate::medium::Medium;
use crate::medium::field::TemperatureField;
use crate::random::Purpose;

/// What all legs of a shower share.
pub struct Evolution {
    /// Coupling, ranges, flavours.
    pub rate: VacuumRate,
    /// Envelopes of a quark and of a gluon.
    pub stairs: [Staircase; 2],
    /// The medium, unless its list of effects is empty.
    pub medium: Option<Medium>,
    /// Whether quarks and gluons emit gluons at all (the splittings that are on); the medium changes these alone.
    pub emits: [bool; 2],
    /// Whether g -> q qbar is on.
    pub makes_pairs: bool,
    /// Streams of the channels of the effects on rates.
    pub effect_purposes: Vec<Purpose>,
    /// Streams of the effects on paths.
    pub path_purposes: Vec<Purpose>,
    /// See [`super::ShowerSettings::envelope_factor`].
    pub envelope_factor: f64,
}

/// What a walk reads but never changes.
#[derive(Clone, Copy)]
pub struct Tools<'a> {
    /// The temperature field of the event, where it is not the medium's own.
    pub field: Option<&'a dyn TemperatureField>,
    /// Rates, envelopes, medium.
    pub evolution: &'a Evolution,
    /// The shower's choices.
    pub settings: &'a ShowerSettings,
}

impl<'a> Tools<'a> {
    /// The temperature field of the event.
    #[inline]
    pub fn field(self, medium: &'a Medium) -> &'a dyn TemperatureField {
        self.field.unwrap_or_else(|| medium.field())
    }
}
