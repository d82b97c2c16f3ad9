//! What all nets of a board make together at one distance, with the biggest owners named.

use super::page::{LABEL_SIZE, LegendEntry, page, shortened};
use super::picture::{Marker, Picture};
use super::readings::{Line, WorstHere, level_range};
use super::spectrum::spectrum_canvas;
use super::{BLUE, GREY};
use crate::limit::LimitAt;
use crate::show::rank::{RankReport, SumRow};
use crate::show::words;

/// Frequencies whose owners are named.
const NAMED: usize = 5;
/// A power sum this near to the sum is not worth a mark of its own.
const APART_DB: f64 = 0.1;

/// Lines that lie further below the highest are left out, and the picture says so.
const DEPTH_DB: f64 = 50.0;
/// Above everything drawn, for the owners' names.
const ROOM_FOR_NAMES_DB: f64 = 30.0;

/// The spectrum of a whole board at one distance.
pub fn board_spectrum_picture(report: &RankReport, distance_m: f64) -> Picture {
    let (lines, hidden) = worth_showing(lines(report, distance_m));
    let limits: Vec<&LimitAt> = report
        .limits
        .iter()
        .filter(|limit| limit.distance_m == distance_m)
        .collect();
    let part = if report.ranking.is_partial() {
        format!(
            "PARTIAL: {} of {} nets",
            report.ranking.done, report.ranking.of
        )
    } else {
        format!("{} nets", report.ranking.done)
    };
    let picture = page(
        &format!("All nets together at {}", words::distance(distance_m)),
        &format!(
            "{} · {part} · {} site",
            report.board,
            words::site(report.site)
        ),
    );
    let frequencies = frequency_range(&lines);
    let (lowest, highest) = level_range(&lines, &limits, frequencies);
    let levels = (lowest, highest + ROOM_FOR_NAMES_DB);
    let mut canvas = spectrum_canvas(picture, &legend_entries(hidden), frequencies, levels);
    canvas.draw_harmonics(&lines);
    let drawn = canvas.draw_limits(&limits, false);
    let rows = rows(report, distance_m);
    let shown = rows
        .iter()
        .filter(|row| row.level.field_dbuv_per_m >= levels.0);
    let shown: Vec<&SumRow> = shown.take(NAMED).collect();
    if let Some(worst) = shown.first()
        && let Some(line) = lines
            .iter()
            .find(|line| line.frequency_hz == worst.frequency_hz)
    {
        canvas.mark_worst(&WorstHere {
            line,
            limit: worst.limit,
            limit_level: worst.limit_dbuv_per_m,
        });
    }
    for limit in &drawn {
        canvas.label_limit(limit);
    }
    let mut boxes: Vec<_> = shown
        .iter()
        .enumerate()
        .map(|(place, row)| {
            let at = (row.frequency_hz, row.level.field_dbuv_per_m);
            (at, box_words(row, place == 0))
        })
        .collect();
    boxes.sort_by(|a, b| a.0.0.total_cmp(&b.0.0));
    canvas.write_boxes(&boxes);
    if drawn.is_empty() {
        let distance = words::distance(distance_m);
        let sentence = format!("No limit line given covers this range at {distance}");
        canvas.note(&sentence, 0);
    }
    if lines.is_empty() {
        canvas.note("No net has a field at this distance", 1);
    }
    canvas.picture
}

fn legend_entries(hidden: usize) -> Vec<LegendEntry> {
    let entry = |label: String, marker| LegendEntry {
        label,
        pen: None,
        marker,
    };
    let mut entries = vec![
        entry(
            "worst case: nets of one clock source in step".into(),
            Some((Marker::Disc, BLUE)),
        ),
        entry(
            "if no two nets kept step".into(),
            Some((Marker::HollowDiamond, GREY)),
        ),
    ];
    if hidden > 0 {
        entries.push(entry(
            format!("{hidden} weaker lines lie below the range"),
            None,
        ));
    }
    entries
}

fn box_words(row: &SumRow, is_worst: bool) -> Vec<String> {
    let margin_db = row.margin_db();
    let frequency = words::frequency(row.frequency_hz);
    let mut lines = vec![if is_worst {
        let side = if margin_db < 0.0 { "over" } else { "under" };
        format!("worst margin {margin_db:.1} dB ({side} the limit) at {frequency}")
    } else {
        format!("{frequency}: {margin_db:.1} dB")
    }];
    for owner in row.named_owners() {
        let name = shortened(&owner.net, LABEL_SIZE, false, 150.0);
        lines.push(match (is_worst, row.level.nets) {
            (_, 1) => format!("{name} alone"),
            (true, _) => format!("{name}: {:.1} dB less without it", owner.relief_db),
            // Only the worst has room for more words.
            (false, _) => name,
        });
    }
    let left = row.level.nets.saturating_sub(lines.len() - 1);
    if left > 0 {
        lines.push(format!("and {left} more"));
    }
    lines
}

