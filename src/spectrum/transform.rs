//! The transform of one period: the fast one of even steps, and one for periods whose time at rest is left out.

use crate::ringing::Pace;
use num_complex::Complex64;
use realfft::{RealFftPlanner, RealToComplex};
use rustfft::{Fft, FftPlanner};
use std::cell::RefCell;
use std::collections::HashMap;
use std::f64::consts::{PI, SQRT_2};
use std::ops::RangeInclusive;
use std::sync::Arc;

type Real = Arc<dyn RealToComplex<f64>>;
type ThereAndBack = [Arc<dyn Fft<f64>>; 2];

// Plans are dear to make and the same for every net of one clock. Each is made by a planner of its own: one that has
// made others builds on them, and the last digits of a net would depend on which nets its thread had before.
thread_local! {
    static REAL: RefCell<HashMap<usize, Real>> = RefCell::default();
    static COMPLEX: RefCell<HashMap<usize, ThereAndBack>> = RefCell::default();
}

fn real_plan(length: usize) -> Real {
    let make = || RealFftPlanner::new().plan_fft_forward(length);
    REAL.with_borrow_mut(|plans| Arc::clone(plans.entry(length).or_insert_with(make)))
}

fn complex_plans(length: usize) -> ThereAndBack {
    let make = || {
        [
            FftPlanner::new().plan_fft_forward(length),
            FftPlanner::new().plan_fft_inverse(length),
        ]
    };
    COMPLEX.with_borrow_mut(|plans| plans.entry(length).or_insert_with(make).clone())
}

/// Gives the rms phasors of some harmonics of periods of one pace.
pub(super) enum Transform {
    Even(Even),
    Stretches(Stretches),
}

impl Transform {
    pub(super) fn new(pace: &Pace, harmonics: RangeInclusive<usize>) -> Self {
        assert!(
            2 * harmonics.end() < pace.total(),
            "too few samples for the highest harmonic"
        );
        if pace.is_whole() {
            Self::Even(Even::new(pace.total(), harmonics))
        } else {
            Self::Stretches(Stretches::new(pace, harmonics))
        }
    }

    /// The phasors of one period.
    pub(super) fn phasors(&mut self, period: &[f64]) -> Vec<Complex64> {
        match self {
            Self::Even(even) => even.phasors(period),
            Self::Stretches(stretches) => stretches.phasors(period),
        }
    }
}

/// The transform of even steps.
pub(super) struct Even {
    plan: Real,
    input: Vec<f64>,
    bins: Vec<Complex64>,
    scratch: Vec<Complex64>,
    harmonics: RangeInclusive<usize>,
}

impl Even {
    fn new(length: usize, harmonics: RangeInclusive<usize>) -> Self {
        let plan = real_plan(length);
        Self {
            input: plan.make_input_vec(),
            bins: plan.make_output_vec(),
            scratch: plan.make_scratch_vec(),
            plan,
            harmonics,
        }
    }

    fn phasors(&mut self, period: &[f64]) -> Vec<Complex64> {
        self.input.copy_from_slice(period);
        self.plan
            .process_with_scratch(&mut self.input, &mut self.bins, &mut self.scratch)
            .expect("all buffers were made by the plan");
        let to_rms = SQRT_2 / period.len() as f64;
        self.harmonics
            .clone()
            .map(|harmonic| self.bins[harmonic] * to_rms)
            .collect()
    }
}

/// The transform of a period in two stretches with rest between.
///
/// The changes from sample to sample vanish at rest, so their transform needs the marched steps alone; divided by
/// 1 - e^{-j 2 pi n / N} it is that of the samples. The changes of each stretch are summed at evenly spaced
/// frequencies by Bluestein's chirp transform (IEEE Trans. AU-18, 1970).
pub(super) struct Stretches {
    pace: Pace,
    harmonics: RangeInclusive<usize>,
    forward: Arc<dyn Fft<f64>>,
    inverse: Arc<dyn Fft<f64>>,
    /// Transform of the chirp that the changes are folded with.
    chirp_bins: Vec<Complex64>,
}

