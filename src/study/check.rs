//! Will a net likely fail a scan?

use super::verdict::{Verdict, chance_of_failing, total_sigma_db};
use super::{FieldReading, Harmonic, NetResult, ReceiverSignal, Signal, Worst};
use crate::board::Net;
use crate::limit::{Limit, LimitAt, limits_at};
use crate::radiation::{
    LargePlane, Layout, Site, loop_area_v_per_m, near_field_factor, strongest_v,
};
use crate::ringing::{Network, Settled, rest_levels_v, settle, steps_per_period};
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
    let steps = steps_per_period(&network, setup.top_frequency_hz);
    let settled = settle(&network, steps);
    let spectrum = spectrum(
        &network,
        &settled,
        setup.lowest_frequency_hz,
        setup.top_frequency_hz,
    );
    let layout = Layout::of(&network, net.along);
    let harmonics = harmonics(&spectrum, &layout, setup);
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
fn harmonics(spectrum: &Spectrum, layout: &Layout, setup: &CheckSetup) -> Vec<Harmonic> {
    let strongest_v = strongest_v(&LargePlane, layout, spectrum);
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

/// What the settled waveform does to the driver and the receivers.
fn signal(network: &Network, settled: &Settled) -> Signal {
    let highest = |samples: &[f64]| samples.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    let lowest = |samples: &[f64]| samples.iter().copied().fold(f64::INFINITY, f64::min);
    let waveform = &settled.waveform;
    let at_rest = rest_levels_v(network, false)
        .into_iter()
        .zip(rest_levels_v(network, true));
    let receivers = network
        .inputs
        .iter()
        .zip(&waveform.receivers_v)
        .zip(at_rest)
        .map(|((input, voltage_v), (low_v, high_v))| {
            let (maximum_v, minimum_v) = (highest(voltage_v), lowest(voltage_v));
            ReceiverSignal {
                name: input.name.clone(),
                maximum_v,
                minimum_v,
                overshoot_v: (maximum_v - high_v).max(0.0),
                undershoot_v: (low_v - minimum_v).max(0.0),
                // A clamp's current rises with the voltage over it.
                low_clamp_peak_a: input.clamps.low_a(minimum_v),
                high_clamp_peak_a: input.clamps.high_a(maximum_v),
            }
        })
        .collect();
    let driver_peak_current_a = highest(&waveform.driver_a).max(-lowest(&waveform.driver_a));
    Signal {
        driver_peak_current_a,
        receivers,
    }
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
