//! One settled period of a net: voltages above, the driver's current below.

use plotters::style::RGBColor;

use super::axis::Axis;
use super::page::{LegendEntry, PANEL_BOTTOM, PANEL_LEFT, PANEL_RIGHT, legend, page, panel};
use super::picture::{Marker, Pen, Picture, Point, Rect};
use super::{BLACK, BLUE, GREEN, ORANGE, PURPLE, VERMILLION};
use crate::show::{CheckReport, words};
use crate::study::NetResult;

/// Markers on each curve.
const MARKERS: usize = 12;

/// A curve and how it is told from the others.
struct Curve<'a> {
    name: String,
    samples: &'a [f64],
    pen: Pen,
    marker: Marker,
}

/// The waveforms of one net over a settled period.
pub fn waveform_picture(report: &CheckReport, net: &NetResult) -> Picture {
    let wave = &net.waveform;
    let voltages = curves(net);
    let current = Curve {
        name: "driver current".into(),
        samples: &wave.driver_a,
        pen: Pen::solid(BLACK, 1.67),
        marker: Marker::Square,
    };
    let mut picture = page(
        &format!("{}: one settled period", net.name),
        &format!(
            "{} · clock {}{}",
            report.board,
            words::frequency(net.clock_hz),
            if wave.pace.is_whole() {
                ""
            } else {
                " · time at rest before each edge left out"
            }
        ),
    );
    let entries: Vec<LegendEntry> = voltages
        .iter()
        .map(|curve| LegendEntry {
            label: curve.name.clone(),
            pen: Some(curve.pen),
            marker: Some((curve.marker, curve.pen.colour)),
        })
        .collect();
    let top = legend(&mut picture, &entries);
    let split = top + 0.64 * (PANEL_BOTTOM - top);
    let upper = Rect {
        left: PANEL_LEFT,
        top,
        right: PANEL_RIGHT,
        bottom: split,
    };
    let lower = Rect {
        top: split + 14.0,
        bottom: PANEL_BOTTOM,
        ..upper
    };
    let period_ns = wave.pace.step_s * wave.driver_v.len() as f64 * 1e9;
    let time = Axis::linear((0.0, period_ns), (PANEL_LEFT, PANEL_RIGHT));
    draw(
        &mut picture,
        &upper,
        &time,
        None,
        "Voltage (V)",
        1.0,
        &voltages,
    );
    draw(
        &mut picture,
        &lower,
        &time,
        Some("Time from the start of the rising edge (ns)"),
        "Driver current (mA)",
        1e3,
        &[current],
    );
    picture
}

fn curves(net: &NetResult) -> Vec<Curve<'_>> {
    const STYLES: [(RGBColor, &[f64], Marker); 5] = [
        (BLUE, &[], Marker::Disc),
        (VERMILLION, &[9.0, 4.0], Marker::Triangle),
        (GREEN, &[3.0, 3.0], Marker::Diamond),
        (PURPLE, &[12.0, 3.5, 3.0, 3.5], Marker::Disc),
        (ORANGE, &[18.0, 5.0], Marker::Square),
    ];
    let driver = Curve {
        name: "driver".into(),
        samples: &net.waveform.driver_v,
        pen: Pen::solid(BLACK, 1.67),
        marker: Marker::Square,
    };
    let receivers = net.signal.receivers.iter().zip(&net.waveform.receivers_v);
    std::iter::once(driver)
        .chain(receivers.enumerate().map(|(index, (receiver, samples))| {
            let (colour, dashes, marker) = STYLES[index % STYLES.len()];
            Curve {
                name: receiver.name.clone(),
                samples,
                pen: Pen {
                    colour,
                    width: 1.67,
                    dashes,
                },
                marker,
            }
        }))
        .collect()
}

fn draw(
    picture: &mut Picture,
    rect: &Rect,
    time: &Axis,
    time_title: Option<&str>,
    title: &str,
    scale: f64,
    curves: &[Curve],
) {
    let level = Axis::linear(range(curves, scale), (rect.bottom, rect.top));
    panel(picture, rect, time, &level, (time_title, title));
    for (index, curve) in curves.iter().enumerate() {
        let count = curve.samples.len();
        let point = |sample: usize| -> Point {
            (
                rect.left + sample as f64 / count as f64 * rect.width(),
                level.place(scale * curve.samples[sample]),
            )
        };
        let points: Vec<Point> = thinned(curve.samples, 2 * rect.width() as usize)
            .into_iter()
            .map(point)
            .collect();
        picture.line(&points, curve.pen);
        // Each curve has its markers at other times, so that equal curves still show apart.
        for marker in 0..MARKERS {
            let share =
                (marker as f64 + (index as f64 + 0.5) / curves.len() as f64) / MARKERS as f64;
            let sample = (share * count as f64) as usize;
            if sample < count && curve.samples[sample].is_finite() {
                picture.marker(curve.marker, point(sample), 4.0, curve.pen.colour);
            }
        }
    }
}

/// All values with a little room; never empty.
fn range(curves: &[Curve], scale: f64) -> (f64, f64) {
    let values = curves.iter().flat_map(|curve| curve.samples);
    let (low, high) = values
        .filter(|value| value.is_finite())
        .map(|value| value * scale)
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), value| {
            (low.min(value), high.max(value))
        });
    if low > high {
        return (-1.0, 1.0);
    }
    let room = (0.07 * (high - low)).max(1e-3 * high.abs()).max(1e-6);
    (low - room, high + room)
}

/// Which samples to draw: in every stretch its lowest and highest, so that no peak is lost.
pub(super) fn thinned(samples: &[f64], most: usize) -> Vec<usize> {
    let finite = (0..samples.len()).filter(|&index| samples[index].is_finite());
    if samples.len() <= most {
        return finite.collect();
    }
    let stretch = samples.len().div_ceil(most / 2);
    let mut kept: Vec<usize> = Vec::with_capacity(most + 2);
    let indices: Vec<usize> = finite.collect();
    for chunk in indices.chunks(stretch) {
        let by_value = |a: &&usize, b: &&usize| samples[**a].total_cmp(&samples[**b]);
        let (low, high) = (chunk.iter().min_by(by_value), chunk.iter().max_by(by_value));
        kept.extend(low);
        kept.extend(high);
    }
    kept.extend(indices.first());
    kept.extend(indices.last());
    kept.sort_unstable();
    kept.dedup();
    kept
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::show::{NOTICE, samples};

    #[test]
    fn every_receiver_is_named_with_units_and_notice() {
        let mut net = samples::net("CAM_PCLK", 48e6, 20);
        samples::add_receiver(&mut net, "connector J3");
        net.waveform.driver_a[7] = f64::NAN;
        let svg = waveform_picture(&samples::report(vec![]), &net).svg();
        for words in [
            "cmos-input",
            "connector J3",
            "Voltage (V)",
            "Driver current (mA)",
            "edge (ns)",
            NOTICE,
        ] {
            assert!(svg.contains(words), "{words}");
        }
    }

    #[test]
    fn thinning_keeps_the_peaks() {
        let mut samples = vec![0.0; 10_000];
        samples[1234] = 7.0;
        samples[1235] = -7.0;
        let kept = thinned(&samples, 200);
        assert!(kept.len() <= 204);
        assert!(kept.contains(&1234) && kept.contains(&1235));
    }
}
