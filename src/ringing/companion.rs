//! Lumped parts on the march.

use super::network::{Branch, BranchEnd, Span};

/// A line too short for its waves to be told apart: its inductance, with the resistance of the middle of the
/// band, between halves of its capacitance.
pub(super) fn pi_section(span: &Span, top_frequency_hz: f64) -> [Branch; 3] {
    /// The middle of a band that starts at 30 MHz.
    const OF_TOP: f64 = 0.2;
    let line = &span.line;
    let resistance_ohm = line.loss.as_ref().map_or(0.0, |loss| {
        let omega = std::f64::consts::TAU * OF_TOP * top_frequency_hz;
        loss.series_ohm_per_m(omega).re * line.length_m
    });
    let half = |from| Branch {
        from,
        to: BranchEnd::RailV(0.0),
        resistance_ohm: 0.0,
        inductance_h: 0.0,
        capacitance_f: Some(line.delay_s / line.impedance_ohm / 2.0),
    };
    let inductance = Branch {
        from: span.near,
        to: BranchEnd::Node(span.far),
        resistance_ohm,
        inductance_h: line.impedance_ohm * line.delay_s,
        capacitance_f: None,
    };
    [inductance, half(span.near), half(span.far)]
}

/// The trapezoidal companion of a branch: a conductance with a voltage source that carries its past.
pub(super) struct Companion {
    pub(super) from: usize,
    pub(super) to: BranchEnd,
    pub(super) conductance_s: f64,
    /// 2 L / h
    pub(super) inductor_ohm: f64,
    /// h / 2 C
    pub(super) capacitor_ohm: f64,
    pub(super) current_a: f64,
    pub(super) inductor_v: f64,
    pub(super) capacitor_v: f64,
    /// The source for this step.
    past_v: f64,
}

impl Companion {
    /// Least resistance of a branch: a dead short to a rail has to have some.
    const LEAST_OHM: f64 = 1e-6;

    /// A companion at rest, voltages counted from `middle_v`.
    pub(super) fn new(branch: &Branch, step_s: f64, middle_v: f64) -> Self {
        let inductor_ohm = 2.0 * branch.inductance_h / step_s;
        let capacitor_ohm = branch.capacitance_f.map_or(0.0, |c| step_s / (2.0 * c));
        let total_ohm = branch.resistance_ohm + inductor_ohm + capacitor_ohm;
        let to = match (branch.capacitance_f, branch.to) {
            (_, BranchEnd::Node(node)) => BranchEnd::Node(node),
            (None, BranchEnd::RailV(rail_v)) => BranchEnd::RailV(rail_v - middle_v),
            // A capacitance is charged to whatever lies between its rail and the middle.
            (Some(_), BranchEnd::RailV(_)) => BranchEnd::RailV(0.0),
        };
        Self {
            from: branch.from,
            to,
            conductance_s: 1.0 / total_ohm.max(Self::LEAST_OHM),
            inductor_ohm,
            capacitor_ohm,
            current_a: 0.0,
            inductor_v: 0.0,
            capacitor_v: 0.0,
            past_v: 0.0,
        }
    }

    /// Shows every value that has a say in what is still to come.
    pub(super) fn visit(&mut self, visit: &mut impl FnMut(&mut f64)) {
        visit(&mut self.current_a);
        visit(&mut self.inductor_v);
        visit(&mut self.capacitor_v);
    }

    /// Injects the current of its past.
    pub(super) fn inject(&mut self, injected_a: &mut [f64]) {
        self.past_v = self.capacitor_v + (self.capacitor_ohm - self.inductor_ohm) * self.current_a
            - self.inductor_v;
        let current_a = self.conductance_s * self.past_v;
        injected_a[self.from] += current_a;
        match self.to {
            BranchEnd::Node(to) => injected_a[to] -= current_a,
            BranchEnd::RailV(rail_v) => injected_a[self.from] += self.conductance_s * rail_v,
        }
    }

    /// Takes the nodes' voltages and goes on to the next step.
    pub(super) fn advance(&mut self, voltage_v: &[f64]) {
        let to_v = match self.to {
            BranchEnd::Node(to) => voltage_v[to],
            BranchEnd::RailV(rail_v) => rail_v,
        };
        let current_a = self.conductance_s * (voltage_v[self.from] - to_v - self.past_v);
        self.inductor_v = self.inductor_ohm * (current_a - self.current_a) - self.inductor_v;
        self.capacitor_v += self.capacitor_ohm * (current_a + self.current_a);
        self.current_a = current_a;
    }
}
