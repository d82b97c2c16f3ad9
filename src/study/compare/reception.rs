//! What a receiver makes of the wave: when it switches, on which wave, and how clean the edge is.

use super::incidence::{FirstWave, first_waves};
use crate::board::{Net, PathItem, Receiver};
use crate::ringing::{Network, Pace};
use crate::study::{NetResult, ReceiverSignal};

/// Where the file gives no thresholds, those of a CMOS input: 30 % and 70 % of the swing (common practice, no source).
pub const USUAL_THRESHOLDS: [f64; 2] = [0.3, 0.7];

/// What comes back within so many edges of the driver melts into the edge; later, it makes a step (a judgement).
const STEPLESS: f64 = 1.5;

/// How one receiver is served.
#[derive(Debug, Clone, PartialEq)]
pub struct Reception {
    /// The receiver's name.
    pub name: String,
    /// Highest level that counts as low.
    pub low_threshold_v: f64,
    /// Lowest level that counts as high.
    pub high_threshold_v: f64,
    /// Whether the file gives these thresholds; else they are 30 % and 70 % of the driver's swing.
    pub thresholds_given: bool,
    /// The first wave, before anything comes back.
    pub first: FirstWave,
    /// From the middle of the driver's edge until the wave stays beyond its threshold, the later of both edges; `None`
    /// where it does not before the next edge.
    pub delay_s: Option<f64>,
    /// From 10 % to 90 % of its levels at rest, the slower of both edges; `None` where it does not get there.
    pub edge_s: Option<f64>,
    /// Slowest edge it takes, where the file says.
    pub max_edge_s: Option<f64>,
    /// Whether it switches on the first wave: one that must wait for a reflection sees a step in its threshold region.
    pub on_first_wave: bool,
    /// Whether its levels at rest lie beyond its thresholds.
    pub rests_beyond: bool,
    /// Rms distance from its levels at rest, once the edge has arrived: what is left of ringing, and of slowness.
    pub ripple_v: f64,
}

/// How every receiver of a net is served, in the order of the path.
pub(super) fn receptions(net: &Net, result: &NetResult) -> Vec<Reception> {
    let network = Network::of(net);
    let waves = first_waves(&network, &net.driver);
    let mut receivers = Vec::new();
    collect(&net.path, &mut receivers);
    let samples = result
        .signal
        .receivers
        .iter()
        .zip(&result.waveform.receivers_v);
    let pace = &result.waveform.pace;
    receivers
        .into_iter()
        .zip(waves)
        .zip(samples)
        .map(|((receiver, first), (signal, voltage_v))| {
            reception(net, &network, receiver, first, signal, pace, voltage_v)
        })
        .collect()
}

fn collect<'n>(path: &'n [PathItem], receivers: &mut Vec<&'n Receiver>) {
    for item in path {
        match item {
            PathItem::Receiver(receiver) => receivers.push(receiver),
            PathItem::Branch(items) => collect(items, receivers),
            _ => {}
        }
    }
}

fn reception(
    net: &Net,
    network: &Network,
    receiver: &Receiver,
    first: FirstWave,
    signal: &ReceiverSignal,
    pace: &Pace,
    voltage_v: &[f64],
) -> Reception {
    let source = &network.source;
    let part = &receiver.part;
    let usual_v = USUAL_THRESHOLDS.map(|share| source.low_v() + share * source.swing_v());
    let low_threshold_v = part.low_threshold_v.unwrap_or(usual_v[0]);
    let high_threshold_v = part.high_threshold_v.unwrap_or(usual_v[1]);

    let (rise, fall) = voltage_v.split_at(pace.high.marched.min(voltage_v.len()));
    let edges_s = source.edges_s();
    let up = Edge::new(pace, 0, rise.to_vec(), edges_s[0], first.arrival_s, 0.0);
    let fallen: Vec<f64> = fall.iter().map(|v| -v).collect();
    let fall_start_s = source.fall_start_s();
    let down = Edge::new(
        pace,
        rise.len(),
        fallen,
        edges_s[1],
        first.arrival_s,
        fall_start_s,
    );

    let (low_v, high_v) = (signal.rest_low_v, signal.rest_high_v);
    let delay_s = later(
        up.stays_beyond_s(high_threshold_v),
        down.stays_beyond_s(-low_threshold_v),
    );
    let edge_s = later(up.edge_s(low_v, high_v), down.edge_s(-high_v, -low_v));
    let on_first_wave = up.on_first_wave(first.risen_v, high_threshold_v)
        && down.on_first_wave(-first.fallen_v, -low_threshold_v);
    let squares = up.squares(high_v) + down.squares(-low_v);
    Reception {
        name: receiver.name.clone(),
        low_threshold_v,
        high_threshold_v,
        thresholds_given: part.low_threshold_v.is_some() && part.high_threshold_v.is_some(),
        first,
        delay_s,
        edge_s,
        max_edge_s: part.max_rise_s,
        on_first_wave,
        rests_beyond: high_v >= high_threshold_v && low_v <= low_threshold_v,
        ripple_v: (squares * pace.step_s / net.clock_hz.recip()).sqrt(),
    }
}

