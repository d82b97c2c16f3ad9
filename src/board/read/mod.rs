//! Board files.

mod antenna;
mod corners;
mod definitions;
mod net;
mod nets;
mod parts;
mod path;
mod table;
mod varied;

use std::collections::BTreeMap;

use super::Board;
use crate::text::{Diagnostic, Fields, Key, Node, Report, Value, alternatives, parse_yaml};
use definitions::Definitions;
use nets::{ReadNet, net_nodes, nets};

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
                varied: None,
            };
        }
    };
    let report = Report::new(&document);
    let mut left = LeftOut::default();
    let (board, varied) = board(&report, &document.root, file_name, tables, &mut left).unzip();
    let mut diagnostics = report.into_diagnostics();
    diagnostics.extend(left.in_tables);
    Reading {
        board,
        diagnostics,
        unusable: left.unusable,
        varied: varied.filter(|varied: &VariedNets| !varied.is_empty()),
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
    let read = nets(&reader, net_nodes?, tables, left);
    let mut nets = Vec::with_capacity(read.len());
    for ReadNet { net, of_draws } in read {
        if let Some(of_draws) = of_draws {
            varied.add(&net.name, of_draws);
        }
        nets.push(net);
    }
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

#[cfg(test)]
mod tests;
