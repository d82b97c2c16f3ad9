//! A plane so large that a wave from the antenna finds no edge: the closed form.
//!
//! The wave doubles the vertical electric and the tangential magnetic field at the plane. With
//! u = sin(theta) cos(phi) taken from a segment's direction, height h, substrate er and capacitance c'
//! per length,
//!
//! ```text
//! E_theta = (w mu0 2h / 4 pi r) { k cos(phi) Int I e^{jkux} dx - (w c' / er) sin(theta) Int V e^{jkux} dx }
//! E_phi   = -(w mu0 2h / 4 pi r)  k cos(theta) sin(phi) Int I e^{jkux} dx
//! ```
//!
//! which, integrated over the half sphere, gives the powers that Lewin ("Radiation from discontinuities
//! in strip-line", Proc. IEE 107C, 1960, 163-170) published for an open and a matched end.

use super::peak::vertex;
use super::site::TestSite;
use super::{Antenna, Footing, Layout, LitNet, LitSegment, Reading, near_field_factor};
use crate::{LIGHT_SPEED_M_PER_S, MU0_H_PER_M};
use num_complex::Complex64;
use std::f64::consts::{PI, TAU};

/// The board's plane, taken as endless, on a test site: the strongest field of free space times the highest factor
/// that the floor may have.
#[derive(Debug, Clone)]
pub struct LargePlane {
    /// Where the antenna stands.
    pub test_site: TestSite,
}

/// A net's far field in free space towards its strongest direction, times the distance; volts rms.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Strongest {
    /// The field.
    pub total_v: f64,
    /// What the loops between traces and plane make of it.
    pub loops_v: f64,
    /// What the charged traces make of it.
    pub charges_v: f64,
}

/// Charge and current of a net as seen from one direction, volts when put into the field.
#[derive(Debug, Clone, Copy, Default)]
struct Moments {
    /// k h Int I
    loops: Complex64,
    /// (w c' / er) h Int V
    charges: Complex64,
}

/// A segment with all that does not depend on the direction.
struct Traced<'a> {
    lit: &'a LitSegment<'a>,
    /// k L / 2
    half_phase: f64,
    /// Propagation over half the length, and its hyperbolic cosine and sine.
    half: Complex64,
    cosh: Complex64,
    sinh: Complex64,
    loop_scale: Complex64,
    charge_scale: Complex64,
}

impl<'a> Traced<'a> {
    fn new(frequency_hz: f64, lit: &'a LitSegment<'a>) -> Self {
        let k = TAU * frequency_hz / LIGHT_SPEED_M_PER_S;
        let segment = lit.segment;
        let half = lit.propagation_per_m * (segment.length_m / 2.0);
        let grown = half.exp();
        let faded = 1.0 / grown;
        let common = faded * (segment.length_m * segment.height_m);
        // Charge per length is the shunt admittance, propagation / impedance, times V over j omega.
        let admittance_s_per_m = lit.propagation_per_m / lit.impedance_ohm;
        Self {
            lit,
            half_phase: k * segment.length_m / 2.0,
            half,
            cosh: (grown + faded) / 2.0,
            sinh: (grown - faded) / 2.0,
            loop_scale: common * k / lit.impedance_ohm,
            charge_scale: common * admittance_s_per_m * Complex64::new(0.0, -1.0)
                / segment.permittivity,
        }
    }
}

impl Antenna for LargePlane {
    fn frequency_share(&self) -> f64 {
        0.0
    }

    fn lay(&self, _: &Layout) -> Footing {
        Footing::default()
    }

    fn readings(&self, frequency_hz: f64, harmonics: &[LitNet]) -> Vec<Vec<Reading>> {
        let TestSite {
            site,
            heights,
            distances_m,
        } = &self.test_site;
        let at_distances: Vec<f64> = distances_m
            .iter()
            .map(|&distance_m| {
                near_field_factor(frequency_hz, distance_m)
                    * site.factor(heights, frequency_hz, distance_m)
                    / distance_m
            })
            .collect();
        let of_net = |net: &LitNet| {
            let strongest = strongest(net.frequency_hz, &net.segments);
            let distances = at_distances.iter();
            distances
                .map(|at_distance| Reading {
                    field_v_per_m: at_distance * strongest.total_v,
                    loops_v_per_m: at_distance * strongest.loops_v,
                    charges_v_per_m: at_distance * strongest.charges_v,
                    cables_v_per_m: None,
                    aim: None,
                })
                .collect()
        };
        harmonics.iter().map(of_net).collect()
    }
}

