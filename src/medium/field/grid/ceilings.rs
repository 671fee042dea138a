//! Rigorous bounds of temperature and flow over segments of a ray, from a coarse table of block maxima.
//!
//! **The box of a segment.** Along a light-like ray x and y are linear in the distance; tau never falls (its derivative
//! is c = (t - nz z)/tau >= 0 in the forward light cone); eta is monotone, as d tanh eta/dl = (nz t - z)/t^2 and
//! nz t - z is constant. So a segment lies in the box between its ends. And c >= sqrt(1 - nz^2) >= |nx|, |ny|: the box
//! is nowhere longer than in tau.
//!
//! **One look-up a segment.** Equal blocks cover each axis of the kept grid. A block's entry bounds the values at all
//! grid points of all cells that touch the block widened by half a `reach` on every side. Multilinear interpolation
//! gives a mean of a cell's corners, so the entry bounds the field in the widened block. A segment whose box is no longer
//! than the reach lies within half a reach of the box's centre, hence in the widened block of that centre. Beyond the
//! grid's ends interpolation takes the end itself; moving centre and points to the nearest place on the grid brings
//! none farther from the other. A segment that is longer in tau takes the entry that bounds all that is not before its
//! start; a ray that crosses more of eta than the reach takes the entries that bound all eta.
//!
//! **The flow factor** p.u/E = u^tau c + (tau u^eta) s - nx u^x - ny u^y, s = (z - nz t)/tau. c never grows along a ray
//! ([`milne_flow_factor`](crate::medium::field::milne_flow_factor)), and s keeps its sign and falls in size, since z - nz t is constant and tau grows. Hence
//! p.u/E <= max(u^tau) c_a + max(0, s_a u^eta) - min(nx u^x) - min(ny u^y), a the segment's start, and extremes over the
//! entry. u^tau = sqrt(1 + u^2) is convex in the interpolated components, so its largest value at the corners bounds it.

use std::ops::{Add, Range};

use wide::f32x4;

use super::axis::Axis;
use super::values::Values;
use crate::medium::field::{Ceiling, Ray, Stretch};

/// Most segments of a stretch.
const MOST_SEGMENTS: usize = 11;
/// A segment's reach over a segment of the longest stretch: slack for rays along which tau does not grow evenly, and for
/// the segments of a stretch that are a whole number.
const SLACK: f64 = 1.1;
/// Blocks of tau, x, y in a reach.
const BLOCKS_PER_REACH: f64 = 2.0;
/// Blocks are no narrower than this part of the axis, whatever the reach.
const MOST_BLOCKS: f64 = 64.0;
/// Width in eta of a block and its reach.
const ETA_REACH: f64 = 0.5;
/// Interpolation in single precision may overshoot its corners by rounding.
const ROUNDING: f32 = 8.0 * f32::EPSILON;
/// Widening of blocks for the rounding of coordinates.
const WIDENING: f64 = 1.0 + 1e-3;
/// Single precision misses a coordinate along a ray by less than this part of the distances that go into it: a few
/// roundings, and as many of the ray's own numbers.
const COORDINATE_ROUNDING: f64 = 16.0 * f32::EPSILON as f64;
/// Ends of segments, filled up to whole vectors.
const LANES: usize = 12;

/// Extremes over the points of some cells. `most`: T, u^x, u^y, tau u^eta; `least`: -(u^tau)^2, then the same three.
#[derive(Clone, Copy, Debug)]
struct Extremes {
    most: f32x4,
    least: f32x4,
}

impl Extremes {
    const NOTHING: Extremes = Extremes {
        most: f32x4::new([f32::NEG_INFINITY; 4]),
        least: f32x4::new([f32::INFINITY; 4]),
    };

    fn of_point(value: f32x4) -> Extremes {
        let [_, ux, uy, ueta] = value.to_array();
        let square = 1.0 + ux * ux + uy * uy + ueta * ueta;
        Extremes {
            most: value,
            least: f32x4::new([-square, ux, uy, ueta]),
        }
    }
}

impl Add for Extremes {
    type Output = Extremes;

    /// Extremes over both.
    fn add(self, other: Extremes) -> Extremes {
        Extremes {
            most: self.most.fast_max(other.most),
            least: self.least.fast_min(other.least),
        }
    }
}

/// Bounds ready for use: `[T, u^tau, u^x least, most, u^y least, most, tau u^eta least, most]`.
#[derive(Clone, Copy, Debug)]
#[repr(align(32))]
struct Entry([f32; 8]);

