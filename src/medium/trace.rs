//! From a temperature field to a path: samples along a ray, cut at the end temperature, as linear pieces of qhat.
//!
//! Each cell is sampled at both ends and in the middle. Where all three are hot, mean and slope are those of the
//! parabola through them (Simpson's rule); where the medium ends inside the cell, each half is taken as linear and cut
//! at the crossing of the end temperature.

use super::Medium;
use super::field::{Ceiling, Local, Ray, Stretch, TemperatureField};
use super::path::{Cell, Path};

/// Energy loss and transport coefficient of the medium are tied by fluctuation and dissipation: ehat = qhat/(4 T).
const TEMPERATURES_PER_LOSS: f64 = 4.0;

/// The path of one parton, with memory that is used again for the next.
#[derive(Clone, Debug)]
pub struct Trace {
    /// The gluon's transport coefficient along the path, or a bound of it.
    pub path: Path,
    /// The gluon's energy loss per length along the path, GeV/fm in place of GeV^2/fm, where an effect asks for it.
    pub loss: Path,
    /// The variance that its energy gains per length, GeV^2/fm, where an effect asks for it.
    pub spread: Path,
    /// int qhat/T dl of a gluon, GeV, where an effect asks for it.
    pub qhat_over_temperature_gev: f64,
    exact: bool,
    ray: Ray,
    samples: Vec<Local>,
    ceilings: Vec<Ceiling>,
}

impl Default for Trace {
    fn default() -> Trace {
        Trace {
            path: Path::default(),
            loss: Path::default(),
            spread: Path::default(),
            qhat_over_temperature_gev: 0.0,
            exact: true,
            ray: Ray {
                birth_fm: [0.0; 4],
                direction: [0.0, 0.0, 1.0],
            },
            samples: Vec::new(),
            ceilings: Vec::new(),
        }
    }
}

impl Trace {
    /// Whether the path holds the transport coefficient itself, not a bound.
    #[inline]
    pub fn is_exact(&self) -> bool {
        self.exact
    }

    /// The ray that was traced.
    #[inline]
    pub fn ray(&self) -> &Ray {
        &self.ray
    }
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
    /// Tabulates the transport coefficient that a parton of a lab energy (GeV) meets along a ray, or bounds of it where
    /// no effect needs more and the field offers them.
    pub fn trace(
        &self,
        field: &dyn TemperatureField,
        ray: &Ray,
        energy_gev: f64,
        trace: &mut Trace,
    ) -> Outcome {
        let Some(stretch) = field.stretch(ray, self.end_temperature_gev) else {
            return Outcome::Empty;
        };
        trace.ray = *ray;
        trace.exact = self.needs_whole_path || !field.ceilings(ray, &stretch, &mut trace.ceilings);
        let at_end_gev = if trace.exact {
            self.sample_path(field, &stretch, energy_gev, trace)
        } else {
            self.bound_path(&stretch, energy_gev, trace);
            self.temperature_at_end(field, ray, &stretch, trace)
        };
        if trace.path.qhat_integral_gev2() <= 0.0 {
            return Outcome::Empty;
        }
        Outcome::Medium {
            left_hot: field.has_artificial_edge() && at_end_gev >= self.end_temperature_gev,
        }
    }

    fn temperature_at_end(
        &self,
        field: &dyn TemperatureField,
        ray: &Ray,
        stretch: &Stretch,
        trace: &Trace,
    ) -> f64 {
        match trace.ceilings.last() {
            Some(last) if last.temperature_gev < self.end_temperature_gev => 0.0,
            _ if !field.has_artificial_edge() => 0.0,
            _ => field.local(ray, stretch.last_fm).temperature_gev,
        }
    }

    fn bound_path(&self, stretch: &Stretch, energy_gev: f64, trace: &mut Trace) {
        let segments = trace.ceilings.len() as f64;
        trace.path.restart(
            stretch.first_fm,
            (stretch.last_fm - stretch.first_fm) / segments,
        );
        trace.path.extend(trace.ceilings.iter().map(|ceiling| {
            let mean = if ceiling.temperature_gev < self.end_temperature_gev {
                0.0
            } else {
                let at_rest = self.transport.gluon_qhat_ceiling_gev2_per_fm(
                    ceiling.temperature_gev,
                    energy_gev * ceiling.flow_factor,
                );
                if self.transport.flow {
                    at_rest * ceiling.flow_factor
                } else {
                    at_rest
                }
            };
            Cell { mean, slope: 0.0 }
        }));
        trace.path.finish();
    }

    /// The exact path; returns the temperature at its end.
    fn sample_path(
        &self,
        field: &dyn TemperatureField,
        stretch: &Stretch,
        energy_gev: f64,
        trace: &mut Trace,
    ) -> f64 {
        let step_fm = (stretch.last_fm - stretch.first_fm) / stretch.cells as f64;
        field.sample(
            &trace.ray,
            stretch.first_fm,
            0.5 * step_fm,
            2 * stretch.cells + 1,
            &mut trace.samples,
        );
        trace.path.restart(stretch.first_fm, step_fm);
        for cell in 0..stretch.cells {
            let samples = self.samples_of(&trace.samples, cell, energy_gev);
            trace.path.push(self.cell(samples, step_fm));
        }
        trace.path.finish();
        if self.needs_loss {
            self.sample_loss(stretch, step_fm, energy_gev, trace);
        }
        trace.samples[2 * stretch.cells].temperature_gev
    }

