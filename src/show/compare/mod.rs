//! What a comparison looks like.

mod csv;
mod json;
mod table;

pub use csv::{comparison_csv, sweep_csv};
pub use json::comparison_json;
pub use table::comparison_table;

pub(super) use json::{VariantEntry, variant_entry};
pub(super) use table::{ASSUMED_THRESHOLDS, push_table};

use super::CheckReport;
use crate::study::compare::{Comparison, Variant};

/// The answer of a comparison, ready to be shown.
#[derive(Debug, Clone)]
pub struct CompareReport {
    /// What stands around it: board, site, limits, remarks. Its nets are the first variants of each net, or of a
    /// sweep.
    pub frame: CheckReport,
    /// The nets with their variants.
    pub comparisons: Vec<Comparison>,
    /// The nets with a sweep.
    pub sweeps: Vec<SweepResult>,
}

/// A sweep of one net, worked out.
#[derive(Debug, Clone)]
pub struct SweepResult {
    /// The net's name.
    pub net: String,
    /// What is swept: `series 0..100 ohm`.
    pub label: String,
    /// The unit of the values.
    pub unit: String,
    /// The values, rising, each with its variant.
    pub points: Vec<(f64, Variant)>,
}
