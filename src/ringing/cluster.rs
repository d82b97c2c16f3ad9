//! A cluster of nodes joined by lumped parts, solved at one instant.

use super::algebra::inverse;
use super::clamp::Clamps;
use super::companion::Companion;
use super::network::{BranchEnd, DRIVER_NODE, Network};
use ndarray::{Array1, Array2};

/// Largest change of a voltage in the last round of an accepted solution.
const TOLERANCE_V: f64 = 1e-10;
const MOST_ROUNDS: usize = 100;

/// Nodes joined by lumped parts. Seen from outside it is a matrix of resistances: the nodes'
/// voltages over the currents injected into them, with the currents of those loads taken off that
/// are no constant conductance.
#[derive(Debug, Clone)]
pub(super) struct Cluster {
    /// The nodes, by their numbers in the network.
    nodes: Vec<usize>,
    /// Node by node, row by row; ohm.
    resistance_ohm: Vec<f64>,
    ports: Ports,
    /// Voltages without the loads' currents, node by node.
    open_v: Vec<f64>,
}

/// A load whose current depends on voltage or time.
#[derive(Debug, Clone)]
pub(super) enum Load {
    /// A receiver's clamps.
    Clamps(Clamps),
    /// What the driver's conductance is now, over the one in the matrix.
    DriverChange,
}

/// The loads of a cluster, each with the place of its node, and how their currents are found.
#[derive(Debug, Clone)]
enum Ports {
    None,
    /// One pair of clamps, taken together with the resistance of the cluster: a closed form.
    OneClamped {
        node: usize,
        behind_cluster: Clamps,
    },
    /// The driver alone: a closed form.
    OneDriver {
        node: usize,
    },
    /// Anything else, by Newton's method.
    Several(Vec<(usize, Load)>),
}

impl Load {
    /// Current out of the node and its slope.
    fn current(&self, voltage_v: f64, driver_change_s: f64) -> (f64, f64) {
        match self {
            Self::Clamps(clamps) => clamps.load(voltage_v),
            Self::DriverChange => (driver_change_s * voltage_v, driver_change_s),
        }
    }
}

impl Cluster {
    /// A cluster from its nodes, their conductance matrix (siemens) and the loads at some of them
    /// (by node number in the network).
    pub(super) fn new(
        nodes: Vec<usize>,
        conductance: &Array2<f64>,
        loads: Vec<(usize, Load)>,
    ) -> Self {
        let place = |node| {
            nodes
                .iter()
                .position(|&n| n == node)
                .expect("loads lie in the cluster")
        };
        let loads: Vec<(usize, Load)> = loads
            .into_iter()
            .map(|(node, load)| (place(node), load))
            .collect();
        let resistance = inverse(conductance);
        let ports = match loads.as_slice() {
            [] => Ports::None,
            [(node, Load::DriverChange)] => Ports::OneDriver { node: *node },
            [(node, Load::Clamps(clamps))] => match clamps.behind(resistance[[*node, *node]]) {
                Some(behind_cluster) => Ports::OneClamped {
                    node: *node,
                    behind_cluster,
                },
                None => Ports::Several(loads),
            },
            _ => Ports::Several(loads),
        };
        Self {
            open_v: vec![0.0; nodes.len()],
            resistance_ohm: resistance.into_iter().collect(),
            nodes,
            ports,
        }
    }

    /// The nodes' voltages, written into `voltage_v`, from the currents injected into them.
    pub(super) fn solve(
        &mut self,
        injected_a: &[f64],
        driver_change_s: f64,
        voltage_v: &mut [f64],
    ) {
        let count = self.nodes.len();
        if let (&[node], &[own_ohm]) = (&self.nodes[..], &self.resistance_ohm[..]) {
            // Most are a single node.
            let open_v = own_ohm * injected_a[node];
            match &self.ports {
                Ports::None => {
                    voltage_v[node] = open_v;
                    return;
                }
                Ports::OneClamped { behind_cluster, .. } => {
                    voltage_v[node] = open_v - own_ohm * behind_cluster.load(open_v).0;
                    return;
                }
                Ports::OneDriver { .. } => {
                    voltage_v[node] = open_v / (1.0 + own_ohm * driver_change_s);
                    return;
                }
                Ports::Several(_) => {}
            }
        }
        for (open_v, row) in self
            .open_v
            .iter_mut()
            .zip(self.resistance_ohm.chunks_exact(count))
        {
            *open_v = row
                .iter()
                .zip(&self.nodes)
                .map(|(r, &node)| r * injected_a[node])
                .sum();
        }
        match &self.ports {
            Ports::None => {}
            Ports::OneClamped {
                node,
                behind_cluster,
            } => {
                let current_a = behind_cluster.load(self.open_v[*node]).0;
                if current_a != 0.0 {
                    self.draw(*node, current_a);
                }
            }
            Ports::OneDriver { node } => {
                let own_ohm = self.resistance_ohm[node * count + node];
                let shared = 1.0 + own_ohm * driver_change_s;
                self.draw(*node, driver_change_s * self.open_v[*node] / shared);
            }
            Ports::Several(loads) => {
                let currents_a = self.balance(loads, driver_change_s);
                let nodes: Vec<usize> = loads.iter().map(|load| load.0).collect();
                for (node, current_a) in nodes.into_iter().zip(currents_a) {
                    self.draw(node, current_a);
                }
            }
        }
        for (&node, &open_v) in self.nodes.iter().zip(&self.open_v) {
            voltage_v[node] = open_v;
        }
    }

    /// Takes off what a current out of one node does to all.
    fn draw(&mut self, node: usize, current_a: f64) {
        let count = self.nodes.len();
        for (open_v, row) in self
            .open_v
            .iter_mut()
            .zip(self.resistance_ohm.chunks_exact(count))
        {
            *open_v -= row[node] * current_a;
        }
    }