impl From<Extremes> for Entry {
    fn from(extremes: Extremes) -> Entry {
        let [temperature, ux_most, uy_most, ueta_most] = extremes.most.to_array();
        let [minus_square, ux_least, uy_least, ueta_least] = extremes.least.to_array();
        let utau = (-minus_square).sqrt();
        // Rounding may take a component beyond its corners by some part of their size.
        let slack = ROUNDING * utau;
        Entry([
            temperature * (1.0 + ROUNDING),
            utau * (1.0 + ROUNDING),
            ux_least - slack,
            ux_most + slack,
            uy_least - slack,
            uy_most + slack,
            ueta_least - slack,
            ueta_most + slack,
        ])
    }
}

/// Equal blocks of one axis.
#[derive(Clone, Copy, Debug)]
struct Blocks {
    first: f64,
    per_unit: f64,
    count: usize,
    /// The last block.
    last: f32,
}

impl Blocks {
    fn new(axis: &Axis, width: f64) -> Blocks {
        let span = axis.last() - axis.first();
        let count = (span / width).ceil().clamp(1.0, MOST_BLOCKS);
        Blocks {
            first: axis.first(),
            per_unit: count / span,
            count: count as usize,
            last: (count - 1.0) as f32,
        }
    }

    /// The block of a coordinate; beyond an end, the last one.
    #[inline(always)]
    fn of(&self, coordinate: f32) -> i32 {
        let scaled = (coordinate - self.first as f32) * self.per_unit as f32;
        // SAFETY: this leaves a number from 0 to the last block, also of NaN.
        unsafe { at_most(at_least(scaled, 0.0), self.last).to_int_unchecked::<i32>() }
    }

    /// For each block the grid points of all cells that touch it when it is widened by `margin`.
    fn points(&self, axis: &Axis, margin: f64) -> Vec<Range<usize>> {
        let edge = |block: usize| self.first + block as f64 / self.per_unit;
        (0..self.count)
            .map(|block| axis.around(edge(block) - margin, edge(block + 1) + margin))
            .collect()
    }
}

/// The coarse table.
#[derive(Clone, Debug)]
pub(super) struct CeilingTable {
    /// Blocks of tau, x and y.
    blocks: [Blocks; 3],
    eta: Option<Blocks>,
    reach_fm: f64,
    segments_per_fm: f32,
    /// Index `[layer][tau][x][y]`, layers being the blocks of eta and then one for all eta.
    entries: Vec<Entry>,
    /// Bounds of all that is not before a block of tau, index `[layer][tau]`.
    later: Vec<Entry>,
}

impl CeilingTable {
    /// The table of a kept grid with its axes tau, x, y and perhaps eta, for stretches between two proper times.
    pub(super) fn new(
        values: &Values,
        axes: &[Axis; 3],
        eta: Option<&Axis>,
        tau_fm: [f64; 2],
    ) -> CeilingTable {
        let longest_fm = tau_fm[1] - tau_fm[0];
        let reach_fm = SLACK * longest_fm / MOST_SEGMENTS as f64;
        let width = reach_fm / BLOCKS_PER_REACH;
        let blocks = [0, 1, 2].map(|axis| Blocks::new(&axes[axis], width));
        let eta_blocks = eta.map(|axis| Blocks::new(axis, ETA_REACH));
        let mut table = CeilingTable {
            blocks,
            eta: eta_blocks,
            reach_fm,
            segments_per_fm: (MOST_SEGMENTS as f64 / longest_fm) as f32,
            entries: Vec::new(),
            later: Vec::new(),
        };
        let margin = 0.5 * reach_fm * WIDENING;
        let mut layers = Vec::new();
        if let (Some(blocks), Some(axis)) = (eta_blocks, eta) {
            layers = blocks.points(axis, 0.5 * ETA_REACH * WIDENING);
        }
        layers.push(0..eta.map_or(1, Axis::len));
        let points = [0, 1, 2].map(|axis| blocks[axis].points(&axes[axis], margin));
        let lengths = [axes[1].len(), axes[2].len(), eta.map_or(1, Axis::len)];
        for layer in layers {
            let extremes = match values {
                Values::Resting(values) => block_extremes(&points, lengths, &layer, |place| {
                    Extremes::of_point(f32x4::new([values[place], 0.0, 0.0, 0.0]))
                }),
                Values::Moving(values) => block_extremes(&points, lengths, &layer, |place| {
                    Extremes::of_point(values[place])
                }),
            };
            table.push_layer(&extremes);
        }
        table
    }

