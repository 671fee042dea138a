//! Where a parton leaves the medium: the last point of its straight, light-like way at which the fluid is at least as
//! hot as the end temperature. That is geometry, whatever the parton's energy and whatever acts on it.
//!
//! A way may leave the medium and enter it again, so its stretch is gone through from the far end: at the points at
//! which paths are sampled (both ends and the middle of each cell, see `trace`), then by bisection. A visit shorter than
//! half a cell may be passed over, here as there.

use super::field::{Fluid, Ray, TemperatureField};

/// The exit is found when it is known to this part of its distance from birth, as close as single precision wants it.
const CLOSE: f64 = 1e-6;
/// Halvings of half a cell, enough for [`CLOSE`] unless the exit stands at birth.
const MOST_HALVINGS: usize = 40;

/// The exit of a parton from the medium.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Exit {
    /// Time and place `[t, x, y, z]` in fm.
    pub point_fm: [f64; 4],
    /// The fluid there, at least as hot as the end temperature: hotter where the way leaves the field's data.
    pub fluid: Fluid,
}

/// The last point of a ray at which a field is at least as hot as `end_temperature_gev` (which must be the one that the
/// field was made for); `None` where the ray never is in the medium.
pub fn exit(field: &dyn TemperatureField, ray: &Ray, end_temperature_gev: f64) -> Option<Exit> {
    let stretch = field.stretch(ray, end_temperature_gev)?;
    let is_hot = |l_fm: f64| {
        let point_fm = ray.at(l_fm);
        let temperature_gev = if point_fm[0] > 0.0 {
            field.fluid(point_fm).temperature_gev
        } else {
            // At the hard vertex all rapidities meet; the ray tells into which of them a parton is born.
            field.local(ray, l_fm).temperature_gev
        };
        temperature_gev >= end_temperature_gev
    };
    let steps = 2 * stretch.cells;
    let step_fm = (stretch.last_fm - stretch.first_fm) / steps as f64;
    let distance = |place: usize| match place {
        _ if place == steps => stretch.last_fm,
        _ => stretch.first_fm + place as f64 * step_fm,
    };
    let last_hot = (0..=steps).rev().find(|place| is_hot(distance(*place)))?;
    let l_fm = if last_hot == steps {
        stretch.last_fm
    } else {
        bisect(distance(last_hot), distance(last_hot + 1), is_hot)
    };
    let point_fm = ray.at(l_fm);
    Some(Exit {
        point_fm,
        fluid: field.fluid(point_fm),
    })
}

