//! What the antenna reads of a net's worst harmonic over its height and the turntable's angle.

use super::axis::Axis;
use super::page::{
    LABEL_SIZE, LegendEntry, PANEL_BOTTOM, PANEL_LEFT, PANEL_RIGHT, legend, page, text,
};
use super::picture::{Anchor, Marker, Pen, Picture, Rect, Text};
use super::shade::shade;
use super::{BLACK, WHITE};
use crate::board::Along;
use crate::radiation::ScanMap;
use crate::show::{CheckReport, words};
use crate::study::NetScan;

const POLARISATIONS: [&str; 2] = ["horizontal", "vertical"];
/// Between the two panels, and beside them for the scale.
const BETWEEN: f64 = 44.0;
const SCALE_ROOM: f64 = 106.0;
const SCALE_WIDTH: f64 = 18.0;
/// Levels further below the strongest are all as dark.
const DEPTH_DB: f64 = 40.0;
/// The scale covers so much at least.
const LEAST_DB: f64 = 6.0;

/// The strongest of the places.
struct Strongest {
    way: usize,
    row: usize,
    column: usize,
    level: f64,
}

/// The scan of a net's worst harmonic, horizontal and vertical side by side.
pub fn scan_picture(report: &CheckReport, scan: &NetScan) -> Picture {
    let worst = &scan.worst;
    let mut picture = page(
        &format!(
            "{}: the scan at {}, {} away",
            scan.name,
            words::frequency(worst.frequency_hz),
            words::distance(worst.distance_m)
        ),
        &format!(
            "{} · worst harmonic, number {} · margin {:.1} dB to {} · {} site",
            report.board,
            worst.harmonic,
            worst.margin_db,
            worst.limit,
            words::site(report.site)
        ),
    );
    let strongest = strongest(&scan.map);
    let axis = match scan.zero_along {
        Along::Length => "x",
        Along::Width => "y",
    };
    let entry = |label, marker| LegendEntry {
        label,
        pen: None,
        marker,
    };
    let mut entries = Vec::new();
    if let Some(strongest) = &strongest {
        let label = format!(
            "strongest place: {:.1} dBµV/m, {}, antenna {:.1} m high, {:.0}° from the board's {axis} axis",
            strongest.level,
            POLARISATIONS[strongest.way],
            scan.map.heights_m[strongest.row],
            angle_deg(strongest.column, scan.map.columns()),
        );
        entries.push(entry(label, Some((Marker::Diamond, BLACK))));
    }
    entries.push(entry(
        format!(
            "reading of the check, between places: {:.1} dBµV/m",
            worst.field_dbuv_per_m
        ),
        None,
    ));
    // Room for the panels' own headings.
    let top = legend(&mut picture, &entries) + 14.0;
    let width = (PANEL_RIGHT - SCALE_ROOM - BETWEEN - PANEL_LEFT) / 2.0;
    let panels = [0.0, width + BETWEEN].map(|aside| Rect {
        left: PANEL_LEFT + aside,
        top,
        right: PANEL_LEFT + aside + width,
        bottom: PANEL_BOTTOM,
    });
    let levels = level_range(&scan.map);
    for (way, rect) in panels.iter().enumerate() {
        let angle = Axis::linear((0.0, 360.0), (rect.left, rect.right));
        let height = Axis::linear(height_range(&scan.map), (rect.bottom, rect.top));
        fill(&mut picture, &scan.map, way, levels, &angle, &height);
        frame(&mut picture, rect, &angle, &height, way, axis);
        if let Some(found) = strongest.as_ref().filter(|found| found.way == way) {
            let at = (
                angle.place(angle_deg(found.column, scan.map.columns())),
                height.place(scan.map.heights_m[found.row]),
            );
            picture.marker(Marker::Diamond, at, 8.0, WHITE);
            picture.marker(Marker::Diamond, at, 6.0, BLACK);
        }
    }
    picture.text(Text {
        anchor: Anchor::Middle,
        turned: true,
        ..text(
            (24.0, (top + PANEL_BOTTOM) / 2.0),
            "Antenna height over the floor (m)",
            13.0,
        )
    });
    let bar = Rect {
        left: PANEL_RIGHT - SCALE_ROOM + 26.0,
        top,
        right: PANEL_RIGHT - SCALE_ROOM + 26.0 + SCALE_WIDTH,
        bottom: PANEL_BOTTOM,
    };
    scale_bar(&mut picture, &bar, levels, weakest(&scan.map) < levels.0);
    picture
}

