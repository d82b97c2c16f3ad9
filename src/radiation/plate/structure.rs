//! The integral equation: geometry once, a factored matrix per frequency.
//!
//! Along each branch the incident field drives the current against the vector potential of all currents
//! and the difference of its nodes' potentials; the charges are what the currents leave behind. The mean
//! of exp(-jkR)/R between two pieces is their mean of 1/R, singular and so integrated exactly, plus the
//! smooth rest (exp(-jkR) - 1)/R between their centres; on itself a piece keeps -jk of it, by which it
//! radiates.
//!
//! A branch's unknown is the current in its middle. Its mean over the branch is taken as a wave's,
//! sin(kl/2)/(kl/2) of it, in what it makes and in what it feels, so that a wave runs along a cut-up wire
//! at its right speed.

use super::axis::Axis;
use super::kernel::{Piece, mean_inverse_distance_per_m};
use super::mesh::{Branch, Mesh, Node, centre_m};
use super::solve::{Factors, Symmetric};
use super::surface::{Currents, Probe};
use super::{Floor, Plate, Wire};
use crate::radiation::vector::{difference, dot, norm};
use crate::{LIGHT_SPEED_M_PER_S, MU0_H_PER_M};
use num_complex::Complex64;
use std::f64::consts::{PI, TAU};

/// Cells along the longer side.
const CELLS: f64 = 13.0;
/// Cells along the shorter side at least.
const FEWEST_CELLS: f64 = 7.0;
/// The widest cell, in wavelengths.
const CELL_WAVELENGTHS: f64 = 0.1;
/// The longest wire segment, metres and wavelengths.
const SEGMENT_M: f64 = 25e-3;
const SEGMENT_WAVELENGTHS: f64 = 0.04;
/// Shorter ones cost more than they tell: at 2 GHz this is 0.06 wavelengths.
const SHORTEST_SEGMENT_M: f64 = 9e-3;

/// Where a branch lies.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct BranchPlace {
    /// Its middle, metres.
    pub centre_m: [f64; 3],
    /// From its start to its end, metres, times the mean over its length of what it carries in the middle.
    pub along_m: [f64; 3],
}

/// Plate and wires, with all that does not depend on the frequency.
#[derive(Debug, Clone)]
pub struct Structure {
    pub(super) mesh: Mesh,
    pub(super) into_cells: Vec<Vec<(usize, f64)>>,
    /// Between each node and those from it on.
    nodes: Vec<Pair>,
    /// The same between branches, with the scalar product of their lengths; none between perpendicular ones.
    branches: Vec<Option<(Pair, f64)>>,
    pub(super) floor: Option<Floor>,
    /// As `nodes` and `branches`, the second of each two being its image in the floor; empty without one.
    node_images: Vec<Pair>,
    branch_images: Vec<Option<(Pair, f64)>>,
}

/// Two nodes or two branches.
#[derive(Debug, Clone, Copy)]
struct Pair {
    mean_inverse_per_m: f64,
    centres_apart_m: f64,
}

impl Pair {
    fn new(a: &[(f64, Piece)], b: &[(f64, Piece)]) -> Self {
        let mut mean_inverse_per_m = 0.0;
        for (share, piece) in a {
            for (other_share, other) in b {
                let mean = mean_inverse_distance_per_m(piece, other);
                mean_inverse_per_m += share * other_share * mean;
            }
        }
        Self {
            mean_inverse_per_m,
            centres_apart_m: norm(difference(centre_m(a), centre_m(b))),
        }
    }

    /// Mean of exp(-jkR)/R.
    fn retarded_per_m(&self, k: f64) -> Complex64 {
        let Self {
            mean_inverse_per_m,
            centres_apart_m,
        } = *self;
        let turn = k * centres_apart_m;
        if turn < 1e-6 {
            return Complex64::new(mean_inverse_per_m, -k);
        }
        mean_inverse_per_m + (Complex64::cis(-turn) - 1.0) / centres_apart_m
    }
}

