//! Drivers whose two states differ in resistance, against closed forms: what a constant resistance sees follows
//! at every instant from v_oc(t) and R(t) = R_low + (R_high - R_low) s(t), and its harmonics by quadrature. And no
//! even harmonic where both halves of the period are alike.

mod oracle;

use num_complex::Complex64;
use oracle::build::{
    clamped, driver, line, net, part, receiver, receiver_of, series, shunt, trace_on,
};
use oracle::run::harmonics;
use ringfield::board::{Clamp, Driver, EdgeShape, Layer, Net, PathItem, Structure};
use ringfield::spectrum::Spectrum;
use std::f64::consts::{PI, SQRT_2, TAU};
use std::sync::Arc;

const TOP_HZ: f64 = 1e9;
const EVEN_BELOW_DB: f64 = 100.0;

fn two_state(high_ohm: f64, low_ohm: f64, edges_s: [f64; 2], edge: EdgeShape) -> Driver {
    Driver {
        high_resistance_ohm: high_ohm,
        fall_s: edges_s[1],
        edge,
        ..driver(3.3, low_ohm, edges_s[0])
    }
}

/// Rms phasor of a harmonic of a function of the driver's high share (0 low, 1 high), by Simpson's rule over each edge
/// and each level of its own. The rising edge starts at time zero; `duty` is between the 50 % points.
fn phasor(net: &Net, harmonic: usize, of_share: impl Fn(f64) -> f64) -> Complex64 {
    const PIECES: usize = 4000;
    let driver = &net.driver;
    let period_s = 1.0 / net.clock_hz;
    let (rise_s, fall_s) = (driver.full_rise_s(), driver.full_fall_s());
    let fall_start_s = rise_s / 2.0 + net.duty * period_s - fall_s / 2.0;
    let shape = |progress: f64| match driver.edge {
        EdgeShape::Ramp => progress,
        EdgeShape::Smooth => (1.0 - (PI * progress).cos()) / 2.0,
    };
    let omega = TAU * harmonic as f64 * net.clock_hz;
    let integral = |from_s: f64, length_s: f64, share: &dyn Fn(f64) -> f64| -> Complex64 {
        let step_s = length_s / PIECES as f64;
        (0..=PIECES)
            .map(|k| {
                let weight = match k {
                    0 | PIECES => 1.0,
                    odd if odd % 2 == 1 => 4.0,
                    _ => 2.0,
                };
                let time_s = from_s + k as f64 * step_s;
                let value = of_share(share(k as f64 / PIECES as f64));
                weight * step_s / 3.0 * value * Complex64::cis(-omega * time_s)
            })
            .sum()
    };
    let fall_end_s = fall_start_s + fall_s;
    let whole = integral(0.0, rise_s, &shape)
        + integral(rise_s, fall_start_s - rise_s, &|_| 1.0)
        + integral(fall_start_s, fall_s, &|progress| 1.0 - shape(progress))
        + integral(fall_end_s, period_s - fall_end_s, &|_| 0.0);
    SQRT_2 / period_s * whole
}

/// How far the engine may be off: what is seen is the sampled corner of a ramp.
const AGREED_DB: f64 = 0.02;
const JUDGED_DB: f64 = 60.0;

/// The harmonics, even ones among them, against the exact ones.
fn agree(net: &Net, spectrum: &Spectrum, engine: &[Complex64], exact: impl Fn(usize) -> Complex64) {
    let exact: Vec<Complex64> = spectrum.harmonics.clone().map(exact).collect();
    let strongest = exact.iter().map(|exact| exact.norm()).fold(0.0, f64::max);
    let judged = |exact: &Complex64| 20.0 * (strongest / exact.norm()).log10() < JUDGED_DB;
    for ((harmonic, engine), exact) in spectrum.harmonics.clone().zip(engine).zip(&exact) {
        // Taken with the phase.
        let off_db = 20.0 * (1.0 + (engine - exact).norm() / exact.norm()).log10();
        assert!(
            off_db < AGREED_DB || !judged(exact),
            "{}: harmonic {harmonic}, {off_db:.4} dB",
            net.name
        );
    }
    // Where states differ much, even harmonics are among what is compared.
    let driver = &net.driver;
    let apart_ohm = (driver.high_resistance_ohm - driver.low_resistance_ohm).abs();
    if apart_ohm > 20.0 {
        let even = exact
            .iter()
            .skip(1)
            .step_by(2)
            .filter(|exact| judged(exact));
        assert!(even.count() > 5, "{}", net.name);
    }
}

fn drivers() -> Vec<(String, Driver, f64)> {
    let mut drivers = Vec::new();
    for (high_ohm, low_ohm) in [(45.0, 35.0), (20.0, 14.0), (5.0, 60.0), (3.0, 2.5)] {
        for (edges_s, duty, edge) in [
            ([1e-9, 1e-9], 0.5, EdgeShape::Ramp),
            ([2.5e-9, 1e-9], 0.5, EdgeShape::Ramp),
            ([1e-9, 1.7e-9], 0.43, EdgeShape::Smooth),
        ] {
            let name = format!("{high_ohm}/{low_ohm} ohm, {edges_s:?}, {duty}, {edge:?}");
            drivers.push((name, two_state(high_ohm, low_ohm, edges_s, edge), duty));
        }
    }
    drivers
}

