//! What the search for remedies looks like.

mod csv;
mod json;
mod table;

pub use csv::remedy_csv;
pub use json::remedy_json;
pub use table::remedy_table;

use super::CheckReport;
use crate::study::change::Change;
use crate::study::remedy::{Cost, Goal, Lever, LeverChange, Remedied};
use crate::text::{metres, ohms};

/// The answer of a search for remedies, ready to be shown.
#[derive(Debug, Clone)]
pub struct RemedyReport {
    /// What stands around it. Its nets are as they are on the board.
    pub frame: CheckReport,
    /// What was asked for.
    pub goal: Goal,
    /// What became of every net.
    pub nets: Vec<Remedied>,
}

/// What a remedy costs, in words.
fn cost(cost: Cost) -> String {
    match cost {
        Cost::Setting => "no part".into(),
        Cost::OnePart => "one resistor".into(),
        Cost::Parts(count) => format!("{count} parts"),
        Cost::Power(1) => "one resistor, power".into(),
        Cost::Power(count) => format!("{count} parts, power"),
    }
}

/// What a lever changes, from what to what: `height 305 um (12 mil) -> 130 um (5.1 mil)`.
pub(super) fn lever(lever: &Lever) -> String {
    let tried = match &lever.tried {
        LeverChange::NoCables => return "no cable on the board".into(),
        LeverChange::Try(tried) => tried,
    };
    match (tried.changes.first(), lever.now) {
        (Some(Change::Height(to_m)), Some(now_m)) => {
            format!("height {} -> {}", length(now_m), length(*to_m))
        }
        (Some(Change::Length(to_m)), Some(now_m)) => {
            format!("length {} -> {}", length(now_m), length(*to_m))
        }
        (Some(Change::Rise(to_s)), Some(now_s)) => {
            let ns = |s: f64| super::words::trimmed(s * 1e9, 3);
            format!("rise {} -> {} ns", ns(now_s), ns(*to_s))
        }
        _ => tried.to_string(),
    }
}

/// A length in the units of both worlds.
fn length(length_m: f64) -> String {
    let mil = length_m / 25.4e-6;
    let inch = if mil < 500.0 {
        format!("{} mil", super::words::trimmed(mil, 1))
    } else {
        format!("{} in", super::words::trimmed(mil / 1000.0, 2))
    };
    format!("{} ({inch})", metres((length_m * 1e7).round() / 1e7))
}

/// The values of the first resistor that do as well.
fn range([from_ohm, to_ohm]: [f64; 2]) -> String {
    format!("{} to {}", ohms(from_ohm), ohms(to_ohm))
}
