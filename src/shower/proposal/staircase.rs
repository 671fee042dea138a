//! The vacuum envelope: a staircase over the plane of ln t and ln e, e being the soft daughter's fraction.
//!
//! In (ln t, ln e) the soft-singular kernels are nearly flat. The plane is cut into rungs of ln t and cells of ln e;
//! in each cell the density is bounded by the coupling at the cell's smallest scale times the kernel's largest value
//! there. The integral over a rung is then linear in ln t, so a trial t is the inverse of a piecewise linear function
//! and a trial e is log-uniform in a cell chosen by Walker's alias method (Walker 1977, ACM Trans. Math. Softw.
//! 3:253). e = 1 - z for q -> q g; for gluons the two mirror halves of the kernel are folded onto e <= 1/2 and
//! unfolded by a fair coin.

use rand::{Rng, RngExt};
use rand_distr::OpenClosed01;

use super::{FractionRange, Trial};
use crate::numerics::elementary::{exp, ln};
use crate::qcd::kernels::Splitting;
use crate::qcd::{C_A, C_F, Coupling, T_R};
use crate::random::Stream;
use crate::shower::{FlavourOpening, ShowerSettings};

use std::f64::consts::TAU;

/// Height of a rung in ln t and width of a cell in ln e, chosen for the least time per event.
const RUNG_HEIGHT: f64 = 0.25;
const CELL_WIDTH: f64 = 0.4;
/// Envelopes lie this much (relative) above the exact bound, so that rounding never makes an overshoot.
const ROUNDING_MARGIN: f64 = 1e-9;
/// Roundings of 1 - e that a density may carry.
const CANCELLATION_ULPS: f64 = 4.0;
/// Half-open sampling of 53 random bits: the spacing of doubles in [1/2, 1).
const UNIFORM_SPACING: f64 = 1.0 / (1u64 << 53) as f64;
const UNUSED_BITS: u32 = 11;

/// Flavours that g -> q qbar can make.
#[derive(Clone, Copy, Debug)]
pub struct FlavourRule {
    opening: FlavourOpening,
    flavours: u8,
    /// t above which c and b open, GeV^2.
    thresholds_gev2: [f64; 2],
}

/// Light flavours are always open.
const LIGHT_FLAVOURS: u8 = 3;

impl FlavourRule {
    /// The rule of a shower, with the quark masses of the coupling.
    pub fn new(settings: &ShowerSettings, quark_masses_gev: [f64; 2]) -> FlavourRule {
        // A pair of mass m needs t > 4 m^2.
        let thresholds_gev2 = quark_masses_gev.map(|mass| 4.0 * mass * mass);
        FlavourRule {
            opening: settings.flavour_opening,
            flavours: settings.flavours,
            thresholds_gev2,
        }
    }

    /// How many flavours can be open at all.
    pub fn most(&self) -> u8 {
        self.flavours
    }

    /// How many flavours are open at `t`.
    #[inline]
    pub fn open(&self, t_gev2: f64) -> u8 {
        match self.opening {
            FlavourOpening::Always => self.flavours,
            FlavourOpening::PairThreshold => {
                let heavy = self
                    .thresholds_gev2
                    .iter()
                    .filter(|threshold| t_gev2 > **threshold)
                    .count() as u8;
                (LIGHT_FLAVOURS + heavy).min(self.flavours)
            }
        }
    }
}

/// What the vacuum rate is made of: coupling, ranges, flavours.
#[derive(Clone, Debug)]
pub struct VacuumRate {
    /// alpha_s.
    pub coupling: Coupling,
    /// Range of the fractions.
    pub range: FractionRange,
    /// Open flavours.
    pub flavours: FlavourRule,
    /// alpha_s at the smallest scale that a branching can have, its largest value.
    pub largest_alpha_s: f64,
}

impl VacuumRate {
    /// The rate of a coupling, a range and flavours.
    pub fn new(coupling: Coupling, range: FractionRange, flavours: FlavourRule) -> VacuumRate {
        let scale = coupling.scale_gev2(range.smallest_kappa2_gev2(), range.end_t_gev2);
        VacuumRate {
            largest_alpha_s: coupling.alpha_s(scale),
            coupling,
            range,
            flavours,
        }
    }

