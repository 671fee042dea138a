//! Centre and second-order event plane of a density across the beam, and whether two of them agree.
//!
//! With polar coordinates about the centre, weighted with the density: ellipticity = |<r^2 e^(2 i phi)>|/<r^2>, and the
//! event plane is the short axis, psi = (arg <r^2 e^(2 i phi)> + pi)/2 modulo pi (common practice; participant plane).

use std::f64::consts::{FRAC_PI_2, PI};

use super::Placement;

/// Below this ellipticity a density has no plane worth comparing.
const ROUND: f64 = 0.05;
/// Planes that differ by less are called the same: lumpy fields turn this far by themselves.
const ALLOWED_ANGLE_RAD: f64 = PI / 8.0;
/// Centres that differ by less are called the same.
const ALLOWED_DISTANCE_FM: f64 = 1.0;
/// Degrees in a radian.
const DEGREES: f64 = 180.0 / PI;

/// Centre and event plane.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Plane {
    /// Centre x, y in fm.
    pub centroid_fm: [f64; 2],
    /// 0 for a round density, 1 for a line.
    pub ellipticity: f64,
    /// Direction of the short axis in radians, in (-pi/2, pi/2]; without meaning for a round density.
    pub event_plane_rad: f64,
}

impl Plane {
    /// The plane of places (fm) with weights; `None` where the sum of weights is not above 0.
    pub fn of(weighted: impl Iterator<Item = ([f64; 2], f64)>) -> Option<Plane> {
        let mut sums = [0.0; 6];
        for ([x, y], weight) in weighted {
            let powers = [1.0, x, y, x * x, y * y, x * y];
            for (sum, power) in sums.iter_mut().zip(powers) {
                *sum += weight * power;
            }
        }
        let total = sums[0];
        if total <= 0.0 {
            return None;
        }
        let [_, x, y, xx, yy, xy] = sums.map(|sum| sum / total);
        let (xx, yy, xy) = (xx - x * x, yy - y * y, xy - x * y);
        let (cosine, sine) = (xx - yy, 2.0 * xy);
        let long_axis = 0.5 * libm::atan2(sine, cosine);
        Some(Plane {
            centroid_fm: [x, y],
            ellipticity: if xx + yy > 0.0 {
                libm::hypot(cosine, sine) / (xx + yy)
            } else {
                0.0
            },
            event_plane_rad: if long_axis > 0.0 {
                long_axis - FRAC_PI_2
            } else {
                long_axis + FRAC_PI_2
            },
        })
    }

    /// The plane of a density that was placed in the lab.
    pub fn placed(&self, placement: &Placement) -> Plane {
        let [x, y] = placement.to_lab(self.centroid_fm);
        let turned = self.event_plane_rad + placement.rotation_rad();
        // Back into (-pi/2, pi/2].
        let event_plane_rad = turned - PI * ((turned - FRAC_PI_2) / PI).ceil();
        Plane {
            centroid_fm: [x, y],
            ellipticity: self.ellipticity,
            event_plane_rad,
        }
    }