fn later(a: Option<f64>, b: Option<f64>) -> Option<f64> {
    Some(a?.max(b?))
}

/// The wave at a receiver from the start of one of the driver's edges to that of the next, seen as a rise.
struct Edge {
    risen_v: Vec<f64>,
    step_s: f64,
    /// When the first sample was taken, from the start of the edge.
    start_s: f64,
    /// Duration of the whole edge at the driver.
    edge_s: f64,
    arrival_s: f64,
}

impl Edge {
    fn new(
        pace: &Pace,
        first: usize,
        risen_v: Vec<f64>,
        edge_s: f64,
        arrival_s: f64,
        edge_start_s: f64,
    ) -> Self {
        Self {
            risen_v,
            step_s: pace.step_s,
            start_s: pace.time_s(first) - edge_start_s,
            edge_s,
            arrival_s,
        }
    }

    /// When the wave crosses a level upwards between a sample and the one before it.
    fn crossing_s(&self, sample: usize, level_v: f64) -> f64 {
        let into = |before: f64, now: f64| (level_v - before) / (now - before);
        let share = match sample.checked_sub(1).map(|before| self.risen_v[before]) {
            Some(before) if self.risen_v[sample] > before => into(before, self.risen_v[sample]),
            _ => 1.0,
        };
        self.start_s + (sample as f64 - 1.0 + share) * self.step_s
    }

    /// From the middle of the driver's edge until the wave stays beyond a level.
    fn stays_beyond_s(&self, level_v: f64) -> Option<f64> {
        let after = self
            .risen_v
            .iter()
            .rposition(|&v| v < level_v)
            .map_or(0, |last| last + 1);
        (after < self.risen_v.len()).then(|| self.crossing_s(after, level_v) - self.edge_s / 2.0)
    }

    /// From a tenth to nine tenths of the way between two levels.
    fn edge_s(&self, from_v: f64, to_v: f64) -> Option<f64> {
        let level_v = |share: f64| from_v + share * (to_v - from_v);
        let crossed = |level_v: f64, from: usize| {
            let past = self.risen_v[from..].iter().position(|&v| v >= level_v)?;
            Some(from + past)
        };
        // What is left of the edge before may still swing over a tenth: begin where it is last below.
        let high = crossed(level_v(0.9), self.sample_at(self.arrival_s))?;
        let below = self.risen_v[..high].iter().rposition(|&v| v < level_v(0.1));
        let low = below.map_or(0, |below| below + 1);
        Some(self.crossing_s(high, level_v(0.9)) - self.crossing_s(low, level_v(0.1)))
    }

    /// Whether a level is crossed by the time the driver's edge has arrived, or the first wave at least reaches it:
    /// a capacitance may hold that up.
    fn on_first_wave(&self, first_v: f64, level_v: f64) -> bool {
        if first_v >= level_v {
            return true;
        }
        let whole = self.sample_at(self.arrival_s + STEPLESS * self.edge_s);
        let reached = self.risen_v.get(whole).or(self.risen_v.last());
        reached.is_some_and(|&v| v >= level_v)
    }

    /// The sum of the squares of the distance from a level, once the whole edge has arrived.
    fn squares(&self, level_v: f64) -> f64 {
        let from = self.sample_at(self.arrival_s + self.edge_s);
        self.risen_v[from..]
            .iter()
            .map(|v| (v - level_v).powi(2))
            .sum()
    }

    fn sample_at(&self, time_s: f64) -> usize {
        let sample = ((time_s - self.start_s) / self.step_s).ceil().max(0.0) as usize;
        sample.min(self.risen_v.len())
    }
}
