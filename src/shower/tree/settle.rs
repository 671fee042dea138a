//! What becomes of a settled parton: its way to its vertex, its rows in the record, its place on the stack.

use rand::RngExt;
use rand_distr::OpenClosed01;

use std::f64::consts::TAU;

use super::{Node, Record, Settled, Walker};
use crate::event::{CHANNEL_FIRST_EFFECT, Parton, Status};
use crate::medium::Medium;
use crate::medium::effects::Flight;
use crate::numerics::elementary::ln;
use crate::qcd::HBAR_C_GEV_FM;
use crate::random::Purpose;
use crate::shower::evolution::Tools;
use crate::shower::kinematics::Place;
use crate::shower::leg::Branching;
use crate::shower::{Lifetime, Ordering};

/// A settled parton at the end of its way.
struct Flown {
    place: Place,
    momentum_gev: [f64; 4],
    t_gev2: f64,
}

impl Walker {
    /// Records a settled parton, and puts it on the stack if it branched.
    #[inline]
    pub(super) fn settle_one(
        &mut self,
        tools: Tools,
        parton: Settled,
        branching: Option<Branching>,
        leg: usize,
        record: &mut Record,
    ) {
        let t = match tools.settings.ordering {
            // Fractions only: light-like momenta along the jet.
            Ordering::Collinear => 0.0,
            Ordering::Virtuality | Ordering::Angular => {
                branching.map_or(0.0, |branching| branching.t)
            }
        };
        let mut flown = Flown {
            place: parton.place,
            momentum_gev: self.frame(parton.jet).momentum(&parton.place, t),
            t_gev2: branching.map_or(0.0, |branching| branching.t),
        };
        let (azimuth, vertex_fm, time_fm) = match &branching {
            None => ([1.0, 0.0], parton.birth_fm, f64::INFINITY),
            Some(branching) => self.geometry(tools, &parton, branching, flown.momentum_gev, leg),
        };
        self.exchanges.clear();
        if let Some(medium) = &tools.evolution.medium
            && !medium.paths().is_empty()
        {
            self.fly(tools, medium, &parton, leg, time_fm, &mut flown);
        }
        let is_final = branching.is_none();
        let mut row = parton.parent;
        if is_final || record.full_history {
            row = self.record_parton(&parton, &flown, is_final, record);
        }
        if !self.exchanges.is_empty() {
            let owner = if record.full_history {
                row
            } else {
                parton.parent
            };
            self.record_exchanges(&parton, owner, record);
        }
        if let Some(branching) = branching {
            self.stack.push(Node {
                species: parton.species,
                key: parton.key,
                branching: Branching {
                    t: flown.t_gev2,
                    ..branching
                },
                place: flown.place,
                jet_fraction: parton.jet_fraction,
                jet: parton.jet,
                vertex_fm,
                azimuth,
                colours: parton.colours,
                row,
            });
        }
    }

    fn record_parton(
        &self,
        parton: &Settled,
        flown: &Flown,
        is_final: bool,
        record: &mut Record,
    ) -> i32 {
        let row = (record.rows.len() - self.first_row) as i32;
        record.rows.push(Parton {
            momentum_gev: flown.momentum_gev,
            birth_fm: parton.birth_fm.map(|component| component as f32),
            virtuality_squared_gev2: flown.t_gev2 as f32,
            splitting_fraction: parton.splitting_fraction as f32,
            jet_fraction: parton.jet_fraction as f32,
            pdg: parton.species.pdg(),
            parent: parton.parent,
            colour: parton.colours[0],
            anticolour: parton.colours[1],
            status: if is_final {
                Status::Final
            } else {
                Status::Branched
            },
            channel: parton.channel,
        });
        row
    }

