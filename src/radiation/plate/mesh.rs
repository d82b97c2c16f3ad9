//! The conductors cut up: nodes that hold charge and potential, branches that carry current between them.
//!
//! A cell of the plate is a node; a current flows over the strip between the centres of two
//! neighbours. A wire is a chain of straight segments; its nodes lie at their ends and hold the charge
//! of the half segments beside them. Where it leaves the plate a root branch, half a cell long, joins
//! its first node to the edge cells whose centres lie on either side of the root. So no root is missed,
//! and the stub, the charge of the wire's first half segment, is not the plate's.

use super::axis::Axis;
use super::kernel::Piece;
use super::{Floor, Plate, Wire};
use crate::radiation::vector::{difference, norm};

/// How far a wire's first point may be from the edge, metres.
const ON_EDGE_M: f64 = 1e-6;

/// Pieces that lie at one potential, each with its share of the charge.
pub type Node = Vec<(f64, Piece)>;

/// A path of current between nodes.
#[derive(Debug, Clone)]
pub struct Branch {
    /// Each with its share of the current.
    pub pieces: Vec<(f64, Piece)>,
    /// Nodes with how much of the current flows into them.
    pub ends: Vec<(usize, f64)>,
    /// Length and direction, metres.
    pub along_m: [f64; 3],
}

impl Branch {
    /// Mean current over the length, relative to that in the middle: the current bends as a wave does.
    pub fn mean_current(&self, k: f64) -> f64 {
        let half_turn = k * norm(self.along_m) / 2.0;
        half_turn.sin() / half_turn
    }
}

/// Middle of pieces, each with its share; metres.
pub fn centre_m(pieces: &[(f64, Piece)]) -> [f64; 3] {
    let mut centre = [0.0; 3];
    for (share, piece) in pieces {
        for (sum, place_m) in centre.iter_mut().zip(piece.centre_m()) {
            *sum += share * place_m;
        }
    }
    centre
}

/// A wire's branches.
#[derive(Debug, Clone)]
pub struct Chain {
    /// Branch, and the distance of its middle from the wire's first point in metres; 0 for the root.
    pub branches: Vec<(usize, f64)>,
    /// Length, metres.
    pub length_m: f64,
    /// Whether it ends on the floor.
    pub grounded: bool,
}

/// All nodes and branches.
#[derive(Debug, Clone)]
pub struct Mesh {
    /// The plate's sides along x and y.
    pub axes: [Axis; 2],
    /// The plate's cells come first, x fastest.
    pub nodes: Vec<Node>,
    /// The plate's currents along x come first, then those along y; x fastest in both.
    pub branches: Vec<Branch>,
    /// By wire.
    pub chains: Vec<Chain>,
}

impl Mesh {
    /// Cuts up a plate and wires.
    pub fn new(axes: [Axis; 2], wires: &[Wire], segment_m: f64) -> Self {
        let mut mesh = Self {
            axes,
            nodes: Vec::new(),
            branches: Vec::new(),
            chains: Vec::new(),
        };
        mesh.add_cells();
        mesh.add_plate_branches(0);
        mesh.add_plate_branches(1);
        for wire in wires {
            mesh.add_wire(wire, segment_m);
        }
        mesh
    }

    /// Wires without a plate.
    #[cfg(test)]
    pub fn of_wires(wires: &[Wire], segment_m: f64) -> Self {
        let none = Axis {
            length_m: 0.0,
            cells: 0,
        };
        Self::new([none.clone(), none], wires, segment_m)
    }

    /// The node of a cell.
    pub fn node(&self, [i, j]: [usize; 2]) -> usize {
        i + j * self.axes[0].cells
    }

    /// The branch from a cell to the next along an axis.
    pub fn plate_branch(&self, axis: usize, [i, j]: [usize; 2]) -> usize {
        let [columns, rows] = [self.axes[0].cells, self.axes[1].cells];
        match axis {
            0 => i + j * (columns - 1),
            _ => (columns - 1) * rows + i + j * columns,
        }
    }

    /// By cell of the plate, the branches with how much of their current flows into it.
    pub fn flows_into_cells(&self) -> Vec<Vec<(usize, f64)>> {
        let mut into = vec![Vec::new(); self.axes[0].cells * self.axes[1].cells];
        for (branch, Branch { ends, .. }) in self.branches.iter().enumerate() {
            for &(node, share) in ends {
                if let Some(cell) = into.get_mut(node) {
                    cell.push((branch, share));
                }
            }
        }
        into
    }

    /// The images in a floor of all nodes and branches.
    pub fn image(&self, floor: Floor) -> (Vec<Node>, Vec<Branch>) {
        let mirrored = |pieces: &[(f64, Piece)]| -> Vec<(f64, Piece)> {
            let pieces = pieces.iter();
            pieces
                .map(|(share, piece)| (*share, piece.mirrored(floor)))
                .collect()
        };
        let branch = |branch: &Branch| Branch {
            pieces: mirrored(&branch.pieces),
            ends: branch.ends.clone(),
            along_m: floor.image_way(branch.along_m),
        };
        (
            self.nodes.iter().map(|node| mirrored(node)).collect(),
            self.branches.iter().map(branch).collect(),
        )
    }

