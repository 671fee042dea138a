//! Light-cone kinematics of a jet (Sudakov decomposition, as in Gieseke, Stephens & Webber 2003, hep-ph/0310083; used
//! here with ordering in virtuality).
//!
//! In the frame of a jet, p_i = x_i P + beta_i n + q_i with P+ = E + |p| of the primary. x multiplies along the tree;
//! q_1 = z q + k, q_2 = (1-z) q - k with k^2 = z(1-z) t - (1-z) t_1 - z t_2; the minus component follows from
//! p_i^2 = t_i. Four-momentum is then conserved at every vertex to rounding.

use crate::numerics::vectors::{cross, dot, unit};

/// A jet's light-cone frame: axis, two transverse unit vectors, and P+ in GeV.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Frame {
    axis: [f64; 3],
    first: [f64; 3],
    second: [f64; 3],
    plus_gev: f64,
}

/// A parton's place in its jet: plus fraction and transverse momentum (GeV).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Place {
    /// x, the product of light-cone fractions since the hard parton.
    pub fraction: f64,
    /// q in the frame's transverse basis, GeV.
    pub transverse_gev: [f64; 2],
}

impl Place {
    /// The primary of a jet.
    pub const PRIMARY: Place = Place {
        fraction: 1.0,
        transverse_gev: [0.0, 0.0],
    };

    /// The two daughters for a fraction z and a relative transverse momentum k.
    #[inline]
    pub fn split(&self, z: f64, k_gev: [f64; 2]) -> [Place; 2] {
        let [qx, qy] = self.transverse_gev;
        let rest = 1.0 - z;
        [
            Place {
                fraction: z * self.fraction,
                transverse_gev: [z * qx + k_gev[0], z * qy + k_gev[1]],
            },
            Place {
                fraction: rest * self.fraction,
                transverse_gev: [rest * qx - k_gev[0], rest * qy - k_gev[1]],
            },
        ]
    }
}

/// k_T^2 = z(1-z) t - (1-z) t1 - z t2 of a branching, GeV^2; negative where the daughters do not fit.
#[inline]
pub fn relative_transverse_gev2(t: f64, z: f64, [t1, t2]: [f64; 2]) -> f64 {
    let rest = 1.0 - z;
    z * rest * t - rest * t1 - z * t2
}

impl Frame {
    /// The frame of a jet along a unit vector with P+ in GeV.
    pub fn new(axis: [f64; 3], plus_gev: f64) -> Frame {
        // The coordinate axis that is farthest from the jet makes a well-conditioned basis.
        let helper = if axis[2].abs() < 0.8 {
            [0.0, 0.0, 1.0]
        } else {
            [1.0, 0.0, 0.0]
        };
        let first = unit(cross(helper, axis));
        Frame {
            axis,
            first,
            second: cross(axis, first),
            plus_gev,
        }
    }

    /// The lab four-momentum `[px, py, pz, energy]` (GeV) of a parton of virtuality squared `t_gev2`.
    #[inline]
    pub fn momentum(&self, place: &Place, t_gev2: f64) -> [f64; 4] {
        let [qx, qy] = place.transverse_gev;
        let plus = place.fraction * self.plus_gev;
        let minus = (t_gev2 + qx * qx + qy * qy) / plus;
        let along = 0.5 * (plus - minus);
        let component = |i: usize| along * self.axis[i] + qx * self.first[i] + qy * self.second[i];
        [
            component(0),
            component(1),
            component(2),
            0.5 * (plus + minus),
        ]
    }

    /// P+ of the jet, GeV.
    pub fn plus_gev(&self) -> f64 {
        self.plus_gev
    }

    /// The axis of the jet.
    pub fn axis(&self) -> [f64; 3] {
        self.axis
    }
}

/// The direction of flight of a four-momentum.
#[inline]
pub fn direction(momentum: [f64; 4]) -> [f64; 3] {
    let [x, y, z, _] = momentum;
    let size = dot([x, y, z], [x, y, z]).sqrt();
    [x / size, y / size, z / size]
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::numerics::vectors::invariant_square;

    #[test]
    fn a_branching_conserves_momentum_and_masses() {
        let frame = Frame::new(unit([0.3, -0.5, 0.9]), 180.0);
        let parent = Place {
            fraction: 0.4,
            transverse_gev: [3.0, -1.0],
        };
        let (t, z, t12) = (400.0, 0.3, [20.0, 55.0]);
        let k2 = relative_transverse_gev2(t, z, t12);
        assert!(k2 > 0.0);
        let k = [k2.sqrt() * 0.6, k2.sqrt() * 0.8];
        let mother = frame.momentum(&parent, t);
        let daughters = parent.split(z, k);
        let momenta = [
            frame.momentum(&daughters[0], t12[0]),
            frame.momentum(&daughters[1], t12[1]),
        ];
        for component in 0..4 {
            let sum = momenta[0][component] + momenta[1][component];
            assert!((sum - mother[component]).abs() < 1e-12 * mother[3]);
        }
        for (momentum, t) in momenta.into_iter().zip(t12) {
            assert!((invariant_square(momentum) - t).abs() < 1e-9 * momentum[3] * momentum[3]);
        }
    }
}
