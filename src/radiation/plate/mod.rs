//! The board as an antenna: a rectangular plate with wires on it, in free space.
//!
//! An integral equation in partial elements (after Ruehli, "Equivalent circuit models for
//! three-dimensional multiconductor systems", IEEE Trans. MTT 22, 1974, 216-221): cells hold charge,
//! branches between them carry current, and every pair acts on each other through retarded potentials.
//! [`Structure`] is the geometry with all that no frequency changes; [`Structure::at`] factors the
//! equations of one frequency; [`Solved`] answers incident fields and sources with [`Currents`]; a
//! [`Probe`] reads charge and current density at a point of the plate.
//!
//! Time goes as exp(+j w t) throughout.

mod axis;
mod kernel;
mod mesh;
mod solve;
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
}
