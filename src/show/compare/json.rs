//! Comparisons and sweeps as JSON. Field names are a contract with whoever reads it.

use serde::Serialize;

use super::{CompareReport, SweepResult};
use crate::show::json::{NetEntry, document, net_entry};
use crate::study::compare::{Comparison, Reception, TerminationPower, Variant};

/// The whole comparison as one JSON object.
pub fn comparison_json(report: &CompareReport) -> String {
    let compared = report.comparisons.iter().map(comparison_entry);
    let swept = report.sweeps.iter().map(sweep_entry);
    document(&report.frame, compared.chain(swept).collect())
}

#[derive(Serialize)]
struct ComparedEntry<'a> {
    name: &'a str,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    worst_harmonics: Vec<FollowedEntry>,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    variants: Vec<VariantEntry<'a>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    sweep: Option<SweepEntry<'a>>,
}

#[derive(Serialize)]
struct FollowedEntry {
    harmonic: usize,
    frequency_hz: f64,
    distance_m: f64,
    margin_db: f64,
}

/// One variant: what `check` says of it, and what only a comparison asks.
#[derive(Serialize)]
pub(in crate::show) struct VariantEntry<'a> {
    variant: &'a str,
    margin_db: Option<f64>,
    change_db: Vec<Option<f64>>,
    faults: Vec<String>,
    receptions: Vec<ReceptionEntry<'a>>,
    termination: PowerEntry,
    net: NetEntry<'a>,
}

#[derive(Serialize)]
struct ReceptionEntry<'a> {
    name: &'a str,
    low_threshold_v: f64,
    high_threshold_v: f64,
    thresholds_given: bool,
    first_wave_arrival_s: f64,
    first_wave_risen_v: f64,
    first_wave_fallen_v: f64,
    on_first_wave: bool,
    delay_s: Option<f64>,
    added_delay_s: Option<f64>,
    edge_s: Option<f64>,
    ripple_v: f64,
}

#[derive(Serialize)]
struct PowerEntry {
    static_power_w: f64,
    dynamic_power_w: f64,
    idle_power_w: f64,
    hottest_part_w: f64,
    driver_low_current_a: f64,
    driver_high_current_a: f64,
}

#[derive(Serialize)]
struct SweepEntry<'a> {
    label: &'a str,
    unit: &'a str,
    points: Vec<PointEntry>,
}

#[derive(Serialize)]
struct PointEntry {
    value: f64,
    margin_db: Option<f64>,
    overshoot_v: f64,
    settling_s: Option<f64>,
    faults: Vec<String>,
}

fn comparison_entry(comparison: &Comparison) -> ComparedEntry<'_> {
    ComparedEntry {
        name: &comparison.net,
        worst_harmonics: (comparison.followed.iter())
            .map(|followed| FollowedEntry {
                harmonic: followed.harmonic,
                frequency_hz: followed.frequency_hz,
                distance_m: followed.distance_m,
                margin_db: followed.margin_db,
            })
            .collect(),
        variants: (comparison.variants.iter())
            .map(|variant| variant_entry(comparison, variant))
            .collect(),
        sweep: None,
    }
}

/// One variant of a comparison.
pub(in crate::show) fn variant_entry<'a>(
    comparison: &Comparison,
    variant: &'a Variant,
) -> VariantEntry<'a> {
    let followed = comparison.followed.iter();
    VariantEntry {
        variant: &variant.name,
        margin_db: margin_db(variant),
        change_db: followed
            .map(|followed| comparison.change_db(variant, followed))
            .collect(),
        faults: words_of_faults(variant),
        receptions: (variant.receptions.iter().enumerate())
            .map(|(number, reception)| {
                reception_entry(reception, comparison.added_delay_s(variant, number))
            })
            .collect(),
        termination: power_entry(&variant.power),
        net: net_entry(&variant.result),
    }
}

fn reception_entry(reception: &Reception, added_delay_s: Option<f64>) -> ReceptionEntry<'_> {
    ReceptionEntry {
        name: &reception.name,
        low_threshold_v: reception.low_threshold_v,
        high_threshold_v: reception.high_threshold_v,
        thresholds_given: reception.thresholds_given,
        first_wave_arrival_s: reception.first.arrival_s,
        first_wave_risen_v: reception.first.risen_v,
        first_wave_fallen_v: reception.first.fallen_v,
        on_first_wave: reception.on_first_wave,
        delay_s: reception.delay_s,
        added_delay_s,
        edge_s: reception.edge_s,
        ripple_v: reception.ripple_v,
    }
}

fn power_entry(power: &TerminationPower) -> PowerEntry {
    PowerEntry {
        static_power_w: power.static_w,
        dynamic_power_w: power.dynamic_w,
        idle_power_w: power.idle_w,
        hottest_part_w: power.hottest_w,
        driver_low_current_a: power.driver_low_a,
        driver_high_current_a: power.driver_high_a,
    }
}

fn sweep_entry(sweep: &SweepResult) -> ComparedEntry<'_> {
    ComparedEntry {
        name: &sweep.net,
        worst_harmonics: Vec::new(),
        variants: Vec::new(),
        sweep: Some(SweepEntry {
            label: &sweep.label,
            unit: &sweep.unit,
            points: (sweep.points.iter())
                .map(|(value, variant)| PointEntry {
                    value: *value,
                    margin_db: margin_db(variant),
                    overshoot_v: variant.overshoot_v(),
                    settling_s: variant.settling_s(),
                    faults: words_of_faults(variant),
                })
                .collect(),
        }),
    }
}

fn margin_db(variant: &Variant) -> Option<f64> {
    variant.result.worst.as_ref().map(|worst| worst.margin_db)
}

fn words_of_faults(variant: &Variant) -> Vec<String> {
    variant.faults().iter().map(ToString::to_string).collect()
}
