//! The factors of a dense complex symmetric matrix, L D L^T without exchanges.
//!
//! The largest terms of the equations stand on the diagonal, so no exchange is needed; the symmetry halves
//! the work of an LU. Real and imaginary parts lie apart, so that the loops become vector code.

use num_complex::Complex64;

/// Columns factored before the rest of the matrix is brought up to date.
const PANEL: usize = 32;
/// Right-hand sides solved together.
const LANES: usize = 8;

type Lanes = [f64; LANES];

/// A symmetric matrix, or its factors: the lower triangle by columns in a square.
#[derive(Debug, Clone)]
pub struct Symmetric {
    order: usize,
    re: Vec<f64>,
    im: Vec<f64>,
}

/// The factors of a symmetric matrix.
#[derive(Debug, Clone)]
pub struct Factors {
    lower: Symmetric,
    inverse_pivots: Vec<Complex64>,
}

impl Symmetric {
    /// A matrix of zeros.
    pub fn zeros(order: usize) -> Self {
        Self {
            order,
            re: vec![0.0; order * order],
            im: vec![0.0; order * order],
        }
    }

    /// Sets an entry on or below the diagonal.
    pub fn set(&mut self, row: usize, column: usize, value: Complex64) {
        let place = column * self.order + row;
        self.re[place] = value.re;
        self.im[place] = value.im;
    }

    fn at(&self, row: usize, column: usize) -> Complex64 {
        let place = column * self.order + row;
        Complex64::new(self.re[place], self.im[place])
    }

    /// A column from a row on.
    fn column(&self, column: usize, from: usize) -> (&[f64], &[f64]) {
        let range = column * self.order + from..(column + 1) * self.order;
        (&self.re[range.clone()], &self.im[range])
    }

    /// Factors the matrix.
    pub fn factor(mut self) -> Factors {
        let mut pivots = Pivots::default();
        let mut start = 0;
        while start < self.order {
            let end = (start + PANEL).min(self.order);
            for column in start..end {
                self.update::<1>(column, start..column, &pivots);
                self.divide(column, &mut pivots);
            }
            let mut column = end;
            while column + 1 < self.order {
                self.update::<2>(column, start..end, &pivots);
                column += 2;
            }
            if column < self.order {
                self.update::<1>(column, start..end, &pivots);
            }
            start = end;
        }
        Factors {
            lower: self,
            inverse_pivots: pivots.inverse,
        }
    }

    /// Takes finished columns out of `COUNT` columns from `first` on, four at a time.
    fn update<const COUNT: usize>(
        &mut self,
        first: usize,
        finished: std::ops::Range<usize>,
        pivots: &Pivots,
    ) {
        let order = self.order;
        let (done_re, re) = self.re.split_at_mut(first * order);
        let (done_im, im) = self.im.split_at_mut(first * order);
        let mut re = re.chunks_exact_mut(order);
        let mut im = im.chunks_exact_mut(order);
        let mut targets: [_; COUNT] = std::array::from_fn(|_| {
            let (re, im) = (re.next(), im.next());
            (
                &mut re.expect("a column")[first..],
                &mut im.expect("a column")[first..],
            )
        });
        let source = |column: usize| {
            let range = column * order + first..(column + 1) * order;
            (&done_re[range.clone()], &done_im[range])
        };
        let (start, end) = (finished.start, finished.end);
        let fours = end - (end - start) % 4;
        for column in (start..fours).step_by(4) {
            let columns: [_; 4] = std::array::from_fn(|place| source(column + place));
            let values = &pivots.values[column..];
            subtract(&mut targets, columns, values);
        }
        for column in fours..end {
            subtract(&mut targets, [source(column)], &pivots.values[column..]);
        }
    }

    fn divide(&mut self, column: usize, pivots: &mut Pivots) {
        let pivot = self.at(column, column);
        let inverse = 1.0 / pivot;
        let range = column * self.order + column + 1..(column + 1) * self.order;
        let parts = self.re[range.clone()].iter_mut().zip(&mut self.im[range]);
        for (re, im) in parts {
            let value = Complex64::new(*re, *im) * inverse;
            (*re, *im) = (value.re, value.im);
        }
        self.set(column, column, Complex64::ONE);
        pivots.values.push(pivot);
        pivots.inverse.push(inverse);
    }
}

#[derive(Debug, Default)]
struct Pivots {
    values: Vec<Complex64>,
    inverse: Vec<Complex64>,
}

