//! The march: step by step until a whole period repeats.

use super::cluster::{Cluster, clusters};
use super::companion::{Companion, pi_section};
use super::extrapolate::Extrapolation;
use super::model::{Model, line_models};
use super::network::{Branch, BranchEnd, DRIVER_NODE, Network};
use super::settled::{MarchReport, Settled, SettledWaveform, Taken, WaveRecord};
use super::steps::Pace;
use super::travelling::TravellingLine;
use std::ops::Range;

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
    /// Whether one half of the period mirrors the other: a round is then the first half, with all signs turned between.
    mirrored: bool,
    /// The driver's state at each step: conductance and short-circuit current.
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
        let steps = pace.marched();
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
        let line_ends = lines.iter().flat_map(|line| match line {
            LineState::Waves(line) => line.conductances_s().to_vec(),
            LineState::Lumped { .. } => Vec::new(),
        });
        let clusters = clusters(network, line_ends, &branches, base_conductance_s, middle_v);
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
        let marched_steps = self.round().len();
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
        if self.mirrored {
            // What is handed on has been marched, not inferred.
            for step in self.round().end..self.drive.len() {
                self.one_step(step);
            }
            report.periods += 1;
        }
        report
    }

    /// The steps that are marched until they repeat.
    fn round(&self) -> Range<usize> {
        0..self.drive.len() / if self.mirrored { 2 } else { 1 }
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
        let waves = self.lines.iter().flat_map(LineState::last_period);
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
        for step in self.round() {
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
        // From voltages counted from the middle to voltages.
        let raised = |mut samples: Vec<f64>, by_v: f64| {
            samples.iter_mut().for_each(|sample| *sample += by_v);
            samples
        };
        let middle_v = self.middle_v;
        let waves = self.lines.into_iter().map(|line| {
            let [outward_v, inward_v] = line.last_period();
            WaveRecord {
                outward_v: raised(outward_v, middle_v / 2.0),
                inward_v: raised(inward_v, middle_v / 2.0),
                taken: line.taken(),
            }
        });
        let receivers_v = self.waveform.receivers_v.into_iter();
        Settled {
            waves: waves.collect(),
            waveform: SettledWaveform {
                driver_v: raised(self.waveform.driver_v, middle_v),
                receivers_v: receivers_v.map(|v| raised(v, middle_v)).collect(),
                ..self.waveform
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
            .all(|clamps| clamps.counted_from(middle_v).is_odd())
        && rails.into_iter().all(|rail_v| rail_v == middle_v)
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

    /// The outward and the inward wave of the last period.
    fn last_period(&self) -> [Vec<f64>; 2] {
        match self {
            Self::Waves(line) => line.last_period(),
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
