//! Always at the same place.

use super::Origin;
use crate::random::Stream;

/// One place of the lab.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Fixed {
    /// x in fm.
    pub x_fm: f64,
    /// y in fm.
    pub y_fm: f64,
}

impl Origin for Fixed {
    fn draw(&self, _stream: &mut Stream) -> [f64; 2] {
        [self.x_fm, self.y_fm]
    }
}
