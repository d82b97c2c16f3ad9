//! The board as an antenna: the field of unit sources over frequency.

use super::axis::Axis;
use super::canvas::around;
use super::label::label_near;
use super::page::{
    LABEL_SIZE, LegendEntry, PANEL_BOTTOM, PANEL_LEFT, PANEL_RIGHT, legend, page, panel, text,
};
use super::picture::{Anchor, Marker, Pen, Picture, Point, Rect, Text};
use super::place::Obstacles;
use super::{BLACK, BLUE, GREEN, GREY, VERMILLION};
use crate::radiation::{FLOOR_ABSORBED_ABOVE_HZ, Site};
use crate::show::{CheckReport, words};
use crate::study::{
    BoardAntenna, Resonance, Resonator, SourceCurve, UNIT_AREA_M2, UNIT_CAPACITANCE_F,
    UNIT_CURRENT_A, UNIT_HEIGHT_M, UNIT_LENGTH_M, UNIT_VOLTAGE_V, UnitSource,
};

const GAP: f64 = 16.0;
/// Peaks of one panel this close, as a share of their frequency, are named once.
const SAME_PEAK: f64 = 0.04;
const NAMED: usize = 12;
const COST_CURVE: f64 = 6.0;
const COST_MARKER: f64 = 60.0;

/// The field that unit sources over the middle of a board's plane make, with and without its cables.
pub fn antenna_picture(report: &CheckReport, antenna: &BoardAntenna) -> Picture {
    let cables = match antenna.cables.as_slice() {
        [] => "no cables".to_owned(),
        names => format!("with {}", names.join(", ")),
    };
    let mut picture = page(
        &format!(
            "The board as an antenna: field at {} of unit sources",
            words::distance(antenna.distance_m)
        ),
        &format!(
            "{} · {cables} · {} site · over the middle of the plane",
            report.board,
            words::site(report.site)
        ),
    );
    let top = legend(&mut picture, &legend_entries(antenna));
    let split = top + (PANEL_BOTTOM - top - GAP) / 2.0;
    let upper = Rect {
        left: PANEL_LEFT,
        top,
        right: PANEL_RIGHT,
        bottom: split,
    };
    let lower = Rect {
        top: split + GAP,
        bottom: PANEL_BOTTOM,
        ..upper
    };
    let (loops, charges): (Vec<_>, Vec<_>) = antenna
        .curves
        .iter()
        .partition(|curve| curve.source != UnitSource::ChargedTrace);
    let floor = report.site == Site::OpenArea;
    let title = "Field of the loop (dBµV/m)";
    draw(&mut picture, &upper, antenna, &loops, (None, title), floor);
    let titles = (Some("Frequency (MHz)"), "Field of the trace (dBµV/m)");
    draw(&mut picture, &lower, antenna, &charges, titles, floor);
    picture
}

fn legend_entries(antenna: &BoardAntenna) -> Vec<LegendEntry> {
    let entry = |label: String, pen, marker| LegendEntry { label, pen, marker };
    let number = |value: f64| words::trimmed(value, 3);
    let mut entries = vec![
        entry(
            format!(
                "loop, {} mA in {} cm², along the plane's length",
                number(UNIT_CURRENT_A * 1e3),
                number(UNIT_AREA_M2 * 1e4)
            ),
            Some(pen(UnitSource::LoopAlongLength)),
            None,
        ),
        entry(
            "along its width".into(),
            Some(pen(UnitSource::LoopAlongWidth)),
            None,
        ),
        entry(
            format!(
                "charged trace, {} V on {} pF, {} mm high, {} mm long",
                number(UNIT_VOLTAGE_V),
                number(UNIT_CAPACITANCE_F * 1e12),
                number(UNIT_HEIGHT_M * 1e3),
                number(UNIT_LENGTH_M * 1e3)
            ),
            Some(pen(UnitSource::ChargedTrace)),
            None,
        ),
    ];
    if !antenna.cables.is_empty() {
        let pen = Pen::solid(GREY, 1.0);
        entries.push(entry("the same, plane alone".into(), Some(pen), None));
    }
    for (of, label) in [
        (Resonator::Cables, "resonance of the cables"),
        (Resonator::Plane, "resonance of the plane"),
    ] {
        let mut all = antenna.curves.iter().flat_map(|curve| &curve.resonances);
        if all.any(|resonance| resonance.of == of) {
            entries.push(entry(label.into(), None, Some((marker(of), BLACK))));
        }
    }
    entries
}

