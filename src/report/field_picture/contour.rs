//! Lines of equal value on an even raster, as closed loops (marching squares).

use std::collections::HashMap;

/// A function on an even raster, index `[column][row]`, coordinates 0 to `columns` - 1 and 0 to `rows` - 1.
pub(super) struct Raster {
    pub(super) columns: usize,
    pub(super) rows: usize,
    pub(super) values: Vec<f64>,
}

/// A side of a cell: its lower end, and whether it runs along the columns.
type Side = (usize, usize, bool);

impl Raster {
    fn at(&self, column: usize, row: usize) -> f64 {
        self.values[column * self.rows + row]
    }

    /// Closed loops around all that is at least `level`; the raster's edge closes those that would leave it.
    pub(super) fn loops(&self, level: f64) -> Vec<Vec<[f64; 2]>> {
        // One more cold point on every side.
        let inside = |column: usize, row: usize| {
            (1..=self.columns).contains(&column)
                && (1..=self.rows).contains(&row)
                && self.at(column - 1, row - 1) >= level
        };
        let mut next: HashMap<Side, Side> = HashMap::new();
        for column in 0..=self.columns {
            for row in 0..=self.rows {
                for [from, to] in links(column, row, &inside) {
                    next.insert(from, to);
                }
            }
        }
        let mut starts: Vec<Side> = next.keys().copied().collect();
        starts.sort_unstable();
        let mut loops = Vec::new();
        for start in starts {
            let mut points = Vec::new();
            let mut side = start;
            while let Some(following) = next.remove(&side) {
                points.push(self.crossing(side, level));
                side = following;
            }
            if points.len() > 2 {
                loops.push(points);
            }
        }
        loops
    }

    /// Where the level is crossed on a side; at the raster's edge, the edge.
    fn crossing(&self, (column, row, along): Side, level: f64) -> [f64; 2] {
        let value = |column: usize, row: usize| {
            let known = (1..=self.columns).contains(&column) && (1..=self.rows).contains(&row);
            known.then(|| self.at(column - 1, row - 1))
        };
        let (far_column, far_row) = if along {
            (column + 1, row)
        } else {
            (column, row + 1)
        };
        let share = match (value(column, row), value(far_column, far_row)) {
            (Some(low), Some(high)) => (level - low) / (high - low),
            (None, _) => 1.0,
            (_, None) => 0.0,
        };
        let (column, row) = (column as f64 - 1.0, row as f64 - 1.0);
        if along {
            [column + share, row]
        } else {
            [column, row + share]
        }
    }
}

/// The pieces of loops inside a cell, each from the side where it enters to the side where it leaves, what is inside on
/// its left.
fn links(column: usize, row: usize, inside: &impl Fn(usize, usize) -> bool) -> Vec<[Side; 2]> {
    let bottom = (column, row, true);
    let top = (column, row + 1, true);
    let left = (column, row, false);
    let right = (column + 1, row, false);
    let corners = [
        inside(column, row),
        inside(column + 1, row),
        inside(column + 1, row + 1),
        inside(column, row + 1),
    ];
    match corners {
        [false, false, false, false] | [true, true, true, true] => vec![],
        [true, false, false, false] => vec![[bottom, left]],
        [false, true, false, false] => vec![[right, bottom]],
        [false, false, true, false] => vec![[top, right]],
        [false, false, false, true] => vec![[left, top]],
        [true, true, false, false] => vec![[right, left]],
        [false, true, true, false] => vec![[top, bottom]],
        [false, false, true, true] => vec![[left, right]],
        [true, false, false, true] => vec![[bottom, top]],
        [true, true, true, false] => vec![[top, left]],
        [false, true, true, true] => vec![[left, bottom]],
        [true, false, true, true] => vec![[bottom, right]],
        [true, true, false, true] => vec![[right, top]],
        // A saddle: its two inner corners stay apart.
        [true, false, true, false] => vec![[bottom, left], [top, right]],
        [false, true, false, true] => vec![[right, bottom], [left, top]],
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn raster(of: impl Fn(f64, f64) -> f64) -> Raster {
        let (columns, rows) = (61, 41);
        let values = (0..columns * rows)
            .map(|place| of((place / rows) as f64, (place % rows) as f64))
            .collect();
        Raster {
            columns,
            rows,
            values,
        }
    }

    /// Signed area, positive when what is inside lies on the left.
    fn area(points: &[[f64; 2]]) -> f64 {
        let pairs = points.iter().zip(points.iter().cycle().skip(1));
        pairs.map(|([x, y], [u, v])| 0.5 * (x * v - u * y)).sum()
    }

    /// A disc's area to the raster's resolution, with a hole's taken off; one loop each.
    #[test]
    fn discs_and_rings() {
        let distance = |x: f64, y: f64| (x - 25.3).hypot(y - 20.1);
        let disc = raster(|x, y| 15.0 - distance(x, y)).loops(0.0);
        assert_eq!(disc.len(), 1);
        let exact = std::f64::consts::PI * 225.0;
        assert!((area(&disc[0]) / exact - 1.0).abs() < 0.01);
        let ring = raster(|x, y| 5.0 - (distance(x, y) - 10.0).abs()).loops(0.0);
        assert_eq!(ring.len(), 2);
        let sum: f64 = ring.iter().map(|points| area(points)).sum();
        let exact = std::f64::consts::PI * (225.0 - 25.0);
        assert!((sum / exact - 1.0).abs() < 0.01, "{sum} {exact}");
    }

    /// What reaches over the edge is closed along it.
    #[test]
    fn the_edge_closes_loops() {
        let all = raster(|_, _| 1.0).loops(0.5);
        assert_eq!(all.len(), 1);
        assert!(
            (area(&all[0]) - 60.0 * 40.0).abs() < 1e-9,
            "{}",
            area(&all[0])
        );
        let half = raster(|x, _| x - 29.5).loops(0.0);
        assert!((area(&half[0]) - 30.5 * 40.0).abs() < 1e-9);
        assert!(raster(|_, _| 0.0).loops(0.5).is_empty());
        // Saddles make loops too, and every one is closed.
        let chess = raster(|x, y| (x * 1.1).sin() * (y * 1.3).sin()).loops(0.0);
        let sum: f64 = chess.iter().map(|points| area(points)).sum();
        assert!((sum / 1200.0 - 1.0).abs() < 0.1, "{sum}");
    }
}
