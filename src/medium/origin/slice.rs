//! The temperature across the beam at a field's first proper time, at mid-rapidity.

use super::{OriginError, Plane};
use crate::medium::field::FieldData;

/// Temperatures on a rectangular grid, bilinear between the nodes.
#[derive(Clone, Debug, PartialEq)]
pub struct TemperatureSlice {
    /// x in fm, strictly increasing, at least two points.
    pub x_fm: Vec<f64>,
    /// y in fm, likewise.
    pub y_fm: Vec<f64>,
    /// GeV, index `[x][y]`, none negative.
    pub temperature_gev: Vec<f64>,
}

impl TemperatureSlice {
    /// The first slice of a gridded field on the grid's own points, interpolated linearly to eta = 0.
    ///
    /// # Errors
    /// [`OriginError::NoMidRapidity`] where the eta axis does not hold 0.
    pub fn of_grid(data: &FieldData) -> Result<TemperatureSlice, OriginError> {
        let [_, columns, rows, _] = data.shape();
        let (eta, share) = mid_rapidity(data.eta.as_deref())?;
        let value = |place: usize| {
            let at = |eta| {
                f64::from(data.temperature_gev[data.index(0, place / rows, place % rows, eta)])
            };
            if share == 0.0 {
                at(eta)
            } else {
                (1.0 - share) * at(eta) + share * at(eta + 1)
            }
        };
        Ok(TemperatureSlice {
            x_fm: data.x_fm.clone(),
            y_fm: data.y_fm.clone(),
            temperature_gev: (0..columns * rows).map(value).collect(),
        })
    }

    /// A function of x, y (fm) in GeV on even points, `points` (at least 2) along each axis from -`half_fm` to `half_fm`.
    pub fn tabulated(
        half_fm: f64,
        points: usize,
        temperature_gev: impl Fn([f64; 2]) -> f64,
    ) -> TemperatureSlice {
        let spacing_fm = 2.0 * half_fm / (points - 1) as f64;
        let at = |place: usize| place as f64 * spacing_fm - half_fm;
        let value = |place: usize| temperature_gev([at(place / points), at(place % points)]);
        TemperatureSlice {
            x_fm: (0..points).map(at).collect(),
            y_fm: (0..points).map(at).collect(),
            temperature_gev: (0..points * points).map(value).collect(),
        }
    }

    /// Largest temperature in GeV.
    pub fn largest_gev(&self) -> f64 {
        self.temperature_gev.iter().copied().fold(0.0, f64::max)
    }

    /// Centre and event plane of the temperature to a power where it is above the end temperature, each node with the
    /// area of its cell; `None` where nothing is above.
    pub fn plane(&self, power: f64, end_temperature_gev: f64) -> Option<Plane> {
        let rows = self.y_fm.len();
        let hot = |(place, value): (usize, &f64)| {
            let (x, y) = (place / rows, place % rows);
            if *value < end_temperature_gev || *value <= 0.0 {
                return None;
            }
            let area = width(&self.x_fm, x) * width(&self.y_fm, y);
            Some((
                [self.x_fm[x], self.y_fm[y]],
                area * libm::pow(*value, power),
            ))
        };
        Plane::of(self.temperature_gev.iter().enumerate().filter_map(hot))
    }
}

/// The length that a node stands for (trapezoidal rule).
fn width(axis: &[f64], node: usize) -> f64 {
    let (before, after) = (node.saturating_sub(1), (node + 1).min(axis.len() - 1));
    0.5 * (axis[after] - axis[before])
}

/// Cell of eta = 0 and place in it; the first one of a field that knows no eta.
fn mid_rapidity(eta: Option<&[f64]>) -> Result<(usize, f64), OriginError> {
    let Some(eta) = eta else {
        return Ok((0, 0.0));
    };
    let (first, last) = (eta[0], eta[eta.len() - 1]);
    if !(first..=last).contains(&0.0) {
        return Err(OriginError::NoMidRapidity { first, last });
    }
    let cell = eta[1..eta.len() - 1].partition_point(|point| *point <= 0.0);
    Ok((cell, -eta[cell] / (eta[cell + 1] - eta[cell])))
}
