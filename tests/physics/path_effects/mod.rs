//! Proves: what effects on paths do to settled partons, and that every exchange with the medium is booked.
//!
//! Everything is read from whole events with their full history: a parton's row holds its momentum at the end of its
//! way, the exchange rows behind it what each effect gave or took, its daughters' birth its lifetime. So the momentum
//! at birth and the path inside the medium are known for each parton, and with them what is expected of it. Jets fly
//! along z: q is (px, py), plus momentum E + pz.
//!
//! See `broadening`, `drag`, `virtuality_diffusion` for the laws, `exchanges` for order, rows and conservation.

mod broadening;
mod drag;
mod exchanges;
mod virtuality_diffusion;

use spindrift::event::{Parton, Status};
use spindrift::medium::effects::EffectSettings;
use spindrift::qcd::{C_A, C_F, Species};
use spindrift::source::{Direction, SourceSettings};

use super::support::setup::{Setup, brick_with, effect};

/// Channel number of the first effect.
const FIRST_CHANNEL: u8 = 2;
const TEMPERATURE_GEV: f64 = 0.3;

/// A parton with its history.
struct Way {
    row: usize,
    parton: Parton,
    /// Channel and four-momentum gained, in the record's order.
    gains: Vec<(u8, [f64; 4])>,
    /// Rows of its daughters.
    daughters: Option<[usize; 2]>,
    /// How long it lived, fm; infinite for a final one.
    life_fm: f64,
}

/// All partons of an event but the hard ones.
fn ways(rows: &[Parton]) -> Vec<Way> {
    let mut place = vec![usize::MAX; rows.len()];
    let mut ways: Vec<Way> = Vec::new();
    for (row, parton) in rows.iter().enumerate() {
        match parton.status {
            Status::Hard => {}
            Status::Final | Status::Branched => {
                place[row] = ways.len();
                ways.push(Way {
                    row,
                    parton: *parton,
                    gains: Vec::new(),
                    daughters: None,
                    life_fm: f64::INFINITY,
                });
                let parent = place[parton.parent as usize];
                if parent == usize::MAX {
                    continue;
                }
                let parent = &mut ways[parent];
                parent.life_fm =
                    f64::from(parton.birth_fm[0]) - f64::from(parent.parton.birth_fm[0]);
                parent.daughters = match parent.daughters {
                    None => Some([row, row]),
                    Some([first, _]) => Some([first, row]),
                };
            }
            Status::GivenToMedium | Status::TakenFromMedium => {
                let way = &mut ways[place[parton.parent as usize]];
                way.gains.push((parton.channel, gain(parton)));
            }
        }
    }
    ways
}

/// The four-momentum that an exchange row gave to its parton.
fn gain(row: &Parton) -> [f64; 4] {
    let sign = if row.status == Status::TakenFromMedium {
        1.0
    } else {
        -1.0
    };
    row.momentum_gev.map(|component| sign * component)
}

impl Way {
    /// At birth, before anything was exchanged.
    fn at_birth(&self) -> [f64; 4] {
        self.before(0)
    }

    /// Before the exchange of a number.
    fn before(&self, exchange: usize) -> [f64; 4] {
        let mut momentum = self.parton.momentum_gev;
        for (_, gain) in &self.gains[exchange..] {
            for (component, gain) in momentum.iter_mut().zip(gain) {
                *component -= gain;
            }
        }
        momentum
    }

    /// How long it was in a brick of a length, fm.
    fn inside_fm(&self, length_fm: f64) -> f64 {
        (length_fm - f64::from(self.parton.birth_fm[0]))
            .min(self.life_fm)
            .max(0.0)
    }

    fn is_final(&self) -> bool {
        self.daughters.is_none()
    }

    fn is_gluon(&self) -> bool {
        self.parton.pdg == Species::GLUON.pdg()
    }

    /// C_R/C_A.
    fn colour(&self) -> f64 {
        if self.is_gluon() { 1.0 } else { C_F / C_A }
    }
}

fn plus(momentum: [f64; 4]) -> f64 {
    momentum[3] + momentum[2]
}

fn minus(momentum: [f64; 4]) -> f64 {
    // E - pz by what it is the difference of, without cancellation, is not needed: jets are wide enough.
    momentum[3] - momentum[2]
}

/// A jet along z in a brick with effects.
fn along_z(
    parton: Species,
    energy_gev: f64,
    start_virtuality_gev: f64,
    length_fm: f64,
    qhat: f64,
    effects: Vec<EffectSettings>,
) -> Setup {
    let mut setup = Setup::single(parton, energy_gev, start_virtuality_gev)
        .with_medium(brick_with(length_fm, qhat, effects));
    let SourceSettings::Single(single) = &mut setup.source else {
        panic!("a single parton")
    };
    single.direction = Direction::Along([0.0, 0.0, 1.0]);
    setup
}

fn plain(kind: &str) -> EffectSettings {
    effect(kind, &[])
}

/// A number of f32 near `value` is off by at most this.
fn rounding(value: f64) -> f64 {
    0.5 * f64::from(f32::EPSILON) * value.abs()
}
