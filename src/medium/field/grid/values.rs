//! The numbers of a grid, the four of a moving fluid side by side, and their interpolation.

use std::ops::{Add, Mul, Sub};

use wide::f32x4;

/// Values of all points in C order over (tau, x, y, eta).
#[derive(Clone, Debug)]
pub(super) enum Values {
    /// Temperature of a fluid at rest in Milne coordinates: 4 bytes a point.
    Resting(Vec<f32>),
    /// Temperature, u^x, u^y, tau u^eta: 16 bytes a point.
    Moving(Vec<f32x4>),
}

/// What can be interpolated: a number or a few side by side.
pub(super) trait Point:
    Copy + Add<Output = Self> + Sub<Output = Self> + Mul<f32, Output = Self>
{
}
impl Point for f32 {}
impl Point for f32x4 {}

/// Where a place lies between the points of the grid.
#[derive(Clone, Copy, Debug)]
pub(super) struct Place {
    /// The corner with the lowest indices.
    pub(super) corner: usize,
    /// Steps to the next point along tau, x, y.
    pub(super) strides: [usize; 3],
    /// Place in the cell, 0 to 1, along tau, x, y.
    pub(super) shares: [f32; 3],
    /// The same along eta, whose stride is 1; `None` for a boost-invariant field.
    pub(super) eta_share: Option<f32>,
}

impl Place {
    /// Multilinear interpolation.
    #[inline(always)]
    pub(super) fn value<V: Point>(&self, values: &[V]) -> V {
        let low = trilinear(values, self.corner, self.strides, self.shares);
        match self.eta_share {
            None => low,
            Some(share) => {
                let high = trilinear(values, self.corner + 1, self.strides, self.shares);
                low + (high - low) * share
            }
        }
    }
}

/// The eight corners of a cell from `corner` on, `strides` apart, mixed by the place in the cell.
#[inline(always)]
fn trilinear<V: Point>(values: &[V], corner: usize, strides: [usize; 3], [u, v, w]: [f32; 3]) -> V {
    let edge = |point: usize| {
        let (low, high) = (values[point], values[point + strides[2]]);
        low + (high - low) * w
    };
    let face = |point: usize| {
        let (low, high) = (edge(point), edge(point + strides[1]));
        low + (high - low) * v
    };
    let (low, high) = (face(corner), face(corner + strides[0]));
    low + (high - low) * u
}
