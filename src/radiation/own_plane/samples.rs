//! At which frequencies a response is solved, and the mixtures by which it is judged.

use crate::radiation::plate::Wire;
use crate::radiation::vector::{difference, norm};

/// Below this, samples lie at even ratios, since fields there go by ratios.
const EVEN_RATIOS_TO_HZ: f64 = 150e6;

/// Frequencies from the first to the last: even ratios at the lower end, even steps above.
pub(super) fn samples_hz(first_hz: f64, last_hz: f64, count: usize) -> Vec<f64> {
    let bend_hz = EVEN_RATIOS_TO_HZ.clamp(first_hz, last_hz);
    // A step at the bend is as long by its ratio as by its difference.
    let turns = (bend_hz / first_hz).ln();
    let steps = (last_hz - bend_hz) / bend_hz;
    let all = turns + steps;
    (0..count)
        .map(|i| {
            let at = all * i as f64 / (count - 1) as f64;
            if at <= turns {
                first_hz * at.exp()
            } else {
                (bend_hz * (1.0 + at - turns)).min(last_hz)
            }
        })
        .collect()
}

/// The middles of the gaps.
pub(super) fn between(samples_hz: &[f64]) -> Vec<f64> {
    samples_hz
        .windows(2)
        .map(|pair| (pair[0] + pair[1]) / 2.0)
        .collect()
}

/// Along all its pieces.
pub(super) fn length_m(wire: &Wire) -> f64 {
    let pieces = wire.points_m.windows(2);
    pieces.map(|pair| norm(difference(pair[1], pair[0]))).sum()
}

/// A sign without a pattern (the finaliser of SplitMix64; Steele, Lea & Flood, OOPSLA 2014, from memory).
pub(super) fn sign(number: usize, series: usize) -> f64 {
    let mut bits =
        (number as u64).wrapping_mul(0x9e37_79b9_7f4a_7c15) ^ (series as u64).rotate_left(32);
    bits = (bits ^ (bits >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
    bits = (bits ^ (bits >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
    if (bits ^ (bits >> 31)) & 1 == 0 {
        1.0
    } else {
        -1.0
    }
}
