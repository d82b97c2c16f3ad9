//! A receiver's clamps: current over voltage.
//!
//! Each is a junction with a series resistance, i = Is (exp((v - i R) / Vt) - 1), at 300 K with an
//! emission coefficient of one; Is is such that the junction drops its knee at 1 mA.

use crate::board::{Clamp, HighClamp, ReceiverPart};

/// Boltzmann constant times 300 K over the elementary charge.
const THERMAL_V: f64 = 0.025_852;
const KNEE_CURRENT_A: f64 = 1e-3;
/// A junction this far below its knee carries less than 1 nA.
const IDLE_V: f64 = 0.36;

/// The clamps of one input.
#[derive(Debug, Clone, Copy, Default)]
pub struct Clamps {
    /// Each with its rail.
    low: Option<(Junction, f64)>,
    high: Option<(Junction, f64)>,
}

/// A junction with its series resistance.
#[derive(Debug, Clone, Copy, PartialEq)]
struct Junction {
    knee_v: f64,
    saturation_a: f64,
    resistance_ohm: f64,
    /// ln(Is R / Vt)
    log_scale: f64,
}

impl Clamps {
    /// The clamps of a receiver part.
    pub fn of(part: &ReceiverPart) -> Self {
        Self {
            low: part.low_clamp.map(|clamp| (Junction::new(clamp), 0.0)),
            high: part
                .high_clamp
                .map(|HighClamp { clamp, supply_v }| (Junction::new(clamp), supply_v)),
        }
    }

    /// Whether there is any.
    pub fn any(&self) -> bool {
        self.low.is_some() || self.high.is_some()
    }

    /// The rail of the upper clamp; zero without one.
    pub fn supply_v(&self) -> f64 {
        self.high.map_or(0.0, |(_, supply_v)| supply_v)
    }

    /// Current in the clamp to 0 V, out of the rail into the input.
    pub fn low_a(&self, input_v: f64) -> Option<f64> {
        self.low
            .map(|(junction, rail_v)| junction.current(rail_v - input_v).0)
    }

    /// Current in the clamp to the supply, out of the input into the rail.
    pub fn high_a(&self, input_v: f64) -> Option<f64> {
        self.high
            .map(|(junction, supply_v)| junction.current(input_v - supply_v).0)
    }

    /// The same clamps with voltages counted from `middle_v`.
    pub(super) fn counted_from(&self, middle_v: f64) -> Self {
        let shifted = |(junction, rail_v)| (junction, rail_v - middle_v);
        Self {
            low: self.low.map(shifted),
            high: self.high.map(shifted),
        }
    }

    /// Whether a voltage and its negative draw a current and its negative.
    pub(super) fn is_odd(&self) -> bool {
        match (self.low, self.high) {
            (None, None) => true,
            (Some((low, low_v)), Some((high, high_v))) => {
                low == high && (low_v + high_v).abs() <= 1e-9 * (high_v - low_v).abs()
            }
            _ => false,
        }
    }

    /// The clamps as seen through a resistance in front of each: the same junctions with more series
    /// resistance. `None` where both can conduct at one voltage, since the resistance is then shared.
    pub(super) fn behind(&self, resistance_ohm: f64) -> Option<Self> {
        if let (Some((low, ground_v)), Some((high, supply_v))) = (&self.low, &self.high)
            && supply_v + high.wakes_v() <= ground_v - low.wakes_v()
        {
            return None;
        }
        let fed = |(junction, rail_v): (Junction, f64)| (junction.behind(resistance_ohm), rail_v);
        Some(Self {
            low: self.low.map(fed),
            high: self.high.map(fed),
        })
    }

    /// Current into both clamps, and its slope over voltage.
    pub(super) fn load(&self, input_v: f64) -> (f64, f64) {
        let (low_a, low_s) = self.low.map_or((0.0, 0.0), |(junction, ground_v)| {
            junction.current(ground_v - input_v)
        });
        let (high_a, high_s) = self.high.map_or((0.0, 0.0), |(junction, supply_v)| {
            junction.current(input_v - supply_v)
        });
        (high_a - low_a, high_s + low_s)
    }
}

impl Junction {
    fn new(clamp: Clamp) -> Self {
        // A vanishing resistance would divide by zero; 1 milliohm is no clamp's limit.
        let resistance_ohm = clamp.resistance_ohm.max(1e-3);
        let saturation_a = KNEE_CURRENT_A / (clamp.knee_v / THERMAL_V).exp_m1();
        Self {
            knee_v: clamp.knee_v,
            saturation_a,
            resistance_ohm,
            log_scale: (saturation_a * resistance_ohm / THERMAL_V).ln(),
        }
    }

