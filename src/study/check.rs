//! Will a net likely fail a scan?

use super::Mechanism;
use super::explain::Piece;
use super::signal::signal;
use super::verdict::{Verdict, chance_of_failing, total_sigma_db};
use super::warnings::{group_remark, warnings};
use super::{FieldReading, Harmonic, NetResult, Worst};
use crate::board::{Board, Net};
use crate::limit::{Limit, LimitAt, limits_at};
use crate::radiation::{
    self, Antenna, Footing, Heights, LargePlane, Layout, LitNet, LitSegment, OwnPlane, Reading,
    Site, TestSite, lit_segments, loop_area_v_per_m,
};
use crate::ringing::{Network, Settled, settle};
use crate::spectrum::{Spectrum, spectrum};
use crate::watch::Watch;
use rayon::prelude::*;

/// What to measure and against what.
#[derive(Debug, Clone)]
pub struct CheckSetup {
    /// The limit lines.
    pub limits: Vec<Limit>,
    /// Distances of the antenna.
    pub distances_m: Vec<f64>,
    /// The test site.
    pub site: Site,
    /// Its heights.
    pub heights: Heights,
    /// Lowest frequency of the scan.
    pub lowest_frequency_hz: f64,
    /// Top frequency of the scan.
    pub top_frequency_hz: f64,
    /// Spread of what is not modelled.
    pub model_sigma_db: f64,
}

impl CheckSetup {
    /// Few frequencies, one distance.
    #[cfg(test)]
    pub(super) fn for_tests() -> Self {
        Self {
            limits: crate::limit::default_limits(),
            distances_m: vec![3.0],
            site: Site::OpenArea,
            heights: Heights::default(),
            lowest_frequency_hz: 30e6,
            top_frequency_hz: 400e6,
            model_sigma_db: super::MODEL_SIGMA_DB,
        }
    }

    /// Where the antenna stands.
    pub fn test_site(&self) -> TestSite {
        TestSite {
            site: self.site,
            heights: self.heights,
            distances_m: self.distances_m.clone(),
        }
    }
}

/// Why a cable of the board cannot hang as described on the site; `None` if all can.
pub fn cable_objection(board: &Board, setup: &CheckSetup) -> Option<String> {
    let cables = board.cables.as_deref()?;
    radiation::cable_objection(board.plane.as_ref()?, cables, &setup.test_site())
}

/// Every net of a board, in its order, on the board's own antenna; several nets at a time.
pub fn check(board: &Board, setup: &CheckSetup, watch: &dyn Watch) -> Vec<NetResult> {
    let rung = ring_all(&board.nets, board, setup, watch);
    let antenna = board_antenna(board, &rung, setup, watch);
    judge_all(antenna.as_ref(), rung, setup, watch)
}

/// A net that has rung and settled, ready to be laid on an antenna.
#[derive(Debug, Clone)]
pub struct RungNet {
    name: String,
    network: Network,
    settled: Settled,
    spectrum: Spectrum,
    layout: Layout,
    /// What the field of one line is multiplied by.
    gain: f64,
    warnings: Vec<String>,
}

impl RungNet {
    /// Where its radiating lines lie.
    pub(super) fn layout(&self) -> &Layout {
        &self.layout
    }

    /// The net laid on an antenna, at the harmonic at a place of its spectrum.
    pub(super) fn lit<'a>(&'a self, footing: &'a Footing, place: usize) -> LitNet<'a> {
        LitNet {
            frequency_hz: self.spectrum.frequency_hz(place),
            footing,
            segments: lit_segments(&self.network, &self.layout, &self.spectrum, place),
        }
    }

    /// The same by the harmonic's number; `None` where it was not worked out.
    pub(super) fn lit_harmonic<'a>(
        &'a self,
        footing: &'a Footing,
        number: usize,
    ) -> Option<LitNet<'a>> {
        let harmonics = &self.spectrum.harmonics;
        (harmonics.contains(&number)).then(|| self.lit(footing, number - harmonics.start()))
    }
}

