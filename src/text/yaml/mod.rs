//! A YAML text as a tree whose every part can be found again in the text.

mod brackets;
mod reading;

use std::cell::Cell;

use brackets::{DEEPEST_BRACKETS, too_deep};
use reading::{Problem, Reading};

use super::diagnostic::{Diagnostic, Place, Position, Severity, SourceLine};
use super::quantity::shortened;

/// Longest text that is read.
const LARGEST_TEXT_BYTES: usize = 16 << 20;
/// Text that may be read again to find places, over all of a document's errors.
const REREAD_BUDGET_BYTES: usize = 32 << 20;

/// A part of a document.
#[derive(Debug, Clone, PartialEq)]
pub struct Node {
    /// Its number in the order of reading: how its place is found again.
    id: usize,
    /// What stands there.
    pub value: Value,
}

/// What stands at a node.
#[derive(Debug, Clone, PartialEq)]
pub enum Value {
    /// Nothing, or `null`.
    Null,
    /// `true` or `false`.
    Bool(bool),
    /// A whole number.
    Integer(i128),
    /// Any other number, `.nan` and `.inf` among them. How it was written is lost.
    Float(f64),
    /// Any other text.
    Text(String),
    /// A list.
    List(Vec<Node>),
    /// A map, in the order of the text; a key may stand twice: [`Report::map`](super::Report::map) reports it.
    Map(Vec<(Key, Node)>),
}

/// A key of a map, as it is written.
#[derive(Debug, Clone, PartialEq)]
pub struct Key {
    id: usize,
    /// The key.
    pub text: String,
}

impl Node {
    /// A part of a table's row at a place ([`Document::of_table`]).
    pub fn at(position: Position, value: Value) -> Self {
        Self {
            id: id_of_cell(position),
            value,
        }
    }

    /// Whether this is a map with such a key.
    pub fn has_key(&self, key: &str) -> bool {
        matches!(&self.value, Value::Map(entries) if entries.iter().any(|(k, _)| k.text == key))
    }

    /// The scalar as text, numbers in their shortest form; `None` for a list, a map or nothing.
    pub fn scalar(&self) -> Option<String> {
        match &self.value {
            Value::Bool(value) => Some(value.to_string()),
            Value::Integer(value) => Some(value.to_string()),
            Value::Float(value) => Some(value.to_string()),
            Value::Text(value) => Some(value.clone()),
            Value::Null | Value::List(_) | Value::Map(_) => None,
        }
    }

    /// The keys and items, counted from 1, that lead from here to the part with this number.
    pub(super) fn way_to(&self, id: usize) -> Option<Vec<String>> {
        if self.id == id {
            return Some(Vec::new());
        }
        let (word, mut way) = match &self.value {
            Value::List(items) => items.iter().enumerate().find_map(|(index, item)| {
                Some((format!("item {}", index + 1), item.way_to(id)?))
            })?,
            Value::Map(entries) => entries
                .iter()
                .find_map(|(key, node)| Some((key.text.clone(), node.way_to(id)?)))?,
            _ => return None,
        };
        way.insert(0, word);
        Some(way)
    }

    /// What stands here, for a message: `` `4 mil` ``, `a list`.
    pub fn describe(&self) -> String {
        match (&self.value, self.scalar()) {
            (Value::List(_), _) => "a list".into(),
            (Value::Map(_), _) => "a map".into(),
            (_, Some(text)) => format!("`{}`", shortened(&text)),
            _ => "nothing".into(),
        }
    }
}

impl Key {
    /// A key of a table's row at a place ([`Document::of_table`]).
    pub fn at(position: Position, text: &str) -> Self {
        Self {
            id: id_of_cell(position),
            text: text.to_owned(),
        }
    }
}

/// Columns that fit into the number of a table's part.
const CELL_COLUMNS: usize = 1 << 16;

/// A place as the number of a part.
fn id_of_cell(position: Position) -> usize {
    position.line * CELL_COLUMNS + position.column.min(CELL_COLUMNS - 1)
}

fn position_of_cell(id: usize) -> Position {
    Position {
        line: id / CELL_COLUMNS,
        column: id % CELL_COLUMNS,
    }
}

/// What a diagnostic can point at.
pub trait Located {
    /// The number in the order of reading.
    #[doc(hidden)]
    fn id(&self) -> usize;
}

impl Located for Node {
    fn id(&self) -> usize {
        self.id
    }
}

impl Located for Key {
    fn id(&self) -> usize {
        self.id
    }
}

/// A YAML text that was read.
#[derive(Debug)]
pub struct Document<'t> {
    /// Name of the file, for messages.
    pub file: &'t str,
    /// The whole of it.
    pub root: Node,
    /// The text itself.
    pub text: &'t str,
    reread_budget_bytes: Cell<usize>,
    /// Whether numbers of parts are places already.
    is_table: bool,
}