impl Stretches {
    fn new(pace: &Pace, harmonics: RangeInclusive<usize>) -> Self {
        let count = harmonics.end() + 1 - harmonics.start();
        let longest = pace.high.marched.max(pace.low.marched);
        let size = (longest + count).next_power_of_two();
        let [forward, inverse] = complex_plans(size);
        let mut chirp_bins = vec![Complex64::ZERO; size];
        for (k, bin) in chirp_bins.iter_mut().enumerate().take(count) {
            *bin = half_turns(k * k, pace.total());
        }
        for k in 1..longest {
            chirp_bins[size - k] = half_turns(k * k, pace.total());
        }
        forward.process(&mut chirp_bins);
        Self {
            pace: *pace,
            harmonics,
            forward,
            inverse,
            chirp_bins,
        }
    }

    fn phasors(&self, period: &[f64]) -> Vec<Complex64> {
        let total = self.pace.total();
        let changes: Vec<f64> = (0..period.len())
            .map(|step| period[step] - period[step.checked_sub(1).unwrap_or(period.len() - 1)])
            .collect();
        let (high, low) = changes.split_at(self.pace.high.marched);
        let low_start = self.pace.place(self.pace.high.marched);
        let (high, low) = (self.sums(high), self.sums(low));
        let to_rms = SQRT_2 / total as f64;
        self.harmonics
            .clone()
            .zip(high.into_iter().zip(low))
            .map(|(harmonic, (high, low))| {
                let shift = half_turns(2 * (harmonic * low_start % total), total).conj();
                let step = half_turns(2 * harmonic, total).conj();
                (high + shift * low) / (1.0 - step) * to_rms
            })
            .collect()
    }

    /// Sum over k of changes[k] e^{-j 2 pi n k / N} for every harmonic n.
    fn sums(&self, changes: &[f64]) -> Vec<Complex64> {
        let total = self.pace.total();
        let first = *self.harmonics.start();
        let size = self.chirp_bins.len();
        // n k = (n^2 + k^2 - (n - k)^2) / 2, with n counted from the first harmonic
        let mut folded = vec![Complex64::ZERO; size];
        for (k, change) in changes.iter().enumerate() {
            let turn = half_turns(2 * (first * k % total), total) * half_turns(k * k, total);
            folded[k] = change * turn.conj();
        }
        self.forward.process(&mut folded);
        for (bin, chirp) in folded.iter_mut().zip(&self.chirp_bins) {
            *bin *= chirp;
        }
        self.inverse.process(&mut folded);
        let count = self.harmonics.end() + 1 - first;
        (0..count)
            .map(|n| folded[n] * half_turns(n * n, total).conj() / size as f64)
            .collect()
    }
}

/// e^{j pi number / total}, exact for large numbers.
fn half_turns(number: usize, total: usize) -> Complex64 {
    Complex64::cis(PI * (number % (2 * total)) as f64 / total as f64)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::ringing::Stretch;

    /// Both transforms against the plain sum.
    #[test]
    fn both_transforms_are_the_plain_sum() {
        let (high, low) = ((40, 60), (50, 66));
        let pace = |left_out: bool| {
            let stretch = |(marched, rest): (usize, usize)| {
                if left_out {
                    Stretch {
                        marched,
                        left_out: rest,
                    }
                } else {
                    Stretch {
                        marched: marched + rest,
                        left_out: 0,
                    }
                }
            };
            Pace {
                step_s: 1e-9,
                high: stretch(high),
                low: stretch(low),
            }
        };
        let wave =
            |step: usize, level: f64| level + (-(step as f64) / 3.0).exp() * (step as f64).sin();
        let stretch =
            |(marched, _): (usize, usize), level| (0..marched).map(move |k| wave(k, level));
        let short: Vec<f64> = stretch(high, 1.0).chain(stretch(low, -0.5)).collect();
        let mut long: Vec<f64> = stretch(high, 1.0).collect();
        long.resize(high.0 + high.1, long[high.0 - 1]);
        long.extend(stretch(low, -0.5));
        let rest = long[long.len() - 1];
        long.resize(long.len() + low.1, rest);

        let harmonics = 3..=60;
        let even = Transform::new(&pace(false), harmonics.clone()).phasors(&long);
        let cut = Transform::new(&pace(true), harmonics.clone()).phasors(&short);
        for (n, (even, cut)) in harmonics.zip(even.into_iter().zip(cut)) {
            let plain: Complex64 = long
                .iter()
                .enumerate()
                .map(|(k, x)| x * half_turns(2 * n * k, long.len()).conj())
                .sum::<Complex64>()
                * (SQRT_2 / long.len() as f64);
            assert!((even - plain).norm() < 1e-13, "{n}");
            assert!((cut - plain).norm() < 1e-13, "{n}");
        }
    }
}
