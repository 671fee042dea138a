//! The running strong coupling.
//!
//! d alpha / d ln mu^2 = -b0 alpha^2 - b1 alpha^3, with b0 = (33 - 2 n_f)/(12 pi) and b1 = (153 - 19 n_f)/(24 pi^2)
//! (Review of Particle Physics, chapter "Quantum chromodynamics"), continuous at the quark thresholds, reference
//! value alpha_s(M_Z). One loop: 1/alpha is linear in ln mu^2. Two loops: the exact solution of the equation above,
//! 1/alpha + c ln(c alpha/(1 + c alpha)) = b0 ln mu^2 + const with c = b1/b0, tabulated. Below the freezing scale the
//! value stays constant: frozen, not cut.

use std::f64::consts::PI;

use thiserror::Error;

use super::Z_MASS_GEV;
use crate::numerics::elementary::{exp, ln};

/// Settings of the coupling.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct CouplingSettings {
    /// How it runs.
    pub law: CouplingLaw,
    /// At what scale it is taken; without meaning when fixed.
    pub argument: ScaleArgument,
    /// Quark masses in GeV, charm and bottom, ascending: thresholds of the running and of pair production.
    pub quark_masses_gev: [f64; 2],
}

/// Fixed or running.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum CouplingLaw {
    /// The same value everywhere.
    Fixed {
        /// In (0, 1).
        alpha_s: f64,
    },
    /// Running from the Z mass.
    Running {
        /// One or two loops.
        loops: Loops,
        /// alpha_s(91.1876 GeV), in (0, 1).
        alpha_s_mz: f64,
        /// Scale in GeV below which it stays constant.
        freeze_gev: f64,
    },
}

/// Order of the running.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Loops {
    /// One loop.
    One,
    /// Two loops.
    Two,
}

/// Argument of the coupling.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ScaleArgument {
    /// kappa^2 = z(1-z) t.
    TransverseMomentum,
    /// t.
    Virtuality,
}

/// Why a coupling cannot be had.
#[derive(Clone, Debug, Error, PartialEq)]
pub enum CouplingError {
    /// The coupling diverges or leaves (0, 1) at or above the freezing scale.
    #[error(
        "the coupling reaches {largest:.3} at {scale_gev:.4} GeV, at or above the freezing scale of {freeze_gev} GeV; it must stay below 1: raise freeze_GeV or lower alpha_s_mz"
    )]
    TooStrong {
        /// The freezing scale asked for, GeV.
        freeze_gev: f64,
        /// Where the coupling leaves the range, GeV.
        scale_gev: f64,
        /// The value there.
        largest: f64,
    },
}

/// alpha_s must stay below this for an expansion in it to have a meaning.
const LARGEST_ALPHA_S: f64 = 1.0;
/// Spacing of the two-loop table in ln mu^2; its interpolation error is tested below.
const TABLE_STEP: f64 = 0.05;
/// The two-loop table ends at this ln(mu^2/GeV^2) (10^8 GeV); above it the last segment is continued.
const TABLE_END: f64 = 36.8;

/// alpha_s as a function of mu^2.
#[derive(Clone, Debug)]
pub struct Coupling {
    law: Law,
    argument: ScaleArgument,
}

#[derive(Clone, Debug)]
enum Law {
    Fixed(f64),
    OneLoop(OneLoop),
    TwoLoops(Box<Table>),
}

/// 1/alpha = intercept + slope ln mu^2, one pair for each number of flavours (3, 4, 5).
#[derive(Clone, Debug)]
struct OneLoop {
    intercepts: [f64; 3],
    slopes: [f64; 3],
    thresholds_gev2: [f64; 2],
    freeze_gev2: f64,
}

/// Values and slopes of 1/alpha on an even grid in ln mu^2, for 3, 4 and 5 flavours (the slope jumps at thresholds).
#[derive(Clone, Debug)]
struct Table {
    start: f64,
    nodes: [Vec<[f64; 2]>; 3],
    thresholds: [f64; 2],
    freeze_gev2: f64,
}

fn b0(flavours: usize) -> f64 {
    (33.0 - 2.0 * flavours as f64) / (12.0 * PI)
}

fn b1(flavours: usize) -> f64 {
    (153.0 - 19.0 * flavours as f64) / (24.0 * PI * PI)
}

impl Coupling {
    /// Prepares the coupling.
    ///
    /// # Errors
    /// [`CouplingError::TooStrong`] where alpha_s leaves (0, 1) at or above the freezing scale.
    pub fn new(settings: &CouplingSettings) -> Result<Coupling, CouplingError> {
        let law = match settings.law {
            CouplingLaw::Fixed { alpha_s } => Law::Fixed(alpha_s),
            CouplingLaw::Running {
                loops,
                alpha_s_mz,
                freeze_gev,
            } => {
                let running = Running::new(settings.quark_masses_gev, alpha_s_mz, loops);
                running.check(freeze_gev)?;
                match loops {
                    Loops::One => Law::OneLoop(running.one_loop(freeze_gev)),
                    Loops::Two => Law::TwoLoops(Box::new(running.table(freeze_gev))),
                }
            }
        };
        Ok(Coupling {
            law,
            argument: settings.argument,
        })
    }

