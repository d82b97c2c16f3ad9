//! Causal filters: what loss makes of a wave, as a sum of relaxations.

use super::algebra::least_squares;
use ndarray::Array2;
use num_complex::Complex64;

/// H(s) = direct + sum of residue / (1 + s / pole) with real poles.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Relaxations {
    pub(super) direct: f64,
    /// (pole in rad/s, residue)
    pub(super) terms: Vec<(f64, f64)>,
}

/// Where a sum of relaxations is held to its samples, and how much each counts.
pub(super) struct Sample {
    pub(super) omega: f64,
    pub(super) weight: f64,
}

impl Relaxations {
    /// For each function, given by its values at the samples, the sum with the given poles that comes nearest to it
    /// in the sense of least squares, and how far off it is (root of the weighted sum of squares). With `at_zero`
    /// all have that value at zero.
    pub(super) fn fit(
        poles: &[f64],
        samples: &[Sample],
        functions: &[Vec<Complex64>],
        at_zero: Option<f64>,
    ) -> Vec<(Self, f64)> {
        const EXACTLY: f64 = 1e3;
        let count = samples.len();
        // Rows: real parts, imaginary parts, the value at zero.
        let mut matrix = Array2::zeros((2 * count + 1, poles.len() + 1));
        let mut right = Array2::zeros((2 * count + 1, functions.len()));
        for (row, Sample { omega, weight }) in samples.iter().enumerate() {
            matrix[[row, 0]] = *weight;
            for (column, pole) in poles.iter().enumerate() {
                let term = weight / Complex64::new(1.0, omega / pole);
                matrix[[row, column + 1]] = term.re;
                matrix[[count + row, column + 1]] = term.im;
            }
            for (column, values) in functions.iter().enumerate() {
                right[[row, column]] = weight * values[row].re;
                right[[count + row, column]] = weight * values[row].im;
            }
        }
        if let Some(at_zero) = at_zero {
            matrix.row_mut(2 * count).fill(EXACTLY);
            right.row_mut(2 * count).fill(EXACTLY * at_zero);
        }
        let (solution, errors) = least_squares(matrix, right);
        let sums = solution.columns().into_iter().map(|column| Self {
            direct: column[0],
            terms: poles
                .iter()
                .copied()
                .zip(column.iter().skip(1).copied())
                .collect(),
        });
        sums.zip(errors).collect()
    }

    /// Its value at j omega.
    #[cfg(test)]
    pub(super) fn at(&self, omega: f64) -> Complex64 {
        self.terms
            .iter()
            .fold(Complex64::from(self.direct), |sum, (pole, residue)| {
                sum + residue / Complex64::new(1.0, omega / pole)
            })
    }
}

/// Relaxations are marched so many at a time: what a processor does at once.
const LANES: usize = 4;

/// A sum of relaxations marched step by step, its input taken as straight between steps.
#[derive(Debug, Clone)]
pub(super) struct Filter {
    /// Share of the present input in the present output.
    direct: f64,
    blocks: Vec<Block>,
    past: f64,
}

/// Relaxations that are marched together.
#[derive(Debug, Clone, Default)]
struct Block {
    decay: [f64; LANES],
    gain: [f64; LANES],
    /// What each relaxation's past will leave in the next output.
    state: [f64; LANES],
}

impl Filter {
    /// A filter that has always had the input `start`.
    pub(super) fn new(relaxations: &Relaxations, step_s: f64, start: f64) -> Self {
        let count = relaxations.terms.len().div_ceil(LANES);
        let mut filter = Self {
            direct: relaxations.direct,
            blocks: vec![Block::default(); count],
            past: 0.0,
        };
        for (number, &(pole, residue)) in relaxations.terms.iter().enumerate() {
            let (block, lane) = (&mut filter.blocks[number / LANES], number % LANES);
            let decay = (-pole * step_s).exp();
            let mean = -(-pole * step_s).exp_m1() / (pole * step_s);
            // Of an input that is straight between steps: the new end's and the old end's share.
            let (from_now, from_before) = (residue * (1.0 - mean), residue * (mean - decay));
            filter.direct += from_now;
            block.decay[lane] = decay;
            block.gain[lane] = decay * from_now + from_before;
            block.state[lane] = (residue - from_now) * start;
            filter.past += (residue - from_now) * start;
        }
        filter
    }

    /// Share of the present input in the present output.
    pub(super) fn direct(&self) -> f64 {
        self.direct
    }

    /// What the past leaves in the present output.
    pub(super) fn past(&self) -> f64 {
        self.past
    }

    /// Shows every value that has a say in what is still to come out.
    pub(super) fn visit(&mut self, visit: &mut impl FnMut(&mut f64)) {
        for block in &mut self.blocks {
            block.state.iter_mut().for_each(&mut *visit);
        }
        visit(&mut self.past);
    }

    /// Takes the present input and goes on to the next step.
    pub(super) fn take(&mut self, input: f64) {
        let mut sums = [0.0; LANES];
        for Block { decay, gain, state } in &mut self.blocks {
            for lane in 0..LANES {
                state[lane] = decay[lane] * state[lane] + gain[lane] * input;
                sums[lane] += state[lane];
            }
        }
        self.past = sums.iter().sum();
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_sum_of_relaxations_is_found_again() {
        let truth = Relaxations {
            direct: 0.2,
            terms: vec![(1e7, 0.5), (1e8, -0.1), (1e9, 0.4)],
        };
        let samples: Vec<Sample> = (0..40)
            .map(|i| Sample {
                omega: 1e6 * 10f64.powf(f64::from(i) / 10.0),
                weight: 1.0,
            })
            .collect();
        let values = samples
            .iter()
            .map(|sample| truth.at(sample.omega))
            .collect();
        let (found, error) =
            Relaxations::fit(&[1e7, 1e8, 1e9], &samples, &[values], Some(1.0)).remove(0);
        assert!(error < 1e-9);
        assert!((found.direct - truth.direct).abs() < 1e-9);
        for (a, b) in found.terms.iter().zip(&truth.terms) {
            assert!((a.1 - b.1).abs() < 1e-9);
        }
    }

    #[test]
    fn a_marched_ramp_matches_the_exact_response() {
        let pole = 3e8;
        let relaxations = Relaxations {
            direct: 0.0,
            terms: vec![(pole, 1.0)],
        };
        let step_s = 1e-10;
        let mut filter = Filter::new(&relaxations, step_s, 0.0);
        for step in 0..200 {
            let time_s = f64::from(step) * step_s;
            let past = filter.past();
            let output = past + filter.direct() * time_s;
            filter.take(time_s);
            // response of 1 / (1 + s / p) to t: t - (1 - e^{-pt}) / p
            let exact = time_s - (1.0 - (-pole * time_s).exp()) / pole;
            assert!((output - exact).abs() < 1e-12 * time_s + 1e-24);
        }
    }
}
