//! `pair`: two hard partons back to back in their rest frame, a colour singlet.

use super::{HardProcess, HardSource, PairSettings};
use crate::random::Stream;

/// Two partons of fixed kind and invariant mass.
#[derive(Clone, Debug)]
pub struct Pair {
    settings: PairSettings,
}

impl Pair {
    /// The source of the settings.
    pub fn new(settings: PairSettings) -> Pair {
        Pair { settings }
    }
}

impl HardSource for Pair {
    fn draw(&self, stream: &mut Stream) -> HardProcess {
        let PairSettings {
            partons,
            sqrt_s_gev,
            start_virtuality_gev,
            direction,
        } = &self.settings;
        HardProcess::pair(
            *partons,
            *sqrt_s_gev,
            direction.draw(stream),
            *start_virtuality_gev,
        )
    }

    fn largest_virtuality_gev(&self) -> f64 {
        self.settings.start_virtuality_gev
    }

    fn open_colour_lines(&self) -> u32 {
        0
    }
}