impl Structure {
    /// Cuts up the conductors finely enough for a highest frequency and takes their static integrals.
    ///
    /// # Panics
    /// If an attached wire does not begin on an edge of the plate.
    pub fn new(plate: Plate, wires: &[Wire], floor: Option<Floor>, top_frequency_hz: f64) -> Self {
        let wavelength_m = LIGHT_SPEED_M_PER_S / top_frequency_hz;
        let sides_m = [plate.length_m, plate.width_m];
        let longer_m = plate.length_m.max(plate.width_m);
        let cells = [0, 1].map(|axis| {
            let side_m: f64 = sides_m[axis];
            let share = CELLS * side_m / longer_m;
            // The widest cell, in the middle, is pi / 2 times the mean.
            let short = PI / 2.0 * side_m / (CELL_WAVELENGTHS * wavelength_m);
            let cells = share.max(short).max(FEWEST_CELLS).ceil() as usize;
            let roots_m: Vec<f64> = wires
                .iter()
                .filter(|wire| wire.attached)
                .filter_map(|wire| {
                    let (across, _) = plate.edge_at(wire.points_m[0])?;
                    (across != axis).then_some(wire.points_m[0][axis])
                })
                .collect();
            Axis::fitted(side_m, cells, &roots_m).cells
        });
        let segment_m = (SEGMENT_WAVELENGTHS * wavelength_m).clamp(SHORTEST_SEGMENT_M, SEGMENT_M);
        Self::with_mesh(plate, wires, floor, cells, segment_m)
    }

    /// The same with a given number of cells along x and y and a longest wire segment.
    ///
    /// # Panics
    /// If an attached wire does not begin on an edge of the plate.
    pub fn with_mesh(
        plate: Plate,
        wires: &[Wire],
        floor: Option<Floor>,
        cells: [usize; 2],
        segment_m: f64,
    ) -> Self {
        let sides_m = [plate.length_m, plate.width_m];
        let axes = [0, 1].map(|axis| Axis {
            length_m: sides_m[axis],
            cells: cells[axis],
        });
        Self::of(Mesh::new(axes, wires, segment_m), floor)
    }

    pub(super) fn of(mesh: Mesh, floor: Option<Floor>) -> Self {
        let images = floor.map(|floor| mesh.image(floor));
        let (node_images, branch_images) = match &images {
            Some((nodes, branches)) => (
                between_nodes(&mesh.nodes, nodes),
                between_branches(&mesh.branches, branches),
            ),
            None => (Vec::new(), Vec::new()),
        };
        Self {
            into_cells: mesh.flows_into_cells(),
            nodes: between_nodes(&mesh.nodes, &mesh.nodes),
            branches: between_branches(&mesh.branches, &mesh.branches),
            mesh,
            floor,
            node_images,
            branch_images,
        }
    }

    /// Number of unknown currents.
    pub fn unknowns(&self) -> usize {
        self.mesh.branches.len()
    }

    /// Number of cells along x and y.
    pub fn cells(&self) -> [usize; 2] {
        [self.mesh.axes[0].cells, self.mesh.axes[1].cells]
    }

    /// Static capacitance to infinity, all conductors at one potential; farads.
    pub fn capacitance_f(&self) -> f64 {
        let order = self.mesh.nodes.len();
        let mut matrix = Symmetric::zeros(order);
        let mut pairs = self.nodes.iter();
        for column in 0..order {
            for (row, pair) in (column..order).zip(pairs.by_ref()) {
                matrix.set(row, column, pair.mean_inverse_per_m.into());
            }
        }
        let mut charges = [vec![Complex64::ONE; order]];
        matrix.factor().solve(&mut charges);
        let sum: f64 = charges[0].iter().map(|charge| charge.re).sum();
        // 4 pi eps0
        4.0 * PI / (MU0_H_PER_M * LIGHT_SPEED_M_PER_S.powi(2)) * sum
    }

