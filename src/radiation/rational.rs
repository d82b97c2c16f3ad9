//! Functions of frequency known at samples, as one rational function with poles common to all.
//!
//! Nakatsukasa, Sete & Trefethen, "The AAA algorithm for rational approximation", SIAM J. Sci. Comput. 40(3), 2018,
//! A1494-A1522, for several functions at once: the supports and the weights of the barycentric form are shared.

use nalgebra::DMatrix;
use num_complex::Complex64;

/// A rational function in barycentric form, for any number of functions that share its poles.
#[derive(Debug, Clone)]
pub struct Rational {
    /// Numbers of the samples that it passes through.
    pub supports: Vec<usize>,
    places: Vec<f64>,
    weights: Vec<Complex64>,
    /// The largest deviation left at any sample, relative to the largest value of the function.
    pub deviation: f64,
}

impl Rational {
    /// Fits functions, each a row of values at the places, until none is off by more than a share of its own largest
    /// value or so many supports are used.
    pub fn fit(
        places: &[f64],
        functions: &[Vec<Complex64>],
        tolerance: f64,
        most_supports: usize,
    ) -> Self {
        let scaled: Vec<Vec<Complex64>> = functions
            .iter()
            .map(|values| {
                let largest = values.iter().map(|v| v.norm()).fold(0.0, f64::max);
                let scale = if largest > 0.0 { 1.0 / largest } else { 0.0 };
                values.iter().map(|value| value * scale).collect()
            })
            .collect();
        // At first all functions are their means.
        let mut fitted: Vec<Vec<Complex64>> = scaled
            .iter()
            .map(|values| {
                vec![values.iter().sum::<Complex64>() / values.len() as f64; values.len()]
            })
            .collect();
        let mut rational = Self {
            supports: Vec::new(),
            places: Vec::new(),
            weights: Vec::new(),
            deviation: f64::INFINITY,
        };
        loop {
            let (worst, deviation) = rational.worst_sample(&scaled, &fitted);
            rational.deviation = deviation;
            if deviation <= tolerance || rational.supports.len() >= most_supports {
                return rational;
            }
            rational.supports.push(worst);
            rational.places.push(places[worst]);
            rational.weights = rational.best_weights(places, &scaled);
            for (sample, &place) in places.iter().enumerate() {
                let shares = rational.shares(place);
                for (fitted, values) in fitted.iter_mut().zip(&scaled) {
                    fitted[sample] = rational.sum(&shares, values);
                }
            }
        }
    }

    /// The share of each support's value in the value at a place.
    pub fn shares(&self, place: f64) -> Vec<Complex64> {
        if let Some(on) = self.places.iter().position(|&support| support == place) {
            let mut shares = vec![Complex64::ZERO; self.places.len()];
            shares[on] = Complex64::ONE;
            return shares;
        }
        let terms = self.weights.iter().zip(&self.places);
        let terms: Vec<Complex64> = terms.map(|(w, support)| w / (place - support)).collect();
        let sum: Complex64 = terms.iter().sum();
        terms.into_iter().map(|term| term / sum).collect()
    }

    /// The value that the samples of a function give with the shares of a place.
    pub fn sum(&self, shares: &[Complex64], values: &[Complex64]) -> Complex64 {
        let supports = self.supports.iter();
        supports
            .zip(shares)
            .map(|(&s, share)| share * values[s])
            .sum()
    }

    fn worst_sample(
        &self,
        functions: &[Vec<Complex64>],
        fitted: &[Vec<Complex64>],
    ) -> (usize, f64) {
        let mut worst = (0, 0.0);
        for (values, fitted) in functions.iter().zip(fitted) {
            for (sample, (value, fitted)) in values.iter().zip(fitted).enumerate() {
                let off = (value - fitted).norm();
                if off > worst.1 {
                    worst = (sample, off);
                }
            }
        }
        worst
    }

    /// The weights that leave the least of the linearised deviation at all other samples: the last right singular
    /// vector of the Loewner matrix of all functions.
    fn best_weights(&self, places: &[f64], functions: &[Vec<Complex64>]) -> Vec<Complex64> {
        let others: Vec<usize> = (0..places.len())
            .filter(|sample| !self.supports.contains(sample))
            .collect();
        let rows = others.len() * functions.len();
        let entry = |row: usize, column: usize| {
            if row >= rows {
                return Complex64::ZERO;
            }
            let (values, sample) = (&functions[row / others.len()], others[row % others.len()]);
            let support = self.supports[column];
            (values[sample] - values[support]) / (places[sample] - places[support])
        };
        let order = self.supports.len();
        let loewner = DMatrix::from_fn(rows.max(order), order, entry);
        // The square factor has the same right singular vectors.
        let svd = loewner.qr().r().svd(false, true);
        let last = svd.singular_values.imin();
        match svd.v_t {
            Some(v_t) => v_t.row(last).iter().map(|w| w.conj()).collect(),
            None => vec![Complex64::ONE; order],
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn samples(count: usize) -> Vec<f64> {
        (0..count)
            .map(|i| 1.0 + i as f64 / (count - 1) as f64)
            .collect()
    }

    /// Three resonances and a slow delay, seen in two different mixtures.
    fn resonances(place: f64) -> [Complex64; 2] {
        let pole = |at: f64, width: f64| 1.0 / Complex64::new(place - at, width);
        let [a, b, c] = [pole(1.2, 0.02), pole(1.5, 0.05), pole(1.83, 0.01)];
        [
            a + b - c,
            (2.0 * a + 0.3 * c) * Complex64::cis(-2.0 * place),
        ]
    }

    #[test]
    fn resonances_between_the_samples_are_found() {
        let places = samples(41);
        let functions: Vec<Vec<Complex64>> = (0..2)
            .map(|f| places.iter().map(|&place| resonances(place)[f]).collect())
            .collect();
        let rational = Rational::fit(&places, &functions, 1e-8, 30);
        assert!(rational.supports.len() < 15, "{}", rational.supports.len());
        for step in 0..=1000 {
            let place = 1.0 + f64::from(step) / 1000.0;
            let shares = rational.shares(place);
            for (values, exact) in functions.iter().zip(resonances(place)) {
                let off = (rational.sum(&shares, values) - exact).norm();
                assert!(off < 1e-5 * 100.0, "{place}: {off}");
            }
        }
    }

    /// Too few samples for long delays: the supports use up nearly all of them.
    #[test]
    fn too_few_samples_show() {
        let delayed = |count: usize| {
            let places = samples(count);
            let delayed = |delay: usize| -> Vec<Complex64> {
                let turns = places.iter().map(|p| -(40.0 + 3.0 * delay as f64) * p);
                turns.map(Complex64::cis).collect()
            };
            let functions: Vec<Vec<Complex64>> = (0..8).map(delayed).collect();
            let rational = Rational::fit(&places, &functions, 1e-6, count - 1);
            rational.supports.len() as f64 / count as f64
        };
        let (few, many) = (delayed(21), delayed(81));
        assert!(few > 0.75 && many < 0.75, "{few} {many}");
    }
}
