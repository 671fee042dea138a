//! What a temperature field holds and whether it can be used, in numbers and words.

use std::fmt;

use super::numbers::significant;
use crate::medium::field::FieldData;

/// Significant digits of everything printed.
const DIGITS: i32 = 4;
/// Power of the temperature that weights places: the energy density of an ideal gas of massless particles.
const WEIGHT_POWER: i32 = 4;
/// Below this temperature in GeV (the default end temperature of a medium) the interpolation is of no interest.
pub(super) const RELEVANT_TEMPERATURE_GEV: f64 = 0.15;
/// Linear interpolation errs with the square of the spacing, so by a quarter of what the doubled spacing shows.
const SPACING_GAIN: f64 = 0.25;
/// Spacings that differ by less than this share are called even.
const EVEN_SPACING: f64 = 1e-6;

/// A field in numbers.
#[derive(Clone, Debug, PartialEq)]
pub struct FieldSummary {
    /// Name, values and unit of each axis.
    pub axes: Vec<(&'static str, Vec<f64>, &'static str)>,
    /// Largest temperature in GeV.
    pub largest_temperature_gev: f64,
    /// Where it is: tau, x, y (and eta) in the axes' units.
    pub largest_temperature_at: Vec<f64>,
    /// Largest transverse four-velocity and largest |tau u^eta|; `None` without flow.
    pub largest_flow: Option<[f64; 2]>,
    /// Centre [x, y] in fm of the first slice, weighted with T^4.
    pub centroid_fm: [f64; 2],
    /// Ellipticity of the first slice about its centre, weighted with r^2 T^4.
    pub ellipticity: f64,
    /// Direction of the short axis in radians, in (-pi/2, pi/2].
    pub event_plane_rad: f64,
    /// Largest temperature in GeV on each face of the grid.
    pub edges: Vec<(String, f64)>,
    /// Estimated error of linear interpolation along each axis.
    pub interpolation: Vec<AxisError>,
}

/// Estimated error of linear interpolation along one axis.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct AxisError {
    /// The axis.
    pub axis: &'static str,
    /// Largest error in GeV.
    pub largest_gev: f64,
    /// Root mean square in GeV.
    pub typical_gev: f64,
    /// Points that were left out and predicted.
    pub points: usize,
}

impl FieldSummary {
    /// Looks at a field. Where all of the first slice is cold, centroid and event plane are not numbers.
    pub fn of(data: &FieldData) -> Self {
        let mut axes = vec![
            ("tau", data.tau_fm.clone(), "fm"),
            ("x", data.x_fm.clone(), "fm"),
            ("y", data.y_fm.clone(), "fm"),
        ];
        if let Some(eta) = &data.eta {
            axes.push(("eta", eta.clone(), ""));
        }
        let (place, largest) = largest_temperature(data);
        let moments = first_slice_moments(data);
        FieldSummary {
            largest_temperature_gev: largest,
            largest_temperature_at: axes
                .iter()
                .zip(place)
                .map(|((_, values, _), index)| values[index])
                .collect(),
            largest_flow: data.flow.as_ref().map(largest_flow),
            centroid_fm: moments.centroid_fm,
            ellipticity: moments.ellipticity,
            event_plane_rad: moments.event_plane_rad,
            edges: edges(data, &axes),
            interpolation: axes
                .iter()
                .enumerate()
                .map(|(axis, (name, values, _))| interpolation_error(data, axis, name, values))
                .collect(),
            axes,
        }
    }
}

/// Visits every grid point: its indices along tau, x, y, eta and its temperature.
fn for_each_point(data: &FieldData, mut visit: impl FnMut([usize; 4], f64)) {
    let [taus, xs, ys, etas] = data.shape();
    for tau in 0..taus {
        for x in 0..xs {
            for y in 0..ys {
                for eta in 0..etas {
                    let value = data.temperature_gev[data.index(tau, x, y, eta)];
                    visit([tau, x, y, eta], f64::from(value));
                }
            }
        }
    }
}

