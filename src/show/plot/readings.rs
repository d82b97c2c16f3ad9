//! What the picture of a spectrum shows: harmonics, limits, and the ranges that hold them.

use crate::limit::{BandAt, LimitAt};
use crate::show::CheckReport;
use crate::study::NetResult;

/// Harmonics that lie further below the highest are left out of the picture, and it says so.
const DEPTH_DB: f64 = 90.0;

/// One harmonic in the picture.
#[derive(Clone, Copy)]
pub(super) struct Line {
    pub number: usize,
    pub frequency_hz: f64,
    pub level: f64,
    /// A level to compare with.
    pub beside: Option<f64>,
    /// What loops, charged traces and cables make of it.
    pub parts: [Option<f64>; 3],
}

/// The harmonic with the smallest margin at a distance.
pub(super) struct WorstHere<'a> {
    pub line: &'a Line,
    pub limit: &'a LimitAt,
    pub limit_level: f64,
}

impl WorstHere<'_> {
    pub fn margin(&self) -> f64 {
        self.limit_level - self.line.level
    }
}

pub(super) fn worst<'a>(
    report: &'a CheckReport,
    distance_m: f64,
    lines: &'a [Line],
) -> Option<WorstHere<'a>> {
    lines
        .iter()
        .filter_map(|line| {
            let (limit, limit_level) = report.tightest_limit(distance_m, line.frequency_hz)?;
            Some(WorstHere {
                line,
                limit,
                limit_level,
            })
        })
        .min_by(|a, b| a.margin().total_cmp(&b.margin()))
}

pub(super) fn lines(net: &NetResult, distance_m: f64) -> Vec<Line> {
    net.harmonics
        .iter()
        .filter_map(|harmonic| {
            let field = harmonic
                .fields
                .iter()
                .find(|f| f.distance_m == distance_m)?;
            Some(Line {
                number: harmonic.number,
                frequency_hz: harmonic.frequency_hz,
                level: field.field_dbuv_per_m.filter(|level| level.is_finite())?,
                beside: field.loop_area_dbuv_per_m.filter(|level| level.is_finite()),
                parts: [
                    field.loops_dbuv_per_m,
                    field.charges_dbuv_per_m,
                    field.cable_dbuv_per_m,
                ]
                .map(|level| level.filter(|level| level.is_finite())),
            })
        })
        .collect()
}

/// From 30 MHz, or the lowest harmonic where that is lower, to a little over the highest.
pub(super) fn frequency_range(net: &NetResult, lines: &[Line]) -> (f64, f64) {
    let lowest = lines.iter().map(|l| l.frequency_hz).fold(30e6, f64::min);
    let highest = net
        .harmonics
        .iter()
        .map(|harmonic| harmonic.frequency_hz)
        .fold(10.0 * lowest, f64::max);
    // Room for the outermost stems beside the frame.
    let room = (highest / lowest).powf(0.015);
    let from = if lowest < 30e6 {
        lowest / room
    } else {
        30e6 / 1.02
    };
    (from, highest * room)
}

/// Whole tens of dB around everything drawn, with room for a label at the top.
pub(super) fn level_range(
    lines: &[Line],
    limits: &[&LimitAt],
    frequencies: (f64, f64),
) -> (f64, f64) {
    let limit_levels: Vec<f64> = limits
        .iter()
        .flat_map(|limit| limit_pieces(limit, frequencies))
        .flatten()
        .map(|(_, level)| level)
        .collect();
    let levels = lines
        .iter()
        .flat_map(|l| [Some(l.level), l.beside].into_iter().chain(l.parts))
        .flatten();
    let highest = levels
        .clone()
        .chain(limit_levels.iter().copied())
        .fold(f64::NEG_INFINITY, f64::max);
    if !highest.is_finite() {
        return (0.0, 60.0);
    }
    let lowest = levels
        .filter(|level| *level > highest - DEPTH_DB)
        .chain(limit_levels.iter().map(|level| level - 20.0))
        .fold(highest - 30.0, f64::min);
    (
        ((lowest - 2.0) / 10.0).floor() * 10.0,
        ((highest + 9.0) / 10.0).ceil() * 10.0,
    )
}

/// A limit within a frequency range as unbroken lines of (frequency, level).
pub(super) fn limit_pieces(limit: &LimitAt, (lowest, highest): (f64, f64)) -> Vec<Vec<(f64, f64)>> {
    let mut pieces: Vec<Vec<(f64, f64)>> = Vec::new();
    let mut end_hz = f64::NAN;
    for BandAt { band, .. } in &limit.bands {
        let (from_hz, to_hz) = (band.from_hz.max(lowest), band.to_hz.min(highest));
        if from_hz >= to_hz {
            continue;
        }
        let slope = (band.to_dbuv_per_m - band.from_dbuv_per_m) / (band.to_hz / band.from_hz).ln();
        let point = |hz: f64| (hz, band.from_dbuv_per_m + slope * (hz / band.from_hz).ln());
        let ends = [point(from_hz), point(to_hz)];
        match pieces.last_mut() {
            Some(piece) if from_hz == end_hz => piece.extend(ends),
            _ => pieces.push(ends.to_vec()),
        }
        end_hz = to_hz;
    }
    pieces
}
