//! Many fields that hang together as sums of a few of themselves.
//!
//! Waves from afar are smooth over a board, so the fields at its knots are far from independent. From examples, a QR
//! decomposition with exchanges picks the fields that the others are sums of (an interpolative decomposition: Cheng,
//! Gimbutas, Martinsson & Rokhlin, SIAM J. Sci. Comput. 26(4), 2005, 1389-1404).

use num_complex::Complex64;

/// Which fields are kept, and how all are made of them.
#[derive(Debug, Clone)]
pub(super) struct Compression {
    kept: Vec<usize>,
    /// By field, its share of each of the kept ones.
    shares: Vec<Complex64>,
}

impl Compression {
    /// Looks at examples, each a value of every field, until no field is off by more than a share of the largest.
    pub(super) fn new(examples: &[Vec<Complex64>], tolerance: f64) -> Self {
        let fields = examples[0].len();
        let mut left: Vec<Vec<Complex64>> = (0..fields)
            .map(|field| examples.iter().map(|example| example[field]).collect())
            .collect();
        let mut sizes: Vec<f64> = left.iter().map(|column| square(column)).collect();
        let largest = sizes.iter().copied().fold(0.0, f64::max);
        let mut kept = Vec::new();
        // By kept field, what each field has of its direction.
        let mut parts: Vec<Vec<Complex64>> = Vec::new();
        while kept.len() < examples.len().min(fields) {
            let best = (0..fields)
                .max_by(|&a, &b| sizes[a].total_cmp(&sizes[b]))
                .unwrap_or(0);
            if sizes[best] <= tolerance * tolerance * largest {
                break;
            }
            let length = square(&left[best]).sqrt();
            let direction: Vec<Complex64> = left[best].iter().map(|value| value / length).collect();
            let mut part = vec![Complex64::ZERO; fields];
            for field in 0..fields {
                if kept.contains(&field) {
                    continue;
                }
                let column = &mut left[field];
                part[field] = product(&direction, column);
                for (value, along) in column.iter_mut().zip(&direction) {
                    *value -= part[field] * along;
                }
                sizes[field] = square(column);
            }
            sizes[best] = 0.0;
            kept.push(best);
            parts.push(part);
        }
        // The kept fields' own parts are triangular; solved from the last kept field on.
        let few = kept.len();
        let mut shares = vec![Complex64::ZERO; fields * few];
        for field in 0..fields {
            let of_field = &mut shares[field * few..(field + 1) * few];
            for row in (0..few).rev() {
                let mut rest = parts[row][field];
                for column in row + 1..few {
                    rest -= parts[row][kept[column]] * of_field[column];
                }
                of_field[row] = rest / parts[row][kept[row]];
            }
        }
        Self { kept, shares }
    }

    /// The kept fields.
    pub(super) fn kept(&self) -> &[usize] {
        &self.kept
    }

    /// Factors of all fields as factors of the kept ones.
    pub(super) fn few(&self, factors: &[Complex64]) -> Vec<Complex64> {
        let mut few = vec![Complex64::ZERO; self.kept.len()];
        for (factor, shares) in factors
            .iter()
            .zip(self.shares.chunks_exact(few.len().max(1)))
        {
            for (sum, share) in few.iter_mut().zip(shares) {
                *sum += factor * share;
            }
        }
        few
    }
}

fn square(column: &[Complex64]) -> f64 {
    column.iter().map(Complex64::norm_sqr).sum()
}

/// The scalar product, the first conjugated; in lanes, so that it becomes vector code.
fn product(direction: &[Complex64], column: &[Complex64]) -> Complex64 {
    let mut lanes = [Complex64::ZERO; 4];
    let (heads, tails) = (direction.chunks_exact(4), column.chunks_exact(4));
    let rest = heads.remainder().iter().zip(tails.remainder());
    let mut sum: Complex64 = rest.map(|(a, b)| a.conj() * b).sum();
    for (a, b) in heads.zip(tails) {
        for (lane, (a, b)) in lanes.iter_mut().zip(a.iter().zip(b)) {
            *lane += a.conj() * b;
        }
    }
    for lane in lanes {
        sum += lane;
    }
    sum
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn waves_from_many_sides_are_sums_of_few() {
        let places: Vec<f64> = (0..60).map(|i| f64::from(i) / 20.0).collect();
        let wave = |side: f64| -> Vec<Complex64> {
            places.iter().map(|at| Complex64::cis(side * at)).collect()
        };
        let examples: Vec<Vec<Complex64>> =
            (0..80).map(|i| wave((f64::from(i) * 0.61).sin())).collect();
        let compression = Compression::new(&examples, 1e-6);
        assert!(
            compression.kept().len() < 15,
            "{}",
            compression.kept().len()
        );
        // Any sum over the fields of a wave not among the examples.
        let factors: Vec<Complex64> = (0..60)
            .map(|i| Complex64::cis(f64::from(i * i % 17)))
            .collect();
        let few = compression.few(&factors);
        let unseen = wave(0.123);
        let exact: Complex64 = factors.iter().zip(&unseen).map(|(f, v)| f * v).sum();
        let kept = compression.kept().iter();
        let found: Complex64 = few
            .iter()
            .zip(kept)
            .map(|(f, &field)| f * unseen[field])
            .sum();
        assert!((found - exact).norm() < 1e-4, "{found} {exact}");
    }
}
