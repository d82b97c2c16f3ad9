//! What every picture has: title, panels with axes, a legend outside the data, the notice.

use plotters::style::RGBColor;

use super::axis::Axis;
use super::paint::text_width;
use super::picture::{Anchor, Marker, Pen, Picture, Rect, Text};
use super::{BLACK, GREY, GRID};
use crate::show::{LABORATORY, NOTICE};

pub(super) const WIDTH: f64 = 1000.0;
pub(super) const HEIGHT: f64 = 620.0;

/// Left and right ends of every panel.
pub(super) const PANEL_LEFT: f64 = 72.0;
pub(super) const PANEL_RIGHT: f64 = WIDTH - 24.0;
/// Where the lowest panel ends.
pub(super) const PANEL_BOTTOM: f64 = HEIGHT - 76.0;

pub(super) const LABEL_SIZE: f64 = 12.5;

const LEGEND_TOP: f64 = 84.0;
const LEGEND_ROW: f64 = 19.0;
const SAMPLE_WIDTH: f64 = 34.0;
const SAMPLE_GAP: f64 = 7.0;

/// An entry of a legend.
pub(super) struct LegendEntry {
    pub label: String,
    pub pen: Option<Pen>,
    pub marker: Option<(Marker, RGBColor)>,
}

/// A page with its title and notice.
pub(super) fn page(title: &str, subtitle: &str) -> Picture {
    let mut picture = Picture::new(WIDTH, HEIGHT);
    let room = PANEL_RIGHT - PANEL_LEFT;
    picture.text(Text {
        bold: true,
        ..text(
            (PANEL_LEFT, 34.0),
            &shortened(title, 19.0, true, room),
            19.0,
        )
    });
    picture.text(Text {
        colour: GREY,
        ..text(
            (PANEL_LEFT, 56.0),
            &shortened(subtitle, 13.0, false, room),
            13.0,
        )
    });
    picture.text(Text {
        bold: true,
        ..text(
            (PANEL_LEFT, HEIGHT - 13.0),
            &format!("{NOTICE}; {LABORATORY}"),
            12.0,
        )
    });
    picture
}

/// Draws a legend in rows under the title; gives where the panels may begin.
pub(super) fn legend(picture: &mut Picture, entries: &[LegendEntry]) -> f64 {
    let (mut x, mut y) = (PANEL_LEFT, LEGEND_TOP);
    for entry in entries {
        let sample = match (entry.pen, entry.marker) {
            (Some(_), _) => SAMPLE_WIDTH,
            (None, Some(_)) => 12.0,
            (None, None) => -SAMPLE_GAP,
        } + SAMPLE_GAP;
        let room = PANEL_RIGHT - PANEL_LEFT - sample;
        let label = shortened(&entry.label, LABEL_SIZE, false, room);
        let width = sample + text_width(&label, LABEL_SIZE, false);
        if x > PANEL_LEFT && x + width > PANEL_RIGHT {
            x = PANEL_LEFT;
            y += LEGEND_ROW;
        }
        let middle = y - 0.36 * LABEL_SIZE;
        if let Some(pen) = entry.pen {
            picture.line(&[(x, middle), (x + SAMPLE_WIDTH, middle)], pen);
        }
        if let Some((marker, colour)) = entry.marker {
            picture.marker(
                marker,
                (x + (sample - SAMPLE_GAP) / 2.0, middle),
                4.0,
                colour,
            );
        }
        picture.text(text((x + sample, y), &label, LABEL_SIZE));
        x += width + 26.0;
    }
    y + 14.0
}

/// Draws the grid, frame and labels of a panel.
pub(super) fn panel(
    picture: &mut Picture,
    rect: &Rect,
    horizontal: &Axis,
    vertical: &Axis,
    titles: (Option<&str>, &str),
) {
    let (horizontal_title, vertical_title) = titles;
    for tick in horizontal.ticks() {
        let x = horizontal.place(tick.value);
        picture.line(&[(x, rect.top), (x, rect.bottom)], Pen::solid(GRID, 0.67));
        if let (Some(label), true) = (&tick.label, horizontal_title.is_some()) {
            picture.line(
                &[(x, rect.bottom), (x, rect.bottom + 5.0)],
                Pen::solid(BLACK, 1.0),
            );
            picture.text(Text {
                anchor: Anchor::Middle,
                ..text((x, rect.bottom + 19.0), label, LABEL_SIZE)
            });
        }
    }
    for tick in vertical.ticks() {
        let y = vertical.place(tick.value);
        picture.line(&[(rect.left, y), (rect.right, y)], Pen::solid(GRID, 0.67));
        picture.line(
            &[(rect.left - 5.0, y), (rect.left, y)],
            Pen::solid(BLACK, 1.0),
        );
        picture.text(Text {
            anchor: Anchor::End,
            ..text(
                (rect.left - 9.0, y + 0.36 * LABEL_SIZE),
                tick.label.as_deref().unwrap_or_default(),
                LABEL_SIZE,
            )
        });
    }
    picture.outline(rect, Pen::solid(BLACK, 1.0));
    if let Some(title) = horizontal_title {
        picture.text(Text {
            anchor: Anchor::Middle,
            ..text(
                ((rect.left + rect.right) / 2.0, rect.bottom + 39.0),
                title,
                13.0,
            )
        });
    }
    picture.text(Text {
        anchor: Anchor::Middle,
        turned: true,
        ..text((24.0, (rect.top + rect.bottom) / 2.0), vertical_title, 13.0)
    });
}

/// A plain black text.
pub(super) fn text(at: (f64, f64), text: &str, size: f64) -> Text {
    Text {
        at,
        text: text.to_string(),
        size,
        colour: BLACK,
        anchor: Anchor::Start,
        bold: false,
        turned: false,
    }
}

/// A text cut to some width, with an ellipsis where something is missing.
pub(super) fn shortened(text: &str, size: f64, bold: bool, room: f64) -> String {
    if text_width(text, size, bold) <= room {
        return text.to_string();
    }
    let mut short = text.to_string();
    while !short.is_empty() && text_width(&format!("{short}…"), size, bold) > room {
        short.pop();
    }
    format!("{}…", short.trim_end())
}
