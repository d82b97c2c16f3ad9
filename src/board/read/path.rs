//! The path of a net, item by item.

use std::cell::RefCell;
use std::collections::HashSet;

use super::super::{DirectLine, PathItem, Plane, Receiver, Series, Shunt, Trace, Via};
use super::antenna::in_mm;
use super::net::NetReader;
use crate::text::{Dimension, Fields, Node, Range, Report, Value};

const DEFAULT_PERMITTIVITY: f64 = 4.3;
/// Share by which a length may differ from that of the points beside it.
const LENGTH_AGREEMENT: f64 = 0.01;
/// How far a point may lie outside of the plane by rounding.
const ROUNDING_M: f64 = 1e-9;

const ITEMS: [&str; 7] = [
    "series", "trace", "line", "via", "shunt", "receiver", "branch",
];

/// Reads the path of one net.
pub(super) struct PathReader<'r> {
    reader: &'r NetReader<'r>,
    report: &'r Report<'r>,
    /// Where a part that cannot be read is kept in mind.
    unreadable: &'r RefCell<Option<String>>,
    /// The names given to receivers, in the order of the path.
    given_names: RefCell<Vec<Option<String>>>,
}

impl<'r> PathReader<'r> {
    pub(super) fn new(reader: &'r NetReader<'r>, unreadable: &'r RefCell<Option<String>>) -> Self {
        Self {
            reader,
            report: reader.report,
            unreadable,
            given_names: RefCell::default(),
        }
    }

    /// Reads the whole path of the net called `owner`.
    pub(super) fn path(self, node: &Node, owner: &str) -> Option<Vec<PathItem>> {
        let mut path = self.items(node, &format!("path of {owner}"))?;
        let mut receivers = Vec::new();
        receivers_of(&mut path, &mut receivers);
        if receivers.is_empty() {
            self.report
                .warning(node, format!("the path of {owner} has no receiver"));
        }
        name_receivers(receivers, &self.given_names.take());
        Some(path)
    }

    fn items(&self, node: &Node, name: &str) -> Option<Vec<PathItem>> {
        let expected = "a list of items such as `- receiver: cmos-input`";
        let nodes = self.report.list(node, name, expected)?;
        if nodes.is_empty() {
            self.report
                .error(node, format!("{name} is empty"), |d| d.expected(expected));
            return None;
        }
        // All are read before one that failed counts, so that all mistakes are found.
        let items: Vec<Option<PathItem>> = nodes.iter().map(|node| self.item(node)).collect();
        items.into_iter().collect()
    }

    fn item(&self, node: &Node) -> Option<PathItem> {
        let expected = "one item with its fields indented below it or in braces, such as `trace: {layer: outer, width: 4 mil, length: 6 in}`";
        let entries = self.report.map(node, "an item of the path", expected)?;
        let [(key, node)] = entries else {
            let keys: Vec<&str> = entries.iter().map(|(key, _)| key.text.as_str()).collect();
            let message = format!("an item of the path has several keys: {}", keys.join(", "));
            self.report
                .error(node, message, |diagnostic| diagnostic.expected(expected));
            return None;
        };
        match key.text.as_str() {
            "series" => self.series(node).map(PathItem::Series),
            "trace" => self.trace(node).map(PathItem::Trace),
            "line" => self.line(node).map(PathItem::Line),
            "via" => self.via(node).map(PathItem::Via),
            "shunt" => self.shunt(node).map(PathItem::Shunt),
            "receiver" => self.receiver(node).map(PathItem::Receiver),
            "branch" => self.items(node, "the branch").map(PathItem::Branch),
            word => {
                let message = format!("a path has no item `{word}`");
                self.report.unknown_word(key, word, message, &ITEMS);
                None
            }
        }
    }

    fn series(&self, node: &Node) -> Option<Series> {
        use Dimension::{Inductance, Resistance};
        if !matches!(node.value, Value::Map(_)) {
            let resistance_ohm = self.report.quantity(
                node,
                "the series resistance",
                Resistance,
                Range::NotNegative,
            )?;
            return Some(Series {
                resistance_ohm,
                inductance_h: 0.0,
            });
        }
        let known = ["resistance", "inductance"];
        let fields = self.report.fields(node, "the series part", &known)?;
        require_any(&fields, &known);
        let value = |field, dimension| fields.quantity(field, dimension, Range::NotNegative);
        Some(Series {
            resistance_ohm: value("resistance", Resistance).unwrap_or(0.0),
            inductance_h: value("inductance", Inductance).unwrap_or(0.0),
        })
    }