    /// The vacuum density of a trial over 2 pi: alpha_s times the kernel.
    #[inline]
    pub fn density(&self, trial: &Trial) -> f64 {
        let scale = self.coupling.scale_gev2(trial.kappa2_gev2(), trial.t);
        self.coupling.alpha_s(scale) * self.kernel(trial)
    }

    #[inline]
    fn kernel(&self, trial: &Trial) -> f64 {
        use crate::qcd::kernels;
        match trial.splitting {
            Splitting::QuarkToQuarkGluon => kernels::quark_to_quark_gluon(trial.z),
            Splitting::GluonToGluons => kernels::gluon_to_gluons(trial.z),
            Splitting::GluonToQuarks => {
                kernels::gluon_to_quarks(trial.z) * f64::from(self.flavours.open(trial.t))
            }
        }
    }
}

/// The envelope of one species' vacuum branchings.
#[derive(Clone, Debug)]
pub struct Staircase {
    rungs: Vec<Rung>,
    ln_end_t: f64,
    range: FractionRange,
}

#[derive(Clone, Debug)]
struct Rung {
    /// Integral of the envelope from the cutoff to the rung's lower edge.
    integral_below: f64,
    /// Integral of the envelope over z per unit of ln t, and one over it.
    rate: f64,
    inverse_rate: f64,
    ln_t: f64,
    cells: Vec<Cell>,
}

/// A cell, with its alias for Walker's method.
#[derive(Clone, Copy, Debug)]
struct Cell {
    /// Share of the column kept by the cell itself; the rest goes to the alias.
    keep: f64,
    alias: usize,
    ln_e: f64,
    width: f64,
    /// e times this is one over 2 pi times the envelope's density in z.
    inverse_bound: f64,
    splitting: Splitting,
}

/// A place in the evolution: the integral of the envelope from the cutoff up to t.
#[derive(Clone, Copy, Debug)]
pub struct Height {
    integral: f64,
    rung: usize,
}

impl Staircase {
    /// The staircase of a gluon or a quark for t from the cutoff to at least `largest_t_gev2`.
    pub fn new(
        rate: &VacuumRate,
        settings: &ShowerSettings,
        is_gluon: bool,
        largest_t_gev2: f64,
    ) -> Staircase {
        let splittings = splittings(settings, is_gluon);
        let ln_end_t = ln(rate.range.end_t_gev2);
        let span = (ln(largest_t_gev2) - ln_end_t).max(0.0);
        let count = (span / RUNG_HEIGHT) as usize + 1;
        let mut rungs: Vec<Rung> = Vec::with_capacity(count);
        for place in 0..count {
            let ln_t = ln_end_t + place as f64 * RUNG_HEIGHT;
            let mut rung = Rung::new(rate, &splittings, ln_t, settings.envelope_factor);
            rung.integral_below = rungs
                .last()
                .map_or(0.0, |below| below.integral_below + below.rate * RUNG_HEIGHT);
            rungs.push(rung);
        }
        Staircase {
            rungs,
            ln_end_t,
            range: rate.range,
        }
    }

    /// The height at which an evolution from `t_gev2` starts; `None` at or below the cutoff.
    #[inline]
    pub fn height(&self, t_gev2: f64) -> Option<Height> {
        if t_gev2 <= self.range.end_t_gev2 {
            return None;
        }
        let ln_t = ln(t_gev2);
        let rung =
            (((ln_t - self.ln_end_t) * (1.0 / RUNG_HEIGHT)) as usize).min(self.rungs.len() - 1);
        let step = &self.rungs[rung];
        Some(Height {
            integral: step.integral_below + step.rate * (ln_t - step.ln_t),
            rung,
        })
    }

    /// The next trial below `height` that lies in the exact range of fractions, `None` when the cutoff is reached.
    /// `height` moves down with it and `trials` counts every proposal.
    #[inline]
    pub fn propose(
        &self,
        height: &mut Height,
        stream: &mut Stream,
        trials: &mut u64,
    ) -> Option<Trial> {
        self.propose_times(1.0, height, stream, trials)
    }