/// Ringing and spectrum of one net.
pub fn ring(net: &Net, board: &Board, setup: &CheckSetup) -> RungNet {
    let network = Network::of(net);
    let settled = settle(&network, setup.top_frequency_hz);
    let spectrum = spectrum(
        &network,
        &settled,
        setup.lowest_frequency_hz,
        setup.top_frequency_hz,
    );
    let layout = Layout::of(&network, net, board.plane.as_ref());
    let mut warnings = warnings(&network, &layout, &settled, &spectrum);
    warnings.extend(board.plane.and_then(|plane| layout.place_warning(&plane)));
    warnings.extend(group_remark(&net.group));
    RungNet {
        name: net.name.clone(),
        network,
        settled,
        spectrum,
        layout,
        gain: net.group.gain(),
        warnings,
    }
}

/// Ringing and spectrum of several nets, in their order.
pub fn ring_all(
    nets: &[Net],
    board: &Board,
    setup: &CheckSetup,
    watch: &dyn Watch,
) -> Vec<RungNet> {
    watch.begin("nets", nets.len());
    nets.par_iter()
        .map(|net| {
            let rung = ring(net, board, setup);
            watch.step();
            rung
        })
        .collect()
}

/// The antenna that a board is: its plane with its cables, or without a plane's size, a large plane. It serves
/// these nets, and others with the same harmonics.
pub fn board_antenna(
    board: &Board,
    nets: &[RungNet],
    setup: &CheckSetup,
    watch: &dyn Watch,
) -> Box<dyn Antenna> {
    let test_site = setup.test_site();
    match &board.plane {
        Some(plane) => {
            let frequencies_hz: Vec<f64> = shared_frequencies(nets, 0.0)
                .iter()
                .map(|shared| shared.frequency_hz)
                .collect();
            let cables = board.cables.as_deref().unwrap_or_default();
            Box::new(OwnPlane::new(
                plane,
                cables,
                test_site,
                &frequencies_hz,
                watch,
            ))
        }
        None => Box::new(LargePlane { test_site }),
    }
}

/// Fields and margins of several nets on one antenna, in their order.
pub fn judge_all(
    antenna: &dyn Antenna,
    nets: Vec<RungNet>,
    setup: &CheckSetup,
    watch: &dyn Watch,
) -> Vec<NetResult> {
    let shared = shared_frequencies(&nets, antenna.frequency_share());
    let footings: Vec<Footing> = nets
        .par_iter()
        .map(|net| antenna.lay(&net.layout))
        .collect();
    watch.begin("frequencies", shared.len());
    let at_frequency: Vec<Vec<Vec<Reading>>> = shared
        .par_iter()
        .map(|shared| {
            let fields = readings(antenna, &nets, &footings, shared);
            watch.step();
            fields
        })
        .collect();
    let mut of_nets: Vec<Vec<Vec<Reading>>> = vec![Vec::new(); nets.len()];
    for (shared, fields) in shared.iter().zip(at_frequency) {
        // Frequencies rise, so each net's harmonics come in order.
        for (&(net, _), field) in shared.harmonics.iter().zip(fields) {
            of_nets[net].push(field);
        }
    }
    let together: Vec<(RungNet, Vec<Vec<Reading>>)> = nets.into_iter().zip(of_nets).collect();
    together
        .into_par_iter()
        .map(|(net, fields)| judge(net, &fields, setup))
        .collect()
}

/// One frequency with the nets that have a harmonic there or very near, so that the antenna is worked out once for
/// all.
#[derive(Debug, Clone, PartialEq)]
struct SharedFrequency {
    /// The frequency.
    frequency_hz: f64,
    /// Number of a net and place of the harmonic in its spectrum.
    harmonics: Vec<(usize, usize)>,
}

