//! How finely to march, and which part of a long period.

use super::network::Network;

/// Steps per period of the highest frequency asked for. The trapezoidal rule then takes every
/// capacitance and inductance wrong by (2 pi / 100)^2 / 12 = 0.03 % at most.
const STEPS_PER_CYCLE: f64 = 100.0;
/// Steps per whole edge, so that the waveform's corners stand where they belong.
const STEPS_PER_EDGE: f64 = 16.0;
/// Fewest steps of a period.
const FEWEST: f64 = 256.0;
/// Time marched after the start of each edge, at first, where the period is much longer.
const FIRST_WINDOW_S: f64 = 1.5e-6;
/// By how much the window grows where the net is not yet at rest at its end.
const GROWTH: usize = 4;

/// The steps of a period. Where the net comes to rest long before its next edge, the time at rest is left out of
/// the march: nothing changes in it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Pace {
    /// Time of a step.
    pub step_s: f64,
    /// Steps from the start of the rising edge on, then steps left out.
    pub high: Stretch,
    /// Steps up to the next rising edge, then steps left out.
    pub low: Stretch,
}

/// Steps marched and steps at rest after them that are left out.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Stretch {
    /// Steps marched.
    pub marched: usize,
    /// Steps left out.
    pub left_out: usize,
}

impl Pace {
    /// Every step of a period: an even number of the form 2^a 3^b for the transform, fine enough for the highest
    /// frequency asked for and for the shortest edge.
    pub fn whole(network: &Network, top_frequency_hz: f64) -> Self {
        let by_frequency = network.period_s * top_frequency_hz * STEPS_PER_CYCLE;
        let by_edge = network.period_s / network.source.shortest_edge_s() * STEPS_PER_EDGE;
        let steps = next_smooth(by_frequency.max(by_edge).max(FEWEST).ceil() as usize);
        let step_s = network.period_s / steps as f64;
        let fall = network.source.fall_start_s() / step_s;
        // The falling edge starts within a step; the stretches meet before it.
        let high = (fall.floor() as usize)
            .saturating_sub(1)
            .clamp(1, steps - 1);
        Self {
            step_s,
            high: Stretch {
                marched: high,
                left_out: 0,
            },
            low: Stretch {
                marched: steps - high,
                left_out: 0,
            },
        }
    }

    /// The first try for a net: without the time at rest where the period is long.
    pub(super) fn first(network: &Network, top_frequency_hz: f64) -> Self {
        let whole = Self::whole(network, top_frequency_hz);
        let [rise_s, fall_s] = network.source.edges_s();
        let window_s = FIRST_WINDOW_S + 2.0 * rise_s.max(fall_s);
        whole.with_window((window_s / whole.step_s) as usize)
    }

    /// The next try where a net was not at rest at the end of its window.
    pub(super) fn longer(&self) -> Self {
        self.with_window(self.high.marched.max(self.low.marched) * GROWTH)
    }

    fn with_window(&self, most: usize) -> Self {
        let cut = |stretch: Stretch| {
            let all = stretch.marched + stretch.left_out;
            // Little left out is not worth a transform of unequal steps.
            let marched = if all > 2 * most { most } else { all };
            Stretch {
                marched,
                left_out: all - marched,
            }
        };
        let (high, low) = (cut(self.high), cut(self.low));
        if high.left_out == 0 || low.left_out == 0 {
            let all = |stretch: Stretch| Stretch {
                marched: stretch.marched + stretch.left_out,
                left_out: 0,
            };
            return Self {
                high: all(self.high),
                low: all(self.low),
                ..*self
            };
        }
        Self { high, low, ..*self }
    }

    /// Whether every step is marched.
    pub fn is_whole(&self) -> bool {
        self.high.left_out == 0 && self.low.left_out == 0
    }

    /// Number of steps marched.
    pub fn marched(&self) -> usize {
        self.high.marched + self.low.marched
    }

    /// Number of steps in a period, with those left out.
    pub fn total(&self) -> usize {
        self.marched() + self.high.left_out + self.low.left_out
    }

    /// The place in the period of a step of the march.
    pub fn place(&self, step: usize) -> usize {
        if step < self.high.marched {
            step
        } else {
            step + self.high.left_out
        }
    }

    /// Time of a step of the march.
    pub fn time_s(&self, step: usize) -> f64 {
        self.place(step) as f64 * self.step_s
    }

    /// The first step of the march that is not before a time within the period.
    pub fn step_from(&self, time_s: f64) -> usize {
        let place = (time_s / self.step_s).ceil() as usize;
        if place < self.high.marched {
            place
        } else {
            place
                .saturating_sub(self.high.left_out)
                .max(self.high.marched)
                .min(self.marched())
        }
    }

    /// Mean over the period of a figure of each sample.
    pub fn mean(&self, samples: &[f64], figure: impl Fn(f64) -> f64) -> f64 {
        let (high, low) = samples.split_at(self.high.marched);
        let sum = |samples: &[f64], stretch: Stretch| {
            let at_rest = samples.last().map_or(0.0, |&rest| figure(rest));
            samples.iter().map(|&x| figure(x)).sum::<f64>() + at_rest * stretch.left_out as f64
        };
        (sum(high, self.high) + sum(low, self.low)) / self.total() as f64
    }
}

/// The smallest even 2^a 3^b that is not below `least`.
fn next_smooth(least: usize) -> usize {
    let mut best = least.next_power_of_two().max(2);
    let mut odd = 3;
    while odd < best {
        let candidate = odd * least.div_ceil(odd).next_power_of_two().max(2);
        best = best.min(candidate);
        odd *= 3;
    }
    best
}

#[cfg(test)]
mod tests {
    use super::next_smooth;

    #[test]
    fn next_smooth_finds_the_smallest() {
        let smooth = |mut n: usize| {
            if n % 2 == 1 {
                return false;
            }
            while n.is_multiple_of(2) {
                n /= 2;
            }
            while n.is_multiple_of(3) {
                n /= 3;
            }
            n == 1
        };
        for least in 1..5000 {
            let slow = (least.max(2)..)
                .find(|&n| smooth(n))
                .expect("there is always one");
            assert_eq!(next_smooth(least), slow, "{least}");
        }
    }
}