    /// What a user should hear where births (this plane) and field (the other), both in the lab, do not fit together.
    pub fn disagreement(&self, field: &Plane) -> Option<String> {
        let mut words = Vec::new();
        let apart = [0, 1].map(|axis| self.centroid_fm[axis] - field.centroid_fm[axis]);
        if libm::hypot(apart[0], apart[1]) > ALLOWED_DISTANCE_FM {
            let [x, y] = field.centroid_fm;
            let [origin_x, origin_y] = self.centroid_fm;
            words.push(format!(
                "the field's centre is ({x:.2}, {y:.2}) fm, that of the births ({origin_x:.2}, {origin_y:.2}) fm (medium.field.shift_fm moves the field)"
            ));
        }
        let turned = self.event_plane_rad - field.event_plane_rad;
        let angle = (turned - PI * (turned / PI).round()).abs();
        if self.ellipticity > ROUND && field.ellipticity > ROUND && angle > ALLOWED_ANGLE_RAD {
            words.push(format!(
                "the field's second-order event plane is at {:.0} degrees, that of the births at {:.0} (medium.field.rotation_rad turns the field)",
                field.event_plane_rad * DEGREES,
                self.event_plane_rad * DEGREES
            ));
        }
        (!words.is_empty()).then(|| words.join("; "))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A Gaussian's second moments as four points: variances `long` along `angle`, `short` across it.
    fn plane(centre: [f64; 2], angle: f64, long: f64, short: f64) -> Plane {
        let (sine, cosine) = angle.sin_cos();
        let points = [(long, 0.0), (-long, 0.0), (0.0, short), (0.0, -short)];
        let place = |(along, across): (f64, f64)| {
            [
                centre[0] + cosine * along - sine * across,
                centre[1] + sine * along + cosine * across,
            ]
        };
        Plane::of(points.into_iter().map(|point| (place(point), 0.7))).unwrap()
    }

    #[test]
    fn the_plane_is_the_short_axis() {
        for angle in [-1.5, -0.3, 0.0, 0.4, 1.2, 1.57] {
            let plane = plane([1.0, -2.0], angle, 3.0, 1.0);
            assert!((plane.ellipticity - 0.8).abs() < 1e-12);
            assert!((plane.centroid_fm[0] - 1.0).abs() < 1e-12);
            assert!((plane.centroid_fm[1] + 2.0).abs() < 1e-12);
            let off = (plane.event_plane_rad - angle - FRAC_PI_2) / PI;
            assert!((off - off.round()).abs() < 1e-12);
            assert!(plane.event_plane_rad.abs() <= FRAC_PI_2 + 1e-12);
        }
        assert_eq!(Plane::of([([1.0, 1.0], 0.0)].into_iter()), None);
        assert_eq!(
            Plane::of([([1.0, 1.0], 2.0)].into_iter())
                .unwrap()
                .ellipticity,
            0.0
        );
    }

    #[test]
    fn placing_a_density_places_its_plane() {
        for rotation in [-3.0, -1.0, 0.5, 2.0, 7.0] {
            let placement = Placement::new(rotation, [0.5, -1.0]);
            let found = plane([1.0, -2.0], 0.3, 3.0, 1.0).placed(&placement);
            let centre = placement.to_lab([1.0, -2.0]);
            let expected = plane(centre, 0.3 + rotation, 3.0, 1.0);
            assert!((found.event_plane_rad - expected.event_plane_rad).abs() < 1e-12);
            assert!((found.centroid_fm[0] - expected.centroid_fm[0]).abs() < 1e-12);
            assert!((found.centroid_fm[1] - expected.centroid_fm[1]).abs() < 1e-12);
        }
    }

    #[test]
    fn planes_that_do_not_fit_are_told() {
        let births = plane([0.0; 2], FRAC_PI_2, 3.0, 2.0);
        assert_eq!(births.disagreement(&births), None);
        // The same axis from the other side.
        assert_eq!(
            births.disagreement(&plane([0.3, 0.2], -1.6, 3.0, 2.5)),
            None
        );
        let turned = births
            .disagreement(&plane([0.0; 2], 0.0, 3.0, 2.5))
            .unwrap();
        assert!(
            turned.contains("at 90 degrees, that of the births at 0"),
            "{turned}"
        );
        assert!(turned.contains("rotation_rad") && !turned.contains("shift_fm"));
        let moved = births
            .disagreement(&plane([2.0, 0.0], FRAC_PI_2, 3.0, 2.0))
            .unwrap();
        assert!(moved.contains("shift_fm") && !moved.contains("rotation_rad"));
        // A round field has no plane.
        assert_eq!(births.disagreement(&plane([0.0; 2], 0.0, 3.0, 2.99)), None);
    }
}
