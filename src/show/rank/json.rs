//! The JSON of a ranking. Field names are a contract with whoever reads it.

use serde::Serialize;

use super::super::json::{
    LimitEntry, UnusableEntry, WorstEntry, limit_entries, text, unusable_entries, worst_entry,
};
use super::super::{NOTICE, words};
use super::{RankReport, best_change, remedy};
use crate::show::spread::{SpreadEntry, spread_entry};
use crate::study::{Change, RankedNet, SumLevel, SumWorst};

/// The whole report as one JSON object; a number that is not finite is `null`.
pub fn rank_json(report: &RankReport) -> String {
    let ranking = &report.ranking;
    text(&Document {
        notice: NOTICE,
        board: &report.board,
        site: words::site(report.site),
        partial: ranking.is_partial(),
        nets_done: ranking.done,
        nets_to_do: ranking.of,
        likely_fail: ranking.tally.likely_fail,
        marginal: ranking.tally.marginal,
        likely_pass: ranking.tally.likely_pass,
        not_judged: ranking.tally.not_judged,
        limits: limit_entries(&report.limits),
        remarks: &report.remarks,
        nets: ranking.listed.iter().map(net_entry).collect(),
        sum: sum_entry(report),
        unsettled: &ranking.unsettled,
        unusable: unusable_entries(&report.unusable),
    })
}

#[derive(Serialize)]
struct Document<'a> {
    notice: &'static str,
    board: &'a str,
    site: &'static str,
    partial: bool,
    nets_done: usize,
    nets_to_do: usize,
    likely_fail: usize,
    marginal: usize,
    likely_pass: usize,
    not_judged: usize,
    limits: Vec<LimitEntry<'a>>,
    remarks: &'a [String],
    nets: Vec<NetEntry<'a>>,
    sum: SumEntry<'a>,
    unsettled: &'a [String],
    unusable: Vec<UnusableEntry<'a>>,
}

#[derive(Serialize)]
struct NetEntry<'a> {
    place: usize,
    name: &'a str,
    lines: u32,
    clock_hz: f64,
    clock_source: Option<&'a str>,
    layers: &'a [String],
    verdict: &'static str,
    chance_of_failing: Option<f64>,
    sigma_db: f64,
    worst: Option<WorstEntry<'a>>,
    change: Option<ChangeEntry>,
    changes_tried: Vec<ChangeEntry>,
    warnings: &'a [String],
    #[serde(skip_serializing_if = "Option::is_none")]
    spread: Option<SpreadEntry<'a>>,
}

#[derive(Serialize)]
struct ChangeEntry {
    change: String,
    margin_db: f64,
    gain_db: f64,
}

#[derive(Serialize)]
struct SumEntry<'a> {
    worst: Option<SumWorstEntry<'a>>,
    lines: Vec<LineEntry<'a>>,
}

#[derive(Serialize)]
struct SumWorstEntry<'a> {
    verdict: &'static str,
    chance_of_failing: f64,
    sigma_db: f64,
    limit: &'a str,
    frequency_hz: f64,
    distance_m: f64,
    field_dbuv_per_m: f64,
    limit_dbuv_per_m: f64,
    margin_db: f64,
    by_power_margin_db: f64,
    owners: Vec<OwnerEntry<'a>>,
}

#[derive(Serialize)]
struct LineEntry<'a> {
    frequency_hz: f64,
    fields: Vec<LevelEntry<'a>>,
}

#[derive(Serialize)]
struct LevelEntry<'a> {
    distance_m: f64,
    field_dbuv_per_m: f64,
    by_power_dbuv_per_m: f64,
    limit: Option<&'a str>,
    limit_dbuv_per_m: Option<f64>,
    margin_db: Option<f64>,
    nets: usize,
    owners: Vec<OwnerEntry<'a>>,
}

#[derive(Serialize)]
struct OwnerEntry<'a> {
    net: &'a str,
    field_dbuv_per_m: f64,
    relief_db: f64,
}

fn net_entry(net: &RankedNet) -> NetEntry<'_> {
    NetEntry {
        place: net.place,
        name: &net.name,
        lines: net.count,
        clock_hz: net.clock_hz,
        clock_source: net.clock_source.as_deref(),
        layers: &net.layers,
        verdict: net.verdict.as_str(),
        chance_of_failing: net.chance_of_failing,
        sigma_db: net.sigma_db,
        worst: net.worst.as_ref().map(worst_entry),
        change: best_change(&net.changes).map(change_entry),
        changes_tried: net.changes.iter().map(change_entry).collect(),
        warnings: &net.warnings,
        spread: net.spread.as_ref().map(spread_entry),
    }
}

fn change_entry(change: &Change) -> ChangeEntry {
    ChangeEntry {
        change: remedy(change.remedy),
        margin_db: change.margin_db,
        gain_db: change.gain_db,
    }
}

fn sum_entry(report: &RankReport) -> SumEntry<'_> {
    let sum = &report.ranking.sum;
    let lines = sum.lines.iter().map(|line| {
        let levels = line.levels.iter().zip(&report.distances_m);
        LineEntry {
            frequency_hz: line.frequency_hz,
            fields: levels
                .filter_map(|(level, &distance_m)| {
                    Some(level_entry(
                        report,
                        line.frequency_hz,
                        distance_m,
                        level.as_ref()?,
                    ))
                })
                .collect(),
        }
    });
    SumEntry {
        worst: sum.worst.as_ref().map(sum_worst_entry),
        lines: lines.collect(),
    }
}

fn sum_worst_entry(worst: &SumWorst) -> SumWorstEntry<'_> {
    SumWorstEntry {
        verdict: worst.verdict.as_str(),
        chance_of_failing: worst.chance_of_failing,
        sigma_db: worst.sigma_db,
        limit: &worst.limit,
        frequency_hz: worst.frequency_hz,
        distance_m: worst.distance_m,
        field_dbuv_per_m: worst.level.field_dbuv_per_m,
        limit_dbuv_per_m: worst.limit_dbuv_per_m,
        margin_db: worst.margin_db,
        by_power_margin_db: worst.limit_dbuv_per_m - worst.level.by_power_dbuv_per_m,
        owners: owner_entries(&worst.level),
    }
}

fn level_entry<'a>(
    report: &'a RankReport,
    frequency_hz: f64,
    distance_m: f64,
    level: &'a SumLevel,
) -> LevelEntry<'a> {
    let tightest = report.tightest_limit(distance_m, frequency_hz);
    LevelEntry {
        distance_m,
        field_dbuv_per_m: level.field_dbuv_per_m,
        by_power_dbuv_per_m: level.by_power_dbuv_per_m,
        limit: tightest.map(|(limit, _)| limit.title.as_str()),
        limit_dbuv_per_m: tightest.map(|(_, limit)| limit),
        margin_db: tightest.map(|(_, limit)| limit - level.field_dbuv_per_m),
        nets: level.nets,
        owners: owner_entries(level),
    }
}

fn owner_entries(level: &SumLevel) -> Vec<OwnerEntry<'_>> {
    let owners = level.owners.iter();
    owners
        .map(|owner| OwnerEntry {
            net: &owner.net,
            field_dbuv_per_m: owner.field_dbuv_per_m,
            relief_db: owner.relief_db,
        })
        .collect()
}