    /// The loads' currents, by Newton's method on u + R i(u) = open voltage. The loads rise with
    /// voltage and bend away from zero, so from the open voltage it goes straight down to the one solution.
    fn balance(&self, loads: &[(usize, Load)], driver_change_s: f64) -> Vec<f64> {
        let (count, size) = (loads.len(), self.nodes.len());
        let between = |p: usize, q: usize| self.resistance_ohm[loads[p].0 * size + loads[q].0];
        let mut u: Vec<f64> = loads.iter().map(|&(node, _)| self.open_v[node]).collect();
        let mut currents: Vec<(f64, f64)> = Vec::new();
        for _ in 0..MOST_ROUNDS {
            currents = loads
                .iter()
                .zip(&u)
                .map(|((_, load), &u)| load.current(u, driver_change_s))
                .collect();
            let jacobian = Array2::from_shape_fn((count, count), |(p, q)| {
                f64::from(u8::from(p == q)) + between(p, q) * currents[q].1
            });
            let residual = Array1::from_shape_fn(count, |p| {
                let drop_v: f64 = (0..count).map(|q| between(p, q) * currents[q].0).sum();
                u[p] - self.open_v[loads[p].0] + drop_v
            });
            let change = inverse(&jacobian).dot(&residual);
            for (u, change) in u.iter_mut().zip(&change) {
                *u -= change;
            }
            if change.iter().all(|change| change.abs() < TOLERANCE_V) {
                break;
            }
        }
        currents.into_iter().map(|current| current.0).collect()
    }
}

/// The clusters of nodes that lumped branches join, with everything that loads them: lines' ends (node and
/// conductance), the driver, and clamps with voltages counted from `middle_v`.
pub(super) fn clusters(
    network: &Network,
    line_ends: impl Iterator<Item = (usize, f64)>,
    branches: &[Companion],
    driver_s: f64,
    middle_v: f64,
) -> Vec<Cluster> {
    let count = network.node_count;
    let mut conductance = Array2::<f64>::zeros((count, count));
    conductance[[DRIVER_NODE, DRIVER_NODE]] += driver_s;
    for (node, conductance_s) in line_ends {
        conductance[[node, node]] += conductance_s;
    }
    // Every node starts in a cluster of its own; a branch between two makes them one.
    let mut cluster_of: Vec<usize> = (0..count).collect();
    for branch in branches {
        let (from, g) = (branch.from, branch.conductance_s);
        conductance[[from, from]] += g;
        if let BranchEnd::Node(to) = branch.to {
            conductance[[to, to]] += g;
            conductance[[from, to]] -= g;
            conductance[[to, from]] -= g;
            let (kept, merged) = (cluster_of[from], cluster_of[to]);
            for cluster in &mut cluster_of {
                if *cluster == merged {
                    *cluster = kept;
                }
            }
        }
    }
    (0..count)
        .map(|id| {
            (0..count)
                .filter(|&node| cluster_of[node] == id)
                .collect::<Vec<usize>>()
        })
        .filter(|nodes| !nodes.is_empty())
        .map(|nodes| {
            let mut loads: Vec<(usize, Load)> = network
                .inputs
                .iter()
                .filter(|input| input.clamps.any() && nodes.contains(&input.node))
                .map(|input| {
                    let clamps = input.clamps.counted_from(middle_v);
                    (input.node, Load::Clamps(clamps))
                })
                .collect();
            if nodes.contains(&DRIVER_NODE) && !network.source.is_steady() {
                loads.push((DRIVER_NODE, Load::DriverChange));
            }
            let block = Array2::from_shape_fn((nodes.len(), nodes.len()), |(row, column)| {
                conductance[[nodes[row], nodes[column]]]
            });
            Cluster::new(nodes, &block, loads)
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::board::{Clamp, HighClamp, ReceiverPart};
    use ndarray::array;

    #[test]
    fn two_clamped_nodes_balance_their_currents() {
        let part = ReceiverPart {
            name: "input".into(),
            capacitance_f: 0.0,
            resistance_ohm: None,
            low_clamp: Some(Clamp {
                knee_v: 0.7,
                resistance_ohm: 10.0,
            }),
            high_clamp: Some(HighClamp {
                clamp: Clamp {
                    knee_v: 0.7,
                    resistance_ohm: 10.0,
                },
                supply_v: 3.3,
            }),
            low_threshold_v: None,
            high_threshold_v: None,
            clamp_rating_a: None,
            max_rise_s: None,
            package_inductance_h: 0.0,
            package_capacitance_f: 0.0,
        };
        let clamps = Clamps::of(&part);
        // node 0 over 50 ohm to ground, 20 ohm between the nodes
        let conductance = array![
            [1.0 / 50.0 + 1.0 / 20.0, -1.0 / 20.0],
            [-1.0 / 20.0, 1.0 / 20.0]
        ];
        let loads = vec![(0, Load::Clamps(clamps)), (1, Load::Clamps(clamps))];
        let mut cluster = Cluster::new(vec![0, 1], &conductance, loads);
        for injected_a in [-0.3, -0.02, 0.0, 0.05, 0.4] {
            let mut v = [0.0; 2];
            cluster.solve(&[injected_a, injected_a / 2.0], 0.0, &mut v);
            let between = (v[0] - v[1]) / 20.0;
            let first = injected_a - v[0] / 50.0 - between - clamps.load(v[0]).0;
            let second = injected_a / 2.0 + between - clamps.load(v[1]).0;
            assert!(
                first.abs() < 1e-8 && second.abs() < 1e-8,
                "{injected_a}: {v:?}"
            );
        }
    }
}
