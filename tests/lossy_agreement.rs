//! Lossy nets on the march against the exact answer: within 0.2 dB to 1 GHz and 0.5 dB to 6 GHz, wherever a
//! harmonic is within 50 dB of the strongest.

// The figures are worth seeing with --nocapture.
#![allow(clippy::print_stdout)]

mod oracle;

use num_complex::Complex64;
use oracle::build::{branch, driver, net, receiver, series, shunt, trace_on, via};
use oracle::run::harmonics;
use ringfield::board::{Layer, Net, PathItem, Structure};
use std::sync::Arc;

const JUDGED_DB: f64 = 50.0;

fn layer(structure: Structure, loss_tangent: f64, roughness_m: f64) -> Arc<Layer> {
    Arc::new(Layer {
        name: "layer".into(),
        structure,
        permittivity: 4.3,
        loss_tangent,
        copper_m: 35e-6,
        roughness_m,
    })
}

fn microstrip() -> Arc<Layer> {
    layer(Structure::Microstrip { height_m: 101.6e-6 }, 0.02, 0.0)
}

fn rough_stripline() -> Arc<Layer> {
    layer(
        Structure::Stripline {
            below_m: 127e-6,
            above_m: 200e-6,
        },
        0.01,
        1e-6,
    )
}

fn trace(length_m: f64) -> PathItem {
    trace_on(&microstrip(), 101.6e-6, length_m)
}

/// The largest disagreement in dB over all judged harmonics of driver current and receivers, and its place.
fn worst_db(net: &Net, top_hz: f64) -> (f64, String) {
    let spectrum = harmonics(net, 30e6, top_hz);
    let exact: Vec<_> = spectrum
        .harmonics
        .clone()
        .map(|number| oracle::harmonic(net, number))
        .collect();
    let mut pairs: Vec<(String, Vec<Complex64>, Vec<Complex64>)> = vec![(
        "driver".into(),
        spectrum.driver_a.clone(),
        exact.iter().map(|answer| answer.driver_a).collect(),
    )];
    for (number, row) in spectrum.receivers_v.rows().into_iter().enumerate() {
        let exact = exact
            .iter()
            .map(|answer| answer.receivers_v[number])
            .collect();
        pairs.push((format!("receiver {number}"), row.to_vec(), exact));
    }
    let mut worst = (0.0, String::new());
    for (what, marched, exact) in pairs {
        let strongest = exact.iter().map(|x| x.norm()).fold(0.0, f64::max);
        for (place, (marched, exact)) in marched.iter().zip(&exact).enumerate() {
            if exact.norm() < strongest * 10f64.powf(-JUDGED_DB / 20.0) {
                continue;
            }
            let off_db = 20.0 * (marched.norm() / exact.norm()).log10();
            assert!(off_db.is_finite(), "{}, {what}: {marched}", net.name);
            if off_db.abs() > worst.0 {
                let mhz = spectrum.frequency_hz(place) / 1e6;
                worst = (
                    off_db.abs(),
                    format!("{}, {what}, {mhz:.0} MHz: {off_db:+.3} dB", net.name),
                );
            }
        }
    }
    worst
}

fn nets(clock_hz: f64, rise_s: f64) -> Vec<Net> {
    let end = || receiver("end", 5e-12);
    let named =
        |name: &str, source_ohm, path| net(name, driver(3.3, source_ohm, rise_s), clock_hz, path);
    vec![
        named("open", 3.0, vec![trace(0.15), end()]),
        named(
            "open, 1 ohm",
            1.0,
            vec![trace(0.15), receiver("end", 2e-12)],
        ),
        named("long", 3.0, vec![trace(0.6), end()]),
        named("short", 3.0, vec![trace(0.02), end()]),
        named("very short", 3.0, vec![trace(0.002), end()]),
        named("series", 3.0, vec![series(60.0), trace(0.15), end()]),
        named("ended", 10.0, vec![trace(0.2), end(), shunt(64.0, 0.0)]),
        named(
            "stripline",
            3.0,
            vec![trace_on(&rough_stripline(), 127e-6, 0.25), end()],
        ),
        named(
            "through vias",
            5.0,
            vec![
                trace(0.01),
                via(0.8e-9, 0.4e-12),
                trace_on(&rough_stripline(), 127e-6, 0.1),
                via(0.8e-9, 0.4e-12),
                trace(0.01),
                end(),
            ],
        ),
        named(
            "tee",
            3.0,
            vec![
                series(30.0),
                trace(0.04),
                branch(vec![trace(0.03), receiver("leg", 3e-12)]),
                trace(0.05),
                end(),
            ],
        ),
        named(
            "chain",
            12.0,
            vec![
                trace(0.05),
                receiver("a", 3e-12),
                trace(0.02),
                receiver("b", 3e-12),
                trace(0.02),
                end(),
            ],
        ),
    ]
}

fn agree(nets: &[Net], top_hz: f64, allowed_db: f64) {
    let worst: Vec<(f64, String)> = nets.iter().map(|net| worst_db(net, top_hz)).collect();
    for (_, said) in &worst {
        println!("{said}");
    }
    let failed: Vec<&String> = worst
        .iter()
        .filter(|(db, _)| *db > allowed_db)
        .map(|(_, said)| said)
        .collect();
    assert!(failed.is_empty(), "{failed:#?}");
}

#[test]
fn within_a_fifth_of_a_decibel_to_1_ghz() {
    agree(&nets(48e6, 0.8e-9), 1e9, 0.2);
    agree(&nets(8e6, 0.6e-9), 1e9, 0.2);
}

#[test]
fn within_half_a_decibel_to_6_ghz() {
    agree(&nets(156e6, 0.1e-9), 6e9, 0.5);
}
