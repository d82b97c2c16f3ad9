//! How the board stands on the test site, in the frame of its own plane.

use super::super::plate::Floor;
use crate::board::{Orientation, Plane};
use crate::radiation::vector::{difference, norm};

/// The board on its table.
#[derive(Debug, Clone, Copy)]
pub(super) struct Stand {
    /// Unit vectors: where turntable angles count from, a quarter turn further, and upwards.
    ways: [[f64; 3]; 3],
    /// The board's middle, which stands over the turntable's.
    middle_m: [f64; 3],
    /// The metal floor.
    pub(super) floor: Floor,
}

impl Stand {
    /// A board whose lowest point is so high over the floor.
    pub(super) fn new(plane: &Plane, table_height_m: f64) -> Self {
        const X: [f64; 3] = [1.0, 0.0, 0.0];
        const Y: [f64; 3] = [0.0, 1.0, 0.0];
        const Z: [f64; 3] = [0.0, 0.0, 1.0];
        let (up, ways) = match plane.orientation {
            Orientation::Flat => (2, [X, Y, Z]),
            Orientation::Standing if plane.length_m >= plane.width_m => {
                (1, [X, [0.0, 0.0, -1.0], Y])
            }
            Orientation::Standing => (0, [Y, Z, X]),
        };
        Self {
            ways,
            middle_m: [plane.length_m / 2.0, plane.width_m / 2.0, 0.0],
            floor: Floor {
                axis: up,
                at_m: -table_height_m,
            },
        }
    }

    /// A place so far from the turntable's axis, at an angle and a height over the floor.
    pub(super) fn place_m(&self, away_m: f64, angle: f64, height_m: f64) -> [f64; 3] {
        let (sin, cos) = angle.sin_cos();
        std::array::from_fn(|axis| {
            if axis == self.floor.axis {
                self.floor.at_m + height_m
            } else {
                self.middle_m[axis] + away_m * (cos * self.ways[0][axis] + sin * self.ways[1][axis])
            }
        })
    }

    /// Level and across the line from the turntable's axis to a place at an angle.
    pub(super) fn across(&self, angle: f64) -> [f64; 3] {
        let (sin, cos) = angle.sin_cos();
        std::array::from_fn(|axis| cos * self.ways[1][axis] - sin * self.ways[0][axis])
    }

    /// Upwards.
    pub(super) fn up(&self) -> [f64; 3] {
        self.ways[2]
    }

    /// Height of a point over the floor.
    pub(super) fn height_m(&self, point_m: [f64; 3]) -> f64 {
        point_m[self.floor.axis] - self.floor.at_m
    }

    /// How far a point is from the turntable's axis, level.
    pub(super) fn off_axis_m(&self, point_m: [f64; 3]) -> f64 {
        let mut away = difference(point_m, self.middle_m);
        away[self.floor.axis] = 0.0;
        norm(away)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::radiation::plate::Floor;
    use crate::radiation::vector::cross;

    #[test]
    fn every_way_of_standing_is_right_handed() {
        let plane = |length_m, width_m, orientation| Plane {
            length_m,
            width_m,
            orientation,
        };
        for plane in [
            plane(0.16, 0.1, Orientation::Flat),
            plane(0.16, 0.1, Orientation::Standing),
            plane(0.1, 0.16, Orientation::Standing),
        ] {
            let stand = Stand::new(&plane, 0.8);
            let [a, b, up] = stand.ways;
            let upwards = cross(a, b);
            assert_eq!(upwards, up);
            let antenna_m = stand.place_m(3.0, 0.7, 2.5);
            assert!((stand.height_m(antenna_m) - 2.5).abs() < 1e-12);
            assert!((stand.off_axis_m(antenna_m) - 3.0).abs() < 1e-12);
            let Floor { axis, at_m } = stand.floor;
            assert_eq!((up[axis], at_m), (1.0, -0.8));
        }
    }
}