    fn behind(&self, more_ohm: f64) -> Self {
        let resistance_ohm = self.resistance_ohm + more_ohm;
        let log_scale = (self.saturation_a * resistance_ohm / THERMAL_V).ln();
        Self {
            resistance_ohm,
            log_scale,
            ..*self
        }
    }

    /// Below this it carries next to nothing.
    fn wakes_v(&self) -> f64 {
        self.knee_v - IDLE_V
    }

    /// Current and its slope at a voltage over junction and resistance.
    fn current(&self, voltage_v: f64) -> (f64, f64) {
        if voltage_v < self.wakes_v() {
            return (0.0, 0.0);
        }
        // With w = (i + Is) R / Vt the law reads w + ln w = x.
        let x = self.log_scale + (voltage_v + self.saturation_a * self.resistance_ohm) / THERMAL_V;
        let w = wright_omega(x);
        let current_a = w * THERMAL_V / self.resistance_ohm - self.saturation_a;
        (current_a, w / (self.resistance_ohm * (1.0 + w)))
    }
}

/// The solution w of w + ln w = x for real x.
///
/// One good guess and one or two steps of the fourth-order iteration of Fritsch, Shafer & Crowley,
/// Comm. ACM 16 (1973), until it is exact to rounding.
fn wright_omega(x: f64) -> f64 {
    let mut w = if x < -2.0 {
        x.exp()
    } else if x < 1.0 {
        (2.0 * (x - 1.0) / 3.0).exp()
    } else {
        x - x.ln() * (1.0 - 1.0 / (1.0 + x))
    };
    if w == 0.0 {
        return 0.0;
    }
    for _ in 0..3 {
        let residual = x - w - w.ln();
        let next = 1.0 + w;
        let q = 2.0 * next * (next + 2.0 / 3.0 * residual);
        w *= 1.0 + residual / next * (q - residual) / (q - 2.0 * residual);
        // What is left is below a seventieth of its fourth power.
        if residual.abs() < 1e-3 {
            break;
        }
    }
    w
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn wright_omega_solves_its_equation() {
        for step in -400..=4000 {
            let x = f64::from(step) * 0.1;
            let w = wright_omega(x);
            assert!(
                (w + w.ln() - x).abs() < 1e-12 * (1.0 + x.abs()),
                "x = {x}, w = {w}"
            );
        }
    }

    #[test]
    fn junction_drops_its_knee_at_one_milliampere() {
        let junction = Junction::new(Clamp {
            knee_v: 0.707,
            resistance_ohm: 10.0,
        });
        let (current_a, _) = junction.current(0.707 + 10.0 * 1e-3);
        assert!((current_a - 1e-3).abs() < 1e-9, "{current_a}");
    }

    #[test]
    fn behind_a_resistance_the_currents_balance() {
        let clamps = Clamps {
            low: Some((
                Junction::new(Clamp {
                    knee_v: 0.7,
                    resistance_ohm: 10.0,
                }),
                0.0,
            )),
            high: Some((
                Junction::new(Clamp {
                    knee_v: 0.5,
                    resistance_ohm: 5.0,
                }),
                3.3,
            )),
        };
        let fed = clamps.behind(40.0).expect("far apart");
        for step in -60..=100 {
            let open_v = f64::from(step) * 0.1;
            let (current_a, _) = fed.load(open_v);
            let at_clamps = clamps.load(open_v - 40.0 * current_a).0;
            assert!(
                (current_a - at_clamps).abs() < 3e-9,
                "{open_v}: {current_a} {at_clamps}"
            );
        }
    }

    #[test]
    fn slope_is_the_derivative() {
        let clamps = Clamps {
            low: Some((
                Junction::new(Clamp {
                    knee_v: 0.7,
                    resistance_ohm: 10.0,
                }),
                0.0,
            )),
            high: Some((
                Junction::new(Clamp {
                    knee_v: 0.5,
                    resistance_ohm: 0.0,
                }),
                3.3,
            )),
        };
        for step in -200..=600 {
            let v = f64::from(step) * 0.01 + 0.003;
            let change = (clamps.load(v + 1e-6).0 - clamps.load(v - 1e-6).0) / 2e-6;
            let (_, slope) = clamps.load(v);
            assert!(
                (change - slope).abs() < 1e-3 * slope.abs() + 1e-4,
                "{v}: {change} {slope}"
            );
        }
    }
}
