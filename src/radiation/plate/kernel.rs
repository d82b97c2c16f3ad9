//! Static integrals: the mean of 1/R between two pieces of conductor, over each of which charge or
//! current is spread evenly.
//!
//! Two rectangles in one plane and two parallel lines have closed forms (Ruehli, "Inductance
//! calculations in a complex integrated circuit environment", IBM J. Res. Dev. 16, 1972, 470-481;
//! Ruehli & Brennan, "Efficient capacitance calculations for three-dimensional multiconductor
//! systems", IEEE Trans. MTT 21, 1973, 76-82). Other close pairs take the closed potential of one and
//! Gauss points on the other, distant ones the first terms of the multipole series.

use super::Floor;
use crate::radiation::vector::{difference, dot, norm, scaled};

/// A piece of conductor: a level rectangle, sides along x and y, or a thin straight wire.
#[derive(Debug, Clone, Copy)]
pub enum Piece {
    /// Centre and half sides in metres.
    Rectangle {
        centre_m: [f64; 3],
        half_m: [f64; 2],
    },
    /// Ends and radius in metres.
    Line {
        from_m: [f64; 3],
        to_m: [f64; 3],
        radius_m: f64,
    },
}

/// Beyond this many times the larger extent the series is used; it then errs by less than 1e-4.
const DISTANT: f64 = 6.0;

/// Abscissae and weights of the 8-point Gauss-Legendre rule on -1..1 (Abramowitz & Stegun, table 25.4,
/// from memory; the tests hold them to polynomials).
const GAUSS: [(f64, f64); 4] = [
    (0.183_434_642_495_649_8, 0.362_683_783_378_362),
    (0.525_532_409_916_329, 0.313_706_645_877_887_3),
    (0.796_666_477_413_626_7, 0.222_381_034_453_374_48),
    (0.960_289_856_497_536_3, 0.101_228_536_290_376_26),
];

impl Piece {
    /// The rectangle in z = 0 from and to places along x and along y, metres.
    pub fn rectangle([[x0, x1], [y0, y1]]: [[f64; 2]; 2]) -> Self {
        Self::Rectangle {
            centre_m: [(x0 + x1) / 2.0, (y0 + y1) / 2.0, 0.0],
            half_m: [(x1 - x0) / 2.0, (y1 - y0) / 2.0],
        }
    }

    /// Middle point, metres.
    pub fn centre_m(&self) -> [f64; 3] {
        match *self {
            Self::Rectangle { centre_m, .. } => centre_m,
            Self::Line { from_m, to_m, .. } => {
                std::array::from_fn(|axis| (from_m[axis] + to_m[axis]) / 2.0)
            }
        }
    }

    /// Area of a rectangle in square metres, length of a line in metres: what its charge is shared by.
    pub fn extent(&self) -> f64 {
        match *self {
            Self::Rectangle { half_m, .. } => 4.0 * half_m[0] * half_m[1],
            Self::Line { from_m, to_m, .. } => norm(difference(to_m, from_m)),
        }
    }

    /// Its image in the floor.
    pub fn mirrored(&self, floor: Floor) -> Self {
        match *self {
            Self::Rectangle { centre_m, half_m } => Self::Rectangle {
                centre_m: floor.mirrored_m(centre_m),
                half_m,
            },
            Self::Line {
                from_m,
                to_m,
                radius_m,
            } => Self::Line {
                from_m: floor.mirrored_m(from_m),
                to_m: floor.mirrored_m(to_m),
                radius_m,
            },
        }
    }

    fn longest_m(&self) -> f64 {
        match *self {
            Self::Rectangle { half_m, .. } => 2.0 * half_m[0].max(half_m[1]),
            Self::Line { .. } => self.extent(),
        }
    }

    /// Mean square distance from the centre along a vector, times that vector's square.
    fn spread(&self, along: [f64; 3]) -> f64 {
        match *self {
            Self::Rectangle { half_m, .. } => {
                ((half_m[0] * along[0]).powi(2) + (half_m[1] * along[1]).powi(2)) / 3.0
            }
            Self::Line { from_m, to_m, .. } => dot(difference(to_m, from_m), along).powi(2) / 12.0,
        }
    }

