//! Microstrip: Hammerstad & Jensen, "Accurate models for microstrip computer-aided design",
//! IEEE MTT-S Digest, 1980, 407-409, with their correction for thickness.

use super::{CrossSection, Range};
use crate::ETA0_OHM;
use std::f64::consts::{E, PI};

/// Impedance and effective permittivity of a trace over one plane, air above.
///
/// The formula claims 0.03 % for the impedance in air and 0.2 % for the effective permittivity
/// at zero thickness.
pub fn microstrip(width_m: f64, height_m: f64, copper_m: f64, permittivity: f64) -> CrossSection {
    let u = width_m / height_m;
    let widening_in_air = widening(u, copper_m / height_m);
    let mixed_share = 0.5 * (1.0 + 1.0 / (permittivity - 1.0).sqrt().cosh());
    let in_air = air_impedance_ohm(u + widening_in_air);
    let u_mixed = u + mixed_share * widening_in_air;
    let mixed = air_impedance_ohm(u_mixed);
    let thin_permittivity = thin_effective_permittivity(u_mixed, permittivity);
    CrossSection {
        impedance_ohm: mixed / thin_permittivity.sqrt(),
        effective_permittivity: thin_permittivity * (in_air / mixed).powi(2),
    }
}

/// Where the formula holds.
pub(super) fn ranges(width_m: f64, height_m: f64, copper_m: f64, permittivity: f64) -> [Range; 3] {
    [
        Range {
            quantity: "width / height",
            value: width_m / height_m,
            from: 0.01,
            to: 100.0,
        },
        Range {
            quantity: "permittivity",
            value: permittivity,
            from: 1.0,
            to: 128.0,
        },
        // The correction treats thickness as a small widening.
        Range {
            quantity: "copper / height",
            value: copper_m / height_m,
            from: 0.0,
            to: 1.0,
        },
    ]
}

/// Growth of width / height that stands for the thickness, in air.
fn widening(u: f64, thickness: f64) -> f64 {
    if thickness <= 0.0 {
        return 0.0;
    }
    let coth_squared = (6.517 * u).sqrt().tanh().powi(-2);
    thickness / PI * (1.0 + 4.0 * E / (thickness * coth_squared)).ln()
}

fn air_impedance_ohm(u: f64) -> f64 {
    let f = 6.0 + (2.0 * PI - 6.0) * (-(30.666 / u).powf(0.7528)).exp();
    ETA0_OHM / (2.0 * PI) * (f / u + (1.0 + (2.0 / u).powi(2)).sqrt()).ln()
}

fn thin_effective_permittivity(u: f64, er: f64) -> f64 {
    let u4 = u.powi(4);
    let a = 1.0
        + ((u4 + (u / 52.0).powi(2)) / (u4 + 0.432)).ln() / 49.0
        + (1.0 + (u / 18.1).powi(3)).ln() / 18.7;
    let b = 0.564 * ((er - 0.9) / (er + 3.0)).powf(0.053);
    (er + 1.0) / 2.0 + (er - 1.0) / 2.0 * (1.0 + 10.0 / u).powf(-a * b)
}