    fn trace(&self, node: &Node) -> Option<Trace> {
        let fields =
            self.report
                .fields(node, "the trace", &["layer", "width", "length", "points"])?;
        let layer = fields.require_name("layer").and_then(|name| {
            let node = fields.get("layer")?;
            self.reader
                .find(self.reader.layers, node, &name, self.unreadable)
        });
        let width_m = fields.require_quantity("width", Dimension::Length, Range::Positive);
        let (length_m, points_m) = run(&fields, self.reader.plane);
        if fields.lacks(&["length", "points"]) {
            fields.error(
                "the trace has no `length`",
                "a length such as `6 in`, or `points`",
            );
        }
        Some(Trace {
            layer: layer?,
            width_m: width_m?,
            length_m: length_m?,
            points_m,
        })
    }

    fn line(&self, node: &Node) -> Option<DirectLine> {
        use Dimension::{Length, Number, Resistance, Time};
        const FIELDS: [&str; 6] = [
            "impedance",
            "delay",
            "length",
            "height",
            "permittivity",
            "points",
        ];
        let fields = self.report.fields(node, "the line", &FIELDS)?;
        let impedance_ohm = fields.require_quantity("impedance", Resistance, Range::Positive);
        let delay_s = fields.require_quantity("delay", Time, Range::Positive);
        let height_m = fields.quantity("height", Length, Range::Positive);
        let permittivity = fields.quantity("permittivity", Number, Range::AtLeastOne);
        let (length_m, points_m) = run(&fields, self.reader.plane);
        Some(DirectLine {
            impedance_ohm: impedance_ohm?,
            delay_s: delay_s?,
            length_m: length_m.unwrap_or(0.0),
            height_m: height_m.unwrap_or(0.0),
            permittivity: permittivity.unwrap_or(DEFAULT_PERMITTIVITY),
            points_m,
        })
    }

    fn via(&self, node: &Node) -> Option<Via> {
        use Dimension::{Capacitance, Inductance};
        let fields = self
            .report
            .fields(node, "the via", &["inductance", "capacitance"])?;
        let value = |field, dimension| fields.quantity(field, dimension, Range::NotNegative);
        Some(Via {
            inductance_h: value("inductance", Inductance).unwrap_or(0.0),
            capacitance_f: value("capacitance", Capacitance).unwrap_or(0.0),
        })
    }

    fn shunt(&self, node: &Node) -> Option<Shunt> {
        use Dimension::{Capacitance, Inductance, Resistance, Voltage};
        let known = ["resistance", "capacitance", "inductance", "to"];
        let fields = self.report.fields(node, "the shunt", &known)?;
        require_any(&fields, &known[..3]);
        let resistance_ohm = fields.quantity("resistance", Resistance, Range::NotNegative);
        let capacitance_f = fields.quantity("capacitance", Capacitance, Range::Positive);
        let inductance_h = fields.quantity("inductance", Inductance, Range::NotNegative);
        let to_v = fields.quantity("to", Voltage, Range::Any).unwrap_or(0.0);
        let is_short = resistance_ohm.or(inductance_h).is_some()
            && resistance_ohm.unwrap_or(0.0) + inductance_h.unwrap_or(0.0) == 0.0;
        if is_short && fields.lacks(&["capacitance"]) {
            fields.error(
                "the shunt shorts the net to its rail",
                "a resistance above zero",
            );
        }
        Some(Shunt {
            resistance_ohm: resistance_ohm.unwrap_or(0.0),
            capacitance_f,
            inductance_h: inductance_h.unwrap_or(0.0),
            to_v,
        })
    }

    fn receiver(&self, node: &Node) -> Option<Receiver> {
        let (part_node, part, name) = if let Value::Map(_) = node.value {
            let fields = self
                .report
                .fields(node, "the receiver", &["part", "name"])?;
            let part = fields.require_name("part");
            let name = fields.name("name");
            (fields.get("part")?, part?, fields.get("name").zip(name))
        } else {
            (node, self.report.name(node, "the receiver")?, None)
        };
        if let Some((node, name)) = &name
            && self
                .given_names
                .borrow()
                .iter()
                .flatten()
                .any(|other| other == name)
        {
            let message = format!("more than one receiver of the net is called `{name}`");
            self.report
                .error(*node, message, |d| d.expected("a name of its own for each"));
        }
        let part = self
            .reader
            .find(self.reader.receivers, part_node, &part, self.unreadable)?;
        self.given_names
            .borrow_mut()
            .push(name.map(|(_, name)| name));
        Some(Receiver {
            name: String::new(),
            part,
        })
    }
}

/// Reports that none of `fields` is there.
fn require_any(fields: &Fields, any_of: &[&str]) {
    if fields.lacks(any_of) {
        let expected = format!("at least one of {}", any_of.join(", "));
        fields.error(format!("{} has no value", fields.owner), &expected);
    }
}

