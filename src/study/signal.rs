//! What the settled waveform does to the driver and the receivers.
//!
//! A receiver's levels at rest are those it would come to if the driver stayed in one state. Times count from
//! the middle of the driver's open-circuit edge.

use crate::ringing::{Input, Network, Pace, Settled, rest_levels_v};
use std::ops::Range;

/// A waveform has settled when it stays this close to its level at rest, as a share of the swing.
const SETTLED_SHARE: f64 = 0.1;

/// What the waveform does to the driver and the receivers. Figures are instantaneous where not said otherwise.
#[derive(Debug, Clone, PartialEq)]
pub struct Signal {
    /// Largest current out of or into the driver.
    pub driver_peak_current_a: f64,
    /// Root mean square of the driver's current.
    pub driver_rms_current_a: f64,
    /// Every receiver of the net, in the order of the path.
    pub receivers: Vec<ReceiverSignal>,
}

/// What the waveform does at one receiver.
#[derive(Debug, Clone, PartialEq)]
pub struct ReceiverSignal {
    /// The receiver's name.
    pub name: String,
    /// Level at rest with the driver low.
    pub rest_low_v: f64,
    /// Level at rest with the driver high.
    pub rest_high_v: f64,
    /// Highest voltage.
    pub maximum_v: f64,
    /// Lowest voltage.
    pub minimum_v: f64,
    /// Highest voltage over the high level at rest, zero or more.
    pub overshoot_v: f64,
    /// Low level at rest over the lowest voltage, zero or more.
    pub undershoot_v: f64,
    /// How far the wave swings back past its level at rest after its first peak, the larger of both edges.
    pub ringback_v: f64,
    /// Crossings of the receiver's thresholds beyond one up and one down each; of the middle between the levels at
    /// rest where no threshold is given.
    pub extra_crossings: usize,
    /// Whether the wave reaches both thresholds; `None` where none is given.
    pub reaches_thresholds: Option<bool>,
    /// Until it stays within 10 % of the swing from its level at rest, the later of both edges; `None` where it
    /// does not before the next edge.
    pub settling_s: Option<f64>,
    /// Until it first crosses the middle between its levels at rest, the later of both edges; `None` where it
    /// does not before the next edge.
    pub flight_s: Option<f64>,
    /// The clamp to 0 V; `None` without one.
    pub low_clamp: Option<ClampSignal>,
    /// The clamp to the supply; `None` without one.
    pub high_clamp: Option<ClampSignal>,
    /// Largest current the clamps are rated for, where the file says.
    pub clamp_rating_a: Option<f64>,
}

/// What the waveform does to one clamp.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ClampSignal {
    /// Peak current.
    pub peak_a: f64,
    /// Charge through it in one period: it conducts after one of the two edges.
    pub charge_c: f64,
    /// Mean power turned to heat in it.
    pub power_w: f64,
}

impl ReceiverSignal {
    /// Mean power turned to heat in both clamps.
    pub fn clamp_power_w(&self) -> f64 {
        [self.low_clamp, self.high_clamp]
            .into_iter()
            .flatten()
            .map(|clamp| clamp.power_w)
            .sum()
    }

    /// Peak current of both clamps; zero without any.
    pub fn clamp_peak_a(&self) -> f64 {
        let clamps = [self.low_clamp, self.high_clamp].into_iter().flatten();
        clamps.map(|clamp| clamp.peak_a).fold(0.0, f64::max)
    }
}

/// Reads the findings off a settled waveform.
pub(super) fn signal(network: &Network, settled: &Settled) -> Signal {
    let waveform = &settled.waveform;
    let at_rest = rest_levels_v(network, false)
        .into_iter()
        .zip(rest_levels_v(network, true));
    let receivers = network
        .inputs
        .iter()
        .zip(&waveform.receivers_v)
        .zip(at_rest)
        .map(|((input, voltage_v), at_rest)| {
            receiver_signal(network, input, &waveform.pace, voltage_v, at_rest)
        })
        .collect();
    Signal {
        driver_peak_current_a: waveform
            .driver_a
            .iter()
            .fold(0.0, |peak, a| a.abs().max(peak)),
        driver_rms_current_a: waveform.pace.mean(&waveform.driver_a, |a| a * a).sqrt(),
        receivers,
    }
}

