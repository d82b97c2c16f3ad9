//! The march: step by step until a whole period repeats.

use super::cluster::{Cluster, Load};
use super::companion::{Companion, pi_section};
use super::extrapolate::Extrapolation;
use super::model::{Model, line_models};
use super::network::{Branch, BranchEnd, DRIVER_NODE, Network};
use super::steps::Pace;
use super::travelling::TravellingLine;
use ndarray::Array2;

#[cfg(test)]
mod energy_tests;

/// Largest share of the swing by which the settled waveform may still be off.
const SETTLED: f64 = 1e-6;
/// How much farther off than estimated the waveform may be.
const SAFETY: f64 = 2.0;
/// Times an extrapolation may begin anew before the states are taken twice as far apart, and how often they are.
const RESTARTS_A_STRIDE: usize = 2;
const MOST_DOUBLINGS: usize = 16;
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
    /// Steps of them that were marched; the others are time at rest, or the mirror image of those marched.
    pub marched_steps: usize,
    /// Times these steps were marched until they repeated.
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
    settle_lines(
        network,
        &line_models(network, top_frequency_hz),
        top_frequency_hz,
    )
}

/// The same with lines whose models are known.
pub fn settle_lines(network: &Network, models: &[Model], top_frequency_hz: f64) -> Settled {
    let mut pace = Pace::first(network, top_frequency_hz);
    loop {
        let mut march = March::new(network, models, pace, top_frequency_hz);
        let report = march.settle();
        if pace.is_whole() || march.restlessness() < SETTLED * network.source.swing_v() {
            return march.into_settled(report);
        }
        pace = pace.longer();
    }
}

