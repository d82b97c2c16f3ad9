//! Board files.

mod antenna;
mod corners;
mod definitions;
mod net;
mod parts;
mod path;
mod table;
mod varied;

use std::collections::{BTreeMap, HashMap, HashSet};
use std::sync::Arc;

use super::Board;
use crate::text::{
    Diagnostic, Document, Fields, Key, Node, Noted, Report, RowStart, Value, alternatives,
    parse_yaml,
};
use definitions::Definitions;
use table::NetTable;

pub use varied::{NamedTolerance, VariedNet, VariedNets};

/// Why plane and cables have no tolerances.
const ONE_ANTENNA: &str =
    "plane and cables are the antenna, which is worked out once for all draws";
/// Why tables have none.
const NONE_IN_TABLES: &str =
    "rows of a table have none; the layers, drivers and receivers that they name may";

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

/// The entries of `nets`: nets and tables of nets. A table alone may stand without a list around it.
fn net_nodes<'r>(fields: &Fields<'r>) -> Option<&'r [Node]> {
    const EXPECTED: &str = "a list of nets, each with `name`, `driver`, `clock` and `path`";
    let node = fields.require("nets", EXPECTED)?;
    if node.has_key("table") {
        return Some(std::slice::from_ref(node));
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
struct ReadNet {
    net: super::Net,
    /// What its draws are read from, where it has tolerances.
    of_draws: Option<OfDraws>,
}

/// What a net with tolerances is read from again.
struct OfDraws {
    node: Node,
    /// Whether that stands in the board file itself.
    is_of_file: bool,
    /// The tolerances in it and in what it uses.
    tolerances: Vec<Noted>,
}

/// Reads the nets of the file and of the tables among them, in their order.
fn nets(
    reader: &net::NetReader,
    nodes: &[Node],
    tables: Tables,
    left: &mut LeftOut,
) -> Vec<ReadNet> {
    let texts: Vec<Option<TableText>> = nodes
        .iter()
        .map(|node| table_text(reader.report, node, tables, left))
        .collect();
    let documents: Vec<Option<Document>> = texts
        .iter()
        .map(|text| {
            text.as_ref()
                .map(|table| Document::of_table(&table.text, &table.name))
        })
        .collect();
    let reports: Vec<Option<Report>> = documents
        .iter()
        .map(|document| document.as_ref().map(Report::new))
        .collect();
    let mut entries = Vec::new();
    for (index, node) in nodes.iter().enumerate() {
        if !node.has_key("table") {
            entries.push(Entry::Net(node, index + 1));
        } else if let (Some(document), Some(report)) = (&documents[index], &reports[index]) {
            entries.extend(entries_of(document, report, left));
        }
    }
    let mut times_used: HashMap<&str, usize> = HashMap::new();
    let names: Vec<Option<String>> = entries.iter().map(Entry::name_written).collect();
    for name in names.iter().flatten() {
        *times_used.entry(name).or_default() += 1;
    }
    let mut nets = Vec::new();
    let mut seen = HashSet::new();
    for (entry, written) in entries.iter().zip(&names) {
        let report = entry.report().unwrap_or(reader.report);
        let reader = net::NetReader { report, ..*reader };
        let mut net = entry.read(&reader);
        if let Some(name) = written
            .as_ref()
            .filter(|name| times_used[name.as_str()] > 1)
        {
            let reason = format!("more than one net is called `{name}`");
            if !seen.insert(name) {
                entry.error(report, &reason, "a name of its own for each net");
            }
            net = Err(reason);
        }
        match net {
            Ok(net) => nets.push(net),
            Err(reason) => {
                let name = written.clone().unwrap_or_else(|| entry.called());
                left.unusable.push(UnusableNet { name, reason });
            }
        }
    }
    drop(entries);
    let of_tables = reports.into_iter().flatten();
    left.in_tables
        .extend(of_tables.flat_map(Report::into_diagnostics));
    nets
}

/// The text of the table that an entry of `nets` names, if it names one.
fn table_text(
    report: &Report,
    node: &Node,
    tables: Tables,
    left: &mut LeftOut,
) -> Option<TableText> {
    if !node.has_key("table") {
        return None;
    }
    let fields = report.fields(node, "the table of nets", &["table"])?;
    let name = fields.require_name("table")?;
    match tables(&name) {
        Ok(table) => Some(TableText {
            text: table.text.trim_start_matches('\u{feff}').to_owned(),
            ..table
        }),
        Err(reason) => {
            let message = format!("cannot read the table `{name}`: {reason}");
            fields.error(&message, "the name of a CSV file beside the board file");
            left.unusable.push(UnusableNet {
                name: format!("all nets of `{name}`"),
                reason,
            });
            None
        }
    }
}

/// The rows of a table, none where its header cannot be understood.
fn entries_of<'t>(
    document: &'t Document<'t>,
    report: &'t Report<'t>,
    left: &mut LeftOut,
) -> Vec<Entry<'t>> {
    let table = report.attempt(|| NetTable::read(document, report));
    match table {
        Ok(table) => {
            let table = Arc::new(table);
            if table.rows().next().is_none() {
                report.error(
                    &document.root,
                    "the table has no nets below its header",
                    |d| d,
                );
            }
            let row = |(row, name)| Entry::Row(Arc::clone(&table), report, row, name);
            table.rows().map(row).collect()
        }
        Err(reason) => {
            left.unusable.push(UnusableNet {
                name: format!("all nets of `{}`", document.file),
                reason: reason.unwrap_or_else(|| "its header cannot be read".into()),
            });
            Vec::new()
        }
    }
}