/// The length and the points of a trace or line; points rule the length.
fn run(fields: &Fields, plane: Option<Plane>) -> (Option<f64>, Vec<[f64; 2]>) {
    let length_m = fields.quantity("length", Dimension::Length, Range::Positive);
    let Some(points_m) = points(fields, plane) else {
        return (length_m, Vec::new());
    };
    let along_points_m = points_m
        .windows(2)
        .map(|pair| (pair[1][0] - pair[0][0]).hypot(pair[1][1] - pair[0][1]));
    let along_points_m: f64 = along_points_m.sum();
    if let Some(length_m) = length_m
        && (length_m / along_points_m - 1.0).abs() > LENGTH_AGREEMENT
    {
        let message = format!("length of {} is not that of its points", fields.owner);
        let expected = format!("{}, or no `length`", in_mm(along_points_m));
        fields.error(message, &expected);
    }
    (Some(along_points_m), points_m)
}

/// The points of a trace or line, if it has any that can be read.
fn points(fields: &Fields, plane: Option<Plane>) -> Option<Vec<[f64; 2]>> {
    const EXPECTED: &str = "two or more points such as `[[10 mm, 50 mm], [60 mm, 50 mm]]`";
    let report = fields.report;
    let node = fields.get("points")?;
    let called = fields.called("points");
    let nodes = report.list(node, &called, EXPECTED)?;
    if nodes.len() < 2 {
        report.error(node, format!("{called} are too few"), |d| {
            d.expected(EXPECTED)
        });
        return None;
    }
    let points: Vec<Option<[f64; 2]>> = nodes.iter().map(|node| point(report, node)).collect();
    let points: Vec<[f64; 2]> = points.into_iter().collect::<Option<_>>()?;
    for ([before, point], node) in points.windows(2).map(|w| [w[0], w[1]]).zip(&nodes[1..]) {
        if before == point {
            report.error(node, "a point repeats the one before it", |d| {
                d.expected(EXPECTED)
            });
            return None;
        }
    }
    if let Some(plane) = plane {
        for ([x_m, y_m], node) in points.iter().zip(nodes) {
            let is_on =
                |at_m: f64, extent_m: f64| at_m >= -ROUNDING_M && at_m <= extent_m + ROUNDING_M;
            if !is_on(*x_m, plane.length_m) || !is_on(*y_m, plane.width_m) {
                let (length, width) = (in_mm(plane.length_m), in_mm(plane.width_m));
                report.error(node, "a point lies outside of the plane", |diagnostic| {
                    diagnostic.expected(format!("x from 0 mm to {length}, y from 0 mm to {width}"))
                });
            }
        }
    }
    Some(points)
}

fn point(report: &Report, node: &Node) -> Option<[f64; 2]> {
    let expected = "a pair of lengths such as `[10 mm, 50 mm]`";
    let [x, y] = report.list(node, "a point", expected)? else {
        report.error(node, "a point is not a pair", |d| d.expected(expected));
        return None;
    };
    let coordinate = |node, name| report.quantity(node, name, Dimension::Length, Range::Any);
    let x_m = coordinate(x, "x of a point");
    let y_m = coordinate(y, "y of a point");
    Some([x_m?, y_m?])
}

/// Collects the receivers of a path, branches included, in the order of the file.
fn receivers_of<'p>(path: &'p mut [PathItem], found: &mut Vec<&'p mut Receiver>) {
    for item in path {
        match item {
            PathItem::Receiver(receiver) => found.push(receiver),
            PathItem::Branch(items) => receivers_of(items, found),
            _ => {}
        }
    }
}

/// Names receivers as given, or after their part: `cmos-input`, or `cmos-input-1` and so on where that is not unique.
fn name_receivers(receivers: Vec<&mut Receiver>, given: &[Option<String>]) {
    let mut taken: HashSet<String> = given.iter().flatten().cloned().collect();
    let bare_parts: Vec<String> = receivers
        .iter()
        .zip(given)
        .filter(|(_, name)| name.is_none())
        .map(|(receiver, _)| receiver.part.name.clone())
        .collect();
    for (receiver, given) in receivers.into_iter().zip(given) {
        let part = &receiver.part.name;
        let of_part = bare_parts.iter().filter(|bare| *bare == part).count();
        receiver.name = match given {
            Some(name) => name.clone(),
            None if of_part == 1 && !taken.contains(part) => part.clone(),
            None => (1..)
                .map(|number| format!("{part}-{number}"))
                .find(|name| !taken.contains(name))
                .unwrap_or_default(),
        };
        taken.insert(receiver.name.clone());
    }
}