    /// The same for `times` the envelope; the trial still carries one over the envelope itself.
    #[inline]
    pub fn propose_times(
        &self,
        times: f64,
        height: &mut Height,
        stream: &mut Stream,
        trials: &mut u64,
    ) -> Option<Trial> {
        loop {
            *trials += 1;
            let uniform: f64 = stream.sample(OpenClosed01);
            let integral = height.integral + ln(uniform) / times;
            height.integral = integral;
            if integral <= 0.0 {
                return None;
            }
            while integral < self.rungs[height.rung].integral_below {
                height.rung -= 1;
            }
            let rung = &self.rungs[height.rung];
            let t = exp(rung.ln_t + (integral - rung.integral_below) * rung.inverse_rate);
            let (e, cell) = rung.draw(stream.random());
            let kappa2 = e * (1.0 - e) * t;
            let (z, uniform) = unfold(e, cell.splitting, stream);
            if self.range.allows(z, kappa2) {
                let inverse_envelope = e * cell.inverse_bound;
                return Some(Trial {
                    t,
                    z,
                    splitting: cell.splitting,
                    uniform,
                    inverse_envelope,
                });
            }
        }
    }

    /// Integral of the envelope from the cutoff to `t_gev2`.
    #[cfg(test)]
    fn integral(&self, t_gev2: f64) -> f64 {
        self.height(t_gev2).map_or(0.0, |height| height.integral)
    }
}

/// The fraction z of the first daughter and the accept rule's uniform number, from one random word.
#[inline]
fn unfold(e: f64, splitting: Splitting, stream: &mut Stream) -> (f64, f64) {
    let word = stream.next_u64();
    let uniform = (word >> UNUSED_BITS) as f64 * UNIFORM_SPACING;
    let mirror = splitting == Splitting::QuarkToQuarkGluon || word & 1 == 1;
    (if mirror { 1.0 - e } else { e }, uniform)
}

impl Rung {
    fn new(rate: &VacuumRate, splittings: &[Splitting], ln_t: f64, envelope_factor: f64) -> Rung {
        let (low_t, high_t) = (exp(ln_t), exp(ln_t + RUNG_HEIGHT));
        let mut cells = Vec::new();
        let mut masses = Vec::new();
        for &splitting in splittings {
            for [low_e, high_e] in cell_edges(&rate.range, splitting, high_t) {
                let bound = cell_bound(rate, splitting, [low_t, high_t], [low_e, high_e]);
                // A soft fraction e next to 1 - e is only known to the spacing of doubles there.
                let margin = ROUNDING_MARGIN + CANCELLATION_ULPS * f64::EPSILON / low_e;
                let bound = bound * envelope_factor * (1.0 + margin);
                let (ln_e, width) = (ln(low_e), ln(high_e / low_e));
                masses.push(bound / TAU * width);
                // Half of a folded density lies on each of the two mirror images.
                let images = if splitting == Splitting::QuarkToQuarkGluon {
                    1.0
                } else {
                    2.0
                };
                cells.push(Cell {
                    keep: 1.0,
                    alias: 0,
                    ln_e,
                    width,
                    inverse_bound: images / bound,
                    splitting,
                });
            }
        }
        let rate: f64 = masses.iter().sum();
        alias(&mut cells, &masses);
        // A rung without cells (all splittings off) is never entered from above, as its integral does not grow.
        Rung {
            integral_below: 0.0,
            rate,
            inverse_rate: 1.0 / rate,
            ln_t,
            cells,
        }
    }

    #[inline]
    fn draw(&self, uniform: f64) -> (f64, &Cell) {
        let scaled = uniform * self.cells.len() as f64;
        let column = scaled as usize;
        let place = scaled - column as f64;
        let own = &self.cells[column];
        let (cell, place) = if place < own.keep {
            (own, place / own.keep)
        } else {
            (
                &self.cells[own.alias],
                (place - own.keep) / (1.0 - own.keep),
            )
        };
        (exp(cell.ln_e + place * cell.width), cell)
    }
}