    /// Mean square distance from the centre.
    fn spread_m2(&self) -> f64 {
        match *self {
            Self::Rectangle { half_m, .. } => (half_m[0].powi(2) + half_m[1].powi(2)) / 3.0,
            Self::Line { .. } => self.extent().powi(2) / 12.0,
        }
    }
}

/// Mean of 1/R between two pieces, per metre.
pub fn mean_inverse_distance_per_m(a: &Piece, b: &Piece) -> f64 {
    let apart = difference(a.centre_m(), b.centre_m());
    let distance_m = norm(apart);
    if distance_m > DISTANT * a.longest_m().max(b.longest_m()) {
        let square = distance_m * distance_m;
        let along = a.spread(apart) + b.spread(apart);
        let all = a.spread_m2() + b.spread_m2();
        return (1.0 + (3.0 * along / square - all) / (2.0 * square)) / distance_m;
    }
    match (a, b) {
        (Piece::Rectangle { .. }, Piece::Rectangle { .. }) => between_rectangles(a, b),
        (Piece::Line { .. }, Piece::Line { .. }) => between_lines(a, b),
        (Piece::Line { .. }, _) => {
            over_line(a, |point, radius_m| from_rectangle(b, point, radius_m))
        }
        (_, Piece::Line { .. }) => mean_inverse_distance_per_m(b, a),
    }
}

/// The four differences of two intervals' ends whose alternating sum is a double integral.
fn differences(a: f64, half_a: f64, b: f64, half_b: f64) -> [(f64, f64); 4] {
    let apart = a - b;
    [
        (apart + half_a + half_b, 1.0),
        (apart - half_a + half_b, -1.0),
        (apart + half_a - half_b, -1.0),
        (apart - half_a - half_b, 1.0),
    ]
}

fn between_rectangles(a: &Piece, b: &Piece) -> f64 {
    let (
        Piece::Rectangle { centre_m, half_m },
        Piece::Rectangle {
            centre_m: other_m,
            half_m: other_half_m,
        },
    ) = (*a, *b)
    else {
        unreachable!("two rectangles");
    };
    if centre_m[2] != other_m[2] {
        return over_rectangle(a, |point| from_rectangle(b, point, 0.0));
    }
    let along = |axis: usize| {
        differences(
            centre_m[axis],
            half_m[axis],
            other_m[axis],
            other_half_m[axis],
        )
    };
    let mut sum = 0.0;
    for (u, sign_u) in along(0) {
        for (v, sign_v) in along(1) {
            // Terms linear in u or v cancel in the sum; so the logarithms may become asinh.
            let r = u.hypot(v);
            let mut term = -r * r * r / 6.0;
            if u != 0.0 && v != 0.0 {
                term += u * v * (v * (u / v.abs()).asinh() + u * (v / u.abs()).asinh()) / 2.0;
            }
            sum += sign_u * sign_v * term;
        }
    }
    sum / (a.extent() * b.extent())
}

/// Mean of 1/R from a point to a rectangle, the point no closer than the radius.
fn from_rectangle(rectangle: &Piece, point: [f64; 3], radius_m: f64) -> f64 {
    let Piece::Rectangle { centre_m, half_m } = *rectangle else {
        unreachable!("a rectangle");
    };
    let z = (point[2] - centre_m[2]).hypot(radius_m);
    let mut sum = 0.0;
    for sign_u in [-1.0, 1.0] {
        for sign_v in [-1.0, 1.0] {
            let u = point[0] - centre_m[0] + sign_u * half_m[0];
            let v = point[1] - centre_m[1] + sign_v * half_m[1];
            let r = (u * u + v * v + z * z).sqrt();
            let term = u * (v / u.hypot(z)).asinh() + v * (u / v.hypot(z)).asinh()
                - z * (u * v / (z * r)).atan();
            sum += sign_u * sign_v * term;
        }
    }
    sum / rectangle.extent()
}

