//! The density of binary collisions of two smooth nuclei, T(|s + b/2|) T(|s - b/2|), the impact parameter b along +x
//! (Miller, Reygers, Sanders & Steinberg 2007, nucl-ex/0701025). T is that of [`super::thickness`].
//!
//! Sampling: a grid of cells covers both nuclei up to 25 diffusenesses beyond their radii, with less than 1e-9 of
//! the density outside. Since T falls with the distance from the centre of its nucleus, the product of its values at the
//! points of a cell nearest to either centre bounds the density in the cell: a piecewise-constant envelope, from which
//! rejection draws exactly.

use rand::RngExt;

use super::chooser::Chooser;
use super::plane::Plane;
use super::thickness::Thickness;
use super::{Nucleus, Origin, OriginError};
use crate::random::Stream;

/// What lies further out than this many diffusenesses beyond the radius is left out of the sampled region.
const TAIL_DIFFUSENESSES: f64 = 25.0;
/// Nuclei that are further apart than their radii and this many diffusenesses each do not meet.
const REACH_DIFFUSENESSES: f64 = 20.0;
/// Cells over a diffuseness.
const CELLS_PER_DIFFUSENESS: f64 = 3.0;
/// Most cells along an axis.
const MOST_CELLS: f64 = 400.0;
/// Lifts the envelope over the rounding of the density.
const ROUNDING: f64 = 1e-9;

/// Two nuclei that overlap.
#[derive(Clone, Debug)]
pub struct Overlap {
    thickness: Thickness,
    half_impact_fm: f64,
    /// ln of what the density is divided by while it is sampled: its envelope's maximum.
    ln_scale: f64,
    x: Cells,
    y: Cells,
    envelope: Vec<f64>,
    chooser: Chooser,
}

/// Equal cells from -half to half.
#[derive(Clone, Copy, Debug)]
struct Cells {
    first_fm: f64,
    width_fm: f64,
    count: usize,
}

impl Cells {
    fn new(half_fm: f64, width_fm: f64) -> Cells {
        let count = (2.0 * half_fm / width_fm).ceil().clamp(1.0, MOST_CELLS) as usize;
        Cells {
            first_fm: -half_fm,
            width_fm: 2.0 * half_fm / count as f64,
            count,
        }
    }

    fn place(&self, cell: usize, share: f64) -> f64 {
        self.first_fm + (cell as f64 + share) * self.width_fm
    }

    /// The point of a cell nearest to a coordinate.
    fn nearest(&self, cell: usize, coordinate: f64) -> f64 {
        coordinate.clamp(self.place(cell, 0.0), self.place(cell, 1.0))
    }
}

impl Overlap {
    /// The largest impact parameter at which two such nuclei meet, fm.
    pub fn largest_impact_fm(nucleus: &Nucleus) -> f64 {
        2.0 * (nucleus.radius_fm + REACH_DIFFUSENESSES * nucleus.diffuseness_fm)
    }

    /// Two equal nuclei at an impact parameter in fm.
    ///
    /// # Errors
    /// [`OriginError::Nucleus`] and [`OriginError::ImpactParameter`] for numbers out of range.
    pub fn new(nucleus: &Nucleus, impact_parameter_fm: f64) -> Result<Overlap, OriginError> {
        nucleus.check()?;
        let reach = |diffusenesses| nucleus.radius_fm + diffusenesses * nucleus.diffuseness_fm;
        let most_fm = Overlap::largest_impact_fm(nucleus);
        if !(0.0..=most_fm).contains(&impact_parameter_fm) {
            return Err(OriginError::ImpactParameter {
                value_fm: impact_parameter_fm,
                most_fm,
            });
        }
        let half_impact_fm = 0.5 * impact_parameter_fm;
        let half_fm = reach(TAIL_DIFFUSENESSES);
        let width_fm = nucleus.diffuseness_fm / CELLS_PER_DIFFUSENESS;
        // Beyond the far side of one nucleus the other one is thinner still.
        let x = Cells::new(half_fm.max(half_impact_fm), width_fm);
        let y = Cells::new(half_fm, width_fm);
        let thickness = Thickness::new(nucleus);
        let ln_envelope = |cell: usize| {
            let (column, row) = (cell / y.count, cell % y.count);
            let y_fm = y.nearest(row, 0.0);
            let ln_of = |centre: f64| {
                thickness.ln_at(libm::hypot(x.nearest(column, centre) - centre, y_fm))
            };
            ln_of(half_impact_fm) + ln_of(-half_impact_fm)
        };
        let mut envelope: Vec<f64> = (0..x.count * y.count).map(ln_envelope).collect();
        let ln_scale = envelope.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        for value in &mut envelope {
            *value = libm::exp(*value - ln_scale) * (1.0 + ROUNDING);
        }
        let chooser = Chooser::new(&envelope).expect("the largest cell has envelope 1");
        Ok(Overlap {
            thickness,
            half_impact_fm,
            ln_scale,
            x,
            y,
            envelope,
            chooser,
        })
    }

    /// The density of collisions a pair of nucleons at a place, fm^-4: times both mass numbers and the cross section of
    /// two nucleons it is the density of binary collisions.
    pub fn density_per_fm4(&self, place_fm: [f64; 2]) -> f64 {
        libm::exp(self.ln_density(place_fm))
    }

    /// Number of collisions a pair of nucleons and cross section, int T T d^2s, fm^-2.
    pub fn integral_per_fm2(&self) -> f64 {
        let area = self.x.width_fm * self.y.width_fm;
        self.centres().map(|(_, density)| density).sum::<f64>() * area * libm::exp(self.ln_scale)
    }

    /// Centre and event plane of the density.
    pub fn plane(&self) -> Plane {
        Plane::of(self.centres()).expect("the density is positive")
    }

    /// Centres of the cells, with the density there over its scale. (The rectangle rule converges exponentially for a
    /// smooth function that vanishes at the rim.)
    fn centres(&self) -> impl Iterator<Item = ([f64; 2], f64)> {
        (0..self.envelope.len()).map(|cell| {
            let (column, row) = (cell / self.y.count, cell % self.y.count);
            let place = [self.x.place(column, 0.5), self.y.place(row, 0.5)];
            (place, libm::exp(self.ln_density(place) - self.ln_scale))
        })
    }

    fn ln_density(&self, [x, y]: [f64; 2]) -> f64 {
        let ln_of = |centre: f64| self.thickness.ln_at(libm::hypot(x - centre, y));
        ln_of(self.half_impact_fm) + ln_of(-self.half_impact_fm)
    }
}

impl Origin for Overlap {
    fn draw(&self, stream: &mut Stream) -> [f64; 2] {
        loop {
            let cell = self.chooser.draw(stream);
            let (column, row) = (cell / self.y.count, cell % self.y.count);
            let place = [
                self.x.place(column, stream.random()),
                self.y.place(row, stream.random()),
            ];
            let level = self.envelope[cell] * stream.random::<f64>();
            if level < libm::exp(self.ln_density(place) - self.ln_scale) {
                return place;
            }
        }
    }
}
