//! Where a net feels the plane: the points at which its lines are sampled, with all that no frequency changes.

use super::response::{Response, Rows};
use crate::radiation::{Layout, LitSegment};
use crate::{ETA0_OHM, LIGHT_SPEED_M_PER_S, MU0_H_PER_M};
use num_complex::Complex64;
use std::f64::consts::TAU;

/// Longest piece of a trace that one set of sample points serves.
const PIECE_M: f64 = 20e-3;
/// Gauss-Legendre points and weights on a piece from 0 to 1 (Abramowitz & Stegun, table 25.4).
const POINTS: [(f64, f64); 3] = [
    (0.112_701_665_379_258_3, 5.0 / 18.0),
    (0.5, 8.0 / 18.0),
    (0.887_298_334_620_741_7, 5.0 / 18.0),
];
/// Nearer to its edge than this the plane's fields are not looked at: there they grow beyond bounds.
const RIM_M: f64 = 0.5e-3;

/// A net on the plane of one response.
#[derive(Debug, Clone)]
pub(super) struct Footprint {
    /// The rows of the response that it feels.
    rows: Vec<usize>,
    points: Vec<Point>,
    on_plane: usize,
}

#[derive(Debug, Clone)]
struct Point {
    segment: usize,
    from_start_m: f64,
    /// Height over the plane times the length that the point stands for.
    area_m2: f64,
    way: [f64; 2],
    /// Places among the rows, with their weights: for the charge and for the loop.
    charge: Vec<(u32, f64)>,
    loops: Vec<(u32, f64)>,
    /// Weights of the knots of the plane.
    knots: Vec<f64>,
}

/// A net's factors of the fields at the knots, by what it is made of.
pub(super) struct Factors {
    pub(super) loops: Vec<Complex64>,
    pub(super) charges: Vec<Complex64>,
}

impl Footprint {
    pub(super) fn new(layout: &Layout, sides_m: [f64; 2], response: &Response) -> Self {
        let mut points = Vec::new();
        for (number, segment) in layout.segments.iter().enumerate() {
            let pieces = (segment.length_m / PIECE_M).ceil().max(1.0) as usize;
            let piece_m = segment.length_m / pieces as f64;
            for piece in 0..pieces {
                for (place, weight) in POINTS {
                    let from_start_m = (piece as f64 + place) * piece_m;
                    let at_m = [0, 1].map(|axis| {
                        let place_m =
                            segment.start_m[axis] + segment.direction[axis] * from_start_m;
                        // A route that runs off the plane is reported; its field is taken from the plane's rim.
                        place_m.clamp(RIM_M, sides_m[axis] - RIM_M)
                    });
                    let weights = response.weights(at_m, segment.direction);
                    points.push((
                        Point {
                            segment: number,
                            from_start_m,
                            area_m2: weight * piece_m * segment.height_m,
                            way: segment.direction,
                            charge: Vec::new(),
                            loops: Vec::new(),
                            knots: response.knots.plane_weights(at_m),
                        },
                        weights,
                    ));
                }
            }
        }
        let of_points = points
            .iter()
            .flat_map(|(_, weights)| weights.iter().flatten());
        let mut rows: Vec<usize> = of_points.map(|(row, _)| *row).collect();
        rows.sort_unstable();
        rows.dedup();
        let placed = |weights: Vec<(usize, f64)>| -> Vec<(u32, f64)> {
            let weights = weights.into_iter();
            weights
                .map(|(row, weight)| (rows.partition_point(|&known| known < row) as u32, weight))
                .collect()
        };
        Self {
            points: points
                .into_iter()
                .map(|(point, [charge, loops])| Point {
                    charge: placed(charge),
                    loops: placed(loops),
                    ..point
                })
                .collect(),
            rows,
            on_plane: response.knots.on_plane(),
        }
    }

    /// Marks the rows that it feels.
    pub(super) fn mark(&self, needed: &mut [bool]) {
        for &row in &self.rows {
            needed[row] = true;
        }
    }

    /// The net's factors with these waves.
    pub(super) fn factors(
        &self,
        frequency_hz: f64,
        segments: &[LitSegment],
        rows: &Rows,
    ) -> Factors {
        let omega = TAU * frequency_hz;
        let per_jk = Complex64::new(0.0, -LIGHT_SPEED_M_PER_S / omega);
        let none = vec![Complex64::ZERO; self.rows.len()];
        let [mut of_charges, mut of_loops] = [none.clone(), none];
        let plane = vec![Complex64::ZERO; 3 * self.on_plane];
        let [mut above_charges, mut above_loops] = [plane.clone(), plane];
        for point in &self.points {
            let lit = &segments[point.segment];
            let x_m = point.from_start_m;
            let gamma = lit.propagation_per_m;
            let outward = lit.outward_v * (-gamma * x_m).exp();
            let inward = lit.inward_v * (-gamma * (lit.segment.length_m - x_m)).exp();
            // -j times the charge per length is the admittance per length times the voltage, over w.
            let charge = point.area_m2 * (outward + inward) * gamma / lit.impedance_ohm
                * Complex64::new(0.0, -1.0)
                / lit.segment.permittivity;
            let current_a = (outward - inward) / lit.impedance_ohm;
            let loop_ = -point.area_m2 * omega * MU0_H_PER_M * current_a;
            for &(row, weight) in &point.charge {
                of_charges[row as usize] += charge * weight;
            }
            let over_jk = loop_ * per_jk;
            for &(row, weight) in &point.loops {
                of_loops[row as usize] += over_jk * weight;
            }
            // The incident wave itself.
            let [x, y] = point.way.map(|part| loop_ * part / ETA0_OHM);
            for (knot, &weight) in point.knots.iter().enumerate() {
                above_charges[knot] += weight * charge;
                above_loops[self.on_plane + knot] -= weight * y;
                above_loops[2 * self.on_plane + knot] += weight * x;
            }
        }
        // What drives nothing lies between the plane's and the cables' driving fields.
        let joined = |of_rows: &[Complex64], above: Vec<Complex64>| {
            let mut factors = rows.sum(&self.rows, of_rows);
            factors.splice(2 * self.on_plane..2 * self.on_plane, above);
            factors
        };
        Factors {
            loops: joined(&of_loops, above_loops),
            charges: joined(&of_charges, above_charges),
        }
    }
}