fn between_lines(a: &Piece, b: &Piece) -> f64 {
    let (
        Piece::Line {
            from_m,
            to_m,
            radius_m,
        },
        Piece::Line {
            from_m: other_m,
            to_m: other_to_m,
            radius_m: other_radius_m,
        },
    ) = (*a, *b)
    else {
        unreachable!("two lines");
    };
    let (length_m, other_length_m) = (a.extent(), b.extent());
    let axis = scaled(difference(to_m, from_m), 1.0 / length_m);
    let other_axis = scaled(difference(other_to_m, other_m), 1.0 / other_length_m);
    let square_m2 = (radius_m.powi(2) + other_radius_m.powi(2)) / 2.0;
    if dot(axis, other_axis).abs() > 1.0 - 1e-9 {
        let apart = difference(a.centre_m(), b.centre_m());
        let along = dot(apart, axis);
        let across_m2 = (dot(apart, apart) - along * along).max(0.0);
        let rho = (across_m2 + square_m2).sqrt();
        let sum: f64 = differences(along, length_m / 2.0, 0.0, other_length_m / 2.0)
            .into_iter()
            .map(|(s, sign)| sign * (s * (s / rho).asinh() - s.hypot(rho)))
            .sum();
        return sum / (length_m * other_length_m);
    }
    over_line(a, |point, _| {
        let before = difference(point, other_m);
        let along = dot(before, other_axis);
        let rho = ((dot(before, before) - along * along).max(0.0) + square_m2).sqrt();
        ((along / rho).asinh() - ((along - other_length_m) / rho).asinh()) / other_length_m
    })
}

/// Mean over a line of a function of its points and its radius.
fn over_line(line: &Piece, value: impl Fn([f64; 3], f64) -> f64) -> f64 {
    let Piece::Line {
        from_m,
        to_m,
        radius_m,
    } = *line
    else {
        unreachable!("a line");
    };
    let centre = line.centre_m();
    let half = scaled(difference(to_m, from_m), 0.5);
    GAUSS
        .into_iter()
        .flat_map(|(place, weight)| [(place, weight), (-place, weight)])
        .map(|(place, weight)| {
            let point = std::array::from_fn(|axis| centre[axis] + place * half[axis]);
            weight / 2.0 * value(point, radius_m)
        })
        .sum()
}