/// The state of a march. Its voltages are counted from the middle of the driver's levels, so that a net that behaves
/// alike up and down has half a period that is the other with all signs turned.
struct March<'a> {
    network: &'a Network,
    pace: Pace,
    middle_v: f64,
    /// Whether one half of the period mirrors the other, which is then not marched.
    mirrored: bool,
    /// The driver's state at each step of a round: conductance and short-circuit current.
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
    fn new(network: &'a Network, models: &[Model], pace: Pace, top_frequency_hz: f64) -> Self {
        let source = &network.source;
        let middle_v = source.low_v() + 0.5 * source.swing_v();
        let mirrored = is_mirrored(network, &pace, middle_v);
        let step_s = pace.step_s;
        let steps = pace.marched() / if mirrored { 2 } else { 1 };
        let mut branches: Vec<Branch> = network.branches.clone();
        let mut lines = Vec::with_capacity(network.spans.len());
        for (span, model) in network.spans.iter().zip(models) {
            let (near, far) = (span.near, span.far);
            lines.push(
                match TravellingLine::new([near, far], model, step_s, steps) {
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
            .map(|branch| Companion::new(branch, step_s, middle_v))
            .collect();
        let drive = (0..steps)
            .map(|step| {
                let high_share = source.high_share(pace.time_s(step));
                let conductance_s = source.conductance_s(high_share);
                (
                    conductance_s,
                    conductance_s * (source.voltage_v(high_share) - middle_v),
                )
            })
            .collect();
        let base_conductance_s = source.conductance_s(0.0);
        let clusters = clusters(network, &lines, &branches, base_conductance_s, middle_v);
        Self {
            network,
            pace,
            middle_v,
            mirrored,
            drive,
            base_conductance_s,
            lines,
            branches,
            clusters,
            injected_a: vec![0.0; network.node_count],
            voltage_v: vec![0.0; network.node_count],
            waveform: SettledWaveform {
                pace,
                driver_v: vec![0.0; steps],
                driver_a: vec![0.0; steps],
                receivers_v: vec![vec![0.0; steps]; network.inputs.len()],
            },
        }
    }

    /// Marches until a round repeats.
    fn settle(&mut self) -> MarchReport {
        let swing_v = self.network.source.swing_v();
        let marched_steps = self.drive.len();
        let most_periods = (MOST_STEPS / marched_steps).max(4);
        let mut report = MarchReport {
            steps_per_period: self.pace.total(),
            marched_steps,
            periods: 0,
            residual: f64::INFINITY,
            settled: false,
        };
        // What is on its way along a line was sent this many rounds ago at most.
        let longest_s = self
            .network
            .spans
            .iter()
            .map(|span| span.line.delay_s)
            .fold(0.0, f64::max);
        let round_s = if self.mirrored {
            self.network.period_s / 2.0
        } else {
            self.network.period_s
        };
        let memory = (longest_s / round_s).ceil().max(1.0) as usize;
        let mut extrapolation = Extrapolation::default();
        let mut start = self.state();
        while report.periods < most_periods {
            // Slow relaxations show only over many rounds.
            let stride = memory << (extrapolation.restarts / RESTARTS_A_STRIDE).min(MOST_DOUBLINGS);
            for _ in 0..stride {
                self.one_round();
            }
            report.periods += stride;
            let (next, farthest_v) = extrapolation.next(&start, self.state());
            report.residual = (SAFETY * farthest_v / swing_v).min(1.0);
            // A number that is none is not settled.
            report.settled = report.residual < SETTLED && self.is_sound();
            if report.settled {
                break;
            }
            if next.iter().all(|value| value.is_finite()) {
                self.set_state(&next);
            }
            start = self.state();
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
            branch.visit(visit);
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
        let waves = self.lines.iter().flat_map(LineState::last_round);
        let waveform = &self.waveform;
        let voltages = waveform.receivers_v.iter().chain([&waveform.driver_v]);
        voltages
            .map(|v| change(v))
            .chain(waves.map(|w| change(&w)))
            .fold(0.0, f64::max)
    }

    /// Marches one round.
    fn one_round(&mut self) {
        if self.mirrored {
            self.negate();
        }
        for step in 0..self.drive.len() {
            self.one_step(step);
        }
    }

    /// Turns the signs of all that has a say in what is still to come.
    fn negate(&mut self) {
        self.visit(&mut |value| *value = -*value);
    }

    fn one_step(&mut self, step: usize) {
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
        for line in &mut self.lines {
            line.leave(step, &self.voltage_v, &self.branches);
        }
        let driver_v = self.voltage_v[DRIVER_NODE];
        self.waveform.driver_v[step] = driver_v;
        self.waveform.driver_a[step] = short_circuit_a - conductance_s * driver_v;
        for (record, input) in self
            .waveform
            .receivers_v
            .iter_mut()
            .zip(&self.network.inputs)
        {
            record[step] = self.voltage_v[input.node];
        }
    }

    fn into_settled(self, report: MarchReport) -> Settled {
        let (mirrored, middle_v) = (self.mirrored, self.middle_v);
        let whole = |round: Vec<f64>, offset: f64| whole_period(round, mirrored, offset);
        let waveform = self.waveform;
        let waves = self.lines.into_iter().map(|line| {
            let [outward_v, inward_v] = line.last_round();
            WaveRecord {
                outward_v: whole(outward_v, middle_v / 2.0),
                inward_v: whole(inward_v, middle_v / 2.0),
                taken: line.taken(),
            }
        });
        Settled {
            waves: waves.collect(),
            waveform: SettledWaveform {
                pace: waveform.pace,
                driver_v: whole(waveform.driver_v, middle_v),
                driver_a: whole(waveform.driver_a, 0.0),
                receivers_v: waveform
                    .receivers_v
                    .into_iter()
                    .map(|record| whole(record, middle_v))
                    .collect(),
            },
            report,
        }
    }
}

/// Whether a net that is marched step by step behaves alike up and down, seen from the middle of the driver's levels.
fn is_mirrored(network: &Network, pace: &Pace, middle_v: f64) -> bool {
    let clamps = network.inputs.iter().map(|input| input.clamps);
    let rails = network
        .branches
        .iter()
        .filter_map(|branch| match branch.to {
            // Direct current does not pass a capacitance.
            BranchEnd::RailV(rail_v) if branch.capacitance_f.is_none() => Some(rail_v),
            _ => None,
        });
    pace.is_whole()
        && network.source.is_mirrored(network.period_s)
        && clamps
            .into_iter()
            .all(|clamps| clamps.with_middle(middle_v).is_odd())
        && rails.into_iter().all(|rail_v| rail_v == middle_v)
}

/// A whole period from what was marched of it, with an offset.
fn whole_period(mut round: Vec<f64>, mirrored: bool, offset: f64) -> Vec<f64> {
    if mirrored {
        round.extend_from_within(..);
        let half = round.len() / 2;
        for value in &mut round[half..] {
            *value = -*value;
        }
    }
    for value in &mut round {
        *value += offset;
    }
    round
}

impl LineState {
    /// Sends the waves that leave now.
    fn leave(&mut self, step: usize, voltage_v: &[f64], branches: &[Companion]) {
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
                record[0][step] = (middle_v + across_v) / 2.0;
                record[1][step] = (middle_v - across_v) / 2.0;
            }
        }
    }

    /// The outward and the inward wave of the last round.
    fn last_round(&self) -> [Vec<f64>; 2] {
        match self {
            Self::Waves(line) => line.last_round(),
            Self::Lumped { record, .. } => record.clone(),
        }
    }

    fn taken(&self) -> Taken {
        match self {
            Self::Waves(_) => Taken::AtStart,
            Self::Lumped { .. } => Taken::InMiddle,
        }
    }
}

/// The clusters of nodes that lumped branches join, with everything that loads them.
fn clusters(
    network: &Network,
    lines: &[LineState],
    branches: &[Companion],
    driver_s: f64,
    middle_v: f64,
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
                .map(|input| {
                    let clamps = input.clamps.with_middle(middle_v);
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