    fn push_layer(&mut self, blocks: &[Extremes]) {
        self.entries
            .extend(blocks.iter().map(|extremes| Entry::from(*extremes)));
        let plane = self.blocks[1].count * self.blocks[2].count;
        let mut later = Vec::new();
        let mut so_far = Extremes::NOTHING;
        for plane in blocks.chunks(plane).rev() {
            so_far = plane.iter().fold(so_far, |sum, block| sum + *block);
            later.push(Entry::from(so_far));
        }
        self.later.extend(later.into_iter().rev());
    }

    /// Bounds over equal segments of a stretch; `false`, and none, so far from the hard vertex that single precision is
    /// too coarse for the table.
    pub(super) fn ceilings(
        &self,
        ray: &Ray,
        stretch: &Stretch,
        ceilings: &mut Vec<Ceiling>,
    ) -> bool {
        let [t, x, y, _] = ray.birth_fm;
        let farthest = t + x.abs() + y.abs() + stretch.last_fm;
        if COORDINATE_ROUNDING * farthest > self.reach_fm * (WIDENING - 1.0) {
            return false;
        }
        let milne = MilneRay::new(ray);
        let taus = [stretch.first_fm, stretch.last_fm].map(|l| milne.tau_fm(l as f32));
        let wanted = (taus[1] - taus[0]) * self.segments_per_fm;
        let count = at_most(wanted.ceil(), MOST_SEGMENTS as f32).max(1.0);
        let (first, step) = (
            stretch.first_fm as f32,
            (stretch.last_fm - stretch.first_fm) as f32 / count,
        );
        let count = count as usize;
        let layer = self.layer(ray, stretch);
        // All lanes are computed, used or not: the compiler makes vectors of them.
        let l: [f32; LANES] = std::array::from_fn(|end| first + end as f32 * step);
        let tau = l.map(|l| milne.tau_fm(l));
        let [taus, xs, ys] = &self.blocks;
        let (half, [x, y], [nx, ny, _]) = (
            0.5 * step,
            [x as f32, y as f32],
            ray.direction.map(|n| n as f32),
        );
        let i: [i32; MOST_SEGMENTS] =
            std::array::from_fn(|segment| taus.of(0.5 * (tau[segment] + tau[segment + 1])));
        let j: [i32; MOST_SEGMENTS] =
            std::array::from_fn(|segment| xs.of(x + nx * (l[segment] + half)));
        let k: [i32; MOST_SEGMENTS] =
            std::array::from_fn(|segment| ys.of(y + ny * (l[segment] + half)));
        let (c, s) = (milne.along(l, tau), milne.across(tau));
        ceilings.clear();
        ceilings.extend((0..count).map(|segment| {
            let entry = if tau[segment + 1] - tau[segment] > self.reach_fm as f32 {
                &self.later[layer * taus.count + taus.of(tau[segment]) as usize]
            } else {
                let [i, j, k] = [i[segment], j[segment], k[segment]].map(|block| block as usize);
                &self.entries[((layer * taus.count + i) * xs.count + j) * ys.count + k]
            };
            entry.bound([nx, ny], [c[segment], s[segment]])
        }));
        true
    }

    /// The layer of a ray along a stretch: its block of eta, or all eta.
    fn layer(&self, ray: &Ray, stretch: &Stretch) -> usize {
        let Some(blocks) = &self.eta else { return 0 };
        let eta = |l_fm: f64| {
            let [t, _, _, z] = ray.at(l_fm);
            libm::atanh(z / t)
        };
        let (from, to) = (eta(stretch.first_fm), eta(stretch.last_fm));
        // NaN (at the hard vertex) is not within the reach either.
        if (to - from).abs() <= ETA_REACH {
            blocks.of((0.5 * (from + to)) as f32) as usize
        } else {
            blocks.count
        }
    }
}

