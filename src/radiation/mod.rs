//! Radiation: the field that a net's currents and charges make at the antenna.
//!
//! By reciprocity the field a net sends to the antenna is the response it would show to a wave sent
//! from there. The wave meets the board first, without any net: what it makes of the vertical electric
//! field and the tangential magnetic field at the plane's upper face is the business of an
//! [`Antenna`]. A net is then a sum over its lines of charge times electric field and current times
//! magnetic field.

mod far_field;
mod large_plane;
mod layout;
mod loop_area;
mod peak;
pub mod plate;
mod plate_antenna;
mod site;

pub use large_plane::{LargePlane, field_toward};
pub use layout::{Layout, Segment};
pub use loop_area::loop_area_v_per_m;
pub use plate_antenna::{COMPARED_TO_HZ, PlateAntenna, UNKNOWN_CABLE_LENGTHS_M, WorstOf};
pub use site::{FLOOR_ABSORBED_ABOVE_HZ, Site, TABLE_HEIGHT_M, two_ray_factors};

use crate::LIGHT_SPEED_M_PER_S;
use crate::line::WaveOnLine;
use crate::ringing::Network;
use crate::spectrum::Spectrum;
use num_complex::Complex64;
use std::f64::consts::TAU;

/// A straight piece of a line at one harmonic, with the two waves on it.
#[derive(Debug, Clone, Copy)]
pub struct LitSegment<'a> {
    /// Where it lies.
    pub segment: &'a Segment,
    /// Attenuation in neper and, imaginary, phase in radians per length.
    pub propagation_per_m: Complex64,
    /// Characteristic impedance.
    pub impedance_ohm: Complex64,
    /// Outward wave at the segment's start, rms.
    pub outward_v: Complex64,
    /// Inward wave at the segment's end, rms.
    pub inward_v: Complex64,
}

/// A net's far field in free space towards its strongest direction, times the distance; volts rms.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Strongest {
    /// The field.
    pub total_v: f64,
    /// What the loops between traces and plane make of it, without cables.
    pub loops_v: f64,
    /// What the charged traces make of it, without cables.
    pub charges_v: f64,
    /// What the cables add: the difference to the field without them; `None` without cables.
    pub cables_v: Option<f64>,
}

/// What stands between nets and the receiver's antenna: the board's plane, whatever hangs on it.
pub trait Antenna: Sync {
    /// How far apart frequencies may lie, as a share of themselves, to be taken as one.
    fn frequency_share(&self) -> f64;

    /// The strongest far fields of several nets at one frequency.
    fn strongest(&self, frequency_hz: f64, nets: &[Vec<LitSegment>]) -> Vec<Strongest>;
}

/// The segments of a net, with the waves on them at the harmonic at a place of its spectrum.
pub fn lit_segments<'a>(
    network: &Network,
    layout: &'a Layout,
    spectrum: &Spectrum,
    place: usize,
) -> Vec<LitSegment<'a>> {
    let omega = TAU * spectrum.frequency_hz(place);
    let waves: Vec<WaveOnLine> = network
        .spans
        .iter()
        .map(|span| span.line.wave_at(omega))
        .collect();
    let lit = |segment| lit(segment, network, spectrum, place, &waves);
    layout.segments.iter().map(lit).collect()
}

fn lit<'a>(
    segment: &'a Segment,
    network: &Network,
    spectrum: &Spectrum,
    place: usize,
    waves: &[WaveOnLine],
) -> LitSegment<'a> {
    let line = segment.line;
    let wave = waves[line];
    let propagation_per_m = wave.propagation / network.spans[line].line.length_m;
    let travelled = |length_m: f64| (-propagation_per_m * length_m).exp();
    LitSegment {
        segment,
        propagation_per_m,
        impedance_ohm: wave.impedance_ohm,
        outward_v: spectrum.outward_v[[line, place]] * travelled(segment.from_near_m),
        inward_v: spectrum.inward_v[[line, place]] * travelled(segment.from_far_m),
    }
}

/// What the near field adds to the far field at a distance: sqrt(1 + 1 / (k r)^2), as in the electric
/// field of a small loop (Balanis, Antenna Theory, chapter 5, from memory).
pub fn near_field_factor(frequency_hz: f64, distance_m: f64) -> f64 {
    let kr = TAU * frequency_hz / LIGHT_SPEED_M_PER_S * distance_m;
    (1.0 + 1.0 / (kr * kr)).sqrt()
}
