//! Several variants of a net on one picture: their spectra against the limit lines, and their waveforms.

use plotters::style::RGBColor;

use super::axis::Axis;
use super::canvas::Canvas;
use super::page::{LegendEntry, PANEL_BOTTOM, PANEL_LEFT, PANEL_RIGHT, legend, page, panel, text};
use super::picture::{Anchor, Marker, Pen, Picture, Point, Rect, Text};
use super::readings::{Line, frequency_range, level_range, lines, worst};
use super::spectrum::spectrum_canvas;
use super::waveform::thinned;
use super::{BLACK, BLUE, GREEN, GREY, ORANGE, PURPLE, VERMILLION};
use crate::limit::LimitAt;
use crate::show::{CheckReport, words};
use crate::study::compare::{Comparison, Variant};

/// How a variant is told from the others, without colour too.
#[derive(Clone, Copy)]
struct Look {
    pen: Pen,
    marker: Marker,
}

fn look(index: usize) -> Look {
    const LOOKS: [(RGBColor, &[f64], Marker); 6] = [
        (BLACK, &[], Marker::Disc),
        (VERMILLION, &[9.0, 4.0], Marker::Triangle),
        (BLUE, &[2.5, 3.0], Marker::HollowDiamond),
        (GREEN, &[14.0, 3.5, 3.0, 3.5], Marker::Square),
        (PURPLE, &[20.0, 5.0], Marker::Diamond),
        (ORANGE, &[5.0, 2.0], Marker::Disc),
    ];
    let (colour, dashes, marker) = LOOKS[index % LOOKS.len()];
    let pen = Pen {
        colour,
        width: 1.67,
        dashes,
    };
    Look { pen, marker }
}

/// The spectra of every variant at one distance, over one another.
pub fn variants_spectrum_picture(
    report: &CheckReport,
    comparison: &Comparison,
    distance_m: f64,
) -> Picture {
    let spectra: Vec<Vec<Line>> = (comparison.variants.iter())
        .map(|variant| {
            let mut lines = lines(&variant.result, distance_m);
            // The loop-area figure is left to the pictures of one net.
            lines.iter_mut().for_each(|line| line.beside = None);
            lines
        })
        .collect();
    let limits: Vec<&LimitAt> = report.limits_at(distance_m).collect();
    let picture = page(
        &format!(
            "{}: estimated field at {} under {} variants",
            comparison.net,
            words::distance(distance_m),
            comparison.variants.len()
        ),
        &format!(
            "{} · ringed: smallest margin here",
            subtitle(report, comparison)
        ),
    );
    let all: Vec<Line> = spectra.iter().flatten().copied().collect();
    let first = comparison.variants.first().map(|variant| &variant.result);
    let frequencies = first.map_or((30e6, 1e9), |net| frequency_range(net, &all));
    let levels = level_range(&all, &limits, frequencies);
    let entries: Vec<LegendEntry> = (comparison.variants.iter().enumerate())
        .map(|(index, variant)| entry(index, &with_margin(variant)))
        .collect();
    let mut canvas = spectrum_canvas(picture, &entries, frequencies, levels);
    for (index, lines) in spectra.iter().enumerate().rev() {
        canvas.draw_variant(lines, look(index));
    }
    for lines in &spectra {
        if let Some(worst) = worst(report, distance_m, lines) {
            canvas.ring_worst(worst.line);
        }
    }
    let drawn = canvas.draw_limits(&limits, true);
    for limit in &drawn {
        canvas.label_limit(limit);
    }
    if all.is_empty() {
        canvas.note("No harmonic in range has a field at this distance", 1);
    }
    canvas.picture
}

