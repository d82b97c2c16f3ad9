//! Causal filters: what loss makes of a wave, as a sum of relaxations.

use super::algebra::least_squares;
use ndarray::{Array1, Array2};
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

/// Relaxations of given poles, to be fitted to functions given by their values at some samples.
pub(super) struct Basis {
    poles: Vec<f64>,
    weights: Vec<f64>,
    at_zero: Option<f64>,
    /// A column for the direct part and each relaxation; rows: real parts, imaginary parts, the value at zero.
    matrix: Array2<f64>,
    /// The least-squares solution for each row of the matrix.
    inverse: Array2<f64>,
}

impl Basis {
    /// What counts as much as a value that must be met.
    const EXACTLY: f64 = 1e3;

    /// With `at_zero` all fits have that value at zero.
    pub(super) fn new(poles: Vec<f64>, samples: &[Sample], at_zero: Option<f64>) -> Self {
        let count = samples.len();
        let mut matrix = Array2::zeros((2 * count + 1, poles.len() + 1));
        for (row, Sample { omega, weight }) in samples.iter().enumerate() {
            matrix[[row, 0]] = *weight;
            for (column, pole) in poles.iter().enumerate() {
                let term = weight / Complex64::new(1.0, omega / pole);
                matrix[[row, column + 1]] = term.re;
                matrix[[count + row, column + 1]] = term.im;
            }
        }
        if at_zero.is_some() {
            matrix.row_mut(2 * count).fill(Self::EXACTLY);
        }
        let (inverse, _) = least_squares(matrix.clone(), Array2::eye(2 * count + 1));
        Self {
            poles,
            weights: samples.iter().map(|sample| sample.weight).collect(),
            at_zero,
            matrix,
            inverse,
        }
    }

    /// The sum that comes nearest to a function in the sense of least squares.
    pub(super) fn fit(&self, values: &[Complex64]) -> Relaxations {
        let solution = self.inverse.dot(&self.right(values, true));
        let residues = solution.iter().skip(1).copied();
        Relaxations {
            direct: solution[0],
            terms: self.poles.iter().copied().zip(residues).collect(),
        }
    }

    /// What the best fit leaves of a function, weighted; `held` is whether it is held at zero, else it is zero there.
    pub(super) fn left(&self, values: &[Complex64], held: bool) -> Vec<f64> {
        let right = self.right(values, held);
        let fitted = self.matrix.dot(&self.inverse.dot(&right));
        (right - fitted).to_vec()
    }

    fn right(&self, values: &[Complex64], held: bool) -> Array1<f64> {
        let weighted = || values.iter().zip(&self.weights);
        let at_zero = self.at_zero.filter(|_| held).unwrap_or(0.0);
        weighted()
            .map(|(value, weight)| weight * value.re)
            .chain(weighted().map(|(value, weight)| weight * value.im))
            .chain([Self::EXACTLY * at_zero])
            .collect()
    }
}

impl Relaxations {
    /// None at all: the same at every frequency.
    pub(super) fn constant(direct: f64) -> Self {
        Self {
            direct,
            terms: Vec::new(),
        }
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

/// A value for each of a line's two ends, which a processor works out at once.
pub(super) type Pair = [f64; 2];

/// The same value for both ends. What both ends share is kept twice all the same: a processor then reads it whole, and
/// does not wait for a neighbour in memory that has just been written.
pub(super) fn both(value: f64) -> Pair {
    [value; 2]
}

/// Both ends' values from a figure of each end.
pub(super) fn pair(of_end: impl FnMut(usize) -> f64) -> Pair {
    [0, 1].map(of_end)
}

/// A sum of relaxations marched step by step at both ends of a line, its inputs taken as straight between steps.
#[derive(Debug, Clone)]
pub(super) struct Filter {
    /// Share of the present input in the present output.
    direct: Pair,
    terms: Vec<Term>,
    /// Sum of the terms' gains.
    gain: Pair,
    past: Pair,
}

/// One relaxation on the march.
#[derive(Debug, Clone)]
struct Term {
    decay: Pair,
    gain: Pair,
    /// What its past will leave in the next output.
    state: Pair,
}

impl Filter {
    /// A filter at rest.
    pub(super) fn new(relaxations: &Relaxations, step_s: f64) -> Self {
        let mut direct = relaxations.direct;
        let terms: Vec<Term> = relaxations
            .terms
            .iter()
            .map(|&(pole, residue)| {
                let decay = (-pole * step_s).exp();
                let mean = -(-pole * step_s).exp_m1() / (pole * step_s);
                // Of an input that is straight between steps: the new end's and the old end's share.
                let (from_now, from_before) = (residue * (1.0 - mean), residue * (mean - decay));
                direct += from_now;
                Term {
                    decay: both(decay),
                    gain: both(decay * from_now + from_before),
                    state: [0.0; 2],
                }
            })
            .collect();
        Self {
            direct: both(direct),
            gain: both(terms.iter().map(|term| term.gain[0]).sum()),
            terms,
            past: [0.0; 2],
        }
    }

    /// Share of the present input in the present output.
    pub(super) fn direct(&self) -> Pair {
        self.direct
    }

    /// What the past leaves in the present output.
    pub(super) fn past(&self) -> Pair {
        self.past
    }

    /// Shows every value that has a say in what is still to come out.
    pub(super) fn visit(&mut self, visit: &mut impl FnMut(&mut f64)) {
        for term in &mut self.terms {
            term.state.iter_mut().for_each(&mut *visit);
        }
        self.past.iter_mut().for_each(visit);
    }

    /// Takes the present inputs and goes on to the next step.
    pub(super) fn take(&mut self, input: Pair) {
        // The sum of what fades does not wait for the input, which comes late in a step.
        let mut faded = [0.0; 2];
        for Term { decay, gain, state } in &mut self.terms {
            let fading = pair(|end| decay[end] * state[end]);
            faded = pair(|end| faded[end] + fading[end]);
            *state = pair(|end| fading[end] + gain[end] * input[end]);
        }
        self.past = pair(|end| faded[end] + self.gain[end] * input[end]);
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
        let values: Vec<Complex64> = samples
            .iter()
            .map(|sample| truth.at(sample.omega))
            .collect();
        let basis = Basis::new(vec![1e7, 1e8, 1e9], &samples, Some(1.0));
        let found = basis.fit(&values);
        let left = basis.left(&values, true);
        assert!(left.iter().all(|left| left.abs() < 1e-9));
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
        let mut filter = Filter::new(&relaxations, step_s);
        for step in 0..200 {
            let time_s = f64::from(step) * step_s;
            let input = [time_s, -2.0 * time_s];
            let past = filter.past();
            let output = pair(|end| past[end] + filter.direct()[end] * input[end]);
            filter.take(input);
            // response of 1 / (1 + s / p) to t: t - (1 - e^{-pt}) / p
            let exact = time_s - (1.0 - (-pole * time_s).exp()) / pole;
            for (output, exact) in output.into_iter().zip([exact, -2.0 * exact]) {
                assert!((output - exact).abs() < 1e-12 * time_s + 1e-24);
            }
        }
    }
}
