//! Printed results, each with its source, for the oracle and for the engine.

use super::build::{driver, line, net, receiver, shunt};
use ringfield::board::Net;

/// A lattice (bounce) diagram: a step of `step_v` through `source_ohm` into a line with a resistor at its
/// end. The load's levels start at 1, 3, 5 ... flight times, the source's at 0, 2, 4 ...
pub struct Lattice {
    pub source: &'static str,
    pub step_v: f64,
    pub source_ohm: f64,
    pub line_ohm: f64,
    pub load_ohm: Option<f64>,
    pub load_v: &'static [f64],
    pub source_v: &'static [f64],
    /// How far the true value may lie below and above the printed one.
    pub printed_within_v: [f64; 2],
}

pub const LATTICES: [Lattice; 5] = [
    Lattice {
        source: "80386 hardware reference manual, table 11-1",
        step_v: 3.70,
        source_ohm: 30.0,
        line_ohm: 75.0,
        load_ohm: Some(100.0),
        load_v: &[3.02041, 2.83549, 2.84681, 2.84611],
        source_v: &[2.64286, 2.85860, 2.84539, 2.84620],
        printed_within_v: [0.5e-5, 0.5e-5],
    },
    Lattice {
        source: "Stevenson, Elements of Power System Analysis, ex. 5.6 (printed truncated)",
        step_v: 120.0,
        source_ohm: 0.0,
        line_ohm: 30.0,
        load_ohm: Some(90.0),
        load_v: &[180.0, 90.0, 135.0, 112.0, 123.0],
        source_v: &[],
        printed_within_v: [0.0, 1.0],
    },
    Lattice {
        source: "Stevenson, Elements of Power System Analysis, ex. 5.6, second case (printed truncated)",
        step_v: 120.0,
        source_ohm: 0.0,
        line_ohm: 30.0,
        load_ohm: Some(10.0),
        load_v: &[60.0, 90.0, 105.0, 112.0, 116.0],
        source_v: &[],
        printed_within_v: [0.0, 1.0],
    },
    Lattice {
        source: "Paul, Scully & Steffka, Introduction to Electromagnetic Compatibility, 3rd ed., sec. 4",
        step_v: 5.0,
        source_ohm: 10.0,
        line_ohm: 50.0,
        load_ohm: None,
        load_v: &[8.33, 2.78],
        source_v: &[],
        printed_within_v: [0.5e-2, 0.5e-2],
    },
    Lattice {
        source: "Paul, Introduction to Electromagnetic Compatibility, earlier edition (from memory)",
        step_v: 30.0,
        source_ohm: 0.0,
        line_ohm: 50.0,
        load_ohm: Some(100.0),
        load_v: &[40.0, 26.67, 31.11, 29.63],
        source_v: &[],
        printed_within_v: [0.5e-2, 0.5e-2],
    },
];

/// Flight time of the lattices' lines.
pub const FLIGHT_S: f64 = 1e-9;

impl Lattice {
    /// The net, on a clock so slow that every edge finds it at rest, with edges of half a flight time.
    pub fn net(&self, least_source_ohm: f64) -> Net {
        let edge = driver(
            self.step_v,
            self.source_ohm.max(least_source_ohm),
            0.5 * FLIGHT_S,
        );
        let mut path = vec![line(self.line_ohm, FLIGHT_S)];
        path.extend(self.load_ohm.map(|ohm| shunt(ohm, 0.0)));
        path.push(receiver("end", 0.0));
        net(self.source, edge, 1.0 / (200.0 * FLIGHT_S), path)
    }

    /// The middles of the load's and the source's printed levels, after the edge and before the next.
    pub fn middles_s(&self) -> [Vec<f64>; 2] {
        let middle = |level: usize| (2 * level) as f64 * FLIGHT_S + 1.25 * FLIGHT_S;
        [
            (0..self.load_v.len())
                .map(|level| middle(level) + FLIGHT_S)
                .collect(),
            (0..self.source_v.len()).map(middle).collect(),
        ]
    }

    pub fn compare(&self, load_v: &[f64], source_v: &[f64], slack_v: f64) {
        let [below_v, above_v] = self.printed_within_v;
        let pairs = self
            .load_v
            .iter()
            .zip(load_v)
            .chain(self.source_v.iter().zip(source_v));
        for (printed_v, computed_v) in pairs {
            assert!(
                (printed_v - below_v - slack_v..printed_v + above_v + slack_v).contains(computed_v),
                "{}: {computed_v:.6} V against {printed_v} V",
                self.source
            );
        }
    }
}