fn pen(source: UnitSource) -> Pen {
    let (colour, dashes): (_, &[f64]) = match source {
        UnitSource::LoopAlongLength => (BLUE, &[]),
        UnitSource::LoopAlongWidth => (VERMILLION, &[8.0, 4.0]),
        UnitSource::ChargedTrace => (GREEN, &[]),
    };
    Pen {
        colour,
        width: 2.0,
        dashes,
    }
}

fn marker(of: Resonator) -> Marker {
    match of {
        Resonator::Cables => Marker::Triangle,
        Resonator::Plane => Marker::Square,
    }
}

fn draw(
    picture: &mut Picture,
    rect: &Rect,
    antenna: &BoardAntenna,
    curves: &[&SourceCurve],
    titles: (Option<&str>, &str),
    floor: bool,
) {
    let frequencies = &antenna.frequencies_hz;
    let (Some(&first_hz), Some(&last_hz)) = (frequencies.first(), frequencies.last()) else {
        return;
    };
    let across = Axis::log((first_hz / 1e6, last_hz / 1e6), (rect.left, rect.right));
    let level = Axis::linear(level_range(curves), (rect.bottom, rect.top));
    panel(picture, rect, &across, &level, titles);
    if floor && last_hz > FLOOR_ABSORBED_ABOVE_HZ {
        let x = across.place(FLOOR_ABSORBED_ABOVE_HZ / 1e6);
        let pen = Pen {
            colour: GREY,
            width: 1.0,
            dashes: &[2.0, 3.0],
        };
        picture.line(&[(x, rect.top), (x, rect.bottom)], pen);
        picture.text(Text {
            anchor: Anchor::End,
            colour: GREY,
            ..text((x - 5.0, rect.bottom - 7.0), "over the floor", LABEL_SIZE)
        });
        picture.text(Text {
            colour: GREY,
            ..text((x + 5.0, rect.bottom - 7.0), "floor absorbed", LABEL_SIZE)
        });
    }
    let mut obstacles = Obstacles::default();
    let mut line = |levels: &[f64], pen: Pen| {
        for stretch in &antenna.stretches {
            let points: Vec<Point> = stretch
                .clone()
                .filter(|&i| levels[i].is_finite())
                .map(|i| (across.place(frequencies[i] / 1e6), level.place(levels[i])))
                .collect();
            picture.line(&points, pen);
            obstacles.add_line(&points, COST_CURVE);
        }
    };
    for curve in curves {
        if let Some(alone) = &curve.plane_alone_dbuv_per_m {
            let pen = Pen {
                colour: GREY,
                width: 1.0,
                ..pen(curve.source)
            };
            line(alone, pen);
        }
    }
    for curve in curves {
        line(&curve.whole_dbuv_per_m, pen(curve.source));
    }
    let point = |resonance: &Resonance| {
        (
            across.place(resonance.frequency_hz / 1e6),
            level.place(resonance.level_dbuv_per_m),
        )
    };
    for resonance in curves.iter().flat_map(|curve| &curve.resonances) {
        let at = point(resonance);
        picture.marker(marker(resonance.of), at, 4.5, BLACK);
        obstacles.add_rect(around(at, 5.0), COST_MARKER);
    }
    for resonance in named(curves) {
        let words = format!(
            "{} MHz, {}",
            words::trimmed(resonance.frequency_hz / 1e6, 0),
            match resonance.of {
                Resonator::Cables => "cables",
                Resonator::Plane => "plane",
            }
        );
        label_near(picture, &mut obstacles, rect, &[point(resonance)], &words);
    }
    picture.outline(rect, Pen::solid(BLACK, 1.0));
}

