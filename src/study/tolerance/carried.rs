//! Which tolerance carries the spread.

use crate::text::{Distribution, Tolerance};
use ndarray::{Array1, Array2, Axis};

/// Draws wanted for each coefficient of the fit.
const DRAWS_A_TERM: usize = 2;

/// The share of the variance of `margins_db` that each tolerance makes by itself; the rest of 1 is what they make only
/// together, or in a way that no parabola follows. `None` where the draws are too few to tell.
///
/// `scores` is draw by tolerance. The margin is fitted, by least squares, as a sum of parabolas, one of each deviation
/// (a straight line where draws are few), and a tolerance's share is the covariance of its part with the margin over
/// the variance: these add up to the coefficient of determination. What so many coefficients explain by chance is
/// taken off (the adjusted coefficient).
pub fn shares(
    tolerances: &[Tolerance],
    scores: &Array2<f64>,
    margins_db: &Array1<f64>,
) -> Option<Vec<f64>> {
    let draws = margins_db.len();
    let degree = [2, 1]
        .into_iter()
        .find(|degree| draws >= DRAWS_A_TERM * (1 + degree * tolerances.len()))?;
    let margins_db = margins_db - margins_db.mean()?;
    let variance = margins_db.dot(&margins_db);
    if variance == 0.0 {
        return Some(vec![0.0; tolerances.len()]);
    }
    let mut terms = Array2::zeros((draws, degree * tolerances.len()));
    for (number, tolerance) in tolerances.iter().enumerate() {
        for draw in 0..draws {
            let polynomials = polynomials(tolerance, scores[[draw, number]]);
            for power in 0..degree {
                terms[[draw, number * degree + power]] = polynomials[power];
            }
        }
    }
    let means = terms.mean_axis(Axis(0))?;
    terms -= &means;
    let right = terms.t().dot(&margins_db);
    let coefficients = solved(terms.t().dot(&terms), right.clone())?;
    let raw: Vec<f64> = (0..tolerances.len())
        .map(|number| {
            let of = number * degree..(number + 1) * degree;
            of.map(|term| coefficients[term] * right[term]).sum::<f64>() / variance
        })
        .collect();
    let explained: f64 = raw.iter().sum();
    let free = (draws - 1 - degree * tolerances.len()) as f64;
    let adjusted = 1.0 - (1.0 - explained) * (draws - 1) as f64 / free;
    let kept = adjusted.clamp(0.0, 1.0) / explained.max(f64::MIN_POSITIVE);
    Some(
        raw.into_iter()
            .map(|share| (share * kept).max(0.0))
            .collect(),
    )
}

/// The first two orthonormal polynomials of a deviation: Legendre's of a uniform one, Hermite's of a normal one.
fn polynomials(tolerance: &Tolerance, score: f64) -> [f64; 2] {
    let deviation = tolerance.deviation(score) / tolerance.reach;
    match tolerance.distribution {
        Distribution::Uniform => [
            3_f64.sqrt() * deviation,
            5_f64.sqrt() * (1.5 * deviation * deviation - 0.5),
        ],
        Distribution::Normal => {
            // The tolerance is two standard deviations.
            let z = 2.0 * deviation;
            [z, (z * z - 1.0) / 2_f64.sqrt()]
        }
    }
}

/// Solves a symmetric, positive system by elimination; `None` where it is singular.
fn solved(mut matrix: Array2<f64>, mut right: Array1<f64>) -> Option<Array1<f64>> {
    let size = right.len();
    for pivot in 0..size {
        if matrix[[pivot, pivot]] <= 0.0 {
            return None;
        }
        for row in pivot + 1..size {
            let factor = matrix[[row, pivot]] / matrix[[pivot, pivot]];
            for column in pivot..size {
                matrix[[row, column]] -= factor * matrix[[pivot, column]];
            }
            right[row] -= factor * right[pivot];
        }
    }
    for row in (0..size).rev() {
        for column in row + 1..size {
            right[row] -= matrix[[row, column]] * right[column];
        }
        right[row] /= matrix[[row, row]];
    }
    Some(right)
}

#[cfg(test)]
mod tests {
    use super::super::scores::scores;
    use super::*;
    use Distribution::{Normal, Uniform};

    /// Shares for a margin that is a function of the standardised deviations.
    fn shares_of(
        distributions: &[Distribution],
        draws: usize,
        margin: impl Fn(&[f64]) -> f64,
    ) -> Option<Vec<f64>> {
        let tolerances: Vec<Tolerance> = distributions
            .iter()
            .map(|&distribution| Tolerance {
                reach: 2.0,
                distribution,
            })
            .collect();
        let count = tolerances.len();
        let table =
            Array2::from_shape_fn((draws, count), |(draw, number)| scores(draw, count)[number]);
        let margins = Array1::from_shape_fn(draws, |draw| {
            let standard: Vec<f64> = (0..count)
                .map(|number| polynomials(&tolerances[number], table[[draw, number]])[0])
                .collect();
            margin(&standard)
        });
        shares(&tolerances, &table, &margins)
    }

    /// Independent terms: variances add, 9 to 4 to 1.
    #[test]
    fn a_linear_margin_is_explained_whole() {
        let shares = shares_of(&[Uniform, Normal, Uniform], 256, |x| {
            7.0 + 3.0 * x[0] - 2.0 * x[1] + x[2]
        });
        let shares = shares.unwrap();
        for (share, expected) in shares.iter().zip([9.0, 4.0, 1.0]) {
            assert!((share - expected / 14.0).abs() < 0.01, "{shares:?}");
        }
        assert!((shares.iter().sum::<f64>() - 1.0).abs() < 1e-9);
    }

    /// x y of two standard deviations has a variance of 1, and neither makes any of it alone.
    #[test]
    fn what_two_make_only_together_is_no_ones() {
        let shares = shares_of(&[Uniform, Uniform], 256, |x| x[0] + x[0] * x[1]).unwrap();
        assert!((shares[0] - 0.5).abs() < 0.03, "{shares:?}");
        assert!(shares[1] < 0.01, "{shares:?}");
    }

    /// x^2 has a variance of 0.8 for a uniform x of variance 1 (9/5 - 1), of 2 for a normal one.
    #[test]
    fn a_bent_margin_is_its_tolerance_s_own() {
        let shares = shares_of(&[Uniform, Normal], 256, |x| x[0] * x[0] + x[1]).unwrap();
        assert!((shares[0] - 0.8 / 1.8).abs() < 0.01, "{shares:?}");
        assert!((shares[1] - 1.0 / 1.8).abs() < 0.01, "{shares:?}");
    }

    #[test]
    fn few_draws_take_straight_lines_and_too_few_nothing() {
        let line = |x: &[f64]| x[0] + 2.0 * x[1] + x[2];
        let three = [Uniform, Normal, Uniform];
        assert!(shares_of(&three, 8, line).is_some());
        assert_eq!(shares_of(&three, 7, line), None);
        assert_eq!(shares_of(&three, 64, |_| 3.0), Some(vec![0.0; 3]));
    }
}
