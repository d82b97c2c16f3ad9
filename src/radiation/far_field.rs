//! Far fields of currents on a board and of what nets pick up there, over all directions.

use super::peak::vertex;
use super::plate::BranchPlace;
use crate::ETA0_OHM;
use num_complex::Complex64;
use std::f64::consts::PI;

/// What a net picks up at a point of the plane: factors of the fields there.
#[derive(Debug, Clone, Copy)]
pub(super) struct Pickup {
    pub(super) at_m: [f64; 2],
    /// Times the electric field upwards.
    pub(super) charge: Complex64,
    /// Along x and y; times the magnetic field to the left of that way.
    pub(super) loop_: [Complex64; 2],
}

/// Currents times lengths, each at its place.
pub(super) struct Flow<'a> {
    branches: &'a [BranchPlace],
    /// Along each axis: number of the branch, its current times its length.
    along: [Vec<(usize, Complex64)>; 3],
}

impl<'a> Flow<'a> {
    /// The flow of currents along the branches.
    pub(super) fn new(branches: &'a [BranchPlace], branches_a: &[Complex64]) -> Self {
        let mut along = [Vec::new(), Vec::new(), Vec::new()];
        for (number, (branch, current)) in branches.iter().zip(branches_a).enumerate() {
            for (axis, along) in along.iter_mut().enumerate() {
                if branch.along_m[axis] != 0.0 {
                    along.push((number, current * branch.along_m[axis]));
                }
            }
        }
        Self { branches, along }
    }

    /// What a wave of 1 V/m from a direction finds, along theta and along phi.
    pub(super) fn toward(&self, at: [f64; 2], k: f64, pickups: &[Pickup]) -> [Complex64; 2] {
        let direction = Direction::new(at);
        let phases: Vec<Complex64> = self
            .branches
            .iter()
            .map(|branch| direction.phase(k, branch.centre_m))
            .collect();
        direction.found(self, &phases, pickups, k)
    }
}

/// A direction on the sphere and its unit vectors.
struct Direction {
    at: [f64; 2],
    toward: [f64; 3],
    theta: [f64; 3],
    phi: [f64; 3],
}

impl Direction {
    fn new(at: [f64; 2]) -> Self {
        let ((sin_theta, cos_theta), (sin_phi, cos_phi)) = (at[0].sin_cos(), at[1].sin_cos());
        Self {
            at,
            toward: [sin_theta * cos_phi, sin_theta * sin_phi, cos_theta],
            theta: [cos_theta * cos_phi, cos_theta * sin_phi, -sin_theta],
            phi: [-sin_phi, cos_phi, 0.0],
        }
    }

    fn phase(&self, k: f64, at_m: [f64; 3]) -> Complex64 {
        let [x, y, z] = self.toward;
        Complex64::cis(k * (x * at_m[0] + y * at_m[1] + z * at_m[2]))
    }

    /// What the waves of both polarisations find of a flow, with the phases of its branches, and of the pickups.
    fn found(
        &self,
        flow: &Flow,
        phases: &[Complex64],
        pickups: &[Pickup],
        k: f64,
    ) -> [Complex64; 2] {
        let flow = flow.along.each_ref().map(|along| {
            along
                .iter()
                .map(|&(branch, current)| current * phases[branch])
                .sum::<Complex64>()
        });
        let mut charge = Complex64::ZERO;
        let mut loops = [Complex64::ZERO; 2];
        for pickup in pickups {
            let phase = self.phase(k, [pickup.at_m[0], pickup.at_m[1], 0.0]);
            charge += phase * pickup.charge;
            loops[0] += phase * pickup.loop_[0];
            loops[1] += phase * pickup.loop_[1];
        }
        [self.theta, self.phi].map(|e| {
            let [x, y, z] = self.toward;
            // The wave's magnetic field, e x r_hat / eta0, in the plane of the board.
            let h = [
                (e[1] * z - e[2] * y) / ETA0_OHM,
                (e[2] * x - e[0] * z) / ETA0_OHM,
            ];
            let scattered = flow[0] * e[0] + flow[1] * e[1] + flow[2] * e[2];
            scattered + charge * e[2] + loops[0] * h[1] - loops[1] * h[0]
        })
    }
}

/// Directions all over the sphere, with the phases that a wave from each has at the branches.
pub(super) struct Directions {
    k: f64,
    /// From pole to pole; around there are twice as many.
    steps: usize,
    directions: Vec<Direction>,
    /// Direction by branch.
    phases: Vec<Vec<Complex64>>,
}

impl Directions {
    pub(super) fn new(steps: usize, k: f64, branches: &[BranchPlace]) -> Self {
        let step = PI / steps as f64;
        let grid = (0..=steps).flat_map(|i| (0..2 * steps).map(move |j| [i, j]));
        let directions: Vec<Direction> = grid
            .map(|at| Direction::new(at.map(|i| i as f64 * step)))
            .collect();
        let table = Coordinates::of(branches);
        let phases = directions
            .iter()
            .map(|direction| table.phases(k, direction))
            .collect();
        Self {
            k,
            steps,
            directions,
            phases,
        }
    }

    /// The square of the largest field, and where it goes.
    pub(super) fn strongest(&self, flow: &Flow, pickups: &[Pickup]) -> (f64, [f64; 2]) {
        let around = 2 * self.steps;
        let squares: Vec<f64> = self
            .directions
            .iter()
            .zip(&self.phases)
            .map(|(direction, phases)| {
                let [theta, phi] = direction.found(flow, phases, pickups, self.k);
                theta.norm_sqr() + phi.norm_sqr()
            })
            .collect();
        let best = (0..squares.len())
            .max_by(|&a, &b| squares[a].total_cmp(&squares[b]))
            .unwrap_or(0);
        let (row, column) = (best / around, best % around);
        let at = |row: usize, column: usize| squares[row * around + column % around];
        let middle = squares[best];
        let sideways = vertex(at(row, column + around - 1), middle, at(row, column + 1));
        let upward = if row == 0 || row == self.steps {
            middle
        } else {
            vertex(at(row - 1, column), middle, at(row + 1, column))
        };
        (sideways + upward - middle, self.directions[best].at)
    }
}

/// The branches' places by the few different coordinates they have: a phase is a product of three.
struct Coordinates {
    different_m: [Vec<f64>; 3],
    of_branches: Vec<[usize; 3]>,
}

impl Coordinates {
    fn of(branches: &[BranchPlace]) -> Self {
        let mut different_m = [Vec::new(), Vec::new(), Vec::new()];
        let of_branches = branches
            .iter()
            .map(|branch| {
                let mut places = [0; 3];
                for axis in 0..3 {
                    let known: &mut Vec<f64> = &mut different_m[axis];
                    let at_m = branch.centre_m[axis];
                    places[axis] = known.iter().position(|&k| k == at_m).unwrap_or_else(|| {
                        known.push(at_m);
                        known.len() - 1
                    });
                }
                places
            })
            .collect();
        Self {
            different_m,
            of_branches,
        }
    }

    fn phases(&self, k: f64, direction: &Direction) -> Vec<Complex64> {
        let mut axis = 0;
        let of_axes = self.different_m.each_ref().map(|different_m| {
            let toward = direction.toward[axis];
            axis += 1;
            different_m
                .iter()
                .map(|at_m| Complex64::cis(k * toward * at_m))
                .collect::<Vec<_>>()
        });
        self.of_branches
            .iter()
            .map(|[x, y, z]| of_axes[0][*x] * of_axes[1][*y] * of_axes[2][*z])
            .collect()
    }
}
