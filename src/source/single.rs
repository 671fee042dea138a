//! `single`: one hard parton without a recoiler.

use super::{HardProcess, HardSource, SingleSettings};
use crate::random::Stream;

/// One parton of fixed kind and energy.
#[derive(Clone, Debug)]
pub struct Single {
    settings: SingleSettings,
}

impl Single {
    /// The source of the settings.
    pub fn new(settings: SingleSettings) -> Single {
        Single { settings }
    }
}

impl HardSource for Single {
    fn draw(&self, stream: &mut Stream) -> HardProcess {
        let SingleSettings {
            parton,
            energy_gev,
            start_virtuality_gev,
            direction,
        } = &self.settings;
        HardProcess::single(
            *parton,
            *energy_gev,
            direction.draw(stream),
            *start_virtuality_gev,
        )
    }

    fn largest_virtuality_gev(&self) -> f64 {
        self.settings.start_virtuality_gev
    }

    fn open_colour_lines(&self) -> u32 {
        if self.settings.parton.is_gluon() {
            2
        } else {
            1
        }
    }
}