fn angle_deg(column: usize, columns: usize) -> f64 {
    360.0 * column as f64 / columns as f64
}

fn level(field_v_per_m: f64) -> f64 {
    20.0 * (1e6 * field_v_per_m).log10()
}

fn strongest(map: &ScanMap) -> Option<Strongest> {
    let mut strongest: Option<Strongest> = None;
    for (way, rows) in map.fields_v_per_m.iter().enumerate() {
        for (row, fields) in rows.iter().enumerate() {
            for (column, &field) in fields.iter().enumerate() {
                let level = level(field);
                if level.is_finite() && strongest.as_ref().is_none_or(|s| level > s.level) {
                    strongest = Some(Strongest {
                        way,
                        row,
                        column,
                        level,
                    });
                }
            }
        }
    }
    strongest
}

/// Of all places that read anything; infinite where none does.
fn weakest(map: &ScanMap) -> f64 {
    let all = map.fields_v_per_m.iter().flatten().flatten();
    let levels = all.map(|&field| level(field)).filter(|l| l.is_finite());
    levels.fold(f64::INFINITY, f64::min)
}

/// Whole decibels from the weakest place, or where that is too weak, from some way below the strongest.
fn level_range(map: &ScanMap) -> (f64, f64) {
    let high = level(map.largest_v_per_m()).ceil();
    if !high.is_finite() {
        return (0.0, LEAST_DB);
    }
    let weakest = weakest(map);
    // A level that is written beside the scale, whatever its steps.
    let depth = ((high - DEPTH_DB) / 10.0).floor() * 10.0;
    let low = if weakest < depth {
        depth
    } else {
        weakest.floor()
    };
    (low.min(high - LEAST_DB), high)
}

/// The antenna's heights; a little about a single one.
fn height_range(map: &ScanMap) -> (f64, f64) {
    match map.heights_m.as_slice() {
        [] => (0.0, 1.0),
        [only_m] => (only_m - 0.1, only_m + 0.1),
        [lowest_m, .., highest_m] => (*lowest_m, *highest_m),
    }
}

/// A cell around every place, as far as the axes reach; that of the first angle lies half at either end.
fn fill(
    picture: &mut Picture,
    map: &ScanMap,
    way: usize,
    (low, high): (f64, f64),
    angle: &Axis,
    height: &Axis,
) {
    let (lowest_m, highest_m) = height_range(map);
    let rows = map.heights_m.len().max(2) - 1;
    let half_m = (highest_m - lowest_m) / rows as f64 / 2.0;
    let half_deg = 180.0 / map.columns() as f64;
    for (fields, height_m) in map.fields_v_per_m[way].iter().zip(&map.heights_m) {
        for column in 0..=fields.len() {
            let colour = shade((level(fields[column % fields.len()]) - low) / (high - low));
            let middle_deg = 2.0 * half_deg * column as f64;
            // Neighbours overlap a little, lest a seam shows between them.
            let cell = Rect {
                left: angle.place(middle_deg - half_deg),
                top: height.place(height_m + 1.1 * half_m),
                right: angle.place(middle_deg + 1.1 * half_deg),
                bottom: height.place(height_m - half_m),
            };
            picture.area(&cell.corners(), colour, 1.0);
        }
    }
}

fn frame(picture: &mut Picture, rect: &Rect, angle: &Axis, height: &Axis, way: usize, axis: &str) {
    let pen = Pen::solid(BLACK, 1.0);
    picture.outline(rect, pen);
    let middle = (rect.left + rect.right) / 2.0;
    picture.text(Text {
        anchor: Anchor::Middle,
        bold: true,
        ..text((middle, rect.top - 7.0), POLARISATIONS[way], 13.0)
    });
    for degrees in (0..=360).step_by(45) {
        let x = angle.place(f64::from(degrees));
        picture.line(&[(x, rect.bottom), (x, rect.bottom + 5.0)], pen);
        picture.text(Text {
            anchor: Anchor::Middle,
            ..text((x, rect.bottom + 19.0), &degrees.to_string(), LABEL_SIZE)
        });
    }
    picture.text(Text {
        anchor: Anchor::Middle,
        ..text(
            (middle, rect.bottom + 39.0),
            &format!("Turntable angle from the board's {axis} axis (°)"),
            13.0,
        )
    });
    for tick in height.ticks() {
        let y = height.place(tick.value);
        picture.line(&[(rect.left - 5.0, y), (rect.left, y)], pen);
        picture.text(Text {
            anchor: Anchor::End,
            ..text(
                (rect.left - 9.0, y + 0.36 * LABEL_SIZE),
                tick.label.as_deref().unwrap_or_default(),
                LABEL_SIZE,
            )
        });
    }
}

