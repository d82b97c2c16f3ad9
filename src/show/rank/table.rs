//! The shortlist as a table, what all nets make together, and what the reader must know.

use std::fmt::Write as _;

use super::super::spread::push_spreads;
use super::super::table::plain_table;
use super::super::{LABORATORY, NOTICE, words};
use super::{RankReport, SumRow, best_change, remedy};
use crate::limit::LimitAt;
use crate::study::{RankedNet, SumWorst, Tally};

/// Frequencies of the sum that are listed.
const SUM_ROWS: usize = 8;
/// Names that are given of many.
const NAMES: usize = 6;

/// The nets asked for, worst first, and the sum of all, with what the reader must know below.
pub fn rank_table(report: &RankReport) -> String {
    let ranking = &report.ranking;
    let mut text = format!("{}\n\n", report.board);
    push_head(&mut text, report);
    if !ranking.listed.is_empty() {
        push_table(&mut text, &ranking.listed);
    }
    let spreads = ranking.listed.iter().filter_map(|net| {
        let nominal_db = net.worst.as_ref().map(|worst| worst.margin_db);
        Some((net.name.as_str(), nominal_db, net.spread.as_ref()?))
    });
    push_spreads(&mut text, spreads);
    if let Some(worst) = &ranking.sum.worst {
        push_sum(&mut text, report, worst);
    }
    push_left_out(&mut text, report);
    push_warnings(&mut text, report);
    push_foot(&mut text, report);
    text
}

fn push_head(text: &mut String, report: &RankReport) {
    let ranking = &report.ranking;
    let Tally {
        likely_fail,
        marginal,
        likely_pass,
        not_judged,
    } = ranking.tally;
    if ranking.done < ranking.of {
        let _ = writeln!(
            text,
            "PARTIAL: stopped after {} of {} nets. What follows knows of these alone.",
            ranking.done, ranking.of
        );
    } else if ranking.is_partial() {
        text.push_str("PARTIAL: stopped before every change was tried.\n");
    }
    let _ = write!(
        text,
        "{}: {likely_fail} likely fail, {marginal} marginal, {likely_pass} likely pass",
        counted(ranking.done, "net")
    );
    if not_judged > 0 {
        let _ = write!(text, ", {not_judged} not judged");
    }
    text.push_str(".\n");
    if ranking.kept < ranking.done {
        let _ = writeln!(text, "{} as asked for.", are(ranking.kept, "net"));
    }
    if ranking.listed.len() < ranking.kept {
        let _ = writeln!(
            text,
            "The worst {} of them (--top tells how many):",
            ranking.listed.len()
        );
    }
    text.push('\n');
}

fn counted(count: usize, what: &str) -> String {
    if count == 1 {
        format!("1 {what}")
    } else {
        format!("{count} {what}s")
    }
}

fn are(count: usize, what: &str) -> String {
    let verb = if count == 1 { "is" } else { "are" };
    format!("{} {verb}", counted(count, what))
}

fn push_table(text: &mut String, nets: &[RankedNet]) {
    let header = [
        "place",
        "net",
        "lines",
        "verdict",
        "margin\ndB",
        "chance of\nfailing",
        "frequency",
        "distance",
        "mainly\nfrom",
        "limit line",
        "the change that would help most",
    ];
    let mut table = plain_table(&header, &[0, 2, 4, 5, 6, 7]);
    for net in nets {
        let mut cells = vec![
            net.place.to_string(),
            net.name.clone(),
            net.count.to_string(),
            net.verdict.as_str().to_owned(),
        ];
        match &net.worst {
            Some(worst) => cells.extend([
                format!("{:.1}", worst.margin_db),
                net.chance_of_failing.map_or("-".into(), words::chance),
                words::frequency(worst.frequency_hz),
                words::distance(worst.distance_m),
                worst.mechanism.as_str().to_owned(),
                worst.limit.clone(),
            ]),
            None => cells.extend(std::iter::repeat_n("-".to_owned(), 6)),
        }
        cells.push(best_change(&net.changes).map_or("-".into(), |change| {
            format!("{}: {:+.1} dB", remedy(change.remedy), change.gain_db)
        }));
        table.add_row(cells);
    }
    push_lines(text, &table);
}

fn push_lines(text: &mut String, table: &comfy_table::Table) {
    for line in table.lines() {
        text.push_str(line.trim_end());
        text.push('\n');
    }
}

