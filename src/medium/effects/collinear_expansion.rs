//! Medium-induced splitting in the collinear (higher-twist) expansion.
//!
//! D = f_vac R with
//!
//! R(t, z) = 1/(z(1-z) t) int_0^{l_max} dl qhat(l) K(l/tau_f),   tau_f = 2 E/t,
//!
//! qhat being the gluon's (Guo & Wang 2000, hep-ph/0005044; Wang & Guo 2001, hep-ph/0102230; Majumder 2009,
//! arXiv:0901.4516; further terms of the expansion: Aurenche, Zakharov & Zaraket 2008, arXiv:0804.4282; all from
//! memory, the algebra below checked numerically). With phi = l/tau_f the phase factor is one of
//!
//! - interference: K_a = 2 - 2 cos phi, in [0, 4];
//! - rescattering: K_b = K_a - 2 phi sin phi + 2 phi^2 cos phi, unbounded in phi and negative beyond 1.2417, so cut at
//!   a window not larger than that;
//! - soft-gradient: K_c = K_a - 2 phi sin phi, negative below 2.33112: there it thins the vacuum channel.
//!
//! Regime: one scattering that gives a splitting its phase, soft on the scale of kappa^2 = z(1-z) t (R of order 1 or
//! less); emissions at small angles (kappa < omega).
//!
//! Envelopes: K_a <= min(4, phi^2), so R z(1-z) <= min(4 I0/t, I2 t/(2E)^2). K_b = phi^2 - (3/4) phi^4 + ... lies below
//! phi^2 and below its maximum over the window. max(K_c, 0) <= 4 + 2 phi, so R z(1-z) <= 4 I0/t + 2 I1/(2E), bounded by
//! twice the larger term. (hbar c restored throughout.)

use rand::RngExt;

use super::rate_effect::{Passage, RateEffect, Splitting};
use super::{Effect, EffectSettings, Model, Physics, PowerLaw, RateBound};
use crate::medium::path::Path;
use crate::parameters::{Choice, Form, Key, Range, Setting, Values, When};
use crate::qcd::HBAR_C_GEV_FM;
use crate::random::Stream;

/// The registry's entry.
pub static MODEL: Model = Model {
    kind: "collinear-expansion",
    about: "induced emission in the collinear (higher-twist) expansion",
    keys: &[
        Key::default(
            "phase",
            Form::Choice(&[
                Choice::built("interference", "2 - 2 cos(phi)"),
                Choice::built(
                    "rescattering",
                    "2 - 2 cos(phi) - 2 phi sin(phi) + 2 phi^2 cos(phi), up to the window",
                ),
                Choice::built(
                    "soft-gradient",
                    "2 - 2 cos(phi) - 2 phi sin(phi), negative at small phi",
                ),
            ]),
            "\"interference\"",
            "Phase factor, with phi the path over the formation time.",
        ),
        Key::default(
            "window",
            Form::Number(Range::above(0.0, LARGEST_WINDOW)),
            "1.0",
            "Largest phase phi, in units of the formation time; the factor turns negative beyond 1.2417.",
        )
        .when(&[When {
            key: "phase",
            is: &["rescattering"],
        }]),
        Key::default(
            "pair_production",
            Form::Flag,
            "false",
            "Whether the medium also induces g -> q qbar.",
        ),
    ],
    describes: &[Physics::InducedEmission],
    regime: "one scattering that gives a splitting its phase: within a formation time the medium gives less transverse \
             momentum squared than the splitting has",
    build,
};

fn build(name: String, values: &Values) -> Effect {
    let phase = match values.word("phase") {
        "interference" => PhaseSettings::Interference,
        "soft-gradient" => PhaseSettings::SoftGradient,
        _ => PhaseSettings::Rescattering {
            window: values.number("window"),
        },
    };
    let pairs = values.flag("pair_production");
    Effect::Rate(Box::new(CollinearExpansion::new(name, phase, pairs)))
}

