//! Finds room for labels: as little as possible may lie under them.

use super::picture::{Point, Rect};

/// What is drawn already, and what it costs to cover it.
#[derive(Debug, Default)]
pub(super) struct Obstacles {
    rects: Vec<(Rect, f64)>,
    segments: Vec<(Point, Point, f64)>,
}

impl Obstacles {
    pub fn add_rect(&mut self, rect: Rect, cost: f64) {
        self.rects.push((rect, cost));
    }

    pub fn add_line(&mut self, points: &[Point], cost: f64) {
        self.segments
            .extend(points.windows(2).map(|pair| (pair[0], pair[1], cost)));
    }

    /// What a label in this place would cover.
    pub fn cost_of_rect(&self, rect: &Rect) -> f64 {
        let rects = self.rects.iter().filter(|(other, _)| overlap(rect, other));
        let segments = self
            .segments
            .iter()
            .filter(|(from, to, _)| crosses(*from, *to, rect));
        rects.map(|(_, cost)| cost).sum::<f64>() + segments.map(|(_, _, cost)| cost).sum::<f64>()
    }

    /// What a leader from one point to another would cover. Crossing other lines is no harm.
    pub fn cost_of_leader(&self, from: Point, to: Point) -> f64 {
        self.rects
            .iter()
            .filter(|(rect, _)| crosses(from, to, rect))
            .map(|(_, cost)| cost)
            .sum()
    }
}

fn overlap(a: &Rect, b: &Rect) -> bool {
    a.left < b.right && b.left < a.right && a.top < b.bottom && b.top < a.bottom
}

/// Whether a straight piece has a part within a rectangle (Liang and Barsky's clipping).
fn crosses(from: Point, to: Point, rect: &Rect) -> bool {
    let (dx, dy) = (to.0 - from.0, to.1 - from.1);
    let (mut enter, mut leave) = (0.0f64, 1.0f64);
    for (step, room) in [
        (-dx, from.0 - rect.left),
        (dx, rect.right - from.0),
        (-dy, from.1 - rect.top),
        (dy, rect.bottom - from.1),
    ] {
        if step == 0.0 {
            if room < 0.0 {
                return false;
            }
        } else if step < 0.0 {
            enter = enter.max(room / step);
        } else {
            leave = leave.min(room / step);
        }
    }
    enter <= leave
}

#[cfg(test)]
mod tests {
    use super::*;

    const BOX: Rect = Rect {
        left: 0.0,
        top: 0.0,
        right: 10.0,
        bottom: 4.0,
    };

    #[test]
    fn a_line_through_a_corner_region_is_told_from_one_past_it() {
        assert!(crosses((-1.0, 3.0), (3.0, -1.0), &BOX));
        assert!(!crosses((-3.0, 1.0), (1.0, -3.0), &BOX));
        assert!(crosses((5.0, 1.0), (5.0, 2.0), &BOX));
        assert!(!crosses((-5.0, 2.0), (-1.0, 2.0), &BOX));
    }

    #[test]
    fn only_what_lies_under_a_label_costs() {
        let mut obstacles = Obstacles::default();
        obstacles.add_rect(BOX, 5.0);
        obstacles.add_line(&[(20.0, -10.0), (20.0, 10.0)], 2.0);
        assert_eq!(obstacles.cost_of_rect(&BOX.grown(20.0)), 7.0);
        assert_eq!(obstacles.cost_of_rect(&BOX), 5.0);
        let beside = Rect {
            left: 12.0,
            right: 15.0,
            ..BOX
        };
        assert_eq!(obstacles.cost_of_rect(&beside), 0.0);
    }
}
