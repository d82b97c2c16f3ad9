//! What terminating parts turn to heat, and what they ask of the driver.

use super::incidence::driver_rest_v;
use super::probe::{Part, Probed, Reading};
use crate::board::Net;
use crate::ringing::{Network, Pace, rest_levels_v};

/// A driver that is switched off: it leaks this little.
const RELEASED_OHM: f64 = 1e12;

/// The power of a net's terminating parts together, and the driver's current at rest.
#[derive(Debug, Clone, PartialEq)]
pub struct TerminationPower {
    /// Heat in the parts with the driver at rest: the mean of both states by their share of the period.
    pub static_w: f64,
    /// What the edges add to it: their mean over the period.
    pub dynamic_w: f64,
    /// Heat in the parts with the driver switched off.
    pub idle_w: f64,
    /// Heat in the hottest of the parts, all in all; what a resistor's rating is held against.
    pub hottest_w: f64,
    /// Current out of the driver at rest in its low state; negative into it.
    pub driver_low_a: f64,
    /// Current out of the driver at rest in its high state.
    pub driver_high_a: f64,
}

impl TerminationPower {
    /// The larger of the driver's currents at rest.
    pub fn driver_static_a(&self) -> f64 {
        self.driver_low_a.abs().max(self.driver_high_a.abs())
    }
}

/// The power of a net's terminating parts, from what their probes saw.
pub(super) fn termination_power(
    probed_net: &Net,
    parts: &[Probed],
    readings: &[Option<Reading>],
    pace: &Pace,
) -> TerminationPower {
    let network = Network::of(probed_net);
    let driver = &probed_net.driver;
    let duty = probed_net.duty;
    let released_v = released_levels_v(probed_net);
    let mut power = TerminationPower {
        static_w: 0.0,
        dynamic_w: 0.0,
        idle_w: 0.0,
        hottest_w: 0.0,
        driver_low_a: (driver.low_v - driver_rest_v(&network, false)) / driver.low_resistance_ohm,
        driver_high_a: (driver.high_v - driver_rest_v(&network, true)) / driver.high_resistance_ohm,
    };
    for Probed { part, near, far } in parts {
        let reading = |number: usize| readings.get(number).and_then(Option::as_ref);
        let Some(near_reading) = reading(*near) else {
            continue;
        };
        let far_reading = far.and_then(reading);
        let across_rest_v = |state: usize| {
            near_reading.at_rest_v[state]
                - far_reading.map_or(part.to_v, |far| far.at_rest_v[state])
        };
        let across_v: Vec<f64> = match far_reading {
            Some(far) => (near_reading.voltage_v.iter().zip(&far.voltage_v))
                .map(|(near, far)| near - far)
                .collect(),
            None => near_reading
                .voltage_v
                .iter()
                .map(|v| v - part.to_v)
                .collect(),
        };
        let static_w = duty * part.heat_at_rest_w(across_rest_v(1))
            + (1.0 - duty) * part.heat_at_rest_w(across_rest_v(0));
        let all_w = part.heat_w(&across_v, pace);
        let far_released_v = far.map_or(part.to_v, |far| released_v[far]);
        power.static_w += static_w;
        // An edge that takes long spends less in a resistor than the states at rest would.
        power.dynamic_w += all_w - static_w;
        power.idle_w += part.heat_at_rest_w(released_v[*near] - far_released_v);
        power.hottest_w = power.hottest_w.max(all_w);
    }
    power.dynamic_w = power.dynamic_w.max(0.0);
    power
}

/// The levels at rest at every receiver and probe with the driver switched off.
fn released_levels_v(net: &Net) -> Vec<f64> {
    let mut released = net.clone();
    let driver = std::sync::Arc::make_mut(&mut released.driver);
    driver.low_resistance_ohm = RELEASED_OHM;
    driver.high_resistance_ohm = RELEASED_OHM;
    rest_levels_v(&Network::of(&released), false)
}

impl Part {
    /// Heat with a voltage at rest across it.
    fn heat_at_rest_w(&self, across_v: f64) -> f64 {
        match self.capacitance_f {
            Some(_) => 0.0,
            None => across_v * across_v / self.resistance_ohm,
        }
    }

    /// Mean heat over a settled period of the voltage across it.
    fn heat_w(&self, across_v: &[f64], pace: &Pace) -> f64 {
        let ohm = self.resistance_ohm;
        // Either the current lags behind v / R (an inductance), or the capacitor's voltage behind v.
        if let Some(farad) = self.capacitance_f {
            let current_a = |v: f64, charged_v: f64| (v - charged_v) / ohm;
            lagging_mean(across_v, pace, ohm * farad, |v, y| {
                ohm * current_a(v, y).powi(2)
            })
        } else if self.inductance_h > 0.0 {
            lagging_mean(across_v, pace, self.inductance_h / ohm, |_, y| y * y / ohm)
        } else {
            pace.mean(across_v, |v| v * v / ohm)
        }
    }
}

/// The mean over a settled period of a figure of `v` and of `y`, which lags behind it: y' = (v - y) / tau.
fn lagging_mean(v: &[f64], pace: &Pace, tau_s: f64, figure: impl Fn(f64, f64) -> f64) -> f64 {
    // y at the end is what y at the start decays to, plus what v alone makes: so the start that repeats is known.
    let (alone, _) = lag(v, pace, tau_s, 0.0, &figure);
    let (with_one, _) = lag(v, pace, tau_s, 1.0, &figure);
    let start = alone / (1.0 - (with_one - alone)).max(1e-12);
    lag(v, pace, tau_s, start, &figure).1
}

/// Follows `y` through a period; gives where it ends and the mean of the figure.
fn lag(
    v: &[f64],
    pace: &Pace,
    tau_s: f64,
    start: f64,
    figure: &impl Fn(f64, f64) -> f64,
) -> (f64, f64) {
    let half = pace.step_s / (2.0 * tau_s);
    let (mut y, mut sum) = (start, 0.0);
    let mut before = v.last().copied().unwrap_or_default();
    let (high, low) = v.split_at(pace.high.marched.min(v.len()));
    for (samples, stretch) in [(high, pace.high), (low, pace.low)] {
        for &now in samples {
            y = (y * (1.0 - half) + half * (before + now)) / (1.0 + half);
            sum += figure(now, y);
            before = now;
        }
        // At rest, y goes on to v exponentially: by steps as long as that takes, and then no more.
        let mut left = stretch.left_out;
        while left > 0 && (y - before).abs() > 1e-9 * before.abs().max(1e-9) {
            y = (y * (1.0 - half) + 2.0 * half * before) / (1.0 + half);
            sum += figure(before, y);
            left -= 1;
        }
        sum += figure(before, before) * left as f64;
    }
    (y, sum / pace.total() as f64)
}
