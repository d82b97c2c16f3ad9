//! Comparisons and sweeps as tables.

use std::fmt::Write as _;

use comfy_table::Table;

use super::{CompareReport, SweepResult};
use crate::show::table::{plain_table, push_foot, push_unusable, push_warnings};
use crate::show::words;
use crate::study::compare::{Comparison, Variant};

/// The variants of every net, and what the reader must know below.
pub fn comparison_table(report: &CompareReport) -> String {
    let mut text = format!("{}\n", report.frame.board);
    for comparison in &report.comparisons {
        push_comparison(&mut text, comparison);
    }
    for sweep in &report.sweeps {
        push_sweep(&mut text, sweep);
    }
    push_thresholds(&mut text, report);
    push_unusable(&mut text, &report.frame);
    push_warnings(&mut text, &report.frame);
    push_foot(&mut text, &report.frame);
    text
}

fn push_comparison(text: &mut String, comparison: &Comparison) {
    let Some(first) = comparison.variants.first() else {
        return;
    };
    let clock = words::frequency(first.result.clock_hz);
    let _ = writeln!(text, "\n{}, clock {clock}", comparison.net);
    push_table(text, &margins(comparison));
    text.push_str("\nAt the receivers:\n");
    push_table(text, &receivers(comparison));
    text.push_str("\nDriver and terminating parts:\n");
    push_table(text, &powers(comparison));
    let mut lines = Vec::new();
    for variant in &comparison.variants {
        lines.extend(faults(variant));
    }
    if !lines.is_empty() {
        text.push_str("\nNot safe:\n");
        text.push_str(&lines.concat());
    }
}

/// What is wrong with a variant, a line each.
pub(in crate::show) fn faults(variant: &Variant) -> Vec<String> {
    let faults = variant.faults();
    let line = |fault| format!("  {}: {fault}\n", variant.name);
    faults.iter().map(line).collect()
}

fn margins(comparison: &Comparison) -> Table {
    let mut header: Vec<String> = [
        "variant",
        "verdict",
        "margin\ndB",
        "chance of\nfailing",
        "ruled by",
        "limit line",
    ]
    .map(String::from)
    .into();
    for (place, followed) in comparison.followed.iter().enumerate() {
        let above = if place == 0 { "change dB\nat " } else { "\n" };
        header.push(format!(
            "{above}{}",
            words::frequency(followed.frequency_hz)
        ));
    }
    let header: Vec<&str> = header.iter().map(String::as_str).collect();
    let mut table = plain_table(&header, &[2, 3, 6, 7, 8]);
    for (place, variant) in comparison.variants.iter().enumerate() {
        let result = &variant.result;
        let mut row = vec![variant.name.clone(), result.verdict.as_str().into()];
        match &result.worst {
            Some(worst) => row.extend([
                format!("{:.1}", worst.margin_db),
                result.chance_of_failing.map_or("-".into(), words::chance),
                format!(
                    "{} ({}) at {}",
                    words::frequency(worst.frequency_hz),
                    worst.harmonic,
                    words::distance(worst.distance_m)
                ),
                worst.limit.clone(),
            ]),
            None => row.extend(std::iter::repeat_n("-".to_string(), 4)),
        }
        for followed in &comparison.followed {
            let change = comparison
                .change_db(variant, followed)
                .filter(|_| place > 0);
            row.push(change.map_or("-".into(), |db| format!("{db:+.1}")));
        }
        table.add_row(row);
    }
    table
}

