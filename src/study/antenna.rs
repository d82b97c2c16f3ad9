//! The board as an antenna: what unit sources over the middle of its plane read, over frequency.
//!
//! A net is such sources all along its lines, so the curves show at which frequencies the board sends well whatever
//! is on it, and whether that is the plane's doing or the cables'.

use super::check::level_dbuv_per_m;
use super::{CheckSetup, Watch};
use crate::LIGHT_SPEED_M_PER_S;
use crate::board::{Board, Cable, Plane};
use crate::radiation::{
    Antenna, FLOOR_ABSORBED_ABOVE_HZ, Footing, Layout, LitNet, LitSegment, OwnPlane, Reading,
    Segment, Site, TestSite,
};
use num_complex::Complex64;
use rayon::prelude::*;
use std::f64::consts::TAU;
use std::ops::Range;

/// Current of the unit loop, rms.
pub const UNIT_CURRENT_A: f64 = 1e-3;
/// Its area.
pub const UNIT_AREA_M2: f64 = 1e-4;
/// Voltage of the unit charged trace, rms.
pub const UNIT_VOLTAGE_V: f64 = 1.0;
/// Its capacitance,
pub const UNIT_CAPACITANCE_F: f64 = 1e-12;
/// height over the plane,
pub const UNIT_HEIGHT_M: f64 = 1e-3;
/// and length, which the loop has too.
pub const UNIT_LENGTH_M: f64 = 10e-3;

const FROM_HZ: f64 = 30e6;
/// A resonance of a thin cable is some tens of percent wide.
const POINTS_PER_DECADE: f64 = 100.0;
/// A peak stands out by so much from what lies beside it.
const STANDS_OUT_DB: f64 = 2.0;
/// Peaks of the board with and without cables this close, as a share of their frequency, are one.
const SAME_PEAK: f64 = 0.06;

/// What a board reads of unit sources.
#[derive(Debug, Clone, PartialEq)]
pub struct BoardAntenna {
    /// Distance of the antenna.
    pub distance_m: f64,
    /// Rising.
    pub frequencies_hz: Vec<f64>,
    /// The frequencies over which nothing jumps: on the open-area site those over the floor, and those above.
    pub stretches: Vec<Range<usize>>,
    /// Names of the cables; of those of unknown length the strongest of the lengths tried counts.
    pub cables: Vec<String>,
    /// One for each of [`UnitSource::ALL`].
    pub curves: Vec<SourceCurve>,
}

/// A source over the middle of the plane.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum UnitSource {
    /// A loop between trace and plane, the trace along the plane's length.
    LoopAlongLength,
    /// The same along its width.
    LoopAlongWidth,
    /// A short trace of one voltage all along.
    ChargedTrace,
}

impl UnitSource {
    /// All of them.
    pub const ALL: [Self; 3] = [
        Self::LoopAlongLength,
        Self::LoopAlongWidth,
        Self::ChargedTrace,
    ];
}

/// The readings of one source.
#[derive(Debug, Clone, PartialEq)]
pub struct SourceCurve {
    /// Which.
    pub source: UnitSource,
    /// For every frequency; minus infinity where nothing is read.
    pub whole_dbuv_per_m: Vec<f64>,
    /// Without cables, where there are any.
    pub plane_alone_dbuv_per_m: Option<Vec<f64>>,
    /// Where the board sends better than around, by rising frequency.
    pub resonances: Vec<Resonance>,
}

/// A peak of a curve.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Resonance {
    /// Its frequency.
    pub frequency_hz: f64,
    /// Its height.
    pub level_dbuv_per_m: f64,
    /// By how much it stands out.
    pub stands_out_db: f64,
    /// Whose it is.
    pub of: Resonator,
}

/// What resonates.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Resonator {
    /// The plane: it does so without cables too.
    Plane,
    /// The cables, with the plane.
    Cables,
}

