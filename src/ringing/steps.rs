//! How finely to march.

use super::network::Network;

/// Steps per period of the highest frequency asked for. The trapezoidal rule then takes every
/// capacitance and inductance wrong by (2 pi / 100)^2 / 12 = 0.03 % at most.
const STEPS_PER_CYCLE: f64 = 100.0;
/// Steps per whole edge, so that the waveform's corners stand where they belong.
const STEPS_PER_EDGE: f64 = 16.0;
/// Fewest steps of a period.
const FEWEST: f64 = 256.0;

/// Number of steps in a period: even, of the form 2^a 3^b for the transform, fine enough for the
/// highest frequency asked for and for the shortest edge.
pub fn steps_per_period(network: &Network, top_frequency_hz: f64) -> usize {
    let by_frequency = network.period_s * top_frequency_hz * STEPS_PER_CYCLE;
    let by_edge = network.period_s / network.source.shortest_edge_s() * STEPS_PER_EDGE;
    next_smooth(by_frequency.max(by_edge).max(FEWEST).ceil() as usize)
}

/// The smallest even 2^a 3^b that is not below `least`.
fn next_smooth(least: usize) -> usize {
    let mut best = least.next_power_of_two().max(2);
    let mut odd = 3;
    while odd < best {
        let candidate = odd * least.div_ceil(odd).next_power_of_two().max(2);
        best = best.min(candidate);
        odd *= 3;
    }
    best
}

#[cfg(test)]
mod tests {
    use super::next_smooth;

    #[test]
    fn next_smooth_finds_the_smallest() {
        let smooth = |mut n: usize| {
            if n % 2 == 1 {
                return false;
            }
            while n.is_multiple_of(2) {
                n /= 2;
            }
            while n.is_multiple_of(3) {
                n /= 3;
            }
            n == 1
        };
        for least in 1..5000 {
            let slow = (least.max(2)..)
                .find(|&n| smooth(n))
                .expect("there is always one");
            assert_eq!(next_smooth(least), slow, "{least}");
        }
    }
}
