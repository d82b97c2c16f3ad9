//! The table a tired person can read. Styled with ANSI codes; the front strips them where they do not belong.

use std::fmt::Write as _;

use anstyle::{AnsiColor, Style};
use comfy_table::{CellAlignment, Table, presets};

use super::findings::findings;
use super::spread::push_spreads;
use super::{CheckReport, LABORATORY, NOTICE, words};
use crate::limit::LimitAt;
use crate::study::{NetResult, Verdict};

const HEADER: [&str; 11] = [
    "net",
    "verdict",
    "margin\ndB",
    "chance of\nfailing",
    "frequency",
    "harmonic",
    "field\ndBµV/m",
    "limit\ndBµV/m",
    "distance",
    "mainly\nfrom",
    "limit line",
];

/// The nets of a check, worst margin first, with what the reader must know below.
pub fn check_table(report: &CheckReport) -> String {
    let mut nets: Vec<&NetResult> = report.nets.iter().collect();
    nets.sort_by(|a, b| margin(a).total_cmp(&margin(b)));

    let mut table = plain_table(&HEADER, &[2, 3, 4, 5, 6, 7, 8]);
    for net in &nets {
        table.add_row(row(net));
    }

    let mut text = format!("{}\n\n", report.board);
    for (index, line) in table.lines().enumerate() {
        let line = line.trim_end();
        // The header takes two lines.
        match index.checked_sub(2).and_then(|row| nets.get(row)) {
            Some(net) => text.push_str(&with_styled_verdict(line, net)),
            None => text.push_str(line),
        }
        text.push('\n');
    }
    let spreads = nets.iter().filter_map(|net| {
        let nominal_db = net.worst.as_ref().map(|worst| worst.margin_db);
        Some((net.name.as_str(), nominal_db, net.spread.as_ref()?))
    });
    push_spreads(&mut text, spreads);
    push_aims(&mut text, &nets);
    push_findings(&mut text, &nets);
    push_unusable(&mut text, report);
    push_warnings(&mut text, report);
    push_foot(&mut text, report);
    text
}

/// How each net's settled waveform was reached.
pub fn march_table(nets: &[NetResult]) -> String {
    let header = [
        "net",
        "steps per\nperiod",
        "periods\nmarched",
        "residual\n(of swing)",
        "settled",
    ];
    let mut table = plain_table(&header, &[1, 2, 3]);
    for net in nets {
        table.add_row(vec![
            net.name.clone(),
            net.march.steps_per_period.to_string(),
            net.march.periods.to_string(),
            format!("{:.1e}", net.march.residual),
            if net.march.settled { "yes" } else { "no" }.to_string(),
        ]);
    }
    table.lines().fold(String::new(), |mut text, line| {
        text.push_str(line.trim_end());
        text.push('\n');
        text
    })
}

/// A table without lines, two blanks between columns, and some columns set to the right.
pub(super) fn plain_table(header: &[&str], right_aligned: &[usize]) -> Table {
    let mut table = Table::new();
    table.load_preset(presets::NOTHING).set_header(header);
    for (index, column) in table.column_iter_mut().enumerate() {
        column.set_padding((0, 2));
        if right_aligned.contains(&index) {
            column.set_cell_alignment(CellAlignment::Right);
        }
    }
    table
}

fn margin(net: &NetResult) -> f64 {
    net.worst
        .as_ref()
        .map_or(f64::INFINITY, |worst| worst.margin_db)
}

fn row(net: &NetResult) -> Vec<String> {
    let mut cells = vec![net.name.clone(), net.verdict.as_str().to_string()];
    match &net.worst {
        Some(worst) => cells.extend([
            format!("{:.1}", worst.margin_db),
            net.chance_of_failing.map_or("-".into(), words::chance),
            words::frequency(worst.frequency_hz),
            worst.harmonic.to_string(),
            format!("{:.1}", worst.field_dbuv_per_m),
            format!("{:.1}", worst.limit_dbuv_per_m),
            words::distance(worst.distance_m),
            worst.mechanism.as_str().to_string(),
            worst.limit.clone(),
        ]),
        None => cells.extend(std::iter::repeat_n("-".to_string(), HEADER.len() - 2)),
    }
    cells
}

/// Colour only repeats what the verdict's word says.
fn with_styled_verdict(line: &str, net: &NetResult) -> String {
    let style = match net.verdict {
        Verdict::LikelyFail => Style::new().bold().fg_color(Some(AnsiColor::Red.into())),
        Verdict::Marginal => Style::new().fg_color(Some(AnsiColor::Yellow.into())),
        Verdict::LikelyPass => Style::new().fg_color(Some(AnsiColor::Green.into())),
        Verdict::NotJudged => Style::new().dimmed(),
    };
    let word = net.verdict.as_str();
    match line.strip_prefix(&net.name) {
        Some(rest) => {
            let styled = format!("{style}{word}{style:#}");
            format!("{}{}", net.name, rest.replacen(word, &styled, 1))
        }
        None => line.to_string(),
    }
}