/// The readings of unit sources at the first distance of a setup, on its site, from 30 MHz to its top frequency.
///
/// # Errors
///
/// Says in a sentence why there are none: the plane's size is not known, or the band ends below 30 MHz.
pub fn antenna_curves(
    board: &Board,
    setup: &CheckSetup,
    watch: &dyn Watch,
) -> Result<BoardAntenna, String> {
    let no_picture = |why: &str| Err(format!("the board is not shown as an antenna: {why}"));
    let (Some(plane), Some(&distance_m)) = (&board.plane, setup.distances_m.first()) else {
        return no_picture("the file gives no `plane`, and a plane without edges has no resonance");
    };
    if setup.top_frequency_hz <= FROM_HZ {
        return no_picture("the scan ends below 30 MHz, where it would begin");
    }
    let (frequencies_hz, stretches) = frequencies(setup);
    let readings = |cables: &[Cable]| {
        let test_site = TestSite {
            distances_m: vec![distance_m],
            ..setup.test_site()
        };
        levels(plane, cables, test_site, &frequencies_hz, watch)
    };
    let cables = board.cables.as_deref().unwrap_or_default();
    let whole = readings(cables);
    let alone = (!cables.is_empty()).then(|| readings(&[]));
    let peaks = |levels: &[f64]| -> Vec<Peak> {
        let stretches = stretches.iter().cloned();
        stretches
            .flat_map(|stretch| peaks(&frequencies_hz, levels, stretch))
            .collect()
    };
    let curves = UnitSource::ALL.into_iter().zip(whole).enumerate();
    let curves = curves
        .map(|(number, (source, whole_dbuv_per_m))| {
            let alone = alone.as_ref().map(|alone| alone[number].clone());
            let known = alone.as_deref().map(peaks);
            SourceCurve {
                source,
                resonances: peaks(&whole_dbuv_per_m)
                    .into_iter()
                    .map(|peak| peak.resonance(known.as_deref()))
                    .collect(),
                whole_dbuv_per_m,
                plane_alone_dbuv_per_m: alone,
            }
        })
        .collect();
    Ok(BoardAntenna {
        distance_m,
        frequencies_hz,
        stretches,
        cables: cables.iter().map(name).collect(),
        curves,
    })
}

fn name(cable: &Cable) -> String {
    match cable.length_m {
        Some(_) => cable.name.clone(),
        None => format!("{} of unknown length", cable.name),
    }
}

/// Even steps on a logarithmic axis, from end to end of every stretch.
fn frequencies(setup: &CheckSetup) -> (Vec<f64>, Vec<Range<usize>>) {
    let top_hz = setup.top_frequency_hz;
    let mut ends_hz = vec![(FROM_HZ, top_hz)];
    if setup.site == Site::OpenArea && top_hz > FLOOR_ABSORBED_ABOVE_HZ {
        // Just above, where the floor is gone.
        let above_hz = FLOOR_ABSORBED_ABOVE_HZ * (1.0 + 1e-6);
        ends_hz = vec![(FROM_HZ, FLOOR_ABSORBED_ABOVE_HZ), (above_hz, top_hz)];
    }
    let mut frequencies_hz = Vec::new();
    let mut stretches = Vec::new();
    for (from_hz, to_hz) in ends_hz {
        let ratio: f64 = to_hz / from_hz;
        let steps = (POINTS_PER_DECADE * ratio.log10()).ceil().max(1.0);
        let first = frequencies_hz.len();
        let step = |number: usize| from_hz * ratio.powf(number as f64 / steps);
        frequencies_hz.extend((0..=steps as usize).map(step).map(|hz| hz.min(to_hz)));
        stretches.push(first..frequencies_hz.len());
    }
    (frequencies_hz, stretches)
}

/// For every source its levels at all frequencies.
fn levels(
    plane: &Plane,
    cables: &[Cable],
    test_site: TestSite,
    frequencies_hz: &[f64],
    watch: &dyn Watch,
) -> Vec<Vec<f64>> {
    let antenna = OwnPlane::new(plane, cables, test_site, frequencies_hz, watch);
    let layouts = UnitSource::ALL.map(|source| layout(source, plane));
    let footings: Vec<Footing> = layouts.iter().map(|layout| antenna.lay(layout)).collect();
    watch.begin("frequencies", frequencies_hz.len());
    let at_frequency = |&frequency_hz: &f64| -> Vec<f64> {
        let sources = UnitSource::ALL.iter().zip(&layouts).zip(&footings);
        let lit: Vec<LitNet> = sources
            .map(|((&source, layout), footing)| LitNet {
                frequency_hz,
                footing,
                segments: vec![lit(source, &layout.segments[0], frequency_hz)],
            })
            .collect();
        let readings = antenna.readings(frequency_hz, &lit);
        watch.step();
        let level = |reading: &Vec<Reading>| {
            level_dbuv_per_m(reading[0].field_v_per_m).unwrap_or(f64::NEG_INFINITY)
        };
        readings.iter().map(level).collect()
    };
    let by_frequency: Vec<Vec<f64>> = frequencies_hz.par_iter().map(at_frequency).collect();
    (0..UnitSource::ALL.len())
        .map(|source| by_frequency.iter().map(|levels| levels[source]).collect())
        .collect()
}