    /// alpha_s at mu^2 in GeV^2 (positive). It never grows with mu^2.
    #[inline]
    pub fn alpha_s(&self, mu2_gev2: f64) -> f64 {
        match &self.law {
            Law::OneLoop(law) => law.alpha_s(mu2_gev2),
            Law::Fixed(value) => *value,
            Law::TwoLoops(table) => table.alpha_s(mu2_gev2),
        }
    }

    /// The scale mu^2 in GeV^2 at which a splitting's coupling is taken, from kappa^2 = z(1-z) t and t.
    #[inline]
    pub fn scale_gev2(&self, kappa2_gev2: f64, t_gev2: f64) -> f64 {
        match self.argument {
            ScaleArgument::TransverseMomentum => kappa2_gev2,
            ScaleArgument::Virtuality => t_gev2,
        }
    }
}

impl OneLoop {
    #[inline]
    fn alpha_s(&self, mu2_gev2: f64) -> f64 {
        let mu2 = mu2_gev2.max(self.freeze_gev2);
        let heavy =
            (mu2 >= self.thresholds_gev2[0]) as usize + (mu2 >= self.thresholds_gev2[1]) as usize;
        1.0 / (self.intercepts[heavy] + self.slopes[heavy] * ln(mu2))
    }
}

impl Table {
    /// Cubic Hermite interpolation of 1/alpha with exact slopes.
    fn alpha_s(&self, mu2_gev2: f64) -> f64 {
        let ln_mu2 = ln(mu2_gev2.max(self.freeze_gev2));
        let heavy =
            (ln_mu2 >= self.thresholds[0]) as usize + (ln_mu2 >= self.thresholds[1]) as usize;
        let nodes = &self.nodes[heavy];
        let place = (ln_mu2 - self.start) / TABLE_STEP;
        let cell = (place as usize).min(nodes.len() - 2);
        let u = place - cell as f64;
        let [left, left_slope] = nodes[cell];
        let [right, right_slope] = nodes[cell + 1];
        let rise = right - left;
        let (bend_left, bend_right) = (
            left_slope * TABLE_STEP - rise,
            rise - right_slope * TABLE_STEP,
        );
        1.0 / (left + u * rise + u * (1.0 - u) * ((1.0 - u) * bend_left + u * bend_right))
    }
}

/// The exact running, slow: used to fill tables and to check settings.
struct Running {
    loops: Loops,
    /// For 3, 4, 5 flavours: ln mu^2 of a reference point and 1/alpha there.
    references: [[f64; 2]; 3],
    thresholds: [f64; 2],
}

impl Running {
    fn new(masses_gev: [f64; 2], alpha_s_mz: f64, loops: Loops) -> Running {
        let thresholds = masses_gev.map(|mass| ln(mass * mass));
        let at_z = [ln(Z_MASS_GEV * Z_MASS_GEV), 1.0 / alpha_s_mz];
        let mut running = Running {
            loops,
            references: [at_z; 3],
            thresholds,
        };
        for place in [1, 0] {
            let threshold = thresholds[place];
            running.references[place] = [threshold, running.inverse_within(place + 1, threshold)];
        }
        running
    }

    fn segment(&self, ln_mu2: f64) -> usize {
        self.thresholds
            .iter()
            .filter(|threshold| ln_mu2 >= **threshold)
            .count()
    }

    fn inverse(&self, ln_mu2: f64) -> f64 {
        self.inverse_within(self.segment(ln_mu2), ln_mu2)
    }

    /// 1/alpha with `segment + 3` flavours; not finite or not positive at or below the pole.
    fn inverse_within(&self, segment: usize, ln_mu2: f64) -> f64 {
        let [reference, inverse] = self.references[segment];
        let flavours = segment + 3;
        let one_loop = b0(flavours) * (ln_mu2 - reference);
        match self.loops {
            Loops::One => inverse + one_loop,
            Loops::Two => two_loop_inverse(inverse, one_loop, b1(flavours) / b0(flavours)),
        }
    }

    fn check(&self, freeze_gev: f64) -> Result<(), CouplingError> {
        let freeze = ln(freeze_gev * freeze_gev);
        let top = ln(Z_MASS_GEV * Z_MASS_GEV).max(freeze);
        let steps = ((top - freeze) / TABLE_STEP).ceil().max(1.0);
        // From above, so that the first violation found is the highest and no exact solution is asked below a pole.
        for step in (0..=steps as usize).rev() {
            let ln_mu2 = freeze + (top - freeze) * step as f64 / steps;
            let alpha = 1.0 / self.inverse(ln_mu2);
            if !(alpha > 0.0 && alpha < LARGEST_ALPHA_S) {
                let scale_gev = exp(0.5 * ln_mu2);
                return Err(CouplingError::TooStrong {
                    freeze_gev,
                    scale_gev,
                    largest: alpha,
                });
            }
        }
        Ok(())
    }

