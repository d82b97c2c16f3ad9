//! Loss: what copper and board material take from a wave, causal both.
//!
//! Copper: R(f) = Rdc + Rs sqrt(jf), its high-frequency part by Wheeler's incremental-inductance rule ("Formulas
//! for the skin effect", Proc. IRE 30, 1942): the surface resistance times the rate at which the impedance in
//! air grows when every conductor's face recedes. Roughness raises that part as Hammerstad & Bekkadal fitted
//! (Microstrip Handbook, Trondheim 1975): 1 + 2/pi atan(1.4 (roughness / skin depth)^2).
//!
//! Board material: the wideband Debye model of Djordjevic et al., IEEE Trans. EMC 43(4), 2001, 662-667, which
//! holds its loss tangent nearly level from 10 kHz to 1 THz and has permittivity fall accordingly.

use super::{CrossSection, microstrip, stripline};
use crate::board::{Structure, Trace};
use crate::{ETA0_OHM, LIGHT_SPEED_M_PER_S, MU0_H_PER_M};
use num_complex::Complex64;
use std::f64::consts::{PI, TAU};

/// Conductivity of copper.
const COPPER_S_PER_M: f64 = 5.8e7;
/// Where a layer's permittivity and loss tangent are stated.
const STATED_AT_RAD_PER_S: f64 = TAU * 1e9;
/// The relaxations of the board material lie between these.
const DEBYE_RAD_PER_S: [f64; 2] = [TAU * 1e4, TAU * 1e12];

/// The loss of a trace, per length.
#[derive(Debug, Clone, PartialEq)]
pub struct Loss {
    /// Resistance to direct current.
    pub dc_ohm_per_m: f64,
    /// Impedance of the skin over sqrt(j omega), smooth.
    skin_ohm_per_m: f64,
    roughness_m: f64,
    air_impedance_ohm: f64,
    /// Share of the field in the board material: effective permittivity is 1 + share (permittivity - 1).
    filling: f64,
    permittivity_above: f64,
    /// Rise of the permittivity per unit of log frequency.
    permittivity_slope: f64,
}

impl Loss {
    /// The loss of a trace whose lossless cross-section is known.
    pub(super) fn of(trace: &Trace, section: &CrossSection) -> Self {
        let layer = &trace.layer;
        let (width_m, copper_m, er) = (trace.width_m, layer.copper_m, layer.permittivity);
        let air_impedance_ohm = |recession_m: f64| {
            let n = recession_m;
            match layer.structure {
                Structure::Microstrip { height_m } => microstrip(
                    width_m - 2.0 * n,
                    height_m + 2.0 * n,
                    copper_m - 2.0 * n,
                    1.0,
                ),
                Structure::Stripline { below_m, above_m } => stripline(
                    width_m - 2.0 * n,
                    below_m + 2.0 * n,
                    above_m + 2.0 * n,
                    copper_m - 2.0 * n,
                    1.0,
                ),
            }
            .impedance_ohm
        };
        let small_m = 1e-4 * width_m.min(copper_m);
        let growth_ohm_per_m =
            (air_impedance_ohm(small_m) - air_impedance_ohm(-small_m)) / (2.0 * small_m);
        let stated = relaxation(STATED_AT_RAD_PER_S);
        let permittivity_slope = -er * layer.loss_tangent / stated.im;
        Self {
            dc_ohm_per_m: 1.0 / (COPPER_S_PER_M * width_m * copper_m),
            skin_ohm_per_m: growth_ohm_per_m / ETA0_OHM * (MU0_H_PER_M / COPPER_S_PER_M).sqrt(),
            roughness_m: layer.roughness_m,
            air_impedance_ohm: section.impedance_ohm * section.effective_permittivity.sqrt(),
            filling: if er > 1.0 {
                (section.effective_permittivity - 1.0) / (er - 1.0)
            } else {
                0.0
            },
            permittivity_above: er - permittivity_slope * stated.re,
            permittivity_slope,
        }
    }

    /// Series impedance per length.
    pub fn series_ohm_per_m(&self, omega: f64) -> Complex64 {
        let skin_depth_m = (2.0 / (omega * MU0_H_PER_M * COPPER_S_PER_M)).sqrt();
        let rough = 1.0 + 2.0 / PI * (1.4 * (self.roughness_m / skin_depth_m).powi(2)).atan();
        let skin = self.skin_ohm_per_m * rough * Complex64::new(0.0, omega).sqrt();
        let inductance_h_per_m = self.air_impedance_ohm / LIGHT_SPEED_M_PER_S;
        self.dc_ohm_per_m + skin + Complex64::new(0.0, omega * inductance_h_per_m)
    }

    /// Shunt admittance per length.
    pub fn shunt_s_per_m(&self, omega: f64) -> Complex64 {
        let air_s_per_m = omega / (self.air_impedance_ohm * LIGHT_SPEED_M_PER_S);
        Complex64::new(0.0, air_s_per_m) * self.effective_permittivity(omega)
    }

    /// Effective permittivity, complex.
    pub fn effective_permittivity(&self, omega: f64) -> Complex64 {
        let er = self.permittivity_above + self.permittivity_slope * relaxation(omega);
        1.0 + self.filling * (er - 1.0)
    }
}

/// ln((w2 + j w) / (w1 + j w))
fn relaxation(omega: f64) -> Complex64 {
    let [lower, upper] = DEBYE_RAD_PER_S;
    (Complex64::new(upper, omega) / Complex64::new(lower, omega)).ln()
}