fn push_sum(text: &mut String, report: &RankReport, worst: &SumWorst) {
    let by_power_db = worst.limit_dbuv_per_m - worst.level.by_power_dbuv_per_m;
    let _ = writeln!(
        text,
        "\nAll nets together: {} ({}), margin {:.1} dB at {} and {}, {}; {by_power_db:.1} dB there if no two nets kept step.",
        worst.verdict,
        words::chance(worst.chance_of_failing),
        worst.margin_db,
        words::frequency(worst.frequency_hz),
        words::distance(worst.distance_m),
        worst.limit,
    );
    text.push_str(
        "The worst case: fields of nets of one clock source add up, different sources add by power.\n\n",
    );
    let header = [
        "frequency",
        "margin\ndB",
        "if not in\nstep dB",
        "sum\ndBµV/m",
        "limit\ndBµV/m",
        "distance",
        "nets",
        "biggest owners, and what the sum falls by without each",
    ];
    let mut table = plain_table(&header, &[0, 1, 2, 3, 4, 5, 6]);
    for row in report.worst_sum_rows().iter().take(SUM_ROWS) {
        table.add_row(vec![
            words::frequency(row.frequency_hz),
            format!("{:.1}", row.margin_db()),
            format!("{:.1}", row.by_power_margin_db()),
            format!("{:.1}", row.level.field_dbuv_per_m),
            format!("{:.1}", row.limit_dbuv_per_m),
            words::distance(row.distance_m),
            row.level.nets.to_string(),
            owners(row),
        ]);
    }
    push_lines(text, &table);
}

/// The owners of a line with what the sum falls by without each.
fn owners(row: &SumRow) -> String {
    let owners = row.named_owners();
    let words: Vec<String> = owners
        .map(|owner| match row.level.nets {
            1 => format!("{} alone", owner.net),
            _ => format!("{} {:.1} dB", owner.net, owner.relief_db),
        })
        .collect();
    words.join(", ")
}

/// Some names, and how many more there are.
fn names<'a>(names: impl ExactSizeIterator<Item = &'a str>) -> String {
    let count = names.len();
    let mut text = names.take(NAMES).collect::<Vec<_>>().join(", ");
    if count > NAMES {
        let _ = write!(text, " and {} more", count - NAMES);
    }
    text
}

fn push_left_out(text: &mut String, report: &RankReport) {
    if !report.unusable.is_empty() {
        text.push_str("\nNot worked out:\n");
        for net in &report.unusable {
            let _ = writeln!(text, "  {}: {}", net.name, net.reason);
        }
    }
    let unsettled = &report.ranking.unsettled;
    if !unsettled.is_empty() {
        text.push_str("\nDid not settle, so that their figures may be off:\n");
        for name in unsettled {
            let _ = writeln!(text, "  {name}");
        }
    }
}

/// The remarks on the board, and every warning of a listed net once with the nets it is about.
fn push_warnings(text: &mut String, report: &RankReport) {
    let mut warnings: Vec<(&str, Vec<&str>)> = Vec::new();
    for net in &report.ranking.listed {
        for warning in &net.warnings {
            match warnings.iter_mut().find(|(known, _)| known == warning) {
                Some((_, names)) if names.contains(&net.name.as_str()) => {}
                Some((_, names)) => names.push(&net.name),
                None => warnings.push((warning, vec![&net.name])),
            }
        }
    }
    if warnings.is_empty() && report.remarks.is_empty() {
        return;
    }
    text.push_str("\nMind:\n");
    for remark in &report.remarks {
        let _ = writeln!(text, "  {remark}");
    }
    for (warning, of) in warnings {
        let _ = writeln!(text, "  {}: {warning}", names(of.into_iter()));
    }
}

fn push_foot(text: &mut String, report: &RankReport) {
    text.push('\n');
    for note in report.limits.iter().filter_map(LimitAt::note) {
        let _ = writeln!(text, "{note}");
    }
    let _ = writeln!(
        text,
        "Site: {}. margin = limit - field; chance of failing: likely fail from 50 %, marginal from 5 %, likely pass below.",
        words::site(report.site)
    );
    if report.ranking.tally.not_judged > 0 {
        text.push_str(
            "not judged: no limit covers a harmonic of the net, or no part of it radiates.\n",
        );
    }
    text.push_str(
        "Changes are tried one at a time on nets that do not likely pass: check the timing before taking one.\n",
    );
    let _ = writeln!(text, "This is a {NOTICE}; {LABORATORY}.");
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::show::{rank_json, ranking_csv, samples};

    #[test]
    fn the_table_tells_nets_sum_and_what_was_left_out() {
        let text = rank_table(&samples::rank_report());
        for words in [
            "7 nets: 1 likely fail, 0 marginal, 6 likely pass.",
            "5 nets are as asked for.",
            "The worst 2 of them",
            "56 ohm in series at the driver: +9.3 dB",
            "All nets together: likely fail (86 %), margin -6.5 dB at 144 MHz and 3 m",
            "CAM_D 4.0 dB, B 0.5 dB",
            "nets.csv, row 3: the net has no `name`",
            "Did not settle",
            NOTICE,
        ] {
            assert!(text.contains(words), "{words}\n{text}");
        }
        assert!(!text.contains("PARTIAL"));
    }

    #[test]
    fn every_form_of_a_partial_ranking_says_so() {
        let mut report = samples::rank_report();
        report.ranking.of = 900;
        assert!(rank_table(&report).contains("PARTIAL: stopped after 7 of 900 nets."));
        assert!(rank_json(&report).contains("\"partial\": true"));
        let csv = ranking_csv(&report);
        let row = csv.lines().nth(1).expect("a row");
        assert!(
            row.starts_with("1,CAM_D,16,") && row.ends_with(",true"),
            "{row}"
        );
        assert!(csv.ends_with(&format!("# notice: {NOTICE}\n")));
    }
}
