//! Points that fill the space of tolerances evenly, as standard normal scores.

use sobol_burley::{NUM_DIMENSIONS, sample};
use std::f64::consts::{PI, SQRT_2};

/// Most draws: the length of the sequence.
pub const MOST_DRAWS: usize = 1 << 16;
/// The generator's steps are 2^-23 or finer: half of one keeps shares off 0 and 1.
const HALF_STEP: f64 = 1.0 / (1 << 24) as f64;

/// The scores of one draw, a tolerance each: a point of a Sobol sequence with Owen's scrambling (Burley, JCGT 9(4),
/// 2020), always the same. The points up to any power of two are the most even.
pub fn scores(draw: usize, tolerances: usize) -> Vec<f64> {
    (0..tolerances as u32)
        .map(|dimension| {
            // Beyond the dimensions there are, another scrambling of the first ones.
            let seed = dimension / NUM_DIMENSIONS;
            let share = sample(draw as u32, dimension % NUM_DIMENSIONS, seed);
            normal_score(f64::from(share) + HALF_STEP)
        })
        .collect()
}

/// The score below which this share of a standard normal distribution lies; shares strictly between 0 and 1.
fn normal_score(share: f64) -> f64 {
    let tail = share.min(1.0 - share);
    // Abramowitz & Stegun 26.2.23 (from memory), good to 5e-4 ...
    let t = (-2.0 * tail.ln()).sqrt();
    let over = 2.515_517 + t * (0.802_853 + t * 0.010_328);
    let under = 1.0 + t * (1.432_788 + t * (0.189_269 + t * 0.001_308));
    let mut score = t - over / under;
    // ... and two of Halley's steps, each of third order.
    for _ in 0..2 {
        let error = 0.5 * libm::erfc(score / SQRT_2) - tail;
        let density = (-0.5 * score * score).exp() / (2.0 * PI).sqrt();
        let step = -error / density;
        score -= step / (1.0 + 0.5 * step * score);
    }
    if share < 0.5 { -score } else { score }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Quantiles of the normal distribution (any statistics table).
    #[test]
    fn normal_scores_are_the_table_s() {
        for (share, score) in [
            (0.5, 0.0),
            (0.75, 0.674_489_750_2),
            (0.95, 1.644_853_626_95),
            (0.975, 1.959_963_984_54),
            (0.999, 3.090_232_306_17),
        ] {
            assert!((normal_score(share) - score).abs() < 1e-10, "{share}");
            assert!((normal_score(1.0 - share) + score).abs() < 1e-10, "{share}");
        }
        let end = normal_score(HALF_STEP);
        assert!((0.5 * libm::erfc(-end / SQRT_2) / HALF_STEP - 1.0).abs() < 1e-9);
    }

    fn share(draw: usize, dimension: usize) -> f64 {
        1.0 - 0.5 * libm::erfc(scores(draw, dimension + 1)[dimension] / SQRT_2)
    }

    /// Sobol (1967): of the first 2^k points, each of 2^k equal intervals of every axis holds exactly one; scrambling
    /// keeps that. A random sequence leaves a third of them empty.
    #[test]
    fn every_interval_of_every_axis_has_its_point() {
        for dimension in [0, 1, 7, 40, 255, 256, 300] {
            for count in [64, 256] {
                let mut held = vec![0; count];
                for draw in 0..count {
                    held[(share(draw, dimension) * count as f64) as usize] += 1;
                }
                assert!(held.iter().all(|held| *held == 1), "{dimension} {held:?}");
            }
        }
    }

    /// The first two dimensions are a (0, 2)-sequence: every box of area 2^-k holds one of the first 2^k points.
    #[test]
    fn every_box_of_the_first_two_axes_has_its_point() {
        for rows in [1_usize, 2, 4, 16, 64, 256] {
            let columns = 256 / rows;
            let mut held = vec![0; 256];
            for draw in 0..256 {
                let row = (share(draw, 0) * rows as f64) as usize;
                let column = (share(draw, 1) * columns as f64) as usize;
                held[row * columns + column] += 1;
            }
            assert!(held.iter().all(|held| *held == 1), "{rows}");
        }
    }

    /// Means and variances of scores come out far nearer than the 1/16 of 256 random ones.
    #[test]
    fn moments_are_those_of_the_normal_distribution() {
        let all: Vec<Vec<f64>> = (0..256).map(|draw| scores(draw, 12)).collect();
        for dimension in 0..12 {
            let mean = all.iter().map(|scores| scores[dimension]).sum::<f64>() / 256.0;
            let square = all.iter().map(|scores| scores[dimension].powi(2));
            assert!(mean.abs() < 0.005, "{dimension}: {mean}");
            assert!((square.sum::<f64>() / 256.0 - 1.0).abs() < 0.03);
        }
    }
}
