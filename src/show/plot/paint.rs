//! A picture's shapes painted with plotters, as PNG and as SVG.
//!
//! In the PNG, text and lines are set here: plotters drops the side bearings of glyphs, and leaves holes in
//! wide lines that turn sharply.

use std::fmt::Debug;
use std::sync::LazyLock;

use ab_glyph::{Font, FontRef, PxScale, ScaleFont, point};
use plotters::backend::{BitMapBackend, DrawingBackend, SVGBackend};
use plotters::style::text_anchor::{HPos, Pos, VPos};
use plotters::style::{
    Color, FontStyle, FontTransform, IntoFont, RGBAColor, RGBColor, ShapeStyle, TextStyle,
};

use super::picture::{Anchor, Picture, Point, Shape, Text};

/// The embedded font, and what an SVG reader without it takes instead.
const FONT: &str = "Noto Sans, Liberation Sans, Arial, Helvetica, sans-serif";

static REGULAR: LazyLock<FontRef> = LazyLock::new(|| embedded(notosans::REGULAR_TTF));
static BOLD: LazyLock<FontRef> = LazyLock::new(|| embedded(notosans::BOLD_TTF));

/// Backends know whole pixels only, so everything is drawn three times as large.
const SCALE: f64 = 3.0;

/// The PNG is the mean of this many drawn pixels each way: smooth edges.
const SHRINK: usize = 2;

type Pixel = (i32, i32);

const IN_MEMORY: &str = "painting into memory with the embedded font cannot fail";

pub(super) fn png(picture: &Picture) -> Vec<u8> {
    let (width, height) = pixels(picture);
    let mut large = vec![255; 3 * width * height];
    {
        let mut backend = BitMapBackend::with_buffer(&mut large, (width as u32, height as u32));
        for shape in &picture.shapes {
            match shape {
                Shape::Line {
                    points,
                    width,
                    colour,
                } => stroke(&mut backend, points, *width, *colour),
                Shape::Text(text) => set_text(&mut backend, text),
                other => draw(&mut backend, other),
            }
        }
    }
    let small = shrunk(&large, width, height);
    let mut file = Vec::new();
    let mut encoder =
        png::Encoder::new(&mut file, (width / SHRINK) as u32, (height / SHRINK) as u32);
    encoder.set_color(png::ColorType::Rgb);
    encoder.set_depth(png::BitDepth::Eight);
    encoder.set_compression(png::Compression::Fast);
    encoder.set_filter(png::FilterType::Up);
    let mut writer = encoder.write_header().expect(IN_MEMORY);
    writer.write_image_data(&small).expect(IN_MEMORY);
    writer.finish().expect(IN_MEMORY);
    file
}

pub(super) fn svg(picture: &Picture) -> String {
    let (width, height) = pixels(picture);
    let mut text = String::new();
    {
        let mut backend = SVGBackend::with_string(&mut text, (width as u32, height as u32));
        backend
            .draw_rect(
                (0, 0),
                (width as i32, height as i32),
                &style(RGBColor(255, 255, 255).to_rgba(), 0.0),
                true,
            )
            .expect(IN_MEMORY);
        for shape in &picture.shapes {
            draw(&mut backend, shape);
        }
        backend.present().expect(IN_MEMORY);
    }
    // Shown at the picture's own size; the view box keeps the finer units.
    text.replacen(
        &format!("width=\"{width}\" height=\"{height}\""),
        &format!("width=\"{}\" height=\"{}\"", picture.width, picture.height),
        1,
    )
}

/// How wide a text is, in the units of the picture.
pub(super) fn text_width(text: &str, size: f64, bold: bool) -> f64 {
    let font = font(bold).as_scaled(font_scale(size));
    let advances = text
        .chars()
        .map(|letter| font.h_advance(font.glyph_id(letter)));
    f64::from(advances.sum::<f32>())
}

fn pixels(picture: &Picture) -> (usize, usize) {
    let pixels = |length: f64| (length * SCALE) as usize / SHRINK * SHRINK;
    (pixels(picture.width), pixels(picture.height))
}

fn draw<B: DrawingBackend>(backend: &mut B, shape: &Shape)
where
    B::ErrorType: Debug,
{
    match shape {
        Shape::Line {
            points,
            width,
            colour,
        } => {
            let points = points.iter().copied().map(pixel);
            backend.draw_path(points, &style(colour.to_rgba(), *width))
        }
        Shape::Area {
            corners,
            colour,
            opacity,
        } => {
            let corners = corners.iter().copied().map(pixel);
            backend.fill_polygon(corners, &style(colour.mix(*opacity), 0.0))
        }
        Shape::Disc {
            centre,
            radius,
            colour,
        } => {
            let radius = (radius * SCALE).round() as u32;
            let style = style(colour.to_rgba(), 0.0);
            backend.draw_circle(pixel(*centre), radius, &style, true)
        }
        Shape::Text(text) => {
            let (at, style) = text_style(text);
            backend.draw_text(&text.text, &style, at)
        }
    }
    .expect(IN_MEMORY);
}