    fn add_cells(&mut self) {
        let [x, y] = &self.axes;
        for j in 0..y.cells {
            for i in 0..x.cells {
                let (columns, rows) = (x.parts_m(i), y.parts_m(j));
                let share = 1.0 / (columns.len() * rows.len()) as f64;
                let pieces = rows.iter().flat_map(|&row| {
                    let strip = columns.iter();
                    strip.map(move |&column| (share, Piece::rectangle([column, row])))
                });
                self.nodes.push(pieces.collect());
            }
        }
    }

    fn add_plate_branches(&mut self, axis: usize) {
        let along = self.axes[axis].clone();
        let across = self.axes[1 - axis].clone();
        let (mut links, mut strips) = (along.cells.saturating_sub(1), across.cells);
        if axis == 1 {
            std::mem::swap(&mut links, &mut strips);
        }
        for outer in 0..strips {
            for inner in 0..links {
                let (from, strip) = match axis {
                    0 => (inner, outer),
                    _ => (outer, inner),
                };
                let span = [from, from + 1].map(|cell| along.centre_m(cell));
                let node = |cell| self.node(ordered(axis, [cell, strip]));
                let mut along_m = [0.0; 3];
                along_m[axis] = span[1] - span[0];
                self.branches.push(Branch {
                    pieces: strip_pieces(axis, span, &across, strip),
                    ends: vec![(node(from), -1.0), (node(from + 1), 1.0)],
                    along_m,
                });
            }
        }
    }

    fn add_wire(&mut self, wire: &Wire, segment_m: f64) {
        let points = cut(&wire.points_m, segment_m);
        let line = |from_m, to_m| Piece::Line {
            from_m,
            to_m,
            radius_m: wire.radius_m,
        };
        let first = self.nodes.len();
        // The floor is at no potential, and a node on it would hold no charge.
        let held = points.len() - usize::from(wire.grounded);
        self.nodes.extend(vec![Node::new(); held]);
        let mut branches = Vec::new();
        if wire.attached {
            branches.push((self.branches.len(), 0.0));
            let root = self.root(wire.points_m[0], first);
            self.branches.push(root);
        }
        let mut length_m = 0.0;
        for (place, pair) in points.windows(2).enumerate() {
            let along_m = difference(pair[1], pair[0]);
            let segment_m = norm(along_m);
            branches.push((self.branches.len(), length_m + segment_m / 2.0));
            length_m += segment_m;
            let middle = std::array::from_fn(|axis| (pair[0][axis] + pair[1][axis]) / 2.0);
            let halves = [(pair[0], middle, -1.0), (middle, pair[1], 1.0)];
            let mut ends = Vec::new();
            for (node, (from_m, to_m, share)) in (first + place..first + held).zip(halves) {
                self.nodes[node].push((segment_m, line(from_m, to_m)));
                ends.push((node, share));
            }
            self.branches.push(Branch {
                pieces: vec![(1.0, line(pair[0], pair[1]))],
                ends,
                along_m,
            });
        }
        for node in &mut self.nodes[first..] {
            let all: f64 = node.iter().map(|(extent, _)| extent).sum();
            for (share, _) in node {
                *share /= all;
            }
        }
        self.chains.push(Chain {
            branches,
            length_m,
            grounded: wire.grounded,
        });
    }

    /// The branch that joins the plate to a wire's first node.
    fn root(&self, point_m: [f64; 3], node: usize) -> Branch {
        let (axis, far) = self
            .edge(point_m)
            .expect("an attached wire begins on the plate's edge");
        let along = &self.axes[axis];
        let across = &self.axes[1 - axis];
        let cell = if far { along.cells - 1 } else { 0 };
        let centre_m = along.centre_m(cell);
        let (span, sign) = match far {
            true => ([centre_m, along.length_m], 1.0),
            false => ([0.0, centre_m], -1.0),
        };
        let mut pieces = Vec::new();
        let mut ends = vec![(node, 1.0)];
        for (strip, share) in across.shares(point_m[1 - axis]) {
            let strips = strip_pieces(axis, span, across, strip).into_iter();
            pieces.extend(strips.map(|(part, piece)| (share * part, piece)));
            ends.push((self.node(ordered(axis, [cell, strip])), -share));
        }
        let mut along_m = [0.0; 3];
        along_m[axis] = sign * (span[1] - span[0]);
        Branch {
            pieces,
            ends,
            along_m,
        }
    }

    fn edge(&self, point_m: [f64; 3]) -> Option<(usize, bool)> {
        let [length_m, width_m] = [0, 1].map(|axis| self.axes[axis].length_m);
        Plate { length_m, width_m }.edge_at(point_m)
    }
}

