//! Draws a spectrum into its panel, and finds room for the labels.

use plotters::style::RGBColor;

use super::axis::Axis;
use super::page::{LABEL_SIZE, shortened, text};
use super::paint::text_width;
use super::picture::{Anchor, Marker, Pen, Picture, Point, Rect, Text};
use super::place::Obstacles;
use super::readings::{Line, WorstHere, limit_pieces};
use super::{BLACK, BLUE, GREEN, GREY, ORANGE, PURPLE, VERMILLION, WHITE};
use crate::limit::LimitAt;
use crate::show::words;

/// What each thing in the picture costs to cover with a label.
const COST_LABEL: f64 = 1000.0;
const COST_MARKER: f64 = 20.0;
const COST_LIMIT: f64 = 15.0;
const COST_STEM: f64 = 4.0;
const COST_BESIDE: f64 = 3.0;

/// From line to line of a text in a box.
const BOX_LINE: f64 = LABEL_SIZE + 4.0;
/// Parts of a field stand no farther apart than this.
const MOST_ASIDE: f64 = 7.0;
/// How the parts of a field are told apart, in the order of [`Line::parts`].
pub(super) const PARTS: [(&str, Marker, RGBColor); 3] = [
    ("of it by loops", Marker::Triangle, VERMILLION),
    ("by charged traces", Marker::Square, GREEN),
    ("by cables", Marker::Diamond, ORANGE),
];

/// Radius of the ring around the worst harmonic.
const RING: f64 = 7.0;

/// How the limits differ without colour: each has its own dashes.
fn limit_pen(index: usize) -> Pen {
    const PENS: [(RGBColor, &[f64]); 4] = [
        (VERMILLION, &[11.0, 5.0]),
        (GREEN, &[2.5, 3.5]),
        (PURPLE, &[14.0, 4.0, 2.5, 4.0]),
        (ORANGE, &[22.0, 6.0]),
    ];
    let (colour, dashes) = PENS[index % PENS.len()];
    Pen {
        colour,
        width: 2.0,
        dashes,
    }
}

/// A limit as it lies in the picture.
pub(super) struct DrawnLimit {
    label: String,
    pen: Pen,
    pieces: Vec<Vec<Point>>,
}

/// The picture while it is drawn.
pub(super) struct Canvas {
    pub picture: Picture,
    pub rect: Rect,
    pub x: Axis,
    pub y: Axis,
    pub obstacles: Obstacles,
}

impl Canvas {
    fn point(&self, frequency_hz: f64, level: f64) -> Point {
        (self.x.place(frequency_hz / 1e6), self.y.place(level))
    }

    pub fn draw_harmonics(&mut self, lines: &[Line]) {
        let crowded = lines.len() > 60;
        let (stem, radius) = if crowded { (0.67, 2.6) } else { (1.67, 4.0) };
        let lowest = self.y.range().0;
        for line in lines.iter().filter(|line| line.level >= lowest) {
            let (x, y) = self.point(line.frequency_hz, line.level);
            let foot = [(x, self.rect.bottom), (x, y)];
            self.picture.line(&foot, Pen::solid(BLUE, stem));
            self.picture.marker(Marker::Disc, (x, y), radius, BLUE);
            self.obstacles.add_line(&foot, COST_STEM);
            self.obstacles.add_rect(around((x, y), radius), COST_MARKER);
        }
        for line in lines {
            let Some(level) = line.beside.filter(|level| *level >= lowest) else {
                continue;
            };
            let at = self.point(line.frequency_hz, level);
            self.picture
                .marker(Marker::HollowDiamond, at, radius + 0.4, GREY);
            self.obstacles.add_rect(around(at, radius), COST_BESIDE);
        }
    }