fn lines(report: &RankReport, distance_m: f64) -> Vec<Line> {
    let Some(distance) = report.distances_m.iter().position(|d| *d == distance_m) else {
        return Vec::new();
    };
    let lines = report.ranking.sum.lines.iter();
    lines
        .filter_map(|line| {
            let level = line.levels[distance].as_ref()?;
            let by_power = level.by_power_dbuv_per_m;
            Some(Line {
                number: 0,
                frequency_hz: line.frequency_hz,
                level: level.field_dbuv_per_m,
                parts: [None; 3],
                beside: (level.field_dbuv_per_m - by_power > APART_DB).then_some(by_power),
            })
        })
        .collect()
}

/// The lines that are not far below the highest, and the number of the others.
fn worth_showing(mut lines: Vec<Line>) -> (Vec<Line>, usize) {
    let levels = lines.iter().map(|line| line.level);
    let lowest = levels.fold(f64::NEG_INFINITY, f64::max) - DEPTH_DB;
    let before = lines.len();
    lines.retain(|line| line.level >= lowest);
    for line in &mut lines {
        line.beside = line.beside.filter(|level| *level >= lowest);
    }
    let hidden = before - lines.len();
    (lines, hidden)
}

/// The lines of the sum at one distance, worst first.
fn rows(report: &RankReport, distance_m: f64) -> Vec<SumRow<'_>> {
    let distance = report.distances_m.iter().position(|d| *d == distance_m);
    let lines = report.ranking.sum.lines.iter();
    let mut rows: Vec<SumRow<'_>> = lines
        .filter_map(|line| report.sum_row(line, distance?))
        .collect();
    rows.sort_by(|a, b| a.margin_db().total_cmp(&b.margin_db()));
    rows
}

/// From 30 MHz, or the lowest line where that is lower, to a little over the highest.
fn frequency_range(lines: &[Line]) -> (f64, f64) {
    let lowest = lines.iter().map(|l| l.frequency_hz).fold(30e6, f64::min);
    let highest = lines
        .iter()
        .map(|line| line.frequency_hz)
        .fold(10.0 * lowest, f64::max);
    (lowest / 1.02, highest * (highest / lowest).powf(0.015))
}

#[cfg(test)]
mod tests {
    use crate::show::plot::{board_spectrum_picture, ranking_picture};
    use crate::show::{NOTICE, samples};

    #[test]
    fn both_pictures_say_what_they_show() {
        let report = samples::rank_report();
        let svg = board_spectrum_picture(&report, 3.0).svg();
        for words in [
            "All nets together at 3 m",
            "47 CFR 15.109 class B",
            "Frequency (MHz)",
            "Field strength (dBµV/m)",
            "worst margin -6.5 dB (over the limit) at 144 MHz",
            "CAM_D: 4.0 dB less without it",
            "and 5 more",
            NOTICE,
        ] {
            assert!(svg.contains(words), "{words}");
        }
        let svg = ranking_picture(&report).svg();
        for words in [
            "Estimate less limit (dB)",
            "all nets together",
            "CAM_D ×16",
            "one standard deviation each way",
            "limit\n",
            NOTICE,
        ] {
            assert!(svg.contains(words), "{words}");
        }
        assert!(!svg.contains("PARTIAL"));
    }

    #[test]
    fn a_partial_ranking_says_so_in_every_picture() {
        let mut report = samples::rank_report();
        report.ranking.of = 900;
        assert!(
            board_spectrum_picture(&report, 10.0)
                .svg()
                .contains("PARTIAL")
        );
        assert!(ranking_picture(&report).svg().contains("PARTIAL"));
    }

    #[test]
    fn nothing_to_show_is_said_not_hidden() {
        let mut report = samples::rank_report();
        report.limits.clear();
        report.ranking.listed.clear();
        report.ranking.sum = Default::default();
        let svg = board_spectrum_picture(&report, 3.0).svg();
        assert!(svg.contains("No limit line given covers this range at 3 m"));
        assert!(svg.contains("No net has a field at this distance"));
        assert!(
            ranking_picture(&report)
                .svg()
                .contains("No net could be judged")
        );
    }
}
