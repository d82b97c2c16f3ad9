//! Board files.

mod antenna;
mod corners;
mod definitions;
mod net;
mod parts;
mod path;
mod varied;

use std::collections::{BTreeMap, HashMap, HashSet};

use super::Board;
use crate::text::{Diagnostic, Fields, Key, Node, Noted, Report, Value, alternatives, parse_yaml};
use definitions::Definitions;

pub use varied::{NamedTolerance, VariedNet, VariedNets};

/// Why plane and cables have no tolerances.
const ONE_ANTENNA: &str =
    "plane and cables are the antenna, which is worked out once for all draws";

/// What a board file holds.
#[derive(Debug, Clone, PartialEq)]
pub struct Reading {
    /// The board with its usable nets; `None` where there is none, or what all nets share is wrong.
    pub board: Option<Board>,
    /// Everything that is wrong or doubtful, in the order of reading.
    pub diagnostics: Vec<Diagnostic>,
    /// The nets that are left out.
    pub unusable: Vec<UnusableNet>,
    /// The usable nets that have tolerances; `None` where there are none.
    pub varied: Option<VariedNets>,
}

/// A net that is left out.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct UnusableNet {
    /// Its name, or `net 3` (counted from 1) where it has none.
    pub name: String,
    /// Why, in a few words.
    pub reason: String,
}

/// Reads a board file. Never fails as a whole: what cannot be used is left out and said.
///
/// A mistake within a net costs that net; one within a driver, layer or receiver costs the nets that use it; any other
/// costs the board.
pub fn read_board(text: &str, file_name: &str) -> Reading {
    let document = match parse_yaml(text, file_name) {
        Ok(document) => document,
        Err(error) => {
            return Reading {
                board: None,
                diagnostics: vec![*error],
                unusable: Vec::new(),
                varied: None,
            };
        }
    };
    let report = Report::new(&document);
    let mut unusable = Vec::new();
    let (board, varied) = board(&report, &document.root, file_name, &mut unusable).unzip();
    Reading {
        board,
        diagnostics: report.into_diagnostics(),
        unusable,
        varied: varied.filter(|varied: &VariedNets| !varied.is_empty()),
    }
}

fn board(
    report: &Report,
    root: &Node,
    file_name: &str,
    unusable: &mut Vec<UnusableNet>,
) -> Option<(Board, VariedNets)> {
    const FIELDS: [&str; 7] = [
        "title",
        "stackup",
        "plane",
        "drivers",
        "receivers",
        "cables",
        "nets",
    ];
    if root.has_key("bands") {
        let message = "this is a limit file, not a board file";
        report.error(root, message, |d| d.expected(alternatives(&FIELDS, "and")));
        return None;
    }
    let fields = report.fields(root, "the board", &FIELDS)?;
    let title = fields.name("title").unwrap_or_else(|| file_name.to_owned());
    let (plane, cables) = report.refusing_tolerances(ONE_ANTENNA, || {
        let plane = antenna::plane(&fields);
        (plane, antenna::cables(&fields, plane))
    });
    let stackup = entries(&fields, "stackup");
    let drivers = entries(&fields, "drivers");
    let receivers = entries(&fields, "receivers");
    let net_nodes = net_nodes(&fields);
    let is_sound = !report.has_errors();

    let mut varied = VariedNets {
        plane,
        layers: Definitions::read(report, stackup),
        drivers: Definitions::read(report, drivers),
        receivers: Definitions::read(report, receivers),
        by_name: BTreeMap::new(),
    };
    let reader = net::NetReader {
        report,
        plane,
        layers: &varied.layers,
        drivers: &varied.drivers,
        receivers: &varied.receivers,
    };
    let read = nets(&reader, net_nodes?, unusable);
    for net in &read {
        if !net.tolerances.is_empty() {
            varied.add(&net.net.name, net.node, net.tolerances.clone());
        }
    }
    let nets: Vec<_> = read.into_iter().map(|read| read.net).collect();
    (is_sound && !nets.is_empty()).then_some((
        Board {
            title,
            plane,
            cables,
            nets,
        },
        varied,
    ))
}

/// The entries of a map of definitions, none where the file leaves it out or empty; `None` where it cannot be read.
fn entries<'r>(fields: &Fields<'r>, field: &str) -> Option<&'r [(Key, Node)]> {
    if fields.lacks(&[field]) {
        return Some(&[]);
    }
    let node = fields.get(field)?;
    if node.value == Value::Null {
        return Some(&[]);
    }
    let expected = "a map from names to what they stand for";
    fields.report.map(node, &fields.called(field), expected)
}

fn net_nodes<'r>(fields: &Fields<'r>) -> Option<&'r [Node]> {
    const EXPECTED: &str = "a list of nets, each with `name`, `driver`, `clock` and `path`";
    let node = fields.require("nets", EXPECTED)?;
    if node.has_key("table") {
        let message = "nets from a table are not supported yet";
        fields
            .report
            .error(node, message, |diagnostic| diagnostic.expected(EXPECTED));
        return None;
    }
    let nodes = fields.report.list(node, "the list of nets", EXPECTED)?;
    if nodes.is_empty() {
        fields
            .report
            .error(node, "the board has no nets", |d| d.expected(EXPECTED));
    }
    Some(nodes)
}

/// A net as it was read.
struct ReadNet<'r> {
    net: super::Net,
    node: &'r Node,
    /// The tolerances in it and in what it uses.
    tolerances: Vec<Noted>,
}

fn nets<'r>(
    reader: &net::NetReader,
    nodes: &'r [Node],
    unusable: &mut Vec<UnusableNet>,
) -> Vec<ReadNet<'r>> {
    let mut times_used: HashMap<String, usize> = HashMap::new();
    for name in nodes.iter().filter_map(name_written) {
        *times_used.entry(name).or_default() += 1;
    }
    let mut nets = Vec::new();
    let mut seen = HashSet::new();
    for (index, node) in nodes.iter().enumerate() {
        let written = name_written(node);
        let (mut net, tolerances) = reader.report.with_noted(|| {
            let read = || reader.net(node);
            reader.report.allowing_tolerances(read)
        });
        if let Some(name) = written.as_ref().filter(|name| times_used[*name] > 1) {
            let reason = format!("more than one net is called `{name}`");
            if !seen.insert(name.clone()) {
                reader.report.error(node, &reason, |d| {
                    d.expected("a name of its own for each net")
                });
            }
            net = Err(reason);
        }
        match net {
            Ok(net) => nets.push(ReadNet {
                net,
                node,
                tolerances,
            }),
            Err(reason) => {
                let name = written.unwrap_or_else(|| format!("net {}", index + 1));
                unusable.push(UnusableNet { name, reason });
            }
        }
    }
    nets
}

/// The name of a net, as far as one is written at all.
fn name_written(node: &Node) -> Option<String> {
    let Value::Map(entries) = &node.value else {
        return None;
    };
    entries
        .iter()
        .find(|(key, _)| key.text == "name")
        .and_then(|(_, name)| name.scalar())
}

#[cfg(test)]
mod tests;