/// Takes from the first target, row by row, every source times its pivot times its own first row; from the
/// second target the same with its second row.
#[inline(always)]
fn subtract<const COUNT: usize, const SOURCES: usize>(
    targets: &mut [(&mut [f64], &mut [f64]); COUNT],
    sources: [(&[f64], &[f64]); SOURCES],
    pivots: &[Complex64],
) {
    let length = targets[0].0.len();
    let factors: [[Complex64; COUNT]; SOURCES] = std::array::from_fn(|s| {
        let (re, im) = sources[s];
        std::array::from_fn(|t| Complex64::new(re[t], im[t]) * pivots[s])
    });
    let sources = sources.map(|(re, im)| (&re[..length], &im[..length]));
    for (re, im) in targets.iter_mut() {
        // Equal lengths, said once, spare the loop its checks.
        assert!(re.len() == length && im.len() == length);
    }
    for row in 0..length {
        let mut sums: [_; COUNT] = std::array::from_fn(|t| (targets[t].0[row], targets[t].1[row]));
        for (s, (re, im)) in sources.iter().enumerate() {
            let (a, b) = (re[row], im[row]);
            for (t, sum) in sums.iter_mut().enumerate() {
                let factor = factors[s][t];
                sum.0 = sum.0 - a * factor.re + b * factor.im;
                sum.1 = sum.1 - a * factor.im - b * factor.re;
            }
        }
        for (t, sum) in sums.into_iter().enumerate() {
            targets[t].0[row] = sum.0;
            targets[t].1[row] = sum.1;
        }
    }
}

impl Factors {
    /// Replaces each right-hand side by its solution.
    pub fn solve(&self, columns: &mut [Vec<Complex64>]) {
        let order = self.lower.order;
        let mut re: Vec<Lanes> = vec![[0.0; LANES]; order];
        let mut im = re.clone();
        for group in columns.chunks_mut(LANES) {
            for (lane, column) in group.iter().enumerate() {
                for (row, value) in column.iter().enumerate() {
                    (re[row][lane], im[row][lane]) = (value.re, value.im);
                }
            }
            self.solve_lanes(&mut re, &mut im);
            for (lane, column) in group.iter_mut().enumerate() {
                for (row, value) in column.iter_mut().enumerate() {
                    *value = Complex64::new(re[row][lane], im[row][lane]);
                }
            }
        }
    }

    fn solve_lanes(&self, re: &mut [Lanes], im: &mut [Lanes]) {
        for column in 0..self.lower.order {
            let (head_re, rest_re) = re.split_at_mut(column + 1);
            let (head_im, rest_im) = im.split_at_mut(column + 1);
            let (known_re, known_im) = (&head_re[column], &head_im[column]);
            let (lower_re, lower_im) = self.lower.column(column, column + 1);
            let entries = lower_re.iter().zip(lower_im);
            for ((x, y), (a, b)) in rest_re.iter_mut().zip(rest_im).zip(entries) {
                take(x, y, (known_re, known_im), (*a, *b));
            }
        }
        for ((re, im), inverse) in re.iter_mut().zip(im.iter_mut()).zip(&self.inverse_pivots) {
            for (re, im) in re.iter_mut().zip(im) {
                let value = Complex64::new(*re, *im) * inverse;
                (*re, *im) = (value.re, value.im);
            }
        }
        for column in (0..self.lower.order).rev() {
            let (mut sum_re, mut sum_im) = (re[column], im[column]);
            let (lower_re, lower_im) = self.lower.column(column, column + 1);
            let entries = lower_re.iter().zip(lower_im);
            let known = re[column + 1..].iter().zip(&im[column + 1..]);
            for ((x, y), (a, b)) in known.zip(entries) {
                take(&mut sum_re, &mut sum_im, (x, y), (*a, *b));
            }
            (re[column], im[column]) = (sum_re, sum_im);
        }
    }
}

/// x + j y -= (a + j b) known
#[inline(always)]
fn take(x: &mut Lanes, y: &mut Lanes, known: (&Lanes, &Lanes), (a, b): (f64, f64)) {
    for lane in 0..LANES {
        let (re, im) = (known.0[lane], known.1[lane]);
        x[lane] = x[lane] - a * re + b * im;
        y[lane] = y[lane] - a * im - b * re;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn solutions_meet_their_equations() {
        let entry = |row: usize, column: usize| {
            let apart = row.abs_diff(column) as f64;
            Complex64::from_polar(1.0, -0.3 * apart) / (0.2 + apart)
        };
        for order in [1, 5, 31, 32, 33, 66, 103] {
            let mut matrix = Symmetric::zeros(order);
            for column in 0..order {
                for row in column..order {
                    matrix.set(row, column, entry(row, column));
                }
            }
            let sides: Vec<Vec<Complex64>> = (0..11)
                .map(|side| {
                    let value = |row| Complex64::new((row * side % 7) as f64, side as f64);
                    (0..order).map(value).collect()
                })
                .collect();
            let mut solutions = sides.clone();
            matrix.factor().solve(&mut solutions);
            for (solution, side) in solutions.iter().zip(&sides) {
                for (row, wanted) in side.iter().enumerate() {
                    let terms = solution.iter().enumerate();
                    let got: Complex64 = terms.map(|(column, x)| entry(row, column) * x).sum();
                    assert!((got - wanted).norm() < 1e-11, "order {order}");
                }
            }
        }
    }
}
