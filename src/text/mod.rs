//! The border between text and numbers: quantities with units, and files that say where they are wrong.

mod diagnostic;
mod fields;
mod quantity;
mod table;
mod yaml;

pub use diagnostic::{Diagnostic, Place, Position, Severity, SourceLine, near_miss};

pub use fields::{Fields, Range, Report, alternatives};
pub use quantity::{Dimension, QuantityError, parse_quantity};
pub use table::{Cell, RowError, RowStart, Table};
pub use yaml::{Document, Key, Located, Node, Value, parse_yaml};
