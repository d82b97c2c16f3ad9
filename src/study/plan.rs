//! The board seen from above: where its nets lie and its cables leave.

use super::{NetResult, Verdict};
use crate::board::{Board, CableRun, Plane};
use crate::radiation::{Layout, Segment, cable_root};
use crate::ringing::Network;

/// What lies where on a board. Places are on the plane, x along its length and y along its width from the corner
/// of left and front edge.
#[derive(Debug, Clone, PartialEq)]
pub struct BoardPlan {
    /// The plane.
    pub plane: Plane,
    /// The nets, in the order of the board.
    pub nets: Vec<PlannedNet>,
    /// The cables.
    pub cables: Vec<PlannedCable>,
}

/// A net and where it lies.
#[derive(Debug, Clone, PartialEq)]
pub struct PlannedNet {
    /// Its name.
    pub name: String,
    /// Its verdict.
    pub verdict: Verdict,
    /// Its worst margin; `None` where nothing could be judged.
    pub margin_db: Option<f64>,
    /// Its radiating pieces, from end to end.
    pub pieces_m: Vec<[[f64; 2]; 2]>,
    /// Its other pieces: between two planes, or with no height over one.
    pub quiet_m: Vec<[[f64; 2]; 2]>,
    /// Whether the file says where it lies; if not, it is taken to lie straight and in the middle.
    pub placed: bool,
}

/// A cable and where it leaves.
#[derive(Debug, Clone, PartialEq)]
pub struct PlannedCable {
    /// Its name.
    pub name: String,
    /// Its length, where it is known.
    pub length_m: Option<f64>,
    /// How it runs.
    pub run: CableRun,
    /// Where it leaves the plane.
    pub from_m: [f64; 2],
    /// Which way, a unit vector.
    pub away: [f64; 2],
}

/// The plan of a board with the verdicts of its nets.
///
/// # Errors
///
/// Says in a sentence why there is none: the plane's size is not known.
pub fn board_plan(board: &Board, results: &[NetResult]) -> Result<BoardPlan, String> {
    let plane = board.plane.ok_or(
        "the board is not shown from above: the file gives no `plane` for the nets to lie on",
    )?;
    let planned = |result: &NetResult| {
        let net = board.nets.iter().find(|net| net.name == result.name)?;
        let network = Network::of(net);
        let layout = Layout::of(&network, net, Some(&plane));
        let piece = |segment: &Segment| {
            let end =
                |axis: usize| segment.start_m[axis] + segment.direction[axis] * segment.length_m;
            [segment.start_m, [end(0), end(1)]]
        };
        let mut spans = network.spans.iter();
        Some(PlannedNet {
            name: result.name.clone(),
            verdict: result.verdict,
            margin_db: result.worst.as_ref().map(|worst| worst.margin_db),
            pieces_m: layout.segments.iter().map(piece).collect(),
            quiet_m: layout.quiet_m,
            placed: net.edge_distance_m.is_some()
                || spans.any(|span| !span.line.points_m.is_empty()),
        })
    };
    let cables = board.cables.iter().flatten().map(|cable| {
        let ([x_m, y_m, _], [x, y, _]) = cable_root(&plane, cable);
        PlannedCable {
            name: cable.name.clone(),
            length_m: cable.length_m,
            run: cable.run,
            from_m: [x_m, y_m],
            away: [x, y],
        }
    });
    Ok(BoardPlan {
        plane,
        nets: results.iter().filter_map(planned).collect(),
        cables: cables.collect(),
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::board::read_board;
    use crate::study::{CheckSetup, Unwatched, check};

    const BOARD: &str = "
title: test buoy
stackup:
  outer: {microstrip: {height: 4 mil, permittivity: 4.3}}
  core: {stripline: {below: 5 mil, above: 5 mil, permittivity: 4.3}}
drivers:
  strong: {swing: 3.3 V, resistance: 3 ohm, rise: 0.8 ns}
receivers:
  input: {capacitance: 5 pF}
plane: {length: 160 mm, width: 100 mm}
cables: [{name: mast, length: 1 m, edge: back, at: 40 mm, run: drops}]
nets:
  - {name: BENT, driver: strong, clock: 48 MHz, path: [{trace: {layer: outer, width: 4 mil, points: [[10 mm, 20 mm], [50 mm, 20 mm], [50 mm, 60 mm]]}}, {receiver: input}]}
  - {name: BURIED, driver: strong, clock: 48 MHz, path: [{trace: {layer: core, width: 4 mil, length: 50 mm}}, {receiver: input}]}
  - {name: BARE, driver: strong, clock: 48 MHz, path: [{line: {impedance: 60 ohm, delay: 100 ps}}, {receiver: input}]}
";

    #[test]
    fn every_net_and_cable_is_on_the_plan_where_it_lies() {
        let board = read_board(BOARD, "board.yaml").board.unwrap();
        let results = check(&board, &CheckSetup::for_tests(), &Unwatched);
        let plan = board_plan(&board, &results).unwrap();
        let names: Vec<&str> = plan.nets.iter().map(|net| net.name.as_str()).collect();
        assert_eq!(names, ["BENT", "BURIED", "BARE"]);
        let [bent, buried, bare] = &plan.nets[..] else {
            panic!("{names:?}");
        };
        assert!(bent.placed && !buried.placed);
        assert_eq!(
            bent.margin_db,
            results[0].worst.as_ref().map(|w| w.margin_db)
        );
        let near = |at: [f64; 2], [x, y]: [f64; 2]| (at[0] - x).hypot(at[1] - y) < 1e-12;
        assert!(near(bent.pieces_m[0][1], [0.05, 0.02]) && near(bent.pieces_m[1][1], [0.05, 0.06]));
        assert!(buried.pieces_m.is_empty() && near(buried.quiet_m[0][0], [0.055, 0.05]));
        assert!(bare.pieces_m.is_empty() && bare.quiet_m.is_empty());
        let mast = &plan.cables[0];
        assert_eq!((mast.from_m, mast.away), ([0.04, 0.1], [0.0, 1.0]));
    }

    #[test]
    fn without_a_plane_there_is_no_plan() {
        let text = BOARD.replace("plane: {length: 160 mm, width: 100 mm}\n", "");
        let board = read_board(&text, "board.yaml").board.unwrap();
        assert!(board_plan(&board, &[]).unwrap_err().contains("no `plane`"));
    }
}
