//! One side of the plate cut into cells, and interpolation between them.
//!
//! Boundaries lie at x = L/2 (1 - cos(pi i / n)). With x = L/2 (1 - cos t) the crowding of charge at
//! both edges, 1 / sqrt(x (L - x)), is 1 / (dx/dt), so that each cell holds the same share of it.

use std::f64::consts::PI;

/// The strips into which a cell is cut where charge crowds towards an edge.
const PARTS: usize = 2;
/// Values that an interpolation takes in.
const NEIGHBOURS: usize = 4;

/// A side of the plate with its cells.
#[derive(Debug, Clone)]
pub struct Axis {
    /// Length, metres.
    pub length_m: f64,
    /// Number of cells.
    pub cells: usize,
}

impl Axis {
    /// So many cells or one more: whichever brings the wires' roots nearer to the cells' centres.
    pub fn fitted(length_m: f64, cells: usize, roots_m: &[f64]) -> Self {
        let [plain, more] = [cells, cells + 1].map(|cells| Self { length_m, cells });
        let worst = |axis: &Self| {
            let off = roots_m.iter().map(|&root| axis.off_centre(root));
            off.fold(0.0, f64::max)
        };
        if worst(&more) + 1e-9 < worst(&plain) {
            more
        } else {
            plain
        }
    }

    /// The place that lies so many cells, or parts of one, from the start; metres.
    fn place_m(&self, cells: f64) -> f64 {
        self.length_m / 2.0 * (1.0 - (PI * cells / self.cells as f64).cos())
    }

    /// Where a cell begins and ends, metres.
    pub fn cell_m(&self, cell: usize) -> [f64; 2] {
        [cell, cell + 1].map(|boundary| self.place_m(boundary as f64))
    }

    /// A cell's strips, each with the same share of its charge, metres.
    pub fn parts_m(&self, cell: usize) -> [[f64; 2]; PARTS] {
        let at = |part: usize| self.place_m(cell as f64 + part as f64 / PARTS as f64);
        std::array::from_fn(|part| [at(part), at(part + 1)])
    }

    /// Centre of a cell's charge, metres.
    pub fn centre_m(&self, cell: usize) -> f64 {
        let sum: f64 = self.parts_m(cell).iter().flatten().sum();
        sum / (2 * PARTS) as f64
    }

    /// The cells whose centres lie about a place, each with its share of it.
    pub fn shares(&self, place_m: f64) -> Vec<(usize, f64)> {
        let last = self.cells - 1;
        let after = (0..=last).find(|&cell| self.centre_m(cell) >= place_m);
        match after {
            None => vec![(last, 1.0)],
            Some(0) => vec![(0, 1.0)],
            Some(after) => {
                let [low, high] = [after - 1, after].map(|cell| self.centre_m(cell));
                let share = (place_m - low) / (high - low);
                [(after - 1, 1.0 - share), (after, share)]
                    .into_iter()
                    .filter(|(_, share)| *share > 1e-9)
                    .collect()
            }
        }
    }

    /// How far a place is from the nearest cell's centre, in cell widths.
    fn off_centre(&self, place_m: f64) -> f64 {
        (0..self.cells)
            .map(|cell| {
                let [start, end] = self.cell_m(cell);
                (place_m - self.centre_m(cell)).abs() / (end - start)
            })
            .fold(f64::INFINITY, f64::min)
    }

    /// sqrt(x (L - x)), metres.
    fn edge_factor_m(&self, place_m: f64) -> f64 {
        (place_m * (self.length_m - place_m)).max(0.0).sqrt()
    }

    /// Density at a place of what cells hold and crowds towards the edges: weights of the cells, per metre.
    pub fn density_weights(&self, at_m: f64) -> Vec<(usize, f64)> {
        let middles: Vec<f64> = (0..self.cells)
            .map(|cell| self.place_m(cell as f64 + 0.5))
            .collect();
        // A cell's share of the edge factor is pi / n.
        let scale = self.cells as f64 / PI / self.edge_factor_m(at_m);
        let mut weights = polynomial(&middles, at_m);
        for (_, weight) in &mut weights {
            *weight *= scale;
        }
        weights
    }

