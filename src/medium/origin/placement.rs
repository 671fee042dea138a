//! Where a field lies in the lab: turned about the beam, then shifted.

/// A rotation about the beam (counter-clockwise, from x to y), followed by a shift: lab = R(angle) field + shift.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Placement {
    rotation_rad: f64,
    cosine: f64,
    sine: f64,
    shift_fm: [f64; 2],
}

impl Placement {
    /// The field as it stands.
    pub const IDENTITY: Placement = Placement {
        rotation_rad: 0.0,
        cosine: 1.0,
        sine: 0.0,
        shift_fm: [0.0; 2],
    };

    /// A placement by its angle in radians and its shift in fm.
    pub fn new(rotation_rad: f64, shift_fm: [f64; 2]) -> Placement {
        let (sine, cosine) = libm::sincos(rotation_rad);
        Placement {
            rotation_rad,
            cosine,
            sine,
            shift_fm,
        }
    }

    /// The angle in radians.
    pub fn rotation_rad(&self) -> f64 {
        self.rotation_rad
    }

    /// The place in the lab of a place in the field, fm.
    #[inline]
    pub fn to_lab(&self, [x, y]: [f64; 2]) -> [f64; 2] {
        [
            self.cosine * x - self.sine * y + self.shift_fm[0],
            self.sine * x + self.cosine * y + self.shift_fm[1],
        ]
    }
}
