//! What conductors off the plate's plane, and all images in the floor, do at the plate's face: the electric field
//! upwards and the magnetic field along the plate of retarded charges and currents, each taken at its middle. What
//! lies in the plate's plane makes neither there.

use super::mesh::{Branch, centre_m};
use super::structure::Structure;
use crate::radiation::vector::{difference, norm};
use crate::{LIGHT_SPEED_M_PER_S, MU0_H_PER_M};
use num_complex::Complex64;
use std::f64::consts::{PI, TAU};

/// By branch, what one ampere in its middle makes at a point: electric field upwards in volts per metre, magnetic
/// field along x and y in amperes per metre.
pub type Stray = [Vec<Complex64>; 3];

impl Structure {
    /// Whether anything lies off the plate's plane or is mirrored.
    pub fn strays(&self) -> bool {
        let off = |branch: &Branch| centre_m(&branch.pieces)[2] != 0.0;
        self.floor.is_some() || self.mesh.branches.iter().any(off)
    }

    /// Stray fields at points of the plate.
    pub fn stray(&self, frequency_hz: f64, points_m: &[[f64; 3]]) -> Vec<Stray> {
        let sources = Sources::new(self, frequency_hz);
        points_m.iter().map(|&at_m| sources.at(at_m)).collect()
    }
}

struct Sources<'a> {
    structure: &'a Structure,
    frequency_hz: f64,
    /// Middles of the nodes, with the sign of their charge, and whose they are.
    charges: Vec<([f64; 3], f64, usize)>,
    /// Middles of the branches and what flows there, ways times lengths, and whose they are.
    currents: Vec<([f64; 3], [f64; 3], usize)>,
}

impl<'a> Sources<'a> {
    fn new(structure: &'a Structure, frequency_hz: f64) -> Self {
        let k = TAU * frequency_hz / LIGHT_SPEED_M_PER_S;
        let mesh = &structure.mesh;
        let mut charges: Vec<_> = mesh
            .nodes
            .iter()
            .enumerate()
            .map(|(node, pieces)| (centre_m(pieces), 1.0, node))
            .collect();
        let mut currents: Vec<_> = mesh
            .branches
            .iter()
            .enumerate()
            .map(|(number, branch)| {
                let mean = branch.mean_current(k);
                let along_m = branch.along_m.map(|length_m| mean * length_m);
                (centre_m(&branch.pieces), along_m, number)
            })
            .collect();
        if let Some(floor) = structure.floor {
            let images = charges
                .iter()
                .map(|&(at_m, sign, node)| (floor.mirrored_m(at_m), -sign, node));
            charges.extend(images.collect::<Vec<_>>());
            let images = currents.iter().map(|&(at_m, along_m, number)| {
                (floor.mirrored_m(at_m), floor.image_way(along_m), number)
            });
            currents.extend(images.collect::<Vec<_>>());
        }
        // What lies in the plate's plane makes nothing there.
        charges.retain(|(at_m, ..)| at_m[2] != 0.0);
        currents.retain(|(at_m, along_m, _)| at_m[2] != 0.0 || along_m[2] != 0.0);
        Self {
            structure,
            frequency_hz,
            charges,
            currents,
        }
    }

    fn at(&self, point_m: [f64; 3]) -> Stray {
        let mesh = &self.structure.mesh;
        let omega = TAU * self.frequency_hz;
        let k = omega / LIGHT_SPEED_M_PER_S;
        let inverse_permittivity = MU0_H_PER_M * LIGHT_SPEED_M_PER_S.powi(2);
        let none = vec![Complex64::ZERO; mesh.branches.len()];
        let [mut e_z, mut h_x, mut h_y] = [none.clone(), none.clone(), none];
        let mut upwards = vec![Complex64::ZERO; mesh.nodes.len()];
        for &(from_m, sign, node) in &self.charges {
            let (apart, distance_m, wave) = retarded(k, from_m, point_m);
            let slope = wave * Complex64::new(1.0, k * distance_m) / (distance_m * distance_m);
            upwards[node] += sign * inverse_permittivity / (4.0 * PI) * slope * apart[2];
        }
        for (number, branch) in mesh.branches.iter().enumerate() {
            let ends = branch.ends.iter();
            let charged: Complex64 = ends.map(|&(node, share)| share * upwards[node]).sum();
            e_z[number] += charged / Complex64::new(0.0, omega);
        }
        for &(from_m, along_m, number) in &self.currents {
            let (apart, distance_m, wave) = retarded(k, from_m, point_m);
            let slope =
                wave * Complex64::new(1.0, k * distance_m) / (4.0 * PI * distance_m * distance_m);
            e_z[number] -=
                Complex64::new(0.0, omega * MU0_H_PER_M / (4.0 * PI)) * wave * along_m[2];
            h_x[number] += slope * (along_m[1] * apart[2] - along_m[2] * apart[1]);
            h_y[number] += slope * (along_m[2] * apart[0] - along_m[0] * apart[2]);
        }
        [e_z, h_x, h_y]
    }
}