fn largest_temperature(data: &FieldData) -> ([usize; 4], f64) {
    let mut largest = ([0; 4], 0.0);
    for_each_point(data, |place, value| {
        if value > largest.1 {
            largest = (place, value);
        }
    });
    largest
}

fn largest_flow([ux, uy, ueta]: &[Vec<f32>; 3]) -> [f64; 2] {
    let transverse = ux.iter().zip(uy).map(|(x, y)| f64::from(x.hypot(*y)));
    let longitudinal = ueta.iter().map(|u| f64::from(u.abs()));
    [
        transverse.fold(0.0, f64::max),
        longitudinal.fold(0.0, f64::max),
    ]
}

struct Moments {
    centroid_fm: [f64; 2],
    ellipticity: f64,
    event_plane_rad: f64,
}

/// T^4-weighted moments of the first slice in the transverse plane, each point with the area of its cell.
fn first_slice_moments(data: &FieldData) -> Moments {
    let (cells_x, cells_y) = (cell_widths(&data.x_fm), cell_widths(&data.y_fm));
    let cells_eta = data.eta.as_deref().map_or(vec![1.0], cell_widths);
    let mut weighted = Vec::new();
    for_each_point(data, |[tau, x, y, eta], value| {
        if tau == 0 {
            let cell = cells_x[x] * cells_y[y] * cells_eta[eta];
            weighted.push((data.x_fm[x], data.y_fm[y], cell * value.powi(WEIGHT_POWER)));
        }
    });
    let mean = |quantity: &dyn Fn(f64, f64) -> f64| {
        let sum: f64 = weighted.iter().map(|(x, y, w)| w * quantity(*x, *y)).sum();
        sum / weighted.iter().map(|(_, _, w)| w).sum::<f64>()
    };
    let centroid_fm = [mean(&|x, _| x), mean(&|_, y| y)];
    let [x0, y0] = centroid_fm;
    // r^2 cos 2 phi, r^2 sin 2 phi and r^2 about the centre
    let cosine = mean(&|x, y| (x - x0).powi(2) - (y - y0).powi(2));
    let sine = mean(&|x, y| 2.0 * (x - x0) * (y - y0));
    let square = mean(&|x, y| (x - x0).powi(2) + (y - y0).powi(2));
    let long_axis = 0.5 * sine.atan2(cosine);
    let quarter_turn = std::f64::consts::FRAC_PI_2;
    Moments {
        centroid_fm,
        ellipticity: cosine.hypot(sine) / square,
        event_plane_rad: if long_axis > 0.0 {
            long_axis - quarter_turn
        } else {
            long_axis + quarter_turn
        },
    }
}

/// The length that each point stands for (trapezoidal rule).
fn cell_widths(axis: &[f64]) -> Vec<f64> {
    (0..axis.len())
        .map(|i| {
            let before = axis[i.saturating_sub(1)];
            let after = axis[(i + 1).min(axis.len() - 1)];
            0.5 * (after - before)
        })
        .collect()
}

fn edges(data: &FieldData, axes: &[(&'static str, Vec<f64>, &'static str)]) -> Vec<(String, f64)> {
    let mut edges = Vec::new();
    for (axis, (name, values, unit)) in axes.iter().enumerate() {
        for index in [0, values.len() - 1] {
            let mut largest = 0.0;
            for_each_point(data, |place, value| {
                if place[axis] == index {
                    largest = f64::max(largest, value);
                }
            });
            let label = format!("{name} = {} {unit}", significant(values[index], DIGITS));
            edges.push((label.trim_end().to_owned(), largest));
        }
    }
    edges
}

