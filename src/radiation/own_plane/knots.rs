//! Places at which an incident wave is known, and by which it is known all over plane and cables.
//!
//! The wave comes from afar and is smooth over the board, unlike what the board makes of it: a few values at the
//! Chebyshev places of the plane and of each straight stretch of cable say all of it (Trefethen, Approximation Theory
//! and Approximation Practice, 2013, chapters 4 and 8). They spare the antenna's many positions the many branches.

use super::sources::Wave;
use crate::LIGHT_SPEED_M_PER_S;
use crate::radiation::plate::{BranchPlace, Plate, Wire};
use crate::radiation::vector::{difference, dot, norm, scaled};
use num_complex::Complex64;
use std::f64::consts::{PI, TAU};

/// Chebyshev places of the first kind on a stretch.
#[derive(Debug, Clone)]
struct Stretch {
    places_m: Vec<f64>,
}

impl Stretch {
    /// Enough places for a wave that turns with so many radians per metre along it: the coefficients of a plane wave
    /// are Bessel functions of half its phase, which vanish soon beyond that order.
    fn new(length_m: f64, radians_per_m: f64) -> Self {
        let half = radians_per_m * length_m / 2.0;
        let count = (half + 2.5 * half.cbrt() + 2.0).ceil() as usize;
        let place = |i: usize| (PI * (i as f64 + 0.5) / count as f64).cos();
        Self {
            places_m: (0..count)
                .map(|i| length_m / 2.0 * (1.0 - place(i)))
                .collect(),
        }
    }

    fn len(&self) -> usize {
        self.places_m.len()
    }

    /// Weights of the values at the places (Lagrange).
    fn weights(&self, at_m: f64) -> Vec<f64> {
        let places = self.places_m.iter().enumerate();
        places
            .map(|(i, place)| {
                let others = self.places_m.iter().enumerate().filter(|(j, _)| *j != i);
                others
                    .map(|(_, other)| (at_m - other) / (place - other))
                    .product()
            })
            .collect()
    }
}

/// A straight stretch of a cable.
#[derive(Debug, Clone)]
struct Leg {
    from_m: [f64; 3],
    way: [f64; 3],
    length_m: f64,
    stretch: Stretch,
    /// Number of its first knot among those of all legs.
    first: usize,
}

/// One field at one knot.
#[derive(Debug, Clone, Copy)]
pub(super) struct Spot {
    /// Number of the knot among all.
    pub(super) knot: usize,
    kind: Kind,
}

#[derive(Debug, Clone, Copy)]
enum Kind {
    Electric(usize),
    Magnetic(usize),
    Along([f64; 3]),
}

impl Spot {
    /// This field of a wave; magnetic fields times the impedance of free space.
    pub(super) fn of(&self, wave: &Wave) -> Complex64 {
        match self.kind {
            Kind::Electric(axis) => wave.e[axis],
            Kind::Magnetic(axis) => wave.h[axis],
            Kind::Along(way) => wave.e.iter().zip(way).map(|(e, part)| e * part).sum(),
        }
    }
}

/// The knots of a plane and its cables.
#[derive(Debug, Clone)]
pub(super) struct Knots {
    sides_m: [f64; 2],
    axes: [Stretch; 2],
    legs: Vec<Leg>,
    spots: Vec<Spot>,
    places_m: Vec<[f64; 3]>,
}

impl Knots {
    /// Knots enough for waves up to a frequency.
    pub(super) fn new(plate: Plate, wires: &[Wire], top_frequency_hz: f64) -> Self {
        let k = TAU * top_frequency_hz / LIGHT_SPEED_M_PER_S;
        let mut legs: Vec<Leg> = Vec::new();
        let mut first = 0;
        for wire in wires {
            for pair in wire.points_m.windows(2) {
                let along = difference(pair[1], pair[0]);
                let length_m = norm(along);
                let stretch = Stretch::new(length_m, k);
                let count = stretch.len();
                legs.push(Leg {
                    from_m: pair[0],
                    way: scaled(along, 1.0 / length_m),
                    length_m,
                    stretch,
                    first,
                });
                first += count;
            }
        }
        let sides_m = [plate.length_m, plate.width_m];
        let mut knots = Self {
            sides_m,
            axes: sides_m.map(|side_m| Stretch::new(side_m, k)),
            legs,
            spots: Vec::new(),
            places_m: Vec::new(),
        };
        let cables = knots.cables_m().into_iter().map(|(at_m, _)| at_m);
        knots.places_m = knots.plane_m().into_iter().chain(cables).collect();
        knots.spots = knots.all_spots();
        knots
    }

    /// The knots on the plane, x fastest.
    pub(super) fn plane_m(&self) -> Vec<[f64; 3]> {
        let [x, y] = &self.axes;
        let row = |&y_m: &f64| x.places_m.iter().map(move |&x_m| [x_m, y_m, 0.0]);
        y.places_m.iter().flat_map(row).collect()
    }

    /// The knots on the cables, each with the way the cable runs there.
    fn cables_m(&self) -> Vec<([f64; 3], [f64; 3])> {
        let of_leg = |leg: &Leg| {
            let (from_m, way) = (leg.from_m, leg.way);
            let places_m = leg.stretch.places_m.clone().into_iter();
            places_m.map(move |at_m| (std::array::from_fn(|i| from_m[i] + way[i] * at_m), way))
        };
        self.legs.iter().flat_map(of_leg).collect()
    }

    /// Number of fields at the knots: at those of the plane the electric field along x, y and z and the magnetic one
    /// along x and y, then the electric field along the cables at theirs.
    pub(super) fn fields(&self) -> usize {
        5 * self.on_plane() + self.on_cables()
    }

