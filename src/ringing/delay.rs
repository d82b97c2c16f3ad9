//! A wave's past: a line's flight time as a delay of a whole and a fractional number of steps.

/// One travelling wave, remembered for as long as its delay and for at least one whole period.
#[derive(Debug, Clone)]
pub(super) struct Delay {
    /// A ring of a whole number of periods.
    samples: Vec<f64>,
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

    /// A wave that has always been `value`, delayed by `delay_steps`; `period` in steps.
    pub(super) fn new(delay_steps: f64, period: usize, value: f64) -> Self {
        debug_assert!(delay_steps >= Self::SHORTEST);
        let whole = delay_steps.floor();
        let oldest_tap = whole as usize + 2;
        // Third-order Lagrange interpolation at p between samples at 0, 1, 2 and 3.
        let p = 2.0 - (delay_steps - whole);
        Self {
            samples: vec![value; period * (oldest_tap + 1).div_ceil(period)],
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

    /// The wave as it arrives now.
    pub(super) fn arriving(&self) -> f64 {
        let oldest = self.back(self.oldest_tap);
        let [a, b, c, d] = self.weights;
        if let Some(&[s0, s1, s2, s3]) = self.samples.get(oldest..oldest + 4) {
            return a * s0 + b * s1 + c * s2 + d * s3;
        }
        let tap = |offset: usize| self.samples[self.back(self.oldest_tap - offset)];
        a * tap(0) + b * tap(1) + c * tap(2) + d * tap(3)
    }

    /// Sends a value now and goes on to the next step; returns the change since one period ago.
    pub(super) fn send(&mut self, value: f64) -> f64 {
        let change = value - self.samples[self.back(self.period)];
        self.samples[self.now] = value;
        self.now += 1;
        if self.now == self.samples.len() {
            self.now = 0;
        }
        change
    }

    /// Shows every value that has a say in what is still to arrive.
    pub(super) fn visit(&mut self, visit: &mut impl FnMut(&mut f64)) {
        for steps in 1..=self.oldest_tap {
            let place = self.back(steps);
            visit(&mut self.samples[place]);
        }
    }

    /// What was sent in the period that has just ended.
    pub(super) fn last_period(&self) -> Vec<f64> {
        let start = self.back(self.period);
        (0..self.period)
            .map(|step| self.samples[(start + step) % self.samples.len()])
            .collect()
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
            let mut delay = Delay::new(delay_steps, 16, 0.0);
            for step in 0..200 {
                if step > 50 {
                    let expected = cubic(f64::from(step) - delay_steps);
                    assert!((delay.arriving() - expected).abs() < 1e-9 * expected.abs());
                }
                delay.send(cubic(f64::from(step)));
            }
        }
    }

    #[test]
    fn the_last_period_is_what_was_sent() {
        for steps in [16, 32, 48] {
            let mut delay = Delay::new(20.5, 16, 0.0);
            for step in 0..steps {
                delay.send(f64::from(step));
            }
            let expected: Vec<f64> = (steps - 16..steps).map(f64::from).collect();
            assert_eq!(delay.last_period(), expected);
        }
    }
}
