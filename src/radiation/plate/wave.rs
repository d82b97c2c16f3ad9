//! Plane waves.

use crate::radiation::vector::{cross, dot};
use crate::{LIGHT_SPEED_M_PER_S, MU0_H_PER_M};
use num_complex::Complex64;
use std::f64::consts::TAU;

/// The way the electric field of a plane wave points.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Polarisation {
    /// Along growing theta.
    Theta,
    /// Along growing phi.
    Phi,
}

/// A plane wave of 1 V/m, e exp(+j k r_hat . r): its phase counted from the origin, r_hat towards its
/// source.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PlaneWave {
    /// Angle of the source from z, radians.
    pub theta: f64,
    /// Angle of the source from x about z, radians.
    pub phi: f64,
    /// Which way the electric field points.
    pub polarisation: Polarisation,
}

impl PlaneWave {
    /// Unit vector towards the source.
    pub fn toward(&self) -> [f64; 3] {
        let (sin_theta, cos_theta) = self.theta.sin_cos();
        let (sin_phi, cos_phi) = self.phi.sin_cos();
        [sin_theta * cos_phi, sin_theta * sin_phi, cos_theta]
    }

    /// Unit vector along the electric field.
    pub fn along(&self) -> [f64; 3] {
        let (sin_theta, cos_theta) = self.theta.sin_cos();
        let (sin_phi, cos_phi) = self.phi.sin_cos();
        match self.polarisation {
            Polarisation::Theta => [cos_theta * cos_phi, cos_theta * sin_phi, -sin_theta],
            Polarisation::Phi => [-sin_phi, cos_phi, 0.0],
        }
    }

    /// Electric field in volts per metre, by place in metres.
    pub fn electric(&self, frequency_hz: f64) -> impl Fn([f64; 3]) -> [Complex64; 3] + use<> {
        travelling(frequency_hz, self.toward(), self.along())
    }

    /// Magnetic field in amperes per metre, by place in metres.
    pub fn magnetic(&self, frequency_hz: f64) -> impl Fn([f64; 3]) -> [Complex64; 3] + use<> {
        let impedance_ohm = MU0_H_PER_M * LIGHT_SPEED_M_PER_S;
        let field = cross(self.along(), self.toward()).map(|h| h / impedance_ohm);
        travelling(frequency_hz, self.toward(), field)
    }
}

fn travelling(
    frequency_hz: f64,
    toward: [f64; 3],
    field: [f64; 3],
) -> impl Fn([f64; 3]) -> [Complex64; 3] + use<> {
    let k = TAU * frequency_hz / LIGHT_SPEED_M_PER_S;
    move |place_m| {
        let phase = Complex64::cis(k * dot(toward, place_m));
        field.map(|component| component * phase)
    }
}
