//! The first wave: how high each receiver gets before anything comes back.
//!
//! The lattice diagram's first pass (any text on transmission lines): a wave launched into the impedances that leave the
//! driver, passed on at every joint, and added to its own reflection where it ends. Edges are taken as steps, lines as
//! lossless, inductances as shorts. A capacitor behind a resistor (an RC termination) holds its voltage meanwhile; one
//! without (an input, a via) is taken as full.

use std::collections::HashMap;

use crate::board::Driver;
use crate::ringing::{Branch, BranchEnd, Clamps, DRIVER_NODE, Input, Network, rest_levels_v};

/// Stands for no resistance; far below any part's.
const SHORT_OHM: f64 = 1e-6;

/// What the first wave makes of one receiver.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FirstWave {
    /// When it arrives, from the driver's edge.
    pub arrival_s: f64,
    /// Level that the rising edge's wave brings.
    pub risen_v: f64,
    /// Level that the falling edge's wave brings.
    pub fallen_v: f64,
}

/// The first wave at every receiver, in the order of [`Network::inputs`].
pub fn first_waves(network: &Network, driver: &Driver) -> Vec<FirstWave> {
    let low = rest_levels_v(network, false);
    let high = rest_levels_v(network, true);
    // What the driver injects into the net the moment its state has changed.
    let injected_a = |from: bool, to: bool| {
        let (from_v, from_ohm) = state(driver, from);
        let (to_v, to_ohm) = state(driver, to);
        let rest_v = driver_rest_v(network, from);
        (to_v - rest_v) / to_ohm - (from_v - rest_v) / from_ohm
    };
    let up = waves(network, injected_a(false, true), driver.high_resistance_ohm);
    let down = waves(network, injected_a(true, false), driver.low_resistance_ohm);
    let inputs = network.inputs.iter().zip(low.iter().zip(&high));
    inputs
        .map(|(input, (low_v, high_v))| FirstWave {
            arrival_s: up[&input.node].0,
            risen_v: low_v + up[&input.node].1,
            fallen_v: high_v + down[&input.node].1,
        })
        .collect()
}

fn state(driver: &Driver, high: bool) -> (f64, f64) {
    if high {
        (driver.high_v, driver.high_resistance_ohm)
    } else {
        (driver.low_v, driver.low_resistance_ohm)
    }
}

/// The level at rest of the driver's pin.
pub(super) fn driver_rest_v(network: &Network, high: bool) -> f64 {
    let mut probed = network.clone();
    probed.inputs.push(Input {
        name: String::new(),
        node: DRIVER_NODE,
        clamps: Clamps::default(),
        clamp_rating_a: None,
        low_threshold_v: None,
        high_threshold_v: None,
    });
    rest_levels_v(&probed, high).pop().unwrap_or_default()
}

/// When the first wave reaches each node, and its voltage there, from a step of current into the driver's node.
fn waves(network: &Network, injected_a: f64, driver_ohm: f64) -> HashMap<usize, (f64, f64)> {
    let mut reached = HashMap::new();
    let mut waiting = vec![(DRIVER_NODE, 0.0, injected_a, 1.0 / driver_ohm)];
    while let Some((entry, arrival_s, injected_a, source_s)) = waiting.pop() {
        let nodes = joined(network, entry);
        let voltages_v = solve(network, &nodes, entry, injected_a, source_s);
        for (&node, &voltage_v) in nodes.iter().zip(&voltages_v) {
            reached.insert(node, (arrival_s, voltage_v));
            for span in network.spans.iter().filter(|span| span.near == node) {
                let ohm = span.line.impedance_ohm;
                let arrival_s = arrival_s + span.line.delay_s;
                // An arriving wave is a source of twice its voltage behind the line.
                waiting.push((span.far, arrival_s, 2.0 * voltage_v / ohm, 0.0));
            }
        }
    }
    reached
}

/// All nodes that lumped parts join to this one.
fn joined(network: &Network, entry: usize) -> Vec<usize> {
    let mut nodes = vec![entry];
    let mut next = 0;
    while let Some(&node) = nodes.get(next) {
        for branch in &network.branches {
            let BranchEnd::Node(to) = branch.to else {
                continue;
            };
            for (here, there) in [(branch.from, to), (to, branch.from)] {
                if here == node && !nodes.contains(&there) {
                    nodes.push(there);
                }
            }
        }
        next += 1;
    }
    nodes
}

/// The voltages of some joined nodes, lines being their impedances.
fn solve(
    network: &Network,
    nodes: &[usize],
    entry: usize,
    injected_a: f64,
    source_s: f64,
) -> Vec<f64> {
    let count = nodes.len();
    let place = |node: usize| nodes.iter().position(|&other| other == node);
    let mut matrix = vec![vec![0.0; count + 1]; count];
    if let Some(entry) = place(entry) {
        matrix[entry][entry] += source_s;
        matrix[entry][count] += injected_a;
    }
    for span in &network.spans {
        for end in [span.near, span.far] {
            if let Some(at) = place(end) {
                matrix[at][at] += 1.0 / span.line.impedance_ohm;
            }
        }
    }
    for branch in &network.branches {
        let Some(from) = place(branch.from) else {
            continue;
        };
        let conductance_s = 1.0 / branch.resistance_ohm.max(SHORT_OHM);
        match branch.to {
            BranchEnd::Node(to) => {
                let Some(to) = place(to) else { continue };
                matrix[from][from] += conductance_s;
                matrix[to][to] += conductance_s;
                matrix[from][to] -= conductance_s;
                matrix[to][from] -= conductance_s;
            }
            BranchEnd::RailV(_) if is_full_at_once(branch) => {}
            BranchEnd::RailV(_) => matrix[from][from] += conductance_s,
        }
    }
    eliminated(matrix)
}