    /// One of them.
    pub(super) fn spot(&self, field: usize) -> Spot {
        self.spots[field]
    }

    /// All of them with their numbers.
    pub(super) fn spots(&self) -> impl Iterator<Item = (usize, Spot)> {
        self.spots.iter().copied().enumerate()
    }

    /// Where all knots are, those of the plane first.
    pub(super) fn places_m(&self) -> &[[f64; 3]] {
        &self.places_m
    }

    fn all_spots(&self) -> Vec<Spot> {
        let kinds = [
            Kind::Electric(0),
            Kind::Electric(1),
            Kind::Electric(2),
            Kind::Magnetic(0),
            Kind::Magnetic(1),
        ];
        let plane = self.on_plane();
        let on_plane = kinds
            .into_iter()
            .flat_map(|kind| (0..plane).map(move |knot| Spot { knot, kind }));
        let cables = self.cables_m();
        let ways = cables.iter().map(|(_, way)| *way).enumerate();
        let on_cables = ways.map(|(number, way)| Spot {
            knot: plane + number,
            kind: Kind::Along(way),
        });
        on_plane.chain(on_cables).collect()
    }

    /// Number of knots on the plane.
    pub(super) fn on_plane(&self) -> usize {
        self.axes[0].len() * self.axes[1].len()
    }

    /// Number of knots on the cables.
    pub(super) fn on_cables(&self) -> usize {
        self.legs.iter().map(|leg| leg.stretch.len()).sum()
    }

    /// Weights of the plane's knots at a point of it.
    pub(super) fn plane_weights(&self, at_m: [f64; 2]) -> Vec<f64> {
        let [x, y] = [0, 1].map(|axis| self.axes[axis].weights(at_m[axis]));
        y.iter()
            .flat_map(|b| x.iter().map(move |a| a * b))
            .collect()
    }

    /// The voltage along a branch as a sum over what drives currents: the field along x at the plane's knots, that
    /// along y, and that along the cables at theirs.
    pub(super) fn driving(&self, branch: &BranchPlace) -> Vec<(usize, f64)> {
        let [x, y, z] = branch.centre_m;
        let inside = |at: f64, side_m: f64| (-1e-9..=side_m + 1e-9).contains(&at);
        let plane = self.on_plane();
        if z == 0.0 && inside(x, self.sides_m[0]) && inside(y, self.sides_m[1]) {
            let weights = self.plane_weights([x, y]);
            let along = |axis: usize| {
                let along_m = branch.along_m[axis];
                let weights = weights.iter().enumerate().filter(move |_| along_m != 0.0);
                weights.map(move |(knot, weight)| (axis * plane + knot, weight * along_m))
            };
            return along(0).chain(along(1)).collect();
        }
        let Some(leg) = self.legs.iter().min_by(|a, b| {
            let [a, b] = [a, b].map(|leg| leg.off_m(branch.centre_m).1);
            a.total_cmp(&b)
        }) else {
            return Vec::new();
        };
        let at_m = leg.off_m(branch.centre_m).0;
        let along_m = dot(branch.along_m, leg.way);
        let weights = leg.stretch.weights(at_m).into_iter().enumerate();
        weights
            .map(|(knot, weight)| (2 * plane + leg.first + knot, weight * along_m))
            .collect()
    }

    /// Number of the fields that drive currents.
    pub(super) fn drives(&self) -> usize {
        2 * self.on_plane() + self.on_cables()
    }
}

impl Leg {
    /// How far along a point lies, and how far aside.
    fn off_m(&self, point_m: [f64; 3]) -> (f64, f64) {
        let from = difference(point_m, self.from_m);
        let along_m = dot(from, self.way);
        let nearest_m = along_m.clamp(0.0, self.length_m);
        (along_m, norm(difference(from, scaled(self.way, nearest_m))))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A plane wave between the knots, straight along a long cable and slanting over the plane.
    #[test]
    fn a_wave_is_known_between_its_knots() {
        let k = TAU * 1e9 / LIGHT_SPEED_M_PER_S;
        for length_m in [0.05, 0.16, 0.5, 1.5, 3.0] {
            let stretch = Stretch::new(length_m, k);
            for step in 0..=50 {
                let at_m = length_m * f64::from(step) / 50.0;
                let pairs = stretch.places_m.iter().zip(stretch.weights(at_m));
                let found: Complex64 = pairs.map(|(p, w)| w * Complex64::cis(k * p)).sum();
                let off = (found - Complex64::cis(k * at_m)).norm();
                assert!(off < 3e-3, "{length_m} m: {off}, {} knots", stretch.len());
            }
        }
    }

    #[test]
    fn a_branch_finds_its_leg() {
        let plate = Plate {
            length_m: 0.16,
            width_m: 0.1,
        };
        let wire = Wire {
            points_m: vec![[0.0, 0.05, 0.0], [-0.1, 0.05, 0.0], [-0.1, 0.05, -0.7]],
            radius_m: 1e-3,
            attached: true,
            grounded: false,
        };
        let knots = Knots::new(plate, &[wire], 1e9);
        let branch = BranchPlace {
            centre_m: [-0.1, 0.05, -0.3],
            along_m: [0.0, 0.0, -0.02],
        };
        let driving = knots.driving(&branch);
        let sum: f64 = driving.iter().map(|(_, weight)| weight).sum();
        assert!((sum - 0.02).abs() < 1e-12);
        let lower = 2 * knots.on_plane() + knots.legs[1].first;
        assert!(driving.iter().all(|(drive, _)| *drive >= lower));
    }
}
