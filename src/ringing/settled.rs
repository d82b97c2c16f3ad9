//! What comes of a march.

use super::steps::Pace;

/// One settled period of a net.
#[derive(Debug, Clone)]
pub struct Settled {
    /// Voltages and currents at the driver and the receivers.
    pub waveform: SettledWaveform,
    /// The waves on each line, in the order of [`super::Network::spans`].
    pub waves: Vec<WaveRecord>,
    /// How it was reached.
    pub report: MarchReport,
}

/// One settled period, from the start of the rising edge.
#[derive(Debug, Clone, PartialEq)]
pub struct SettledWaveform {
    /// When the samples were taken.
    pub pace: Pace,
    /// Voltage at the driver's pin.
    pub driver_v: Vec<f64>,
    /// Current out of the driver.
    pub driver_a: Vec<f64>,
    /// Voltage at each receiver, in the order of the path.
    pub receivers_v: Vec<Vec<f64>>,
}

/// The two travelling waves of a line over one settled period, volts.
#[derive(Debug, Clone)]
pub struct WaveRecord {
    /// The wave away from the driver.
    pub outward_v: Vec<f64>,
    /// The wave back to the driver.
    pub inward_v: Vec<f64>,
    /// Where they were taken.
    pub taken: Taken,
}

/// Where on a line its two waves were taken.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Taken {
    /// Each where it sets out: outward at the near end, inward at the far end.
    AtStart,
    /// Both in the middle of a line too short to carry waves.
    InMiddle,
}

/// How the settled waveform was reached.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct MarchReport {
    /// Steps in one period.
    pub steps_per_period: usize,
    /// Steps of them that were marched; the others are time at rest, or a second half that mirrors the first.
    pub marched_steps: usize,
    /// Times these steps were marched until they repeated.
    pub periods: usize,
    /// How far the last period may still be from the settled one, as a share of the swing.
    pub residual: f64,
    /// Whether that is small enough.
    pub settled: bool,
}
