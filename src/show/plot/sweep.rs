//! A sweep: worst margin, overshoot and settling over the value.

use super::axis::Axis;
use super::page::{LegendEntry, PANEL_BOTTOM, PANEL_LEFT, PANEL_RIGHT, legend, page, panel};
use super::picture::{Marker, Pen, Picture, Point, Rect};
use super::{BLACK, BLUE, GREY, VERMILLION};
use crate::show::compare::SweepResult;
use crate::show::{CheckReport, words};
use crate::study::compare::Variant;

const GAP: f64 = 16.0;

/// A figure of a variant, where it has one.
type Figure = fn(&Variant) -> Option<f64>;

/// Worst margin, overshoot and settling over the value.
pub fn sweep_picture(report: &CheckReport, sweep: &SweepResult) -> Picture {
    let mut picture = page(
        &format!("{}: {}", sweep.net, sweep.label),
        &format!("{} · {} site", report.board, words::site(report.site)),
    );
    let entry = |label: &str, marker| LegendEntry {
        label: label.into(),
        pen: None,
        marker: Some(marker),
    };
    let entries = [
        entry("safe for the signal", (Marker::Disc, BLUE)),
        entry(
            "not safe for the signal",
            (Marker::HollowDiamond, VERMILLION),
        ),
    ];
    let top = legend(&mut picture, &entries);
    let height = (PANEL_BOTTOM - top - 2.0 * GAP) / 3.0;
    let values: Vec<f64> = sweep.points.iter().map(|(value, _)| *value).collect();
    let (Some(&first), Some(&last)) = (values.first(), values.last()) else {
        return picture;
    };
    let across = Axis::linear((first, last), (PANEL_LEFT, PANEL_RIGHT));
    let figures: [(&str, Figure); 3] = [
        ("Worst margin (dB)", |v| {
            v.result.worst.as_ref().map(|w| w.margin_db)
        }),
        ("Overshoot (V)", |v| Some(v.overshoot_v())),
        ("Settling (ns)", |v| v.settling_s().map(|s| s * 1e9)),
    ];
    let value_title = format!("{} ({})", sweep.label, sweep.unit);
    for (row, (title, figure)) in figures.into_iter().enumerate() {
        let rect = Rect {
            left: PANEL_LEFT,
            top: top + row as f64 * (height + GAP),
            right: PANEL_RIGHT,
            bottom: top + row as f64 * (height + GAP) + height,
        };
        let found: Vec<f64> = (sweep.points.iter())
            .filter_map(|(_, v)| figure(v))
            .collect();
        let (low, high) = found.iter().fold((0.0f64, 1e-3f64), |(low, high), &value| {
            (low.min(value), high.max(value))
        });
        let room = 0.08 * (high - low);
        let low = if low < 0.0 { low - room } else { 0.0 };
        let level = Axis::linear((low, high + room), (rect.bottom, rect.top));
        let below = (row == 2).then_some(value_title.as_str());
        panel(&mut picture, &rect, &across, &level, (below, title));
        let zero = level.place(0.0);
        picture.line(
            &[(rect.left, zero), (rect.right, zero)],
            Pen::solid(GREY, 1.0),
        );
        let mut line: Vec<Point> = Vec::new();
        let mut markers = Vec::new();
        for (value, variant) in &sweep.points {
            let Some(figure) = figure(variant) else {
                continue;
            };
            let at = (across.place(*value), level.place(figure));
            line.push(at);
            markers.push((at, variant.faults().is_empty()));
        }
        picture.line(&line, Pen::solid(BLACK, 1.2));
        for (at, safe) in markers {
            if safe {
                picture.marker(Marker::Disc, at, 4.0, BLUE);
            } else {
                picture.marker(Marker::HollowDiamond, at, 5.5, VERMILLION);
            }
        }
    }
    picture
}
