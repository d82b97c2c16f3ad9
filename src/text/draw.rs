//! Tolerances of a document as they are met in reading, and one set of values for them.

use std::cell::{Cell, RefCell};

use super::fields::{Range, Report};
use super::quantity::{Stated, Tolerance, shortened};
use super::yaml::{Located, Node};

/// A tolerance at its place in a document.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Noted {
    id: usize,
    /// The tolerance.
    pub tolerance: Tolerance,
}

impl Noted {
    pub(super) fn at(what: &impl Located, tolerance: Tolerance) -> Self {
        let id = what.id();
        Self { id, tolerance }
    }

    /// Whether both stand at the same place.
    pub fn is_at_place_of(&self, other: &Self) -> bool {
        self.id == other.id
    }

    /// The way to it from `root`, in the words of the file: `path item 2 trace width`. `None` where it stands elsewhere.
    pub fn way_from(&self, root: &Node) -> Option<String> {
        root.way_to(self.id).map(|words| words.join(" "))
    }
}

/// A standard normal score for each of some tolerances; the others are at zero, which is nominal.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Draw(Vec<(usize, f64)>);

impl Draw {
    /// The scores of these tolerances, in their order.
    pub fn new(tolerances: &[Noted], scores: &[f64]) -> Self {
        let ids = tolerances.iter().map(|noted| noted.id);
        Self(ids.zip(scores.iter().copied()).collect())
    }

    /// The deviation of what has this tolerance.
    pub(super) fn deviation(&self, noted: &Noted) -> f64 {
        let found = self.0.iter().find(|(id, _)| *id == noted.id);
        found.map_or(0.0, |(_, score)| noted.tolerance.deviation(*score))
    }
}

impl Report<'_> {
    /// For reading parts of a sound document again with other values. Its diagnostics have no place.
    pub fn of_draw(draw: Draw) -> Self {
        Self {
            document: None,
            diagnostics: RefCell::default(),
            tolerances_refused: Cell::new(None),
            noted: RefCell::default(),
            draw,
        }
    }

    /// Whether this is a reading with other values than the nominal ones.
    pub fn is_of_draw(&self) -> bool {
        self.document.is_none()
    }

    /// Reads a part whose quantities may have tolerances.
    pub fn allowing_tolerances<T>(&self, read: impl FnOnce() -> T) -> T {
        self.with_tolerances(None, read)
    }

    /// Reads a part whose quantities may not, and why.
    pub fn refusing_tolerances<T>(&self, why: &'static str, read: impl FnOnce() -> T) -> T {
        self.with_tolerances(Some(why), read)
    }

    fn with_tolerances<T>(&self, refused: Option<&'static str>, read: impl FnOnce() -> T) -> T {
        let before = self.tolerances_refused.replace(refused);
        let value = read();
        self.tolerances_refused.set(before);
        value
    }

    /// Reads a part and gives the tolerances met in it as well, each once.
    pub fn with_noted<T>(&self, read: impl FnOnce() -> T) -> (T, Vec<Noted>) {
        let before = self.noted.take();
        let value = read();
        let mut noted: Vec<Noted> = Vec::new();
        for new in self.noted.replace(before) {
            if !noted.iter().any(|known| known.is_at_place_of(&new)) {
                noted.push(new);
            }
        }
        (value, noted)
    }

    /// Notes tolerances that were met when a part was read which is now used.
    pub fn note(&self, noted: &[Noted]) {
        self.noted.borrow_mut().extend_from_slice(noted);
    }

    /// Notes a tolerance of what stands at `node`, and gives its deviation in this reading.
    pub fn deviation(&self, node: &Node, tolerance: Tolerance) -> f64 {
        let noted = Noted::at(node, tolerance);
        self.note(&[noted]);
        self.draw.deviation(&noted)
    }

    /// The value that a stated quantity has in this reading; reports a tolerance that it cannot have.
    pub(super) fn drawn(
        &self,
        node: &Node,
        name: &str,
        written: &str,
        stated: Stated,
        range: Range,
    ) -> Option<f64> {
        let Some(tolerance) = stated.tolerance else {
            return Some(stated.nominal);
        };
        let written = shortened(written);
        if let Some(why) = self.tolerances_refused.get() {
            let message = format!("{name} cannot have a tolerance: `{written}`");
            self.error(node, message, |d| {
                d.expected(format!("an exact value: {why}"))
            });
            return None;
        }
        let least = stated.nominal - tolerance.farthest();
        if let Some(complaint) = range.complaint(least) {
            let message = format!("{name} {complaint}, which its tolerance allows: `{written}`");
            self.error(node, message, |d| {
                d.expected("a smaller tolerance (a `normal` one reaches to twice what it states)")
            });
            return None;
        }
        Some(stated.nominal + self.deviation(node, tolerance))
    }
}
