//! The shortlist as bars from the limit to each estimate, with whiskers of one sigma.

use plotters::style::RGBColor;

use super::axis::Axis;
use super::page::{LABEL_SIZE, PANEL_BOTTOM, PANEL_LEFT, PANEL_RIGHT, page, shortened, text};
use super::paint::text_width;
use super::picture::{Anchor, Pen, Picture, Rect, Text};
use super::{BLACK, BLUE, GREY, GRID, ORANGE, VERMILLION};
use crate::show::rank::RankReport;
use crate::show::words;
use crate::study::{RankedNet, Verdict};

/// Nets that have room.
const MOST_NETS: usize = 20;
/// Room for names on the left and for words on the right.
const NAMES_WIDTH: f64 = 178.0;
const WORDS_WIDTH: f64 = 208.0;
/// Estimates farther under their limit are cut off.
const DEPTH_DB: f64 = 60.0;
/// Where the first row begins, under the legend and the limit's label.
const TOP: f64 = 116.0;

/// One bar.
struct Bar {
    name: String,
    bold: bool,
    verdict: Verdict,
    /// Estimate less limit.
    over_db: f64,
    sigma_db: f64,
    words: String,
}

/// The worst nets of a ranking, the board's sum above them.
pub fn ranking_picture(report: &RankReport) -> Picture {
    let ranking = &report.ranking;
    let judged = ranking.listed.iter().filter_map(bar).take(MOST_NETS);
    let bars: Vec<Bar> = sum_bar(report).into_iter().chain(judged).collect();
    let nets = bars.len() - usize::from(ranking.sum.worst.is_some());
    let part = if ranking.is_partial() {
        format!("PARTIAL: {} of {} nets done", ranking.done, ranking.of)
    } else {
        format!("{} nets", ranking.done)
    };
    let mut picture = page(
        &format!("The {nets} worst nets against the limit"),
        &format!(
            "{} · {part} · {} site",
            report.board,
            words::site(report.site)
        ),
    );
    let rect = Rect {
        left: PANEL_LEFT - 48.0 + NAMES_WIDTH,
        top: TOP,
        right: PANEL_RIGHT - WORDS_WIDTH,
        bottom: PANEL_BOTTOM,
    };
    let x = Axis::linear(range(&bars), (rect.left, rect.right));
    draw_legend(&mut picture);
    draw_frame(&mut picture, &rect, &x);
    let row = (rect.height() / bars.len().max(1) as f64).min(30.0);
    for (index, bar) in bars.iter().enumerate() {
        let middle = rect.top + row * (index as f64 + 0.5);
        draw_bar(&mut picture, &rect, &x, (middle, row), bar);
    }
    if bars.is_empty() {
        picture.text(Text {
            anchor: Anchor::Middle,
            ..text(
                ((rect.left + rect.right) / 2.0, rect.top + 40.0),
                "No net could be judged",
                14.0,
            )
        });
    }
    draw_limit(&mut picture, &rect, &x);
    picture
}

fn bar(net: &RankedNet) -> Option<Bar> {
    let worst = net.worst.as_ref()?;
    let lines = if net.count > 1 {
        format!(" ×{}", net.count)
    } else {
        String::new()
    };
    Some(Bar {
        name: format!("{}{lines}", net.name),
        bold: false,
        verdict: net.verdict,
        over_db: -worst.margin_db,
        sigma_db: net.sigma_db,
        words: format!(
            "{} · {} · {} · {}",
            words::chance(net.chance_of_failing.unwrap_or_default()),
            words::frequency(worst.frequency_hz),
            words::distance(worst.distance_m),
            worst.mechanism.as_str(),
        ),
    })
}

fn sum_bar(report: &RankReport) -> Option<Bar> {
    let worst = report.ranking.sum.worst.as_ref()?;
    Some(Bar {
        name: "all nets together".into(),
        bold: true,
        verdict: worst.verdict,
        over_db: -worst.margin_db,
        sigma_db: worst.sigma_db,
        words: format!(
            "{} · {} · {} · worst case",
            words::chance(worst.chance_of_failing),
            words::frequency(worst.frequency_hz),
            words::distance(worst.distance_m),
        ),
    })
}

/// Every bar and whisker, the limit among them.
fn range(bars: &[Bar]) -> (f64, f64) {
    let ends = bars
        .iter()
        .flat_map(|bar| [bar.over_db - bar.sigma_db, bar.over_db + bar.sigma_db]);
    let (low, high) = ends
        .filter(|end| end.is_finite())
        .fold((-5.0f64, 5.0f64), |(low, high), end| {
            (low.min(end), high.max(end))
        });
    let low = low.max(-DEPTH_DB);
    let room = 0.03 * (high - low);
    (low - room, high + room)
}

