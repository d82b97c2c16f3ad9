//! How cables run from the plane's edge, as wires.

use super::stand::Stand;
use crate::board::{Cable, CableRun, Edge, Plane};
use crate::radiation::plate::Wire;
use crate::radiation::vector::dot;

/// A cable that drops leaves the board this far, and
const OUT_M: f64 = 0.1;
/// lies so high over the floor.
const LYING_M: f64 = 10e-3;
/// No conductor may come nearer to the antenna.
const CLEARANCE_M: f64 = 0.5;

/// A cable of known length as a wire on the test site; without a floor a bonded one ends in the open.
pub(super) fn wire(
    plane: &Plane,
    cable: &Cable,
    length_m: f64,
    stand: &Stand,
    floor: bool,
) -> Wire {
    let (root, away) = root(plane, cable);
    let run = match cable.run {
        CableRun::Straight => vec![step(root, away, length_m)],
        CableRun::Drops | CableRun::Bonded => hanging(root, away, length_m, cable.run, stand),
    };
    let mut points_m = vec![root];
    points_m.extend(run);
    Wire {
        points_m,
        radius_m: cable.diameter_m / 2.0,
        attached: true,
        grounded: floor && cable.run == CableRun::Bonded,
    }
}

/// Why a cable cannot hang as described where the nearest antenna stands at a distance; `None` if it can. A cable of
/// unknown length is judged by the one it would be tried with.
pub(super) fn objection(
    plane: &Plane,
    cable: &Cable,
    length_m: f64,
    stand: &Stand,
    nearest_antenna_m: f64,
) -> Option<String> {
    let name = &cable.name;
    let wire = wire(plane, cable, length_m, stand, true);
    let lowest_m = wire
        .points_m
        .iter()
        .map(|&p| stand.height_m(p))
        .fold(f64::INFINITY, f64::min);
    if cable.run == CableRun::Bonded && lowest_m > 1e-9 {
        return Some(format!(
            "the cable `{name}` is {length_m} m long and does not reach the floor, to which it is said to be bonded: it needs {:.2} m",
            length_m + lowest_m
        ));
    }
    if cable.run == CableRun::Straight && lowest_m < LYING_M {
        return Some(format!(
            "the cable `{name}` runs straight down into the floor; say `run: drops` for one that then lies on it"
        ));
    }
    let farthest_m = wire
        .points_m
        .iter()
        .map(|&p| stand.off_axis_m(p))
        .fold(0.0, f64::max);
    (farthest_m > nearest_antenna_m - CLEARANCE_M).then(|| {
        let way_out = match cable.run {
            CableRun::Straight => "; say how it hangs (`run: drops` or `run: bonded`), or what of it lies bundled on the table, and",
            CableRun::Drops | CableRun::Bonded => "; bundle what lies on the floor, as in the laboratory, and",
        };
        format!(
            "the cable `{name}` reaches {farthest_m:.2} m from the middle of the turntable, where the antenna at {nearest_antenna_m} m \
             would touch it{way_out} give that length, or measure farther away (--distance 10m)"
        )
    })
}

/// Where a cable leaves the plane, and which way, in the plane's frame.
pub fn root(plane: &Plane, cable: &Cable) -> ([f64; 3], [f64; 3]) {
    let (along_m, middle_m) = match cable.edge {
        Edge::Left | Edge::Right => (plane.width_m, plane.width_m / 2.0),
        Edge::Front | Edge::Back => (plane.length_m, plane.length_m / 2.0),
    };
    let at_m = cable.at_m.unwrap_or(middle_m).clamp(0.0, along_m);
    match cable.edge {
        Edge::Left => ([0.0, at_m, 0.0], [-1.0, 0.0, 0.0]),
        Edge::Right => ([plane.length_m, at_m, 0.0], [1.0, 0.0, 0.0]),
        Edge::Front => ([at_m, 0.0, 0.0], [0.0, -1.0, 0.0]),
        Edge::Back => ([at_m, plane.width_m, 0.0], [0.0, 1.0, 0.0]),
    }
}