/// v(t) = v_oc(t) R / (R + R(t)) at a resistor of R; to a rail, the rest of the divider adds the rail's share.
#[test]
fn into_a_resistor() {
    for (name, driver, duty) in drivers() {
        for (load_ohm, rail_v) in [(50.0, 0.0), (25.0, 1.65), (500.0, 3.3)] {
            let path = vec![shunt(load_ohm, rail_v), receiver("end", 0.0)];
            let net = Net {
                duty,
                ..net(&name, driver.clone(), 40e6, path)
            };
            let spectrum = harmonics(&net, 0.0, TOP_HZ);
            let voltage_v = |share: f64| {
                let own_ohm = driver.low_resistance_ohm
                    + (driver.high_resistance_ohm - driver.low_resistance_ohm) * share;
                (3.3 * share * load_ohm + rail_v * own_ohm) / (own_ohm + load_ohm)
            };
            let row = spectrum.receivers_v.row(0).to_vec();
            agree(&net, &spectrum, &row, |n| phasor(&net, n, voltage_v));
        }
    }
}

/// A matched line is its impedance for all time; its far end follows a flight time later.
#[test]
fn into_a_matched_line() {
    for (name, driver, duty) in drivers() {
        for delay_s in [0.87e-9, 7.3e-9, 40e-12] {
            let path = vec![line(64.0, delay_s), shunt(64.0, 0.0), receiver("end", 0.0)];
            let net = Net {
                duty,
                ..net(&name, driver.clone(), 40e6, path)
            };
            let spectrum = harmonics(&net, 0.0, TOP_HZ);
            let current_a = |share: f64| {
                let own_ohm = driver.low_resistance_ohm
                    + (driver.high_resistance_ohm - driver.low_resistance_ohm) * share;
                3.3 * share / (own_ohm + 64.0)
            };
            let exact = |n: usize| phasor(&net, n, current_a);
            agree(&net, &spectrum, &spectrum.driver_a, exact);
            let row = spectrum.receivers_v.row(0).to_vec();
            let later = |n: usize| Complex64::cis(-TAU * n as f64 * net.clock_hz * delay_s);
            agree(&net, &spectrum, &row, |n| 64.0 * exact(n) * later(n));
        }
    }
}

/// The strongest even harmonic below the fundamental, dB, of driver current and receiver voltage.
fn even_below_fundamental_db(spectrum: &Spectrum) -> f64 {
    let rows = [
        spectrum.driver_a.clone(),
        spectrum.receivers_v.row(0).to_vec(),
    ];
    rows.iter()
        .map(|row| {
            assert_eq!(*spectrum.harmonics.start(), 1);
            let even = row.iter().skip(1).step_by(2);
            let strongest = even.map(|phasor| phasor.norm()).fold(0.0, f64::max);
            20.0 * (row[0].norm() / strongest).log10()
        })
        .fold(f64::INFINITY, f64::min)
}

#[test]
fn equal_states_make_no_even_harmonics() {
    let layer = Arc::new(Layer {
        name: "outer".into(),
        structure: Structure::Microstrip { height_m: 101.6e-6 },
        permittivity: 4.3,
        loss_tangent: 0.02,
        copper_m: 35e-6,
        roughness_m: 0.0,
    });
    let clamp = Clamp {
        knee_v: 0.7,
        resistance_ohm: 10.0,
    };
    let end = || receiver("end", 5e-12);
    let clamped_end = || receiver_of("end", clamped(part(5e-12), clamp, 3.3));
    let trace = || trace_on(&layer, 101.6e-6, 0.15);
    let paths: [(&str, Vec<PathItem>); 6] = [
        ("open", vec![line(65.0, 0.87e-9), end()]),
        ("long", vec![line(65.0, 11.3e-9), end()]),
        ("series", vec![series(47.0), line(65.0, 0.87e-9), end()]),
        ("clamped", vec![line(65.0, 0.87e-9), clamped_end()]),
        ("lossy", vec![trace(), end()]),
        ("lossy, clamped", vec![trace(), clamped_end()]),
    ];
    // A hair's difference takes the way of drivers whose states differ.
    for (how, high_ohm) in [("one", 7.0), ("two", 7.0 + 1e-9)] {
        for clock_hz in [1e6, 8e6, 33e6, 48e6, 133e6] {
            for edge in [EdgeShape::Ramp, EdgeShape::Smooth] {
                for (name, path) in &paths {
                    let name = format!("{how} state, {name}, {clock_hz:e} Hz, {edge:?}");
                    let driver = two_state(high_ohm, 7.0, [0.9e-9; 2], edge);
                    let spectrum =
                        harmonics(&net(&name, driver, clock_hz, path.clone()), 0.0, TOP_HZ);
                    let below_db = even_below_fundamental_db(&spectrum);
                    assert!(below_db > EVEN_BELOW_DB, "{name}: {below_db:.1} dB");
                }
            }
        }
    }
}
