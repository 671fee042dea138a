//! Three- and four-vectors as plain arrays: `[x, y, z]` and `[px, py, pz, energy]`.

/// The scalar product of two three-vectors.
#[inline]
pub fn dot(a: [f64; 3], b: [f64; 3]) -> f64 {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
}

/// The vector product of two three-vectors.
#[inline]
pub fn cross(a: [f64; 3], b: [f64; 3]) -> [f64; 3] {
    [
        a[1] * b[2] - a[2] * b[1],
        a[2] * b[0] - a[0] * b[2],
        a[0] * b[1] - a[1] * b[0],
    ]
}

/// The unit vector along `a`, which must not vanish.
#[inline]
pub fn unit(a: [f64; 3]) -> [f64; 3] {
    let inverse = 1.0 / dot(a, a).sqrt();
    a.map(|component| component * inverse)
}

/// The invariant square E^2 - p^2 of a four-momentum.
#[inline]
pub fn invariant_square(p: [f64; 4]) -> f64 {
    p[3] * p[3] - (p[0] * p[0] + p[1] * p[1] + p[2] * p[2])
}
