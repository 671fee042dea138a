//! Births where the medium starts hot: a density T(x, y)^power where T is above the end temperature, T the field at its
//! first proper time and mid-rapidity, bilinear between the nodes of its slice.
//!
//! A bilinear function is largest at a corner of a rectangle, so the hottest corner to the power bounds the density in
//! it: a piecewise-constant envelope, from which rejection draws exactly, the rim at the end temperature included. The
//! cells of the slice are quartered where the density varies much in them or the rim passes through, so that few draws
//! are rejected.

use rand::RngExt;

use super::chooser::Chooser;
use super::{Origin, OriginError, Placement, TemperatureSlice};
use crate::random::Stream;

/// Larger powers are taken for a mistake.
pub const LARGEST_POWER: f64 = 20.0;
/// Fields that are nowhere above the end temperature by this share are called cold: next to nothing is left of them.
pub const LEAST_EXCESS: f64 = 1e-3;
/// Lifts the envelope over the rounding of an interpolation.
const ROUNDING: f64 = 1e-12;
/// A rectangle is quartered where the density varies by more than this factor.
const LARGEST_VARIATION: f64 = 2.0;
/// A cell is quartered this often at most.
const MOST_QUARTERINGS: u32 = 6;

/// The first temperature to a power.
#[derive(Clone, Debug)]
pub struct FieldWeighted {
    slice: TemperatureSlice,
    power: f64,
    end_temperature_gev: f64,
    placement: Placement,
    largest_gev: f64,
    leaves: Vec<Leaf>,
    chooser: Chooser,
}

/// A square part of a cell, in the cell's own coordinates 0 to 1, and the largest density in it.
#[derive(Clone, Copy, Debug)]
struct Leaf {
    x: u32,
    y: u32,
    first: [f64; 2],
    side: f64,
    envelope: f64,
}

impl FieldWeighted {
    /// The density of a slice (in the field's own frame) that lies in the lab as `placement` says; `power` above 0, at
    /// most [`LARGEST_POWER`].
    ///
    /// # Errors
    /// [`OriginError::Power`], and [`OriginError::Cold`] where nothing is above the end temperature by
    /// [`LEAST_EXCESS`].
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
        let cold = OriginError::Cold {
            end_temperature_gev,
            largest_gev,
        };
        if largest_gev <= end_temperature_gev * (1.0 + LEAST_EXCESS) {
            return Err(cold);
        }
        let mut divider = Divider {
            slice: &slice,
            power,
            end_temperature_gev,
            largest_gev,
            leaves: Vec::new(),
        };
        for x in 0..slice.x_fm.len() - 1 {
            for y in 0..slice.y_fm.len() - 1 {
                divider.divide([x as u32, y as u32], [0.0; 2], 1.0, 0);
            }
        }
        let leaves = divider.leaves;
        let bound = |leaf: &Leaf| {
            let (x, y) = (leaf.x as usize, leaf.y as usize);
            let area = (slice.x_fm[x + 1] - slice.x_fm[x]) * (slice.y_fm[y + 1] - slice.y_fm[y]);
            area * leaf.side * leaf.side * leaf.envelope
        };
        let bounds: Vec<f64> = leaves.iter().map(bound).collect();
        let chooser = Chooser::new(&bounds).ok_or(cold)?;
        Ok(FieldWeighted {
            slice,
            power,
            end_temperature_gev,
            placement,
            largest_gev,
            leaves,
            chooser,
        })
    }
}

/// Quarters cells into leaves.
struct Divider<'a> {
    slice: &'a TemperatureSlice,
    power: f64,
    end_temperature_gev: f64,
    largest_gev: f64,
    leaves: Vec<Leaf>,
}

impl Divider<'_> {
    fn divide(&mut self, [x, y]: [u32; 2], [u, v]: [f64; 2], side: f64, quarterings: u32) {
        let corners = [[u, v], [u + side, v], [u, v + side], [u + side, v + side]]
            .map(|[u, v]| temperature(self.slice, [x as usize, y as usize], [u, v]));
        let hottest = corners.into_iter().fold(0.0, f64::max);
        let coldest = corners.into_iter().fold(f64::INFINITY, f64::min);
        if hottest < self.end_temperature_gev {
            return;
        }
        let density = |temperature: f64| libm::pow(temperature / self.largest_gev, self.power);
        let smooth = coldest >= self.end_temperature_gev
            && density(hottest) <= LARGEST_VARIATION * density(coldest);
        if smooth || quarterings == MOST_QUARTERINGS {
            self.leaves.push(Leaf {
                x,
                y,
                first: [u, v],
                side,
                envelope: density(hottest) * (1.0 + ROUNDING),
            });
            return;
        }
        let half = 0.5 * side;
        for [right, up] in [[0.0, 0.0], [half, 0.0], [0.0, half], [half, half]] {
            self.divide([x, y], [u + right, v + up], half, quarterings + 1);
        }
    }
}

/// The temperature at a place in a cell, GeV.
#[inline]
fn temperature(slice: &TemperatureSlice, [x, y]: [usize; 2], [u, v]: [f64; 2]) -> f64 {
    let (rows, values) = (slice.y_fm.len(), &slice.temperature_gev);
    let corner = x * rows + y;
    let low = (1.0 - v) * values[corner] + v * values[corner + 1];
    let high = (1.0 - v) * values[corner + rows] + v * values[corner + rows + 1];
    (1.0 - u) * low + u * high
}

impl Origin for FieldWeighted {
    fn draw(&self, stream: &mut Stream) -> [f64; 2] {
        loop {
            let leaf = &self.leaves[self.chooser.draw(stream)];
            let (x, y) = (leaf.x as usize, leaf.y as usize);
            let u = leaf.first[0] + leaf.side * stream.random::<f64>();
            let v = leaf.first[1] + leaf.side * stream.random::<f64>();
            let level = leaf.envelope * stream.random::<f64>();
            let temperature_gev = temperature(&self.slice, [x, y], [u, v]);
            let density = libm::pow(temperature_gev / self.largest_gev, self.power);
            if temperature_gev >= self.end_temperature_gev && level < density {
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