/// Phase factors of the collinear expansion.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum PhaseSettings {
    /// K_a = 2 - 2 cos phi.
    Interference,
    /// K_b = K_a - 2 phi sin phi + 2 phi^2 cos phi, cut at phi = `window`.
    Rescattering {
        /// In units of the formation time, at most 1.2417.
        window: f64,
    },
    /// K_c = K_a - 2 phi sin phi.
    SoftGradient,
}

impl From<PhaseSettings> for EffectSettings {
    fn from(phase: PhaseSettings) -> EffectSettings {
        let word = |word| ("phase", Setting::Word(word));
        match phase {
            PhaseSettings::Interference => EffectSettings::new(&MODEL, &[word("interference")]),
            PhaseSettings::SoftGradient => EffectSettings::new(&MODEL, &[word("soft-gradient")]),
            PhaseSettings::Rescattering { window } => {
                let window = ("window", Setting::Number(window));
                EffectSettings::new(&MODEL, &[word("rescattering"), window])
            }
        }
    }
}

/// The largest window, in formation times, inside which K_b is not negative.
pub const LARGEST_WINDOW: f64 = 1.2417;

/// Below this phase over the whole path the closed forms cancel: power series there.
const SMALL_PHASE: f64 = 0.05;
/// Terms of the series of K_b; the first one left out is below 10^-12 of phi^2 inside the largest window.
const SERIES_TERMS: usize = 10;
/// Below this phase K = phi^2 to the last bit but one.
const TINY_PHASE: f64 = 1e-7;
/// Draws of a vertex before the last one is taken as it is: more than any accepted rate can need.
const MOST_DRAWS: u32 = 1 << 20;
/// Steps of the search for the maximum of K_b over its window.
const MAXIMUM_SEARCH_STEPS: usize = 2000;

/// The effect `collinear-expansion`.
#[derive(Clone, Debug)]
pub struct CollinearExpansion {
    name: String,
    phase: Phase,
    pair_production: bool,
}

#[derive(Clone, Debug)]
enum Phase {
    Interference,
    Rescattering {
        window: f64,
        largest: f64,
        series: [f64; SERIES_TERMS],
    },
    SoftGradient,
}

impl CollinearExpansion {
    /// The effect under a name that is unique in the run.
    pub fn new(name: String, phase: PhaseSettings, pair_production: bool) -> CollinearExpansion {
        let phase = match phase {
            PhaseSettings::Interference => Phase::Interference,
            PhaseSettings::SoftGradient => Phase::SoftGradient,
            PhaseSettings::Rescattering { window } => Phase::Rescattering {
                window,
                largest: largest_rescattering(window),
                series: std::array::from_fn(|place| rescattering_coefficient(place + 1)),
            },
        };
        CollinearExpansion {
            name,
            phase,
            pair_production,
        }
    }

    /// int dl qhat(l) K(k l) over a path, GeV^2, k = 1/tau_f per fm: R z(1-z) t.
    pub fn strength_gev2(&self, path: &Path, k_per_fm: f64) -> f64 {
        let (i0, i2) = (path.qhat_integral_gev2(), path.second_moment_gev2_fm2());
        let (k2, i4) = (k_per_fm * k_per_fm, path.fourth_moment_gev2_fm4());
        let small = k_per_fm * path.end_fm() < SMALL_PHASE;
        match &self.phase {
            // K_a = phi^2 - phi^4/12 + ...
            Phase::Interference if small => k2 * (i2 - k2 * i4 / 12.0),
            Phase::Interference => 2.0 * (i0 - path.transform(k_per_fm).cosine),
            // K_c = -phi^2 + phi^4/4 - ...
            Phase::SoftGradient if small => k2 * (k2 * i4 / 4.0 - i2),
            Phase::SoftGradient => {
                let transform = path.transform(k_per_fm);
                2.0 * (i0 - transform.cosine + transform.cosine_slope)
            }
            Phase::Rescattering { window, series, .. } => {
                path.power_series(k_per_fm, window / k_per_fm, series)
            }
        }
    }