/// Mean over a rectangle of a function of its points.
fn over_rectangle(rectangle: &Piece, value: impl Fn([f64; 3]) -> f64) -> f64 {
    let Piece::Rectangle { centre_m, half_m } = *rectangle else {
        unreachable!("a rectangle");
    };
    let [x, y, z] = centre_m;
    let row = |at: f64| Piece::Line {
        from_m: [x - half_m[0], y + at, z],
        to_m: [x + half_m[0], y + at, z],
        radius_m: 0.0,
    };
    let column = Piece::Line {
        from_m: [-half_m[1], 0.0, 0.0],
        to_m: [half_m[1], 0.0, 0.0],
        radius_m: 0.0,
    };
    over_line(&column, |point, _| {
        over_line(&row(point[0]), |point, _| value(point))
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    fn line(from_m: [f64; 3], to_m: [f64; 3]) -> Piece {
        Piece::Line {
            from_m,
            to_m,
            radius_m: 1e-3,
        }
    }

    /// Mean of 1/R by many points on both, a wire's radius added to the distance as the closed forms do.
    fn slow(a: &Piece, b: &Piece) -> f64 {
        let radius_m = [a, b].map(|piece| match *piece {
            Piece::Rectangle { .. } => 0.0,
            Piece::Line { radius_m, .. } => radius_m,
        });
        let radius_m = radius_m[0].max(radius_m[1]);
        let points = |piece: &Piece| -> Vec<[f64; 3]> {
            let steps = |count: usize| (0..count).map(move |i| (i as f64 + 0.5) / count as f64);
            match *piece {
                Piece::Rectangle { centre_m, half_m } => steps(60)
                    .flat_map(|s| steps(60).map(move |t| (2.0 * s - 1.0, 2.0 * t - 1.0)))
                    .map(|(s, t)| {
                        [
                            centre_m[0] + s * half_m[0],
                            centre_m[1] + t * half_m[1],
                            centre_m[2],
                        ]
                    })
                    .collect(),
                Piece::Line { from_m, to_m, .. } => steps(1000)
                    .map(|s| std::array::from_fn(|i| from_m[i] + s * (to_m[i] - from_m[i])))
                    .collect(),
            }
        };
        let (a, b) = (points(a), points(b));
        let sum: f64 = a
            .iter()
            .flat_map(|&p| {
                b.iter()
                    .map(move |&q| 1.0 / norm(difference(p, q)).hypot(radius_m))
            })
            .sum();
        sum / (a.len() * b.len()) as f64
    }

    /// Mean of 1/R over a square of side a on itself: 4 (ln(1 + sqrt 2) - (sqrt 2 - 1) / 3) / a
    /// (Higgins & Reitan, "Calculation of the capacitance of a circular annulus by the method of
    /// subareas", AIEE Trans. 70, 1951, from memory).
    #[test]
    fn a_square_on_itself() {
        let side_m = 0.02;
        let square = Piece::rectangle([[0.1, 0.1 + side_m], [0.0, side_m]]);
        let root = 2f64.sqrt();
        let expected = 4.0 * ((1.0 + root).ln() - (root - 1.0) / 3.0) / side_m;
        let got = mean_inverse_distance_per_m(&square, &square);
        assert_relative_eq!(got, expected, max_relative = 1e-10);
    }

    #[test]
    fn close_pairs_agree_with_many_points() {
        let square = Piece::rectangle([[0.0, 0.01], [0.0, 0.01]]);
        let long = Piece::rectangle([[0.012, 0.03], [0.004, 0.006]]);
        let wire = line([-0.001, 0.005, 0.0], [-0.02, 0.005, 0.0]);
        let hanging = line([-0.022, 0.005, 0.0], [-0.022, 0.005, -0.03]);
        let beside = line([-0.001, 0.015, 0.0], [-0.02, 0.015, 0.0]);
        let below = long.mirrored(Floor {
            axis: 2,
            at_m: -0.004,
        });
        let pairs = [
            (square, below),
            (hanging, below),
            (square, long),
            (square, wire),
            (long, hanging),
            (wire, hanging),
            (wire, beside),
        ];
        for (a, b) in pairs {
            let got = mean_inverse_distance_per_m(&a, &b);
            assert_relative_eq!(got, slow(&a, &b), max_relative = 5e-3);
            let reverse = mean_inverse_distance_per_m(&b, &a);
            assert_relative_eq!(got, reverse, max_relative = 1e-4);
        }
    }

    /// The series and the closed forms meet.
    #[test]
    fn distant_pairs_continue_close_ones() {
        let square = Piece::rectangle([[0.0, 0.01], [0.0, 0.01]]);
        let wire = line([0.0, 0.0, 0.0], [0.01, 0.0, 0.0]);
        for apart_m in [0.0599, 0.0701] {
            let far = Piece::rectangle([[apart_m, apart_m + 0.01], [0.01, 0.015]]);
            let further = line([apart_m, 0.02, 0.0], [apart_m + 0.01, 0.02, 0.0]);
            let got = mean_inverse_distance_per_m(&square, &far);
            assert_relative_eq!(got, between_rectangles(&square, &far), max_relative = 1e-4);
            let got = mean_inverse_distance_per_m(&wire, &further);
            assert_relative_eq!(got, between_lines(&wire, &further), max_relative = 2e-4);
        }
    }

    #[test]
    fn gauss_points_meet_polynomials() {
        let along = line([0.0, 0.0, 0.0], [1.0, 0.0, 0.0]);
        for power in 0..16 {
            let mean = over_line(&along, |point, _| point[0].powi(power));
            assert_relative_eq!(mean, 1.0 / f64::from(power + 1), max_relative = 1e-13);
        }
    }
}
