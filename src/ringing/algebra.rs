//! Small dense systems.

use ndarray::{Array2, ArrayView1};

/// Inverse of a small regular matrix, by Gauss-Jordan elimination with row pivoting.
pub(super) fn inverse(matrix: &Array2<f64>) -> Array2<f64> {
    let n = matrix.nrows();
    let mut left = matrix.clone();
    let mut right = Array2::eye(n);
    for column in 0..n {
        let pivot = (column..n)
            .max_by(|&a, &b| left[[a, column]].abs().total_cmp(&left[[b, column]].abs()))
            .unwrap_or(column);
        for k in 0..n {
            left.swap([column, k], [pivot, k]);
            right.swap([column, k], [pivot, k]);
        }
        let scale = 1.0 / left[[column, column]];
        for k in 0..n {
            left[[column, k]] *= scale;
            right[[column, k]] *= scale;
        }
        for row in (0..n).filter(|&row| row != column) {
            let factor = left[[row, column]];
            for k in 0..n {
                left[[row, k]] -= factor * left[[column, k]];
                right[[row, k]] -= factor * right[[column, k]];
            }
        }
    }
    right
}

/// The least-squares solutions of a tall system, one for each right-hand side, and the norms of what is left, by
/// Householder reflections (Golub & Van Loan, Matrix Computations, section 5.3).
pub(super) fn least_squares(
    mut matrix: Array2<f64>,
    mut right: Array2<f64>,
) -> (Array2<f64>, Vec<f64>) {
    let (rows, columns) = matrix.dim();
    for k in 0..columns {
        let norm = (k..rows)
            .map(|i| matrix[[i, k]].powi(2))
            .sum::<f64>()
            .sqrt();
        if norm == 0.0 {
            continue;
        }
        let alpha = if matrix[[k, k]] > 0.0 { -norm } else { norm };
        let mut v: Vec<f64> = (k..rows).map(|i| matrix[[i, k]]).collect();
        v[0] -= alpha;
        let scale = 2.0 / v.iter().map(|x| x * x).sum::<f64>();
        for target in [&mut matrix, &mut right] {
            for mut column in target.columns_mut() {
                let dot: f64 = v.iter().enumerate().map(|(i, x)| x * column[k + i]).sum();
                for (i, x) in v.iter().enumerate() {
                    column[k + i] -= scale * dot * x;
                }
            }
        }
    }
    let mut solution = Array2::zeros((columns, right.ncols()));
    for of in 0..right.ncols() {
        for k in (0..columns).rev() {
            let known: f64 = (k + 1..columns)
                .map(|j| matrix[[k, j]] * solution[[j, of]])
                .sum();
            solution[[k, of]] = (right[[k, of]] - known) / matrix[[k, k]];
        }
    }
    let left = |column: ArrayView1<f64>| column.iter().skip(columns).map(|x| x * x).sum::<f64>();
    let errors = right
        .columns()
        .into_iter()
        .map(|column| left(column).sqrt());
    (solution, errors.collect())
}

#[cfg(test)]
mod tests {
    use super::*;
    use ndarray::array;

    #[test]
    fn inverse_undoes_the_matrix() {
        let matrix = array![[0.0, 2.0, 1.0], [1.0, 3.0, -1.0], [4.0, 0.5, 2.0]];
        let product = matrix.dot(&inverse(&matrix));
        for ((row, column), value) in product.indexed_iter() {
            let expected = f64::from(u8::from(row == column));
            assert!((value - expected).abs() < 1e-12);
        }
    }
}
