//! Board files.

mod antenna;
mod net;
mod nets;
mod parts;
mod path;
mod table;

use std::collections::BTreeMap;
use std::sync::Arc;

use super::Board;
use crate::text::{
    Diagnostic, Fields, Key, Node, Report, Value, alternatives, near_miss, parse_yaml,
};
use nets::{net_nodes, nets};

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

/// A table of nets that a board file names.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct TableText {
    /// What to call it in messages.
    pub name: String,
    /// All of it.
    pub text: String,
}

/// Hands out the table of a name that the board file gives, or says why it cannot.
type Tables<'t> = &'t dyn Fn(&str) -> Result<TableText, String>;

/// Reads a board file. Never fails as a whole: what cannot be used is left out and said.
///
/// A mistake within a net costs that net; one within a driver, layer or receiver costs the nets that use it; any other
/// costs the board. A table of nets is refused: see [`read_board_and_tables`].
pub fn read_board(text: &str, file_name: &str) -> Reading {
    read_board_and_tables(text, file_name, &|_| Err("no tables are at hand".into()))
}

/// Reads a board file as [`read_board`] does, and the tables of nets it names.
///
/// `tables` hands out the table of a name. A mistake in a row costs that net, one in a table's header all of its nets.
pub fn read_board_and_tables(text: &str, file_name: &str, tables: Tables) -> Reading {
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
    let mut left = LeftOut::default();
    let board = board(&report, &document.root, file_name, tables, &mut left);
    let mut diagnostics = report.into_diagnostics();
    diagnostics.extend(left.in_tables);
    Reading {
        board,
        diagnostics,
        unusable: left.unusable,
    }
}

/// What is left out, and why.
#[derive(Default)]
struct LeftOut {
    unusable: Vec<UnusableNet>,
    /// What is wrong in tables, which have places of their own.
    in_tables: Vec<Diagnostic>,
}

fn board(
    report: &Report,
    root: &Node,
    file_name: &str,
    tables: Tables,
    left: &mut LeftOut,
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

    let layers = Definitions::read(report, "layer", stackup, parts::layer);
    let drivers = Definitions::read(report, "driver", drivers, parts::driver);
    let receivers = Definitions::read(report, "receiver", receivers, parts::receiver);
    let reader = net::NetReader {
        report,
        plane,
        layers: &layers,
        drivers: &drivers,
        receivers: &receivers,
    };
    let nets = nets(&reader, net_nodes?, tables, left);
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
