//! What the currents show: charge and current density on the plate, fields at its upper face, wire
//! currents, and their work on any incident field.

use super::Structure;
use super::axis::polynomial;
use super::mesh::Mesh;
use crate::{LIGHT_SPEED_M_PER_S, MU0_H_PER_M};
use num_complex::Complex64;
use std::f64::consts::TAU;

/// A point of the plate: the weights by which the branch currents make its charge and current density.
///
/// Between cells the density over its edge factor is interpolated. Charge crowds as
/// 1 / sqrt(x (L - x) y (W - y)), a current along x as sqrt(x (L - x)) / sqrt(y (W - y)).
#[derive(Debug, Clone)]
pub struct Probe {
    /// Charge density by the charges of cells, per square metre.
    pub charge: Vec<(usize, f64)>,
    /// The same by the branches: growth of the charge density with time.
    growth: Vec<(usize, f64)>,
    /// Current density along x and y by the currents between cells, per metre.
    pub current: [Vec<(usize, f64)>; 2],
}

impl Probe {
    pub(super) fn new(mesh: &Mesh, into_cells: &[Vec<(usize, f64)>], point_m: [f64; 2]) -> Self {
        let density = [0, 1].map(|axis| mesh.axes[axis].density_weights(point_m[axis]));
        let crossing = [0, 1].map(|axis| mesh.axes[axis].crossing_weights(point_m[axis]));
        let charge: Vec<(usize, f64)> = products(&density[0], &density[1])
            .into_iter()
            .map(|(cell, weight)| (mesh.node(cell), weight))
            .collect();
        let mut growth = Vec::new();
        for &(cell, weight) in &charge {
            let into = into_cells[cell].iter();
            growth.extend(into.map(|&(branch, share)| (branch, share * weight)));
        }
        let current = [0, 1].map(|axis| {
            let weights = match axis {
                0 => products(&crossing[0], &density[1]),
                _ => products(&density[0], &crossing[1]),
            };
            let branches = weights.into_iter();
            branches
                .map(|(cell, weight)| (mesh.plate_branch(axis, cell), weight))
                .collect()
        });
        Self {
            charge,
            growth: merged(growth),
            current,
        }
    }

    /// Adds to a set of voltages along the branches those that, taken as a source, drive what this point
    /// picks up: charge density times `charge` plus current density times `current`. By reciprocity the
    /// currents they drive then give the pick-up of any incident field as [`Currents::work_va`], so that
    /// one solution serves all fields.
    pub fn add_pickup(
        &self,
        frequency_hz: f64,
        charge: Complex64,
        current: [Complex64; 2],
        voltages: &mut [Complex64],
    ) {
        let charge = charge / Complex64::new(0.0, TAU * frequency_hz);
        let parts = [
            (&self.growth, charge),
            (&self.current[0], current[0]),
            (&self.current[1], current[1]),
        ];
        for (weights, factor) in parts {
            for &(branch, weight) in weights {
                voltages[branch] += weight * factor;
            }
        }
    }
}

fn products(x: &[(usize, f64)], y: &[(usize, f64)]) -> Vec<([usize; 2], f64)> {
    let row =
        |&(j, across): &(usize, f64)| x.iter().map(move |&(i, along)| ([i, j], along * across));
    y.iter().flat_map(row).collect()
}

/// One weight for each branch.
fn merged(mut weights: Vec<(usize, f64)>) -> Vec<(usize, f64)> {
    weights.sort_by_key(|&(branch, _)| branch);
    let mut merged: Vec<(usize, f64)> = Vec::with_capacity(weights.len());
    for (branch, weight) in weights {
        match merged.last_mut() {
            Some((last, sum)) if *last == branch => *sum += weight,
            _ => merged.push((branch, weight)),
        }
    }
    merged
}

/// What a trace over the plate feels of the whole field.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct UpperFace {
    /// Electric field away from the plate, volts per metre.
    pub e_z_v_per_m: Complex64,
    /// Magnetic field along x, amperes per metre.
    pub h_x_a_per_m: Complex64,
    /// Magnetic field along y, amperes per metre.
    pub h_y_a_per_m: Complex64,
}