/// Leaves out every other point along an axis, predicts it from its neighbours, and scales to the full grid.
fn interpolation_error(
    data: &FieldData,
    axis: usize,
    name: &'static str,
    values: &[f64],
) -> AxisError {
    let (mut largest, mut squares, mut points) = (0.0, 0.0, 0);
    for_each_point(data, |place, value| {
        let index = place[axis];
        if index % 2 == 0 || index + 1 >= values.len() || value < RELEVANT_TEMPERATURE_GEV {
            return;
        }
        let neighbour = |index: usize| {
            let mut there = place;
            there[axis] = index;
            let [tau, x, y, eta] = there;
            f64::from(data.temperature_gev[data.index(tau, x, y, eta)])
        };
        let share = (values[index] - values[index - 1]) / (values[index + 1] - values[index - 1]);
        let predicted = (1.0 - share) * neighbour(index - 1) + share * neighbour(index + 1);
        let error = SPACING_GAIN * (predicted - value).abs();
        largest = f64::max(largest, error);
        squares += error * error;
        points += 1;
    });
    AxisError {
        axis: name,
        largest_gev: largest,
        typical_gev: (squares / f64::max(points as f64, 1.0)).sqrt(),
        points,
    }
}

impl fmt::Display for FieldSummary {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        let number = |value: f64| significant(value, DIGITS);
        for (name, values, unit) in &self.axes {
            writeln!(out, "axis {name:<4} {}", axis_words(values, unit))?;
        }
        let place: Vec<_> = self
            .axes
            .iter()
            .zip(&self.largest_temperature_at)
            .map(|((name, _, unit), value)| format!("{name} {} {unit}", number(*value)))
            .map(|part| part.trim_end().to_owned())
            .collect();
        writeln!(
            out,
            "largest temperature {} GeV at {}",
            number(self.largest_temperature_gev),
            place.join(", ")
        )?;
        match self.largest_flow {
            None => writeln!(out, "no flow")?,
            Some([transverse, longitudinal]) => writeln!(
                out,
                "largest flow: transverse u {} (speed {}), |tau u^eta| {}",
                number(transverse),
                number(transverse / (1.0 + transverse * transverse).sqrt()),
                number(longitudinal)
            )?,
        }
        let [x, y] = self.centroid_fm;
        writeln!(
            out,
            "first slice, weighted with T^{WEIGHT_POWER}: centre x {} fm, y {} fm; about it, with r^2: ellipticity {}, second-order event plane (short axis) {} rad",
            number(x),
            number(y),
            number(self.ellipticity),
            number(self.event_plane_rad)
        )?;
        for (edge, temperature) in &self.edges {
            writeln!(
                out,
                "largest T at the edge {edge}: {} GeV",
                number(*temperature)
            )?;
        }
        for error in &self.interpolation {
            writeln!(out, "{}", error_words(error))?;
        }
        Ok(())
    }
}

fn axis_words(values: &[f64], unit: &str) -> String {
    let steps: Vec<f64> = values.windows(2).map(|pair| pair[1] - pair[0]).collect();
    let least = steps.iter().copied().fold(f64::INFINITY, f64::min);
    let most = steps.iter().copied().fold(0.0, f64::max);
    let spacing = if most - least <= EVEN_SPACING * most {
        format!("every {} {unit}", significant(most, DIGITS))
    } else {
        format!(
            "uneven, steps of {} to {} {unit}",
            significant(least, DIGITS),
            significant(most, DIGITS)
        )
    };
    let (first, last) = (values[0], values[values.len() - 1]);
    let range = format!(
        "{} points from {} to {} {unit}",
        values.len(),
        significant(first, DIGITS),
        significant(last, DIGITS)
    );
    format!("{}, {}", range.trim_end(), spacing.trim_end())
}

fn error_words(error: &AxisError) -> String {
    if error.points == 0 {
        return format!(
            "interpolation along {}: no point above {RELEVANT_TEMPERATURE_GEV} GeV to test it with",
            error.axis
        );
    }
    format!(
        "interpolation along {}: errs by about {} GeV, at most {} GeV (a quarter of what leaving out every other point costs, T above {RELEVANT_TEMPERATURE_GEV} GeV, {} points)",
        error.axis,
        significant(error.typical_gev, 2),
        significant(error.largest_gev, 2),
        error.points
    )
}