/// Where the antenna stands for the worst reading of each net that does not likely pass, so that the laboratory can go
/// there first.
fn push_aims(text: &mut String, nets: &[&NetResult]) {
    let failing = nets.iter().filter(|net| net.verdict != Verdict::LikelyPass);
    let aims: Vec<String> = failing
        .filter_map(|net| {
            let worst = net.worst.as_ref()?;
            let aim = words::aim(worst.aim.as_ref()?);
            let (frequency, distance) = (
                words::frequency(worst.frequency_hz),
                words::distance(worst.distance_m),
            );
            Some(format!(
                "  {}: {frequency} at {distance}: {aim}\n",
                net.name
            ))
        })
        .collect();
    if !aims.is_empty() {
        text.push_str(
            "\nWhere the antenna reads the worst (its angle from the board's x axis, counter-clockwise from above):\n",
        );
        text.extend(aims);
    }
}

/// What the ringing does to the parts, where it is worth a word.
fn push_findings(text: &mut String, nets: &[&NetResult]) {
    let found: Vec<(&str, Vec<String>)> = nets
        .iter()
        .map(|net| (net.name.as_str(), findings(&net.signal)))
        .filter(|(_, sentences)| !sentences.is_empty())
        .collect();
    if found.is_empty() {
        return;
    }
    text.push_str("\nWhat the ringing does to the parts:\n");
    for (name, sentences) in found {
        for sentence in sentences {
            let _ = writeln!(text, "  {name}: {sentence}");
        }
    }
}

pub(super) fn push_unusable(text: &mut String, report: &CheckReport) {
    if report.unusable.is_empty() {
        return;
    }
    text.push_str("\nNot worked out:\n");
    for net in &report.unusable {
        let _ = writeln!(text, "  {}: {}", net.name, net.reason);
    }
}

/// The remarks on the board, and every warning once with the nets it is about.
pub(super) fn push_warnings(text: &mut String, report: &CheckReport) {
    let mut warnings: Vec<(&str, Vec<&str>)> = Vec::new();
    for net in &report.nets {
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
    for (warning, names) in warnings {
        let _ = writeln!(text, "  {}: {warning}", names.join(", "));
    }
}

pub(super) fn push_foot(text: &mut String, report: &CheckReport) {
    text.push('\n');
    for note in report.limits.iter().filter_map(LimitAt::note) {
        let _ = writeln!(text, "{note}");
    }
    let _ = writeln!(
        text,
        "Site: {}. margin = limit - field; chance of failing: likely fail from 50 %, marginal from 5 %, likely pass below.",
        words::site(report.site)
    );
    if report.nets.iter().any(|net| net.worst.is_none()) {
        text.push_str(
            "not judged: no limit covers a harmonic of the net, or no part of it radiates.\n",
        );
    }
    let _ = writeln!(text, "This is a {NOTICE}; {LABORATORY}.");
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::show::samples::{self, report};

    fn plain(report: &CheckReport) -> String {
        anstream::adapter::strip_str(&check_table(report)).to_string()
    }

    #[test]
    fn the_worst_margin_comes_first_and_the_unjudged_last() {
        let mut nets = vec![
            samples::net("UNJUDGED", 48e6, 20),
            samples::net("QUIET", 48e6, 20),
            samples::net("LOUD", 48e6, 20),
        ];
        nets[0].worst = None;
        nets[0].verdict = Verdict::NotJudged;
        nets[1].worst = samples::worst(12.0);
        nets[2].worst = samples::worst(-3.25);
        let text = plain(&report(nets));
        let place = |word: &str| text.find(word).expect("in the table");
        assert!(place("LOUD") < place("QUIET") && place("QUIET") < place("UNJUDGED"));
        assert!(text.contains("-3.2"));
        assert!(text.contains("not judged: no limit covers"));
    }

    #[test]
    fn the_notice_and_the_laboratory_stand_at_the_foot() {
        let text = plain(&report(vec![samples::net("A", 48e6, 20)]));
        let last = text.lines().last().expect("a line");
        assert!(last.contains(NOTICE) && last.contains("accredited laboratory"));
    }

    #[test]
    fn one_warning_of_two_nets_stands_once() {
        let mut nets = vec![samples::net("A", 48e6, 20), samples::net("B", 48e6, 20)];
        for net in &mut nets {
            net.warnings = vec!["the trace is narrow".into(), "the trace is narrow".into()];
        }
        let text = plain(&report(nets));
        assert_eq!(text.matches("the trace is narrow").count(), 1);
        assert!(text.contains("A, B: the trace is narrow"));
    }

    #[test]
    fn only_the_verdict_is_coloured_even_in_a_net_named_after_one() {
        let text = check_table(&report(vec![samples::net("likely fail", 48e6, 20)]));
        let row = text.lines().nth(4).expect("the first row");
        assert!(row.starts_with("likely fail "), "{row:?}");
        assert_eq!(
            row.matches('\u{1b}').count(),
            row.matches("\u{1b}[0m").count() * 3,
            "{row:?}"
        );
    }

    #[test]
    fn a_moved_limit_says_so() {
        let text = plain(&report(vec![samples::net("A", 48e6, 20)]));
        assert!(text.contains("47 CFR 15.109 class B is stated at 3 m and moved to 10 m"));
    }

    #[test]
    fn the_march_is_told_per_net() {
        let text = march_table(&[samples::net("CAM_PCLK", 48e6, 20)]);
        assert!(text.contains("CAM_PCLK") && text.contains("4096"));
    }
}
