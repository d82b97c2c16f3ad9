//! The JSON of a check. Field names are a contract with whoever reads it.

use std::collections::BTreeMap;

use serde::Serialize;

use super::spread::{SpreadEntry, spread_entry};
use super::{CheckReport, NOTICE, words};
use crate::board::UnusableNet;
use crate::limit::LimitAt;
use crate::radiation::Aim;
use crate::study::{ClampSignal, Harmonic, NetResult, ReceiverSignal, Signal, Worst};

/// The whole report as one JSON object; a number that is not finite is `null`.
pub fn check_json(report: &CheckReport) -> String {
    document(report, report.nets.iter().map(net_entry).collect())
}

/// What a report says of the whole board, around what it says of each net.
pub(super) fn document<Entry: Serialize>(report: &CheckReport, nets: Vec<Entry>) -> String {
    let document = Document {
        notice: NOTICE,
        board: &report.board,
        site: words::site(report.site),
        limits: limit_entries(&report.limits),
        remarks: &report.remarks,
        nets,
        unusable: unusable_entries(&report.unusable),
    };
    text(&document)
}

/// A document as text.
pub(super) fn text(document: &impl Serialize) -> String {
    let mut text = serde_json::to_string_pretty(document)
        .expect("plain structs with text keys always serialise");
    text.push('\n');
    text
}

pub(super) fn limit_entries(limits: &[LimitAt]) -> Vec<LimitEntry<'_>> {
    limits
        .iter()
        .map(|limit| LimitEntry {
            title: &limit.title,
            distance_m: limit.distance_m,
            note: limit.note(),
        })
        .collect()
}

pub(super) fn unusable_entries(nets: &[UnusableNet]) -> Vec<UnusableEntry<'_>> {
    nets.iter()
        .map(|net| UnusableEntry {
            name: &net.name,
            reason: &net.reason,
        })
        .collect()
}

#[derive(Serialize)]
struct Document<'a, Entry> {
    notice: &'static str,
    board: &'a str,
    site: &'static str,
    limits: Vec<LimitEntry<'a>>,
    remarks: &'a [String],
    nets: Vec<Entry>,
    unusable: Vec<UnusableEntry<'a>>,
}

#[derive(Serialize)]
pub(super) struct LimitEntry<'a> {
    title: &'a str,
    distance_m: f64,
    note: Option<String>,
}

#[derive(Serialize)]
pub(super) struct UnusableEntry<'a> {
    name: &'a str,
    reason: &'a str,
}

#[derive(Serialize)]
pub(super) struct NetEntry<'a> {
    name: &'a str,
    clock_hz: f64,
    verdict: &'static str,
    chance_of_failing: Option<f64>,
    worst: Option<WorstEntry<'a>>,
    harmonics: Vec<HarmonicEntry<'a>>,
    signal: SignalEntry<'a>,
    warnings: &'a [String],
    #[serde(skip_serializing_if = "Option::is_none")]
    spread: Option<SpreadEntry<'a>>,
}

#[derive(Serialize)]
pub(super) struct WorstEntry<'a> {
    limit: &'a str,
    harmonic: usize,
    frequency_hz: f64,
    distance_m: f64,
    field_dbuv_per_m: f64,
    limit_dbuv_per_m: f64,
    margin_db: f64,
    mainly: &'static str,
    #[serde(skip_serializing_if = "Option::is_none")]
    antenna: Option<AimEntry>,
}

/// Where the antenna reads a field.
#[derive(Serialize)]
struct AimEntry {
    height_m: f64,
    angle_deg: f64,
    polarisation: &'static str,
}

fn aim_entry(aim: Aim) -> AimEntry {
    AimEntry {
        height_m: aim.antenna_height_m,
        angle_deg: aim.angle_deg,
        polarisation: words::polarisation(aim.polarisation),
    }
}

#[derive(Serialize)]
struct HarmonicEntry<'a> {
    harmonic: usize,
    frequency_hz: f64,
    driver_current_a: f64,
    receiver_voltage_v: BTreeMap<&'a str, f64>,
    fields: Vec<FieldEntry>,
}

