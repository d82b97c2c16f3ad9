//! The frequency-domain oracle against printed results, before anything is measured against it.

mod oracle;

use oracle::build::{driver, line, net, receiver, shunt};
use oracle::published::{LATTICES, TRAPEZOIDS};
use ringfield::board::EdgeShape;
use std::f64::consts::TAU;

#[test]
fn lattice_diagrams() {
    for lattice in LATTICES {
        let net = lattice.net(0.0);
        let [load_s, source_s] = lattice.middles_s();
        // Harmonics fall with the square of their number: the rest of the sum is far below the
        // printed places.
        let load_v = oracle::receiver_at(&net, 20_000, &load_s);
        let source_v = oracle::driver_at(&net, 20_000, &source_s);
        lattice.compare(&load_v, &source_v, 1e-6 * lattice.step_v);
    }
}

#[test]
fn trapezoid_spectra() {
    for trapezoid in TRAPEZOIDS {
        let answer = oracle::harmonic(&trapezoid.net(), trapezoid.harmonic);
        trapezoid.compare(answer.receivers_v[0].norm(), 0.0);
    }
}

/// The edges themselves, from the sum of their harmonics: the start at time zero, the 50 % points and the
/// levels, for straight and smooth, equal and unequal edges.
#[test]
fn edges_start_where_they_should() {
    for edge in [EdgeShape::Ramp, EdgeShape::Smooth] {
        let mut driver = driver(2.0, 1e-3, 8e-9);
        (driver.low_v, driver.fall_s, driver.edge) = (-1.0, 4e-9, edge);
        let mut net = net("edges", driver, 10e6, vec![receiver("open", 0.0)]);
        net.duty = 0.3;
        let middle_v = 0.5;
        let expected = [
            (0.0, -1.0),
            (4e-9, middle_v),
            (20e-9, 2.0),
            (32e-9, 2.0),
            (34e-9, middle_v),
            (36e-9, -1.0),
            (70e-9, -1.0),
        ];
        let times_s = expected.map(|(time_s, _)| time_s);
        let summed = oracle::receiver_at(&net, 10_000, &times_s);
        for ((time_s, expected_v), v) in expected.into_iter().zip(summed) {
            // A corner of a ramp is what the last harmonics draw.
            assert!(
                (v - expected_v).abs() < 2e-3,
                "{edge:?} {time_s}: {v} {expected_v}"
            );
        }
    }
}

/// Textbook facts of lines: a matched line is its load, a quarter wave inverts it, half a wave repeats it.
#[test]
fn quarter_and_half_waves() {
    let clock_hz = 100e6;
    let seen_ohm = |delay_s: f64, load_ohm: f64| {
        let path = vec![line(50.0, delay_s), shunt(load_ohm, 0.0)];
        let net = net("stub", driver(1.0, 10.0, 1e-9), clock_hz, path);
        let answer = oracle::respond(&net, TAU * clock_hz, 1.0.into());
        answer.driver_v / answer.driver_a
    };
    for (delay_s, load_ohm, expected_ohm) in [
        (1.234e-9, 50.0, 50.0),
        (2.5e-9, 20.0, 125.0),
        (5e-9, 20.0, 20.0),
        (10e-9, 70.0, 70.0),
    ] {
        let ohm = seen_ohm(delay_s, load_ohm);
        assert!(
            (ohm - expected_ohm).norm() < 1e-9,
            "{delay_s} {load_ohm}: {ohm}"
        );
    }
}