    /// Draws what each harmonic is made of, beside its stem.
    pub fn draw_parts(&mut self, lines: &[Line]) {
        let lowest = self.y.range().0;
        let crowded = lines.len() > 60;
        let radius = if crowded { 2.4 } else { 3.6 };
        let shown: Vec<&Line> = lines.iter().filter(|line| line.level >= lowest).collect();
        for (number, line) in shown.iter().enumerate() {
            let x = self.x.place(line.frequency_hz / 1e6);
            // Total and parts share the way to the next stem.
            let next = shown
                .get(number + 1)
                .or(number.checked_sub(1).map(|i| &shown[i]));
            let gap = next.map_or(MOST_ASIDE, |next| {
                (self.x.place(next.frequency_hz / 1e6) - x).abs() / 4.0
            });
            let aside = gap.min(MOST_ASIDE);
            for ((part, level), slot) in PARTS.iter().zip(line.parts).zip([-1.0, 1.0, 2.0]) {
                let Some(level) = level.filter(|level| *level >= lowest) else {
                    continue;
                };
                let at = (x + slot * aside, self.y.place(level));
                self.picture.marker(part.1, at, radius, part.2);
                self.obstacles.add_rect(around(at, radius), COST_BESIDE);
            }
        }
    }

    /// Draws the limits; gives those that have a part in the picture. They are `grey` where colours tell other things.
    pub fn draw_limits(&mut self, limits: &[&LimitAt], grey: bool) -> Vec<DrawnLimit> {
        let frequencies = self.x.range();
        let frequencies = (frequencies.0 * 1e6, frequencies.1 * 1e6);
        let mut drawn = Vec::new();
        for (index, limit) in limits.iter().enumerate() {
            let pieces: Vec<Vec<Point>> = limit_pieces(limit, frequencies)
                .into_iter()
                .map(|piece| {
                    piece
                        .into_iter()
                        .map(|(hz, level)| self.point(hz, level))
                        .collect()
                })
                .collect();
            if pieces.is_empty() {
                continue;
            }
            let mut pen = limit_pen(index);
            if grey {
                pen.colour = GREY;
            }
            for piece in &pieces {
                self.picture.line(piece, pen);
                self.obstacles.add_line(piece, COST_LIMIT);
            }
            drawn.push(DrawnLimit {
                label: limit_label(limit),
                pen,
                pieces,
            });
        }
        drawn
    }

    /// Writes a limit's name along its line, where it covers least, behind a sample of its dashes.
    pub fn label_limit(&mut self, limit: &DrawnLimit) {
        const SAMPLE: f64 = 30.0;
        const GAP: f64 = 4.0;
        let label = shortened(&limit.label, LABEL_SIZE, false, 0.6 * self.rect.width());
        let width = SAMPLE + 6.0 + text_width(&label, LABEL_SIZE, false) + 6.0;
        let height = LABEL_SIZE + 4.0;

        let mut best: Option<(f64, Rect)> = None;
        let steps = ((self.rect.width() - width) / 8.0).max(0.0) as usize;
        for step in 0..=steps {
            let left = self.rect.left + 6.0 + 8.0 * step as f64;
            let right = left + width;
            let Some((highest, lowest, covered)) = extent(&limit.pieces, left, right) else {
                continue;
            };
            for top in [highest - GAP - height, lowest + GAP] {
                let rect = Rect {
                    left,
                    top,
                    right,
                    bottom: top + height,
                };
                // A label belongs along its line: not beyond its ends, not at a step of it.
                let astray = (1.0 - covered / width) * 200.0 + (lowest - highest);
                let cost = self.obstacles.cost_of_rect(&rect) + astray + self.cost_outside(&rect)
                    // Of equal places, the rightmost.
                    + 0.001 * (self.rect.right - right);
                if best.is_none_or(|(least, _)| cost < least) {
                    best = Some((cost, rect));
                }
            }
        }
        let Some((_, rect)) = best else { return };
        let baseline = rect.bottom - 4.0;
        let middle = baseline - 0.36 * LABEL_SIZE;
        self.picture.area(&rect.corners(), WHITE, 0.8);
        self.picture.line(
            &[
                (rect.left + 3.0, middle),
                (rect.left + 3.0 + SAMPLE, middle),
            ],
            limit.pen,
        );
        self.picture.text(text(
            (rect.left + SAMPLE + 9.0, baseline),
            &label,
            LABEL_SIZE,
        ));
        self.obstacles.add_rect(rect, COST_LABEL);
    }

