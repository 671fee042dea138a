//! Places with weights, in the lab.

use super::chooser::Chooser;
use super::{Origin, OriginError};
use crate::random::Stream;

/// A list of places, each drawn in proportion to its weight.
#[derive(Clone, Debug)]
pub struct PlaceList {
    places_fm: Vec<[f64; 2]>,
    chooser: Chooser,
}

impl PlaceList {
    /// Places x, y in fm and their weights, as many (the shorter of the two counts); weights need no normalisation.
    ///
    /// # Errors
    /// [`OriginError::Place`] for what is not finite and for negative weights; [`OriginError::Empty`] without a weight
    /// above 0.
    pub fn new(places_fm: Vec<[f64; 2]>, weights: &[f64]) -> Result<PlaceList, OriginError> {
        for (place, ([x, y], weight)) in places_fm.iter().zip(weights).enumerate() {
            let refuse = |quantity, value, allowed| {
                Err(OriginError::Place {
                    place,
                    quantity,
                    value,
                    allowed,
                })
            };
            if !x.is_finite() {
                return refuse("x_fm", *x, "finite");
            }
            if !y.is_finite() {
                return refuse("y_fm", *y, "finite");
            }
            if !(weight.is_finite() && *weight >= 0.0) {
                return refuse("weight", *weight, "finite and not negative");
            }
        }
        let count = places_fm.len().min(weights.len());
        let chooser =
            Chooser::new(&weights[..count]).ok_or(OriginError::Empty("the weight of a place"))?;
        Ok(PlaceList { places_fm, chooser })
    }
}

impl Origin for PlaceList {
    fn draw(&self, stream: &mut Stream) -> [f64; 2] {
        self.places_fm[self.chooser.draw(stream)]
    }
}