/// How a verdict is drawn: told apart without colour by full, hatched and hollow.
fn paint_bar(picture: &mut Picture, rect: &Rect, verdict: Verdict) {
    let colour = colour(verdict);
    match verdict {
        Verdict::LikelyFail => picture.area(&rect.corners(), colour, 1.0),
        Verdict::Marginal => {
            picture.area(&rect.corners(), colour, 0.35);
            const STEP: f64 = 6.0;
            let height = rect.height();
            let mut x = rect.left;
            while x < rect.right {
                let width = height.min(rect.right - x);
                let foot = (x, rect.bottom);
                let head = (x + width, rect.bottom - width);
                picture.line(&[foot, head], Pen::solid(colour, 1.3));
                x += STEP;
            }
        }
        Verdict::LikelyPass | Verdict::NotJudged => {}
    }
    picture.outline(rect, Pen::solid(colour, 1.3));
}

fn colour(verdict: Verdict) -> RGBColor {
    match verdict {
        Verdict::LikelyFail => VERMILLION,
        Verdict::Marginal => ORANGE,
        Verdict::LikelyPass => BLUE,
        Verdict::NotJudged => GREY,
    }
}

fn draw_legend(picture: &mut Picture) {
    const Y: f64 = 82.0;
    let mut x = PANEL_LEFT;
    for verdict in [Verdict::LikelyFail, Verdict::Marginal, Verdict::LikelyPass] {
        let swatch = Rect {
            left: x,
            top: Y - 10.0,
            right: x + 30.0,
            bottom: Y + 1.0,
        };
        paint_bar(picture, &swatch, verdict);
        let label = verdict.as_str();
        picture.text(text((x + 38.0, Y), label, LABEL_SIZE));
        x += 38.0 + text_width(label, LABEL_SIZE, false) + 24.0;
    }
    whisker(picture, (x, x + 30.0), Y - 4.5, 4.0);
    let label = "one standard deviation each way";
    picture.text(text((x + 38.0, Y), label, LABEL_SIZE));
}

fn whisker(picture: &mut Picture, (from, to): (f64, f64), y: f64, cap: f64) {
    let pen = Pen::solid(BLACK, 1.5);
    picture.line(&[(from, y), (to, y)], pen);
    for end in [from, to] {
        picture.line(&[(end, y - cap), (end, y + cap)], pen);
    }
}

fn draw_frame(picture: &mut Picture, rect: &Rect, x: &Axis) {
    for tick in x.ticks() {
        let at = x.place(tick.value);
        picture.line(&[(at, rect.top), (at, rect.bottom)], Pen::solid(GRID, 0.67));
        picture.line(
            &[(at, rect.bottom), (at, rect.bottom + 5.0)],
            Pen::solid(BLACK, 1.0),
        );
        picture.text(Text {
            anchor: Anchor::Middle,
            ..text(
                (at, rect.bottom + 19.0),
                tick.label.as_deref().unwrap_or_default(),
                LABEL_SIZE,
            )
        });
    }
    picture.outline(rect, Pen::solid(BLACK, 1.0));
    picture.text(Text {
        anchor: Anchor::Middle,
        ..text(
            ((rect.left + rect.right) / 2.0, rect.bottom + 39.0),
            "Estimate less limit (dB): to the right of 0 is over the limit",
            13.0,
        )
    });
    picture.text(Text {
        colour: GREY,
        ..text(
            (rect.right + 10.0, rect.top - 7.0),
            "chance of failing · where · mainly from",
            10.5,
        )
    });
}

fn draw_bar(picture: &mut Picture, rect: &Rect, x: &Axis, (middle, row): (f64, f64), bar: &Bar) {
    let half = 0.3 * row;
    let (limit, end) = (x.place(0.0), x.place(bar.over_db));
    let body = Rect {
        left: limit.min(end),
        top: middle - half,
        right: limit.max(end),
        bottom: middle + half,
    };
    paint_bar(picture, &body, bar.verdict);
    let ends = (
        x.place(bar.over_db - bar.sigma_db),
        x.place(bar.over_db + bar.sigma_db),
    );
    whisker(picture, ends, middle, 0.22 * row);
    let baseline = middle + 0.36 * LABEL_SIZE;
    picture.text(Text {
        anchor: Anchor::End,
        bold: bar.bold,
        ..text(
            (rect.left - 9.0, baseline),
            &shortened(&bar.name, LABEL_SIZE, bar.bold, NAMES_WIDTH - 12.0),
            LABEL_SIZE,
        )
    });
    picture.text(text(
        (rect.right + 10.0, middle + 0.36 * 10.5),
        &shortened(&bar.words, 10.5, false, WORDS_WIDTH - 12.0),
        10.5,
    ));
}

fn draw_limit(picture: &mut Picture, rect: &Rect, x: &Axis) {
    let at = x.place(0.0);
    let pen = Pen {
        colour: BLACK,
        width: 2.0,
        dashes: &[11.0, 5.0],
    };
    picture.line(&[(at, rect.top - 4.0), (at, rect.bottom)], pen);
    picture.text(Text {
        anchor: Anchor::Middle,
        bold: true,
        ..text((at, rect.top - 8.0), "limit", LABEL_SIZE)
    });
}
