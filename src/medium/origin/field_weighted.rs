//! Births where the medium starts hot: a density T(x, y)^power where T is above the end temperature, T the field at its
//! first proper time and mid-rapidity, bilinear between the nodes of its slice.
//!
//! A bilinear function is largest at a corner of its cell, so the hottest corner to the power bounds the density in the
//! cell: a piecewise-constant envelope, from which rejection draws exactly, the rim at the end temperature included.

use rand::RngExt;

use super::chooser::Chooser;
use super::{Origin, OriginError, Placement, TemperatureSlice};
use crate::random::Stream;

/// Larger powers are taken for a mistake.
pub const LARGEST_POWER: f64 = 20.0;
/// Lifts the envelope over the rounding of an interpolation.
const ROUNDING: f64 = 1e-12;

/// The first temperature to a power.
#[derive(Clone, Debug)]
pub struct FieldWeighted {
    slice: TemperatureSlice,
    power: f64,
    end_temperature_gev: f64,
    placement: Placement,
    largest_gev: f64,
    envelope: Vec<f64>,
    chooser: Chooser,
}

impl FieldWeighted {
    /// The density of a slice (in the field's own frame) that lies in the lab as `placement` says; `power` above 0, at
    /// most [`LARGEST_POWER`].
    ///
    /// # Errors
    /// [`OriginError::Power`], and [`OriginError::Cold`] where nothing is above the end temperature.
    pub fn new(
        slice: TemperatureSlice,
        power: f64,
        end_temperature_gev: f64,
        placement: Placement,
    ) -> Result<FieldWeighted, OriginError> {
        if !(power > 0.0 && power <= LARGEST_POWER) {
            return Err(OriginError::Power(power));
        }
        let largest_gev = slice.largest_gev();
        if largest_gev <= end_temperature_gev {
            return Err(OriginError::Cold {
                end_temperature_gev,
                largest_gev,
            });
        }
        let cells_y = slice.y_fm.len() - 1;
        let cells = (slice.x_fm.len() - 1) * cells_y;
        let largest_in = |cell: usize| {
            let (x, y) = (cell / cells_y, cell % cells_y);
            let hottest = corners(&slice, x, y).into_iter().fold(0.0, f64::max);
            if hottest < end_temperature_gev {
                0.0
            } else {
                libm::pow(hottest / largest_gev, power) * (1.0 + ROUNDING)
            }
        };
        let envelope: Vec<f64> = (0..cells).map(largest_in).collect();
        let bound = |cell: usize| {
            let (x, y) = (cell / cells_y, cell % cells_y);
            let area = (slice.x_fm[x + 1] - slice.x_fm[x]) * (slice.y_fm[y + 1] - slice.y_fm[y]);
            area * envelope[cell]
        };
        let bounds: Vec<f64> = (0..cells).map(bound).collect();
        let chooser = Chooser::new(&bounds).ok_or(OriginError::Cold {
            end_temperature_gev,
            largest_gev,
        })?;
        Ok(FieldWeighted {
            slice,
            power,
            end_temperature_gev,
            placement,
            largest_gev,
            envelope,
            chooser,
        })
    }
}

/// The temperatures at the corners of a cell: low x low y, low x high y, high x low y, high x high y.
fn corners(slice: &TemperatureSlice, x: usize, y: usize) -> [f64; 4] {
    let (rows, values) = (slice.y_fm.len(), &slice.temperature_gev);
    let corner = x * rows + y;
    [
        values[corner],
        values[corner + 1],
        values[corner + rows],
        values[corner + rows + 1],
    ]
}

impl Origin for FieldWeighted {
    fn draw(&self, stream: &mut Stream) -> [f64; 2] {
        let cells_y = self.slice.y_fm.len() - 1;
        loop {
            let cell = self.chooser.draw(stream);
            let (x, y) = (cell / cells_y, cell % cells_y);
            let [u, v, level]: [f64; 3] = [stream.random(), stream.random(), stream.random()];
            let [low_low, low_high, high_low, high_high] = corners(&self.slice, x, y);
            let temperature_gev = (1.0 - u) * ((1.0 - v) * low_low + v * low_high)
                + u * ((1.0 - v) * high_low + v * high_high);
            let density = libm::pow(temperature_gev / self.largest_gev, self.power);
            if temperature_gev >= self.end_temperature_gev && level * self.envelope[cell] < density
            {
                let between = |axis: &[f64], cell: usize, share: f64| {
                    (1.0 - share) * axis[cell] + share * axis[cell + 1]
                };
                return self.placement.to_lab([
                    between(&self.slice.x_fm, x, u),
                    between(&self.slice.y_fm, y, v),
                ]);
            }
        }
    }
}
