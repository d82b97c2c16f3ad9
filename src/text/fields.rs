//! Maps read field by field, with every mistake reported at its place.

use std::cell::{Cell, RefCell};
use std::collections::HashSet;

use super::diagnostic::{Diagnostic, Severity, near_miss};
use super::draw::{Draw, Noted};
use super::quantity::{Dimension, QuantityError, parse_stated, shortened};
use super::yaml::{Document, Key, Located, Node, Value};

/// What a reader found wrong in a document so far.
///
/// Readers report a mistake, go on with `None` or a default, and ask afterwards whether a part was free of errors
/// ([`Report::attempt`]): so one reading finds all mistakes.
#[derive(Debug)]
pub struct Report<'d> {
    /// `None` where the same was read and reported before.
    pub(super) document: Option<&'d Document<'d>>,
    pub(super) diagnostics: RefCell<Vec<Diagnostic>>,
    /// Why no quantity may have a tolerance just now; `None` where it may.
    pub(super) tolerances_refused: Cell<Option<&'static str>>,
    pub(super) noted: RefCell<Vec<Noted>>,
    pub(super) draw: Draw,
}

/// What a quantity may be.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Range {
    /// Any finite number.
    Any,
    /// Above zero.
    Positive,
    /// Zero or more.
    NotNegative,
    /// One or more.
    AtLeastOne,
}

impl Range {
    /// What a number outside is not, if it lies outside.
    pub(super) fn complaint(self, number: f64) -> Option<&'static str> {
        let (inside, complaint) = match self {
            Self::Any => (true, ""),
            Self::Positive => (number > 0.0, "must be above zero"),
            Self::NotNegative => (number >= 0.0, "must not be negative"),
            Self::AtLeastOne => (number >= 1.0, "must be 1 or more"),
        };
        (!inside).then_some(complaint)
    }
}

impl<'d> Report<'d> {
    /// An empty report on `document`.
    pub fn new(document: &'d Document<'d>) -> Self {
        Self {
            document: Some(document),
            diagnostics: RefCell::default(),
            tolerances_refused: Cell::new(Some(
                "only nets and what they are made of have tolerances",
            )),
            noted: RefCell::default(),
            draw: Draw::default(),
        }
    }

    fn diagnostic(
        &self,
        severity: Severity,
        what: &impl Located,
        message: impl Into<String>,
    ) -> Diagnostic {
        match self.document {
            Some(document) => document.diagnostic(severity, what, message),
            None => Diagnostic {
                severity,
                ..Diagnostic::error(message)
            },
        }
    }

    /// Everything reported, in the order of reporting.
    pub fn into_diagnostics(self) -> Vec<Diagnostic> {
        self.diagnostics.into_inner()
    }

    /// Name of the file; empty in a reading with other values than the nominal ones.
    pub fn file(&self) -> &str {
        self.document.map_or("", |document| document.file)
    }

    /// Whether any error was reported.
    pub fn has_errors(&self) -> bool {
        self.diagnostics
            .borrow()
            .iter()
            .any(|diagnostic| diagnostic.severity == Severity::Error)
    }

    /// Reports an error at `what`. `detail` adds what was expected and the near miss.
    pub fn error(
        &self,
        what: &impl Located,
        message: impl Into<String>,
        detail: impl FnOnce(Diagnostic) -> Diagnostic,
    ) {
        let diagnostic = self.diagnostic(Severity::Error, what, message);
        self.diagnostics.borrow_mut().push(detail(diagnostic));
    }

    /// Reports a warning at `what`.
    pub fn warning(&self, what: &impl Located, message: impl Into<String>) {
        let diagnostic = self.diagnostic(Severity::Warning, what, message);
        self.diagnostics.borrow_mut().push(diagnostic);
    }

    /// Reads a part of the document.
    ///
    /// # Errors
    ///
    /// The message of the first error that the reading reported; `None` where it gave up without one.
    pub fn attempt<T>(&self, read: impl FnOnce() -> Option<T>) -> Result<T, Option<String>> {
        let before = self.diagnostics.borrow().len();
        let value = read();
        let diagnostics = self.diagnostics.borrow();
        let mut new = diagnostics[before..].iter();
        match new.find(|diagnostic| diagnostic.severity == Severity::Error) {
            Some(first) => Err(Some(first.message.clone())),
            None => value.ok_or(None),
        }
    }

