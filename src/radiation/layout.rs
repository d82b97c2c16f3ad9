//! Where a net lies on the board: its radiating lines, cut into straight segments.

use crate::board::{Along, Net, Plane};
use crate::line::Place;
use crate::ringing::Network;

/// The outer lines of a net as straight segments, and how much of the net they leave out.
#[derive(Debug, Clone, Default)]
pub struct Layout {
    /// The radiating segments.
    pub segments: Vec<Segment>,
    /// The straight pieces of the lines that do not radiate, from end to end.
    pub quiet_m: Vec<[[f64; 2]; 2]>,
    /// Length of all lines between two planes.
    pub buried_m: f64,
    /// Length of all lines.
    pub total_m: f64,
}

/// A straight piece of a line over the plane.
#[derive(Debug, Clone, PartialEq)]
pub struct Segment {
    /// Number of its line in the network.
    pub line: usize,
    /// Where it starts on the plane.
    pub start_m: [f64; 2],
    /// The way it runs, a unit vector.
    pub direction: [f64; 2],
    /// Its length.
    pub length_m: f64,
    /// From the line's near end to the segment's start.
    pub from_near_m: f64,
    /// From the line's far end to the segment's end.
    pub from_far_m: f64,
    /// Height over the plane.
    pub height_m: f64,
    /// Relative permittivity of what lies under it.
    pub permittivity: f64,
}

/// Where a line ends, for the one that continues it.
#[derive(Clone, Copy)]
struct Tip {
    at_m: [f64; 2],
    direction: [f64; 2],
}

impl Layout {
    /// Lays a net out. A line with points lies on them; one without continues, straight on, what is
    /// before it, so that a branch lies beside the path it leaves. The fields of lines side by side add
    /// up, which makes that the careful choice.
    ///
    /// On a plane of known size a path without points lies straight and centred, or at the net's distance from the
    /// nearest edge; `along` is which way.
    pub fn of(network: &Network, net: &Net, plane: Option<&Plane>) -> Self {
        let mut layout = Self::default();
        let direction = match net.along {
            Along::Length => [1.0, 0.0],
            Along::Width => [0.0, 1.0],
        };
        let origin = Tip {
            at_m: plane.map_or([0.0; 2], |plane| start_m(network, net, plane)),
            direction,
        };
        let mut tips: Vec<Tip> = Vec::with_capacity(network.spans.len());
        for (number, span) in network.spans.iter().enumerate() {
            let line = &span.line;
            let start = span.after.map_or(origin, |before| tips[before]);
            let route = if line.points_m.is_empty() {
                let end_m = step(start.at_m, start.direction, line.length_m);
                vec![start.at_m, end_m]
            } else {
                line.points_m.clone()
            };
            layout.total_m += line.length_m;
            let height_m = match line.place {
                Place::Outer { height_m } => height_m,
                Place::Buried => {
                    layout.buried_m += line.length_m;
                    0.0
                }
            };
            let mut tip = start;
            let mut from_near_m = 0.0;
            for pair in route.windows(2) {
                let [[x0, y0], [x1, y1]] = [pair[0], pair[1]];
                let length_m = (x1 - x0).hypot(y1 - y0);
                if length_m == 0.0 {
                    continue;
                }
                let direction = [(x1 - x0) / length_m, (y1 - y0) / length_m];
                tip = Tip {
                    at_m: pair[1],
                    direction,
                };
                if height_m > 0.0 {
                    layout.segments.push(Segment {
                        line: number,
                        start_m: pair[0],
                        direction,
                        length_m,
                        from_near_m,
                        from_far_m: (line.length_m - from_near_m - length_m).max(0.0),
                        height_m,
                        permittivity: line.permittivity,
                    });
                } else {
                    layout.quiet_m.push([pair[0], pair[1]]);
                }
                from_near_m += length_m;
            }
            tips.push(tip);
        }
        layout
    }

    /// What is doubtful about where the net lies on its plane.
    pub fn place_warning(&self, plane: &Plane) -> Option<String> {
        /// A trace this many heights from the edge and farther sees a plane on both sides.
        const HEIGHTS: f64 = 5.0;
        let sides_m = [plane.length_m, plane.width_m];
        let nearest_m = |at_m: [f64; 2]| {
            let [x, y] = [0, 1].map(|axis| at_m[axis].min(sides_m[axis] - at_m[axis]));
            x.min(y)
        };
        let nearness = |segment: &Segment| {
            let end_m = step(segment.start_m, segment.direction, segment.length_m);
            (
                nearest_m(segment.start_m).min(nearest_m(end_m)),
                segment.height_m,
            )
        };
        let of_all: Vec<(f64, f64)> = self.segments.iter().map(nearness).collect();
        if of_all.iter().any(|(nearest_m, _)| *nearest_m < 0.0) {
            Some(
                "does not fit on the plane as a straight line: give the points of its traces"
                    .into(),
            )
        } else if of_all
            .iter()
            .any(|(nearest_m, height_m)| *nearest_m < HEIGHTS * height_m)
        {
            Some(
                "runs within a few heights of the plane's edge, where its field is less sure"
                    .into(),
            )
        } else {
            None
        }
    }

    /// Sum over the segments of height times length: the area between the net and its plane.
    pub fn loop_area_m2(&self) -> f64 {
        self.segments
            .iter()
            .map(|segment| segment.height_m * segment.length_m)
            .sum()
    }
}

/// Where a straight path starts on its plane.
fn start_m(network: &Network, net: &Net, plane: &Plane) -> [f64; 2] {
    let mut tips_m: Vec<f64> = Vec::with_capacity(network.spans.len());
    for span in &network.spans {
        tips_m.push(span.after.map_or(0.0, |before| tips_m[before]) + span.line.length_m);
    }
    let extent_m = tips_m.into_iter().fold(0.0, f64::max);
    let along = |side_m: f64| (side_m - extent_m) / 2.0;
    let across = |side_m: f64| net.edge_distance_m.unwrap_or(side_m / 2.0);
    match net.along {
        Along::Length => [along(plane.length_m), across(plane.width_m)],
        Along::Width => [across(plane.length_m), along(plane.width_m)],
    }
}

fn step([x, y]: [f64; 2], [dx, dy]: [f64; 2], length_m: f64) -> [f64; 2] {
    [x + dx * length_m, y + dy * length_m]
}
