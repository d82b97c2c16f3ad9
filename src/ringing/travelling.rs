//! A line on the march: two delayed waves, filtered by its loss.
//!
//! With a lossy line's own impedance Zc(f) and a real reference impedance Z, a wave `a` that comes to an end
//! from outside and a wave `y` that arrives there from inside leave as
//!
//! ```text
//! inwards   x = a + G (a - y)      G = (Zc - Z) / (Zc + Z)
//! outwards  b = y + G (a - y)
//! ```
//!
//! and `x` arrives at the other end, a flight time later, multiplied by P = e^{-propagation + j w delay}. Both
//! G and P are fitted by causal relaxations; a lossless line has G = 0 and P = 1. The resistance to direct
//! current stands lumped, half at each end.

use super::delay::Delay;
use super::filter::{Filter, Relaxations, Wanted};
use crate::LIGHT_SPEED_M_PER_S;
use crate::line::{Line, Loss, WaveOnLine};
use num_complex::Complex64;
use std::f64::consts::TAU;

/// A line between two nodes on the march.
pub(super) struct TravellingLine {
    ends: [End; 2],
    /// The wave that sets out from each end.
    waves: [Delay; 2],
}

/// One end of a line.
struct End {
    node: usize,
    /// Seen from the node: a conductance ...
    conductance_s: f64,
    /// ... with a current source.
    source_a: f64,
    dc_ohm: f64,
    impedance_ohm: f64,
    propagation: Filter,
    reflection: Filter,
    reflection_past_v: f64,
    arrived_v: f64,
}

/// How a line is marched: its reference impedance, its pure delay, and what its loss does.
pub(super) struct Model {
    impedance_ohm: f64,
    pub(super) delay_s: f64,
    propagation: Relaxations,
    reflection: Relaxations,
    /// At each end.
    dc_ohm: f64,
}

impl TravellingLine {
    /// A line at rest at `start_v`. `None` where its delay is too short for the step.
    pub(super) fn new(
        nodes: [usize; 2],
        model: &Model,
        step_s: f64,
        steps: usize,
        start_v: f64,
    ) -> Option<Self> {
        let delay_steps = model.delay_s / step_s;
        if delay_steps < Delay::SHORTEST {
            return None;
        }
        let wave = Delay::new(delay_steps, steps, start_v / 2.0);
        let ends = nodes.map(|node| End::new(node, model, step_s, start_v));
        Some(Self {
            ends,
            waves: [wave.clone(), wave],
        })
    }

    /// Its ends' nodes and the conductances they see.
    pub(super) fn conductances_s(&self) -> [(usize, f64); 2] {
        [0, 1].map(|end| (self.ends[end].node, self.ends[end].conductance_s))
    }

    /// Lets the waves arrive that do so now, and injects their currents.
    pub(super) fn arrive(&mut self, injected_a: &mut [f64]) {
        let [near, far] = &mut self.ends;
        near.arrive(self.waves[1].arriving(), injected_a);
        far.arrive(self.waves[0].arriving(), injected_a);
    }

    /// Sends off the waves that leave now; returns their largest change since one period ago.
    pub(super) fn leave(&mut self, voltage_v: &[f64]) -> f64 {
        let changes = [0, 1].map(|end| self.waves[end].send(self.ends[end].leave(voltage_v)));
        changes[0].abs().max(changes[1].abs())
    }

    /// The waves that set out from both ends in the last period.
    pub(super) fn last_period(&self) -> [Vec<f64>; 2] {
        [0, 1].map(|end| self.waves[end].last_period())
    }
}

impl End {
    fn new(node: usize, model: &Model, step_s: f64, start_v: f64) -> Self {
        let reflection = Filter::new(&model.reflection, step_s, 0.0);
        let direct = reflection.direct();
        let line_s = (1.0 - direct) / ((1.0 + direct) * model.impedance_ohm);
        Self {
            node,
            conductance_s: line_s / (1.0 + line_s * model.dc_ohm),
            source_a: 0.0,
            dc_ohm: model.dc_ohm,
            impedance_ohm: model.impedance_ohm,
            propagation: Filter::new(&model.propagation, step_s, start_v / 2.0),
            reflection,
            reflection_past_v: 0.0,
            arrived_v: 0.0,
        }
    }

    fn arrive(&mut self, delayed_v: f64, injected_a: &mut [f64]) {
        self.arrived_v = self.propagation.past() + self.propagation.direct() * delayed_v;
        self.propagation.take(delayed_v);
        let past_v = self.reflection.past();
        self.reflection_past_v = past_v;
        // Before the lumped resistance the source has 1 / (1 - G r) more to give.
        let direct = self.reflection.direct();
        let line_s = (1.0 - direct) / ((1.0 + direct) * self.impedance_ohm);
        let line_a = line_s * (2.0 * self.arrived_v + past_v) + past_v / self.impedance_ohm;
        self.source_a = line_a * self.conductance_s / line_s;
        injected_a[self.node] += self.source_a;
    }

