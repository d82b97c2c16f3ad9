//! The nets of a board file: those that it describes itself, and those of the tables it names.

use std::collections::{HashMap, HashSet};
use std::sync::Arc;

use super::super::Net;
use super::net::NetReader;
use super::table::NetTable;
use super::{LeftOut, TableText, Tables, UnusableNet};
use crate::text::{Document, Fields, Node, Noted, Report, RowStart, Value};

/// Why tables have none.
const NONE_IN_TABLES: &str =
    "rows of a table have none; the layers, drivers and receivers that they name may";

/// The entries of `nets`: nets and tables of nets. A table alone may stand without a list around it.
pub(super) fn net_nodes<'r>(fields: &Fields<'r>) -> Option<&'r [Node]> {
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
pub(super) struct ReadNet {
    pub(super) net: Net,
    /// What its draws are read from, where it has tolerances.
    pub(super) of_draws: Option<OfDraws>,
}

/// What a net with tolerances is read from again.
pub(super) struct OfDraws {
    pub(super) node: Node,
    /// Whether that stands in the board file itself.
    pub(super) is_of_file: bool,
    /// The tolerances in it and in what it uses.
    pub(super) tolerances: Vec<Noted>,
}

/// Reads the nets of the file and of the tables among them, in their order.
pub(super) fn nets(
    reader: &NetReader,
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
        let reader = NetReader { report, ..*reader };
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

    fn read(&self, reader: &NetReader) -> Result<ReadNet, String> {
        let report = reader.report;
        let read = |net: Net, tolerances: Vec<Noted>, node: &Node| ReadNet {
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
