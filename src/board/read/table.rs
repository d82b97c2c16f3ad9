//! Nets from a table, a row a net: driver, series resistor, one trace, receiver, part at the far end.
//!
//! A row is turned into the very map that a board file would hold for the net, and read as one, so that both say the
//! same about the same mistake. Its parts point at the cells they come from.

use crate::text::{
    Cell, Dimension, Document, Key, Node, Position, Report, RowStart, Table, Value, alternatives,
    near_miss, parse_quantity,
};

/// What a column holds.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Column {
    Net,
    Driver,
    Clock,
    Duty,
    Series,
    Layer,
    Width,
    Length,
    Receiver,
    Shunt,
    ShuntCapacitor,
    ShuntRail,
    Count,
    ClockSource,
    Phase,
    EdgeDistance,
    Along,
}

/// Every column: its names, the first of which is the usual one, and what it measures.
const COLUMNS: [(Column, &[&str], Option<Dimension>); 17] = {
    use Dimension::{Capacitance, Frequency, Length, Number, Resistance, Share, Voltage};
    [
        (Column::Net, &["net", "net name", "name", "signal"], None),
        (Column::Driver, &["driver"], None),
        (
            Column::Clock,
            &["clock", "frequency", "clock frequency"],
            Some(Frequency),
        ),
        (Column::Duty, &["duty", "duty cycle"], Some(Share)),
        (
            Column::Series,
            &["series", "series resistor", "series resistance"],
            Some(Resistance),
        ),
        (Column::Layer, &["layer"], None),
        (Column::Width, &["width", "trace width"], Some(Length)),
        (Column::Length, &["length", "trace length"], Some(Length)),
        (Column::Receiver, &["receiver", "load"], None),
        (
            Column::Shunt,
            &["shunt", "shunt resistor", "end resistor"],
            Some(Resistance),
        ),
        (
            Column::ShuntCapacitor,
            &["shunt capacitor", "end capacitor"],
            Some(Capacitance),
        ),
        (
            Column::ShuntRail,
            &["shunt to", "end resistor to"],
            Some(Voltage),
        ),
        (Column::Count, &["count", "lines"], Some(Number)),
        (Column::ClockSource, &["clock source", "source"], None),
        (Column::Phase, &["phase"], None),
        (Column::EdgeDistance, &["edge distance"], Some(Length)),
        (Column::Along, &["along"], None),
    ]
};

/// Columns that a table cannot do without.
const REQUIRED: [Column; 6] = [
    Column::Net,
    Column::Driver,
    Column::Clock,
    Column::Layer,
    Column::Width,
    Column::Length,
];

/// A table whose header is understood.
pub(super) struct NetTable<'t> {
    table: Table<'t>,
    /// What each cell of a row means, in their order; `None` for columns that are not read.
    columns: Vec<Option<Meaning>>,
}

/// What a column means.
#[derive(Debug, Clone)]
struct Meaning {
    column: Column,
    dimension: Option<Dimension>,
    /// The unit of cells that give none.
    unit: Option<String>,
}

impl<'t> NetTable<'t> {
    /// Understands a table's header; what is wrong with it is reported.
    pub(super) fn read(document: &Document<'t>, report: &Report) -> Option<Self> {
        let expected = format!(
            "a header with {}",
            alternatives(&usual_names(&REQUIRED), "and")
        );
        let table = match Table::read(document.text) {
            Ok(table) => table,
            Err(Some(error)) => {
                let place = Node::at(error.position, Value::Null);
                report.error(&place, error.message, |d| d.expected(error.expected));
                return None;
            }
            Err(None) => {
                report.error(&document.root, "the table is empty", |d| {
                    d.expected(expected)
                });
                return None;
            }
        };
        let mut columns: Vec<Option<Meaning>> = Vec::new();
        for cell in &table.header {
            let meaning = meaning(cell, report);
            let is_twice = meaning.as_ref().is_some_and(|meaning| {
                let mut others = columns.iter().flatten();
                others.any(|other| other.column == meaning.column)
            });
            if is_twice {
                let message = format!("column `{}` stands twice in the table", cell.text);
                report.error(&Node::at(cell.position, Value::Null), message, |d| d);
            }
            columns.push(meaning);
        }
        if report.has_errors() {
            return None;
        }
        let lacks = |wanted: &Column| {
            let mut all = columns.iter().flatten();
            !all.any(|meaning| meaning.column == *wanted)
        };
        let missing: Vec<Column> = REQUIRED.into_iter().filter(lacks).collect();
        if !missing.is_empty() {
            let message = format!(
                "the table has no column {}",
                alternatives(&usual_names(&missing), "and")
            );
            report.error(&document.root, message, |d| d.expected(expected));
            return None;
        }
        Some(Self { table, columns })
    }

