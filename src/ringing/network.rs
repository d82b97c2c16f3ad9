//! A net as a circuit: nodes, lumped branches and lines.

use super::clamp::Clamps;
use super::source::Source;
use crate::board::{Net, PathItem, ReceiverPart};
use crate::line::{Line, LineWarning, line_of_direct, line_of_trace};

/// The driver's node.
pub const DRIVER_NODE: usize = 0;

/// A net as a circuit: a tree of nodes joined by lumped branches and lines, driven at node zero.
#[derive(Debug, Clone)]
pub struct Network {
    /// The driver.
    pub source: Source,
    /// Period of the clock.
    pub period_s: f64,
    /// Number of nodes.
    pub node_count: usize,
    /// The lumped parts.
    pub branches: Vec<Branch>,
    /// The lines, each after the one it continues.
    pub spans: Vec<Span>,
    /// The receivers' inputs, in the order of the path.
    pub inputs: Vec<Input>,
    /// What is doubtful about the lines, each said once.
    pub warnings: Vec<LineWarning>,
}

/// A resistance, an inductance and a capacitance in series.
#[derive(Debug, Clone, Copy)]
pub struct Branch {
    /// The node it leaves.
    pub from: usize,
    /// Where it goes.
    pub to: BranchEnd,
    /// Resistance.
    pub resistance_ohm: f64,
    /// Inductance.
    pub inductance_h: f64,
    /// Capacitance; `None` is no capacitor.
    pub capacitance_f: Option<f64>,
}

/// Where a branch goes.
#[derive(Debug, Clone, Copy)]
pub enum BranchEnd {
    /// To another node.
    Node(usize),
    /// To a rail of this voltage.
    RailV(f64),
}

/// A line between two nodes.
#[derive(Debug, Clone)]
pub struct Span {
    /// The node nearer to the driver.
    pub near: usize,
    /// The other one.
    pub far: usize,
    /// The span it continues; `None` at the driver.
    pub after: Option<usize>,
    /// The line.
    pub line: Line,
}

/// A receiver's input.
#[derive(Debug, Clone)]
pub struct Input {
    /// The receiver's name.
    pub name: String,
    /// Its node.
    pub node: usize,
    /// Its clamps.
    pub clamps: Clamps,
    /// Largest current they are rated for, where the file says.
    pub clamp_rating_a: Option<f64>,
    /// Highest level that is surely read as low, where the file says.
    pub low_threshold_v: Option<f64>,
    /// Lowest level that is surely read as high, where the file says.
    pub high_threshold_v: Option<f64>,
}

impl Network {
    /// The circuit of a net.
    pub fn of(net: &Net) -> Self {
        let mut network = Self {
            source: Source::new(&net.driver, net.clock_hz, net.duty),
            period_s: 1.0 / net.clock_hz,
            node_count: 1,
            branches: Vec::new(),
            spans: Vec::new(),
            inputs: Vec::new(),
            warnings: Vec::new(),
        };
        network.add_path(&net.path, DRIVER_NODE, None);
        network
    }

    fn add_path(&mut self, path: &[PathItem], mut node: usize, mut after: Option<usize>) {
        for item in path {
            match item {
                PathItem::Series(part) => {
                    node = self.add_series(node, part.resistance_ohm, part.inductance_h);
                }
                PathItem::Trace(trace) => {
                    let (line, warnings) = line_of_trace(trace);
                    for warning in warnings {
                        if !self.warnings.contains(&warning) {
                            self.warnings.push(warning);
                        }
                    }
                    (node, after) = self.add_line(node, after, line);
                }
                PathItem::Line(direct) => {
                    (node, after) = self.add_line(node, after, line_of_direct(direct));
                }
                PathItem::Via(via) => {
                    self.add_capacitor(node, via.capacitance_f / 2.0);
                    node = self.add_series(node, 0.0, via.inductance_h);
                    self.add_capacitor(node, via.capacitance_f / 2.0);
                }
                PathItem::Shunt(shunt) => self.branches.push(Branch {
                    from: node,
                    to: BranchEnd::RailV(shunt.to_v),
                    resistance_ohm: shunt.resistance_ohm,
                    inductance_h: shunt.inductance_h,
                    capacitance_f: shunt.capacitance_f,
                }),
                PathItem::Receiver(receiver) => {
                    self.add_receiver(node, &receiver.name, &receiver.part);
                }
                PathItem::Branch(items) => self.add_path(items, node, after),
            }
        }
    }

    /// A part in series; no part adds no node.
    fn add_series(&mut self, node: usize, resistance_ohm: f64, inductance_h: f64) -> usize {
        if resistance_ohm == 0.0 && inductance_h == 0.0 {
            return node;
        }
        let next = self.add_node();
        self.branches.push(Branch {
            from: node,
            to: BranchEnd::Node(next),
            resistance_ohm,
            inductance_h,
            capacitance_f: None,
        });
        next
    }

    fn add_line(
        &mut self,
        near: usize,
        after: Option<usize>,
        line: Line,
    ) -> (usize, Option<usize>) {
        let far = self.add_node();
        self.spans.push(Span {
            near,
            far,
            after,
            line,
        });
        (far, Some(self.spans.len() - 1))
    }

    fn add_capacitor(&mut self, node: usize, capacitance_f: f64) {
        if capacitance_f > 0.0 {
            self.branches.push(Branch {
                from: node,
                to: BranchEnd::RailV(0.0),
                resistance_ohm: 0.0,
                inductance_h: 0.0,
                capacitance_f: Some(capacitance_f),
            });
        }
    }

    fn add_receiver(&mut self, pin: usize, name: &str, part: &ReceiverPart) {
        self.add_capacitor(pin, part.package_capacitance_f);
        let node = self.add_series(pin, 0.0, part.package_inductance_h);
        self.add_capacitor(node, part.capacitance_f);
        if let Some(resistance_ohm) = part.resistance_ohm {
            self.branches.push(Branch {
                from: node,
                to: BranchEnd::RailV(0.0),
                resistance_ohm,
                inductance_h: 0.0,
                capacitance_f: None,
            });
        }
        self.inputs.push(Input {
            name: name.to_owned(),
            node,
            clamps: Clamps::of(part),
            clamp_rating_a: part.clamp_rating_a,
            low_threshold_v: part.low_threshold_v,
            high_threshold_v: part.high_threshold_v,
        });
    }

    fn add_node(&mut self) -> usize {
        self.node_count += 1;
        self.node_count - 1
    }
}
