//! qhat as numbers over temperature and energy: bilinear between the nodes, end values held beyond them.
//!
//! A table with one energy does not depend on energy. The ceiling is the bilinear interpolation of running maxima of
//! the nodes: these rise along both axes, so their interpolation does, and it lies nowhere below the table; its value at
//! (T, E) therefore bounds the table over all T' <= T, E' <= E.

use thiserror::Error;

/// Ceilings are lifted by this share, so that no rounding of an interpolation passes them.
const ROUNDING: f64 = 1e-12;

/// A transport coefficient in GeV^2/fm on a grid of temperature (GeV) and energy (GeV, rest frame of the fluid).
#[derive(Clone, Debug, PartialEq)]
pub struct TransportTable {
    temperature_gev: Vec<f64>,
    energy_gev: Vec<f64>,
    /// Index [temperature][energy].
    qhat_gev2_per_fm: Vec<f64>,
}

/// Why numbers are no transport table.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum TransportTableError {
    /// An axis without points, or values that do not fill the grid.
    #[error(
        "{temperatures} temperatures and {energies} energies need {} values, found {values}",
        .temperatures * .energies
    )]
    Shape {
        /// Number of temperatures, at least 1.
        temperatures: usize,
        /// Number of energies, at least 1.
        energies: usize,
        /// Number of values found.
        values: usize,
    },
    /// An axis that does not rise.
    #[error(
        "the {axis} axis must be strictly increasing, but {before} GeV is followed by {after} GeV; sort it and drop repeated points"
    )]
    Order {
        /// `temperature` or `energy`.
        axis: &'static str,
        /// A point.
        before: f64,
        /// The next one.
        after: f64,
    },
    /// A number outside its range.
    #[error(
        "{quantity} is {value} at temperature[{temperature}] energy[{energy}]; allowed: finite and not negative"
    )]
    Value {
        /// What it is.
        quantity: &'static str,
        /// The number.
        value: f64,
        /// Its place along the temperature axis.
        temperature: usize,
        /// Its place along the energy axis.
        energy: usize,
    },
}

impl TransportTable {
    /// A table: axes strictly increasing, not negative, of at least one point each (one energy: no energy dependence);
    /// values in C order, index `[temperature][energy]`, finite and not negative.
    ///
    /// # Errors
    /// [`TransportTableError`] where the numbers do not obey that.
    pub fn new(
        temperature_gev: Vec<f64>,
        energy_gev: Vec<f64>,
        qhat_gev2_per_fm: Vec<f64>,
    ) -> Result<TransportTable, TransportTableError> {
        let (temperatures, energies) = (temperature_gev.len(), energy_gev.len());
        if temperatures == 0
            || energies == 0
            || temperatures.checked_mul(energies) != Some(qhat_gev2_per_fm.len())
        {
            return Err(TransportTableError::Shape {
                temperatures,
                energies,
                values: qhat_gev2_per_fm.len(),
            });
        }
        let bad = |value: &f64| !(value.is_finite() && *value >= 0.0);
        let refuse = |quantity, value, temperature, energy| {
            Err(TransportTableError::Value {
                quantity,
                value,
                temperature,
                energy,
            })
        };
        if let Some(place) = temperature_gev.iter().position(bad) {
            return refuse("temperature", temperature_gev[place], place, 0);
        }
        if let Some(place) = energy_gev.iter().position(bad) {
            return refuse("energy", energy_gev[place], 0, place);
        }
        if let Some(place) = qhat_gev2_per_fm.iter().position(bad) {
            let (temperature, energy) = (place / energies, place % energies);
            return refuse("qhat", qhat_gev2_per_fm[place], temperature, energy);
        }
        expect_rising("temperature", &temperature_gev)?;
        expect_rising("energy", &energy_gev)?;
        Ok(TransportTable {
            temperature_gev,
            energy_gev,
            qhat_gev2_per_fm,
        })
    }

    /// Temperatures in GeV.
    pub fn temperature_gev(&self) -> &[f64] {
        &self.temperature_gev
    }

    /// Energies in GeV; one of them where the table does not depend on energy.
    pub fn energy_gev(&self) -> &[f64] {
        &self.energy_gev
    }

    /// Values in GeV^2/fm, index `[temperature][energy]`.
    pub fn qhat_gev2_per_fm(&self) -> &[f64] {
        &self.qhat_gev2_per_fm
    }

    /// The value at a temperature and an energy (GeV), in GeV^2/fm; beyond an end, the end's.
    pub fn at(&self, temperature_gev: f64, energy_gev: f64) -> f64 {
        let energies = self.energy_gev.len();
        let (row, up) = locate(&self.temperature_gev, temperature_gev);
        let (column, along) = locate(&self.energy_gev, energy_gev);
        let next_row = (row + 1).min(self.temperature_gev.len() - 1);
        let next_column = (column + 1).min(energies - 1);
        let node = |row: usize, column: usize| self.qhat_gev2_per_fm[row * energies + column];
        // Weights that add up keep the value between those of the nodes.
        let between =
            |row: usize| (1.0 - along) * node(row, column) + along * node(row, next_column);
        (1.0 - up) * between(row) + up * between(next_row)
    }

    /// What a user should hear where the table does not reach the temperatures from `coldest_gev` to `hottest_gev`.
    pub fn coverage_warning(&self, coldest_gev: f64, hottest_gev: f64) -> Option<String> {
        let (first, last) = (
            self.temperature_gev[0],
            self.temperature_gev[self.temperature_gev.len() - 1],
        );
        (first > coldest_gev || last < hottest_gev).then(|| {
            format!(
                "the transport table reaches from {first} to {last} GeV, the medium from {coldest_gev} to {hottest_gev} GeV: beyond the table its end values are held"
            )
        })
    }