/// Reads a YAML text into a tree.
///
/// # Errors
///
/// One error, with its place, for a text that is no YAML, too long or too deep, holds several documents, or has
/// tags.
pub fn parse_yaml<'t>(text: &'t str, file: &'t str) -> Result<Document<'t>, Box<Diagnostic>> {
    if text.len() > LARGEST_TEXT_BYTES {
        let message = format!("the file is too large: {} MB", text.len() >> 20);
        let expected = format!("at most {} MB", LARGEST_TEXT_BYTES >> 20);
        return Err(Diagnostic::about_file(file, message)
            .expected(expected)
            .into());
    }
    if let Some(position) = too_deep(text) {
        let error = at(text, file, Some(position), "brackets are nested too deeply");
        let expected = format!("at most {DEEPEST_BRACKETS} brackets open at once");
        return Err(error.expected(expected).into());
    }
    let reading = Reading::default();
    match reading.read(text) {
        Ok(Node {
            value: Value::Null, ..
        }) => Err(Diagnostic::about_file(file, "the file is empty").into()),
        Ok(root) => {
            let reread_budget_bytes = Cell::new(REREAD_BUDGET_BYTES);
            Ok(Document {
                file,
                root,
                text,
                reread_budget_bytes,
                is_table: false,
            })
        }
        Err(error) => Err(explained(&error, reading.problem.take(), text, file).into()),
    }
}

impl<'t> Document<'t> {
    /// A table's text, for diagnostics that point at parts made with [`Node::at`] and [`Key::at`].
    pub fn of_table(text: &'t str, file: &'t str) -> Self {
        Self {
            file,
            root: Node::at(Position { line: 1, column: 1 }, Value::Null),
            text,
            reread_budget_bytes: Cell::new(REREAD_BUDGET_BYTES),
            is_table: true,
        }
    }

    /// A diagnostic that points at `what`. Its position is left out once finding places has cost too much.
    pub fn diagnostic(
        &self,
        severity: Severity,
        what: &impl Located,
        message: impl Into<String>,
    ) -> Diagnostic {
        let is_affordable = self.take_from_budget().is_some();
        let position = if self.is_table {
            Some(position_of_cell(what.id()))
        } else {
            is_affordable.then(|| self.find(what.id())).flatten()
        };
        let line_of = if is_affordable { self.text } else { "" };
        Diagnostic {
            severity,
            ..at(line_of, self.file, position, message)
        }
    }

    /// Where a part begins; `None` once finding places has cost too much.
    pub fn place_of(&self, what: &impl Located) -> Option<Position> {
        self.take_from_budget()?;
        self.find(what.id())
    }

    /// Allows for one more reading of the text, as long as that has not cost too much.
    fn take_from_budget(&self) -> Option<()> {
        let left = self
            .reread_budget_bytes
            .get()
            .checked_sub(self.text.len())?;
        self.reread_budget_bytes.set(left);
        Some(())
    }

    /// Finds a part by reading the text again and failing there: the parser tells places only of errors.
    fn find(&self, id: usize) -> Option<Position> {
        let reading = Reading::stopping_at(id);
        reading
            .read(self.text)
            .err()
            .and_then(|error| position_of(&error))
    }
}

fn at(
    text: &str,
    file: &str,
    position: Option<Position>,
    message: impl Into<String>,
) -> Diagnostic {
    Diagnostic {
        source_line: position.and_then(|position| SourceLine::of(text, position)),
        place: Some(Place {
            file: file.to_owned(),
            position,
        }),
        ..Diagnostic::error(message)
    }
}

fn position_of(error: &serde_yaml::Error) -> Option<Position> {
    error.location().map(|place| Position {
        line: place.line(),
        column: place.column(),
    })
}

/// Turns the parser's error into one of ours.
fn explained(
    error: &serde_yaml::Error,
    problem: Option<Problem>,
    text: &str,
    file: &str,
) -> Diagnostic {
    let position = position_of(error);
    let here = |message: &str| at(text, file, position, message);
    const TOO_MUCH: &str = "the file has too many parts, or its aliases expand to too much";
    match problem {
        Some(Problem::TooManyNodes) => return here(TOO_MUCH),
        Some(Problem::Tag) => {
            return here("YAML tags (`!name`) have no meaning here")
                .expected("quotes around a text that starts with `!`");
        }
        None => {}
    }
    let whole = error.to_string();
    let first = whole.split(" at line ").next().unwrap_or_default();
    let context = whole
        .split_once(", while")
        .map_or("", |(_, context)| context);
    let known = |part: &str| first.contains(part);
    if known("recursion limit") {
        return here("nested too deeply, or an alias that contains itself");
    }
    if known("repetition limit") {
        return here(TOO_MUCH);
    }
    if known("unknown anchor") {
        return here("an alias (`*name`) without its anchor (`&name`)")
            .expected("quotes around a text that starts with `*`");
    }
    if known("more than one document") {
        return here("the file holds more than one YAML document").expected("a single one");
    }
    if known("plain word as the key") {
        return here("a key is itself a list or a map").expected("a plain word");
    }
    let separator = if context.is_empty() { "" } else { ", while" };
    let diagnostic = here(&format!("this is not YAML: {first}{separator}{context}"));
    if known("mapping values are not allowed") {
        return diagnostic.expected("quotes around a text that holds `: `");
    }
    let line = position.and_then(|position| text.split('\n').nth(position.line - 1));
    if line.is_some_and(|line| line.trim_start_matches(' ').starts_with('\t')) {
        return diagnostic.expected("spaces: YAML allows no tabs at the start of a line");
    }
    diagnostic
}

#[cfg(test)]
mod tests;