    /// Lets the effects on paths act on a parton on its way to its vertex, and notes what each exchanged.
    fn fly(
        &mut self,
        tools: Tools,
        medium: &Medium,
        parton: &Settled,
        leg: usize,
        time_fm: f64,
        flown: &mut Flown,
    ) {
        let is_final = time_fm.is_infinite();
        let Some(journey) = self.legs[leg].journey(medium, time_fm, is_final) else {
            return;
        };
        let frame = self.frames[parton.jet]
            .as_ref()
            .expect("a jet has its frame before it has daughters");
        let mut flight = Flight {
            plus_gev: parton.place.fraction * frame.plus_gev(),
            transverse_gev: parton.place.transverse_gev,
            t_gev2: flown.t_gev2,
        };
        for (path, purpose) in medium.paths().iter().zip(&tools.evolution.path_purposes) {
            let before = flight;
            let mut stream = parton.key.stream(*purpose);
            let is_inside = path.effect.act(&journey, &mut flight, &mut stream);
            let counters = &mut self.tally.counters.channels[path.place + 1];
            counters.accepted += 1;
            counters.outside_regime += !is_inside as u64;
            if flight != before {
                let earlier = flown.momentum_gev;
                *flown = Flown {
                    place: Place {
                        fraction: flight.plus_gev / frame.plus_gev(),
                        transverse_gev: flight.transverse_gev,
                    },
                    t_gev2: flight.t_gev2,
                    momentum_gev: [0.0; 4],
                };
                flown.momentum_gev = frame.momentum(&flown.place, flown.t_gev2);
                let gain = std::array::from_fn(|i| flown.momentum_gev[i] - earlier[i]);
                self.exchanges.push((path.place, gain));
            }
        }
    }

    /// One row for each effect that exchanged four-momentum with a parton: taken from the medium where the energy is
    /// positive, else given to it.
    fn record_exchanges(&self, parton: &Settled, owner: i32, record: &mut Record) {
        for (place, gain) in &self.exchanges {
            let taken = gain[3] > 0.0;
            let sign = if taken { 1.0 } else { -1.0 };
            let momentum_gev = gain.map(|component| sign * component);
            let [px, py, pz, energy] = momentum_gev;
            let invariant = energy * energy - px * px - py * py - pz * pz;
            record.rows.push(Parton {
                momentum_gev,
                birth_fm: parton.birth_fm.map(|component| component as f32),
                virtuality_squared_gev2: invariant as f32,
                splitting_fraction: 0.0,
                jet_fraction: 0.0,
                pdg: 0,
                parent: owner,
                colour: 0,
                anticolour: 0,
                status: if taken {
                    Status::TakenFromMedium
                } else {
                    Status::GivenToMedium
                },
                channel: CHANNEL_FIRST_EFFECT + *place as u8,
            });
        }
    }

    /// Azimuth (cosine and sine), vertex and time of flight (fm) of a branching.
    fn geometry(
        &self,
        tools: Tools,
        parton: &Settled,
        branching: &Branching,
        momentum: [f64; 4],
        leg: usize,
    ) -> ([f64; 2], [f64; 4], f64) {
        let mut stream = parton.key.stream(Purpose::GEOMETRY);
        let (sin, cos) = libm::sincos(TAU * stream.random::<f64>());
        let uniform: f64 = stream.sample(OpenClosed01);
        let mean_fm = 2.0 * momentum[3] / branching.t * HBAR_C_GEV_FM;
        let induced_fm = self.legs[leg].induced_vertex_fm(tools, branching, parton.key);
        let time_fm = induced_fm.unwrap_or_else(|| match tools.settings.lifetime {
            Lifetime::Exponential => -ln(uniform) * mean_fm,
            Lifetime::Mean => mean_fm,
        });
        let per_energy = time_fm / momentum[3];
        let [t, x, y, z] = parton.birth_fm;
        let [px, py, pz, _] = momentum;
        let vertex_fm = [
            t + time_fm,
            x + px * per_energy,
            y + py * per_energy,
            z + pz * per_energy,
        ];
        ([cos, sin], vertex_fm, time_fm)
    }
}