    /// K(phi), 0 beyond the window.
    fn phase_factor(&self, phi: f64) -> f64 {
        match self.phase {
            Phase::Interference => interference(phi),
            Phase::SoftGradient => interference(phi) - 2.0 * phi * libm::sin(phi),
            Phase::Rescattering { window, .. } if phi > window => 0.0,
            Phase::Rescattering { .. } => rescattering(phi),
        }
    }

    /// A bound on K(phi)/min(1, phi^2/4) over phi up to `last_phase`, for drawing vertices.
    fn largest_over_envelope(&self, last_phase: f64) -> f64 {
        match self.phase {
            // K <= min(4, phi^2) = 4 min(1, phi^2/4), for K_b too.
            Phase::Interference | Phase::Rescattering { .. } => 4.0,
            // K_c is positive only above phi = 2, where it lies below 4 + 2 phi.
            Phase::SoftGradient => 4.0 + 2.0 * last_phase,
        }
    }
}

/// 1/tau_f = t/(2 E hbar c), per fm.
pub fn wave_number_per_fm(t_gev2: f64, energy_gev: f64) -> f64 {
    t_gev2 / (2.0 * energy_gev * HBAR_C_GEV_FM)
}

fn interference(phi: f64) -> f64 {
    let half = libm::sin(0.5 * phi);
    4.0 * half * half
}

fn rescattering(phi: f64) -> f64 {
    interference(phi) - 2.0 * phi * libm::sin(phi) + 2.0 * phi * phi * libm::cos(phi)
}

/// The coefficient of phi^(2n) in K_b: 2 (-1)^(n+1) (1 - 2n + 2n(2n-1))/(2n)!.
fn rescattering_coefficient(n: usize) -> f64 {
    let even = 2.0 * n as f64;
    let factorial: f64 = (1..=2 * n).map(|factor| factor as f64).product();
    let sign = if n % 2 == 1 { 1.0 } else { -1.0 };
    2.0 * sign * (1.0 - even + even * (even - 1.0)) / factorial
}

/// The maximum of K_b on [0, window], from above: |K_b'| = |2 phi cos phi - 2 phi^2 sin phi| <= 2 phi (1 + phi), so
/// between two points of the grid K_b rises by at most that slope times a step.
fn largest_rescattering(window: f64) -> f64 {
    let step = window / MAXIMUM_SEARCH_STEPS as f64;
    let on_grid = (0..=MAXIMUM_SEARCH_STEPS)
        .map(|place| rescattering(place as f64 * step))
        .fold(0.0, f64::max);
    on_grid + 2.0 * window * (1.0 + window) * step
}

impl CollinearExpansion {
    fn soft_gradient(&self) -> bool {
        matches!(self.phase, Phase::SoftGradient)
    }

    /// Whether the bound at t is the one that falls with the square of the phase.
    fn is_short(&self, passage: &Passage, k_per_fm: f64) -> bool {
        let path = &passage.trace.path;
        let largest = match self.phase {
            Phase::Rescattering { largest, .. } => largest,
            _ => 4.0,
        };
        k_per_fm * k_per_fm * path.second_moment_gev2_fm2() < largest * path.qhat_integral_gev2()
    }

    /// K(phi)/phi^2.
    fn phase_factor_over_square(&self, phi: f64) -> f64 {
        if phi < TINY_PHASE {
            1.0
        } else {
            self.phase_factor(phi) / (phi * phi)
        }
    }

    /// Density qhat(l) max(K(l/tau_f), 0).
    fn draw_by_integrand(&self, passage: &Passage, t_gev2: f64, stream: &mut Stream) -> f64 {
        let path = &passage.trace.path;
        let k_per_fm = wave_number_per_fm(t_gev2, passage.energy_gev);
        let last_phase = k_per_fm * path.end_fm();
        let short = last_phase < 2.0;
        let largest = self.largest_over_envelope(last_phase);
        let mut l = path.end_fm();
        for _ in 0..MOST_DRAWS {
            l = if short {
                path.draw_by_qhat_l2(stream)
            } else {
                path.draw_by_qhat(stream)
            };
            let phi = k_per_fm * l;
            let envelope = if short { 0.25 * phi * phi } else { 1.0 };
            if stream.random::<f64>() * largest * envelope < self.phase_factor(phi) {
                break;
            }
        }
        l
    }
}

