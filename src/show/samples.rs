//! Made-up results for the tests of this stage.

use crate::board::UnusableNet;
use crate::limit::{Band, Detector, Limit, LimitAt, limits_at};
use crate::radiation::{Aim, Polarisation, Site};
use crate::ringing::{MarchReport, Pace, SettledWaveform, Stretch};
use crate::study::{
    BoardSum, Change, ClampSignal, FieldReading, Harmonic, Mechanism, NetResult, Owner, RankedNet,
    Ranking, ReceiverSignal, Remedy, Signal, SumLevel, SumLine, SumWorst, Tally, Verdict, Worst,
};

use super::{CheckReport, RankReport};

pub(super) const DISTANCES_M: [f64; 2] = [3.0, 10.0];
const STEPS: usize = 4096;

/// 47 CFR 15.109(a), class B at 3 m.
pub(super) fn limit() -> Limit {
    limit_of(
        "47 CFR 15.109 class B",
        3.0,
        &[
            (30e6, 88e6, 40.0),
            (88e6, 216e6, 43.5),
            (216e6, 960e6, 46.0),
            (960e6, 40e9, 54.0),
        ],
    )
}

pub(super) fn limit_of(title: &str, distance_m: f64, bands: &[(f64, f64, f64)]) -> Limit {
    Limit {
        title: title.into(),
        source: None,
        distance_m,
        detector: Detector::QuasiPeak,
        bands: bands
            .iter()
            .map(|&(from_hz, to_hz, level)| Band {
                from_hz,
                to_hz,
                from_dbuv_per_m: level,
                to_dbuv_per_m: level,
                detector: None,
            })
            .collect(),
    }
}

pub(super) fn limits_at_both_distances() -> [LimitAt; 2] {
    DISTANCES_M.map(|distance_m| limits_at(&[limit()], distance_m).remove(0))
}

pub(super) fn report(nets: Vec<NetResult>) -> CheckReport {
    CheckReport {
        board: "Brackwater buoy controller, revision C".into(),
        site: Site::OpenArea,
        distances_m: DISTANCES_M.into(),
        limits: limits_at_both_distances().into(),
        nets,
        unusable: vec![UnusableNet {
            name: "SPARE".into(),
            reason: "it has no path".into(),
        }],
        remarks: vec!["The file does not say what hangs on the board.".into()],
    }
}

/// A ranking of two nets out of seven, with a sum of two lines.
pub(super) fn rank_report() -> RankReport {
    let level = |field_dbuv_per_m: f64| SumLevel {
        field_dbuv_per_m,
        by_power_dbuv_per_m: field_dbuv_per_m - 3.0,
        nets: 7,
        owners: vec![
            owner("CAM_D", field_dbuv_per_m - 1.0, 4.0),
            owner("B", 20.0, 0.5),
        ],
    };
    let line = |frequency_hz: f64, field_dbuv_per_m: f64| SumLine {
        frequency_hz,
        levels: vec![
            Some(level(field_dbuv_per_m)),
            Some(level(field_dbuv_per_m - 10.0)),
        ],
    };
    RankReport {
        board: "Brackwater buoy controller, revision C".into(),
        site: Site::OpenArea,
        distances_m: DISTANCES_M.into(),
        limits: limits_at_both_distances().into(),
        ranking: Ranking {
            listed: vec![ranked("CAM_D", -5.0, 16), ranked("B", 12.0, 1)],
            kept: 5,
            tally: Tally {
                likely_fail: 1,
                marginal: 0,
                likely_pass: 6,
                not_judged: 0,
            },
            unsettled: vec!["B".into()],
            sum: BoardSum {
                lines: vec![line(48e6, 30.0), line(144e6, 50.0)],
                worst: Some(SumWorst {
                    limit: "47 CFR 15.109 class B".into(),
                    frequency_hz: 144e6,
                    distance_m: 3.0,
                    limit_dbuv_per_m: 43.5,
                    margin_db: -6.5,
                    sigma_db: 5.9,
                    chance_of_failing: 0.86,
                    verdict: Verdict::LikelyFail,
                    level: level(50.0),
                }),
            },
            done: 7,
            of: 7,
            has_all_changes: true,
        },
        unusable: vec![UnusableNet {
            name: "nets.csv, row 3".into(),
            reason: "the net has no `name`".into(),
        }],
        remarks: Vec::new(),
    }
}

fn owner(net: &str, field_dbuv_per_m: f64, relief_db: f64) -> Owner {
    Owner {
        net: net.into(),
        field_dbuv_per_m,
        relief_db,
    }
}

fn ranked(name: &str, margin_db: f64, count: u32) -> RankedNet {
    let change = Change {
        remedy: Remedy::SeriesResistor {
            resistance_ohm: 56.0,
        },
        margin_db: margin_db + 9.3,
        gain_db: 9.3,
    };
    let fails = margin_db < 0.0;
    RankedNet {
        place: 1,
        name: name.into(),
        clock_hz: 48e6,
        clock_source: None,
        count,
        layers: vec!["outer".into()],
        verdict: if fails {
            Verdict::LikelyFail
        } else {
            Verdict::LikelyPass
        },
        chance_of_failing: Some(if fails { 0.8 } else { 0.02 }),
        worst: worst(margin_db),
        spread: None,
        sigma_db: 5.9,
        changes: if fails { vec![change] } else { Vec::new() },
        warnings: Vec::new(),
    }
}