/// Draws a line of some width: square at its ends, round where its pieces join.
fn stroke(backend: &mut BitMapBackend, points: &[Point], width: f64, colour: RGBColor) {
    let reach = width * SCALE / 2.0;
    let points: Vec<Point> = points.iter().map(|(x, y)| (x * SCALE, y * SCALE)).collect();
    for (index, pair) in points.windows(2).enumerate() {
        let ((x0, y0), (x1, y1)) = (pair[0], pair[1]);
        let length = (x1 - x0).hypot(y1 - y0).max(1e-9);
        let (along_x, along_y) = ((x1 - x0) / length, (y1 - y0) / length);
        let rows = (y0.min(y1) - reach) as i32..=(y0.max(y1) + reach) as i32;
        let columns = (x0.min(x1) - reach) as i32..=(x0.max(x1) + reach) as i32;
        for (y, x) in rows.flat_map(|y| columns.clone().map(move |x| (y, x))) {
            let (dx, dy) = (f64::from(x) + 0.5 - x0, f64::from(y) + 0.5 - y0);
            let along = dx * along_x + dy * along_y;
            let across = (dx * along_y - dy * along_x).abs();
            let on_piece = across <= reach && (0.0..=length).contains(&along);
            let on_join = index > 0 && dx.hypot(dy) <= reach;
            if on_piece || on_join {
                backend
                    .draw_pixel((x, y), colour.to_backend_color())
                    .expect(IN_MEMORY);
            }
        }
    }
}

/// Place and style of a text for the SVG backend.
fn text_style(text: &Text) -> (Pixel, TextStyle<'_>) {
    // The backend divides the size by 1.24, and sets the baseline 0.76 em below the place.
    let drop = 0.76 * text.size;
    let (at, turn) = if text.turned {
        ((text.at.0 - drop, text.at.1), FontTransform::Rotate270)
    } else {
        ((text.at.0, text.at.1 - drop), FontTransform::None)
    };
    let weight = if text.bold {
        FontStyle::Bold
    } else {
        FontStyle::Normal
    };
    let anchor = match text.anchor {
        Anchor::Start => HPos::Left,
        Anchor::Middle => HPos::Center,
        Anchor::End => HPos::Right,
    };
    let font = (FONT, 1.24 * text.size * SCALE).into_font();
    let style = TextStyle::from(font.style(weight).transform(turn))
        .color(&text.colour)
        .pos(Pos::new(anchor, VPos::Top));
    (pixel(at), style)
}

/// Sets a text glyph by glyph.
fn set_text(backend: &mut BitMapBackend, text: &Text) {
    let font = font(text.bold);
    let scale = font_scale(text.size * SCALE);
    let width = text_width(&text.text, text.size * SCALE, text.bold) as f32;
    let mut along = match text.anchor {
        Anchor::Start => 0.0,
        Anchor::Middle => -width / 2.0,
        Anchor::End => -width,
    };
    let (x0, y0) = pixel(text.at);
    for letter in text.text.chars() {
        let id = font.glyph_id(letter);
        let glyph = id.with_scale_and_position(scale, point(along, 0.0));
        along += font.as_scaled(scale).h_advance(id);
        let Some(outline) = font.outline_glyph(glyph) else {
            continue;
        };
        let corner = outline.px_bounds().min;
        outline.draw(|x, y, coverage| {
            let (x, y) = (corner.x as i32 + x as i32, corner.y as i32 + y as i32);
            let (x, y) = if text.turned { (y, -x) } else { (x, y) };
            let colour = text.colour.mix(f64::from(coverage));
            backend
                .draw_pixel((x0 + x, y0 + y), colour.to_backend_color())
                .expect(IN_MEMORY);
        });
    }
}

fn font(bold: bool) -> &'static FontRef<'static> {
    if bold { &BOLD } else { &REGULAR }
}

/// Noto Sans is 1.362 em from ascender to descender, which is what the rasteriser calls its size.
fn font_scale(size: f64) -> PxScale {
    PxScale::from((1.362 * size) as f32)
}

fn embedded(bytes: &'static [u8]) -> FontRef<'static> {
    FontRef::try_from_slice(bytes).expect("the embedded font is sound")
}

fn style(colour: RGBAColor, width: f64) -> ShapeStyle {
    ShapeStyle {
        color: colour,
        filled: true,
        stroke_width: (width * SCALE).round() as u32,
    }
}

fn pixel((x, y): Point) -> Pixel {
    ((x * SCALE).round() as i32, (y * SCALE).round() as i32)
}

/// The mean over squares of [`SHRINK`] pixels.
fn shrunk(large: &[u8], width: usize, height: usize) -> Vec<u8> {
    let mut small = Vec::with_capacity(large.len() / (SHRINK * SHRINK));
    for y in (0..height).step_by(SHRINK) {
        for x in (0..width).step_by(SHRINK) {
            for channel in 0..3 {
                let mut sum = 0;
                for dy in 0..SHRINK {
                    for dx in 0..SHRINK {
                        sum += usize::from(large[3 * ((y + dy) * width + x + dx) + channel]);
                    }
                }
                small.push((sum / (SHRINK * SHRINK)) as u8);
            }
        }
    }
    small
}