    /// The equations of one frequency, factored.
    pub fn at(&self, frequency_hz: f64) -> Solved<'_> {
        let k = TAU * frequency_hz / LIGHT_SPEED_M_PER_S;
        let means: Vec<f64> = self
            .mesh
            .branches
            .iter()
            .map(|branch| branch.mean_current(k))
            .collect();
        Solved {
            structure: self,
            frequency_hz,
            factors: self.matrix(k, &means).factor(),
            means,
        }
    }

    /// The equations, divided by j w mu0 / 4 pi.
    fn matrix(&self, k: f64, means: &[f64]) -> Symmetric {
        let nodes = self.mesh.nodes.len();
        let mut potentials = vec![Complex64::ZERO; nodes * nodes];
        let mut pairs = self.nodes.iter();
        let mut images = self.node_images.iter();
        for first in 0..nodes {
            for (second, pair) in (first..nodes).zip(pairs.by_ref()) {
                let mut potential = pair.retarded_per_m(k) / (k * k);
                if let Some(image) = images.next() {
                    potential -= image.retarded_per_m(k) / (k * k);
                }
                potentials[first * nodes + second] = potential;
                potentials[second * nodes + first] = potential;
            }
        }
        let branches = &self.mesh.branches;
        let mut matrix = Symmetric::zeros(branches.len());
        let mut potential = vec![Complex64::ZERO; nodes];
        let mut pairs = self.branches.iter();
        let mut images = self.branch_images.iter();
        for (column, branch) in branches.iter().enumerate() {
            potential.fill(Complex64::ZERO);
            for &(node, share) in &branch.ends {
                let of_node = &potentials[node * nodes..(node + 1) * nodes];
                for (sum, of_node) in potential.iter_mut().zip(of_node) {
                    *sum += share * of_node;
                }
            }
            for (row, pair) in (column..branches.len()).zip(pairs.by_ref()) {
                let ends = branches[row].ends.iter();
                let mut entry: Complex64 =
                    ends.map(|&(node, share)| -share * potential[node]).sum();
                let image = images.next().and_then(Option::as_ref);
                for (pair, lengths_m2) in [pair.as_ref(), image].into_iter().flatten() {
                    let lengths_m2 = means[row] * means[column] * lengths_m2;
                    entry += lengths_m2 * pair.retarded_per_m(k);
                }
                matrix.set(row, column, entry);
            }
        }
        matrix
    }

    /// Number of cells.
    pub fn cell_count(&self) -> usize {
        self.into_cells.len()
    }

    /// Number of branches that lie between cells.
    pub fn plate_branches(&self) -> usize {
        let [columns, rows] = self.cells();
        (columns - 1) * rows + columns * (rows - 1)
    }

    /// What gives charge and current density at a point inside the plate, metres; on its very edge they are
    /// infinite.
    pub fn probe(&self, x_m: f64, y_m: f64) -> Probe {
        Probe::new(&self.mesh, &self.into_cells, [x_m, y_m])
    }

    /// The voltages of a 1 V source in a wire, in the segment whose middle is nearest to a distance from the
    /// wire's first point.
    pub fn gap_v(&self, wire: usize, distance_m: f64) -> Vec<Complex64> {
        let off = |place_m: f64| (place_m - distance_m).abs();
        let nearest = self.mesh.chains[wire]
            .branches
            .iter()
            .min_by(|a, b| off(a.1).total_cmp(&off(b.1)));
        let mut voltages = vec![Complex64::ZERO; self.unknowns()];
        if let Some(&(branch, _)) = nearest {
            voltages[branch] = Complex64::ONE;
        }
        voltages
    }
}

/// Between each and those of the others from the same place on.
fn between_nodes(nodes: &[Node], others: &[Node]) -> Vec<Pair> {
    let from = |(first, a): (usize, &Node)| {
        let others = others[first..].iter();
        others.map(|b| Pair::new(a, b)).collect::<Vec<_>>()
    };
    nodes.iter().enumerate().flat_map(from).collect()
}

