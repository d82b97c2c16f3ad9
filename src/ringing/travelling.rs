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
//! G and P are fitted by causal relaxations from the lowest frequency that matters; a lossless line has G = 0 and
//! P = 1. To direct current alone the resistance stands lumped, half at each end.

use super::delay::Delay;
use super::filter::{Filter, Relaxations, Sample};
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
    line_s: f64,
    impedance_ohm: f64,
    bypassed: Bypassed,
    propagation: Filter,
    reflection: Filter,
    arrived_v: f64,
}

/// A resistance that stands in the way of direct current only: a capacitance bypasses it.
struct Bypassed {
    /// Of both together, as a trapezoidal companion ...
    companion_ohm: f64,
    capacitor_s: f64,
    /// ... with the capacitance's past.
    past_a: f64,
}

impl Bypassed {
    fn new(resistance_ohm: f64, corner_rad_per_s: f64, step_s: f64) -> Self {
        let per_ohm = 2.0 / (corner_rad_per_s * step_s);
        Self {
            companion_ohm: resistance_ohm / (1.0 + per_ohm),
            capacitor_s: if resistance_ohm > 0.0 {
                per_ohm / resistance_ohm
            } else {
                0.0
            },
            past_a: 0.0,
        }
    }

    /// The drop of the present current; goes on to the next step.
    fn take(&mut self, current_a: f64) -> f64 {
        let drop_v = self.companion_ohm * (current_a + self.past_a);
        self.past_a = 2.0 * self.capacitor_s * drop_v - self.past_a;
        drop_v
    }
}

/// How a line is marched: its reference impedance, its pure delay, and what its loss does.
pub(super) struct Model {
    impedance_ohm: f64,
    pub(super) delay_s: f64,
    propagation: Relaxations,
    reflection: Relaxations,
    /// To direct current, at each end.
    dc_ohm: f64,
    /// Above this the relaxations hold that resistance too.
    corner_rad_per_s: f64,
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

    /// Shows every value that has a say in what is still to come.
    pub(super) fn visit(&mut self, visit: &mut impl FnMut(&mut f64)) {
        self.waves.iter_mut().for_each(|wave| wave.visit(visit));
        for end in &mut self.ends {
            end.propagation.visit(visit);
            end.reflection.visit(visit);
            visit(&mut end.bypassed.past_a);
        }
    }

    /// What both ends take from their nodes at this step.
    #[cfg(test)]
    pub(super) fn power_w(&self, voltage_v: &[f64]) -> f64 {
        self.ends
            .iter()
            .map(|end| {
                let node_v = voltage_v[end.node];
                node_v * (end.conductance_s * node_v - end.source_a)
            })
            .sum()
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
        let bypassed = Bypassed::new(model.dc_ohm, model.corner_rad_per_s, step_s);
        Self {
            node,
            conductance_s: line_s / (1.0 + line_s * bypassed.companion_ohm),
            source_a: 0.0,
            line_s,
            impedance_ohm: model.impedance_ohm,
            bypassed,
            propagation: Filter::new(&model.propagation, step_s, start_v / 2.0),
            reflection,
            arrived_v: 0.0,
        }
    }

    fn arrive(&mut self, delayed_v: f64, injected_a: &mut [f64]) {
        self.arrived_v = self.propagation.past() + self.propagation.direct() * delayed_v;
        self.propagation.take(delayed_v);
        let reflected_v = self.reflection.past();
        let line_a =
            self.line_s * (2.0 * self.arrived_v + reflected_v) + reflected_v / self.impedance_ohm;
        let bypassed_v = self.bypassed.companion_ohm * self.bypassed.past_a;
        self.source_a = (line_a / self.line_s + bypassed_v) * self.conductance_s;
        injected_a[self.node] += self.source_a;
    }

