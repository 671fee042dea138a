//! What the two spectra of soft gluons share: from a spectrum h(omega, kappa^2) to a change of the splitting rates.
//!
//! D = alpha_s/(2 pi) dt/t dz Delta P with, for a quark that emits omega = (1-z) E,
//!
//! Delta P = 4 C_F/(1-z) h(omega, kappa^2),   kappa^2 = z(1-z) t
//!
//! (the vacuum's soft gluon is h = 1/2: 2 C_F/(1-z)). For g -> g g either gluon is the emitted one, with half of the weight
//! each: Delta P = 1/2 [4 C_A/(1-z) h((1-z) E) + 4 C_A/z h(z E)]. The two parts are judged one by one: what is positive is
//! drawn, what is negative thins the vacuum; the total density is the same (Armesto, Cunqueiro, Salgado & Xiang 2008,
//! arXiv:0710.3073, for the spectrum as a change of the kernel; from memory).
//!
//! Bound: the trials are a Poisson process in (ln omega, ln kappa^2) with the intensity of a plane of cells, each as high as
//! h can be in it ([`super::emission_plane`]).

use super::bound::{Emission, EmissionLimits};
use super::emission_plane::{EmissionPlane, Region, SUPPORT};
use super::rate_effect::{Passage, Splitting};
use super::scaled_table::ScaledSpectrum;
use crate::numerics::elementary::{exp, ln};
use crate::qcd::kernels::{gluon_to_gluons, quark_to_quark_gluon};
use crate::qcd::{C_A, C_F};
use crate::random::Stream;

/// 4 C_R of Delta P.
const EMISSION_FACTOR: f64 = 4.0;

/// The scales of a spectrum for one parton: omega and kappa^2 where its variables are 1, and a factor on h.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Scales {
    /// omega at x = 1, GeV.
    pub omega_gev: f64,
    /// kappa^2 at y = 1, GeV^2.
    pub kappa2_gev2: f64,
    /// Factor on h.
    pub strength: f64,
}

impl Scales {
    /// Whether there is anything to emit.
    pub fn act(&self) -> bool {
        self.omega_gev > 0.0 && self.kappa2_gev2 > 0.0 && self.strength > 0.0
    }
}

fn casimir(is_gluon: bool) -> f64 {
    if is_gluon { C_A } else { C_F }
}

/// R of one image: the emitted gluon takes `fraction` of the parton's energy.
fn image<S: ScaledSpectrum>(
    spectrum: &S,
    scales: &Scales,
    passage: &Passage,
    splitting: &Splitting,
    fraction: f64,
) -> f64 {
    let Splitting { t_gev2, z, .. } = *splitting;
    let is_gluon = passage.species.is_gluon();
    let ln_x = ln(fraction * passage.energy_gev / scales.omega_gev);
    let ln_y = ln(z * (1.0 - z) * t_gev2 / scales.kappa2_gev2);
    let within = |[low, high]: [f64; 2], place| (low..high).contains(&place);
    if !within(SUPPORT.ln_x, ln_x) || !within(SUPPORT.ln_y, ln_y) {
        return 0.0;
    }
    let h = scales.strength * spectrum.value(ln_x, ln_y);
    let (share, kernel) = if is_gluon {
        (0.5, gluon_to_gluons(z))
    } else {
        (1.0, quark_to_quark_gluon(z))
    };
    share * EMISSION_FACTOR * casimir(is_gluon) / fraction * h / kernel
}

/// R of a trial of the effect's own channel.
pub fn relative_change<S: ScaledSpectrum>(
    spectrum: &S,
    scales: &Scales,
    passage: &Passage,
    splitting: &Splitting,
) -> f64 {
    image(
        spectrum,
        scales,
        passage,
        splitting,
        emitted_fraction(splitting),
    )
}

/// The negative parts of R at a vacuum trial.
pub fn negative_change<S: ScaledSpectrum>(
    spectrum: &S,
    scales: &Scales,
    passage: &Passage,
    splitting: &Splitting,
) -> f64 {
    let z = splitting.z;
    let second = image(spectrum, scales, passage, splitting, 1.0 - z).min(0.0);
    if passage.species.is_gluon() {
        second + image(spectrum, scales, passage, splitting, z).min(0.0)
    } else {
        second
    }
}

/// The fraction that the emitted gluon takes.
pub fn emitted_fraction(splitting: &Splitting) -> f64 {
    if splitting.emits_first {
        splitting.z
    } else {
        1.0 - splitting.z
    }
}

/// Draws the trials of one parton.
pub fn propose(
    plane: &EmissionPlane,
    scales: &Scales,
    passage: &Passage,
    limits: &EmissionLimits,
    stream: &mut Stream,
    emissions: &mut Vec<Emission>,
) {
    let energy = passage.energy_gev;
    let [least, most] = limits.fractions;
    let ln_scale = [ln(scales.omega_gev), ln(scales.kappa2_gev2)];
    let ln_energy = ln(energy);
    let region = Region {
        ln_x: [ln(least), ln(most)].map(|ln_fraction| ln_fraction + ln_energy - ln_scale[0]),
        // kappa^2 = e(1-e) t is below e t, and below omega^2 at small angles: lines of slope 1 and 2 in ln omega.
        below_slope_1: ln(limits.largest_t_gev2) - ln_energy + ln_scale[0] - ln_scale[1],
        below_slope_2: if limits.limit_to_small_angles {
            2.0 * ln_scale[0] - ln_scale[1]
        } else {
            f64::INFINITY
        },
        least_ln_y: ln(limits.least_kappa2_gev2) - ln_scale[1],
    };
    let intensity = EMISSION_FACTOR * casimir(passage.species.is_gluon()) * scales.strength;
    plane.draw_all(
        &region,
        limits.largest_rate * intensity,
        stream,
        |ln_x, ln_y, bound| {
            emissions.push(Emission {
                fraction: exp(ln_x + ln_scale[0] - ln_energy),
                kappa2_gev2: exp(ln_y + ln_scale[1]),
                density: intensity * bound,
            });
        },
    );
}