/// What a net is read from.
enum Entry<'t> {
    /// An entry of the board file with its number, from 1.
    Net(&'t Node, usize),
    /// A row of a table, and the name in it.
    Row(Arc<NetTable<'t>>, &'t Report<'t>, RowStart, Option<String>),
}

impl<'t> Entry<'t> {
    fn name_written(&self) -> Option<String> {
        match self {
            Self::Net(node, _) => name_written(node),
            Self::Row(.., name) => name.clone(),
        }
    }

    /// Where its mistakes go, if not to the board file's report.
    fn report(&self) -> Option<&'t Report<'t>> {
        match self {
            Self::Net(..) => None,
            Self::Row(_, report, ..) => Some(report),
        }
    }

    fn read(&self, reader: &net::NetReader) -> Result<ReadNet, String> {
        let report = reader.report;
        let read = |net: super::Net, tolerances: Vec<Noted>, node: &Node| ReadNet {
            net,
            of_draws: (!tolerances.is_empty()).then(|| OfDraws {
                node: node.clone(),
                is_of_file: matches!(self, Self::Net(..)),
                tolerances,
            }),
        };
        match self {
            Self::Net(node, _) => {
                let (net, tolerances) =
                    report.with_noted(|| report.allowing_tolerances(|| reader.net(node)));
                Ok(read(net?, tolerances, node))
            }
            Self::Row(table, _, row, _) => {
                let node = report.attempt(|| table.net(*row, report));
                let node = node.map_err(|reason| reason.unwrap_or_default())?;
                let (net, tolerances) = report.with_noted(|| {
                    report.refusing_tolerances(NONE_IN_TABLES, || reader.net(&node))
                });
                Ok(read(net?, tolerances, &node))
            }
        }
    }

    fn error(&self, report: &Report, message: &str, expected: &str) {
        match self {
            Self::Net(node, _) => report.error(*node, message, |d| d.expected(expected)),
            Self::Row(table, _, row, _) => {
                report.error(&table.start(*row), message, |d| d.expected(expected));
            }
        }
    }

    /// What to call a net without a name.
    fn called(&self) -> String {
        match self {
            Self::Net(_, number) => format!("net {number}"),
            Self::Row(_, report, row, _) => format!("{}, row {}", report.file(), row.line),
        }
    }
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
