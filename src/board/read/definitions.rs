//! What a board file defines by name for its nets to use.

use std::collections::BTreeMap;
use std::sync::Arc;

use crate::text::{Key, Node, Noted, Report, alternatives, near_miss};

/// Something that is defined by name.
pub(super) trait Part: Sized {
    /// What it is called in messages.
    const KIND: &'static str;

    /// Reads what stands under its name.
    fn read(report: &Report, name: &str, node: &Node) -> Option<Self>;
}

/// Parts by name.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Definitions<T> {
    /// Whether the map of them can be read; if not, any name may stand in it.
    is_readable: bool,
    by_name: BTreeMap<String, Definition<T>>,
}

#[derive(Debug, Clone, PartialEq)]
struct Definition<T> {
    /// `None` where it cannot be read.
    part: Option<Arc<T>>,
    /// Where it has tolerances, what to read it from again.
    varied: Option<Varied>,
}

#[derive(Debug, Clone, PartialEq)]
struct Varied {
    node: Node,
    tolerances: Vec<Noted>,
}

/// A definition that cannot be had.
pub(super) enum Unavailable {
    /// Nothing of that name is defined; reported.
    Undefined,
    /// It has mistakes of its own, reported there.
    Unreadable(String),
}

impl<T: Part> Definitions<T> {
    pub(super) fn read(report: &Report, entries: Option<&[(Key, Node)]>) -> Self {
        let definition = |(key, node): &(Key, Node)| {
            let (part, tolerances) = report.with_noted(|| {
                let read = || T::read(report, &key.text, node);
                report.attempt(|| report.allowing_tolerances(read)).ok()
            });
            let varied = (!tolerances.is_empty()).then(|| Varied {
                node: node.clone(),
                tolerances,
            });
            let part = part.map(Arc::new);
            (key.text.clone(), Definition { part, varied })
        };
        Self {
            is_readable: entries.is_some(),
            by_name: entries.unwrap_or_default().iter().map(definition).collect(),
        }
    }

    /// Finds the part named at `node`, with the values of the report's draw, and notes its tolerances.
    pub(super) fn find(
        &self,
        report: &Report,
        node: &Node,
        name: &str,
    ) -> Result<Arc<T>, Unavailable> {
        let kind = T::KIND;
        let unreadable =
            || Unavailable::Unreadable(format!("uses {kind} `{name}`, which cannot be read"));
        match self.by_name.get(name) {
            Some(Definition {
                varied: Some(varied),
                ..
            }) if report.is_of_draw() => T::read(report, name, &varied.node)
                .map(Arc::new)
                .ok_or_else(unreadable),
            Some(Definition {
                part: Some(part),
                varied,
            }) => {
                if let Some(varied) = varied {
                    report.note(&varied.tolerances);
                }
                Ok(Arc::clone(part))
            }
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
            _ => Err(unreadable()),
        }
    }

    /// What the user calls one of their tolerances: the part's name and the way below it.
    pub(super) fn name_of(&self, tolerance: &Noted) -> Option<String> {
        self.by_name.iter().find_map(|(name, definition)| {
            let varied = definition.varied.as_ref()?;
            let way = tolerance.way_from(&varied.node)?;
            Some(format!("{name} {way}"))
        })
    }
}