/// Out, down, and what is left along the floor; or, bonded, down to the floor.
fn hanging(
    root: [f64; 3],
    away: [f64; 3],
    length_m: f64,
    run: CableRun,
    stand: &Stand,
) -> Vec<[f64; 3]> {
    let up = stand.up();
    let down = up.map(|component| -component);
    let rising = dot(away, up);
    let mut left_m = length_m;
    let mut points_m: Vec<[f64; 3]> = Vec::new();
    let mut go = |way: [f64; 3], wanted_m: f64| {
        let gone_m = f64::min(wanted_m, left_m);
        if gone_m > 1e-9 {
            let from = points_m.last().copied().unwrap_or(root);
            points_m.push(step(from, way, gone_m));
            left_m -= gone_m;
        }
    };
    // Behind the board, away from its traces.
    let behind = [0.0, 0.0, -1.0];
    let outwards = if rising.abs() > 0.5 { behind } else { away };
    let mut height_m = stand.height_m(root);
    if rising > 0.5 {
        // From the upper edge of a standing board a cable would fall onto the board.
        go(away, OUT_M);
        go(behind, OUT_M);
        height_m += OUT_M;
    } else if rising > -0.5 {
        go(away, OUT_M);
    }
    match run {
        CableRun::Bonded => go(down, height_m),
        _ => {
            go(down, height_m - LYING_M);
            go(outwards, f64::INFINITY);
        }
    }
    points_m
}

fn step(from: [f64; 3], way: [f64; 3], length_m: f64) -> [f64; 3] {
    std::array::from_fn(|axis| from[axis] + way[axis] * length_m)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::board::Orientation;
    use crate::radiation::vector::{difference, norm};
    use approx::assert_relative_eq;

    fn plane(orientation: Orientation) -> Plane {
        Plane {
            length_m: 0.16,
            width_m: 0.1,
            orientation,
        }
    }

    fn cable(edge: Edge, run: CableRun) -> Cable {
        Cable {
            name: "harness".into(),
            length_m: None,
            edge,
            at_m: None,
            run,
            diameter_m: 5e-3,
        }
    }

    #[test]
    fn a_cable_keeps_its_length_whichever_edge_it_leaves() {
        for orientation in [Orientation::Flat, Orientation::Standing] {
            let plane = plane(orientation);
            let stand = Stand::new(&plane, 0.8);
            for edge in [Edge::Left, Edge::Right, Edge::Front, Edge::Back] {
                for length_m in [0.05, 0.5, 2.0] {
                    let wire = wire(
                        &plane,
                        &cable(edge, CableRun::Drops),
                        length_m,
                        &stand,
                        true,
                    );
                    let pairs = wire.points_m.windows(2);
                    let all_m: f64 = pairs.map(|p| norm(difference(p[1], p[0]))).sum();
                    assert_relative_eq!(all_m, length_m, max_relative = 1e-9);
                    for &point in &wire.points_m {
                        assert!(stand.height_m(point) > 0.0099);
                    }
                    if length_m > 1.5 {
                        let end = wire.points_m[wire.points_m.len() - 1];
                        assert_relative_eq!(stand.height_m(end), LYING_M, max_relative = 1e-6);
                    }
                }
            }
        }
    }

    #[test]
    fn a_bonded_cable_ends_on_the_floor_or_is_objected_to() {
        let plane = plane(Orientation::Flat);
        let stand = Stand::new(&plane, 0.8);
        let bonded = cable(Edge::Left, CableRun::Bonded);
        let wire = wire(&plane, &bonded, 2.0, &stand, true);
        assert_eq!(wire.points_m.len(), 3);
        assert_relative_eq!(stand.height_m(wire.points_m[2]), 0.0);
        assert!(wire.grounded);
        assert!(objection(&plane, &bonded, 0.9, &stand, 3.0).is_none());
        let short = objection(&plane, &bonded, 0.7, &stand, 3.0);
        assert!(short.is_some_and(|text| text.contains("0.90 m")));
    }

    #[test]
    fn a_cable_that_would_reach_the_antenna_is_objected_to() {
        let plane = plane(Orientation::Flat);
        let stand = Stand::new(&plane, 0.8);
        let straight = cable(Edge::Left, CableRun::Straight);
        assert!(objection(&plane, &straight, 2.4, &stand, 3.0).is_none());
        assert!(objection(&plane, &straight, 2.5, &stand, 3.0).is_some());
        assert!(objection(&plane, &straight, 2.5, &stand, 10.0).is_none());
    }
}