/// A hot place next to a crossing between a hot and a cold one.
fn bisect(mut hot_fm: f64, mut cold_fm: f64, is_hot: impl Fn(f64) -> bool) -> f64 {
    for _ in 0..MOST_HALVINGS {
        if cold_fm - hot_fm <= CLOSE * cold_fm {
            break;
        }
        let middle_fm = 0.5 * (hot_fm + cold_fm);
        if is_hot(middle_fm) {
            hot_fm = middle_fm;
        } else {
            cold_fm = middle_fm;
        }
    }
    hot_fm
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::medium::field::{Brick, FieldData, Grid, Longitudinal, Radial, placed};
    use crate::qcd::HBAR_C_GEV_FM;
    use std::sync::Arc;

    const END_GEV: f64 = 0.15;
    /// Of bisection, with a margin of 2 for directions that see the distance at an angle.
    const TOLERANCE: f64 = 2e-6;

    fn ray(birth_fm: [f64; 4], direction: [f64; 3]) -> Ray {
        let size = direction.iter().map(|n| n * n).sum::<f64>().sqrt();
        Ray {
            birth_fm,
            direction: direction.map(|n| n / size),
        }
    }

    fn near(found: f64, expected: f64) {
        let off = (found - expected).abs();
        assert!(
            off <= TOLERANCE * expected.abs().max(1.0),
            "{found} for {expected}"
        );
    }

    fn proper_time([t, _, _, z]: [f64; 4]) -> f64 {
        (t * t - z * z).sqrt()
    }

    /// Births in the forward light cone, in many directions.
    fn rays() -> Vec<Ray> {
        let mut rays = Vec::new();
        for t in [0.0, 0.3, 1.7, 4.0, 9.0] {
            for (x, y, z) in [(0.0, 0.0, 0.0), (1.0, -0.4, 0.5 * t), (-4.0, 2.0, -0.9 * t)] {
                for direction in [
                    [1.0, 0.2, 0.0],
                    [-0.3, 1.0, 2.0],
                    [0.6, -0.5, -0.1],
                    [0.1, 0.0, 1.0],
                ] {
                    rays.push(ray([t, x, y, z], direction));
                }
            }
        }
        rays
    }

    #[test]
    fn a_brick_is_left_at_its_end() {
        let brick = Brick::new(0.3, 5.0);
        for ray in rays() {
            let found = exit(&brick, &ray, END_GEV);
            let l = 5.0 - ray.birth_fm[0];
            let Some(found) = found else {
                assert!(l <= 0.0, "{ray:?}");
                continue;
            };
            for (found, expected) in found.point_fm.iter().zip(ray.at(l)) {
                near(*found, expected);
            }
            assert_eq!(
                (found.fluid.temperature_gev, found.fluid.velocity),
                (0.3, [0.0; 3])
            );
        }
        assert_eq!(exit(&Brick::new(0.14, 5.0), &rays()[0], END_GEV), None);
    }

    /// T = T0 (tau0/tau)^(1/3) ends at tau0 (T0/T_end)^3, where the fluid moves with u^z = z/tau.
    #[test]
    fn longitudinal_expansion_is_left_at_its_last_proper_time() {
        let (start, hottest) = (0.6, 0.35);
        let last_tau = start * (hottest / END_GEV).powi(3);
        let field = Longitudinal::new(hottest, start);
        let mut outside = 0;
        for ray in rays() {
            let Some(found) = exit(&field, &ray, END_GEV) else {
                assert!(proper_time(ray.birth_fm) >= last_tau, "{ray:?}");
                outside += 1;
                continue;
            };
            let tau = proper_time(found.point_fm);
            near(tau, last_tau);
            near(found.fluid.temperature_gev, END_GEV);
            let [ux, uy, uz] = found.fluid.velocity;
            assert_eq!([ux, uy], [0.0; 2]);
            near(uz, found.point_fm[3] / tau);
        }
        assert!(outside > 0);
        let along_beam = ray([0.0; 4], [0.0, 0.0, 1.0]);
        assert_eq!(exit(&field, &along_beam, END_GEV), None);
    }

    /// Temperature and u^r of the radial solution, written out anew (formulas at the head of `field::radial`).
    fn radial_state(amplitude: f64, q: f64, [t, x, y, z]: [f64; 4]) -> (f64, f64) {
        let (tau, r) = (proper_time([t, x, y, z]), x.hypot(y));
        let (a, b) = (q * q * (tau * tau + r * r), q * q * (tau * tau - r * r));
        let spread = 1.0 + 2.0 * a + b * b;
        let temperature = amplitude * HBAR_C_GEV_FM * (4.0 * q * q / (tau * spread)).cbrt();
        (temperature, 2.0 * q * q * tau * r / spread.sqrt())
    }

    /// At the exit the closed form gives the end temperature, and is colder all the way after; rays without an exit are
    /// cold throughout.
    #[test]
    fn radial_expansion_is_left_where_the_closed_form_is_cold_for_good() {
        const STEP_FM: f64 = 0.01;
        const LONGEST_FM: f64 = 30.0;
        let (amplitude, q, start) = (7.0, 0.25, 0.5);
        let field = Radial::new(amplitude, q, start);
        let mut counts = [0, 0, 0];
        for ray in rays() {
            let hot = |l: f64| {
                let point = ray.at(l);
                let known = proper_time(point) >= start;
                known && radial_state(amplitude, q, point).0 >= END_GEV
            };
            let from = match exit(&field, &ray, END_GEV) {
                None => {
                    counts[0] += 1;
                    0.0
                }
                Some(found) => {
                    let (temperature, radial) = radial_state(amplitude, q, found.point_fm);
                    near(temperature, END_GEV);
                    near(found.fluid.temperature_gev, temperature);
                    let [_, x, y, _] = found.point_fm;
                    let [ux, uy, _] = found.fluid.velocity;
                    near((ux * x + uy * y) / x.hypot(y), radial);
                    near(ux * y - uy * x, 0.0);
                    let l = found.point_fm[0] - ray.birth_fm[0];
                    counts[if hot(0.0) { 1 } else { 2 }] += 1;
                    l * (1.0 + TOLERANCE)
                }
            };
            let steps = (LONGEST_FM / STEP_FM) as usize;
            let again = (1..steps)
                .map(|step| from + step as f64 * STEP_FM)
                .find(|l| hot(*l));
            assert_eq!(again, None, "{ray:?}");
        }
        // Never inside, born inside, and come in from outside or before the start: all of them are met.
        assert!(counts.iter().all(|count| *count > 0), "{counts:?}");
    }

    /// T depends on x alone, linear between the points: a lump, a cold gap, a lump.
    fn two_lumps() -> Grid {
        let profile = [0.1, 0.3, 0.1, 0.1, 0.35, 0.05];
        let (taus, ys) = (vec![0.2, 8.0, 16.0], vec![-30.0, 0.0, 30.0]);
        let mut temperature_gev = Vec::new();
        for _ in &taus {
            for t in profile {
                temperature_gev.extend([t as f32; 3]);
            }
        }
        let points = temperature_gev.len();
        let data = FieldData {
            tau_fm: taus,
            x_fm: vec![-1.0, 0.0, 1.0, 3.0, 4.0, 5.0],
            y_fm: ys,
            temperature_gev,
            flow: Some([vec![0.5; points], vec![-0.2; points], vec![0.0; points]]),
            ..FieldData::default()
        };
        Grid::new(data, END_GEV)
    }

    /// Out of the second lump at x = 4 + (0.35 - 0.15)/(0.35 - 0.05), of the first at x = -(0.3 - 0.15)/(0.3 - 0.1); the
    /// values are held in single precision.
    #[test]
    fn a_path_through_two_lumps_is_left_for_the_second_time() {
        let grid = two_lumps();
        let birth = [0.2, 0.0, 0.0, 0.0];
        for (direction, x) in [
            ([1.0, 0.0, 0.0], 4.0 + 2.0 / 3.0),
            ([1.0, 0.4, 0.3], 4.0 + 2.0 / 3.0),
            ([-1.0, 0.1, 0.0], -0.75),
        ] {
            let ray = ray(birth, direction);
            let found = exit(&grid, &ray, END_GEV).unwrap();
            near(found.point_fm[1], x);
            near(found.fluid.temperature_gev, END_GEV);
            let tau = proper_time(found.point_fm);
            let [ux, uy, uz] = found.fluid.velocity;
            near(ux, 0.5);
            near(uy, f64::from(-0.2_f32));
            near(uz, (1.0_f64 + 0.25 + 0.04).sqrt() * found.point_fm[3] / tau);
        }
        // Born in the gap and flying along it; born beyond both.
        assert_eq!(
            exit(&grid, &ray([0.2, 2.0, 0.0, 0.0], [0.0, 1.0, 0.0]), END_GEV),
            None
        );
        assert_eq!(
            exit(&grid, &ray([0.2, 4.9, 0.0, 0.0], [1.0, 0.0, 0.0]), END_GEV),
            None
        );
    }

    #[test]
    fn a_field_whose_data_end_hot_is_left_at_their_edge() {
        let data = FieldData {
            tau_fm: vec![0.5, 20.0],
            x_fm: vec![-6.0, 6.0],
            y_fm: vec![-6.0, 6.0],
            temperature_gev: vec![0.25; 8],
            ..FieldData::default()
        };
        let grid = Grid::new(data, END_GEV);
        for (direction, l) in [
            ([1.0, 0.0, 0.0], 5.0),
            ([0.6, -0.8, 0.0], 7.5),
            ([0.0, 0.6, 0.8], 10.0),
        ] {
            let ray = ray([0.5, 1.0, 0.0, 0.0], direction);
            let found = exit(&grid, &ray, END_GEV).unwrap();
            near(found.point_fm[0], 0.5 + l);
            near(found.fluid.temperature_gev, 0.25);
        }
        // The last plane of proper time is an edge as well.
        let found = exit(&grid, &ray([0.5, 1.0, 0.0, 0.0], [0.01, 0.0, 1.0]), END_GEV).unwrap();
        near(proper_time(found.point_fm), 20.0);
    }

    /// Turned by a quarter and shifted, the same exit stands elsewhere.
    #[test]
    fn a_field_placed_elsewhere_is_left_there() {
        let grid = Arc::new(two_lumps());
        let turned = placed(grid, std::f64::consts::FRAC_PI_2, [1.0, 2.0]);
        let found = exit(
            &*turned,
            &ray([0.2, 1.0, 2.0, 0.0], [0.0, 1.0, 0.0]),
            END_GEV,
        )
        .unwrap();
        near(found.point_fm[2], 2.0 + 4.0 + 2.0 / 3.0);
        near(found.fluid.velocity[0], f64::from(0.2_f32));
        near(found.fluid.velocity[1], 0.5);
    }
}