impl Entry {
    /// The ceiling of a segment: the ray's direction across the beam, and c and s at the segment's start.
    #[inline(always)]
    fn bound(&self, [nx, ny]: [f32; 2], [c, s]: [f32; 2]) -> Ceiling {
        let [
            temperature,
            utau,
            ux_least,
            ux_most,
            uy_least,
            uy_most,
            ueta_least,
            ueta_most,
        ] = self.0;
        let along_x = at_least(-nx * ux_least, -nx * ux_most);
        let along_y = at_least(-ny * uy_least, -ny * uy_most);
        let twist = at_least(at_least(s * ueta_least, s * ueta_most), 0.0);
        let rounding = ROUNDING * (1.0 + c) * utau;
        Ceiling {
            temperature_gev: f64::from(temperature),
            flow_factor: f64::from(c * utau + along_x + along_y + twist + rounding),
        }
    }
}

/// tau^2 = tau_0^2 + 2 b l + a l^2 along a ray, with a = 1 - nz^2 and b = t_0 - nz z_0; no term is negative.
struct MilneRay {
    start: f32,
    slope: f32,
    curvature: f32,
    /// z - nz t, the same all along the ray.
    across: f32,
}

impl MilneRay {
    fn new(ray: &Ray) -> MilneRay {
        let ([t, _, _, z], [_, _, nz]) = (ray.birth_fm, ray.direction);
        MilneRay {
            start: (t * t - z * z).max(0.0) as f32,
            slope: (t - nz * z) as f32,
            curvature: (1.0 - nz * nz) as f32,
            across: (z - nz * t) as f32,
        }
    }

    #[inline(always)]
    fn tau_fm(&self, l_fm: f32) -> f32 {
        (self.start + l_fm * (2.0 * self.slope + self.curvature * l_fm)).sqrt()
    }

    /// c = (t - nz z)/tau at points of the ray.
    #[inline(always)]
    fn along<const N: usize>(&self, l_fm: [f32; N], tau_fm: [f32; N]) -> [f32; N] {
        let mut c: [f32; N] =
            std::array::from_fn(|end| (self.slope + self.curvature * l_fm[end]) / tau_fm[end]);
        if tau_fm[0] == 0.0 {
            // The limit along a ray from the hard vertex.
            c[0] = self.curvature.sqrt();
        }
        c
    }

    /// s = (z - nz t)/tau.
    #[inline(always)]
    fn across<const N: usize>(&self, tau_fm: [f32; N]) -> [f32; N] {
        let mut s: [f32; N] = std::array::from_fn(|end| self.across / tau_fm[end]);
        if tau_fm[0] == 0.0 {
            s[0] = 0.0;
        }
        s
    }
}

/// The larger of two numbers; the second where the first is NaN.
#[inline(always)]
fn at_least(one: f32, other: f32) -> f32 {
    if one > other { one } else { other }
}

/// The smaller of two numbers; the second where the first is NaN.
#[inline(always)]
fn at_most(one: f32, other: f32) -> f32 {
    if one < other { one } else { other }
}

/// Extremes of all blocks, in C order over (tau, x, y): first along y, then x, then tau.
fn block_extremes(
    [tau, x, y]: &[Vec<Range<usize>>; 3],
    [columns, rows, depth]: [usize; 3],
    layer: &Range<usize>,
    point: impl Fn(usize) -> Extremes,
) -> Vec<Extremes> {
    let planes = tau.iter().map(|range| range.end).max().unwrap_or(0);
    let mut blocks = vec![Extremes::NOTHING; tau.len() * x.len() * y.len()];
    let mut row = vec![Extremes::NOTHING; rows];
    for plane in 0..planes {
        let mut coarse = vec![Extremes::NOTHING; x.len() * y.len()];
        for column in 0..columns {
            for (k, extremes) in row.iter_mut().enumerate() {
                let start = ((plane * columns + column) * rows + k) * depth;
                *extremes = layer
                    .clone()
                    .map(|m| point(start + m))
                    .fold(Extremes::NOTHING, Extremes::add);
            }
            let reduced = y.iter().map(|range| {
                let points = row[range.clone()].iter();
                points.fold(Extremes::NOTHING, |sum, point| sum + *point)
            });
            let reduced: Vec<Extremes> = reduced.collect();
            for (target, range) in coarse.chunks_mut(y.len()).zip(x) {
                if range.contains(&column) {
                    merge(target, &reduced);
                }
            }
        }
        for (target, range) in blocks.chunks_mut(x.len() * y.len()).zip(tau) {
            if range.contains(&plane) {
                merge(target, &coarse);
            }
        }
    }
    blocks
}

fn merge(target: &mut [Extremes], more: &[Extremes]) {
    for (extremes, other) in target.iter_mut().zip(more) {
        *extremes = *extremes + *other;
    }
}