fn splittings(settings: &ShowerSettings, is_gluon: bool) -> Vec<Splitting> {
    let kernels = settings.kernels;
    let known = [
        (Splitting::QuarkToQuarkGluon, kernels.q_qg && !is_gluon),
        (Splitting::GluonToGluons, kernels.g_gg && is_gluon),
        (Splitting::GluonToQuarks, kernels.g_qq && is_gluon),
    ];
    known
        .into_iter()
        .filter(|(_, on)| *on)
        .map(|(splitting, _)| splitting)
        .collect()
}

/// Edges of the cells in e that cover the range at `high_t`, the widest of the rung.
fn cell_edges(range: &FractionRange, splitting: Splitting, high_t: f64) -> Vec<[f64; 2]> {
    let smallest = range.smallest(high_t);
    let largest = if splitting == Splitting::QuarkToQuarkGluon {
        1.0 - smallest
    } else {
        0.5
    };
    let width = ln(largest / smallest);
    let count = (width / CELL_WIDTH).ceil().max(1.0) as usize;
    let edge = |place: usize| match place {
        0 => smallest,
        last if last == count => largest,
        place => smallest * exp(width * place as f64 / count as f64),
    };
    (0..count)
        .map(|place| [edge(place), edge(place + 1)])
        .collect()
}

/// 2 pi times a bound on e times the (folded) density in a cell: the coupling never grows with its scale, and the
/// kernels' largest values lie at an end of the cell (proven below).
fn cell_bound(
    rate: &VacuumRate,
    splitting: Splitting,
    [low_t, high_t]: [f64; 2],
    [low_e, high_e]: [f64; 2],
) -> f64 {
    // e(1-e) is concave, so its least value in the cell lies at an end.
    let soft = (low_e * (1.0 - low_e)).min(high_e * (1.0 - high_e));
    let kappa2 = (soft * low_t).max(rate.range.smallest_kappa2_gev2());
    let alpha_s = rate
        .coupling
        .alpha_s(rate.coupling.scale_gev2(kappa2, low_t));
    alpha_s
        * folded_kernel(rate, splitting, high_t, low_e)
            .max(folded_kernel(rate, splitting, high_t, high_e))
}

/// e times the kernel as a function of the soft fraction e, both mirror images of a gluon's splitting together.
///
/// q -> q g: C_F (1 + (1-e)^2) falls. g -> g g: 2 C_A (1 - e(1-e))^2/(1-e), whose logarithmic derivative
/// 1/(1-e) - 2(1-2e)/(1-e+e^2) rises on [0, 1/2], so it has no inner maximum. g -> q qbar:
/// 2 T_R n e (e^2 + (1-e)^2) rises.
fn folded_kernel(rate: &VacuumRate, splitting: Splitting, t: f64, e: f64) -> f64 {
    let z = 1.0 - e;
    match splitting {
        Splitting::QuarkToQuarkGluon => C_F * (1.0 + z * z),
        Splitting::GluonToGluons => 2.0 * C_A * (1.0 - e * z) * (1.0 - e * z) / z,
        Splitting::GluonToQuarks => {
            2.0 * T_R * f64::from(rate.flavours.open(t)) * e * (e * e + z * z)
        }
    }
}

