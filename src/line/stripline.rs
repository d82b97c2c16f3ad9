//! Stripline: Cohn's exact impedance of a thin strip midway between two planes
//! ("Characteristic impedance of the shielded-strip transmission line", IRE Trans. MTT-2, 1954),
//! Wheeler's widening for thickness ("Transmission-line properties of a strip line between parallel
//! planes", IEEE Trans. MTT-26, 1978), and the usual parallel combination off centre.

use super::{CrossSection, Range};
use crate::ETA0_OHM;
use std::f64::consts::PI;

/// Impedance of a strip between two planes; the effective permittivity is the material's own.
///
/// Off centre, each half of the field is taken as that of a centred strip in twice the distance to
/// its plane; good to a few per cent as long as one distance is not many times the other.
pub fn stripline(
    width_m: f64,
    below_m: f64,
    above_m: f64,
    copper_m: f64,
    permittivity: f64,
) -> CrossSection {
    let toward = |distance_m: f64| centred_air_ohm(width_m, 2.0 * distance_m + copper_m, copper_m);
    let (lower, upper) = (toward(below_m), toward(above_m));
    CrossSection {
        impedance_ohm: 2.0 * lower * upper / (lower + upper) / permittivity.sqrt(),
        effective_permittivity: permittivity,
    }
}

/// Where the formula holds.
pub(super) fn ranges(width_m: f64, below_m: f64, above_m: f64, copper_m: f64) -> [Range; 3] {
    let spacing_m = below_m + copper_m + above_m;
    [
        Range {
            quantity: "width / plane spacing",
            value: width_m / spacing_m,
            from: 0.01,
            to: 100.0,
        },
        Range {
            quantity: "copper / plane spacing",
            value: copper_m / spacing_m,
            from: 0.0,
            to: 0.25,
        },
        Range {
            quantity: "distance to one plane / to the other",
            value: below_m.max(above_m) / below_m.min(above_m),
            from: 1.0,
            to: 10.0,
        },
    ]
}

/// Impedance in air of a strip midway between planes `spacing_m` apart.
fn centred_air_ohm(width_m: f64, spacing_m: f64, copper_m: f64) -> f64 {
    let gap_m = spacing_m - copper_m;
    let thin_width_m = width_m + widening_m(width_m, spacing_m, copper_m);
    let argument = PI * thin_width_m / (2.0 * gap_m);
    let k = 1.0 / argument.cosh();
    // K(k) / K(k') by the arithmetic-geometric mean
    ETA0_OHM / 4.0 * mean(1.0, k) / mean(1.0, argument.tanh())
}

/// Wheeler's growth of the width that stands for the thickness, with the planes `copper_m` closer.
fn widening_m(width_m: f64, spacing_m: f64, copper_m: f64) -> f64 {
    let x = copper_m / spacing_m;
    if x <= 0.0 {
        return 0.0;
    }
    let m = 2.0 / (1.0 + 2.0 / 3.0 * x / (1.0 - x));
    let side = (x / (2.0 - x)).powi(2) + (0.0796 * x / (width_m / spacing_m + 1.1 * x)).powf(m);
    copper_m / PI * (1.0 - 0.5 * side.ln())
}

/// Arithmetic-geometric mean.
fn mean(mut a: f64, mut b: f64) -> f64 {
    while (a - b).abs() > 1e-15 * a {
        (a, b) = ((a + b) / 2.0, (a * b).sqrt());
    }
    a
}
