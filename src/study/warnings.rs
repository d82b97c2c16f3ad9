//! What the user should know about the figures of a net.

use crate::board::{Group, Phase};
use crate::radiation::Layout;
use crate::ringing::{Network, Settled};
use crate::spectrum::Spectrum;

/// What has to be said of a net that stands for several lines.
pub(super) fn group_remark(group: &Group) -> Option<String> {
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

/// Bandwidth of the receiver from 30 MHz to 1 GHz (CISPR 16-1-1).
const RECEIVER_BANDWIDTH_HZ: f64 = 120e3;

/// What the user should know about the figures of a net.
pub(super) fn warnings(
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
