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
//! and `x` arrives at the other end, a flight time later, multiplied by P = e^{-propagation + j w delay}. The voltage at
//! the end is a + b, so that x is that voltage less what arrived. A lossless line has G = 0 and P = 1. To direct
//! current alone the resistance stands lumped, half at each end.

use super::delay::Delay;
use super::filter::{Filter, Pair, both, pair};
use super::model::Model;

/// A line between two nodes on the march; pairs hold what belongs to its near and to its far end.
pub(super) struct TravellingLine {
    nodes: [usize; 2],
    /// Seen from either node: a conductance ...
    conductance_s: Pair,
    /// ... with a current source.
    source_a: Pair,
    /// The wave that sets out from each end.
    waves: Delay,
    propagation: Filter,
    arrived_v: Pair,
    reflection: Filter,
    /// How much of a reflection's past is seen in the source.
    reflected_share: Pair,
    /// 1 / (1 + the reflection's direct part)
    difference_share: Pair,
    bypassed: Bypassed,
}

/// A resistance at each end that stands in the way of direct current only: a capacitance bypasses it.
struct Bypassed {
    /// Of both together, as a trapezoidal companion ...
    companion_ohm: Pair,
    capacitor_s: Pair,
    /// ... with the capacitance's past.
    past_a: Pair,
}

impl Bypassed {
    fn new(resistance_ohm: f64, corner_rad_per_s: f64, step_s: f64) -> Self {
        let per_ohm = 2.0 / (corner_rad_per_s * step_s);
        Self {
            companion_ohm: both(resistance_ohm / (1.0 + per_ohm)),
            capacitor_s: both(if resistance_ohm > 0.0 {
                per_ohm / resistance_ohm
            } else {
                0.0
            }),
            past_a: [0.0; 2],
        }
    }

    /// The drops of the present currents; goes on to the next step.
    fn take(&mut self, current_a: Pair) -> Pair {
        let drop_v = pair(|end| self.companion_ohm[end] * (current_a[end] + self.past_a[end]));
        self.past_a = pair(|end| 2.0 * self.capacitor_s[end] * drop_v[end] - self.past_a[end]);
        drop_v
    }
}

impl TravellingLine {
    /// A line at rest. `None` where its delay is too short for the step; `period` in steps.
    pub(super) fn new(
        nodes: [usize; 2],
        model: &Model,
        step_s: f64,
        period: usize,
    ) -> Option<Self> {
        let delay_steps = model.delay_s / step_s;
        if delay_steps < Delay::SHORTEST {
            return None;
        }
        let reflection = Filter::new(&model.reflection, step_s);
        let direct = reflection.direct()[0];
        let line_ohm = (1.0 + direct) / (1.0 - direct) * model.impedance_ohm;
        let bypassed = Bypassed::new(model.dc_ohm, model.corner_rad_per_s, step_s);
        Some(Self {
            nodes,
            conductance_s: both(1.0 / (line_ohm + bypassed.companion_ohm[0])),
            source_a: [0.0; 2],
            waves: Delay::new(delay_steps, period),
            propagation: Filter::new(&model.propagation, step_s),
            arrived_v: [0.0; 2],
            reflection,
            reflected_share: both(2.0 / (1.0 - direct)),
            difference_share: both(1.0 / (1.0 + direct)),
            bypassed,
        })
    }

    /// Its ends' nodes and the conductances they see.
    pub(super) fn conductances_s(&self) -> [(usize, f64); 2] {
        [0, 1].map(|end| (self.nodes[end], self.conductance_s[end]))
    }

    /// Lets the waves arrive that do so now, and injects their currents.
    pub(super) fn arrive(&mut self, injected_a: &mut [f64]) {
        let [outward_v, inward_v] = self.waves.arriving();
        // Each arrives at the other end.
        let delayed_v = [inward_v, outward_v];
        let (past_v, direct) = (self.propagation.past(), self.propagation.direct());
        let arrived_v = pair(|end| past_v[end] + direct[end] * delayed_v[end]);
        self.propagation.take(delayed_v);
        let (reflected_v, bypassed) = (self.reflection.past(), &self.bypassed);
        self.source_a = pair(|end| {
            let bypassed_v = bypassed.companion_ohm[end] * bypassed.past_a[end];
            let line_v = 2.0 * arrived_v[end] + self.reflected_share[end] * reflected_v[end];
            self.conductance_s[end] * (line_v + bypassed_v)
        });
        self.arrived_v = arrived_v;
        for (node, source_a) in self.nodes.into_iter().zip(self.source_a) {
            injected_a[node] += source_a;
        }
    }

    /// Sends off the waves that leave now.
    pub(super) fn leave(&mut self, voltage_v: &[f64]) {
        let node_v = self.nodes.map(|node| voltage_v[node]);
        let drop_v = self.bypassed.take(self.currents_a(node_v));
        let (arrived_v, reflected_v) = (self.arrived_v, self.reflection.past());
        let line_v = pair(|end| node_v[end] - drop_v[end]);
        self.reflection.take(pair(|end| {
            self.difference_share[end] * (line_v[end] - 2.0 * arrived_v[end] - reflected_v[end])
        }));
        self.waves.send(pair(|end| line_v[end] - arrived_v[end]));
    }

    /// The currents into both ends.
    fn currents_a(&self, node_v: Pair) -> Pair {
        pair(|end| self.conductance_s[end] * node_v[end] - self.source_a[end])
    }

    /// Shows every value that has a say in what is still to come.
    pub(super) fn visit(&mut self, visit: &mut impl FnMut(&mut f64)) {
        self.waves.visit(visit);
        self.propagation.visit(visit);
        self.reflection.visit(visit);
        self.bypassed.past_a.iter_mut().for_each(visit);
    }

    /// What both ends take from their nodes at this step.
    #[cfg(test)]
    pub(super) fn power_w(&self, voltage_v: &[f64]) -> f64 {
        let node_v = self.nodes.map(|node| voltage_v[node]);
        let current_a = self.currents_a(node_v);
        node_v[0] * current_a[0] + node_v[1] * current_a[1]
    }

    /// The waves that set out from both ends in the last period.
    pub(super) fn last_period(&self) -> [Vec<f64>; 2] {
        self.waves.last_period()
    }
}