/// The levels and their colours; the lowest may stand for weaker ones too.
fn scale_bar(picture: &mut Picture, bar: &Rect, levels: (f64, f64), weaker: bool) {
    const STEPS: usize = 96;
    let axis = Axis::linear(levels, (bar.bottom, bar.top));
    for step in 0..STEPS {
        let y = |number: usize| bar.bottom - number as f64 / STEPS as f64 * bar.height();
        let cell = Rect {
            top: y(step + 1),
            bottom: (y(step) + 0.5).min(bar.bottom),
            ..*bar
        };
        let share = (step as f64 + 0.5) / STEPS as f64;
        picture.area(&cell.corners(), shade(share), 1.0);
    }
    let pen = Pen::solid(BLACK, 1.0);
    picture.outline(bar, pen);
    for tick in axis.ticks() {
        let y = axis.place(tick.value);
        picture.line(&[(bar.right, y), (bar.right + 5.0, y)], pen);
        let mut label = tick.label.unwrap_or_default();
        if weaker && tick.value <= levels.0 {
            label.insert(0, '≤');
        }
        picture.text(text(
            (bar.right + 8.0, y + 0.36 * LABEL_SIZE),
            &label,
            LABEL_SIZE,
        ));
    }
    picture.text(Text {
        anchor: Anchor::Middle,
        turned: true,
        ..text(
            (PANEL_RIGHT - 4.0, (bar.top + bar.bottom) / 2.0),
            "Field strength (dBµV/m)",
            13.0,
        )
    });
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::show::{NOTICE, samples};

    fn scan(heights_m: &[f64]) -> NetScan {
        let field = |row: usize, column: usize| 1e-5 * (1 + row * column) as f64;
        let rows = |scale: f64| {
            let row = |row| (0..16).map(|column| scale * field(row, column)).collect();
            (0..heights_m.len()).map(row).collect()
        };
        NetScan {
            name: "CAM_PCLK".into(),
            worst: samples::worst(-1.5).unwrap(),
            map: ScanMap {
                heights_m: heights_m.to_vec(),
                fields_v_per_m: [rows(1.0), rows(2.0)],
            },
            zero_along: Along::Length,
        }
    }

    #[test]
    fn axes_scale_strongest_place_and_notice_are_written() {
        let svg = scan_picture(&samples::report(vec![]), &scan(&[1.0, 2.0, 3.0, 4.0])).svg();
        for words in [
            "CAM_PCLK: the scan at 144 MHz, 3 m away",
            "Antenna height over the floor (m)",
            "x axis (°)",
            "Field strength (dBµV/m)",
            "horizontal",
            "vertical",
            // 2 * 10 uV/m * (1 + 3 * 15)
            "strongest place: 59.3 dBµV/m, vertical, antenna 4.0 m high, 338°",
            NOTICE,
        ] {
            assert!(svg.contains(words), "{words}");
        }
    }

    #[test]
    fn every_place_has_its_cell_and_the_first_angle_two() {
        let heights_m = [1.0, 2.5, 4.0];
        let picture = scan_picture(&samples::report(vec![]), &scan(&heights_m));
        let areas = |picture: &Picture| {
            let shapes = picture.shapes.iter();
            shapes
                .filter(|shape| matches!(shape, super::super::picture::Shape::Area { .. }))
                .count()
        };
        // Beside them the scale's 96 steps and the two diamonds of the mark.
        let in_legend = 1;
        assert_eq!(areas(&picture), 2 * 3 * 17 + 96 + 2 + in_legend);
    }

    #[test]
    fn one_height_and_no_field_at_all_are_drawn_too() {
        let mut scan = scan(&[1.5]);
        scan.map.fields_v_per_m = [vec![vec![0.0; 16]], vec![vec![0.0; 16]]];
        let svg = scan_picture(&samples::report(vec![]), &scan).svg();
        assert!(svg.contains("Field strength") && !svg.contains("strongest place"));
    }
}
