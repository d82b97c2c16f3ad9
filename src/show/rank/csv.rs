//! The shortlist as CSV.

use csv::Writer;
use serde::Serialize;

use super::super::csv::{IN_MEMORY, with_notice};
use super::{RankReport, best_change, remedy};

#[derive(Serialize)]
struct Row<'a> {
    place: usize,
    net: &'a str,
    lines: u32,
    clock_hz: f64,
    clock_source: Option<&'a str>,
    layers: String,
    verdict: &'static str,
    chance_of_failing: Option<f64>,
    margin_db: Option<f64>,
    sigma_db: f64,
    frequency_hz: Option<f64>,
    harmonic: Option<usize>,
    distance_m: Option<f64>,
    field_dbuv_per_m: Option<f64>,
    limit_dbuv_per_m: Option<f64>,
    limit: Option<&'a str>,
    mainly: Option<&'static str>,
    change: Option<String>,
    change_gain_db: Option<f64>,
    partial: bool,
}

/// A row for every listed net, worst first.
pub fn ranking_csv(report: &RankReport) -> String {
    let mut writer = Writer::from_writer(Vec::new());
    for net in &report.ranking.listed {
        let worst = net.worst.as_ref();
        let change = best_change(&net.changes);
        let row = Row {
            place: net.place,
            net: &net.name,
            lines: net.count,
            clock_hz: net.clock_hz,
            clock_source: net.clock_source.as_deref(),
            layers: net.layers.join(" "),
            verdict: net.verdict.as_str(),
            chance_of_failing: net.chance_of_failing,
            margin_db: worst.map(|worst| worst.margin_db),
            sigma_db: net.sigma_db,
            frequency_hz: worst.map(|worst| worst.frequency_hz),
            harmonic: worst.map(|worst| worst.harmonic),
            distance_m: worst.map(|worst| worst.distance_m),
            field_dbuv_per_m: worst.map(|worst| worst.field_dbuv_per_m),
            limit_dbuv_per_m: worst.map(|worst| worst.limit_dbuv_per_m),
            limit: worst.map(|worst| worst.limit.as_str()),
            mainly: worst.map(|worst| worst.mechanism.as_str()),
            change: change.map(|change| remedy(change.remedy)),
            change_gain_db: change.map(|change| change.gain_db),
            partial: report.ranking.is_partial(),
        };
        writer.serialize(row).expect(IN_MEMORY);
    }
    with_notice(writer)
}