/// The strongest far field of a net in free space.
pub fn strongest(frequency_hz: f64, segments: &[LitSegment]) -> Strongest {
    let scale = scale_ohm_per_m(frequency_hz);
    let peak = match positions_on_one_line(segments) {
        Some(positions_m) => strongest_of_straight(frequency_hz, segments, &positions_m),
        None => strongest_of_any(frequency_hz, segments),
    };
    Strongest {
        total_v: scale * peak.squared.sqrt(),
        loops_v: scale * peak.loops,
        charges_v: scale * peak.charges,
    }
}

/// The strongest direction, before the scale of the field.
struct Peak {
    squared: f64,
    /// What the loops and the charges make of it.
    loops: f64,
    charges: f64,
}

/// w mu0 2 / 4 pi
fn scale_ohm_per_m(frequency_hz: f64) -> f64 {
    TAU * frequency_hz * MU0_H_PER_M * 2.0 / (4.0 * PI)
}

/// The two components of the far field towards a direction, (theta, phi) in radians from the vertical
/// and from x, times the distance; volts.
pub fn field_toward(
    frequency_hz: f64,
    segments: &[LitSegment],
    theta: f64,
    phi: f64,
) -> [Complex64; 2] {
    let traced: Vec<Traced> = segments
        .iter()
        .map(|lit| Traced::new(frequency_hz, lit))
        .collect();
    toward(frequency_hz, &traced, theta, phi)
        .map(|component| scale_ohm_per_m(frequency_hz) * component)
}

/// The same without its scale.
fn toward(frequency_hz: f64, segments: &[Traced], theta: f64, phi: f64) -> [Complex64; 2] {
    let k = TAU * frequency_hz / LIGHT_SPEED_M_PER_S;
    let (sin_theta, cos_theta) = theta.sin_cos();
    let (sin_phi, cos_phi) = phi.sin_cos();
    let mut field = [Complex64::ZERO; 2];
    for traced in segments {
        let segment = traced.lit.segment;
        let [dx, dy] = segment.direction;
        let along = cos_phi * dx + sin_phi * dy;
        let across = sin_phi * dx - cos_phi * dy;
        let [x, y] = segment.start_m;
        let start = Complex64::cis(k * sin_theta * (cos_phi * x + sin_phi * y));
        let moments = traced.moments(sin_theta * along);
        field[0] += start * (along * moments.loops - sin_theta * moments.charges);
        field[1] -= start * cos_theta * across * moments.loops;
    }
    field
}

impl Traced<'_> {
    /// Moments of the segment, its start as the phase reference, towards a direction `u` along it.
    fn moments(&self, u: f64) -> Moments {
        // Int_0^L e^{zx} dx = L e^{zL/2} sinh(zL/2) / (zL/2), with z = jku -+ propagation
        let turn = self.half_phase * u;
        let (sin, cos) = turn.sin_cos();
        let (even, odd) = (Complex64::new(0.0, sin) * self.cosh, cos * self.sinh);
        let outward = sinhc(
            even - odd,
            Complex64::new(-self.half.re, turn - self.half.im),
        );
        let inward = sinhc(
            even + odd,
            Complex64::new(self.half.re, turn + self.half.im),
        );
        let (outward, inward) = (self.lit.outward_v * outward, self.lit.inward_v * inward);
        let travel = Complex64::new(cos, sin);
        Moments {
            loops: travel * self.loop_scale * (outward - inward),
            charges: travel * self.charge_scale * (outward + inward),
        }
    }
}

/// sinh(z) / z where sinh(z) is known.
fn sinhc(sinh: Complex64, z: Complex64) -> Complex64 {
    if z.norm_sqr() < 1e-8 {
        1.0 + z * z / 6.0
    } else {
        sinh / z
    }
}

/// Where the segments start on the line they all lie on, in its direction, if there is one.
fn positions_on_one_line(segments: &[LitSegment]) -> Option<Vec<f64>> {
    let first = segments.first()?.segment;
    let [dx, dy] = first.direction;
    segments
        .iter()
        .map(|LitSegment { segment, .. }| {
            let (x, y) = (
                segment.start_m[0] - first.start_m[0],
                segment.start_m[1] - first.start_m[1],
            );
            let turned = segment.direction[0] * dy - segment.direction[1] * dx;
            let same_way = segment.direction[0] * dx + segment.direction[1] * dy > 0.0;
            let aside_m = x * dy - y * dx;
            (same_way && turned.abs() < 1e-9 && aside_m.abs() < 1e-9).then_some(x * dx + y * dy)
        })
        .collect()
}