    /// Rings the harmonic with the smallest margin and joins it to its limit.
    pub fn mark_worst(&mut self, worst: &WorstHere) {
        let marker = self.point(worst.line.frequency_hz, worst.line.level);
        let limit = self.point(worst.line.frequency_hz, worst.limit_level);
        let pen = Pen::solid(BLACK, 1.67);
        self.picture.line(&[marker, limit], pen);
        self.picture
            .line(&[(limit.0 - 5.0, limit.1), (limit.0 + 5.0, limit.1)], pen);
        self.picture.ring(marker, RING, pen);
        self.obstacles
            .add_rect(around(marker, RING + 2.0), COST_LABEL);
        self.obstacles.add_line(&[marker, limit], COST_MARKER);
    }

    /// Says in words what the worst margin is, in a box with a leader, where it covers least.
    pub fn write_callout(&mut self, worst: &WorstHere) {
        let words = callout_words(worst);
        let marker = self.point(worst.line.frequency_hz, worst.line.level);
        let (width, height) = box_size(&words);

        let mut best: Option<(f64, Rect)> = None;
        for row in 0..40 {
            for column in 0..60 {
                let left = self.rect.left
                    + 8.0
                    + f64::from(column) / 59.0 * (self.rect.width() - width - 16.0);
                let top = self.rect.top
                    + 8.0
                    + f64::from(row) / 39.0 * (self.rect.height() - height - 16.0);
                let rect = Rect {
                    left,
                    top,
                    right: left + width,
                    bottom: top + height,
                };
                let end = rect.nearest(marker);
                let length = (end.0 - marker.0).hypot(end.1 - marker.1);
                if length < 22.0 {
                    continue;
                }
                let cost = self.obstacles.cost_of_rect(&rect.grown(3.0))
                    + 0.3
                        * self
                            .obstacles
                            .cost_of_leader(toward(marker, end, 2.0 * RING), end)
                    + 0.04 * length;
                if best.is_none_or(|(least, _)| cost < least) {
                    best = Some((cost, rect));
                }
            }
        }
        if let Some((_, rect)) = best {
            self.draw_box(&rect, marker, &words);
        }
    }

    /// Writes texts about frequencies and levels, which rise in frequency, in boxes side by side along the top, each
    /// with a leader.
    pub fn write_boxes(&mut self, boxes: &[((f64, f64), Vec<String>)]) {
        const GAP: f64 = 8.0;
        let widths: Vec<f64> = boxes.iter().map(|(_, words)| box_size(words).0).collect();
        let mut lefts: Vec<f64> = Vec::with_capacity(boxes.len());
        let mut free = self.rect.left + GAP;
        for (((frequency_hz, level), _), width) in boxes.iter().zip(&widths) {
            let left = (self.point(*frequency_hz, *level).0 - width / 2.0).max(free);
            free = left + width + GAP;
            lefts.push(left);
        }
        let mut free = self.rect.right - GAP;
        for (left, width) in lefts.iter_mut().zip(&widths).rev() {
            *left = left.min(free - width);
            free = *left - GAP;
        }
        for (((frequency_hz, level), words), left) in boxes.iter().zip(lefts) {
            let (width, height) = box_size(words);
            let top = self.rect.top + GAP;
            let rect = Rect {
                left,
                top,
                right: left + width,
                bottom: top + height,
            };
            self.draw_box(&rect, self.point(*frequency_hz, *level), words);
        }
    }

    /// Lines of text, the first in bold, in a box with a leader to a marker.
    fn draw_box(&mut self, rect: &Rect, marker: Point, words: &[String]) {
        let end = rect.nearest(marker);
        self.picture
            .line(&[toward(marker, end, RING), end], Pen::solid(BLACK, 1.0));
        self.picture.area(&rect.corners(), WHITE, 0.9);
        self.picture.outline(rect, Pen::solid(BLACK, 1.0));
        for (index, line) in words.iter().enumerate() {
            let baseline = rect.top + 2.0 + BOX_LINE * (index as f64 + 0.9);
            self.picture.text(Text {
                bold: index == 0,
                ..text((rect.left + 9.0, baseline), line, LABEL_SIZE)
            });
        }
    }

