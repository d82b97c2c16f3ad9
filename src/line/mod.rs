//! Lines: what a trace's cross-section makes of it as a transmission line.

mod loss;
mod microstrip;
mod stripline;

pub use loss::Loss;
pub use microstrip::microstrip;
pub use stripline::stripline;

use crate::LIGHT_SPEED_M_PER_S;
use crate::board::{DirectLine, Structure, Trace};
use num_complex::Complex64;
use thiserror::Error;

/// Impedance and speed of a uniform line without its loss.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CrossSection {
    /// Characteristic impedance.
    pub impedance_ohm: f64,
    /// Effective relative permittivity: (light speed / wave speed) squared.
    pub effective_permittivity: f64,
}

/// A line of a net: what the ringing and the radiation need to know of it.
#[derive(Debug, Clone, PartialEq)]
pub struct Line {
    /// Characteristic impedance.
    pub impedance_ohm: f64,
    /// Flight time.
    pub delay_s: f64,
    /// Length.
    pub length_m: f64,
    /// Where its conductor lies.
    pub place: Place,
    /// Relative permittivity of what lies under it.
    pub permittivity: f64,
    /// Its route on the plane; empty where the file does not say.
    pub points_m: Vec<[f64; 2]>,
    /// Its loss; `None` for a lossless line.
    pub loss: Option<Loss>,
}

/// What a line is to its waves at one frequency.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct WaveOnLine {
    /// Propagation over the whole length: attenuation in neper and, imaginary, phase in radians.
    pub propagation: Complex64,
    /// Characteristic impedance.
    pub impedance_ohm: Complex64,
}

/// Where a line's conductor lies, seen from outside the board.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Place {
    /// Over the plane at this height; zero does not radiate.
    Outer {
        /// From the plane to the underside of the trace.
        height_m: f64,
    },
    /// Between two planes, which contain its field.
    Buried,
}

impl Line {
    /// The waves at an angular frequency.
    pub fn wave_at(&self, omega: f64) -> WaveOnLine {
        match &self.loss {
            None => WaveOnLine {
                propagation: Complex64::new(0.0, omega * self.delay_s),
                impedance_ohm: self.impedance_ohm.into(),
            },
            Some(loss) => {
                let (series, shunt) = (loss.series_ohm_per_m(omega), loss.shunt_s_per_m(omega));
                WaveOnLine {
                    propagation: self.length_m * (series * shunt).sqrt(),
                    impedance_ohm: (series / shunt).sqrt(),
                }
            }
        }
    }

    /// Capacitance per length; zero for a line without length.
    pub fn capacitance_f_per_m(&self) -> f64 {
        if self.length_m > 0.0 {
            self.delay_s / (self.impedance_ohm * self.length_m)
        } else {
            0.0
        }
    }
}

/// What is doubtful about a line.
#[derive(Debug, Clone, PartialEq, Error)]
pub enum LineWarning {
    /// The geometry lies outside the range its formula was made for.
    #[error(
        "layer {layer}: {quantity} is {value:.4}, outside the {from} to {to} that {formula} covers; impedance and delay are less sure"
    )]
    OutOfRange {
        /// The layer.
        layer: String,
        /// The quantity that is out of range.
        quantity: &'static str,
        /// Its value.
        value: f64,
        /// Lower end of the range.
        from: f64,
        /// Upper end of the range.
        to: f64,
        /// The formula.
        formula: &'static str,
    },
}

/// The line that a trace is, and what is doubtful about it.
pub fn line_of_trace(trace: &Trace) -> (Line, Vec<LineWarning>) {
    let layer = &trace.layer;
    let (er, width_m, copper_m) = (layer.permittivity, trace.width_m, layer.copper_m);
    let (section, place, ranges, formula) = match layer.structure {
        Structure::Microstrip { height_m } => (
            microstrip(width_m, height_m, copper_m, er),
            Place::Outer { height_m },
            microstrip::ranges(width_m, height_m, copper_m, er),
            "Hammerstad & Jensen's microstrip",
        ),
        Structure::Stripline { below_m, above_m } => (
            stripline(width_m, below_m, above_m, copper_m, er),
            Place::Buried,
            stripline::ranges(width_m, below_m, above_m, copper_m),
            "the stripline formula",
        ),
    };
    let warnings = ranges
        .into_iter()
        .filter(|range| !(range.from..=range.to).contains(&range.value))
        .map(|range| LineWarning::OutOfRange {
            layer: layer.name.clone(),
            quantity: range.quantity,
            value: range.value,
            from: range.from,
            to: range.to,
            formula,
        })
        .collect();
    let line = Line {
        impedance_ohm: section.impedance_ohm,
        delay_s: trace.length_m * section.effective_permittivity.sqrt() / LIGHT_SPEED_M_PER_S,
        length_m: trace.length_m,
        place,
        permittivity: er,
        points_m: trace.points_m.clone(),
        loss: Some(Loss::of(trace, &section)),
    };
    (line, warnings)
}

/// The line that is given directly.
pub fn line_of_direct(direct: &DirectLine) -> Line {
    Line {
        impedance_ohm: direct.impedance_ohm,
        delay_s: direct.delay_s,
        length_m: direct.length_m,
        place: Place::Outer {
            height_m: direct.height_m,
        },
        permittivity: direct.permittivity,
        points_m: direct.points_m.clone(),
        loss: None,
    }
}

/// A quantity of a geometry and the range in which a formula holds.
struct Range {
    quantity: &'static str,
    value: f64,
    from: f64,
    to: f64,
}