/// The peaks to name, those that stand out most first; of two curves' peaks at about one frequency, one.
fn named<'a>(curves: &[&'a SourceCurve]) -> Vec<&'a Resonance> {
    let mut all: Vec<&Resonance> = curves.iter().flat_map(|curve| &curve.resonances).collect();
    all.sort_by(|a, b| b.stands_out_db.total_cmp(&a.stands_out_db));
    let mut named: Vec<&Resonance> = Vec::new();
    for resonance in all {
        let same = |other: &&Resonance| {
            (other.frequency_hz / resonance.frequency_hz - 1.0).abs() < SAME_PEAK
                && other.of == resonance.of
        };
        if named.len() < NAMED && !named.iter().any(same) {
            named.push(resonance);
        }
    }
    named
}

/// Whole tens of dB around every curve, with room for labels.
fn level_range(curves: &[&SourceCurve]) -> (f64, f64) {
    let alone = |curve: &&SourceCurve| curve.plane_alone_dbuv_per_m.clone().unwrap_or_default();
    let whole = curves.iter().flat_map(|curve| &curve.whole_dbuv_per_m);
    let levels = curves.iter().flat_map(alone).chain(whole.copied());
    let (low, high) = levels
        .filter(|level| level.is_finite())
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), level| {
            (low.min(level), high.max(level))
        });
    if low > high {
        return (0.0, 60.0);
    }
    (
        (low / 10.0).floor() * 10.0,
        ((high + 6.0) / 10.0).ceil() * 10.0,
    )
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::show::{NOTICE, samples};

    fn resonance(frequency_hz: f64, of: Resonator) -> Resonance {
        Resonance {
            frequency_hz,
            level_dbuv_per_m: 30.0,
            stands_out_db: 6.0,
            of,
        }
    }

    fn antenna() -> BoardAntenna {
        let frequencies_hz: Vec<f64> = (0..40).map(|i| 30e6 * 1.12f64.powi(i)).collect();
        let curve = |source| SourceCurve {
            source,
            whole_dbuv_per_m: (0..40).map(f64::from).collect(),
            plane_alone_dbuv_per_m: Some(vec![f64::NEG_INFINITY; 40]),
            resonances: vec![
                resonance(61e6, Resonator::Cables),
                resonance(62e6, Resonator::Cables),
                resonance(640e6, Resonator::Plane),
            ],
        };
        BoardAntenna {
            distance_m: 3.0,
            stretches: vec![0..31, 31..40],
            frequencies_hz,
            cables: vec!["mast".into()],
            curves: UnitSource::ALL.map(curve).into(),
        }
    }

    #[test]
    fn axes_resonances_and_notice_are_written() {
        let svg = antenna_picture(&samples::report(vec![]), &antenna()).svg();
        for words in [
            "field at 3 m of unit sources",
            "with mast",
            "Frequency (MHz)",
            "Field of the loop (dBµV/m)",
            "Field of the trace (dBµV/m)",
            "loop, 1 mA in 1 cm²",
            "1 V on 1 pF, 1 mm high, 10 mm long",
            "the same, plane alone",
            "61 MHz, cables",
            "640 MHz, plane",
            "floor absorbed",
            NOTICE,
        ] {
            assert!(svg.contains(words), "{words}");
        }
        // Peaks of both loops, and two at nearly one frequency, are named once a panel.
        assert_eq!(svg.matches("61 MHz, cables").count(), 2);
        assert!(!svg.contains("62 MHz"));
    }

    #[test]
    fn a_board_that_sends_nothing_makes_a_picture_all_the_same() {
        let mut nothing = antenna();
        for curve in &mut nothing.curves {
            curve.whole_dbuv_per_m = vec![f64::NEG_INFINITY; 40];
            curve.resonances.clear();
        }
        let svg = antenna_picture(&samples::report(vec![]), &nothing).svg();
        assert!(svg.contains("Frequency (MHz)") && !svg.contains("resonance"));
    }
}
