//! The board as an antenna: a rectangular plate with wires on it, in free space or over a metal floor.
//!
//! An integral equation in partial elements (after Ruehli, "Equivalent circuit models for
//! three-dimensional multiconductor systems", IEEE Trans. MTT 22, 1974, 216-221): cells hold charge,
//! branches between them carry current, and every pair acts on each other through retarded potentials.
//! [`Structure`] is the geometry with all that no frequency changes; [`Structure::at`] factors the
//! equations of one frequency; [`Solved`] answers incident fields and sources with [`Currents`]; a
//! [`Probe`] reads charge and current density at a point of the plate. A floor, endless and perfectly
//! conducting, acts as the image of all charges and currents in it.
//!
//! Time goes as exp(+j w t) throughout.

mod axis;
mod kernel;
mod mesh;
mod solve;
mod stray;
mod structure;
mod surface;
mod wave;

pub use structure::{BranchPlace, Solved, Structure};
pub use surface::{Currents, Probe, UpperFace};
pub use wave::{PlaneWave, Polarisation};

/// A rectangular perfectly conducting plate without thickness, in z = 0, one corner at the origin.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Plate {
    /// Side along x, metres.
    pub length_m: f64,
    /// Side along y, metres.
    pub width_m: f64,
}

/// A thin wire: straight pieces between points.
#[derive(Debug, Clone, PartialEq)]
pub struct Wire {
    /// Its ends and corners, metres. An attached wire's first point lies on an edge of the plate.
    pub points_m: Vec<[f64; 3]>,
    /// Radius, metres.
    pub radius_m: f64,
    /// Whether its first point is joined to the plate.
    pub attached: bool,
    /// Whether its last point is joined to the floor, on which it then lies.
    pub grounded: bool,
}

/// An endless metal floor, square to an axis of the plate's frame; the plate lies on its far side.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Floor {
    /// The axis that points upwards: 0, 1 or 2.
    pub axis: usize,
    /// Where along it the floor lies, metres.
    pub at_m: f64,
}

impl Floor {
    /// Where a point's image lies, metres.
    pub fn mirrored_m(self, mut point_m: [f64; 3]) -> [f64; 3] {
        point_m[self.axis] = 2.0 * self.at_m - point_m[self.axis];
        point_m
    }

    /// The way the image of a current flows: upright as the current, level the other way.
    pub fn image_way(self, way: [f64; 3]) -> [f64; 3] {
        let mut image = way.map(|component| -component);
        image[self.axis] = way[self.axis];
        image
    }
}