/// A net whose field falls off after a hump, with weak even harmonics.
pub(super) fn net(name: &str, clock_hz: f64, harmonics: usize) -> NetResult {
    let level = |number: usize| {
        let frequency_hz = number as f64 * clock_hz;
        let even = if number.is_multiple_of(2) { 14.0 } else { 0.0 };
        40.0 + 8.0 * (frequency_hz / 1.1e8).sin()
            - 20.0 * (frequency_hz / 3e8).max(1.0).log10()
            - even
    };
    NetResult {
        name: name.into(),
        clock_hz,
        verdict: Verdict::LikelyFail,
        chance_of_failing: Some(0.6),
        worst: worst(-1.5),
        harmonics: (1..=harmonics)
            .map(|number| harmonic(number, clock_hz, level(number)))
            .collect(),
        signal: Signal {
            driver_peak_current_a: 0.04,
            driver_rms_current_a: 0.015,
            receivers: vec![receiver("cmos-input")],
        },
        march: MarchReport {
            steps_per_period: STEPS,
            marched_steps: STEPS,
            periods: 12,
            residual: 3e-7,
            settled: true,
        },
        waveform: SettledWaveform {
            pace: Pace {
                step_s: 1.0 / clock_hz / STEPS as f64,
                high: Stretch {
                    marched: STEPS / 2,
                    left_out: 0,
                },
                low: Stretch {
                    marched: STEPS / 2,
                    left_out: 0,
                },
            },
            driver_v: ringing(clock_hz, 0.0, 0.3),
            driver_a: ringing(clock_hz, 0.0, 0.9)
                .iter()
                .map(|v| 0.02 * (v - 1.65))
                .collect(),
            receivers_v: vec![ringing(clock_hz, 0.9e-9, 1.3)],
        },
        warnings: Vec::new(),
        spread: None,
    }
}

const AIM: Option<Aim> = Some(Aim {
    antenna_height_m: 1.4,
    angle_deg: 130.0,
    polarisation: Polarisation::Vertical,
});

pub(super) fn worst(margin_db: f64) -> Option<Worst> {
    Some(Worst {
        limit: "47 CFR 15.109 class B".into(),
        harmonic: 3,
        frequency_hz: 144e6,
        distance_m: 3.0,
        field_dbuv_per_m: 43.5 - margin_db,
        limit_dbuv_per_m: 43.5,
        margin_db,
        mechanism: Mechanism::Charges,
        aim: AIM,
    })
}

pub(super) fn add_receiver(net: &mut NetResult, name: &str) {
    let count = net.signal.receivers.len();
    net.signal.receivers.push(receiver(name));
    let delay_s = (0.9 + 0.6 * count as f64) * 1e-9;
    net.waveform
        .receivers_v
        .push(ringing(net.clock_hz, delay_s, 1.3 - 0.3 * count as f64));
}

fn receiver(name: &str) -> ReceiverSignal {
    ReceiverSignal {
        name: name.into(),
        rest_low_v: 0.0,
        rest_high_v: 3.3,
        maximum_v: 4.5,
        minimum_v: -1.2,
        overshoot_v: 1.2,
        undershoot_v: 1.2,
        ringback_v: 0.8,
        extra_crossings: 0,
        reaches_thresholds: None,
        settling_s: Some(7.4e-9),
        flight_s: Some(1.1e-9),
        low_clamp: Some(ClampSignal {
            peak_a: 0.02,
            charge_c: 30e-12,
            power_w: 1.2e-3,
        }),
        high_clamp: None,
        clamp_rating_a: None,
    }
}

fn harmonic(number: usize, clock_hz: f64, level_dbuv_per_m: f64) -> Harmonic {
    Harmonic {
        number,
        frequency_hz: number as f64 * clock_hz,
        driver_current_a: 0.01 / number as f64,
        receiver_voltage_v: vec![1.5 / number as f64],
        fields: DISTANCES_M
            .iter()
            .map(|distance_m| {
                let field = level_dbuv_per_m - 20.0 * (distance_m / 3.0).log10();
                FieldReading {
                    distance_m: *distance_m,
                    field_dbuv_per_m: Some(field),
                    loop_area_dbuv_per_m: Some(field - 7.0),
                    loops_dbuv_per_m: Some(field - 6.0),
                    charges_dbuv_per_m: Some(field - 5.0),
                    cable_dbuv_per_m: None,
                    aim: AIM,
                }
            })
            .collect(),
    }
}

/// A 3.3 V square wave with damped ringing after each edge.
fn ringing(clock_hz: f64, delay_s: f64, ring_v: f64) -> Vec<f64> {
    let period_s = 1.0 / clock_hz;
    (0..STEPS)
        .map(|step| {
            let time_s = (step as f64 / STEPS as f64 * period_s - delay_s).rem_euclid(period_s);
            let half_s = period_s / 2.0;
            let rising = time_s < half_s;
            let since_ns = (if rising { time_s } else { time_s - half_s }) * 1e9;
            let sign = if rising { 1.0 } else { -1.0 };
            let edge = 1.65 * (2.0 * since_ns.min(1.0) - 1.0);
            1.65 + sign * (edge + ring_v * (-since_ns / 2.5).exp() * (since_ns * 2.4).sin())
        })
        .collect()
}
