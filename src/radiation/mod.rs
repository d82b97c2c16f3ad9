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
mod own_plane;
mod peak;
pub mod plate;
mod rational;
mod site;
mod vector;

pub use large_plane::{LargePlane, Strongest, field_toward, strongest};
pub use layout::{Layout, Segment};
pub use loop_area::loop_area_v_per_m;
pub use own_plane::{
    Aim, COMPARED_TO_HZ, Footing, OwnPlane, ScanMap, UNKNOWN_CABLE_LENGTHS_M, cable_objection,
    cable_root,
};
pub use site::{
    FLOOR_ABSORBED_ABOVE_HZ, Heights, Polarisation, Site, TABLE_HEIGHT_M, TestSite, two_ray_factors,
};

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

/// The field that a net makes at the antenna, rms: the largest over all places of a scan.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Reading {
    /// The field.
    pub field_v_per_m: f64,
    /// What the loops between traces and plane make of it, without cables.
    pub loops_v_per_m: f64,
    /// What the charged traces make of it, without cables.
    pub charges_v_per_m: f64,
    /// What the cables add: the difference to the field without them; `None` without cables.
    pub cables_v_per_m: Option<f64>,
    /// Where the antenna reads it; `None` in free space and on a large plane, where it is not known.
    pub aim: Option<Aim>,
}

/// A net at one of its harmonics, ready for an antenna.
#[derive(Debug, Clone)]
pub struct LitNet<'a> {
    /// The harmonic's frequency.
    pub frequency_hz: f64,
    /// Where the net lies on that antenna ([`Antenna::lay`]).
    pub footing: &'a Footing,
    /// Its segments, in the order of its layout.
    pub segments: Vec<LitSegment<'a>>,
}

/// What stands between nets and the receiver's antenna: the board's plane, whatever hangs on it, and the site.
pub trait Antenna: Sync {
    /// How far apart frequencies may lie, as a share of themselves, to be read together.
    fn frequency_share(&self) -> f64;

    /// Lays a net on the antenna, once for all frequencies.
    fn lay(&self, layout: &Layout) -> Footing;

    /// The readings of several nets, each at its own frequency near a shared one, those of one frequency together:
    /// for each net, one reading for each distance of the site.
    fn readings(&self, frequency_hz: f64, harmonics: &[LitNet]) -> Vec<Vec<Reading>>;
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