/// The currents of one incident field or source.
#[derive(Debug, Clone)]
pub struct Currents<'a> {
    structure: &'a Structure,
    frequency_hz: f64,
    branches_a: Vec<Complex64>,
}

impl<'a> Currents<'a> {
    pub(super) fn new(
        structure: &'a Structure,
        frequency_hz: f64,
        branches_a: Vec<Complex64>,
    ) -> Self {
        Self {
            structure,
            frequency_hz,
            branches_a,
        }
    }

    fn sum(&self, weights: &[(usize, f64)]) -> Complex64 {
        let terms = weights.iter();
        terms
            .map(|&(branch, weight)| weight * self.branches_a[branch])
            .sum()
    }

    /// The currents in the middle of the branches, amperes.
    pub fn branches_a(&self) -> &[Complex64] {
        &self.branches_a
    }

    /// The charges of the plate's cells, coulombs; those of cables are not counted.
    pub fn cells_c(&self) -> Vec<Complex64> {
        let into_cells = self.structure.into_cells.iter();
        into_cells
            .map(|into| self.sum(into) / Complex64::new(0.0, TAU * self.frequency_hz))
            .collect()
    }

    /// Charge density of both faces, coulombs per square metre. A wire's own charge is not counted.
    pub fn charge_c_per_m2(&self, probe: &Probe) -> Complex64 {
        self.sum(&probe.growth) / Complex64::new(0.0, TAU * self.frequency_hz)
    }

    /// Current density of both faces along x and y, amperes per metre.
    pub fn current_a_per_m(&self, probe: &Probe) -> [Complex64; 2] {
        [self.sum(&probe.current[0]), self.sum(&probe.current[1])]
    }

    /// The whole field at the upper face, from the incident one at the same point (V/m, A/m): each face has
    /// half of the charge and of the current.
    pub fn upper_face(
        &self,
        probe: &Probe,
        electric: [Complex64; 3],
        magnetic: [Complex64; 3],
    ) -> UpperFace {
        let inverse_permittivity = MU0_H_PER_M * LIGHT_SPEED_M_PER_S.powi(2);
        let [k_x, k_y] = self.current_a_per_m(probe);
        UpperFace {
            e_z_v_per_m: electric[2] + self.charge_c_per_m2(probe) * inverse_permittivity / 2.0,
            h_x_a_per_m: magnetic[0] + k_y / 2.0,
            h_y_a_per_m: magnetic[1] - k_x / 2.0,
        }
    }

    /// Current along a wire, away from its first point, at a distance from that point; amperes.
    pub fn wire_current_a(&self, wire: usize, distance_m: f64) -> Complex64 {
        let chain = &self.structure.mesh.chains[wire];
        let known = chain.branches.iter();
        let mut known: Vec<(f64, Complex64)> = known
            .map(|&(branch, place_m)| (place_m, self.branches_a[branch]))
            .collect();
        if known[0].0 > 0.0 {
            known.insert(0, (0.0, Complex64::ZERO));
        }
        if !chain.grounded {
            known.push((chain.length_m, Complex64::ZERO));
        }
        let places_m: Vec<f64> = known.iter().map(|(place_m, _)| *place_m).collect();
        let weights = polynomial(&places_m, distance_m).into_iter();
        weights.map(|(place, weight)| weight * known[place].1).sum()
    }

    /// Sum over the branches of voltage times current, volt amperes (no conjugate).
    ///
    /// With a plane wave's voltages ([`super::Solved::incident_v`]) it gives the far field towards the wave's
    /// source along the wave's field: E r = -j w mu0 / (4 pi) exp(-jkr) times it over 1 V/m.
    pub fn work_va(&self, voltages: &[Complex64]) -> Complex64 {
        let pairs = voltages.iter().zip(&self.branches_a);
        pairs.map(|(voltage, current)| voltage * current).sum()
    }
}
