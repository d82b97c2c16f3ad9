//! Comparisons and sweeps as CSV.

use csv::Writer;
use serde::Serialize;

use super::CompareReport;
use crate::show::csv::{IN_MEMORY, with_notice};

#[derive(Serialize)]
struct HarmonicRow<'a> {
    net: &'a str,
    variant: &'a str,
    harmonic: usize,
    frequency_hz: f64,
    distance_m: f64,
    field_dbuv_per_m: Option<f64>,
    change_db: Option<f64>,
    limit: Option<&'a str>,
    limit_dbuv_per_m: Option<f64>,
    margin_db: Option<f64>,
}

/// A row for every net, variant, harmonic and distance, with its change against the first variant and the tightest
/// limit.
pub fn comparison_csv(report: &CompareReport) -> String {
    let mut writer = Writer::from_writer(Vec::new());
    for comparison in &report.comparisons {
        let first = comparison.variants.first();
        for variant in &comparison.variants {
            for harmonic in &variant.result.harmonics {
                for field in &harmonic.fields {
                    let level = field.field_dbuv_per_m;
                    let before = first.and_then(|first| {
                        first.field_dbuv_per_m(harmonic.number, field.distance_m)
                    });
                    let tightest =
                        (report.frame).tightest_limit(field.distance_m, harmonic.frequency_hz);
                    let limit_level = tightest.map(|(_, level)| level);
                    let row = HarmonicRow {
                        net: &comparison.net,
                        variant: &variant.name,
                        harmonic: harmonic.number,
                        frequency_hz: harmonic.frequency_hz,
                        distance_m: field.distance_m,
                        field_dbuv_per_m: level,
                        change_db: level.zip(before).map(|(now, before)| now - before),
                        limit: tightest.map(|(limit, _)| limit.title.as_str()),
                        limit_dbuv_per_m: limit_level,
                        margin_db: limit_level.zip(level).map(|(limit, field)| limit - field),
                    };
                    writer.serialize(row).expect(IN_MEMORY);
                }
            }
        }
    }
    with_notice(writer)
}

#[derive(Serialize)]
struct SweepRow<'a> {
    net: &'a str,
    sweep: &'a str,
    value: f64,
    unit: &'a str,
    margin_db: Option<f64>,
    overshoot_v: f64,
    settling_s: Option<f64>,
    faults: String,
}

/// A row for every net and value of its sweep.
pub fn sweep_csv(report: &CompareReport) -> String {
    let mut writer = Writer::from_writer(Vec::new());
    for sweep in &report.sweeps {
        for (value, variant) in &sweep.points {
            let faults: Vec<String> = variant.faults().iter().map(ToString::to_string).collect();
            let row = SweepRow {
                net: &sweep.net,
                sweep: &sweep.label,
                value: *value,
                unit: &sweep.unit,
                margin_db: variant.result.worst.as_ref().map(|worst| worst.margin_db),
                overshoot_v: variant.overshoot_v(),
                settling_s: variant.settling_s(),
                faults: faults.join("; "),
            };
            writer.serialize(row).expect(IN_MEMORY);
        }
    }
    with_notice(writer)
}
