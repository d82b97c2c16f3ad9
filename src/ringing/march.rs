//! The march: step by step until a whole period repeats.

use super::cluster::{Cluster, Load};
use super::companion::{Companion, pi_section};
use super::extrapolate::extrapolated;
use super::network::{Branch, BranchEnd, DRIVER_NODE, Network};
use super::steps::Pace;
use super::travelling::{Model, TravellingLine};
use ndarray::Array2;

#[cfg(test)]
mod energy_tests;

/// Largest share of the swing by which the settled waveform may still be off.
const SETTLED: f64 = 1e-6;
/// Losses are fitted from here on: what lies lower is not radiated, and its slow relaxations would keep a net long
/// from its settled state.
const LOWEST_LOSSY_HZ: f64 = 20e6;
/// Where a net has not settled after this many states, the next is extrapolated from them.
const STATES: usize = 6;
/// Extrapolations before the states are taken twice as far apart.
const JUMPS_A_STRIDE: usize = 3;
/// How changes are taken to shrink where only one is known.
const USUAL_RATIO: f64 = 0.9;
/// Most steps of one march, some tenths of a second's worth.
const MOST_STEPS: usize = 10_000_000;

/// One settled period of a net.
#[derive(Debug, Clone)]
pub struct Settled {
    /// Voltages and currents at the driver and the receivers.
    pub waveform: SettledWaveform,
    /// The waves on each line, in the order of [`Network::spans`].
    pub waves: Vec<WaveRecord>,
    /// How it was reached.
    pub report: MarchReport,
}

/// One settled period, from the start of the rising edge.
#[derive(Debug, Clone, PartialEq)]
pub struct SettledWaveform {
    /// When the samples were taken.
    pub pace: Pace,
    /// Voltage at the driver's pin.
    pub driver_v: Vec<f64>,
    /// Current out of the driver.
    pub driver_a: Vec<f64>,
    /// Voltage at each receiver, in the order of the path.
    pub receivers_v: Vec<Vec<f64>>,
}

/// The two travelling waves of a line over one settled period, volts.
#[derive(Debug, Clone)]
pub struct WaveRecord {
    /// The wave away from the driver.
    pub outward_v: Vec<f64>,
    /// The wave back to the driver.
    pub inward_v: Vec<f64>,
    /// Where they were taken.
    pub taken: Taken,
}

/// Where on a line its two waves were taken.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Taken {
    /// Each where it sets out: outward at the near end, inward at the far end.
    AtStart,
    /// Both in the middle of a line too short to carry waves.
    InMiddle,
}

/// How the settled waveform was reached.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct MarchReport {
    /// Steps in one period.
    pub steps_per_period: usize,
    /// Steps of them that were marched; the others are time at rest.
    pub marched_steps: usize,
    /// Periods marched until one repeated.
    pub periods: usize,
    /// How far the last period may still be from the settled one, as a share of the swing.
    pub residual: f64,
    /// Whether that is small enough.
    pub settled: bool,
}

/// Marches a net until a whole period repeats, in steps fine enough for the top frequency, up to which losses are
/// fitted.
///
/// A net that does not settle within the longest march is returned as it stands, with the residual
/// in its report.
pub fn settle(network: &Network, top_frequency_hz: f64) -> Settled {
    let mut pace = Pace::first(network, top_frequency_hz);
    loop {
        let mut march = March::new(network, pace, top_frequency_hz);
        let report = march.settle();
        if pace.is_whole() || march.restlessness() < SETTLED * network.source.swing_v() {
            return march.into_settled(report);
        }
        pace = pace.longer();
    }
}

/// The state of a march.
struct March<'a> {
    network: &'a Network,
    pace: Pace,
    /// The driver's state at each step of the period: conductance and short-circuit current.
    drive: Vec<(f64, f64)>,
    base_conductance_s: f64,
    lines: Vec<LineState>,
    branches: Vec<Companion>,
    clusters: Vec<Cluster>,
    injected_a: Vec<f64>,
    voltage_v: Vec<f64>,
    waveform: SettledWaveform,
}

/// A line on the march.
enum LineState {
    /// Two delayed waves.
    Waves(Box<TravellingLine>),
    /// Shorter than the delays can be: one pi section of lumped parts, seen in its middle.
    Lumped {
        near: usize,
        far: usize,
        branch: usize,
        impedance_ohm: f64,
        record: [Vec<f64>; 2],
    },
}