/// Fills the alias table of Walker's method (Vose's construction).
fn alias(cells: &mut [Cell], masses: &[f64]) {
    let mean = masses.iter().sum::<f64>() / masses.len() as f64;
    let mut shares: Vec<f64> = masses.iter().map(|mass| mass / mean).collect();
    let (mut small, mut large): (Vec<usize>, Vec<usize>) =
        (0..cells.len()).partition(|&cell| shares[cell] < 1.0);
    while let (Some(poor), Some(&rich)) = (small.pop(), large.last()) {
        cells[poor].keep = shares[poor];
        cells[poor].alias = rich;
        shares[rich] -= 1.0 - shares[poor];
        if shares[rich] < 1.0 {
            large.pop();
            small.push(rich);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::qcd::{CouplingLaw, CouplingSettings, Loops, ScaleArgument};
    use crate::random::{Key, Purpose};
    use crate::shower::{Kernels, Lifetime, Ordering};

    fn settings(z_range: ZRange, cutoff: f64) -> ShowerSettings {
        ShowerSettings {
            virtuality_cutoff_gev: cutoff,
            ordering: Ordering::Virtuality,
            z_range,
            lifetime: Lifetime::Exponential,
            kernels: Kernels {
                q_qg: true,
                g_gg: true,
                g_qq: true,
            },
            flavours: 5,
            flavour_opening: FlavourOpening::PairThreshold,
            envelope_factor: 1.0,
        }
    }
    use crate::shower::ZRange;

    fn rates() -> Vec<(VacuumRate, ShowerSettings)> {
        let mut rates = Vec::new();
        for z_range in [ZRange::Kinematic, ZRange::Constant { epsilon: 0.01 }] {
            for argument in [ScaleArgument::TransverseMomentum, ScaleArgument::Virtuality] {
                for loops in [Loops::One, Loops::Two] {
                    let settings = settings(z_range, 1.0);
                    let quark_masses_gev = [1.5, 4.75];
                    let law = CouplingLaw::Running {
                        loops,
                        alpha_s_mz: 0.118,
                        freeze_gev: 1.0,
                    };
                    let coupling = Coupling::new(&CouplingSettings {
                        law,
                        argument,
                        quark_masses_gev,
                    })
                    .unwrap();
                    let range = FractionRange {
                        end_t_gev2: 1.0,
                        kind: z_range,
                    };
                    let flavours = FlavourRule::new(&settings, quark_masses_gev);
                    rates.push((VacuumRate::new(coupling, range, flavours), settings));
                }
            }
        }
        rates
    }

    /// No trial's density exceeds its envelope, and the mean efficiency stays high.
    #[test]
    fn the_staircase_lies_above_the_density() {
        for (rate, settings) in rates() {
            for is_gluon in [false, true] {
                let stairs = Staircase::new(&rate, &settings, is_gluon, 1e4);
                let (mut trials, mut allowed, mut sum) = (0, 0, 0.0);
                for id in 0..20_000 {
                    let mut stream = Key::event(11, id).stream(Purpose::VACUUM);
                    let mut height = stairs.height(1e4).unwrap();
                    while let Some(trial) = stairs.propose(&mut height, &mut stream, &mut trials) {
                        let ratio = rate.density(&trial) * trial.inverse_envelope;
                        assert!(ratio > 0.0 && ratio <= 1.0, "{trial:?}: {ratio}");
                        assert!(trial.t >= 1.0 && trial.t <= 1e4);
                        (allowed, sum) = (allowed + 1, sum + ratio);
                    }
                }
                assert!(
                    sum / allowed as f64 > 0.6,
                    "efficiency {}",
                    sum / allowed as f64
                );
            }
        }
    }

    /// The number of trials above the cutoff is Poisson with the envelope's integral as its mean: mean and variance
    /// over 10^5 evolutions within 5 standard deviations (a bias of 1.5 % of the mean would be seen).
    #[test]
    fn trials_follow_the_integral_of_the_envelope() {
        let (rate, settings) = rates().swap_remove(0);
        let stairs = Staircase::new(&rate, &settings, true, 100.0);
        let expected = stairs.integral(100.0);
        let runs = 100_000;
        let mut total = 0u64;
        for id in 0..runs {
            let mut stream = Key::event(5, id).stream(Purpose::VACUUM);
            let mut height = stairs.height(100.0).unwrap();
            while stairs
                .propose(&mut height, &mut stream, &mut total)
                .is_some()
            {}
        }
        // Each evolution's last proposal falls below the cutoff.
        let found = (total - runs) as f64 / runs as f64;
        let error = (expected / runs as f64).sqrt();
        assert!(
            (found - expected).abs() < 5.0 * error,
            "{found} against {expected} +- {error}"
        );
    }
}
