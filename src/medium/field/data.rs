//! A temperature field as numbers on a grid, whatever file or flow it came from.

/// Temperature, and perhaps flow, on a grid of Milne proper time and place.
///
/// Arrays are in C order with index `[tau][x][y]`, or `[tau][x][y][eta]` where `eta` is there. Axes are strictly
/// increasing, not necessarily even, and hold at least two points.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct FieldData {
    /// Proper time tau = sqrt(t^2 - z^2) in fm/c.
    pub tau_fm: Vec<f64>,
    /// Place x in the transverse plane in fm.
    pub x_fm: Vec<f64>,
    /// Place y in the transverse plane in fm.
    pub y_fm: Vec<f64>,
    /// Space-time rapidity; `None` for a boost-invariant field.
    pub eta: Option<Vec<f64>>,
    /// Temperature in GeV, none negative, all finite.
    pub temperature_gev: Vec<f32>,
    /// Four-velocity components u^x, u^y and tau u^eta on the same grid; u^tau follows from them.
    pub flow: Option<[Vec<f32>; 3]>,
    /// The field's own density of collision points in fm^-2 for drawing origins, index `[x][y]`.
    pub collision_density_per_fm2: Option<Vec<f64>>,
    /// What the user should hear of before the field is used.
    pub warnings: Vec<String>,
}

impl FieldData {
    /// Number of points along tau, x, y and eta (1 for a boost-invariant field).
    pub fn shape(&self) -> [usize; 4] {
        let eta = self.eta.as_ref().map_or(1, Vec::len);
        [self.tau_fm.len(), self.x_fm.len(), self.y_fm.len(), eta]
    }

    /// Place of a grid point in the arrays; `eta` is 0 for a boost-invariant field.
    pub fn index(&self, tau: usize, x: usize, y: usize, eta: usize) -> usize {
        let [_, count_x, count_y, count_eta] = self.shape();
        ((tau * count_x + x) * count_y + y) * count_eta + eta
    }
}
