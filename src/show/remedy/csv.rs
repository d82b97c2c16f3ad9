//! The remedies as CSV: what to order and where it goes.

use csv::Writer;
use serde::Serialize;

use super::table::added_delay_ns;
use super::{RemedyReport, cost};
use crate::show::csv::{IN_MEMORY, with_notice};
use crate::study::remedy::Outcome;

#[derive(Serialize)]
struct Row<'a> {
    net: &'a str,
    outcome: &'static str,
    remedy: Option<String>,
    takes: Option<String>,
    margin_before_db: Option<f64>,
    margin_after_db: Option<f64>,
    verdict_after: Option<&'static str>,
    parts_power_w: Option<f64>,
    added_delay_s: Option<f64>,
}

/// A row for every net.
pub fn remedy_csv(report: &RemedyReport) -> String {
    let mut writer = Writer::from_writer(Vec::new());
    for net in &report.nets {
        let remedy = match &net.outcome {
            Outcome::Found(remedy) => Some(remedy),
            _ => None,
        };
        let before = &net.before;
        let row = Row {
            net: &before.net.name,
            outcome: outcome(&net.outcome),
            remedy: remedy.map(|remedy| remedy.tried.to_string()),
            takes: remedy.map(|remedy| cost(remedy.cost)),
            margin_before_db: before.result.worst.as_ref().map(|worst| worst.margin_db),
            margin_after_db: remedy.map(|remedy| remedy.after.margin_db()),
            verdict_after: remedy.map(|remedy| remedy.after.result.verdict.as_str()),
            parts_power_w: remedy.map(|r| r.after.power.static_w + r.after.power.dynamic_w),
            added_delay_s: remedy
                .and_then(|remedy| added_delay_ns(before, &remedy.after))
                .map(|ns| ns * 1e-9),
        };
        writer.serialize(row).expect(IN_MEMORY);
    }
    with_notice(writer)
}

/// What became of a net, in a word or two.
pub(super) fn outcome(outcome: &Outcome) -> &'static str {
    match outcome {
        Outcome::LeftAlone => "left alone",
        Outcome::NotJudged => "not judged",
        Outcome::Found(_) => "found",
        Outcome::Hopeless(_) => "none suffices",
    }
}
