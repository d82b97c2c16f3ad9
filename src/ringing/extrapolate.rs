//! The state that a slow march would come to.

use super::algebra::least_squares;
use ndarray::Array2;

/// Reduced-rank extrapolation (Mesina 1977; Eddy 1979): of states one period apart, the weighted mean, its weights
/// adding up to one, whose change over a period is least. On a linear net it removes as many slow relaxations and
/// resonances as there are changes; near its settled state a clamped net is close to one.
///
/// `None` where the states do not differ enough to tell.
pub(super) fn extrapolated(states: &[Vec<f64>]) -> Option<Vec<f64>> {
    let changes: Vec<Vec<f64>> = states
        .windows(2)
        .map(|pair| {
            pair[1]
                .iter()
                .zip(&pair[0])
                .map(|(new, old)| new - old)
                .collect()
        })
        .collect();
    let (first, others) = changes.split_first()?;
    // The first weight is what the others leave of one.
    let matrix = Array2::from_shape_fn((first.len(), others.len()), |(row, column)| {
        others[column][row] - first[row]
    });
    let right = Array2::from_shape_fn((first.len(), 1), |(row, _)| -first[row]);
    let (solution, _) = least_squares(matrix, right);
    let mut weights = solution.column(0).to_vec();
    weights.insert(0, 1.0 - weights.iter().sum::<f64>());
    if weights.iter().any(|weight| !weight.is_finite()) {
        return None;
    }
    let mut mean = vec![0.0; states[0].len()];
    for (weight, state) in weights.iter().zip(states) {
        for (mean, value) in mean.iter_mut().zip(state) {
            *mean += weight * value;
        }
    }
    Some(mean)
}

#[cfg(test)]
mod tests {
    use super::extrapolated;

    /// A map with two slow relaxations and a slow oscillation comes to rest at once.
    #[test]
    fn slow_relaxations_are_removed() {
        let rest = [1.0, -2.0, 0.5, 0.25];
        let step = |x: &[f64]| {
            let d: Vec<f64> = x.iter().zip(rest).map(|(x, r)| x - r).collect();
            let (sin, cos) = 0.3_f64.sin_cos();
            vec![
                rest[0] + 0.99 * d[0],
                rest[1] + 0.9 * d[1],
                rest[2] + 0.999 * (cos * d[2] - sin * d[3]),
                rest[3] + 0.999 * (sin * d[2] + cos * d[3]),
            ]
        };
        let mut states = vec![vec![0.0; 4]];
        for _ in 0..5 {
            states.push(step(&states[states.len() - 1]));
        }
        let found = extrapolated(&states).expect("the states differ");
        for (found, rest) in found.iter().zip(rest) {
            assert!((found - rest).abs() < 1e-5, "{found} {rest}");
        }
    }

    #[test]
    fn states_that_do_not_differ_tell_nothing() {
        assert_eq!(extrapolated(&[vec![1.0], vec![1.0], vec![1.0]]), None);
    }
}