    /// The rows, each with the name of its net as far as one can be read.
    pub(super) fn rows(&self) -> impl Iterator<Item = (RowStart, Option<String>)> {
        self.table.rows.iter().map(|row| {
            let cells = self.table.cells(*row).unwrap_or_default();
            let mut pairs = self.columns.iter().zip(cells);
            let name = pairs.find_map(|(meaning, cell)| {
                let is_name = meaning.as_ref()?.column == Column::Net && !cell.text.is_empty();
                is_name.then_some(cell.text)
            });
            (*row, name)
        })
    }

    /// Where a row starts, for messages.
    pub(super) fn start(&self, row: RowStart) -> Node {
        Node::at(
            Position {
                line: row.line,
                column: 1,
            },
            Value::Null,
        )
    }

    /// A row as the map of its net; `None` where it is no row, which is reported.
    pub(super) fn net(&self, row: RowStart, report: &Report) -> Option<Node> {
        let cells = match self.table.cells(row) {
            Ok(cells) => cells,
            Err(error) => {
                let place = Node::at(error.position, Value::Null);
                report.error(&place, error.message, |d| d.expected(error.expected));
                return None;
            }
        };
        let start = cells.first().map_or(
            Position {
                line: row.line,
                column: 1,
            },
            |cell| cell.position,
        );
        if let Some(cell) = cells[self.columns.len().min(cells.len())..]
            .iter()
            .find(|cell| !cell.text.is_empty())
        {
            let message = format!(
                "the row has more cells than the header's {}",
                self.columns.len()
            );
            report.error(&Node::at(cell.position, Value::Null), message, |d| {
                d.expected("quotes around a cell that holds the delimiter")
            });
            return None;
        }
        let filled = |wanted: Column| {
            let mut pairs = self.columns.iter().zip(&cells);
            pairs.find_map(|(meaning, cell)| {
                let meaning = meaning
                    .as_ref()
                    .filter(|meaning| meaning.column == wanted)?;
                (!cell.text.is_empty()).then(|| self.value(meaning, cell))
            })
        };
        Some(map_of_net(start, filled))
    }

    /// A cell with the unit of its column, where it has none of its own, and a decimal point.
    fn value(&self, meaning: &Meaning, cell: &Cell) -> Node {
        let mut text = cell.text.clone();
        if meaning.dimension.is_some() {
            if self.table.has_decimal_commas() && has_one_decimal_comma(&text) {
                text = text.replace(',', ".");
            }
            if let Some(unit) = &meaning.unit
                && text.parse::<f64>().is_ok_and(f64::is_finite)
            {
                text = format!("{text} {unit}");
            }
        }
        Node::at(cell.position, Value::Text(text))
    }
}

