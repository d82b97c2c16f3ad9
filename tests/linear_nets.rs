//! What holds for every net without clamps, whatever its parts: its response is in proportion to its sources and
//! adds up; and a trace cut in two stays the same.

mod oracle;

use oracle::build::{branch, driver, line, net, receiver, series, shunt, shunt_rlc, trace_on, via};
use oracle::run;
use ringfield::board::{Driver, Layer, PathItem, Structure};
use ringfield::ringing::SettledWaveform;
use ringfield::spectrum::Spectrum;
use std::sync::Arc;

const TOP_HZ: f64 = 1e9;
/// The march stops within a millionth of the swing.
const WITHIN: f64 = 5e-6;

fn trace(length_m: f64) -> PathItem {
    let layer = Layer {
        name: "outer".into(),
        structure: Structure::Microstrip { height_m: 101.6e-6 },
        permittivity: 4.3,
        loss_tangent: 0.02,
        copper_m: 35e-6,
        roughness_m: 0.0,
    };
    trace_on(&Arc::new(layer), 101.6e-6, length_m)
}

/// Paths whose only source beside the driver is a rail of some voltage.
fn paths(rail_v: f64) -> Vec<Vec<PathItem>> {
    let end = || receiver("end", 5e-12);
    vec![
        vec![line(65.0, 0.87e-9), end()],
        vec![line(65.0, 0.87e-9), end(), shunt(300.0, rail_v)],
        vec![trace(0.15), shunt(130.0, rail_v), shunt(130.0, 0.0), end()],
        vec![
            series(22.0),
            trace(0.05),
            branch(vec![line(80.0, 13e-12), receiver("leg", 3e-12)]),
            via(0.8e-9, 0.4e-12),
            trace(0.003),
            shunt_rlc(64.0, 1e-9, 100e-12),
            shunt(500.0, rail_v),
            end(),
        ],
    ]
}

/// All of them at a usual clock; at a slow one, whose time at rest is left out, one is enough.
fn cases() -> [(f64, Vec<Vec<PathItem>>); 2] {
    let mut one = paths(0.0);
    one.truncate(1);
    [(48e6, paths(0.0)), (0.1e6, one)]
}

/// Steady, and with two states: the latter changes with time, but not with voltage.
fn drivers(low_v: f64, swing_v: f64) -> [Driver; 2] {
    let steady = Driver {
        low_v,
        high_v: low_v + swing_v,
        ..driver(swing_v, 8.0, 0.8e-9)
    };
    let two_state = Driver {
        high_resistance_ohm: 30.0,
        ..steady.clone()
    };
    [steady, two_state]
}

fn waveform(driver: &Driver, clock_hz: f64, path: Vec<PathItem>) -> SettledWaveform {
    let net = net("linear", driver.clone(), clock_hz, path);
    run::settled(&net, TOP_HZ).1.waveform
}

/// Every sample of every voltage, and of the driver's current at 50 ohm.
fn samples(waveform: &SettledWaveform) -> Vec<f64> {
    let mut samples = waveform.driver_v.clone();
    samples.extend(waveform.driver_a.iter().map(|a| 50.0 * a));
    samples.extend(waveform.receivers_v.iter().flatten());
    samples
}

/// The largest value of a sum of waveforms, each times a factor.
fn largest(sum: &[(f64, &SettledWaveform)]) -> f64 {
    let pace = sum[0].1.pace;
    let terms: Vec<(f64, Vec<f64>)> = sum
        .iter()
        .map(|&(factor, waveform)| {
            assert_eq!(waveform.pace, pace);
            (factor, samples(waveform))
        })
        .collect();
    (0..terms[0].1.len())
        .map(|place| {
            let sum: f64 = terms
                .iter()
                .map(|(factor, samples)| factor * samples[place])
                .sum();
            sum.abs()
        })
        .fold(0.0, f64::max)
}

#[test]
fn twice_the_swing_is_twice_the_response() {
    for (clock_hz, paths) in cases() {
        for number in [0, 1] {
            for path in &paths {
                let [one, two] = [1.0, 2.0].map(|swing_v| {
                    waveform(&drivers(0.0, swing_v)[number], clock_hz, path.clone())
                });
                let off_v = largest(&[(2.0, &one), (-1.0, &two)]);
                assert!(off_v < 2.0 * WITHIN, "driver {number}: {off_v:e} V");
            }
        }
    }
}