/// A capacitance without a resistor: an input, a via.
fn is_full_at_once(branch: &Branch) -> bool {
    branch.capacitance_f.is_some() && branch.resistance_ohm == 0.0
}

/// Gauss's elimination with pivoting of a small matrix with its right-hand side in the last column.
fn eliminated(mut rows: Vec<Vec<f64>>) -> Vec<f64> {
    let count = rows.len();
    for column in 0..count {
        let by_size =
            |a: &usize, b: &usize| rows[*a][column].abs().total_cmp(&rows[*b][column].abs());
        let pivot = (column..count).max_by(by_size).unwrap_or(column);
        rows.swap(column, pivot);
        let head = rows[column].clone();
        if head[column] == 0.0 {
            continue;
        }
        for (number, row) in rows.iter_mut().enumerate() {
            if number == column {
                continue;
            }
            let share = row[column] / head[column];
            for (value, of_head) in row.iter_mut().zip(&head) {
                *value -= share * of_head;
            }
        }
    }
    (0..count)
        .map(|row| match rows[row][row] {
            0.0 => 0.0,
            pivot => rows[row][count] / pivot,
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::board::read_board;

    /// First waves of a net whose driver swings 4 V through `ohm`.
    fn of(ohm: f64, path: &[&str]) -> Vec<FirstWave> {
        let path: Vec<String> = path.iter().map(|item| format!("{{{item}}}")).collect();
        let path = path.join(", ");
        let text = format!(
            "drivers: {{d: {{swing: 4 V, resistance: {ohm} ohm, rise: 0.5 ns}}}}
receivers: {{r: {{capacitance: 0 pF}}}}
nets: [{{name: A, driver: d, clock: 10 MHz, path: [{path}]}}]"
        );
        let net = read_board(&text, "test").board.unwrap().nets.remove(0);
        first_waves(&Network::of(&net), &net.driver)
    }

    const LINE: &str = "line: {impedance: 50 ohm, delay: 2 ns}";

    fn near(left: f64, right: f64) {
        assert!((left - right).abs() < 1e-4, "{left} is not {right}");
    }

    /// Lattice diagram by hand: 4 V behind 50 ohm launch 2 V, doubled at the open end.
    #[test]
    fn a_matched_source_reaches_the_far_end_in_full_and_half_way_at_half() {
        let waves = of(
            10.0,
            &["series: 40 ohm", LINE, "receiver: r", LINE, "receiver: r"],
        );
        assert_eq!(waves.len(), 2);
        near(waves[0].risen_v, 2.0);
        near(waves[0].arrival_s * 1e9, 2.0);
        near(waves[1].risen_v, 4.0);
        near(waves[1].fallen_v, 0.0);
        near(waves[1].arrival_s * 1e9, 4.0);
    }

    /// By hand: 4 V through 10 ohm into 50 ohm launch 3.333 V; an open end doubles it to 6.667 V, a matched end leaves
    /// it, 25 ohm (reflection -1/3) bring 2.222 V.
    #[test]
    fn ends_reflect_as_their_resistance_says() {
        let launched = 4.0 * 50.0 / 60.0;
        near(of(10.0, &[LINE, "receiver: r"])[0].risen_v, 2.0 * launched);
        near(
            of(10.0, &[LINE, "receiver: r", "shunt: {resistance: 50 ohm}"])[0].risen_v,
            launched,
        );
        let third = of(10.0, &[LINE, "receiver: r", "shunt: {resistance: 25 ohm}"]);
        near(third[0].risen_v, launched * 2.0 / 3.0);
        let rc = of(
            10.0,
            &[
                LINE,
                "receiver: r",
                "shunt: {resistance: 50 ohm, capacitance: 1 nF}",
            ],
        );
        near(rc[0].risen_v, launched);
        // At rest the capacitor is full: the falling wave starts from 4 V.
        near(rc[0].fallen_v, 4.0 - launched);
    }

    /// By hand: to 3.3 V, at rest low, 50 ohm and 10 ohm divide to 0.55 V at the pin and the end alike; the rising
    /// wave's source steps by 4 V, 3.333 V of it enter the line.
    #[test]
    fn a_rail_lifts_the_level_that_the_wave_starts_from() {
        let waves = of(
            10.0,
            &[
                LINE,
                "receiver: r",
                "shunt: {resistance: 50 ohm, to: 3.3 V}",
            ],
        );
        near(waves[0].risen_v, 0.55 + 4.0 * 50.0 / 60.0);
    }

    /// By hand: 2 V arrive (50 ohm source); two legs of 50 ohm are 25 ohm, reflection -1/3: 1.333 V go on, and open
    /// ends double them.
    #[test]
    fn a_tee_passes_on_two_thirds() {
        let leg = format!("branch: [{{{LINE}}}, {{receiver: r}}]");
        let waves = of(50.0, &[LINE, &leg, LINE, "receiver: r"]);
        near(waves[0].risen_v, 2.0 * 2.0 / 3.0 * 2.0);
        near(waves[1].risen_v, 2.0 * 2.0 / 3.0 * 2.0);
    }
}