/// The map that a board file would hold for a net, from what its row has.
fn map_of_net(start: Position, filled: impl Fn(Column) -> Option<Node>) -> Node {
    let map = |fields: &[(&str, Column)]| -> Vec<(Key, Node)> {
        let entries = fields.iter().filter_map(|(key, column)| {
            let value = filled(*column)?;
            Some((Key::at(start, key), value))
        });
        entries.collect()
    };
    let item =
        |key: &str, value: Node| Node::at(start, Value::Map(vec![(Key::at(start, key), value)]));
    let mut path = Vec::new();
    path.extend(filled(Column::Series).map(|value| item("series", value)));
    let trace = map(&[
        ("layer", Column::Layer),
        ("width", Column::Width),
        ("length", Column::Length),
    ]);
    path.push(item("trace", Node::at(start, Value::Map(trace))));
    path.extend(filled(Column::Receiver).map(|value| item("receiver", value)));
    let shunt = map(&[
        ("resistance", Column::Shunt),
        ("capacitance", Column::ShuntCapacitor),
        ("to", Column::ShuntRail),
    ]);
    if !shunt.is_empty() {
        path.push(item("shunt", Node::at(start, Value::Map(shunt))));
    }
    let mut net = map(&[
        ("name", Column::Net),
        ("driver", Column::Driver),
        ("clock", Column::Clock),
        ("duty", Column::Duty),
        ("count", Column::Count),
        ("clock_source", Column::ClockSource),
        ("phase", Column::Phase),
        ("edge_distance", Column::EdgeDistance),
        ("along", Column::Along),
    ]);
    net.push((Key::at(start, "path"), Node::at(start, Value::List(path))));
    Node::at(start, Value::Map(net))
}

/// What a cell of the header means; `None` for a column that is not read, which is said.
fn meaning(cell: &Cell, report: &Report) -> Option<Meaning> {
    if cell.text.is_empty() {
        return None;
    }
    let place = Node::at(cell.position, Value::Null);
    let (name, unit) = name_and_unit(&cell.text);
    let known = |(column, names, dimension): &(Column, &[&str], Option<Dimension>)| {
        let is_it = names.contains(&name.as_str());
        is_it.then_some((*column, *dimension))
    };
    let Some((column, dimension)) = COLUMNS.iter().find_map(known) else {
        let names = COLUMNS
            .iter()
            .flat_map(|(_, names, _)| names.iter().copied());
        let message = format!("a table of nets has no column `{}`", cell.text);
        match near_miss(&name, names) {
            None => report.warning(&place, format!("{message}: it is not read")),
            near => report.error(&place, message, |d| d.near_miss(near)),
        }
        return None;
    };
    if let Some(unit) = &unit {
        let Some(dimension) = dimension else {
            let message = format!("column `{name}` holds words and has no unit");
            report.error(&place, message, |d| d);
            return None;
        };
        if let Err(error) = parse_quantity(&format!("1 {unit}"), dimension) {
            let message = format!("column `{name}` {}", error.problem);
            let near = error.near_miss.map(|near| near.replacen("1 ", "", 1));
            report.error(&place, message, |d| {
                d.expected(format!("the unit of {}", error.expected))
                    .near_miss(near)
            });
            return None;
        }
    }
    Some(Meaning {
        column,
        dimension,
        unit,
    })
}

/// A column's name in small letters and single blanks, and the unit in brackets behind it: `Trace_Length [in]`.
fn name_and_unit(header: &str) -> (String, Option<String>) {
    let bracketed = [('[', ']'), ('(', ')')]
        .into_iter()
        .find_map(|(open, close)| {
            let (name, unit) = header.strip_suffix(close)?.split_once(open)?;
            Some((name, unit.trim().to_owned()))
        });
    let (name, unit) = match bracketed {
        Some((name, unit)) => (name, Some(unit)),
        None => (header, None),
    };
    let words: Vec<&str> = name
        .split(|c: char| c.is_whitespace() || c == '_' || c == '-')
        .filter(|word| !word.is_empty())
        .collect();
    (words.join(" ").to_lowercase(), unit)
}

fn usual_names(columns: &[Column]) -> Vec<&'static str> {
    let usual = |wanted: &Column| {
        let mut all = COLUMNS.iter();
        all.find_map(|(column, names, _)| (column == wanted).then(|| names[0]))
    };
    columns.iter().filter_map(usual).collect()
}

/// Whether the text is a number with a comma before its decimals: `6,5 in`, not `1.234,5` nor `1,5,2`.
fn has_one_decimal_comma(text: &str) -> bool {
    let mut parts = text.split(',');
    let (Some(whole), Some(decimals), None) = (parts.next(), parts.next(), parts.next()) else {
        return false;
    };
    let is_digit = |c: Option<char>| c.is_some_and(|c| c.is_ascii_digit());
    !text.contains('.') && is_digit(whole.chars().last()) && is_digit(decimals.chars().next())
}