    /// The wave that sets out into the line.
    fn leave(&mut self, voltage_v: &[f64]) -> f64 {
        let node_v = voltage_v[self.node];
        let current_a = self.conductance_s * node_v - self.source_a;
        let line_v = node_v - self.bypassed.take(current_a);
        let (direct, reflected_v) = (self.reflection.direct(), self.reflection.past());
        let difference_v = (line_v - 2.0 * self.arrived_v - reflected_v) / (1.0 + direct);
        self.reflection.take(difference_v);
        difference_v + self.arrived_v + direct * difference_v + reflected_v
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
                corner_rad_per_s: TAU * lowest_hz,
            },
        }
    }

    fn of_lossy(line: &Line, loss: &Loss, lowest_hz: f64, top_hz: f64) -> Self {
        // Found by trial: with these the fits stay within a few parts in ten thousand.
        const BELOW: f64 = 5.0;
        const POLES_PER_DECADE: f64 = 3.0;
        const SAMPLES_PER_DECADE: f64 = 20.0;
        const DELAYS: usize = 13;
        const FAR_ABOVE_RAD_PER_S: f64 = 1e18;
        const WEIGHT_ABOVE: f64 = 0.01;
        let poles = spread(lowest_hz / BELOW, 10.0 * top_hz, POLES_PER_DECADE);
        // Above the band the fit need not be close, but must not amplify.
        let samples: Vec<Sample> = spread(0.7 * lowest_hz, 1.5 * top_hz, SAMPLES_PER_DECADE)
            .into_iter()
            .map(|omega| Sample { omega, weight: 1.0 })
            .chain(
                spread(2.0 * top_hz, 50.0 * top_hz, SAMPLES_PER_DECADE)
                    .into_iter()
                    .map(|omega| Sample {
                        omega,
                        weight: WEIGHT_ABOVE,
                    }),
            )
            .collect();
        let waves: Vec<WaveOnLine> = samples
            .iter()
            .map(|sample| line.wave_at(sample.omega))
            .collect();

        // The reference impedance leaves nothing to reflect at the top.
        let top_omega = TAU * top_hz;
        let impedance_ohm = line.wave_at(top_omega).impedance_ohm.re;
        let values = waves
            .iter()
            .map(|wave| (wave.impedance_ohm - impedance_ohm) / (wave.impedance_ohm + impedance_ohm))
            .collect();
        let (reflection, _) = Relaxations::fit(&poles, &samples, &[values], None).remove(0);

        // How much of the phase is pure delay lies between what holds far above the band and what holds
        // at its top; the rest is left to the relaxations. The best split is the one they fit best.
        let delay_s = |omega: f64| {
            line.length_m * loss.effective_permittivity(omega).re.sqrt() / LIGHT_SPEED_M_PER_S
        };
        let (shortest_s, longest_s) = (delay_s(FAR_ABOVE_RAD_PER_S), delay_s(top_omega));
        let delays_s: Vec<f64> = (0..DELAYS)
            .map(|i| shortest_s + i as f64 / (DELAYS - 1) as f64 * (longest_s - shortest_s))
            .collect();
        let filtered: Vec<Vec<Complex64>> = delays_s
            .iter()
            .map(|delay_s| {
                let value = |(sample, wave): (&Sample, &WaveOnLine)| {
                    (Complex64::new(0.0, sample.omega * delay_s) - wave.propagation).exp()
                };
                samples.iter().zip(&waves).map(value).collect()
            })
            .collect();
        let fits = Relaxations::fit(&poles, &samples, &filtered, Some(1.0));
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
            corner_rad_per_s: TAU * lowest_hz / BELOW,
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

#[cfg(test)]
mod tests {
    use super::*;
    use crate::board::{Layer, Structure, Trace};
    use crate::line::line_of_trace;
    use std::sync::Arc;

    fn line(structure: Structure, width_m: f64, length_m: f64) -> Line {
        let layer = Layer {
            name: "layer".into(),
            structure,
            permittivity: 4.3,
            loss_tangent: 0.02,
            copper_m: 35e-6,
            roughness_m: 0.0,
        };
        let points_m = Vec::new();
        line_of_trace(&Trace {
            layer: Arc::new(layer),
            width_m,
            length_m,
            points_m,
        })
        .0
    }

    /// In the band the fits are good to one part in a thousand, and nowhere do they give more than they take.
    #[test]
    fn loss_is_fitted_closely_and_never_amplifies() {
        let microstrip = (Structure::Microstrip { height_m: 101.6e-6 }, 101.6e-6);
        let stripline = (
            Structure::Stripline {
                below_m: 127e-6,
                above_m: 200e-6,
            },
            127e-6,
        );
        for (lowest_hz, top_hz) in [(20e6, 1e9), (48e6, 1e9), (156e6, 6e9), (500e6, 2e9)] {
            for (structure, width_m) in [microstrip, stripline] {
                for length_m in [0.01, 0.1, 0.25, 0.6] {
                    let line = line(structure, width_m, length_m);
                    let model = Model::of(&line, lowest_hz, top_hz);
                    let what =
                        format!("{structure:?}, {length_m} m, {lowest_hz:e} to {top_hz:e} Hz");
                    for omega in spread(lowest_hz, top_hz, 50.0) {
                        let wave = line.wave_at(omega);
                        let delay = Complex64::new(0.0, omega * model.delay_s);
                        let reflection = (wave.impedance_ohm - model.impedance_ohm)
                            / (wave.impedance_ohm + model.impedance_ohm);
                        let off =
                            (model.propagation.at(omega) - (delay - wave.propagation).exp()).norm();
                        assert!(
                            off < 1e-3,
                            "{what}: propagation off by {off:.1e} at {omega:e}"
                        );
                        let off = (model.reflection.at(omega) - reflection).norm();
                        assert!(
                            off < 1e-3,
                            "{what}: reflection off by {off:.1e} at {omega:e}"
                        );
                    }
                    for omega in spread(lowest_hz / 1e3, top_hz * 1e4, 20.0) {
                        let gain = model.propagation.at(omega).norm();
                        assert!(gain < 1.0 + 1e-4, "{what}: gain of {gain} at {omega:e}");
                    }
                }
            }
        }
    }
}
