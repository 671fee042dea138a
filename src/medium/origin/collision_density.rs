//! The field file's own density of collision points, bilinear between the nodes of its x and y axes.

use super::bilinear::Bilinear;
use super::{Origin, OriginError, Placement};
use crate::medium::field::FieldData;
use crate::random::Stream;

/// A density of collision points in the transverse plane.
#[derive(Clone, Debug)]
pub struct CollisionDensity {
    density: Bilinear,
    placement: Placement,
}

impl CollisionDensity {
    /// The density of a field that lies in the lab as `placement` says.
    ///
    /// # Errors
    /// [`OriginError::NoCollisionDensity`], or [`OriginError::Empty`] where it is 0 everywhere.
    pub fn new(data: &FieldData, placement: Placement) -> Result<CollisionDensity, OriginError> {
        let values = data
            .collision_density_per_fm2
            .clone()
            .ok_or(OriginError::NoCollisionDensity)?;
        let density = Bilinear::new(&data.x_fm, &data.y_fm, values)
            .ok_or(OriginError::Empty("collision_density"))?;
        Ok(CollisionDensity { density, placement })
    }

    /// Number of collision points: the integral over the plane, the weight of the field among many.
    pub fn integral(&self) -> f64 {
        self.density.integral()
    }
}

impl Origin for CollisionDensity {
    fn draw(&self, stream: &mut Stream) -> [f64; 2] {
        self.placement.to_lab(self.density.draw(stream))
    }
}
