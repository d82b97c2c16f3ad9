//! A wave's past: a line's flight time as a delay of a whole and a fractional number of steps.

use super::filter::{Pair, pair};

/// A line's two travelling waves, remembered for as long as their delay and for at least one whole period.
#[derive(Debug, Clone)]
pub(super) struct Delay {
    /// A ring of a whole number of periods.
    samples: Vec<Pair>,
    period: usize,
    /// The present step's place in the ring.
    now: usize,
    /// Steps from the present back to the oldest sample of the interpolation.
    oldest_tap: usize,
    weights: [f64; 4],
}

impl Delay {
    /// Shortest delay, in steps: the interpolation must not need the present.
    pub(super) const SHORTEST: f64 = 2.0;

    /// Waves that have always been zero, delayed by `delay_steps`; `period` in steps.
    pub(super) fn new(delay_steps: f64, period: usize) -> Self {
        debug_assert!(delay_steps >= Self::SHORTEST);
        let whole = delay_steps.floor();
        let oldest_tap = whole as usize + 2;
        // Third-order Lagrange interpolation at p between samples at 0, 1, 2 and 3.
        let p = 2.0 - (delay_steps - whole);
        Self {
            samples: vec![[0.0; 2]; period * (oldest_tap + 1).div_ceil(period)],
            period,
            now: 0,
            oldest_tap,
            weights: [
                -(p - 1.0) * (p - 2.0) * (p - 3.0) / 6.0,
                p * (p - 2.0) * (p - 3.0) / 2.0,
                -p * (p - 1.0) * (p - 3.0) / 2.0,
                p * (p - 1.0) * (p - 2.0) / 6.0,
            ],
        }
    }

    /// The waves as they arrive now.
    pub(super) fn arriving(&self) -> Pair {
        let oldest = self.back(self.oldest_tap);
        let [a, b, c, d] = self.weights;
        let between = |s0: &Pair, s1: &Pair, s2: &Pair, s3: &Pair| {
            pair(|wave| (a * s0[wave] + b * s1[wave]) + (c * s2[wave] + d * s3[wave]))
        };
        if let Some([s0, s1, s2, s3]) = self.samples.get(oldest..oldest + 4) {
            return between(s0, s1, s2, s3);
        }
        let tap = |offset: usize| &self.samples[self.back(self.oldest_tap - offset)];
        between(tap(0), tap(1), tap(2), tap(3))
    }

    /// Sends the present values and goes on to the next step.
    pub(super) fn send(&mut self, values: Pair) {
        self.samples[self.now] = values;
        self.now += 1;
        if self.now == self.samples.len() {
            self.now = 0;
        }
    }

    /// Shows every value that has a say in what is still to arrive.
    pub(super) fn visit(&mut self, visit: &mut impl FnMut(&mut f64)) {
        for steps in 1..=self.oldest_tap {
            let place = self.back(steps);
            self.samples[place].iter_mut().for_each(&mut *visit);
        }
    }

    /// What was sent in the period that has just ended, wave by wave.
    pub(super) fn last_period(&self) -> [Vec<f64>; 2] {
        let (before, after) = self.samples.split_at(self.now);
        let skipped = self.samples.len() - self.period;
        let sent = after.iter().chain(before).skip(skipped);
        [0, 1].map(|wave| sent.clone().map(|sample| sample[wave]).collect())
    }

    /// The place of a step that lies at most one ring back.
    fn back(&self, steps: usize) -> usize {
        if steps <= self.now {
            self.now - steps
        } else {
            self.now + self.samples.len() - steps
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_cubic_is_delayed_exactly() {
        let cubic = |t: f64| 1.0 - 0.3 * t + 0.02 * t * t - 0.001 * t * t * t;
        for delay_steps in [2.0, 2.25, 3.5, 7.0, 11.9, 13.0, 13.99, 14.0, 40.3] {
            let mut delay = Delay::new(delay_steps, 16);
            for step in 0..200 {
                if step > 50 {
                    let expected = cubic(f64::from(step) - delay_steps);
                    let [outward, inward] = delay.arriving();
                    assert!((outward - expected).abs() < 1e-9 * expected.abs());
                    assert!((inward - 3.0 * expected).abs() < 3e-9 * expected.abs());
                }
                let value = cubic(f64::from(step));
                delay.send([value, 3.0 * value]);
            }
        }
    }

    #[test]
    fn the_last_period_is_what_was_sent() {
        for steps in [16, 32, 48] {
            let mut delay = Delay::new(20.5, 16);
            for step in 0..steps {
                delay.send([f64::from(step), 0.5]);
            }
            let expected: Vec<f64> = (steps - 16..steps).map(f64::from).collect();
            assert_eq!(delay.last_period(), [expected, vec![0.5; 16]]);
        }
    }
}