/// All frequencies of some nets, rising. Those that lie closer together than `share` of themselves are one.
fn shared_frequencies(nets: &[RungNet], share: f64) -> Vec<SharedFrequency> {
    let mut all: Vec<(f64, usize, usize)> = Vec::new();
    for (number, net) in nets.iter().enumerate() {
        let places = 0..net.spectrum.len();
        all.extend(places.map(|place| (net.spectrum.frequency_hz(place), number, place)));
    }
    all.sort_by(|a, b| a.0.total_cmp(&b.0));
    // Multiples of two clocks may differ by a rounding.
    let together =
        |a: &(f64, usize, usize), b: &(f64, usize, usize)| b.0 <= a.0 * (1.0 + share.max(1e-12));
    let mut shared = Vec::new();
    let mut rest = all.as_slice();
    while let Some(first) = rest.first() {
        let count = rest
            .iter()
            .take_while(|other| together(first, other))
            .count();
        let (group, after) = rest.split_at(count);
        rest = after;
        shared.push(SharedFrequency {
            frequency_hz: (first.0 * group[count - 1].0).sqrt(),
            harmonics: group.iter().map(|&(_, net, place)| (net, place)).collect(),
        });
    }
    shared
}

/// The readings of the harmonics that share a frequency, in the order of its list, at every distance.
fn readings(
    antenna: &dyn Antenna,
    nets: &[RungNet],
    footings: &[Footing],
    shared: &SharedFrequency,
) -> Vec<Vec<Reading>> {
    let lit: Vec<LitNet> = shared
        .harmonics
        .iter()
        .map(|&(number, place)| nets[number].lit(&footings[number], place))
        .collect();
    antenna.readings(shared.frequency_hz, &lit)
}

/// The pieces of a net's route with what each contributes to its worst reading; `None` where the reading is not one
/// of the net's.
pub(super) fn segment_readings(
    antenna: &dyn Antenna,
    net: &RungNet,
    worst: &Worst,
    setup: &CheckSetup,
) -> Option<Vec<Piece>> {
    let place = worst
        .harmonic
        .checked_sub(*net.spectrum.harmonics.start())?;
    let mut distances = setup.distances_m.iter();
    let distance = distances.position(|&distance_m| distance_m == worst.distance_m)?;
    let frequency_hz = net.spectrum.frequency_hz(place);
    let whole = lit_segments(&net.network, &net.layout, &net.spectrum, place);
    let footing = antenna.lay(&net.layout);
    let only = |counts: &dyn Fn(usize) -> bool| LitNet {
        frequency_hz,
        footing: &footing,
        segments: whole
            .iter()
            .enumerate()
            .map(|(number, lit)| {
                let share = if counts(number) { 1.0 } else { 0.0 };
                LitSegment {
                    outward_v: share * lit.outward_v,
                    inward_v: share * lit.inward_v,
                    ..*lit
                }
            })
            .collect(),
    };
    let alone = (0..whole.len()).map(|piece| only(&|number| number == piece));
    let without = (0..whole.len()).map(|piece| only(&|number| number != piece));
    let nets: Vec<LitNet> = alone.chain(without).collect();
    let readings = antenna.readings(frequency_hz, &nets);
    let level =
        |number: usize| level_dbuv_per_m(net.gain * readings[number][distance].field_v_per_m);
    let piece = |(number, lit): (usize, &LitSegment)| {
        let segment = lit.segment;
        let half = (-lit.propagation_per_m * segment.length_m / 2.0).exp();
        let (outward, inward) = (lit.outward_v * half, lit.inward_v * half);
        Piece {
            line: segment.line + 1,
            start_m: segment.start_m,
            end_m: [0, 1]
                .map(|axis| segment.start_m[axis] + segment.direction[axis] * segment.length_m),
            length_m: segment.length_m,
            height_m: segment.height_m,
            middle_current_a: ((outward - inward) / lit.impedance_ohm).norm(),
            middle_voltage_v: (outward + inward).norm(),
            alone_dbuv_per_m: level(number),
            rest_dbuv_per_m: level(whole.len() + number),
        }
    };
    Some(whole.iter().enumerate().map(piece).collect())
}