#[derive(Serialize)]
struct FieldEntry {
    distance_m: f64,
    field_dbuv_per_m: Option<f64>,
    loop_area_dbuv_per_m: Option<f64>,
    loops_dbuv_per_m: Option<f64>,
    charges_dbuv_per_m: Option<f64>,
    cable_dbuv_per_m: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    antenna: Option<AimEntry>,
}

#[derive(Serialize)]
struct SignalEntry<'a> {
    driver_peak_current_a: f64,
    driver_rms_current_a: f64,
    receivers: Vec<ReceiverEntry<'a>>,
}

#[derive(Serialize)]
struct ReceiverEntry<'a> {
    name: &'a str,
    rest_low_v: f64,
    rest_high_v: f64,
    maximum_v: f64,
    minimum_v: f64,
    overshoot_v: f64,
    undershoot_v: f64,
    ringback_v: f64,
    extra_crossings: usize,
    reaches_thresholds: Option<bool>,
    settling_s: Option<f64>,
    flight_s: Option<f64>,
    clamp_peak_current_a: ClampEntry,
    clamp_charge_c: ClampEntry,
    clamp_power_w: f64,
}

#[derive(Serialize)]
struct ClampEntry {
    low: Option<f64>,
    high: Option<f64>,
}

pub(super) fn net_entry(net: &NetResult) -> NetEntry<'_> {
    NetEntry {
        name: &net.name,
        clock_hz: net.clock_hz,
        verdict: net.verdict.as_str(),
        chance_of_failing: net.chance_of_failing,
        worst: net.worst.as_ref().map(worst_entry),
        harmonics: net
            .harmonics
            .iter()
            .map(|harmonic| harmonic_entry(harmonic, &net.signal))
            .collect(),
        signal: signal_entry(&net.signal),
        warnings: &net.warnings,
        spread: net.spread.as_ref().map(spread_entry),
    }
}

pub(super) fn worst_entry(worst: &Worst) -> WorstEntry<'_> {
    WorstEntry {
        limit: &worst.limit,
        harmonic: worst.harmonic,
        frequency_hz: worst.frequency_hz,
        distance_m: worst.distance_m,
        field_dbuv_per_m: worst.field_dbuv_per_m,
        limit_dbuv_per_m: worst.limit_dbuv_per_m,
        margin_db: worst.margin_db,
        mainly: worst.mechanism.as_str(),
        antenna: worst.aim.map(aim_entry),
    }
}

fn harmonic_entry<'a>(harmonic: &Harmonic, signal: &'a Signal) -> HarmonicEntry<'a> {
    HarmonicEntry {
        harmonic: harmonic.number,
        frequency_hz: harmonic.frequency_hz,
        driver_current_a: harmonic.driver_current_a,
        receiver_voltage_v: signal
            .receivers
            .iter()
            .map(|receiver| receiver.name.as_str())
            .zip(harmonic.receiver_voltage_v.iter().copied())
            .collect(),
        fields: harmonic
            .fields
            .iter()
            .map(|field| FieldEntry {
                distance_m: field.distance_m,
                field_dbuv_per_m: field.field_dbuv_per_m,
                loop_area_dbuv_per_m: field.loop_area_dbuv_per_m,
                loops_dbuv_per_m: field.loops_dbuv_per_m,
                charges_dbuv_per_m: field.charges_dbuv_per_m,
                cable_dbuv_per_m: field.cable_dbuv_per_m,
                antenna: field.aim.map(aim_entry),
            })
            .collect(),
    }
}

fn signal_entry(signal: &Signal) -> SignalEntry<'_> {
    SignalEntry {
        driver_peak_current_a: signal.driver_peak_current_a,
        driver_rms_current_a: signal.driver_rms_current_a,
        receivers: signal
            .receivers
            .iter()
            .map(|receiver| ReceiverEntry {
                name: &receiver.name,
                rest_low_v: receiver.rest_low_v,
                rest_high_v: receiver.rest_high_v,
                maximum_v: receiver.maximum_v,
                minimum_v: receiver.minimum_v,
                overshoot_v: receiver.overshoot_v,
                undershoot_v: receiver.undershoot_v,
                ringback_v: receiver.ringback_v,
                extra_crossings: receiver.extra_crossings,
                reaches_thresholds: receiver.reaches_thresholds,
                settling_s: receiver.settling_s,
                flight_s: receiver.flight_s,
                clamp_peak_current_a: clamp_entry(receiver, |clamp| clamp.peak_a),
                clamp_charge_c: clamp_entry(receiver, |clamp| clamp.charge_c),
                clamp_power_w: receiver.clamp_power_w(),
            })
            .collect(),
    }
}

