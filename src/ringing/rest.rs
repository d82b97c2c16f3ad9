//! The levels at which a net comes to rest.

use super::cluster::{Cluster, Load};
use super::network::{BranchEnd, DRIVER_NODE, Network};
use ndarray::Array2;

/// Stands for no resistance at all; far below any part's.
const SHORT_OHM: f64 = 1e-6;

/// The voltage at each receiver when the driver has been in one state for ever: lines and
/// inductances are shorts, capacitances open.
pub fn rest_levels_v(network: &Network, high: bool) -> Vec<f64> {
    let source = &network.source;
    let high_share = if high { 1.0 } else { 0.0 };
    let driver_s = source.conductance_s(high_share);
    let count = network.node_count;
    let mut conductance = Array2::<f64>::zeros((count, count));
    let mut injected_a = vec![0.0; count];
    conductance[[DRIVER_NODE, DRIVER_NODE]] += driver_s;
    injected_a[DRIVER_NODE] += driver_s * source.voltage_v(high_share);
    let lines = network
        .spans
        .iter()
        .map(|span| (span.near, BranchEnd::Node(span.far), 0.0));
    let parts = network
        .branches
        .iter()
        .filter(|branch| branch.capacitance_f.is_none())
        .map(|branch| (branch.from, branch.to, branch.resistance_ohm));
    for (from, to, resistance_ohm) in lines.chain(parts) {
        let g = 1.0 / resistance_ohm.max(SHORT_OHM);
        conductance[[from, from]] += g;
        match to {
            BranchEnd::Node(to) => {
                conductance[[to, to]] += g;
                conductance[[from, to]] -= g;
                conductance[[to, from]] -= g;
            }
            BranchEnd::RailV(rail_v) => injected_a[from] += g * rail_v,
        }
    }
    let loads = network
        .inputs
        .iter()
        .filter(|input| input.clamps.any())
        .map(|input| (input.node, Load::Clamps(input.clamps)))
        .collect();
    let mut voltage_v = vec![0.0; count];
    Cluster::new((0..count).collect(), &conductance, loads).solve(&injected_a, 0.0, &mut voltage_v);
    network
        .inputs
        .iter()
        .map(|input| voltage_v[input.node])
        .collect()
}
