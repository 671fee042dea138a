//! From a temperature field to a path: samples along a ray, cut at the end temperature, as linear pieces of qhat.
//!
//! Each cell is sampled at both ends and in the middle. Where all three are hot, mean and slope are those of the
//! parabola through them (Simpson's rule); where the medium ends inside the cell, each half is taken as linear and cut
//! at the crossing of the end temperature.

use super::Medium;
use super::field::{Local, Ray};
use super::path::{Cell, Path};

/// The path of one parton, with memory that is used again for the next.
#[derive(Clone, Debug, Default)]
pub struct Trace {
    /// The gluon's transport coefficient along the path.
    pub path: Path,
    samples: Vec<Local>,
}

/// What a trace found.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Outcome {
    /// No medium on the way.
    Empty,
    /// A path through the medium.
    Medium {
        /// The path left the data of the field while still above the end temperature.
        left_hot: bool,
    },
}

#[derive(Clone, Copy)]
struct Sample {
    temperature_gev: f64,
    qhat: f64,
}

impl Medium {
    /// Tabulates the transport coefficient along a ray.
    pub fn trace(&self, ray: &Ray, trace: &mut Trace) -> Outcome {
        let Some(stretch) = self.field.stretch(ray, self.end_temperature_gev) else {
            return Outcome::Empty;
        };
        let step_fm = (stretch.last_fm - stretch.first_fm) / stretch.cells as f64;
        self.field.sample(
            ray,
            stretch.first_fm,
            0.5 * step_fm,
            2 * stretch.cells + 1,
            &mut trace.samples,
        );
        trace.path.restart(stretch.first_fm, step_fm);
        for cell in 0..stretch.cells {
            let samples = [0, 1, 2].map(|place| self.sample(&trace.samples[2 * cell + place]));
            trace.path.push(self.cell(samples, step_fm));
        }
        trace.path.finish();
        if trace.path.qhat_integral_gev2() <= 0.0 {
            return Outcome::Empty;
        }
        let at_end = trace.samples[2 * stretch.cells].temperature_gev;
        Outcome::Medium {
            left_hot: self.field.has_artificial_edge() && at_end >= self.end_temperature_gev,
        }
    }

    #[inline]
    fn sample(&self, local: &Local) -> Sample {
        let flow = if self.transport.flow {
            local.flow_factor
        } else {
            1.0
        };
        let qhat = self
            .transport
            .gluon_qhat_gev2_per_fm(local.temperature_gev, f64::INFINITY)
            * flow;
        Sample {
            temperature_gev: local.temperature_gev,
            qhat,
        }
    }

    #[inline]
    fn cell(&self, [left, middle, right]: [Sample; 3], step_fm: f64) -> Cell {
        let hot = |sample: &Sample| sample.temperature_gev >= self.end_temperature_gev;
        if hot(&left) && hot(&middle) && hot(&right) {
            // Simpson's weights 1, 4, 1.
            let mean = (left.qhat + 4.0 * middle.qhat + right.qhat) / 6.0;
            return Cell {
                mean,
                slope: (right.qhat - left.qhat) / step_fm,
            };
        }
        let half = 0.5 * step_fm;
        let first = self.half_cell(left, middle, -half, half);
        let second = self.half_cell(middle, right, 0.0, half);
        let (integral, lever) = (first[0] + second[0], first[1] + second[1]);
        // Projection on the first two Legendre polynomials of the cell; the steepest line that is nowhere negative stands
        // for a steeper one, so that moments and rates keep their sign.
        let mean = integral / step_fm;
        let steepest = 2.0 * mean / step_fm;
        let slope = 12.0 * lever / (step_fm * step_fm * step_fm);
        Cell {
            mean,
            slope: slope.clamp(-steepest, steepest),
        }
    }

    /// Integrals of qhat and of s qhat over the hot part of [start, start + width], s measured from the cell's centre.
    fn half_cell(&self, left: Sample, right: Sample, start: f64, width: f64) -> [f64; 2] {
        let end = self.end_temperature_gev;
        let crossing =
            || (end - left.temperature_gev) / (right.temperature_gev - left.temperature_gev);
        let (from, to) = match (left.temperature_gev >= end, right.temperature_gev >= end) {
            (false, false) => return [0.0, 0.0],
            (true, true) => (0.0, 1.0),
            (true, false) => (0.0, crossing()),
            (false, true) => (crossing(), 1.0),
        };
        let at = |u: f64| left.qhat + (right.qhat - left.qhat) * u;
        let (low, high) = (at(from), at(to));
        let length = (to - from) * width;
        let centre = start + 0.5 * (from + to) * width;
        let integral = 0.5 * (low + high) * length;
        [
            integral,
            integral * centre + (high - low) * length * length / 12.0,
        ]
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::medium::field::{Stretch, TemperatureField};
    use crate::medium::{
        ColourCharge, FieldKind, FieldSettings, MediumSettings, OriginSettings, TransportKind,
        TransportSettings,
    };

    /// Hot up to a distance along any ray, cold beyond.
    struct Sliver {
        hot_fm: f64,
    }

    impl TemperatureField for Sliver {
        fn stretch(&self, _ray: &Ray, _end_temperature_gev: f64) -> Option<Stretch> {
            Some(Stretch {
                first_fm: 0.0,
                last_fm: 1.2,
                cells: 2,
            })
        }

        fn local(&self, _ray: &Ray, l_fm: f64) -> Local {
            // Falls linearly through the end temperature of 0.15 GeV at `hot_fm`.
            let temperature_gev = 0.15 + 0.1 * (self.hot_fm - l_fm);
            Local {
                temperature_gev,
                flow_factor: 1.0,
            }
        }
    }

    /// A medium that ends inside a cell has no negative moment, however small the hot part.
    #[test]
    fn partly_hot_cells_keep_their_sign() {
        for hot_fm in [1e-6, 0.01, 0.06, 0.2, 0.31, 0.59, 0.61, 0.7, 1.1] {
            let settings = MediumSettings {
                field: FieldSettings {
                    kind: FieldKind::Brick {
                        temperature_gev: 0.3,
                        length_fm: 1.0,
                    },
                    end_temperature_gev: 0.15,
                },
                origin: OriginSettings::Fixed {
                    x_fm: 0.0,
                    y_fm: 0.0,
                },
                transport: TransportSettings {
                    kind: TransportKind::Constant {
                        qhat_gev2_per_fm: 1.0,
                    },
                    stated_for: ColourCharge::Gluon,
                    flow: true,
                },
                effects: Vec::new(),
                limit_to_small_angles: true,
                min_energy_gev: 2.0,
            };
            let medium = Medium::new(&settings, Box::new(Sliver { hot_fm }));
            let mut trace = Trace::default();
            let ray = Ray {
                birth_fm: [0.0; 4],
                direction: [1.0, 0.0, 0.0],
            };
            medium.trace(&ray, &mut trace);
            let path = &trace.path;
            assert!(
                (path.qhat_integral_gev2() / hot_fm - 1.0).abs() < 1e-9,
                "{hot_fm}"
            );
            assert!(
                path.first_moment_gev2_fm() > 0.0 && path.second_moment_gev2_fm2() > 0.0,
                "{hot_fm}"
            );
        }
    }
}
