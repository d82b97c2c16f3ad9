//! Labels beside what they name, where they cover least.

use super::canvas::toward;
use super::page::{LABEL_SIZE, text};
use super::paint::text_width;
use super::picture::{Marker, Pen, Picture, Point, Rect};
use super::place::Obstacles;
use super::{BLACK, WHITE};

/// What it costs to cover another label or to leave the panel.
pub(super) const COST_LABEL: f64 = 1000.0;
/// How far from its point a label may stand.
const APART: [f64; 7] = [8.0, 14.0, 24.0, 38.0, 56.0, 80.0, 110.0];
const DIRECTIONS: usize = 24;
/// Farther away than this a leader joins them.
const NEAR: f64 = 15.0;

/// Writes words beside the best of some points, with a leader where they stand off; gives where they lie, and keeps
/// that free of others.
pub(super) fn label_near(
    picture: &mut Picture,
    obstacles: &mut Obstacles,
    within: &Rect,
    points: &[Point],
    words: &str,
) -> Option<Rect> {
    let half_width = text_width(words, LABEL_SIZE, false) / 2.0 + 3.0;
    let half_height = LABEL_SIZE / 2.0 + 1.0;
    let mut best: Option<(f64, Point, Rect)> = None;
    for &at in points {
        for apart in APART {
            for direction in 0..DIRECTIONS {
                let angle = direction as f64 / DIRECTIONS as f64 * std::f64::consts::TAU;
                let (sin, cos) = angle.sin_cos();
                let rect = Rect {
                    left: at.0 + (apart + half_width) * cos - half_width,
                    top: at.1 + (apart + half_height) * sin - half_height,
                    right: at.0 + (apart + half_width) * cos + half_width,
                    bottom: at.1 + (apart + half_height) * sin + half_height,
                };
                let end = rect.nearest(at);
                let cost = obstacles.cost_of_rect(&rect.grown(1.0))
                    + 0.3 * obstacles.cost_of_leader(toward(at, end, 6.0), end)
                    + if inside(&rect, within) {
                        0.0
                    } else {
                        COST_LABEL
                    }
                    + 0.15 * apart;
                if best.is_none_or(|(least, _, _)| cost < least) {
                    best = Some((cost, at, rect));
                }
            }
        }
    }
    let (_, at, rect) = best?;
    let end = rect.nearest(at);
    if (end.0 - at.0).hypot(end.1 - at.1) > NEAR {
        picture.line(&[at, end], Pen::solid(BLACK, 0.8));
        picture.marker(Marker::Disc, at, 1.8, BLACK);
    }
    picture.area(&rect.corners(), WHITE, 0.75);
    picture.text(text(
        (rect.left + 3.0, rect.bottom - 3.5),
        words,
        LABEL_SIZE,
    ));
    obstacles.add_rect(rect, COST_LABEL);
    Some(rect)
}

fn inside(rect: &Rect, within: &Rect) -> bool {
    rect.left >= within.left + 2.0
        && rect.right <= within.right - 2.0
        && rect.top >= within.top + 2.0
        && rect.bottom <= within.bottom - 2.0
}