impl Plate {
    /// The axis across the edge on which a point lies, and whether it is the far one of the two.
    pub(super) fn edge_at(&self, point_m: [f64; 3]) -> Option<(usize, bool)> {
        let sides_m = [self.length_m, self.width_m];
        let inside =
            |axis: usize| (-ON_EDGE_M..=sides_m[axis] + ON_EDGE_M).contains(&point_m[axis]);
        if point_m[2].abs() > ON_EDGE_M || !inside(0) || !inside(1) {
            return None;
        }
        [(0, false), (0, true), (1, false), (1, true)]
            .into_iter()
            .find(|&(axis, far)| {
                let edge_m = if far { sides_m[axis] } else { 0.0 };
                (point_m[axis] - edge_m).abs() <= ON_EDGE_M
            })
    }
}

/// (along, across) an axis as (x, y).
fn ordered<T>(axis: usize, [along, across]: [T; 2]) -> [T; 2] {
    match axis {
        0 => [along, across],
        _ => [across, along],
    }
}

/// A strip between two places along an axis, one cell wide.
fn strip_pieces(axis: usize, span: [f64; 2], across: &Axis, cell: usize) -> Vec<(f64, Piece)> {
    let parts = across.parts_m(cell);
    let share = 1.0 / parts.len() as f64;
    parts
        .into_iter()
        .map(|part| (share, Piece::rectangle(ordered(axis, [span, part]))))
        .collect()
}

/// The points of a polyline with more between them, none further apart than a segment.
fn cut(points_m: &[[f64; 3]], segment_m: f64) -> Vec<[f64; 3]> {
    let mut cut = vec![points_m[0]];
    for pair in points_m.windows(2) {
        let along = difference(pair[1], pair[0]);
        let pieces = (norm(along) / segment_m - 1e-9).ceil().max(1.0);
        for place in 1..=pieces as usize {
            let share = place as f64 / pieces;
            cut.push(std::array::from_fn(|axis| {
                pair[0][axis] + share * along[axis]
            }));
        }
    }
    cut
}

#[cfg(test)]
mod tests {
    use super::*;

    fn mesh(wires: &[Wire]) -> Mesh {
        let axis = |length_m, cells| Axis { length_m, cells };
        Mesh::new([axis(0.16, 8), axis(0.1, 6)], wires, 25e-3)
    }

    fn cable(from: [f64; 2], to: [f64; 2]) -> Wire {
        Wire {
            points_m: vec![[from[0], from[1], 0.0], [to[0], to[1], 0.0]],
            radius_m: 1e-3,
            attached: true,
            grounded: false,
        }
    }

    #[test]
    fn every_edge_takes_a_cable() {
        for (from, to, along) in [
            ([0.0, 0.04], [-1.0, 0.04], [-1.0, 0.0]),
            ([0.16, 0.0999], [1.0, 0.0999], [1.0, 0.0]),
            ([0.05, 0.0], [0.05, -1.0], [0.0, -1.0]),
            ([0.16, 0.1], [0.16, 1.0], [1.0, 0.0]),
        ] {
            let mesh = mesh(&[cable(from, to)]);
            let root = &mesh.branches[mesh.chains[0].branches[0].0];
            let sum: f64 = root.ends.iter().map(|(_, share)| share).sum();
            assert!(sum.abs() < 1e-12 && root.ends[0] == (48, 1.0));
            for (axis, sign) in along.into_iter().enumerate() {
                assert!(root.along_m[axis] * sign >= 0.0);
                assert_eq!(root.along_m[axis] == 0.0, sign == 0.0);
            }
        }
    }

    #[test]
    #[should_panic(expected = "begins on the plate's edge")]
    fn a_cable_cannot_miss_the_plate() {
        mesh(&[cable([-0.01, 0.05], [-1.0, 0.05])]);
    }

    #[test]
    fn branches_join_the_cells_their_index_says() {
        let mesh = mesh(&[]);
        assert_eq!(mesh.nodes.len(), 48);
        assert_eq!(mesh.branches.len(), 7 * 6 + 8 * 5);
        for (axis, cell, next) in [
            (0, [3, 2], [4, 2]),
            (1, [3, 2], [3, 3]),
            (1, [7, 4], [7, 5]),
        ] {
            let branch = &mesh.branches[mesh.plate_branch(axis, cell)];
            assert_eq!(
                branch.ends,
                [(mesh.node(cell), -1.0), (mesh.node(next), 1.0)]
            );
        }
    }

    #[test]
    fn a_wire_may_bend() {
        let wire = Wire {
            points_m: vec![[0.0, 0.05, 0.0], [-0.1, 0.05, 0.0], [-0.1, 0.05, -0.06]],
            radius_m: 1e-3,
            attached: true,
            grounded: false,
        };
        let mesh = mesh(&[wire]);
        let chain = &mesh.chains[0];
        assert_eq!(chain.branches.len(), 1 + 4 + 3);
        assert!((chain.length_m - 0.16).abs() < 1e-12);
        let corner = &mesh.nodes[48 + 4];
        assert_eq!(corner.len(), 2);
        assert!((corner[0].0 - 25.0 / 45.0).abs() < 1e-9);
    }
}
