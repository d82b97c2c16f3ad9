//! The remedies as JSON. Field names are a contract with whoever reads it.

use serde::Serialize;

use super::csv::outcome;
use super::{RemedyReport, cost, lever};
use crate::show::compare::{VariantEntry, variant_entry};
use crate::show::json::document;
use crate::study::compare::Comparison;
use crate::study::remedy::{Attempt, Lever, Outcome, Remedied};

/// The whole search as one JSON object.
pub fn remedy_json(report: &RemedyReport) -> String {
    // What an entry of a variant borrows from must outlive it.
    let comparisons: Vec<Comparison> = report.nets.iter().map(before_and_after).collect();
    let nets = report.nets.iter().zip(&comparisons);
    let entries = nets.map(|(net, comparison)| net_entry(report, net, comparison));
    document(&report.frame, entries.collect())
}

#[derive(Serialize)]
struct NetEntry<'a> {
    name: &'a str,
    outcome: &'static str,
    wanted_margin_db: f64,
    remedy: Option<RemedyEntry>,
    before: VariantEntry<'a>,
    after: Option<VariantEntry<'a>>,
    attempts: Vec<AttemptEntry>,
    levers: Vec<LeverEntry>,
}

#[derive(Serialize)]
struct RemedyEntry {
    change: String,
    takes: String,
    margin_db: f64,
    range_ohm: Option<[f64; 2]>,
}

#[derive(Serialize)]
struct AttemptEntry {
    change: String,
    margin_db: f64,
    faults: Vec<String>,
}

#[derive(Serialize)]
struct LeverEntry {
    change: String,
    /// `null` where nothing is left that could be estimated.
    margin_db: Option<f64>,
    suffices: bool,
    faults: Vec<String>,
}

fn before_and_after(net: &Remedied) -> Comparison {
    let mut variants = vec![net.before.clone()];
    match &net.outcome {
        Outcome::Found(remedy) => variants.push(remedy.after.clone()),
        Outcome::Hopeless(hopeless) => {
            variants.extend(
                hopeless
                    .best
                    .iter()
                    .map(|(_, variant)| variant.as_ref().clone()),
            );
        }
        Outcome::LeftAlone | Outcome::NotJudged => {}
    }
    Comparison {
        net: net.before.net.name.clone(),
        variants,
        followed: Vec::new(),
    }
}

fn net_entry<'a>(
    report: &RemedyReport,
    net: &'a Remedied,
    comparison: &'a Comparison,
) -> NetEntry<'a> {
    let (remedy, attempts, levers): (_, &[Attempt], &[Lever]) = match &net.outcome {
        Outcome::Found(remedy) => (Some(remedy), &remedy.cheaper, &[]),
        Outcome::Hopeless(hopeless) => (None, &hopeless.attempts, &hopeless.levers),
        Outcome::LeftAlone | Outcome::NotJudged => (None, &[], &[]),
    };
    let entry = |place: usize| {
        let variant = comparison.variants.get(place)?;
        Some(variant_entry(comparison, variant))
    };
    NetEntry {
        name: &net.before.net.name,
        outcome: outcome(&net.outcome),
        wanted_margin_db: report.goal.margin_db,
        remedy: remedy.map(|remedy| RemedyEntry {
            change: remedy.tried.to_string(),
            takes: cost(remedy.cost),
            margin_db: remedy.after.margin_db(),
            range_ohm: remedy.range_ohm,
        }),
        before: variant_entry(comparison, &comparison.variants[0]),
        after: entry(1),
        attempts: (attempts.iter())
            .map(|attempt| AttemptEntry {
                change: attempt.tried.to_string(),
                margin_db: attempt.margin_db,
                faults: attempt.faults.iter().map(ToString::to_string).collect(),
            })
            .collect(),
        levers: (levers.iter())
            .map(|found| LeverEntry {
                change: lever(found),
                margin_db: Some(found.reach.margin_db).filter(|margin| margin.is_finite()),
                suffices: found.reach.suffices,
                faults: found.faults.iter().map(ToString::to_string).collect(),
            })
            .collect(),
    }
}