    fn one_loop(&self, freeze_gev: f64) -> OneLoop {
        let slopes = [b0(3), b0(4), b0(5)];
        let intercepts = std::array::from_fn(|segment| {
            let [reference, inverse] = self.references[segment];
            inverse - slopes[segment] * reference
        });
        let thresholds_gev2 = self.thresholds.map(libm::exp);
        OneLoop {
            intercepts,
            slopes,
            thresholds_gev2,
            freeze_gev2: freeze_gev * freeze_gev,
        }
    }

    fn table(&self, freeze_gev: f64) -> Table {
        let start = ln(freeze_gev * freeze_gev);
        let count = ((TABLE_END - start) / TABLE_STEP).ceil().max(2.0) as usize;
        let node = |segment: usize, place: usize| {
            let inverse = self.inverse_within(segment, start + place as f64 * TABLE_STEP);
            let flavours = segment + 3;
            [inverse, b0(flavours) + b1(flavours) / inverse]
        };
        let nodes =
            std::array::from_fn(|segment| (0..=count).map(|place| node(segment, place)).collect());
        Table {
            start,
            nodes,
            thresholds: self.thresholds,
            freeze_gev2: freeze_gev * freeze_gev,
        }
    }
}

/// Solves y - c ln(y + c) = y0 - c ln(y0 + c) + `one_loop` for y = 1/alpha by Newton's method.
fn two_loop_inverse(inverse: f64, one_loop: f64, c: f64) -> f64 {
    const LARGEST_STEP_COUNT: usize = 60;
    const TOLERANCE: f64 = 1e-15;
    let target = inverse - c * ln(inverse + c) + one_loop;
    let mut y = (inverse + one_loop).max(inverse * 0.5);
    for _ in 0..LARGEST_STEP_COUNT {
        let step = (y - c * ln(y + c) - target) * (y + c) / y;
        y = if step < y { y - step } else { 0.5 * y };
        if step.abs() < TOLERANCE * y {
            return y;
        }
    }
    // No convergence: the target lies below the smallest value that the left side can take, beyond the pole.
    if (y - c * ln(y + c) - target).abs() < 1e-9 {
        y
    } else {
        f64::NAN
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn coupling(loops: Loops, freeze_gev: f64) -> Result<Coupling, CouplingError> {
        Coupling::new(&CouplingSettings {
            law: CouplingLaw::Running {
                loops,
                alpha_s_mz: 0.118,
                freeze_gev,
            },
            argument: ScaleArgument::TransverseMomentum,
            quark_masses_gev: [1.5, 4.75],
        })
    }

    /// The table must agree with a Runge-Kutta integration of the equation itself.
    #[test]
    fn two_loops_solve_the_renormalisation_group_equation() {
        let table = coupling(Loops::Two, 1.0).unwrap();
        let beta = |flavours: usize, a: f64| -b0(flavours) * a * a - b1(flavours) * a * a * a;
        let (mut alpha, mut scale) = (0.118, ln(Z_MASS_GEV * Z_MASS_GEV));
        for (flavours, end_gev) in [(5, 4.75), (4, 1.5), (3, 1.0_f64)] {
            let steps = 20_000;
            let h = (ln(end_gev * end_gev) - scale) / steps as f64;
            for _ in 0..steps {
                let k1 = beta(flavours, alpha);
                let k2 = beta(flavours, alpha + 0.5 * h * k1);
                let k3 = beta(flavours, alpha + 0.5 * h * k2);
                let k4 = beta(flavours, alpha + h * k3);
                alpha += h / 6.0 * (k1 + 2.0 * k2 + 2.0 * k3 + k4);
                scale += h;
                let off = table.alpha_s(exp(scale)) / alpha - 1.0;
                assert!(
                    off.abs() < 1e-8,
                    "{flavours} flavours, ln mu^2 = {scale}: off by {off}"
                );
            }
        }
    }

    #[test]
    fn alpha_s_never_grows_and_freezes() {
        for loops in [Loops::One, Loops::Two] {
            let coupling = coupling(loops, 1.0).unwrap();
            let mut last = f64::INFINITY;
            for step in 0..200_000 {
                let alpha = coupling.alpha_s(exp(-2.0 + 1e-4 * step as f64));
                assert!(alpha <= last * (1.0 + 1e-14));
                last = alpha;
            }
            assert_eq!(coupling.alpha_s(0.1), coupling.alpha_s(1.0));
        }
    }

    #[test]
    fn a_freeze_below_the_pole_is_refused() {
        for loops in [Loops::One, Loops::Two] {
            for freeze_gev in [0.25, 0.1, 0.001] {
                let error = coupling(loops, freeze_gev).unwrap_err();
                let CouplingError::TooStrong { scale_gev, .. } = error;
                assert!(scale_gev >= freeze_gev);
            }
        }
    }
}