impl<'a> March<'a> {
    fn new(network: &'a Network, pace: Pace, top_frequency_hz: f64) -> Self {
        let (step_s, steps) = (pace.step_s, pace.marched());
        let source = &network.source;
        let low_v = source.low_v();
        let mut branches: Vec<Branch> = network.branches.clone();
        let mut lines = Vec::with_capacity(network.spans.len());
        let lowest_hz = (1.0 / network.period_s).max(LOWEST_LOSSY_HZ);
        for span in &network.spans {
            let (near, far) = (span.near, span.far);
            let model = Model::of(&span.line, lowest_hz, top_frequency_hz);
            lines.push(
                match TravellingLine::new([near, far], &model, step_s, steps, low_v) {
                    Some(line) => LineState::Waves(Box::new(line)),
                    None => {
                        let branch = branches.len();
                        branches.extend(pi_section(span, top_frequency_hz));
                        let impedance_ohm = span.line.impedance_ohm;
                        let record = [vec![0.0; steps], vec![0.0; steps]];
                        LineState::Lumped {
                            near,
                            far,
                            branch,
                            impedance_ohm,
                            record,
                        }
                    }
                },
            );
        }
        let branches: Vec<Companion> = branches
            .iter()
            .map(|branch| Companion::new(branch, step_s, low_v))
            .collect();
        let drive = (0..steps)
            .map(|step| {
                let high_share = source.high_share(pace.time_s(step));
                let conductance_s = source.conductance_s(high_share);
                (conductance_s, conductance_s * source.voltage_v(high_share))
            })
            .collect();
        let base_conductance_s = source.conductance_s(0.0);
        let clusters = clusters(network, &lines, &branches, base_conductance_s);
        Self {
            network,
            pace,
            drive,
            base_conductance_s,
            lines,
            branches,
            clusters,
            injected_a: vec![0.0; network.node_count],
            voltage_v: vec![low_v; network.node_count],
            waveform: SettledWaveform {
                pace,
                driver_v: vec![low_v; steps],
                driver_a: vec![0.0; steps],
                receivers_v: vec![vec![low_v; steps]; network.inputs.len()],
            },
        }
    }

    /// Marches until a period repeats.
    fn settle(&mut self) -> MarchReport {
        let swing_v = self.network.source.swing_v();
        let marched_steps = self.pace.marched();
        let most_periods = (MOST_STEPS / marched_steps).max(4);
        let mut report = MarchReport {
            steps_per_period: self.pace.total(),
            marched_steps,
            periods: 0,
            residual: f64::INFINITY,
            settled: false,
        };
        // What is on its way along a line was sent this many periods ago at most.
        let longest_s = self
            .network
            .spans
            .iter()
            .map(|span| span.line.delay_s)
            .fold(0.0, f64::max);
        let memory = (longest_s / self.network.period_s).ceil().max(1.0) as usize;
        // States a stride of changes apart. Slow relaxations show only over many periods, so that the stride
        // doubles where a few jumps did not settle the net.
        let mut states = vec![self.state()];
        let (mut jumps, mut since_state, mut since_jump) = (0, 0, 0);
        let mut last_change = None;
        while report.periods < most_periods && !report.settled {
            let change = (0..memory).fold(0.0, |most, _| self.one_period().max(most)) / swing_v;
            report.periods += memory;
            (since_state, since_jump) = (since_state + 1, since_jump + 1);
            // The first change after a jump is the jump itself.
            if since_jump > 1 {
                // Changes that shrink by a constant ratio leave this sum of all that are still to come.
                let ratio = last_change
                    .map_or(USUAL_RATIO, |last| change / last)
                    .min(1.0 - 1e-9);
                report.residual = change.max(change * ratio / (1.0 - ratio)).min(1.0);
                // A number that is none is not settled.
                report.settled = report.residual < SETTLED && self.is_sound();
                last_change = Some(change);
            }
            if since_state == 1 << (jumps / JUMPS_A_STRIDE) {
                since_state = 0;
                states.push(self.state());
            }
            if states.len() == STATES && !report.settled {
                if let Some(state) = extrapolated(&states) {
                    self.set_state(&state);
                    last_change = None;
                }
                (since_jump, jumps) = (0, jumps + 1);
                states = vec![self.state()];
            }
        }
        report
    }

    /// Every value that has a say in what is still to come.
    fn state(&mut self) -> Vec<f64> {
        let mut state = Vec::new();
        self.visit(&mut |value| state.push(*value));
        state
    }

    fn set_state(&mut self, state: &[f64]) {
        let mut values = state.iter();
        self.visit(&mut |value| *value = *values.next().expect("a state of the same march"));
    }

    fn visit(&mut self, visit: &mut impl FnMut(&mut f64)) {
        for line in &mut self.lines {
            if let LineState::Waves(line) = line {
                line.visit(visit);
            }
        }
        for branch in &mut self.branches {
            visit(&mut branch.current_a);
            visit(&mut branch.inductor_v);
            visit(&mut branch.capacitor_v);
        }
    }

    /// Whether the voltages are numbers still.
    fn is_sound(&self) -> bool {
        self.voltage_v.iter().all(|v| v.is_finite())
    }

