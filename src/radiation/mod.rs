//! Radiation: the field that a net's currents and charges make at the antenna.
//!
//! By reciprocity the field a net sends to the antenna is the response it would show to a wave sent
//! from there. The wave meets the board first, without any net: what it makes of the vertical electric
//! field and the tangential magnetic field at the plane's upper face is the business of an
//! [`Antenna`]. A net is then a sum over its lines of charge times electric field and current times
//! magnetic field.

mod large_plane;
mod layout;
mod loop_area;
mod site;

pub use large_plane::LargePlane;
pub use layout::{Layout, Segment};
pub use loop_area::loop_area_v_per_m;
pub use site::{FLOOR_ABSORBED_ABOVE_HZ, Site, TABLE_HEIGHT_M, two_ray_factors};

use crate::LIGHT_SPEED_M_PER_S;
use crate::spectrum::Spectrum;
use num_complex::Complex64;
use std::f64::consts::TAU;

/// A straight piece of a line at one harmonic, with the two waves on it.
#[derive(Debug, Clone, Copy)]
pub struct LitSegment<'a> {
    /// Where it lies and what it is made of.
    pub segment: &'a Segment,
    /// Phase constant of its waves.
    pub beta_rad_per_m: f64,
    /// Outward wave at the segment's start, rms.
    pub outward_v: Complex64,
    /// Inward wave at the segment's end, rms.
    pub inward_v: Complex64,
}

/// What stands between a net and the receiver's antenna: the board's plane, whatever hangs on it.
pub trait Antenna {
    /// The largest field over all directions times the distance, in volts rms, far away in free space.
    fn strongest_v(&self, frequency_hz: f64, segments: &[LitSegment]) -> f64;
}

/// The largest far field of each harmonic over all directions in free space, times the distance;
/// volts rms.
pub fn strongest_v(antenna: &impl Antenna, layout: &Layout, spectrum: &Spectrum) -> Vec<f64> {
    (0..spectrum.len())
        .map(|place| {
            let frequency_hz = spectrum.frequency_hz(place);
            let segments: Vec<LitSegment> = layout
                .segments
                .iter()
                .map(|segment| {
                    let beta_rad_per_m = TAU * frequency_hz * segment.delay_s_per_m;
                    let travelled = |length_m: f64| Complex64::cis(-beta_rad_per_m * length_m);
                    LitSegment {
                        segment,
                        beta_rad_per_m,
                        outward_v: spectrum.outward_v[[segment.line, place]]
                            * travelled(segment.from_near_m),
                        inward_v: spectrum.inward_v[[segment.line, place]]
                            * travelled(segment.from_far_m),
                    }
                })
                .collect();
            antenna.strongest_v(frequency_hz, &segments)
        })
        .collect()
}

/// What the near field adds to the far field at a distance: sqrt(1 + 1 / (k r)^2), as in the electric
/// field of a small loop (Balanis, Antenna Theory, chapter 5, from memory).
pub fn near_field_factor(frequency_hz: f64, distance_m: f64) -> f64 {
    let kr = TAU * frequency_hz / LIGHT_SPEED_M_PER_S * distance_m;
    (1.0 + 1.0 / (kr * kr)).sqrt()
}