/// A driver from 1 V to 4.3 V is one from 0 V to 3.3 V and one that stands at 1 V: the first and second differ by
/// as much as the second and third, from 2 V.
#[test]
fn levels_add() {
    for (clock_hz, paths) in cases() {
        for number in [0, 1] {
            for path in &paths {
                let [none, one, two] = [0.0, 1.0, 2.0]
                    .map(|low_v| waveform(&drivers(low_v, 3.3)[number], clock_hz, path.clone()));
                let off_v = largest(&[(1.0, &none), (-2.0, &one), (1.0, &two)]);
                assert!(off_v < 4.0 * WITHIN * 3.3, "driver {number}: {off_v:e} V");
                // An open net stands at its driver's level.
                if number == 0 && path.len() == 2 {
                    let places = one.receivers_v[0].iter().zip(&none.receivers_v[0]);
                    for (one, none) in places {
                        assert!((one - none - 1.0).abs() < 2.0 * WITHIN * 3.3);
                    }
                }
            }
        }
    }
}

#[test]
fn rails_add() {
    for number in [0, 1] {
        let with = |rail_v: f64, place: usize, swing_v: f64| {
            waveform(
                &drivers(0.0, swing_v)[number],
                48e6,
                paths(rail_v).swap_remove(place),
            )
        };
        for place in 1..paths(0.0).len() {
            let [none, one, three] = [0.0, 1.0, 3.0].map(|rail_v| with(rail_v, place, 3.3));
            let off_v = largest(&[(2.0, &none), (-3.0, &one), (1.0, &three)]);
            assert!(
                off_v < 6.0 * WITHIN * 3.3,
                "driver {number}, path {place}: {off_v:e} V"
            );
            // Half of everything is half.
            let half = with(1.5, place, 1.65);
            let off_v = largest(&[(1.0, &three), (-2.0, &half)]);
            assert!(
                off_v < 3.0 * WITHIN * 3.3,
                "driver {number}, path {place}: {off_v:e} V"
            );
        }
    }
}

fn harmonics(path: Vec<PathItem>, clock_hz: f64) -> Spectrum {
    let net = net("trace", driver(3.3, 3.0, 0.8e-9), clock_hz, path);
    run::harmonics(&net, 30e6, TOP_HZ)
}

/// The largest difference over driver current and first receiver, dB, within 50 dB of the strongest.
fn largest_difference_db(one: &Spectrum, other: &Spectrum) -> f64 {
    let voltages = [one, other].map(|spectrum| spectrum.receivers_v.row(0).to_vec());
    [
        [&one.driver_a, &other.driver_a],
        [&voltages[0], &voltages[1]],
    ]
    .iter()
    .map(|[one, other]| {
        let strongest = one.iter().map(|phasor| phasor.norm()).fold(0.0, f64::max);
        one.iter()
            .zip(*other)
            .filter(|(one, _)| one.norm() > strongest * 10f64.powf(-50.0 / 20.0))
            .map(|(one, other)| 20.0 * (other.norm() / one.norm()).log10().abs())
            .fold(0.0, f64::max)
    })
    .fold(0.0, f64::max)
}

/// Pieces that carry waves of their own. A shorter piece than two steps, here 3.3 mm, is a pi section whose copper has the
/// resistance of one frequency: sharp resonances far from it come out up to 0.07 dB off.
#[test]
fn a_lossy_trace_cut_in_two_stays_the_same() {
    const SHORTEST_M: f64 = 3.3e-3;
    for clock_hz in [8e6, 48e6] {
        for length_m in [0.05, 0.15, 0.4] {
            let end = || receiver("end", 5e-12);
            let whole = harmonics(vec![trace(length_m), end()], clock_hz);
            for share in [0.5, 0.37, 0.03, 0.004] {
                let pieces_m = [share * length_m, (1.0 - share) * length_m];
                let cut = vec![trace(pieces_m[0]), trace(pieces_m[1]), end()];
                let off_db = largest_difference_db(&whole, &harmonics(cut, clock_hz));
                let allowed_db = if pieces_m[0] > SHORTEST_M { 0.02 } else { 0.1 };
                assert!(
                    off_db < allowed_db,
                    "{length_m} m at {clock_hz:e} Hz, cut at {share}: {off_db:.4} dB"
                );
            }
        }
    }
}