fn receivers(comparison: &Comparison) -> Table {
    let header = [
        "variant",
        "receiver",
        "first wave\nV up, down",
        "at rest\nV low, high",
        "over-\nshoot V",
        "under-\nshoot V",
        "settles\nns",
        "edge\nns",
        "delay\nns",
        "added\nns",
        "clamps\nmA",
    ];
    let mut table = plain_table(&header, &[2, 3, 4, 5, 6, 7, 8, 9, 10]);
    for (place, variant) in comparison.variants.iter().enumerate() {
        let receivers = variant
            .receptions
            .iter()
            .zip(&variant.result.signal.receivers);
        for (number, (reception, signal)) in receivers.enumerate() {
            let added_s = comparison
                .added_delay_s(variant, number)
                .filter(|_| place > 0);
            table.add_row(vec![
                if number == 0 {
                    variant.name.clone()
                } else {
                    String::new()
                },
                reception.name.clone(),
                format!(
                    "{:.2}, {:.2}",
                    reception.first.risen_v,
                    plain_zero(reception.first.fallen_v, 2)
                ),
                format!(
                    "{:.2}, {:.2}",
                    plain_zero(signal.rest_low_v, 2),
                    signal.rest_high_v
                ),
                format!("{:.2}", signal.overshoot_v),
                format!("{:.2}", signal.undershoot_v),
                nanoseconds(signal.settling_s),
                nanoseconds(reception.edge_s),
                nanoseconds(reception.delay_s),
                added_s.map_or("-".into(), |s| format!("{:+.2}", plain_zero(s * 1e9, 2))),
                format!("{:.1}", signal.clamp_peak_a() * 1e3),
            ]);
        }
    }
    table
}

fn powers(comparison: &Comparison) -> Table {
    let header = [
        "variant",
        "static\nmW",
        "dynamic\nmW",
        "hottest\npart mW",
        "driver at rest\nmA low, high",
        "driver\npeak mA",
    ];
    let mut table = plain_table(&header, &[1, 2, 3, 4, 5]);
    for variant in &comparison.variants {
        let power = &variant.power;
        let milli = |value: f64| format!("{:.1}", plain_zero(value * 1e3, 1));
        table.add_row(vec![
            variant.name.clone(),
            milli(power.static_w),
            milli(power.dynamic_w),
            milli(power.hottest_w),
            format!(
                "{}, {}",
                milli(power.driver_low_a),
                milli(power.driver_high_a)
            ),
            milli(variant.result.signal.driver_peak_current_a),
        ]);
    }
    table
}

fn push_sweep(text: &mut String, sweep: &SweepResult) {
    let _ = writeln!(text, "\n{}, {}", sweep.net, sweep.label);
    let value = format!("value\n{}", sweep.unit);
    let header = [
        value.as_str(),
        "margin\ndB",
        "overshoot\nV",
        "settles\nns",
        "not safe",
    ];
    let mut table = plain_table(&header, &[0, 1, 2, 3]);
    for (value, variant) in &sweep.points {
        let faults = variant.faults();
        table.add_row(vec![
            words::trimmed(*value, 3),
            (variant.result.worst.as_ref()).map_or("-".into(), |w| format!("{:.1}", w.margin_db)),
            format!("{:.2}", variant.overshoot_v()),
            nanoseconds(variant.settling_s()),
            faults.first().map_or(String::new(), ToString::to_string),
        ]);
    }
    push_table(text, &table);
}

/// Says which receivers are held to thresholds that their part does not give.
fn push_thresholds(text: &mut String, report: &CompareReport) {
    let compared = report.comparisons.iter().filter_map(|c| c.variants.first());
    let swept = report
        .sweeps
        .iter()
        .filter_map(|sweep| Some(&sweep.points.first()?.1));
    let assumed = compared
        .chain(swept)
        .flat_map(|variant| &variant.receptions)
        .any(|reception| !reception.thresholds_given);
    if assumed {
        text.push_str(ASSUMED_THRESHOLDS);
    }
}

/// What has to be said where thresholds are assumed.
pub(in crate::show) const ASSUMED_THRESHOLDS: &str = "\nReceivers whose part gives no `low_threshold` and `high_threshold` are held to 30 % and 70 % of the driver's swing.\n";

pub(in crate::show) fn push_table(text: &mut String, table: &Table) {
    for line in table.lines() {
        text.push_str(line.trim_end());
        text.push('\n');
    }
}

fn nanoseconds(time_s: Option<f64>) -> String {
    time_s.map_or("never".into(), |s| format!("{:.2}", s * 1e9))
}

/// A value that would be shown as minus zero, as zero.
fn plain_zero(value: f64, decimals: i32) -> f64 {
    if value.abs() < 0.5 * 10f64.powi(-decimals) {
        0.0
    } else {
        value
    }
}