    /// The wave that sets out into the line.
    fn leave(&mut self, voltage_v: &[f64]) -> f64 {
        let node_v = voltage_v[self.node];
        let current_a = self.conductance_s * node_v - self.source_a;
        let line_v = node_v - self.dc_ohm * current_a;
        let direct = self.reflection.direct();
        let difference_v =
            (line_v - 2.0 * self.arrived_v - self.reflection_past_v) / (1.0 + direct);
        self.reflection.take(difference_v);
        let outside_v = difference_v + self.arrived_v;
        outside_v + direct * difference_v + self.reflection_past_v
    }
}

impl Model {
    /// How to march a line whose waves matter from `lowest_hz` to `top_hz`.
    pub(super) fn of(line: &Line, lowest_hz: f64, top_hz: f64) -> Self {
        match &line.loss {
            Some(loss) => Self::of_lossy(line, loss, lowest_hz, top_hz),
            None => Self {
                impedance_ohm: line.impedance_ohm,
                delay_s: line.delay_s,
                propagation: Relaxations {
                    direct: 1.0,
                    terms: Vec::new(),
                },
                reflection: Relaxations {
                    direct: 0.0,
                    terms: Vec::new(),
                },
                dc_ohm: 0.0,
            },
        }
    }

    fn of_lossy(line: &Line, loss: &Loss, lowest_hz: f64, top_hz: f64) -> Self {
        const POLES_PER_DECADE: f64 = 2.5;
        const SAMPLES_PER_DECADE: f64 = 10.0;
        /// The relaxations reach this far over the top frequency, the samples half as far.
        const REACH: f64 = 8.0;
        const DELAYS: usize = 11;
        let poles = spread(lowest_hz, REACH * top_hz, POLES_PER_DECADE);
        let omegas = spread(lowest_hz / 2.0, REACH / 2.0 * top_hz, SAMPLES_PER_DECADE);
        let waves: Vec<WaveOnLine> = omegas.iter().map(|&omega| line.wave_at(omega)).collect();

        // The reference impedance leaves nothing to reflect at the top.
        let top_omega = TAU * top_hz;
        let impedance_ohm = line.wave_at(top_omega).impedance_ohm.re;
        let values: Vec<Complex64> = waves
            .iter()
            .map(|wave| (wave.impedance_ohm - impedance_ohm) / (wave.impedance_ohm + impedance_ohm))
            .collect();
        let above = values.last().map_or(0.0, |value| value.re);
        let (reflection, _) = Relaxations::fit(
            &poles,
            &omegas,
            &[Wanted {
                values,
                at_zero: None,
                above,
            }],
        )
        .remove(0);

        // How much of the phase is pure delay lies between what holds far above the band and what holds
        // at its top; the rest is left to the relaxations. The best split is the one they fit best.
        let delay_s = |omega: f64| {
            line.length_m * loss.effective_permittivity(omega).re.sqrt() / LIGHT_SPEED_M_PER_S
        };
        let (shortest_s, longest_s) = (delay_s(f64::MAX.sqrt()), delay_s(top_omega));
        let delays_s: Vec<f64> = (0..DELAYS)
            .map(|i| shortest_s + i as f64 / (DELAYS - 1) as f64 * (longest_s - shortest_s))
            .collect();
        let wanted: Vec<Wanted> = delays_s
            .iter()
            .map(|delay_s| {
                let filtered = |(omega, wave): (&f64, &WaveOnLine)| {
                    (Complex64::new(0.0, omega * delay_s) - wave.propagation).exp()
                };
                let values: Vec<Complex64> = omegas.iter().zip(&waves).map(filtered).collect();
                let above = values.last().map_or(1.0, |value| 0.5 * value.norm());
                Wanted {
                    values,
                    at_zero: Some(1.0),
                    above,
                }
            })
            .collect();
        let fits = Relaxations::fit(&poles, &omegas, &wanted);
        let ((propagation, _), delay_s) = fits
            .into_iter()
            .zip(delays_s)
            .min_by(|a, b| a.0.1.total_cmp(&b.0.1))
            .expect("there is more than one delay to try");
        Self {
            impedance_ohm,
            delay_s,
            propagation,
            reflection,
            dc_ohm: loss.dc_ohm_per_m * line.length_m / 2.0,
        }
    }
}

/// Angular frequencies from one frequency to another, so many to the decade.
fn spread(from_hz: f64, to_hz: f64, per_decade: f64) -> Vec<f64> {
    let decades = (to_hz / from_hz).log10();
    let steps = (decades * per_decade).ceil().max(1.0);
    (0..=steps as usize)
        .map(|i| TAU * from_hz * 10f64.powf(i as f64 / steps * decades))
        .collect()
}
