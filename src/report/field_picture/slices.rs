//! A field at any place of a time slice at mid-rapidity, for drawing.

use crate::medium::field::FieldData;

/// Temperature in GeV and u^x, u^y at a place.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Point {
    pub(super) temperature_gev: f64,
    pub(super) flow: [f64; 2],
}

impl Point {
    /// Transverse velocity in the frame that moves along the beam.
    pub(super) fn velocity(&self) -> [f64; 2] {
        let [ux, uy] = self.flow;
        let gamma = (1.0 + ux * ux + uy * uy).sqrt();
        [ux / gamma, uy / gamma]
    }
}

/// A field with the weights of eta = 0.
pub(super) struct Slices<'a> {
    pub(super) data: &'a FieldData,
    eta: [(usize, f64); 2],
}

impl<'a> Slices<'a> {
    /// Mid-rapidity of a field, or what is nearest to it.
    pub(super) fn new(data: &'a FieldData) -> Slices<'a> {
        let eta = data
            .eta
            .as_deref()
            .map_or([(0, 1.0), (0, 0.0)], |eta| around(eta, 0.0));
        Slices { data, eta }
    }

    /// The field at a place of the grid, linear between points; nothing outside.
    pub(super) fn at(&self, tau_fm: f64, [x, y]: [f64; 2]) -> Point {
        let data = self.data;
        let inside = |axis: &[f64], value: f64| (axis[0]..=axis[axis.len() - 1]).contains(&value);
        let mut point = Point {
            temperature_gev: 0.0,
            flow: [0.0; 2],
        };
        if !inside(&data.tau_fm, tau_fm) || !inside(&data.x_fm, x) || !inside(&data.y_fm, y) {
            return point;
        }
        for (i, u) in around(&data.tau_fm, tau_fm) {
            for (j, v) in around(&data.x_fm, x) {
                for (k, w) in around(&data.y_fm, y) {
                    for (m, s) in self.eta {
                        let (place, weight) = (data.index(i, j, k, m), u * v * w * s);
                        point.temperature_gev += weight * f64::from(data.temperature_gev[place]);
                        if let Some(flow) = &data.flow {
                            point.flow[0] += weight * f64::from(flow[0][place]);
                            point.flow[1] += weight * f64::from(flow[1][place]);
                        }
                    }
                }
            }
        }
        point
    }

    /// First and last proper time at which the field is as hot as a temperature, and the largest |x| or |y| where it is;
    /// `None` where nowhere.
    pub(super) fn hot_extent(&self, temperature_gev: f64) -> Option<([f64; 2], f64)> {
        let data = self.data;
        let (mut times, mut reach) = ([f64::INFINITY, f64::NEG_INFINITY], 0.0_f64);
        for (i, tau) in data.tau_fm.iter().enumerate() {
            for (j, x) in data.x_fm.iter().enumerate() {
                for (k, y) in data.y_fm.iter().enumerate() {
                    let place = data.index(i, j, k, self.eta[0].0);
                    if f64::from(data.temperature_gev[place]) >= temperature_gev {
                        times = [times[0].min(*tau), times[1].max(*tau)];
                        reach = reach.max(x.abs()).max(y.abs());
                    }
                }
            }
        }
        (times[0] <= times[1]).then_some((times, reach))
    }
}

/// The points before and after a coordinate, with their weights.
fn around(axis: &[f64], coordinate: f64) -> [(usize, f64); 2] {
    let cell = axis[1..axis.len() - 1].partition_point(|point| *point <= coordinate);
    let share = (coordinate - axis[cell]) / (axis[cell + 1] - axis[cell]);
    let share = share.clamp(0.0, 1.0);
    [(cell, 1.0 - share), (cell + 1, share)]
}