/// Fields and margins of one net, from the readings of each of its harmonics.
fn judge(net: RungNet, readings: &[Vec<Reading>], setup: &CheckSetup) -> NetResult {
    let harmonics = harmonics(&net, readings, setup);
    let worst = worst_reading(&harmonics, setup);
    let chance = worst
        .as_ref()
        .map(|worst| chance_of_failing(worst.margin_db, total_sigma_db(setup.model_sigma_db)));
    NetResult {
        name: net.name,
        clock_hz: net.spectrum.clock_hz,
        verdict: chance.map_or(Verdict::NotJudged, Verdict::of),
        chance_of_failing: chance,
        worst,
        harmonics,
        signal: signal(&net.network, &net.settled),
        march: net.settled.report,
        warnings: net.warnings,
        waveform: net.settled.waveform,
        spread: None,
    }
}

/// The harmonics with their fields at every distance.
fn harmonics(net: &RungNet, readings: &[Vec<Reading>], setup: &CheckSetup) -> Vec<Harmonic> {
    let spectrum = &net.spectrum;
    let area_m2 = net.layout.loop_area_m2();
    readings
        .iter()
        .enumerate()
        .map(|(place, at_distances)| {
            let frequency_hz = spectrum.frequency_hz(place);
            let driver_current_a = spectrum.driver_a[place].norm();
            let reading = |(&distance_m, reading): (&f64, &Reading)| {
                let level = |field_v_per_m: f64| level_dbuv_per_m(net.gain * field_v_per_m);
                let loop_v_per_m =
                    loop_area_v_per_m(frequency_hz, area_m2, driver_current_a, distance_m);
                FieldReading {
                    distance_m,
                    field_dbuv_per_m: level(reading.field_v_per_m),
                    loop_area_dbuv_per_m: level(loop_v_per_m),
                    loops_dbuv_per_m: level(reading.loops_v_per_m),
                    charges_dbuv_per_m: level(reading.charges_v_per_m),
                    cable_dbuv_per_m: reading.cables_v_per_m.and_then(level),
                    aim: reading.aim,
                }
            };
            Harmonic {
                number: spectrum.harmonics.start() + place,
                frequency_hz,
                driver_current_a,
                receiver_voltage_v: spectrum
                    .receivers_v
                    .column(place)
                    .iter()
                    .map(|phasor| phasor.norm())
                    .collect(),
                fields: setup
                    .distances_m
                    .iter()
                    .zip(at_distances)
                    .map(reading)
                    .collect(),
            }
        })
        .collect()
}

/// A field strength as a level; zero has none.
pub(super) fn level_dbuv_per_m(field_v_per_m: f64) -> Option<f64> {
    (field_v_per_m > 0.0).then(|| 20.0 * (field_v_per_m * 1e6).log10())
}

/// The reading with the smallest margin to any limit.
fn worst_reading(harmonics: &[Harmonic], setup: &CheckSetup) -> Option<Worst> {
    let limits: Vec<Vec<LimitAt>> = setup
        .distances_m
        .iter()
        .map(|&distance_m| limits_at(&setup.limits, distance_m))
        .collect();
    let mut worst: Option<Worst> = None;
    for harmonic in harmonics {
        for (reading, limits) in harmonic.fields.iter().zip(&limits) {
            let Some(field_dbuv_per_m) = reading.field_dbuv_per_m else {
                continue;
            };
            for limit in limits {
                let Some(limit_dbuv_per_m) = limit.at(harmonic.frequency_hz) else {
                    continue;
                };
                let margin_db = limit_dbuv_per_m - field_dbuv_per_m;
                if worst
                    .as_ref()
                    .is_none_or(|worst| margin_db < worst.margin_db)
                {
                    worst = Some(Worst {
                        limit: limit.title.clone(),
                        harmonic: harmonic.number,
                        frequency_hz: harmonic.frequency_hz,
                        distance_m: reading.distance_m,
                        field_dbuv_per_m,
                        limit_dbuv_per_m,
                        margin_db,
                        mechanism: Mechanism::ruling(reading),
                        aim: reading.aim,
                    });
                }
            }
        }
    }
    worst
}