fn receiver_signal(
    network: &Network,
    input: &Input,
    pace: &Pace,
    voltage_v: &[f64],
    (rest_low_v, rest_high_v): (f64, f64),
) -> ReceiverSignal {
    let maximum_v = voltage_v.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    let minimum_v = voltage_v.iter().copied().fold(f64::INFINITY, f64::min);
    let swing_v = rest_high_v - rest_low_v;
    let middle_v = (rest_low_v + rest_high_v) / 2.0;

    // Each edge as a rise from its rest level at zero to one at `swing`, up to the next edge.
    let [rise, fall] = network
        .source
        .middles_s()
        .map(|time_s| pace.step_from(time_s));
    let next_fall = pace.step_from(network.source.fall_start_s());
    let edge = |steps: Range<usize>, risen: &dyn Fn(f64) -> f64| Edge {
        risen_v: voltage_v[steps].iter().map(|&v| risen(v)).collect(),
        step_s: pace.step_s,
    };
    let up = edge(rise.min(next_fall)..next_fall, &|v| v - rest_low_v);
    let down = edge(fall..pace.marched(), &|v| rest_high_v - v);
    let later =
        |time: fn(&Edge, f64) -> Option<f64>| Some(time(&up, swing_v)?.max(time(&down, swing_v)?));

    let thresholds_v: Vec<f64> = [input.low_threshold_v, input.high_threshold_v]
        .into_iter()
        .flatten()
        .collect();
    let watched_v = if thresholds_v.is_empty() {
        vec![middle_v]
    } else {
        thresholds_v.clone()
    };
    let clamp = |currents_a: &dyn Fn(f64) -> Option<f64>, drop_v: &dyn Fn(f64) -> f64| {
        currents_a(0.0)?;
        let current_a = |v| currents_a(v).unwrap_or(0.0);
        Some(ClampSignal {
            // A clamp's current rises with the voltage over it.
            peak_a: current_a(maximum_v).max(current_a(minimum_v)),
            charge_c: pace.mean(voltage_v, current_a) * network.period_s,
            power_w: pace.mean(voltage_v, |v| current_a(v) * drop_v(v)),
        })
    };
    ReceiverSignal {
        name: input.name.clone(),
        rest_low_v,
        rest_high_v,
        maximum_v,
        minimum_v,
        overshoot_v: (maximum_v - rest_high_v).max(0.0),
        undershoot_v: (rest_low_v - minimum_v).max(0.0),
        ringback_v: up.ringback_v(swing_v).max(down.ringback_v(swing_v)),
        extra_crossings: watched_v
            .iter()
            .map(|&level_v| crossings(voltage_v, level_v).saturating_sub(2))
            .sum(),
        reaches_thresholds: (!thresholds_v.is_empty()).then(|| {
            thresholds_v
                .iter()
                .all(|v| (minimum_v..maximum_v).contains(v))
        }),
        settling_s: later(Edge::settling_s),
        flight_s: later(Edge::flight_s),
        low_clamp: clamp(&|v| input.clamps.low_a(v), &|v| -v),
        high_clamp: clamp(&|v| input.clamps.high_a(v), &|v| {
            v - input.clamps.supply_v()
        }),
        clamp_rating_a: input.clamp_rating_a,
    }
}

/// How often a period crosses a level.
fn crossings(period_v: &[f64], level_v: f64) -> usize {
    let mut above = period_v.last().is_some_and(|&v| v > level_v);
    period_v
        .iter()
        .filter(|&&v| {
            let crossed = (v > level_v) != above;
            above = v > level_v;
            crossed
        })
        .count()
}

/// The wave from the middle of one of the driver's edges to the start of the next, seen as a rise.
struct Edge {
    risen_v: Vec<f64>,
    step_s: f64,
}

impl Edge {
    /// Until it first crosses the middle.
    fn flight_s(&self, swing_v: f64) -> Option<f64> {
        let crossing = self.risen_v.iter().position(|&v| v >= swing_v / 2.0)?;
        Some(crossing as f64 * self.step_s)
    }

    /// Until it stays close to the swing.
    fn settling_s(&self, swing_v: f64) -> Option<f64> {
        let astray = |v: &f64| (v - swing_v).abs() > SETTLED_SHARE * swing_v;
        let settled = self
            .risen_v
            .iter()
            .rposition(astray)
            .map_or(0, |last| last + 1);
        (settled < self.risen_v.len()).then_some(settled as f64 * self.step_s)
    }

    /// How far it falls back under the swing after its first peak over it.
    fn ringback_v(&self, swing_v: f64) -> f64 {
        let Some(over) = self.risen_v.iter().position(|&v| v > swing_v) else {
            return 0.0;
        };
        let after = &self.risen_v[over..];
        let lowest = after.iter().copied().fold(f64::INFINITY, f64::min);
        (swing_v - lowest).max(0.0)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn crossings_of_a_clean_and_of_a_ringing_period() {
        assert_eq!(crossings(&[0.0, 1.0, 1.0, 0.0], 0.5), 2);
        assert_eq!(crossings(&[0.0, 1.0, 0.4, 1.0, 1.0, 0.0], 0.5), 4);
        assert_eq!(crossings(&[0.0, 0.4, 0.4, 0.0], 0.5), 0);
    }

    #[test]
    fn an_edge_is_read_as_it_looks() {
        let edge = Edge {
            risen_v: vec![0.0, 0.4, 1.5, 1.2, 0.7, 0.95, 1.05, 1.0],
            step_s: 1e-9,
        };
        assert_eq!(edge.flight_s(1.0), Some(2e-9));
        assert_eq!(edge.settling_s(1.0), Some(5e-9));
        assert!((edge.ringback_v(1.0) - 0.3).abs() < 1e-12);
        let restless = Edge {
            risen_v: vec![0.0, 1.5, 0.5],
            step_s: 1e-9,
        };
        assert_eq!(restless.settling_s(1.0), None);
    }
}
