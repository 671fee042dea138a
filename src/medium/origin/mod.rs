//! Where jets are born in the transverse plane.
//!
//! | kind | density of births |
//! | --- | --- |
//! | `fixed` | one place |
//! | `overlap` | T_A(x + b/2) T_A(x - b/2) of two smooth nuclei, see [`overlap`] |
//! | `field-weighted` | the field's first temperature to a power, see [`field_weighted`] |
//! | `collision-density` | the field file's own density of collision points, see [`collision_density`] |
//! | `list` | places with weights, see [`list`] |
//!
//! All births are at t = z = 0. Every draw is exact for the density as stated, and belongs to the event's own stream.

mod bilinear;
mod chooser;
pub mod collision_density;
mod error;
pub mod field_weighted;
pub mod fixed;
pub mod list;
pub mod nucleus;
pub mod overlap;
mod placement;
pub mod plane;
mod slice;
#[cfg(test)]
mod test_statistics;
pub mod thickness;

use std::path::PathBuf;

pub use collision_density::CollisionDensity;
pub use error::OriginError;
pub use field_weighted::FieldWeighted;
pub use fixed::Fixed;
pub use list::PlaceList;
pub use nucleus::Nucleus;
pub use overlap::Overlap;
pub use placement::Placement;
pub use plane::Plane;
pub use slice::TemperatureSlice;

use crate::random::Stream;

/// A distribution of birth places.
pub trait Origin: Send + Sync {
    /// Draws a place x, y in fm, in the lab.
    fn draw(&self, stream: &mut Stream) -> [f64; 2];
}

/// Which distribution of birth places.
#[derive(Clone, Debug, PartialEq)]
pub enum OriginSettings {
    /// Always at the same place of the lab.
    Fixed {
        /// x in fm.
        x_fm: f64,
        /// y in fm.
        y_fm: f64,
    },
    /// Two smooth nuclei, the impact parameter along +x of the lab.
    Overlap {
        /// Both nuclei.
        nucleus: Nucleus,
        /// Distance of their centres in fm.
        impact_parameter_fm: f64,
    },
    /// The field's temperature at its first proper time and mid-rapidity to a power, where it is above the end
    /// temperature.
    FieldWeighted {
        /// Above 0.
        power: f64,
    },
    /// The field file's own density.
    CollisionDensity,
    /// A list of places in the lab.
    List {
        /// The file, its path already resolved against the config's folder.
        file: PathBuf,
    },
}