fn clamp_entry(receiver: &ReceiverSignal, figure: fn(ClampSignal) -> f64) -> ClampEntry {
    ClampEntry {
        low: receiver.low_clamp.map(figure),
        high: receiver.high_clamp.map(figure),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::show::samples;
    use crate::study::Verdict;
    use serde_json::Value;

    fn parsed(report: &CheckReport) -> Value {
        serde_json::from_str(&check_json(report)).expect("valid JSON")
    }

    fn keys(value: &Value) -> Vec<&str> {
        let object = value.as_object().expect("an object");
        object.keys().map(String::as_str).collect()
    }

    #[test]
    fn the_names_are_those_of_the_contract() {
        let json = parsed(&samples::report(vec![samples::net("CAM_PCLK", 48e6, 20)]));
        for key in ["notice", "board", "site", "nets", "unusable", "limits"] {
            assert!(keys(&json).contains(&key), "{key}");
        }
        assert_eq!(json["notice"], NOTICE);
        assert_eq!(json["site"], "open-area");
        let net = &json["nets"][0];
        for key in ["name", "verdict", "worst", "harmonics", "signal"] {
            assert!(keys(net).contains(&key), "{key}");
        }
        assert_eq!(
            keys(&net["worst"]),
            [
                "antenna",
                "distance_m",
                "field_dbuv_per_m",
                "frequency_hz",
                "harmonic",
                "limit",
                "limit_dbuv_per_m",
                "mainly",
                "margin_db"
            ]
        );
        let harmonic = &net["harmonics"][0];
        assert_eq!(
            keys(harmonic),
            [
                "driver_current_a",
                "fields",
                "frequency_hz",
                "harmonic",
                "receiver_voltage_v"
            ]
        );
        assert_eq!(keys(&harmonic["receiver_voltage_v"]), ["cmos-input"]);
        assert_eq!(
            keys(&harmonic["fields"][0]),
            [
                "antenna",
                "cable_dbuv_per_m",
                "charges_dbuv_per_m",
                "distance_m",
                "field_dbuv_per_m",
                "loop_area_dbuv_per_m",
                "loops_dbuv_per_m"
            ]
        );
        let receiver = &net["signal"]["receivers"][0];
        for key in [
            "clamp_peak_current_a",
            "clamp_power_w",
            "extra_crossings",
            "maximum_v",
            "minimum_v",
            "name",
            "overshoot_v",
            "ringback_v",
            "settling_s",
            "undershoot_v",
        ] {
            assert!(keys(receiver).contains(&key), "{key}");
        }
        assert_eq!(keys(&receiver["clamp_peak_current_a"]), ["high", "low"]);
    }

    #[test]
    fn an_unjudged_net_has_no_worst_reading() {
        let mut net = samples::net("BURIED", 48e6, 20);
        net.verdict = Verdict::NotJudged;
        net.worst = None;
        net.chance_of_failing = None;
        let json = parsed(&samples::report(vec![net]));
        assert_eq!(json["nets"][0]["verdict"], "not judged");
        assert_eq!(json["nets"][0]["worst"], Value::Null);
    }

    #[test]
    fn a_number_that_is_not_finite_is_null() {
        let mut net = samples::net("ODD", 48e6, 20);
        net.signal.driver_peak_current_a = f64::NAN;
        net.harmonics[0].fields[0].field_dbuv_per_m = Some(f64::NEG_INFINITY);
        let json = parsed(&samples::report(vec![net]));
        let net = &json["nets"][0];
        assert_eq!(net["signal"]["driver_peak_current_a"], Value::Null);
        assert_eq!(
            net["harmonics"][0]["fields"][0]["field_dbuv_per_m"],
            Value::Null
        );
    }
}
