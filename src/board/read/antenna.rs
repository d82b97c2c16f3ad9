//! What radiates: the plane and the cables.

use super::super::{Cable, CableRun, Edge, Orientation, Plane};
use crate::text::{Dimension::Length, Fields, Node, Range, Report};

const DEFAULT_DIAMETER_M: f64 = 5e-3;

/// The board's plane, if it has one that can be read.
pub(super) fn plane(board: &Fields) -> Option<Plane> {
    const ORIENTATIONS: [(&str, Orientation); 2] = [
        ("flat", Orientation::Flat),
        ("standing", Orientation::Standing),
    ];
    let node = board.get("plane")?;
    let fields = board
        .report
        .fields(node, "the plane", &["length", "width", "orientation"])?;
    let orientation = fields
        .choice("orientation", &ORIENTATIONS)
        .unwrap_or_default();
    let length_m = fields.require_quantity("length", Length, Range::Positive);
    let width_m = fields.require_quantity("width", Length, Range::Positive);
    Some(Plane {
        length_m: length_m?,
        width_m: width_m?,
        orientation,
    })
}

/// The board's cables; `None` where the file does not speak of them (or they cannot be read).
pub(super) fn cables(board: &Fields, plane: Option<Plane>) -> Option<Vec<Cable>> {
    let node = board.get("cables")?;
    let expected = "a list of cables; `[]` says that nothing hangs on the board";
    let nodes = board.report.list(node, "the list of cables", expected)?;
    if !nodes.is_empty() && board.lacks(&["plane"]) {
        board.report.warning(
            node,
            "the file gives no `plane` for the cables to hang on, so they cannot be in any figure",
        );
    }
    let mut cables: Vec<Cable> = Vec::new();
    for node in nodes {
        let Some(cable) = cable(board.report, node, plane, cables.len() + 1) else {
            continue;
        };
        if cables.iter().any(|other| other.name == cable.name) {
            let message = format!("more than one cable is called `{}`", cable.name);
            board.report.error(node, message, |d| {
                d.expected("a name of its own for each cable")
            });
        }
        cables.push(cable);
    }
    Some(cables)
}

fn cable(report: &Report, node: &Node, plane: Option<Plane>, number: usize) -> Option<Cable> {
    const FIELDS: [&str; 6] = ["name", "length", "edge", "at", "run", "diameter"];
    const EDGES: [(&str, Edge); 4] = [
        ("left", Edge::Left),
        ("right", Edge::Right),
        ("front", Edge::Front),
        ("back", Edge::Back),
    ];
    const RUNS: [(&str, CableRun); 3] = [
        ("straight", CableRun::Straight),
        ("drops", CableRun::Drops),
        ("bonded", CableRun::Bonded),
    ];
    let mut fields = report.fields(node, "the cable", &FIELDS)?;
    let name = fields
        .name("name")
        .unwrap_or_else(|| format!("cable {number}"));
    fields.owner = format!("cable `{name}`");
    let edge = fields
        .require("edge", "`left`, `right`, `front` or `back`")
        .and_then(|_| fields.choice("edge", &EDGES));
    let run = fields.choice("run", &RUNS).unwrap_or_default();
    let diameter_m = fields
        .quantity("diameter", Length, Range::Positive)
        .unwrap_or(DEFAULT_DIAMETER_M);

    let length_node = fields.require("length", "a length such as `1.5 m`, or `unknown`");
    let length_m = length_node
        .filter(|node| node.scalar().as_deref() != Some("unknown"))
        .and_then(|_| fields.quantity("length", Length, Range::Positive));

    let at_m = fields.quantity("at", Length, Range::NotNegative);
    if let (Some(plane), Some(edge), Some(at_m), Some(node)) = (plane, edge, at_m, fields.get("at"))
    {
        let edge_length_m = match edge {
            Edge::Left | Edge::Right => plane.width_m,
            Edge::Front | Edge::Back => plane.length_m,
        };
        if at_m > edge_length_m {
            let message = format!("{} is placed beyond the end of its edge", fields.owner);
            let expected = format!("at most {}", in_mm(edge_length_m));
            report.error(node, message, |diagnostic| diagnostic.expected(expected));
        }
    }
    Some(Cable {
        name,
        length_m,
        edge: edge?,
        at_m,
        run,
        diameter_m,
    })
}

/// A length for a message.
pub(super) fn in_mm(length_m: f64) -> String {
    // Rounded to a nanometre, so that binary fractions do not show.
    format!("{} mm", (length_m * 1e9).round() / 1e6)
}