/// The same, with the scalar product of the lengths; none between perpendicular ones.
fn between_branches(branches: &[Branch], others: &[Branch]) -> Vec<Option<(Pair, f64)>> {
    let between = |a: &Branch, b: &Branch| {
        let lengths_m2 = dot(a.along_m, b.along_m);
        let largest_m2 = dot(a.along_m, a.along_m).max(dot(b.along_m, b.along_m));
        let parallel = lengths_m2.abs() > 1e-12 * largest_m2;
        parallel.then(|| (Pair::new(&a.pieces, &b.pieces), lengths_m2))
    };
    let from = |(first, a): (usize, &Branch)| {
        let others = others[first..].iter();
        others.map(|b| between(a, b)).collect::<Vec<_>>()
    };
    branches.iter().enumerate().flat_map(from).collect()
}

/// The factored equations of one frequency.
#[derive(Debug, Clone)]
pub struct Solved<'a> {
    structure: &'a Structure,
    frequency_hz: f64,
    factors: Factors,
    /// Mean current of each branch over that in its middle.
    means: Vec<f64>,
}

impl<'a> Solved<'a> {
    /// The currents that incident fields drive, each field in volts per metre by place in metres.
    pub fn respond<F>(&self, fields: &[F]) -> Vec<Currents<'a>>
    where
        F: Fn([f64; 3]) -> [Complex64; 3],
    {
        let voltages = fields.iter().map(|field| self.incident_v(field));
        self.driven(voltages.collect())
    }

    /// The voltage that an incident field puts along each branch, the field in volts per metre by place in
    /// metres.
    pub fn incident_v(&self, field: &impl Fn([f64; 3]) -> [Complex64; 3]) -> Vec<Complex64> {
        let voltage = |(branch, mean): (&Branch, &f64)| {
            let field = field(centre_m(&branch.pieces));
            let along = field.into_iter().zip(branch.along_m);
            along.map(|(e, length_m)| e * length_m * mean).sum()
        };
        let branches = self.structure.mesh.branches.iter();
        branches.zip(&self.means).map(voltage).collect()
    }

    /// The branches that carry the unknown currents, in their order, as they act on far fields.
    pub fn branches(&self) -> Vec<BranchPlace> {
        let place = |(branch, mean): (&Branch, &f64)| BranchPlace {
            centre_m: centre_m(&branch.pieces),
            along_m: branch.along_m.map(|length_m| length_m * mean),
        };
        let branches = self.structure.mesh.branches.iter();
        branches.zip(&self.means).map(place).collect()
    }

    /// The currents that voltages along the branches drive, for several sets of them.
    pub fn driven(&self, mut voltages: Vec<Vec<Complex64>>) -> Vec<Currents<'a>> {
        // 4 pi / (j w mu0)
        let scale = Complex64::new(0.0, -2.0 / (self.frequency_hz * MU0_H_PER_M));
        self.factors.solve(&mut voltages);
        voltages
            .into_iter()
            .map(|mut branches| {
                for current in &mut branches {
                    *current *= scale;
                }
                Currents::new(self.structure, self.frequency_hz, branches)
            })
            .collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A thin half-wave dipole: 73.1 + j42.5 ohm (Balanis, Antenna Theory, chapter 8, from memory), the
    /// limit of no thickness, reached slowly: the thinner, the nearer.
    #[test]
    fn half_wave_dipole() {
        let frequency_hz = 300e6;
        let half_m = LIGHT_SPEED_M_PER_S / frequency_hz / 4.0;
        let impedance_ohm = |radius_m: f64| {
            let wire = Wire {
                points_m: vec![[0.0, 0.0, -half_m], [0.0, 0.0, half_m]],
                radius_m,
                attached: false,
                grounded: false,
            };
            let structure = Structure::of(Mesh::of_wires(&[wire], half_m / 50.5), None);
            let gap = structure.gap_v(0, half_m);
            let currents = structure.at(frequency_hz).driven(vec![gap]);
            1.0 / currents[0].wire_current_a(0, half_m)
        };
        let expected = Complex64::new(73.1, 42.5);
        let off = |radius_m: f64| (impedance_ohm(radius_m) - expected).norm();
        assert!(off(1e-6) < 5.0 && off(1e-12) < 2.0 && off(1e-24) < 1.2);
    }
}
