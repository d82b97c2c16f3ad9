//! The line spectrum of a net's field at one distance, against the limit lines.

use super::axis::Axis;
use super::canvas::{Canvas, PARTS};
use super::page::{LegendEntry, PANEL_BOTTOM, PANEL_LEFT, PANEL_RIGHT, legend, page, panel};
use super::picture::{Marker, Picture, Rect};
use super::place::Obstacles;
use super::readings::{Line, frequency_range, level_range, lines, worst};
use super::{BLUE, GREY};
use crate::limit::LimitAt;
use crate::show::{CheckReport, words};
use crate::study::NetResult;

/// The spectrum of one net's field at one distance.
pub fn spectrum_picture(report: &CheckReport, net: &NetResult, distance_m: f64) -> Picture {
    drawn(report, net, distance_m, false)
}

/// The same, and beside every stem what loops, charged traces and cables make of it.
pub fn spectrum_parts_picture(report: &CheckReport, net: &NetResult, distance_m: f64) -> Picture {
    drawn(report, net, distance_m, true)
}

fn drawn(report: &CheckReport, net: &NetResult, distance_m: f64, parts: bool) -> Picture {
    let mut lines = lines(net, distance_m);
    if !parts {
        lines.iter_mut().for_each(|line| line.parts = [None; 3]);
    }
    let limits: Vec<&LimitAt> = report.limits_at(distance_m).collect();

    let picture = page(
        &format!(
            "{}: estimated field at {}",
            net.name,
            words::distance(distance_m)
        ),
        &format!(
            "{} · clock {} · {} site",
            report.board,
            words::frequency(net.clock_hz),
            words::site(report.site)
        ),
    );
    let frequencies = frequency_range(net, &lines);
    let levels = level_range(&lines, &limits, frequencies);
    let hidden = lines.iter().filter(|line| line.level < levels.0).count();
    let entries = legend_entries(hidden, &lines);
    let mut canvas = spectrum_canvas(picture, &entries, frequencies, levels);
    canvas.draw_harmonics(&lines);
    canvas.draw_parts(&lines);
    let drawn = canvas.draw_limits(&limits, false);
    let worst = worst(report, distance_m, &lines).filter(|worst| worst.line.level >= levels.0);
    if let Some(worst) = &worst {
        canvas.mark_worst(worst);
    }
    for limit in &drawn {
        canvas.label_limit(limit);
    }
    if let Some(worst) = &worst {
        canvas.write_callout(worst);
    }
    if drawn.is_empty() {
        let distance = words::distance(distance_m);
        canvas.note(
            &format!("No limit line given covers this range at {distance}"),
            0,
        );
    }
    if lines.is_empty() {
        canvas.note("No harmonic in range has a field at this distance", 1);
    }
    canvas.picture
}

/// The empty panel of a spectrum over frequencies in Hz and levels in dBµV/m, below a legend.
pub(super) fn spectrum_canvas(
    mut picture: Picture,
    entries: &[LegendEntry],
    frequencies: (f64, f64),
    levels: (f64, f64),
) -> Canvas {
    let rect = Rect {
        left: PANEL_LEFT,
        top: legend(&mut picture, entries),
        right: PANEL_RIGHT,
        bottom: PANEL_BOTTOM,
    };
    let mut canvas = Canvas {
        x: Axis::log(
            (frequencies.0 / 1e6, frequencies.1 / 1e6),
            (rect.left, rect.right),
        ),
        y: Axis::linear(levels, (rect.bottom, rect.top)),
        rect,
        picture,
        obstacles: Obstacles::default(),
    };
    let titles = (Some("Frequency (MHz)"), "Field strength (dBµV/m)");
    panel(&mut canvas.picture, &rect, &canvas.x, &canvas.y, titles);
    canvas
}

fn legend_entries(hidden: usize, lines: &[Line]) -> Vec<LegendEntry> {
    let entry = |label: &str, marker| LegendEntry {
        label: label.to_string(),
        pen: None,
        marker,
    };
    let mut entries = vec![
        entry("estimate (a stem per harmonic)", Some((Marker::Disc, BLUE))),
        entry(
            "loop-area figure alone, for comparison",
            Some((Marker::HollowDiamond, GREY)),
        ),
    ];
    for (place, (label, marker, colour)) in PARTS.into_iter().enumerate() {
        if lines.iter().any(|line| line.parts[place].is_some()) {
            entries.push(entry(label, Some((marker, colour))));
        }
    }
    match hidden {
        0 => {}
        1 => entries.push(entry("1 weaker harmonic lies below the range shown", None)),
        _ => entries.push(entry(
            &format!("{hidden} weaker harmonics lie below the range shown"),
            None,
        )),
    }
    entries
}

#[cfg(test)]
mod tests {
    use crate::limit::limits_at;
    use crate::show::plot::{spectrum_parts_picture, spectrum_picture};
    use crate::show::{NOTICE, samples};

