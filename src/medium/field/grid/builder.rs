//! A grid put together point by point, so that nothing but its hot part is ever in memory.

use std::ops::Range;

use wide::f32x4;

use super::ceilings::CeilingTable;
use super::hot_region::{HotRegion, HotScan};
use super::values::Values;
use super::{Axis, Grid, Hot};
use crate::medium::field::FieldData;

/// The axes of a whole field, strictly increasing, not necessarily even, at least two points each.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Frame {
    /// Proper time tau = sqrt(t^2 - z^2) in fm/c.
    pub tau_fm: Vec<f64>,
    /// Place x in the transverse plane in fm.
    pub x_fm: Vec<f64>,
    /// Place y in the transverse plane in fm.
    pub y_fm: Vec<f64>,
    /// Space-time rapidity; `None` for a boost-invariant field.
    pub eta: Option<Vec<f64>>,
}

impl Frame {
    /// Number of points along tau, x, y and eta (1 for a boost-invariant field).
    pub fn lengths(&self) -> [usize; 4] {
        let eta = self.eta.as_ref().map_or(1, Vec::len);
        [self.tau_fm.len(), self.x_fm.len(), self.y_fm.len(), eta]
    }
}

/// The hot part of a field under construction: 4 bytes a point, 16 with flow.
#[derive(Clone, Debug)]
pub struct GridBuilder {
    frame: Frame,
    scan: HotScan,
    kept: Option<[Range<usize>; 4]>,
    values: Values,
}

impl GridBuilder {
    /// Room for the hot part of a field whose every temperature was seen by `scan`; it is at rest in Milne coordinates
    /// unless it is `moving`.
    pub fn new(frame: Frame, scan: HotScan, moving: bool) -> GridBuilder {
        let depth = frame.lengths()[3];
        let kept = scan.kept().map(|kept| {
            let [tau, x, y] = kept.map(|[first, last]| first..last + 1);
            [tau, x, y, 0..depth]
        });
        let points = kept
            .as_ref()
            .map_or(0, |kept| kept.iter().map(Range::len).product());
        GridBuilder {
            frame,
            scan,
            kept,
            values: if moving {
                Values::Moving(vec![f32x4::ZERO; points])
            } else {
                Values::Resting(vec![0.0; points])
            },
        }
    }

    /// The part of the grid (indices along tau, x, y, eta) whose values are wanted; `None` where all is cold.
    pub fn kept(&self) -> Option<[Range<usize>; 4]> {
        self.kept.clone()
    }

    /// Sets the temperature (GeV) at a place in C order over the kept part.
    #[inline]
    pub fn set_temperature(&mut self, place: usize, temperature_gev: f32) {
        match &mut self.values {
            Values::Resting(values) => values[place] = temperature_gev,
            Values::Moving(values) => values[place].as_array_mut()[0] = temperature_gev,
        }
    }

    /// Sets a component (0 to 2: u^x, u^y, tau u^eta) of the flow at a place in C order over the kept part; nothing for
    /// a fluid at rest.
    #[inline]
    pub fn set_flow(&mut self, component: usize, place: usize, value: f32) {
        if let Values::Moving(values) = &mut self.values {
            values[place].as_array_mut()[component + 1] = value;
        }
    }

    /// Changes the flow at every kept point, given its place.
    ///
    /// # Errors
    /// The first error of `change`.
    pub fn change_flow<E>(
        &mut self,
        mut change: impl FnMut(usize, [f32; 3]) -> Result<[f32; 3], E>,
    ) -> Result<(), E> {
        if let Values::Moving(values) = &mut self.values {
            for (place, value) in values.iter_mut().enumerate() {
                let [temperature, ux, uy, ueta] = value.to_array();
                let [ux, uy, ueta] = change(place, [ux, uy, ueta])?;
                *value = f32x4::new([temperature, ux, uy, ueta]);
            }
        }
        Ok(())
    }

    /// The field; with `hold` the first slice stands for what was before it.
    pub fn finish(self, hold: bool) -> Grid {
        let first_tau_fm = self.frame.tau_fm[0];
        let region = HotRegion::new(&self.scan, &self.frame, hold);
        let hot = region.zip(self.kept).map(|(region, [tau, x, y, _])| {
            let axis = |points: &[f64], kept: Range<usize>| Axis::new(points[kept].to_vec());
            let axes = [
                axis(&self.frame.tau_fm, tau),
                axis(&self.frame.x_fm, x),
                axis(&self.frame.y_fm, y),
            ];
            let eta = self.frame.eta.map(Axis::new);
            let ceilings = CeilingTable::new(&self.values, &axes, eta.as_ref(), region.tau_fm());
            let spacing_fm = axes
                .iter()
                .map(Axis::mean_spacing)
                .fold(f64::INFINITY, f64::min);
            let [tau, x, y] = axes;
            Hot {
                region,
                tau,
                x,
                y,
                eta,
                values: self.values,
                ceilings,
                spacing_fm,
            }
        });
        Grid {
            first_tau_fm,
            hold,
            is_hot_at_an_end: self.scan.is_hot_at_an_end(),
            hot,
        }
    }
}

impl Grid {
    /// The field of some data, which must obey what [`FieldData`] promises of its axes and lengths; what is colder than
    /// the end temperature (GeV) is dropped.
    pub fn new(data: FieldData, end_temperature_gev: f64) -> Grid {
        Grid::held(data, end_temperature_gev, false)
    }

    /// The same; with `hold` the first slice stands for what was before it.
    pub fn held(data: FieldData, end_temperature_gev: f64, hold: bool) -> Grid {
        let mut scan = HotScan::new(data.shape(), end_temperature_gev);
        for (place, temperature) in data.temperature_gev.iter().enumerate() {
            scan.see(place, *temperature);
        }
        let frame = Frame {
            tau_fm: data.tau_fm.clone(),
            x_fm: data.x_fm.clone(),
            y_fm: data.y_fm.clone(),
            eta: data.eta.clone(),
        };
        let mut builder = GridBuilder::new(frame, scan, data.flow.is_some());
        let [taus, xs, ys, etas] = builder.kept().unwrap_or([0..0, 0..0, 0..0, 0..0]);
        let mut place = 0;
        for tau in taus {
            for x in xs.clone() {
                for y in ys.clone() {
                    for eta in etas.clone() {
                        let index = data.index(tau, x, y, eta);
                        builder.set_temperature(place, data.temperature_gev[index]);
                        for (component, u) in data.flow.iter().flatten().enumerate() {
                            builder.set_flow(component, place, u[index]);
                        }
                        place += 1;
                    }
                }
            }
        }
        builder.finish(hold)
    }
}