/// The largest squared field of segments on one line.
///
/// For a given u the squared field |A|^2 (1 + u^2) - 2 u Re(A B*) + s^2 (|B|^2 - |A|^2), A the loops, B
/// the charges and s = sin(theta), is largest at an end of |u| <= s <= 1: along the plane, where
/// it is |u A - B|^2, or straight over the line, where it is |A - u B|^2. Only u needs a search.
fn strongest_of_straight(frequency_hz: f64, segments: &[LitSegment], positions_m: &[f64]) -> Peak {
    let k = TAU * frequency_hz / LIGHT_SPEED_M_PER_S;
    let extent_m = segments
        .iter()
        .zip(positions_m)
        .map(|(lit, start_m)| start_m + lit.segment.length_m)
        .fold(0.0, f64::max);
    let traced: Vec<Traced> = segments
        .iter()
        .map(|lit| Traced::new(frequency_hz, lit))
        .collect();
    let moments = |u: f64| {
        let mut sum = Moments::default();
        for (traced, position_m) in traced.iter().zip(positions_m) {
            let start = Complex64::cis(k * u * position_m);
            let Moments { loops, charges } = traced.moments(u);
            sum.loops += start * loops;
            sum.charges += start * charges;
        }
        sum
    };
    let both = |u: f64| {
        let Moments { loops, charges } = moments(u);
        [
            (u * loops - charges).norm_sqr(),
            (loops - u * charges).norm_sqr(),
        ]
    };
    let steps = 16 + (k * extent_m * 4.0) as usize;
    let at = |i: usize| -1.0 + 2.0 * i as f64 / steps as f64;
    let samples: Vec<f64> = (0..=steps)
        .map(|i| {
            let [along_plane, over_line] = both(at(i));
            along_plane.max(over_line)
        })
        .collect();
    let best = (0..=steps)
        .max_by(|&a, &b| samples[a].total_cmp(&samples[b]))
        .unwrap_or(0);
    let squared = match (best.checked_sub(1), samples.get(best + 1)) {
        (Some(before), Some(&after)) => vertex(samples[before], samples[best], after),
        _ => samples[best],
    };
    let u = at(best);
    let Moments { loops, charges } = moments(u);
    let [along_plane, over_line] = both(u);
    let (of_loops, of_charges) = if along_plane >= over_line {
        (u.abs(), 1.0)
    } else {
        (1.0, u.abs())
    };
    Peak {
        squared,
        loops: of_loops * loops.norm(),
        charges: of_charges * charges.norm(),
    }
}

/// The largest squared field of segments in any place, over a grid of directions on the half sphere.
fn strongest_of_any(frequency_hz: f64, segments: &[LitSegment]) -> Peak {
    let k = TAU * frequency_hz / LIGHT_SPEED_M_PER_S;
    let mut extent_m: f64 = 0.0;
    for a in segments {
        for b in segments {
            let [x, y] = a.segment.start_m;
            let apart_m = (x - b.segment.start_m[0]).hypot(y - b.segment.start_m[1]);
            extent_m = extent_m.max(apart_m + a.segment.length_m.max(b.segment.length_m));
        }
    }
    let traced: Vec<Traced> = segments
        .iter()
        .map(|lit| Traced::new(frequency_hz, lit))
        .collect();
    let squared = |theta: f64, phi: f64| {
        let [e_theta, e_phi] = toward(frequency_hz, &traced, theta, phi);
        e_theta.norm_sqr() + e_phi.norm_sqr()
    };
    // Fine against the pattern's lobes, about 1 / (k extent) wide.
    let quarter_steps = 12 + (k * extent_m * 3.0) as usize;
    let step = PI / 2.0 / quarter_steps as f64;
    let mut best = (0.0, 0.0, 0.0);
    for i in 0..=quarter_steps {
        for j in 0..4 * quarter_steps {
            let (theta, phi) = (i as f64 * step, j as f64 * step);
            let value = squared(theta, phi);
            if value > best.0 {
                best = (value, theta, phi);
            }
        }
    }
    let (value, theta, phi) = best;
    let around = vertex(
        squared(theta, phi - step),
        value,
        squared(theta, phi + step),
    );
    // Below the plane there is no field to go down to.
    let upward = if theta + step > PI / 2.0 {
        value
    } else {
        vertex(
            squared(theta - step, phi),
            value,
            squared(theta + step, phi),
        )
    };
    let parts = |loops: bool| {
        let traced: Vec<Traced> = segments
            .iter()
            .map(|lit| {
                let mut traced = Traced::new(frequency_hz, lit);
                if loops {
                    traced.charge_scale = Complex64::ZERO;
                } else {
                    traced.loop_scale = Complex64::ZERO;
                }
                traced
            })
            .collect();
        let [e_theta, e_phi] = toward(frequency_hz, &traced, theta, phi);
        (e_theta.norm_sqr() + e_phi.norm_sqr()).sqrt()
    };
    Peak {
        squared: around + upward - value,
        loops: parts(true),
        charges: parts(false),
    }
}
