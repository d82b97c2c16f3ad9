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
        let mut left: Vec<Split> = (0..fields)
            .map(|field| Split::new(examples.iter().map(|example| example[field])))
            .collect();
        let mut sizes: Vec<f64> = left.iter().map(Split::square).collect();
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
            let direction = left[best].scaled(1.0 / left[best].square().sqrt());
            let mut part = vec![Complex64::ZERO; fields];
            for (field, column) in left.iter_mut().enumerate() {
                // A field that is kept has nothing left; one this small never will be.
                if sizes[field] == 0.0 {
                    continue;
                }
                part[field] = direction.product(column);
                column.take(part[field], &direction);
                sizes[field] = column.square();
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

    /// Memory that it takes.
    pub(super) fn bytes(&self) -> usize {
        self.shares.len() * size_of::<Complex64>()
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

/// Complex values, their parts apart, so that the loops become vector code.
#[derive(Debug, Clone)]
struct Split {
    re: Vec<f64>,
    im: Vec<f64>,
}

impl Split {
    fn new(values: impl Iterator<Item = Complex64>) -> Self {
        let (re, im) = values.map(|value| (value.re, value.im)).unzip();
        Self { re, im }
    }

    fn square(&self) -> f64 {
        dot(&self.re, &self.re) + dot(&self.im, &self.im)
    }

    fn scaled(&self, factor: f64) -> Self {
        let scaled = |part: &Vec<f64>| part.iter().map(|value| factor * value).collect();
        Self {
            re: scaled(&self.re),
            im: scaled(&self.im),
        }
    }

    /// The scalar product with another, this one conjugated.
    fn product(&self, other: &Self) -> Complex64 {
        Complex64::new(
            dot(&self.re, &other.re) + dot(&self.im, &other.im),
            dot(&self.re, &other.im) - dot(&self.im, &other.re),
        )
    }

    /// Takes a multiple of another away.
    fn take(&mut self, factor: Complex64, other: &Self) {
        let parts = self.re.iter_mut().zip(&mut self.im);
        for ((re, im), (a, b)) in parts.zip(other.re.iter().zip(&other.im)) {
            *re -= factor.re * a - factor.im * b;
            *im -= factor.re * b + factor.im * a;
        }
    }
}

/// In lanes: a sum in order would forbid vector code.
fn dot(a: &[f64], b: &[f64]) -> f64 {
    let mut lanes = [0.0; 4];
    let (heads, others) = (a.chunks_exact(4), b.chunks_exact(4));
    let rest = heads.remainder().iter().zip(others.remainder());
    let sum: f64 = rest.map(|(a, b)| a * b).sum();
    for (a, b) in heads.zip(others) {
        for (lane, (a, b)) in lanes.iter_mut().zip(a.iter().zip(b)) {
            *lane += a * b;
        }
    }
    sum + lanes.iter().sum::<f64>()
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