/// A source over the middle of the plane. Of a loop only the area matters.
fn layout(source: UnitSource, plane: &Plane) -> Layout {
    let (direction, height_m) = match source {
        UnitSource::LoopAlongLength => ([1.0, 0.0], UNIT_AREA_M2 / UNIT_LENGTH_M),
        UnitSource::LoopAlongWidth => ([0.0, 1.0], UNIT_AREA_M2 / UNIT_LENGTH_M),
        UnitSource::ChargedTrace => ([1.0, 0.0], UNIT_HEIGHT_M),
    };
    let middle_m = [plane.length_m / 2.0, plane.width_m / 2.0];
    let start_m = [0, 1].map(|axis| middle_m[axis] - direction[axis] * UNIT_LENGTH_M / 2.0);
    Layout {
        segments: vec![Segment {
            line: 0,
            start_m,
            direction,
            length_m: UNIT_LENGTH_M,
            from_near_m: 0.0,
            from_far_m: 0.0,
            height_m,
            permittivity: 1.0,
        }],
        total_m: UNIT_LENGTH_M,
        ..Layout::default()
    }
}

/// Its waves: a loop has a current and no voltage; the charged trace has two equal waves, which make the same voltage
/// all along since it is so much shorter than they are.
fn lit(source: UnitSource, segment: &Segment, frequency_hz: f64) -> LitSegment<'_> {
    let (propagation_per_m, impedance_ohm, outward_v, inward_v) = match source {
        UnitSource::LoopAlongLength | UnitSource::LoopAlongWidth => {
            let impedance_ohm = 1.0;
            let half_v = impedance_ohm * UNIT_CURRENT_A / 2.0;
            (Complex64::ZERO, impedance_ohm, half_v, -half_v)
        }
        UnitSource::ChargedTrace => {
            let per_m = UNIT_CAPACITANCE_F / UNIT_LENGTH_M;
            let impedance_ohm = 1.0 / (LIGHT_SPEED_M_PER_S * per_m);
            let phase_per_m = TAU * frequency_hz / LIGHT_SPEED_M_PER_S;
            let half_v = UNIT_VOLTAGE_V / 2.0;
            (
                Complex64::new(0.0, phase_per_m),
                impedance_ohm,
                half_v,
                half_v,
            )
        }
    };
    LitSegment {
        segment,
        propagation_per_m,
        impedance_ohm: impedance_ohm.into(),
        outward_v: outward_v.into(),
        inward_v: inward_v.into(),
    }
}

/// A local maximum of a curve.
#[derive(Debug, Clone, Copy)]
struct Peak {
    frequency_hz: f64,
    level: f64,
    stands_out_db: f64,
}

impl Peak {
    /// Whose it is, by the peaks that the plane has alone; where there are no cables it is the plane's.
    fn resonance(self, alone: Option<&[Peak]>) -> Resonance {
        let same = |other: &Peak| (other.frequency_hz / self.frequency_hz - 1.0).abs() < SAME_PEAK;
        let planes = alone.is_none_or(|peaks| peaks.iter().any(same));
        Resonance {
            frequency_hz: self.frequency_hz,
            level_dbuv_per_m: self.level,
            stands_out_db: self.stands_out_db,
            of: if planes {
                Resonator::Plane
            } else {
                Resonator::Cables
            },
        }
    }
}

/// The maxima within a stretch that stand out, each at the peak of a parabola through it.
fn peaks(frequencies_hz: &[f64], levels: &[f64], stretch: Range<usize>) -> Vec<Peak> {
    let (first, levels) = (stretch.start, &levels[stretch]);
    let inner = 1..levels.len().saturating_sub(1);
    let peak = |i: usize| {
        let [left, middle, right] = [levels[i - 1], levels[i], levels[i + 1]];
        if !(middle > left && middle >= right) {
            return None;
        }
        let foot = |beside: &mut dyn Iterator<Item = &f64>| {
            let lower = beside.take_while(|&&level| level <= middle);
            lower.copied().fold(f64::INFINITY, f64::min)
        };
        let feet = [
            foot(&mut levels[..i].iter().rev()),
            foot(&mut levels[i + 1..].iter()),
        ];
        let stands_out_db = middle - feet[0].max(feet[1]);
        let bend = left - 2.0 * middle + right;
        let aside = if bend < 0.0 {
            (left - right) / (2.0 * bend)
        } else {
            0.0
        };
        let step = (frequencies_hz[first + i + 1] / frequencies_hz[first + i - 1]).sqrt();
        (stands_out_db >= STANDS_OUT_DB).then(|| Peak {
            frequency_hz: frequencies_hz[first + i] * step.powf(aside),
            level: middle - (left - right) * aside / 4.0,
            stands_out_db,
        })
    };
    inner.filter_map(peak).collect()
}

#[cfg(test)]
mod tests;