    /// How much any voltage or wave still changes towards the ends of the two stretches.
    fn restlessness(&self) -> f64 {
        let (high, all) = (self.pace.high.marched, self.pace.marched());
        let change = |samples: &[f64]| {
            let late = |from: usize, to: usize| {
                (samples[to - 1] - samples[to - 1 - (to - from) / 8]).abs()
            };
            late(0, high).max(late(high, all))
        };
        let waves = self.lines.iter().flat_map(LineState::last_period);
        let waveform = &self.waveform;
        let voltages = waveform.receivers_v.iter().chain([&waveform.driver_v]);
        voltages
            .map(|v| change(v))
            .chain(waves.map(|w| change(&w)))
            .fold(0.0, f64::max)
    }

    /// Marches one period; returns the largest change of any wave or voltage since the last one.
    fn one_period(&mut self) -> f64 {
        (0..self.drive.len()).fold(0.0, |largest, step| self.one_step(step).max(largest))
    }

    fn one_step(&mut self, step: usize) -> f64 {
        self.injected_a.fill(0.0);
        for line in &mut self.lines {
            if let LineState::Waves(line) = line {
                line.arrive(&mut self.injected_a);
            }
        }
        for branch in &mut self.branches {
            branch.inject(&mut self.injected_a);
        }
        let (conductance_s, short_circuit_a) = self.drive[step];
        self.injected_a[DRIVER_NODE] += short_circuit_a;
        let driver_change_s = conductance_s - self.base_conductance_s;
        for cluster in &mut self.clusters {
            cluster.solve(&self.injected_a, driver_change_s, &mut self.voltage_v);
        }
        for branch in &mut self.branches {
            branch.advance(&self.voltage_v);
        }
        let mut largest: f64 = 0.0;
        for line in &mut self.lines {
            largest = largest.max(line.leave(step, &self.voltage_v, &self.branches));
        }
        let driver_v = self.voltage_v[DRIVER_NODE];
        largest = largest.max((driver_v - self.waveform.driver_v[step]).abs());
        self.waveform.driver_v[step] = driver_v;
        self.waveform.driver_a[step] = short_circuit_a - conductance_s * driver_v;
        for (record, input) in self
            .waveform
            .receivers_v
            .iter_mut()
            .zip(&self.network.inputs)
        {
            let voltage_v = self.voltage_v[input.node];
            largest = largest.max((voltage_v - record[step]).abs());
            record[step] = voltage_v;
        }
        largest
    }

    fn into_settled(self, report: MarchReport) -> Settled {
        let waves = self.lines.into_iter().map(LineState::into_record).collect();
        Settled {
            waveform: self.waveform,
            waves,
            report,
        }
    }
}

impl LineState {
    /// Sends the waves that leave now; returns the largest change since one period ago.
    fn leave(&mut self, step: usize, voltage_v: &[f64], branches: &[Companion]) -> f64 {
        match self {
            Self::Waves(line) => line.leave(voltage_v),
            Self::Lumped {
                near,
                far,
                branch,
                impedance_ohm,
                record,
            } => {
                let middle_v = (voltage_v[*near] + voltage_v[*far]) / 2.0;
                let across_v = *impedance_ohm * branches[*branch].current_a;
                let new = [(middle_v + across_v) / 2.0, (middle_v - across_v) / 2.0];
                let mut largest: f64 = 0.0;
                for (record, new) in record.iter_mut().zip(new) {
                    largest = largest.max((new - record[step]).abs());
                    record[step] = new;
                }
                largest
            }
        }
    }

    /// The outward and the inward wave of the last period.
    fn last_period(&self) -> [Vec<f64>; 2] {
        match self {
            Self::Waves(line) => line.last_period(),
            Self::Lumped { record, .. } => record.clone(),
        }
    }

    fn into_record(self) -> WaveRecord {
        let [outward_v, inward_v] = self.last_period();
        let taken = match self {
            Self::Waves(_) => Taken::AtStart,
            Self::Lumped { .. } => Taken::InMiddle,
        };
        WaveRecord {
            outward_v,
            inward_v,
            taken,
        }
    }
}

/// The clusters of nodes that lumped branches join, with everything that loads them.
fn clusters(
    network: &Network,
    lines: &[LineState],
    branches: &[Companion],
    driver_s: f64,
) -> Vec<Cluster> {
    let count = network.node_count;
    let mut conductance = Array2::<f64>::zeros((count, count));
    conductance[[DRIVER_NODE, DRIVER_NODE]] += driver_s;
    for line in lines {
        if let LineState::Waves(line) = line {
            for (node, conductance_s) in line.conductances_s() {
                conductance[[node, node]] += conductance_s;
            }
        }
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
                .map(|input| (input.node, Load::Clamps(input.clamps)))
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
