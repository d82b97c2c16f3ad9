//! Will a net likely fail a scan?

use super::Mechanism;
use super::signal::signal;
use super::verdict::{Verdict, chance_of_failing, total_sigma_db};
use super::watch::Watch;
use super::{FieldReading, Harmonic, NetResult, Worst};
use crate::board::{Board, Group, Net, Phase};
use crate::limit::{Limit, LimitAt, limits_at};
use crate::radiation::{
    Antenna, LargePlane, Layout, LitSegment, Site, Strongest, WorstOf, lit_segments,
    loop_area_v_per_m, near_field_factor,
};
use crate::ringing::{Network, Settled, settle};
use crate::spectrum::{Spectrum, spectrum};
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
    /// Lowest frequency of the scan.
    pub lowest_frequency_hz: f64,
    /// Top frequency of the scan.
    pub top_frequency_hz: f64,
    /// Spread of what is not modelled.
    pub model_sigma_db: f64,
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

/// What has to be said of a net that stands for several lines.
fn group_remark(group: &Group) -> Option<String> {
    let (step, count) = match group.phase {
        Phase::Locked => ("in step, their worst case", group.count),
        Phase::Independent => ("out of step, added by power", group.count),
    };
    (count > 1).then(|| {
        format!(
            "stands for {count} lines: its field is that of all of them {step} ({:+.1} dB)",
            20.0 * group.gain().log10()
        )
    })
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
    _nets: &[RungNet],
    setup: &CheckSetup,
    _watch: &dyn Watch,
) -> Box<dyn Antenna> {
    match &board.plane {
        Some(plane) => {
            let cables = board.cables.as_deref().unwrap_or_default();
            Box::new(WorstOf::new(plane, cables, setup.top_frequency_hz))
        }
        None => Box::new(LargePlane),
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
    watch.begin("frequencies", shared.len());
    let at_frequency: Vec<Vec<Strongest>> = shared
        .par_iter()
        .map(|shared| {
            let fields = far_fields(antenna, &nets, shared);
            watch.step();
            fields
        })
        .collect();
    let mut of_nets: Vec<Vec<Strongest>> = vec![Vec::new(); nets.len()];
    for (shared, fields) in shared.iter().zip(at_frequency) {
        // Frequencies rise, so each net's harmonics come in order.
        for (&(net, _), field) in shared.harmonics.iter().zip(fields) {
            of_nets[net].push(field);
        }
    }
    let together: Vec<(RungNet, Vec<Strongest>)> = nets.into_iter().zip(of_nets).collect();
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

/// The strongest far field of every harmonic at one frequency, in the order of its list.
fn far_fields(antenna: &dyn Antenna, nets: &[RungNet], shared: &SharedFrequency) -> Vec<Strongest> {
    let lit: Vec<Vec<LitSegment>> = shared
        .harmonics
        .iter()
        .map(|&(number, place)| {
            let net = &nets[number];
            lit_segments(&net.network, &net.layout, &net.spectrum, place)
        })
        .collect();
    antenna.strongest(shared.frequency_hz, &lit)
}

/// Fields and margins of one net, from the strongest far field of each of its harmonics.
fn judge(net: RungNet, far_fields: &[Strongest], setup: &CheckSetup) -> NetResult {
    let harmonics = harmonics(&net, far_fields, setup);
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
    }
}

/// The harmonics with their fields at every distance.
fn harmonics(net: &RungNet, far_fields: &[Strongest], setup: &CheckSetup) -> Vec<Harmonic> {
    let spectrum = &net.spectrum;
    let area_m2 = net.layout.loop_area_m2();
    far_fields
        .iter()
        .enumerate()
        .map(|(place, strongest)| {
            let frequency_hz = spectrum.frequency_hz(place);
            let driver_current_a = spectrum.driver_a[place].norm();
            let reading = |&distance_m: &f64| {
                let at_distance = net.gain
                    * near_field_factor(frequency_hz, distance_m)
                    * setup.site.factor(frequency_hz, distance_m)
                    / distance_m;
                let level = |far_field_v: f64| level_dbuv_per_m(far_field_v * at_distance);
                let loop_v_per_m = net.gain
                    * loop_area_v_per_m(frequency_hz, area_m2, driver_current_a, distance_m);
                FieldReading {
                    distance_m,
                    field_dbuv_per_m: level(strongest.total_v),
                    loop_area_dbuv_per_m: level_dbuv_per_m(loop_v_per_m),
                    loops_dbuv_per_m: level(strongest.loops_v),
                    charges_dbuv_per_m: level(strongest.charges_v),
                    cable_dbuv_per_m: strongest.cables_v.and_then(level),
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
                fields: setup.distances_m.iter().map(reading).collect(),
            }
        })
        .collect()
}

/// A field strength as a level; zero has none.
fn level_dbuv_per_m(field_v_per_m: f64) -> Option<f64> {
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
                    });
                }
            }
        }
    }
    worst
}

/// Bandwidth of the receiver from 30 MHz to 1 GHz (CISPR 16-1-1).
const RECEIVER_BANDWIDTH_HZ: f64 = 120e3;

/// What the user should know about the figures of a net.
fn warnings(
    network: &Network,
    layout: &Layout,
    settled: &Settled,
    spectrum: &Spectrum,
) -> Vec<String> {
    let mut warnings: Vec<String> = network.warnings.iter().map(ToString::to_string).collect();
    if !settled.report.settled {
        warnings.push(format!(
            "did not settle within {} periods; the waveform may still be off by {:.2} % of the swing",
            settled.report.periods,
            settled.report.residual * 100.0
        ));
    }
    if network.inputs.is_empty() {
        warnings.push("has no receiver; its far end is open".into());
    }
    warnings.extend(electrical_length(network).map(str::to_owned));
    if spectrum.clock_hz < RECEIVER_BANDWIDTH_HZ {
        let lines = RECEIVER_BANDWIDTH_HZ / spectrum.clock_hz;
        warnings.push(format!(
            "has {lines:.1} harmonics in the receiver's bandwidth of 120 kHz at once: it may read up to {:.0} dB more than a single one",
            20.0 * lines.log10()
        ));
    }
    if spectrum.is_empty() {
        warnings.push("has no harmonic in the scanned band".into());
    }
    if layout.buried_m > 0.0 {
        warnings.push(format!(
            "{:.0} % of the route lies between two planes, which contain it: the field is that of the outer parts alone",
            100.0 * layout.buried_m / layout.total_m
        ));
    }
    if layout.segments.is_empty() && layout.buried_m == 0.0 {
        warnings.push("no line has a length and a height, so no field can be estimated".into());
    }
    warnings
}

/// How long the net is for its edge.
fn electrical_length(network: &Network) -> Option<&'static str> {
    // common practice, no source: a trace is short when its edge lasts ten flight times and more, long when
    // the first reflection is back after the edge is over
    const SHORT: f64 = 10.0;
    const LONG: f64 = 2.0;
    let mut farthest_s = vec![0.0; network.spans.len()];
    for (number, span) in network.spans.iter().enumerate() {
        farthest_s[number] =
            span.line.delay_s + span.after.map_or(0.0, |before| farthest_s[before]);
    }
    let flight_s = farthest_s.into_iter().fold(0.0, f64::max);
    let edge_s = network.source.shortest_edge_s();
    if flight_s > 0.0 && edge_s > SHORT * flight_s {
        Some("is short for its edge (over ten flight times): it hardly rings, whatever its ends")
    } else if edge_s < LONG * flight_s {
        Some("is long for its edge: the edge is over before the first reflection is back")
    } else {
        None
    }
}