/// A harmonic of an open-circuit trapezoid.
pub struct Trapezoid {
    pub source: &'static str,
    pub swing_v: f64,
    pub clock_hz: f64,
    pub rise_s: f64,
    pub fall_s: f64,
    pub duty: f64,
    pub harmonic: usize,
    /// Peak amplitude.
    pub peak_v: f64,
    /// Half a unit of the last printed place.
    pub printed_within_v: f64,
}

const PAUL_3_5: &str = "Paul, Scully & Steffka, 3rd ed., example 3.5";
const PAUL_3_48: &str = "Paul, Scully & Steffka, 3rd ed., eq. 3.48";
/// Printed for edges that *start* half a period apart: the wave is high for 9.5 ns of 20 between its
/// 50 % points, and equal shares of time there would give 0.1051 V.
const PAUL_UNEQUAL: &str = "Paul, Scully & Steffka, 3rd ed., eq. 3.58, rise 6 ns, fall 5 ns";

const fn equal(
    source: &'static str,
    [swing_v, clock_hz, edge_s]: [f64; 3],
    harmonic: usize,
    [peak_v, printed_within_v]: [f64; 2],
) -> Trapezoid {
    Trapezoid {
        source,
        swing_v,
        clock_hz,
        rise_s: edge_s,
        fall_s: edge_s,
        duty: 0.5,
        harmonic,
        peak_v,
        printed_within_v,
    }
}

/// 73.8 dBuV (peak) and a place of 0.1 dB.
const DBUV_73_8: [f64; 2] = [4.898e-3, 0.0289e-3];
/// 90.4 dBuV (peak) and a place of 0.1 dB.
const DBUV_90_4: [f64; 2] = [33.11e-3, 0.20e-3];

pub const TRAPEZOIDS: [Trapezoid; 13] = [
    equal(PAUL_3_5, [1.0, 10e6, 20e-9], 11, DBUV_73_8),
    equal(PAUL_3_5, [1.0, 10e6, 5e-9], 11, DBUV_90_4),
    equal(PAUL_3_48, [5.0, 100e6, 1e-9], 1, [3.131, 0.5e-3]),
    equal(PAUL_3_48, [5.0, 100e6, 1e-9], 3, [0.9108, 0.5e-4]),
    equal(PAUL_3_48, [5.0, 100e6, 1e-9], 5, [0.4053, 0.5e-4]),
    equal(PAUL_3_48, [5.0, 100e6, 1e-9], 7, [0.1673, 0.5e-4]),
    equal(PAUL_3_48, [5.0, 100e6, 1e-9], 9, [0.03865, 0.5e-5]),
    equal(PAUL_3_48, [5.0, 50e6, 5e-9], 1, [2.866, 0.5e-3]),
    equal(PAUL_3_48, [5.0, 50e6, 5e-9], 3, [0.3184, 0.5e-4]),
    equal(PAUL_3_48, [5.0, 50e6, 5e-9], 5, [0.1146, 0.5e-4]),
    equal(PAUL_3_48, [5.0, 50e6, 5e-9], 7, [0.05849, 0.5e-5]),
    equal(PAUL_3_48, [5.0, 50e6, 5e-9], 9, [0.03538, 0.5e-5]),
    Trapezoid {
        source: PAUL_UNEQUAL,
        swing_v: 5.0,
        clock_hz: 50e6,
        rise_s: 6e-9,
        fall_s: 5e-9,
        duty: 0.475,
        harmonic: 2,
        peak_v: 0.1759,
        printed_within_v: 0.5e-4,
    },
];

impl Trapezoid {
    /// The source alone, seen by a receiver that takes no current.
    pub fn net(&self) -> Net {
        let mut edge = driver(self.swing_v, 1e-3, self.rise_s);
        edge.fall_s = self.fall_s;
        let mut net = net(
            self.source,
            edge,
            self.clock_hz,
            vec![receiver("open", 0.0)],
        );
        net.duty = self.duty;
        net
    }

    /// `further`: what the method itself may be off, as a share.
    pub fn compare(&self, rms_v: f64, further: f64) {
        let peak_v = rms_v * std::f64::consts::SQRT_2;
        let within_v = self.printed_within_v + further * self.peak_v;
        assert!(
            (peak_v - self.peak_v).abs() <= within_v,
            "{}, harmonic {}: {peak_v:.6} V against {} V",
            self.source,
            self.harmonic,
            self.peak_v
        );
    }
}
