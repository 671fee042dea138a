//! Partons of an event with their history: momentum at birth, exchanges, daughters, lifetime. Jets fly along z, so that
//! q is (px, py) and the plus momentum E + pz.

use spindrift::event::{Parton, Status};
use spindrift::medium::effects::EffectSettings;
use spindrift::qcd::{C_A, C_F, Species};
use spindrift::source::{Direction, SourceSettings};

use super::setup::{Setup, brick_with};

/// A parton with its history.
pub struct Way {
    pub row: usize,
    pub parton: Parton,
    /// Channel and four-momentum gained, in the record's order.
    pub gains: Vec<(u8, [f64; 4])>,
    /// Rows of its daughters.
    pub daughters: Option<[usize; 2]>,
    /// How long it lived, fm; infinite for a final one.
    pub life_fm: f64,
}

/// All partons of an event but the hard ones.
pub fn ways(rows: &[Parton]) -> Vec<Way> {
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
pub fn gain(row: &Parton) -> [f64; 4] {
    let sign = if row.status == Status::TakenFromMedium {
        1.0
    } else {
        -1.0
    };
    row.momentum_gev.map(|component| sign * component)
}

impl Way {
    /// At birth, before anything was exchanged.
    pub fn at_birth(&self) -> [f64; 4] {
        self.before(0)
    }

    /// Before the exchange of a number.
    pub fn before(&self, exchange: usize) -> [f64; 4] {
        let mut momentum = self.parton.momentum_gev;
        for (_, gain) in &self.gains[exchange..] {
            for (component, gain) in momentum.iter_mut().zip(gain) {
                *component -= gain;
            }
        }
        momentum
    }

    /// How long it was in a brick of a length, fm.
    pub fn inside_fm(&self, length_fm: f64) -> f64 {
        (length_fm - f64::from(self.parton.birth_fm[0]))
            .min(self.life_fm)
            .max(0.0)
    }

    pub fn is_final(&self) -> bool {
        self.daughters.is_none()
    }

    pub fn is_gluon(&self) -> bool {
        self.parton.pdg == Species::GLUON.pdg()
    }

    /// C_R/C_A.
    pub fn colour(&self) -> f64 {
        if self.is_gluon() { 1.0 } else { C_F / C_A }
    }
}

pub fn plus(momentum: [f64; 4]) -> f64 {
    momentum[3] + momentum[2]
}

pub fn minus(momentum: [f64; 4]) -> f64 {
    // E - pz by what it is the difference of, without cancellation, is not needed: jets are wide enough.
    momentum[3] - momentum[2]
}

/// A jet along z in a brick with effects.
pub fn along_z(
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

/// Energies of two daughters with the azimuth of their branching and k^2 = z(1-z) t.
pub fn massless_energies(mother: &Way, pair: [&Way; 2]) -> [f64; 2] {
    let z = f64::from(pair[0].parton.splitting_fraction);
    let t = f64::from(mother.parton.virtuality_squared_gev2);
    let [one, other] = pair.map(Way::at_birth);
    let settled = [0, 1].map(|i| (1.0 - z) * one[i] - z * other[i]);
    let size = settled[0].hypot(settled[1]);
    let k = settled.map(|component| component / size * (z * (1.0 - z) * t).sqrt());
    let momentum = mother.parton.momentum_gev;
    let energy = |share: f64, sign: f64| {
        let q = [0, 1].map(|i| share * momentum[i] + sign * k[i]);
        let plus = share * plus(momentum);
        0.5 * (plus + (q[0] * q[0] + q[1] * q[1]) / plus)
    };
    [energy(z, 1.0), energy(1.0 - z, -1.0)]
}
