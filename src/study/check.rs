//! Will a net likely fail a scan?

use super::signal::signal;
use super::verdict::{Verdict, chance_of_failing, total_sigma_db};
use super::{FieldReading, Harmonic, NetResult, Worst};
use crate::board::Net;
use crate::limit::{Limit, LimitAt, limits_at};
use crate::radiation::{
    LargePlane, Layout, Site, loop_area_v_per_m, near_field_factor, strongest_v,
};
use crate::ringing::{Network, Settled, settle};
use crate::spectrum::{Spectrum, spectrum};

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

/// Ringing, spectrum, field and margins of one net.
pub fn check_net(net: &Net, setup: &CheckSetup) -> NetResult {
    let network = Network::of(net);
    let settled = settle(&network, setup.top_frequency_hz);
    let spectrum = spectrum(
        &network,
        &settled,
        setup.lowest_frequency_hz,
        setup.top_frequency_hz,
    );
    let layout = Layout::of(&network, net.along);
    let harmonics = harmonics(&network, &layout, &spectrum, setup);
    let worst = worst_reading(&harmonics, setup);
    let chance = worst
        .as_ref()
        .map(|worst| chance_of_failing(worst.margin_db, total_sigma_db(setup.model_sigma_db)));
    NetResult {
        name: net.name.clone(),
        clock_hz: net.clock_hz,
        verdict: chance.map_or(Verdict::NotJudged, Verdict::of),
        chance_of_failing: chance,
        worst,
        harmonics,
        signal: signal(&network, &settled),
        march: settled.report,
        warnings: warnings(&network, &layout, &settled, &spectrum),
        waveform: settled.waveform,
    }
}

/// The harmonics with their fields at every distance.
fn harmonics(
    network: &Network,
    layout: &Layout,
    spectrum: &Spectrum,
    setup: &CheckSetup,
) -> Vec<Harmonic> {
    let strongest_v = strongest_v(&LargePlane, network, layout, spectrum);
    let area_m2 = layout.loop_area_m2();
    strongest_v
        .into_iter()
        .enumerate()
        .map(|(place, strongest_v)| {
            let frequency_hz = spectrum.frequency_hz(place);
            let driver_current_a = spectrum.driver_a[place].norm();
            let reading = |&distance_m: &f64| {
                let field_v_per_m = strongest_v / distance_m
                    * near_field_factor(frequency_hz, distance_m)
                    * setup.site.factor(frequency_hz, distance_m);
                let loop_v_per_m =
                    loop_area_v_per_m(frequency_hz, area_m2, driver_current_a, distance_m);
                FieldReading {
                    distance_m,
                    field_dbuv_per_m: level_dbuv_per_m(field_v_per_m),
                    loop_area_dbuv_per_m: level_dbuv_per_m(loop_v_per_m),
                    cable_dbuv_per_m: None,
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
                    });
                }
            }
        }
    }
    worst
}

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
