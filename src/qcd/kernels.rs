//! Leading-order splitting kernels, unregularised (Altarelli & Parisi 1977, Nucl. Phys. B 126:298; Ellis, Stirling &
//! Webber, "QCD and Collider Physics", chapters 4 and 5).
//!
//! The rate of a splitting is dt/t dz alpha_s/(2 pi) P(z), z being the light-cone fraction of the first daughter.

use super::{C_A, C_F, T_R};

/// A splitting of one parton into two.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[repr(u8)]
pub enum Splitting {
    /// Quark (or antiquark) to itself and a gluon; z is the quark's.
    QuarkToQuarkGluon,
    /// Gluon to two gluons.
    GluonToGluons,
    /// Gluon to quark and antiquark; z is the quark's.
    GluonToQuarks,
}

/// q -> q g: C_F (1 + z^2)/(1 - z), for z in (0, 1).
#[inline]
pub fn quark_to_quark_gluon(z: f64) -> f64 {
    C_F * (1.0 + z * z) / (1.0 - z)
}

/// g -> g g over the full range of z in (0, 1), with the 1/2 of identical gluons: C_A (1 - z(1-z))^2/(z(1-z)).
#[inline]
pub fn gluon_to_gluons(z: f64) -> f64 {
    let soft = z * (1.0 - z);
    C_A * (1.0 - soft) * (1.0 - soft) / soft
}

/// g -> q qbar for one flavour: T_R (z^2 + (1-z)^2), for z in [0, 1].
#[inline]
pub fn gluon_to_quarks(z: f64) -> f64 {
    T_R * (z * z + (1.0 - z) * (1.0 - z))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Closed z integrals over the kinematic range, s = sqrt(1 - t0/t), l = ln((1+s)/(1-s)): quark C_F (2l - 3s/2),
    /// gluons C_A (2l - 7s/4 - s^3/12), one flavour T_R (s/2 + s^3/6); done by hand from the kernels.
    #[test]
    fn integrals_over_the_kinematic_range_are_the_closed_ones() {
        for s in [0.1, 0.5, 0.9, 0.999_f64] {
            let l = ((1.0 + s) / (1.0 - s)).ln();
            let closed = [
                C_F * (2.0 * l - 1.5 * s),
                C_A * (2.0 * l - 1.75 * s - s.powi(3) / 12.0),
                T_R * (s / 2.0 + s.powi(3) / 6.0),
            ];
            let kernels = [quark_to_quark_gluon, gluon_to_gluons, gluon_to_quarks];
            for (kernel, expected) in kernels.into_iter().zip(closed) {
                let found = integral(kernel, s);
                assert!(
                    (found / expected - 1.0).abs() < 1e-9,
                    "s = {s}: {found} against {expected}"
                );
            }
        }
    }

    /// Simpson's rule in logit(z), which spreads both end points.
    fn integral(kernel: fn(f64) -> f64, s: f64) -> f64 {
        let (steps, end) = (20_000, ((1.0 + s) / (1.0 - s)).ln());
        let value = |step: i32| {
            let z = 1.0 / (1.0 + (-end + 2.0 * end * step as f64 / steps as f64).exp());
            kernel(z) * z * (1.0 - z)
        };
        let weight = |step: i32| match step {
            0 => 1.0,
            n if n == steps => 1.0,
            n if n % 2 == 1 => 4.0,
            _ => 2.0,
        };
        (0..=steps)
            .map(|step| weight(step) * value(step))
            .sum::<f64>()
            * (2.0 * end / steps as f64)
            / 3.0
    }
}
