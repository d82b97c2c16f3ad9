//! A picture as a list of shapes, in units of which it is some hundreds wide.

use plotters::style::RGBColor;

use super::paint;

/// A place in a picture: x to the right, y downwards.
pub(super) type Point = (f64, f64);

/// A picture, ready to be painted.
#[derive(Debug, Clone)]
pub struct Picture {
    pub(super) width: f64,
    pub(super) height: f64,
    pub(super) shapes: Vec<Shape>,
}

#[derive(Debug, Clone)]
pub(super) enum Shape {
    Line {
        points: Vec<Point>,
        width: f64,
        colour: RGBColor,
    },
    Area {
        corners: Vec<Point>,
        colour: RGBColor,
        opacity: f64,
    },
    Disc {
        centre: Point,
        radius: f64,
        colour: RGBColor,
    },
    Text(Text),
}

/// A line of text; `at` is on its baseline.
#[derive(Debug, Clone)]
pub(super) struct Text {
    pub at: Point,
    pub text: String,
    pub size: f64,
    pub colour: RGBColor,
    pub anchor: Anchor,
    pub bold: bool,
    /// Reading upwards.
    pub turned: bool,
}

/// Which end of a text its place means.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Anchor {
    Start,
    Middle,
    End,
}

/// How a line is drawn. `dashes` are lengths, drawn and left out in turn; none is a whole line.
#[derive(Debug, Clone, Copy)]
pub(super) struct Pen {
    pub colour: RGBColor,
    pub width: f64,
    pub dashes: &'static [f64],
}

/// The shape of a marker.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Marker {
    Disc,
    Square,
    Triangle,
    Diamond,
    HollowDiamond,
}

/// An upright rectangle.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Rect {
    pub left: f64,
    pub top: f64,
    pub right: f64,
    pub bottom: f64,
}

impl Rect {
    pub fn corners(&self) -> [Point; 4] {
        [
            (self.left, self.top),
            (self.right, self.top),
            (self.right, self.bottom),
            (self.left, self.bottom),
        ]
    }

    pub fn width(&self) -> f64 {
        self.right - self.left
    }

    pub fn height(&self) -> f64 {
        self.bottom - self.top
    }

    pub fn grown(&self, by: f64) -> Rect {
        Rect {
            left: self.left - by,
            top: self.top - by,
            right: self.right + by,
            bottom: self.bottom + by,
        }
    }

    /// The point of the rectangle that lies nearest to another.
    pub fn nearest(&self, point: Point) -> Point {
        (
            point.0.clamp(self.left, self.right),
            point.1.clamp(self.top, self.bottom),
        )
    }
}

impl Pen {
    pub fn solid(colour: RGBColor, width: f64) -> Self {
        Self {
            colour,
            width,
            dashes: &[],
        }
    }
}

impl Picture {
    pub(super) fn new(width: f64, height: f64) -> Self {
        Self {
            width,
            height,
            shapes: Vec::new(),
        }
    }

    /// The picture as a PNG file.
    pub fn png(&self) -> Vec<u8> {
        paint::png(self)
    }

    /// The picture as an SVG file.
    pub fn svg(&self) -> String {
        paint::svg(self)
    }

    pub(super) fn line(&mut self, points: &[Point], pen: Pen) {
        let pieces = if pen.dashes.is_empty() {
            vec![points.to_vec()]
        } else {
            dashed(points, pen.dashes)
        };
        for points in pieces {
            self.shapes.push(Shape::Line {
                points,
                width: pen.width,
                colour: pen.colour,
            });
        }
    }

    pub(super) fn area(&mut self, corners: &[Point], colour: RGBColor, opacity: f64) {
        self.shapes.push(Shape::Area {
            corners: corners.to_vec(),
            colour,
            opacity,
        });
    }

    pub(super) fn outline(&mut self, rect: &Rect, pen: Pen) {
        let [a, b, c, d] = rect.corners();
        self.line(&[a, b, c, d, a, b], pen);
    }

    pub(super) fn text(&mut self, text: Text) {
        self.shapes.push(Shape::Text(text));
    }

    /// A marker that reaches `radius` to every side.
    pub(super) fn marker(&mut self, marker: Marker, (x, y): Point, radius: f64, colour: RGBColor) {
        let diamond = [
            (x, y - radius),
            (x + radius, y),
            (x, y + radius),
            (x - radius, y),
        ];
        match marker {
            Marker::Disc => self.shapes.push(Shape::Disc {
                centre: (x, y),
                radius,
                colour,
            }),
            Marker::Square => {
                let half = 0.85 * radius;
                let square = Rect {
                    left: x - half,
                    top: y - half,
                    right: x + half,
                    bottom: y + half,
                };
                self.area(&square.corners(), colour, 1.0);
            }
            Marker::Triangle => {
                let corners = [
                    (x, y - radius),
                    (x + radius, y + 0.8 * radius),
                    (x - radius, y + 0.8 * radius),
                ];
                self.area(&corners, colour, 1.0);
            }
            Marker::Diamond => self.area(&diamond, colour, 1.0),
            Marker::HollowDiamond => {
                let [a, b, c, d] = diamond;
                self.line(&[a, b, c, d, a, b], Pen::solid(colour, 1.0));
            }
        }
    }

    /// A circle around a point.
    pub(super) fn ring(&mut self, (x, y): Point, radius: f64, pen: Pen) {
        let points: Vec<Point> = (0..=24)
            .map(|step| {
                let angle = f64::from(step) / 24.0 * std::f64::consts::TAU;
                (x + radius * angle.cos(), y + radius * angle.sin())
            })
            .collect();
        self.line(&points, pen);
    }
}

/// The drawn pieces of a dashed line.
fn dashed(points: &[Point], dashes: &[f64]) -> Vec<Vec<Point>> {
    let mut pieces = Vec::new();
    let mut piece: Vec<Point> = points.first().copied().into_iter().collect();
    let mut turn = 0;
    let mut left = dashes[0];
    for pair in points.windows(2) {
        let (mut from, to) = (pair[0], pair[1]);
        loop {
            let length = (to.0 - from.0).hypot(to.1 - from.1);
            if length <= left {
                left -= length;
                if turn % 2 == 0 {
                    piece.push(to);
                }
                break;
            }
            let share = left / length;
            from = (
                from.0 + share * (to.0 - from.0),
                from.1 + share * (to.1 - from.1),
            );
            if turn % 2 == 0 {
                piece.push(from);
                pieces.push(std::mem::take(&mut piece));
            } else {
                piece = vec![from];
            }
            turn += 1;
            left = dashes[turn % dashes.len()];
        }
    }
    if piece.len() > 1 {
        pieces.push(piece);
    }
    pieces
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn dashes_go_round_corners() {
        let pieces = dashed(&[(0.0, 0.0), (3.0, 0.0), (3.0, 7.0)], &[4.0, 2.0]);
        assert_eq!(
            pieces,
            [
                vec![(0.0, 0.0), (3.0, 0.0), (3.0, 1.0)],
                vec![(3.0, 3.0), (3.0, 7.0)],
            ]
        );
    }
}
