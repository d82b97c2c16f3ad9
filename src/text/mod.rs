//! The border between text and numbers: quantities with units, and files that say where they are wrong.

mod diagnostic;
mod draw;
mod fields;
mod quantity;
mod table;
mod written;
mod yaml;

pub use diagnostic::{Diagnostic, Place, Position, Severity, SourceLine, near_miss};

pub use draw::{Draw, Noted};
pub use fields::{Fields, Range, Report, alternatives};
pub use quantity::{
    Dimension, Distribution, QuantityError, Stated, Tolerance, parse_quantity, parse_stated,
};
pub use table::{Cell, RowError, RowStart, Table};
pub use written::{farads, henries, metres, ohms, seconds, volts};
pub use yaml::{Document, Key, Located, Node, Value, parse_yaml};
