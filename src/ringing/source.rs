//! The driver as a source: its open-circuit voltage and resistance over one period.

use crate::board::{Driver, EdgeShape};

/// A driver on its clock. The rising edge starts at time zero.
#[derive(Debug, Clone)]
pub struct Source {
    low_v: f64,
    high_v: f64,
    low_resistance_ohm: f64,
    high_resistance_ohm: f64,
    rise_s: f64,
    fall_start_s: f64,
    fall_s: f64,
    edge: EdgeShape,
}

impl Source {
    /// The driver at a clock whose high share, between the 50 % points, is `duty`.
    pub fn new(driver: &Driver, clock_hz: f64, duty: f64) -> Self {
        let (rise_s, fall_s) = (driver.full_rise_s(), driver.full_fall_s());
        Self {
            low_v: driver.low_v,
            high_v: driver.high_v,
            low_resistance_ohm: driver.low_resistance_ohm,
            high_resistance_ohm: driver.high_resistance_ohm,
            rise_s,
            fall_start_s: duty / clock_hz + (rise_s - fall_s) / 2.0,
            fall_s,
            edge: driver.edge,
        }
    }

    /// Open-circuit voltage in the low state.
    pub fn low_v(&self) -> f64 {
        self.low_v
    }

    /// High less low level.
    pub fn swing_v(&self) -> f64 {
        self.high_v - self.low_v
    }

    /// When the falling edge starts, within the period; the rising edge starts at zero.
    pub fn fall_start_s(&self) -> f64 {
        self.fall_start_s
    }

    /// When the rising and the falling edge are half over, within the period.
    pub fn middles_s(&self) -> [f64; 2] {
        [self.rise_s / 2.0, self.fall_start_s + self.fall_s / 2.0]
    }

    /// Whether the resistance is the same in both states.
    pub fn is_steady(&self) -> bool {
        self.low_resistance_ohm == self.high_resistance_ohm
    }

    /// Duration of the rising and the falling edge, 0 to 100 %.
    pub fn edges_s(&self) -> [f64; 2] {
        [self.rise_s, self.fall_s]
    }

    /// Duration of the shorter edge, 0 to 100 %.
    pub fn shortest_edge_s(&self) -> f64 {
        self.rise_s.min(self.fall_s)
    }

    /// Whether one half of a period of this length is the other upside down.
    pub(super) fn is_mirrored(&self, period_s: f64) -> bool {
        self.is_steady()
            && self.rise_s == self.fall_s
            && self.rise_s <= self.fall_start_s
            && (self.fall_start_s / period_s - 0.5).abs() < 1e-12
    }

    /// Share of the high state at a time within the period, 0 to 1.
    pub fn high_share(&self, time_s: f64) -> f64 {
        if time_s < self.rise_s {
            self.shape(time_s / self.rise_s)
        } else if time_s < self.fall_start_s {
            1.0
        } else {
            1.0 - self.shape((time_s - self.fall_start_s) / self.fall_s)
        }
    }

    /// Open-circuit voltage at a share of the high state.
    pub fn voltage_v(&self, high_share: f64) -> f64 {
        self.low_v + self.swing_v() * high_share
    }

    /// Output conductance at a share of the high state: the resistance changes over with the edge.
    pub fn conductance_s(&self, high_share: f64) -> f64 {
        1.0 / (self.low_resistance_ohm
            + (self.high_resistance_ohm - self.low_resistance_ohm) * high_share)
    }

    fn shape(&self, progress: f64) -> f64 {
        let progress = progress.min(1.0);
        match self.edge {
            EdgeShape::Ramp => progress,
            EdgeShape::Smooth => 0.5 * (1.0 - (std::f64::consts::PI * progress).cos()),
        }
    }
}