    /// A sentence in the empty upper part of the panel.
    pub fn note(&mut self, sentence: &str, row: usize) {
        let y = self.rect.top + 24.0 + 20.0 * row as f64;
        self.picture.text(Text {
            anchor: Anchor::Middle,
            ..text(
                ((self.rect.left + self.rect.right) / 2.0, y),
                sentence,
                14.0,
            )
        });
    }

    /// What it costs a label to leave the panel.
    fn cost_outside(&self, rect: &Rect) -> f64 {
        let outside = rect.left < self.rect.left + 2.0
            || rect.right > self.rect.right - 2.0
            || rect.top < self.rect.top + 2.0
            || rect.bottom > self.rect.bottom - 2.0;
        if outside { COST_LABEL } else { 0.0 }
    }
}

/// Width and height of a box around lines of text, the first in bold.
fn box_size(words: &[String]) -> (f64, f64) {
    let widths = words
        .iter()
        .enumerate()
        .map(|(index, line)| text_width(line, LABEL_SIZE, index == 0));
    let width = widths.fold(0.0, f64::max) + 18.0;
    (width, BOX_LINE * words.len() as f64 + 9.0)
}

fn callout_words(worst: &WorstHere) -> [String; 3] {
    let (line, margin) = (worst.line, worst.margin());
    let side = if margin < 0.0 { "over" } else { "under" };
    [
        format!("worst margin {margin:.1} dB ({side} the limit)"),
        format!(
            "harmonic {} at {}: {:.1} against {:.1} dBµV/m",
            line.number,
            words::frequency(line.frequency_hz),
            line.level,
            worst.limit_level
        ),
        shortened(&worst.limit.title, LABEL_SIZE, false, 300.0),
    ]
}

fn limit_label(limit: &LimitAt) -> String {
    // Where all of it is moved from one distance; a part of it is left to the table's note.
    let mut stated_m = limit.bands.iter().map(|band| band.stated_distance_m);
    match stated_m.next() {
        Some(first_m)
            if first_m != limit.distance_m && stated_m.all(|other_m| other_m == first_m) =>
        {
            format!("{}, moved from {}", limit.title, words::distance(first_m))
        }
        _ => limit.title.clone(),
    }
}

/// Highest and lowest place of a line between two places, and over how much of the way it runs.
fn extent(pieces: &[Vec<Point>], left: f64, right: f64) -> Option<(f64, f64, f64)> {
    let (mut highest, mut lowest, mut covered) = (f64::INFINITY, f64::NEG_INFINITY, 0.0);
    for pair in pieces.iter().flat_map(|piece| piece.windows(2)) {
        let ((x0, y0), (x1, y1)) = (pair[0], pair[1]);
        let (from, to) = (x0.max(left), x1.min(right));
        if from > to {
            continue;
        }
        for x in [from, to] {
            let y = if x1 > x0 {
                y0 + (x - x0) / (x1 - x0) * (y1 - y0)
            } else {
                y1
            };
            highest = highest.min(y);
            lowest = lowest.max(y);
        }
        covered += to - from;
    }
    highest.is_finite().then_some((highest, lowest, covered))
}

pub(super) fn around((x, y): Point, radius: f64) -> Rect {
    Rect {
        left: x,
        top: y,
        right: x,
        bottom: y,
    }
    .grown(radius)
}

/// The point some way from one towards another.
pub(super) fn toward(from: Point, to: Point, way: f64) -> Point {
    let length = (to.0 - from.0).hypot(to.1 - from.1).max(way);
    (
        from.0 + way / length * (to.0 - from.0),
        from.1 + way / length * (to.1 - from.1),
    )
}