    /// Loss and spread of the energy and the mean of 1/T, for effects that ask for them.
    ///
    /// In the rest frame of the fluid a light-like parton shrinks along itself; the relative loss and dt/E are the same
    /// in every frame, so the energy lost per lab length is that at rest, without the flow factor f, and the variance
    /// per lab length, (E/E_rest)^2 dt_rest/dt times that at rest, carries 1/f.
    fn sample_loss(&self, stretch: &Stretch, step_fm: f64, energy_gev: f64, trace: &mut Trace) {
        let Trace {
            loss,
            spread,
            samples,
            ..
        } = trace;
        let fill = |path: &mut Path, quantity: &dyn Fn(&Local, f64) -> f64| {
            path.restart(stretch.first_fm, step_fm);
            for cell in 0..stretch.cells {
                let samples = [0, 1, 2].map(|place| {
                    let local = &samples[2 * cell + place];
                    Sample {
                        temperature_gev: local.temperature_gev,
                        qhat: quantity(local, self.qhat_of(local, energy_gev)),
                    }
                });
                path.push(self.cell(samples, step_fm));
            }
            path.finish();
        };
        let warmth = |local: &Local| local.temperature_gev.max(f64::MIN_POSITIVE);
        let flow = |local: &Local| {
            if self.transport.flow {
                local.flow_factor
            } else {
                1.0
            }
        };
        fill(loss, &|local, qhat| qhat / warmth(local));
        trace.qhat_over_temperature_gev = loss.qhat_integral_gev2();
        fill(loss, &|local, qhat| {
            qhat / (flow(local) * TEMPERATURES_PER_LOSS * warmth(local))
        });
        // One of the two transverse dimensions of qhat.
        fill(spread, &|local, qhat| {
            0.5 * qhat / (flow(local) * flow(local))
        });
    }

    #[inline]
    fn samples_of(&self, samples: &[Local], cell: usize, energy_gev: f64) -> [Sample; 3] {
        [0, 1, 2].map(|place| {
            let local = &samples[2 * cell + place];
            Sample {
                temperature_gev: local.temperature_gev,
                qhat: self.qhat_of(local, energy_gev),
            }
        })
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
    use crate::medium::field::Fluid;
    use crate::medium::{
        ColourCharge, EffectSettings, FieldKind, FieldSettings, MediumSettings, OriginSettings,
        TransportKind, TransportSettings,
    };
    use std::sync::Arc;

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

        fn fluid(&self, _point_fm: [f64; 4]) -> Fluid {
            Fluid::EMPTY
        }

        fn first_tau_fm(&self) -> f64 {
            0.0
        }
    }

    fn settings() -> MediumSettings {
        MediumSettings {
            field: FieldSettings::new(
                FieldKind::Brick {
                    temperature_gev: 0.3,
                    length_fm: 1.0,
                },
                0.15,
            ),
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
        }
    }

    /// A medium that ends inside a cell has no negative moment, however small the hot part.
    #[test]
    fn partly_hot_cells_keep_their_sign() {
        for hot_fm in [1e-6, 0.01, 0.06, 0.2, 0.31, 0.59, 0.61, 0.7, 1.1] {
            let settings = settings();
            let medium = Medium::new(&settings, Arc::new(Sliver { hot_fm }));
            let mut trace = Trace::default();
            let ray = Ray {
                birth_fm: [0.0; 4],
                direction: [1.0, 0.0, 0.0],
            };
            medium.trace(medium.field(), &ray, 10.0, &mut trace);
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

    /// In a moving fluid the loss per lab length is that at rest and its variance falls with the flow factor; qhat
    /// rises with it.
    #[test]
    fn loss_in_a_moving_fluid() {
        struct Wind(f64);
        impl TemperatureField for Wind {
            fn stretch(&self, _ray: &Ray, _end_temperature_gev: f64) -> Option<Stretch> {
                Some(Stretch {
                    first_fm: 0.0,
                    last_fm: 2.0,
                    cells: 3,
                })
            }

            fn local(&self, _ray: &Ray, _l_fm: f64) -> Local {
                Local {
                    temperature_gev: 0.3,
                    flow_factor: self.0,
                }
            }

            fn fluid(&self, _point_fm: [f64; 4]) -> Fluid {
                Fluid::EMPTY
            }

            fn first_tau_fm(&self) -> f64 {
                0.0
            }
        }
        for flow in [0.4, 1.0, 1.7] {
            let mut settings = settings();
            settings.effects = vec![EffectSettings::new(
                &crate::medium::effects::drag::MODEL,
                &[],
            )];
            let medium = Medium::new(&settings, Arc::new(Wind(flow)));
            let mut trace = Trace::default();
            let ray = Ray {
                birth_fm: [0.0; 4],
                direction: [1.0, 0.0, 0.0],
            };
            medium.trace(medium.field(), &ray, 10.0, &mut trace);
            // qhat = 1 GeV^2/fm at rest over 2 fm.
            for (found, expected) in [
                (trace.path.qhat_integral_gev2(), 2.0 * flow),
                (trace.loss.qhat_integral_gev2(), 2.0 / (4.0 * 0.3)),
                (trace.spread.qhat_integral_gev2(), 1.0 / flow),
                (trace.qhat_over_temperature_gev, 2.0 * flow / 0.3),
            ] {
                assert!((found / expected - 1.0).abs() < 1e-12, "{found} {expected}");
            }
        }
    }
}
