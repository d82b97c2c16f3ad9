//! From 32 kHz to 500 MHz, edges from 50 ps to 10 ns, the strongest driver on the lightest load over lossy traces:
//! every net settles or says that it did not, and where it did its harmonics are the exact ones within 0.2 dB.

mod oracle;

use num_complex::Complex64;
use oracle::build::{driver, net, receiver, trace_on};
use oracle::run::march;
use ringfield::board::{Layer, Structure};
use ringfield::spectrum::spectrum;
use std::sync::Arc;

const AGREED_DB: f64 = 0.2;
const JUDGED_DB: f64 = 50.0;
/// Of a slow clock's many harmonics so many are enough.
const SAMPLED: usize = 150;

/// Clock, whole edge, length of the trace.
const SAMPLE: [(f64, f64, f64); 14] = [
    (32_768.0, 50e-12, 0.15),
    (32_768.0, 10e-9, 0.05),
    (100e3, 1e-9, 0.6),
    (1e6, 0.2e-9, 0.15),
    (1e6, 10e-9, 0.6),
    (8e6, 50e-12, 0.05),
    (25e6, 3e-9, 0.3),
    (48e6, 0.8e-9, 0.15),
    (48e6, 10e-9, 0.15),
    (133e6, 0.1e-9, 0.02),
    (133e6, 3e-9, 0.3),
    (250e6, 1e-9, 0.15),
    (500e6, 50e-12, 0.05),
    (500e6, 0.8e-9, 0.003),
];

/// 47 CFR 15.33(b)(1), and no less than 1 GHz.
fn top_hz(clock_hz: f64) -> f64 {
    match clock_hz {
        slow if slow < 108e6 => 1e9,
        medium if medium < 500e6 => 2e9,
        _ => 5e9,
    }
}

#[test]
fn every_clock_and_edge_settles_and_agrees_or_says_that_it_did_not() {
    let layer = Arc::new(Layer {
        name: "outer".into(),
        structure: Structure::Microstrip { height_m: 101.6e-6 },
        permittivity: 4.3,
        loss_tangent: 0.02,
        copper_m: 35e-6,
        roughness_m: 0.0,
    });
    let mut settled_nets = 0;
    for (clock_hz, edge_s, length_m) in SAMPLE {
        let name = format!("{clock_hz:e} Hz, {edge_s:e} s, {length_m} m");
        let path = vec![trace_on(&layer, 101.6e-6, length_m), receiver("end", 2e-12)];
        let net = net(&name, driver(3.3, 1.0, edge_s), clock_hz, path);
        let top_hz = top_hz(clock_hz);
        let (network, settled) = march(&net, top_hz);
        let spectrum = spectrum(&network, &settled, 30e6, top_hz);
        if !settled.report.settled {
            assert!(
                settled.report.residual >= 1e-6,
                "{name}: {:?}",
                settled.report
            );
            continue;
        }
        settled_nets += 1;
        // An odd stride meets odd harmonics.
        let stride = (spectrum.len() / SAMPLED) | 1;
        let sampled: Vec<usize> = (0..spectrum.len()).step_by(stride).collect();
        let exact: Vec<oracle::Answer> = sampled
            .iter()
            .map(|place| oracle::harmonic(&net, spectrum.harmonics.start() + place))
            .collect();
        let currents = sampled.iter().map(|&place| spectrum.driver_a[place]);
        let voltages = sampled
            .iter()
            .map(|&place| spectrum.receivers_v[[0, place]]);
        let exact_a = exact.iter().map(|answer| answer.driver_a);
        let exact_v = exact.iter().map(|answer| answer.receivers_v[0]);
        let pairs = |engine: Vec<Complex64>, exact: Vec<Complex64>| engine.into_iter().zip(exact);
        for (what, pairs) in [
            ("current", pairs(currents.collect(), exact_a.collect())),
            ("voltage", pairs(voltages.collect(), exact_v.collect())),
        ] {
            let strongest = pairs
                .clone()
                .map(|(_, exact)| exact.norm())
                .fold(0.0, f64::max);
            for ((engine, exact), place) in pairs.zip(&sampled) {
                let below_db = 20.0 * (strongest / exact.norm()).log10();
                let off_db = 20.0 * (engine.norm() / exact.norm()).log10();
                assert!(
                    off_db.abs() < AGREED_DB || below_db > JUDGED_DB,
                    "{name}: {what} at {:e} Hz, {off_db:+.3} dB",
                    spectrum.frequency_hz(*place)
                );
            }
        }
    }
    // Nothing in the sample is known not to settle.
    assert_eq!(settled_nets, SAMPLE.len());
}