    /// The list at `node`, called `name`; reports anything else.
    pub fn list<'n>(&self, node: &'n Node, name: &str, expected: &str) -> Option<&'n [Node]> {
        if let Value::List(items) = &node.value {
            return Some(items);
        }
        self.not(node, name, expected);
        None
    }

    /// The map at `node`, called `name`; reports anything else, and keys that stand twice.
    pub fn map<'n>(&self, node: &'n Node, name: &str, expected: &str) -> Option<&'n [(Key, Node)]> {
        let Value::Map(entries) = &node.value else {
            self.not(node, name, expected);
            return None;
        };
        let mut seen = HashSet::new();
        for (key, _) in entries {
            if !seen.insert(&key.text) {
                let message = format!("`{}` stands twice in {name}", shortened(&key.text));
                self.error(key, message, |diagnostic| diagnostic);
            }
        }
        Some(entries)
    }

    /// The map at `node`, called `owner` in messages, whose keys are all `known`; reports any other.
    pub fn fields<'r>(
        &'r self,
        node: &'r Node,
        owner: impl Into<String>,
        known: &[&str],
    ) -> Option<Fields<'r>> {
        let owner = owner.into();
        let expected = format!("a map with {}", alternatives(known, "and"));
        let entries = self.map(node, &owner, &expected)?;
        let mut misspelt = Vec::new();
        for (key, _) in entries {
            if !known.contains(&key.text.as_str()) {
                let message = format!("{owner} has no field `{}`", shortened(&key.text));
                self.unknown_word(key, &key.text, message, known);
                misspelt.extend(near_miss(&key.text, known.iter().copied()));
            }
        }
        Some(Fields {
            report: self,
            node,
            entries,
            owner,
            misspelt,
        })
    }

    /// Reports a word that is none of `known`.
    pub fn unknown_word(
        &self,
        what: &impl Located,
        word: &str,
        message: impl Into<String>,
        known: &[&str],
    ) {
        self.error(what, message, |diagnostic| {
            diagnostic
                .expected(alternatives(known, "or"))
                .near_miss(near_miss(word, known.iter().copied()))
        });
    }

    /// Reports that `node`, called `name`, is not what was expected.
    pub fn not(&self, node: &Node, name: &str, expected: &str) {
        let message = match node.value {
            Value::Null => format!("{name} is empty"),
            _ => format!("{name} cannot be {}", node.describe()),
        };
        self.error(node, message, |diagnostic| diagnostic.expected(expected));
    }

    /// The quantity at `node`, called `name`; reports anything else.
    pub fn quantity(
        &self,
        node: &Node,
        name: &str,
        dimension: Dimension,
        range: Range,
    ) -> Option<f64> {
        let written = match &node.value {
            Value::Bool(_) | Value::Null | Value::List(_) | Value::Map(_) => {
                self.not(node, name, &dimension.expectation());
                return None;
            }
            // std writes what is not finite in its own way
            Value::Float(number) if number.is_nan() => ".nan".into(),
            Value::Float(number) if number.is_infinite() => ".inf".into(),
            _ => node.scalar()?,
        };
        match parse_stated(&written, dimension) {
            Ok(stated) => {
                if let Some(complaint) = range.complaint(stated.nominal) {
                    let message = format!("{name} {complaint}: `{}`", shortened(&written));
                    self.error(node, message, |d| d);
                } else {
                    return self.drawn(node, name, &written, stated, range);
                }
            }
            Err(QuantityError {
                text,
                problem,
                expected,
                near_miss,
            }) => {
                self.error(node, format!("{name} {problem}: `{text}`"), |diagnostic| {
                    diagnostic.expected(expected).near_miss(near_miss)
                });
            }
        }
        None
    }

    /// The name at `node`, called `name` in messages; reports anything that is none.
    pub fn name(&self, node: &Node, name: &str) -> Option<String> {
        match &node.value {
            Value::Text(text) if !text.trim().is_empty() => return Some(text.clone()),
            Value::Integer(number) => return Some(number.to_string()),
            Value::Text(_) => {
                self.error(node, format!("{name} is empty"), |d| d.expected("a text"))
            }
            Value::Float(_) | Value::Bool(_) => {
                let message = format!("{name} is read as {}, not as a text", node.describe());
                self.error(node, message, |d| {
                    d.expected("quotes around it, such as `\"1.10\"`")
                });
            }
            Value::Null | Value::List(_) | Value::Map(_) => self.not(node, name, "a text"),
        }
        None
    }
}