/// From a source to a point, how far, and exp(-jkR)/R.
fn retarded(k: f64, from_m: [f64; 3], to_m: [f64; 3]) -> ([f64; 3], f64, Complex64) {
    let apart = difference(to_m, from_m);
    let distance_m = norm(apart);
    (
        apart,
        distance_m,
        Complex64::cis(-k * distance_m) / distance_m,
    )
}

#[cfg(test)]
mod tests {
    use super::super::{Floor, Plate, Structure, Wire};
    use super::*;
    use crate::ETA0_OHM;
    use crate::radiation::vector::dot;

    /// Electric field upwards and magnetic field along x and y of a current element, at a point (Balanis, Antenna
    /// Theory, section 4.2: the infinitesimal dipole).
    fn of_element(k: f64, from_m: [f64; 3], along_am: [f64; 3], to_m: [f64; 3]) -> [Complex64; 3] {
        let (apart, r, wave) = retarded(k, from_m, to_m);
        let away = apart.map(|a| a / r);
        let jkr = Complex64::new(0.0, k * r);
        let lengthwise = dot(away, along_am);
        let scale = Complex64::new(0.0, -k * ETA0_OHM / (4.0 * PI)) * wave;
        let near = 1.0 / jkr + 1.0 / (jkr * jkr);
        let e_z = scale * ((1.0 + near) * along_am[2] - (1.0 + 3.0 * near) * lengthwise * away[2]);
        let h = wave * (jkr + 1.0) / (4.0 * PI * r);
        let h_x = h * (along_am[1] * away[2] - along_am[2] * away[1]);
        let h_y = h * (along_am[2] * away[0] - along_am[0] * away[2]);
        [e_z, h_x, h_y]
    }

    /// Charges at nodes and currents between them make the field of as many current elements, which carry their
    /// charges at their ends.
    #[test]
    fn a_hanging_cable_makes_the_field_of_its_current_elements() {
        let frequency_hz = 120e6;
        let k = TAU * frequency_hz / LIGHT_SPEED_M_PER_S;
        let plate = Plate {
            length_m: 0.16,
            width_m: 0.1,
        };
        let wire = Wire {
            points_m: vec![
                [0.0, 0.05, 0.0],
                [-0.1, 0.05, 0.0],
                [-0.1, 0.05, -0.79],
                [-0.7, 0.05, -0.79],
            ],
            radius_m: 1e-3,
            attached: true,
            grounded: false,
        };
        let floor = Floor {
            axis: 2,
            at_m: -0.8,
        };
        let structure = Structure::new(plate, &[wire], Some(floor), 1e9);
        let solved = structure.at(frequency_hz);
        let currents = solved.driven(vec![structure.gap_v(0, 0.3)]);
        let point_m = [0.05, 0.03, 0.0];
        let stray = &structure.stray(frequency_hz, &[point_m])[0];
        let mut expected = [Complex64::ZERO; 3];
        for (place, current_a) in solved.branches().iter().zip(currents[0].branches_a()) {
            let (at_m, along_m) = (place.centre_m, place.along_m);
            let mut elements = vec![(floor.mirrored_m(at_m), floor.image_way(along_m))];
            if at_m[2] != 0.0 {
                elements.push((at_m, along_m));
            }
            for (at_m, along_m) in elements {
                let found = of_element(k, at_m, along_m, point_m);
                for (sum, part) in expected.iter_mut().zip(found) {
                    *sum += current_a * part;
                }
            }
        }
        for (kind, expected) in expected.into_iter().enumerate() {
            let pairs = stray[kind].iter().zip(currents[0].branches_a());
            let found: Complex64 = pairs.map(|(factor, current)| factor * current).sum();
            let off = (found - expected).norm() / expected.norm();
            assert!(off < 0.02, "{kind}: {found} {expected}");
        }
    }
}