impl RateEffect for CollinearExpansion {
    fn name(&self) -> &str {
        &self.name
    }

    fn bound(&self, passage: &Passage) -> RateBound {
        let path = &passage.trace.path;
        let k_at_one = wave_number_per_fm(1.0, passage.energy_gev);
        let quadratic = k_at_one * k_at_one * path.second_moment_gev2_fm2();
        let flat = path.qhat_integral_gev2();
        let law = |coefficient, power| PowerLaw { coefficient, power };
        match self.phase {
            Phase::Interference => RateBound::LeastOf(law(4.0 * flat, -1), law(quadratic, 1)),
            Phase::Rescattering { largest, .. } => {
                RateBound::LeastOf(law(largest * flat, -1), law(quadratic, 1))
            }
            Phase::SoftGradient => {
                let rising = 2.0 * k_at_one * path.first_moment_gev2_fm();
                RateBound::GreatestOf(law(2.0 * 4.0 * flat, -1), law(2.0 * rising, 0))
            }
        }
    }

    fn needs_whole_path(&self) -> bool {
        self.soft_gradient()
    }

    fn propose_place_fm(&self, passage: &Passage, t_gev2: f64, stream: &mut Stream) -> f64 {
        let path = &passage.trace.path;
        if self.soft_gradient() {
            0.0
        } else if self.is_short(passage, wave_number_per_fm(t_gev2, passage.energy_gev)) {
            path.draw_by_qhat_l2(stream)
        } else {
            path.draw_by_qhat(stream)
        }
    }

    /// The integrand at the place over the density that the place was drawn with.
    fn relative_change(&self, passage: &Passage, splitting: &Splitting) -> f64 {
        let Splitting {
            t_gev2,
            z,
            place_fm,
            ..
        } = *splitting;
        let k_per_fm = wave_number_per_fm(t_gev2, passage.energy_gev);
        let path = &passage.trace.path;
        let strength = if self.soft_gradient() {
            self.strength_gev2(path, k_per_fm)
        } else {
            let phi = k_per_fm * place_fm;
            if self.is_short(passage, k_per_fm) {
                let phase = self.phase_factor_over_square(phi);
                k_per_fm * k_per_fm * path.second_moment_gev2_fm2() * phase
            } else {
                path.qhat_integral_gev2() * self.phase_factor(phi)
            }
        };
        strength / (z * (1.0 - z) * t_gev2)
    }

    fn thins_the_vacuum(&self) -> bool {
        self.soft_gradient()
    }

    fn negative_change(&self, passage: &Passage, splitting: &Splitting) -> f64 {
        self.relative_change(passage, splitting).min(0.0)
    }

    fn vertex_fm(
        &self,
        passage: &Passage,
        splitting: &Splitting,
        stream: &mut Stream,
    ) -> Option<f64> {
        Some(if self.soft_gradient() {
            self.draw_by_integrand(passage, splitting.t_gev2, stream)
        } else {
            splitting.place_fm
        })
    }

    fn makes_quark_pairs(&self) -> bool {
        self.pair_production
    }

    /// More transverse momentum than its own comes from the medium within a formation time.
    fn is_outside_regime(&self, passage: &Passage, splitting: &Splitting) -> bool {
        let Splitting {
            t_gev2,
            z,
            place_fm,
            ..
        } = *splitting;
        let formation_fm = 1.0 / wave_number_per_fm(t_gev2, passage.energy_gev);
        let bound = passage.trace.path.qhat_gev2_per_fm(place_fm);
        let kappa2_gev2 = z * (1.0 - z) * t_gev2;
        // Where even the bound is soft enough the point need not be looked up.
        bound * formation_fm > kappa2_gev2
            && bound * passage.share_of_bound(place_fm) * formation_fm > kappa2_gev2
    }
}