/// A map of the document, read field by field.
#[derive(Debug)]
pub struct Fields<'r> {
    /// Where mistakes go.
    pub report: &'r Report<'r>,
    /// The map itself.
    pub node: &'r Node,
    /// What it is called in messages: `the trace`.
    pub owner: String,
    entries: &'r [(Key, Node)],
    /// Fields that were reported as the near miss of an unknown one: not to be reported missing too.
    misspelt: Vec<String>,
}

impl<'r> Fields<'r> {
    /// The value of a field, if it is there.
    pub fn get(&self, field: &str) -> Option<&'r Node> {
        self.entries
            .iter()
            .find(|(key, _)| key.text == field)
            .map(|(_, node)| node)
    }

    /// Whether a field is there.
    pub fn has(&self, field: &str) -> bool {
        self.get(field).is_some()
    }

    /// The value of a field that must be there; reports it missing.
    pub fn require(&self, field: &str, expected: &str) -> Option<&'r Node> {
        if self.lacks(&[field]) {
            self.error(format!("{} has no `{field}`", self.owner), expected);
        }
        self.get(field)
    }

    /// Whether none of these fields is there, not even misspelt.
    pub fn lacks(&self, fields: &[&str]) -> bool {
        let is_misspelt = |field: &str| self.misspelt.iter().any(|meant| meant == field);
        !fields
            .iter()
            .any(|field| self.has(field) || is_misspelt(field))
    }

    /// Reports an error of the map as a whole.
    pub fn error(&self, message: impl Into<String>, expected: &str) {
        self.report.error(self.node, message, |diagnostic| {
            diagnostic.expected(expected)
        });
    }

    /// What a field is called in messages: `width of the trace`.
    pub fn called(&self, field: &str) -> String {
        format!("{field} of {}", self.owner)
    }

    /// A quantity, if its field is there and it can be read.
    pub fn quantity(&self, field: &str, dimension: Dimension, range: Range) -> Option<f64> {
        self.report
            .quantity(self.get(field)?, &self.called(field), dimension, range)
    }

    /// A quantity whose field must be there.
    pub fn require_quantity(&self, field: &str, dimension: Dimension, range: Range) -> Option<f64> {
        self.require(field, &dimension.expectation())?;
        self.quantity(field, dimension, range)
    }

    /// A name, if its field is there and it can be read.
    pub fn name(&self, field: &str) -> Option<String> {
        self.report.name(self.get(field)?, &self.called(field))
    }

    /// A name whose field must be there.
    pub fn require_name(&self, field: &str) -> Option<String> {
        self.require(field, "a text")?;
        self.name(field)
    }

    /// One of a few words, if its field is there and holds one of them.
    pub fn choice<T: Copy>(&self, field: &str, words: &[(&str, T)]) -> Option<T> {
        let node = self.get(field)?;
        let known: Vec<&str> = words.iter().map(|(word, _)| *word).collect();
        let Some(written) = node.scalar() else {
            self.report
                .not(node, &self.called(field), &alternatives(&known, "or"));
            return None;
        };
        let found = words.iter().find(|(word, _)| *word == written);
        if found.is_none() {
            let message = format!("{} cannot be {}", self.called(field), node.describe());
            self.report.unknown_word(node, &written, message, &known);
        }
        found.map(|(_, value)| *value)
    }
}

/// `` `a`, `b` or `c` ``, cut where there are many.
pub fn alternatives(words: &[&str], last: &str) -> String {
    const SHOWN: usize = 12;
    let quoted: Vec<String> = words
        .iter()
        .take(SHOWN)
        .map(|word| format!("`{}`", shortened(word)))
        .collect();
    match quoted.as_slice() {
        _ if words.len() > SHOWN => format!("one of {} ...", quoted.join(", ")),
        [rest @ .., end] if !rest.is_empty() => format!("{} {last} {end}", rest.join(", ")),
        _ => quoted.concat(),
    }
}