    /// All values times a factor.
    pub(super) fn scaled(&self, factor: f64) -> TransportTable {
        let mut scaled = self.clone();
        scaled
            .qhat_gev2_per_fm
            .iter_mut()
            .for_each(|value| *value *= factor);
        scaled
    }

    /// The table of running maxima along both axes.
    pub(super) fn ceiling(&self) -> TransportTable {
        let mut ceiling = self.clone();
        let (values, energies) = (&mut ceiling.qhat_gev2_per_fm, self.energy_gev.len());
        for place in 0..values.len() {
            values[place] *= 1.0 + ROUNDING;
            if place % energies > 0 {
                values[place] = values[place].max(values[place - 1]);
            }
            if place >= energies {
                values[place] = values[place].max(values[place - energies]);
            }
        }
        ceiling
    }
}

fn expect_rising(axis: &'static str, points: &[f64]) -> Result<(), TransportTableError> {
    match points.windows(2).find(|pair| pair[0] >= pair[1]) {
        Some(pair) => Err(TransportTableError::Order {
            axis,
            before: pair[0],
            after: pair[1],
        }),
        None => Ok(()),
    }
}

/// Cell of a coordinate and place in it, 0 to 1; beyond an end, the end itself.
fn locate(axis: &[f64], coordinate: f64) -> (usize, f64) {
    let cells = axis.len() - 1;
    if cells == 0 {
        return (0, 0.0);
    }
    let cell = axis[1..cells].partition_point(|point| *point <= coordinate);
    let place = (coordinate - axis[cell]) / (axis[cell + 1] - axis[cell]);
    (cell, place.clamp(0.0, 1.0))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn bilinear_function(temperature: f64, energy: f64) -> f64 {
        0.3 + 2.0 * temperature + 0.01 * energy + 0.5 * temperature * energy
    }

    /// A bilinear function is met exactly, between the nodes, on them, and held beyond them.
    #[test]
    fn a_bilinear_function_is_reproduced() {
        let temperatures = vec![0.1, 0.15, 0.4, 0.5];
        let energies = vec![1.0, 10.0, 12.0];
        let values = temperatures
            .iter()
            .flat_map(|t| energies.iter().map(|e| bilinear_function(*t, *e)));
        let table = TransportTable::new(temperatures.clone(), energies.clone(), values.collect());
        let table = table.unwrap();
        for temperature in [0.1, 0.12, 0.15, 0.33, 0.4, 0.499, 0.5] {
            for energy in [1.0, 1.5, 10.0, 11.0, 12.0] {
                let expected = bilinear_function(temperature, energy);
                assert!((table.at(temperature, energy) - expected).abs() < 1e-13);
            }
        }
        for (outside, end) in [
            ((0.0, 5.0), (0.1, 5.0)),
            ((2.0, 5.0), (0.5, 5.0)),
            ((0.3, 0.0), (0.3, 1.0)),
            ((0.3, 1e9), (0.3, 12.0)),
        ] {
            let expected = bilinear_function(end.0, end.1);
            assert!((table.at(outside.0, outside.1) - expected).abs() < 1e-13);
        }
    }

    #[test]
    fn one_energy_means_none() {
        let table = TransportTable::new(vec![0.2, 0.4], vec![7.0], vec![1.0, 3.0]).unwrap();
        assert_eq!(table.at(0.3, 0.1), table.at(0.3, 1e6));
        assert!((table.at(0.3, 1.0) - 2.0).abs() < 1e-15);
        let point = TransportTable::new(vec![0.2], vec![7.0], vec![1.5]).unwrap();
        assert_eq!(point.at(1.0, 3.0), 1.5);
    }

    #[test]
    fn the_ceiling_runs_over_both_axes() {
        let values = vec![1.0, 5.0, 2.0, 3.0, 0.0, 9.0];
        let table = TransportTable::new(vec![0.1, 0.2], vec![1.0, 2.0, 3.0], values).unwrap();
        let plain: Vec<f64> = table
            .ceiling()
            .qhat_gev2_per_fm
            .iter()
            .map(|value| value.round())
            .collect();
        assert_eq!(plain, [1.0, 5.0, 5.0, 3.0, 5.0, 9.0]);
    }

    #[test]
    fn what_is_no_table_is_refused() {
        let refused = |temperatures: &[f64], energies: &[f64], values: &[f64]| {
            TransportTable::new(temperatures.into(), energies.into(), values.into())
                .unwrap_err()
                .to_string()
        };
        assert!(refused(&[], &[1.0], &[]).contains("0 temperatures"));
        assert!(refused(&[0.1, 0.2], &[1.0], &[1.0]).contains("need 2 values, found 1"));
        assert!(refused(&[0.2, 0.2], &[1.0], &[1.0, 1.0]).contains("temperature axis"));
        assert!(refused(&[0.2], &[2.0, 1.0], &[1.0, 1.0]).contains("2 GeV is followed by 1 GeV"));
        assert!(refused(&[f64::NAN], &[1.0], &[1.0]).contains("temperature is NaN"));
        assert!(refused(&[0.1], &[f64::INFINITY], &[1.0]).contains("energy is inf"));
        assert!(
            refused(&[0.1, 0.2], &[1.0], &[1.0, -2.0]).contains("qhat is -2 at temperature[1]")
        );
    }
}
