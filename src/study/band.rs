//! Which frequencies to scan.

use crate::board::Board;
use crate::limit::Limit;

const LOWEST_HZ: f64 = 30e6;
/// CISPR 32 scans to 1 GHz at least (from memory); 47 CFR 15.33 lets devices below 1.705 MHz stop sooner.
const LEAST_TOP_HZ: f64 = 1e9;

/// The band of a radiated scan, from 30 MHz, or the lowest limit if that is lower, to the top frequency
/// that 47 CFR 15.33 asks for.
pub fn scan_band_hz(board: &Board, limits: &[Limit]) -> (f64, f64) {
    let lowest_hz = limits
        .iter()
        .flat_map(|limit| &limit.bands)
        .map(|band| band.from_hz)
        .fold(LOWEST_HZ, f64::min);
    let highest_clock_hz = board
        .nets
        .iter()
        .map(|net| net.clock_hz)
        .fold(0.0, f64::max);
    (lowest_hz, top_frequency_hz(highest_clock_hz))
}

/// Top frequency of the scan from the highest frequency generated or used in the device
/// (47 CFR 15.33(b)(1)), and no less than 1 GHz.
fn top_frequency_hz(highest_hz: f64) -> f64 {
    if highest_hz < 108e6 {
        LEAST_TOP_HZ
    } else if highest_hz < 500e6 {
        2e9
    } else if highest_hz < 1e9 {
        5e9
    } else {
        (5.0 * highest_hz).min(40e9)
    }
}

#[cfg(test)]
mod tests {
    use super::top_frequency_hz;

    /// 47 CFR 15.33(b)(1).
    #[test]
    fn top_frequency_follows_the_table() {
        for (highest_hz, top_hz) in [
            (1e6, 1e9),
            (48e6, 1e9),
            (107.9e6, 1e9),
            (156e6, 2e9),
            (499e6, 2e9),
            (600e6, 5e9),
            (1.2e9, 6e9),
            (10e9, 40e9),
        ] {
            assert_eq!(top_frequency_hz(highest_hz), top_hz);
        }
    }
}
