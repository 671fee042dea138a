//! The numbers of a grid, the four of a moving fluid side by side, and their interpolation.

use std::ops::{Add, Mul};

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
pub(super) trait Point: Copy + Add<Output = Self> + Mul<f32, Output = Self> {}
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
    /// Multilinear interpolation: the corners of the cell, each with its weight.
    ///
    /// # Safety
    /// The corner with the highest indices, `corner` + all strides (and 1 with eta), must be one of `values`.
    #[inline(always)]
    pub(super) unsafe fn value<V: Point>(&self, values: &[V]) -> V {
        match self.eta_share {
            None => {
                // SAFETY: the caller's promise.
                unsafe { self.corners(values, 0, 1.0) }
            }
            Some(share) => {
                // SAFETY: the caller's promise.
                unsafe { self.corners(values, 0, 1.0 - share) + self.corners(values, 1, share) }
            }
        }
    }

    /// The eight corners of a cell, one `step` further along eta, with a common weight.
    ///
    /// # Safety
    /// As for [`Place::value`].
    #[inline(always)]
    unsafe fn corners<V: Point>(&self, values: &[V], step: usize, weight: f32) -> V {
        let corner = self.corner + step;
        let [along_tau, along_x, along_y] = self.strides;
        debug_assert!(corner + along_tau + along_x + along_y < values.len());
        // SAFETY: the highest corner is inside, so all are.
        let at = |place: usize| unsafe { *values.get_unchecked(corner + place) };
        let [u, v, w] = self.shares;
        let (late, early) = (u * weight, weight - u * weight);
        let (early_far, late_far) = (early * v, late * v);
        let (early_near, late_near) = (early - early_far, late - late_far);
        let row = |place: usize, weight: f32| {
            let high = weight * w;
            at(place) * (weight - high) + at(place + along_y) * high
        };
        (row(0, early_near) + row(along_x, early_far))
            + (row(along_tau, late_near) + row(along_tau + along_x, late_far))
    }
}