    /// A current at a place that vanishes at the edges as sqrt(x): weights of the currents from each cell
    /// to the next.
    pub fn crossing_weights(&self, at_m: f64) -> Vec<(usize, f64)> {
        let boundaries: Vec<f64> = (1..self.cells)
            .map(|cell| self.place_m(cell as f64))
            .collect();
        let here = self.edge_factor_m(at_m);
        let mut weights = polynomial(&boundaries, at_m);
        for (boundary, weight) in &mut weights {
            *weight *= here / self.edge_factor_m(boundaries[*boundary]);
        }
        weights
    }
}

/// Weights of the values known at the nearest places, by the polynomial through them (Lagrange).
pub fn polynomial(places_m: &[f64], at_m: f64) -> Vec<(usize, f64)> {
    let count = places_m.len().min(NEIGHBOURS);
    let after = places_m.partition_point(|&place| place < at_m);
    let first = after.saturating_sub(count / 2).min(places_m.len() - count);
    let near = first..first + count;
    near.clone()
        .map(|place| {
            let others = near.clone().filter(|&other| other != place);
            let factors =
                others.map(|other| (at_m - places_m[other]) / (places_m[place] - places_m[other]));
            (place, factors.product())
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    #[test]
    fn cells_cover_the_side() {
        let axis = Axis {
            length_m: 0.16,
            cells: 9,
        };
        assert_eq!(axis.cell_m(0)[0], 0.0);
        assert_relative_eq!(axis.cell_m(8)[1], 0.16);
        assert_relative_eq!(axis.centre_m(4), 0.08, max_relative = 1e-12);
        let [first, second] = axis.parts_m(3);
        assert_eq!([first[0], second[1]], axis.cell_m(3));
    }

    #[test]
    fn a_root_in_the_middle_makes_the_number_odd() {
        let cells = |cells, roots: &[f64]| Axis::fitted(0.1, cells, roots).cells;
        assert_eq!([cells(8, &[0.05]), cells(9, &[0.05])], [9, 9]);
        assert_eq!([cells(8, &[]), cells(9, &[])], [8, 9]);
    }

    #[test]
    fn shares_lie_about_their_place() {
        let axis = Axis {
            length_m: 0.1,
            cells: 8,
        };
        for place_m in [0.004, 0.03, 0.05, 0.0712] {
            let shares = axis.shares(place_m);
            let centre: f64 = shares
                .iter()
                .map(|&(cell, s)| s * axis.centre_m(cell))
                .sum();
            assert_relative_eq!(centre, place_m, max_relative = 1e-9);
        }
        assert_eq!(axis.shares(0.0), [(0, 1.0)]);
        assert_eq!(axis.shares(0.1), [(7, 1.0)]);
    }

    /// What crowds exactly as the edge factor is met exactly, also times a polynomial.
    #[test]
    fn edge_factors_are_interpolated_exactly() {
        let axis = Axis {
            length_m: 0.16,
            cells: 9,
        };
        for at_m in [0.001, 0.01, 0.033, 0.08, 0.159] {
            let charge: f64 = axis
                .density_weights(at_m)
                .into_iter()
                .map(|(_, weight)| weight * PI / 9.0)
                .sum();
            assert_relative_eq!(charge, 1.0 / axis.edge_factor_m(at_m), max_relative = 1e-9);
            let shape = |x: f64| axis.edge_factor_m(x) * (1.0 + 20.0 * x * x);
            let current: f64 = axis
                .crossing_weights(at_m)
                .into_iter()
                .map(|(cell, weight)| weight * shape(axis.cell_m(cell)[1]))
                .sum();
            assert_relative_eq!(current, shape(at_m), max_relative = 1e-9);
        }
    }
}