/// The waveforms of every variant at one receiver, over one another.
pub fn variants_waveform_picture(
    report: &CheckReport,
    comparison: &Comparison,
    receiver: usize,
) -> Picture {
    let reception = (comparison.variants.first()).and_then(|v| v.receptions.get(receiver));
    let name = reception.map_or("receiver", |reception| &reception.name);
    let mut picture = page(
        &format!(
            "{}: voltage at {name} under {} variants",
            comparison.net,
            comparison.variants.len()
        ),
        &subtitle(report, comparison),
    );
    let entries: Vec<LegendEntry> = (comparison.variants.iter().enumerate())
        .map(|(index, variant)| entry(index, &variant.name))
        .collect();
    let top = legend(&mut picture, &entries);
    let curves: Vec<Vec<Point>> = (comparison.variants.iter())
        .map(|variant| curve(variant, receiver))
        .collect();
    let rect = Rect {
        left: PANEL_LEFT,
        top,
        right: PANEL_RIGHT,
        bottom: PANEL_BOTTOM,
    };
    let values = || curves.iter().flatten();
    let last_ns = values().map(|point| point.0).fold(1e-3, f64::max);
    let (low, high) = values().fold((0.0f64, 1e-3f64), |(low, high), point| {
        (low.min(point.1), high.max(point.1))
    });
    let room = 0.07 * (high - low);
    let time = Axis::linear((0.0, last_ns), (rect.left, rect.right));
    let level = Axis::linear((low - room, high + room), (rect.bottom, rect.top));
    panel(
        &mut picture,
        &rect,
        &time,
        &level,
        (
            Some("Time from the start of the rising edge (ns)"),
            "Voltage (V)",
        ),
    );
    if let Some(reception) = reception {
        for (name, level_v) in [
            ("high threshold", reception.high_threshold_v),
            ("low threshold", reception.low_threshold_v),
        ] {
            let y = level.place(level_v);
            picture.line(&[(rect.left, y), (rect.right, y)], Pen::solid(GREY, 0.67));
            let label = Text {
                anchor: Anchor::End,
                ..text((rect.right - 5.0, y - 4.0), name, 11.0)
            };
            picture.text(label);
        }
    }
    for (index, points) in curves.iter().enumerate().rev() {
        let look = look(index);
        let placed: Vec<Point> = (points.iter())
            .map(|&(ns, volt)| (time.place(ns), level.place(volt)))
            .collect();
        picture.line(&placed, look.pen);
        // Markers at other times for each, so that equal curves still show apart.
        const MARKERS: usize = 12;
        for marker in 0..MARKERS {
            let share =
                (marker as f64 + (index as f64 + 0.5) / curves.len() as f64) / MARKERS as f64;
            let at = placed.partition_point(|point| point.0 < rect.left + share * rect.width());
            if let Some(&point) = placed.get(at) {
                picture.marker(look.marker, point, 4.0, look.pen.colour);
            }
        }
    }
    picture
}

fn subtitle(report: &CheckReport, comparison: &Comparison) -> String {
    let clock_hz = (comparison.variants.first()).map_or(0.0, |variant| variant.result.clock_hz);
    format!(
        "{} · clock {} · {} site",
        report.board,
        words::frequency(clock_hz),
        words::site(report.site)
    )
}

fn entry(index: usize, label: &str) -> LegendEntry {
    let look = look(index);
    LegendEntry {
        label: label.to_string(),
        pen: Some(look.pen),
        marker: Some((look.marker, look.pen.colour)),
    }
}

fn with_margin(variant: &Variant) -> String {
    match &variant.result.worst {
        Some(worst) => format!("{}: worst margin {:.1} dB", variant.name, worst.margin_db),
        None => format!("{}: not judged", variant.name),
    }
}

/// Time in ns and voltage; of a period with time at rest left out, only the part from the rising edge on.
fn curve(variant: &Variant, receiver: usize) -> Vec<Point> {
    let wave = &variant.result.waveform;
    let Some(samples) = wave.receivers_v.get(receiver) else {
        return Vec::new();
    };
    let shown = if wave.pace.is_whole() {
        samples.as_slice()
    } else {
        &samples[..wave.pace.high.marched.min(samples.len())]
    };
    let point = |sample: usize| (wave.pace.time_s(sample) * 1e9, shown[sample]);
    thinned(shown, 1700).into_iter().map(point).collect()
}

impl Canvas {
    /// Rings the harmonic with the smallest margin.
    fn ring_worst(&mut self, line: &Line) {
        if line.level >= self.y.range().0 {
            let at = (
                self.x.place(line.frequency_hz / 1e6),
                self.y.place(line.level),
            );
            self.picture.ring(at, 8.0, Pen::solid(BLACK, 1.67));
        }
    }

    /// A marker for every harmonic, and a line over those that stand above both of their neighbours.
    fn draw_variant(&mut self, lines: &[Line], look: Look) {
        let lowest = self.y.range().0;
        let crowded = lines.len() > 60;
        let radius = if crowded { 2.8 } else { 4.2 };
        let mut ridge = Vec::new();
        for (index, line) in lines.iter().enumerate() {
            if line.level < lowest {
                continue;
            }
            let at = (
                self.x.place(line.frequency_hz / 1e6),
                self.y.place(line.level),
            );
            let beside = |other: Option<&Line>| other.is_none_or(|other| other.level <= line.level);
            let before = index.checked_sub(1).and_then(|before| lines.get(before));
            if beside(before) && beside(lines.get(index + 1)) {
                ridge.push(at);
            }
            self.picture
                .marker(look.marker, at, radius, look.pen.colour);
            let box_ = Rect {
                left: at.0,
                top: at.1,
                right: at.0,
                bottom: at.1,
            };
            self.obstacles.add_rect(box_.grown(radius), 20.0);
        }
        self.obstacles.add_line(&ridge, 4.0);
        let pen = Pen {
            width: 1.2,
            ..look.pen
        };
        self.picture.line(&ridge, pen);
    }
}