    #[test]
    fn the_picture_says_what_it_shows() {
        let net = samples::net("A<B", 48e6, 20);
        let svg = spectrum_picture(&samples::report(vec![]), &net, 10.0).svg();
        for words in [
            "A&lt;B: estimated field at 10 m",
            "47 CFR 15.109 class B, moved from 3 m",
            "Frequency (MHz)",
            "Field strength (dBµV/m)",
            "open-area site",
            "worst margin",
            NOTICE,
        ] {
            assert!(svg.contains(words), "{words}");
        }
        assert!(svg.starts_with("<svg width=\"1000\" height=\"620\" viewBox="));
    }

    #[test]
    fn parts_are_drawn_on_request_alone() {
        let mut net = samples::net("CAM_PCLK", 48e6, 20);
        let report = samples::report(vec![]);
        let parts = spectrum_parts_picture(&report, &net, 3.0).svg();
        let plain = spectrum_picture(&report, &net, 3.0).svg();
        for words in ["of it by loops", "by charged traces"] {
            assert!(parts.contains(words) && !plain.contains(words), "{words}");
        }
        assert!(!parts.contains("by cables"));
        // A triangle and a square for each harmonic, beside its stem, and in the legend.
        let areas = |svg: &str| svg.matches("<polygon").count();
        assert_eq!(areas(&parts) - areas(&plain), 2 * (20 + 1));
        for field in net.harmonics.iter_mut().flat_map(|h| &mut h.fields) {
            field.cable_dbuv_per_m = field.field_dbuv_per_m;
        }
        let cabled = spectrum_parts_picture(&report, &net, 3.0).svg();
        assert!(cabled.contains("by cables"));
    }

    #[test]
    fn the_png_is_whole_and_not_blank() {
        let net = samples::net("CAM_PCLK", 48e6, 20);
        let file = spectrum_picture(&samples::report(vec![]), &net, 3.0).png();
        let mut reader = png::Decoder::new(file.as_slice()).read_info().unwrap();
        let mut pixels = vec![0; reader.output_buffer_size()];
        reader.next_frame(&mut pixels).unwrap();
        let dark = pixels.iter().filter(|value| **value < 100).count();
        assert!(dark > 5_000 && dark < pixels.len() / 4, "{dark}");
    }

    #[test]
    fn labels_of_limits_that_nearly_coincide_lie_apart() {
        let net = samples::net("CAM_PCLK", 48e6, 200);
        let mut report = samples::report(vec![]);
        let bands = [(30e6, 1e9, 40.0)];
        let close = [(30e6, 1e9, 40.2)];
        report.limits = limits_at(
            &[
                samples::limit_of("first line", 3.0, &bands),
                samples::limit_of("second line", 3.0, &close),
                samples::limit_of("third line", 3.0, &bands),
            ],
            3.0,
        );
        let svg = spectrum_picture(&report, &net, 3.0).svg();
        let place = |label: &str| -> (f64, f64) {
            let before = &svg[..svg.find(&format!("{label}\n")).unwrap()];
            let tag = &before[before.rfind("<text").unwrap()..];
            let value = |name: &str| -> f64 {
                let rest = &tag[tag.find(name).unwrap() + name.len()..];
                rest[..rest.find('"').unwrap()].parse().unwrap()
            };
            (value(" x=\""), value(" y=\""))
        };
        let places = ["first line", "second line", "third line"].map(place);
        for (index, a) in places.iter().enumerate() {
            for b in &places[index + 1..] {
                // In thirds of a unit: a line of text is about 40 high, these labels 200 long.
                assert!(
                    (a.1 - b.1).abs() > 40.0 || (a.0 - b.0).abs() > 200.0,
                    "{places:?}"
                );
            }
        }
    }

    #[test]
    fn nothing_to_show_is_said_not_hidden() {
        let mut net = samples::net("BURIED", 48e6, 20);
        for field in net.harmonics.iter_mut().flat_map(|h| &mut h.fields) {
            field.field_dbuv_per_m = None;
            field.loop_area_dbuv_per_m = None;
        }
        let mut report = samples::report(vec![]);
        report.limits.clear();
        let svg = spectrum_picture(&report, &net, 3.0).svg();
        assert!(svg.contains("No limit line given covers this range at 3 m"));
        assert!(svg.contains("No harmonic in range has a field"));
    }

    #[test]
    fn numbers_that_are_not_finite_do_not_spoil_a_picture() {
        let mut net = samples::net("ODD", 48e6, 20);
        net.harmonics[3].fields[0].field_dbuv_per_m = Some(f64::NEG_INFINITY);
        net.harmonics[4].fields[0].loop_area_dbuv_per_m = Some(f64::NAN);
        let svg = spectrum_picture(&samples::report(vec![]), &net, 3.0).svg();
        assert!(svg.contains("worst margin"));
    }
}
