//! Board files.

mod antenna;
mod net;
mod parts;
mod path;

use std::collections::{BTreeMap, HashMap, HashSet};
use std::sync::Arc;

use super::Board;
use crate::text::{
    Diagnostic, Fields, Key, Node, Report, Value, alternatives, near_miss, parse_yaml,
};

/// What a board file holds.
#[derive(Debug, Clone, PartialEq)]
pub struct Reading {
    /// The board with its usable nets; `None` where there is none, or what all nets share is wrong.
    pub board: Option<Board>,
    /// Everything that is wrong or doubtful, in the order of reading.
    pub diagnostics: Vec<Diagnostic>,
    /// The nets that are left out.
    pub unusable: Vec<UnusableNet>,
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
            };
        }
    };
    let report = Report::new(&document);
    let mut unusable = Vec::new();
    let board = board(&report, &document.root, file_name, &mut unusable);
    Reading {
        board,
        diagnostics: report.into_diagnostics(),
        unusable,
    }
}

fn board(
    report: &Report,
    root: &Node,
    file_name: &str,
    unusable: &mut Vec<UnusableNet>,
) -> Option<Board> {
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
    let plane = antenna::plane(&fields);
    let cables = antenna::cables(&fields, plane);
    let stackup = entries(&fields, "stackup");
    let drivers = entries(&fields, "drivers");
    let receivers = entries(&fields, "receivers");
    let net_nodes = net_nodes(&fields);
    let is_sound = !report.has_errors();

    let reader = net::NetReader {
        report,
        plane,
        layers: Definitions::read(report, "layer", stackup, parts::layer),
        drivers: Definitions::read(report, "driver", drivers, parts::driver),
        receivers: Definitions::read(report, "receiver", receivers, parts::receiver),
    };
    let nets = nets(&reader, net_nodes?, unusable);
    (is_sound && !nets.is_empty()).then_some(Board {
        title,
        plane,
        cables,
        nets,
    })
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

fn nets(
    reader: &net::NetReader,
    nodes: &[Node],
    unusable: &mut Vec<UnusableNet>,
) -> Vec<super::Net> {
    let mut times_used: HashMap<String, usize> = HashMap::new();
    for name in nodes.iter().filter_map(name_written) {
        *times_used.entry(name).or_default() += 1;
    }
    let mut nets = Vec::new();
    let mut seen = HashSet::new();
    for (index, node) in nodes.iter().enumerate() {
        let written = name_written(node);
        let mut net = reader.net(node);
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
            Ok(net) => nets.push(net),
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

/// Parts by name; `None` for those that cannot be read.
struct Definitions<T> {
    kind: &'static str,
    /// Whether the map of them can be read; if not, any name may stand in it.
    is_readable: bool,
    by_name: BTreeMap<String, Option<Arc<T>>>,
}

/// A definition that cannot be had.
enum Unavailable {
    /// Nothing of that name is defined; reported.
    Undefined,
    /// It has mistakes of its own, reported there.
    Unreadable(String),
}

impl<T> Definitions<T> {
    fn read(
        report: &Report,
        kind: &'static str,
        entries: Option<&[(Key, Node)]>,
        part: fn(&Report, &str, &Node) -> Option<T>,
    ) -> Self {
        let by_name = entries
            .unwrap_or_default()
            .iter()
            .map(|(key, node)| {
                let part = report
                    .attempt(|| part(report, &key.text, node))
                    .ok()
                    .map(Arc::new);
                (key.text.clone(), part)
            })
            .collect();
        Self {
            kind,
            is_readable: entries.is_some(),
            by_name,
        }
    }

    /// Finds the part named at `node`.
    fn find(&self, report: &Report, node: &Node, name: &str) -> Result<Arc<T>, Unavailable> {
        let kind = self.kind;
        match self.by_name.get(name) {
            Some(Some(part)) => Ok(Arc::clone(part)),
            None if self.is_readable => {
                let known: Vec<&str> = self.by_name.keys().map(String::as_str).collect();
                let expected = if known.is_empty() {
                    format!("a {kind} that this file defines; it defines none")
                } else {
                    format!(
                        "a {kind} that this file defines: {}",
                        alternatives(&known, "or")
                    )
                };
                report.error(
                    node,
                    format!("no {kind} is called {}", node.describe()),
                    |d| d.expected(expected).near_miss(near_miss(name, known)),
                );
                Err(Unavailable::Undefined)
            }
            _ => {
                let reason = format!("uses {kind} `{name}`, which cannot be read");
                Err(Unavailable::Unreadable(reason))
            }
        }
    }
}

#[cfg(test)]
mod tests;
