//! A net as an antenna sees it, its waves from the exact solution; and the net of the full-wave rows.

use super::build::{driver, net, receiver, series, shunt};
use super::{Answer, respond};
use num_complex::Complex64;
use ringfield::board::{DirectLine, Net, PathItem, Plane};
use ringfield::radiation::{Antenna, Footing, Layout, LitNet, LitSegment, Reading};
use ringfield::ringing::Network;
use std::f64::consts::TAU;

const LIGHT_SPEED_M_PER_S: f64 = 299_792_458.0;

/// A net on its plane at one frequency, source 1 V.
pub struct Lit {
    network: Network,
    layout: Layout,
    answer: Answer,
    omega: f64,
}

impl Lit {
    pub fn new(net: &Net, plane: &Plane, frequency_hz: f64) -> Self {
        let network = Network::of(net);
        let layout = Layout::of(&network, net, Some(plane));
        let omega = TAU * frequency_hz;
        Self {
            network,
            layout,
            answer: respond(net, omega, Complex64::ONE),
            omega,
        }
    }

    /// What an antenna reads.
    pub fn readings(&self, antenna: &dyn Antenna) -> Vec<Vec<Reading>> {
        self.readings_near(antenna, self.omega / TAU)
    }

    /// The same with the light of another frequency.
    pub fn readings_near(&self, antenna: &dyn Antenna, frequency_hz: f64) -> Vec<Vec<Reading>> {
        let footing = self.footing(antenna);
        antenna.readings(frequency_hz, &[self.net(&footing)])
    }

    /// Where it lies on an antenna.
    pub fn footing(&self, antenna: &dyn Antenna) -> Footing {
        antenna.lay(&self.layout)
    }

    /// Ready for the antenna on which it lies.
    pub fn net<'a>(&'a self, footing: &'a Footing) -> LitNet<'a> {
        LitNet {
            frequency_hz: self.omega / TAU,
            footing,
            segments: self.lit(),
        }
    }

    /// Its segments; each must be a whole line.
    fn lit(&self) -> Vec<LitSegment<'_>> {
        let segments = self.layout.segments.iter();
        segments
            .map(|segment| {
                let line = &self.network.spans[segment.line].line;
                let wave = line.wave_at(self.omega);
                assert!(segment.from_near_m == 0.0 && segment.from_far_m == 0.0);
                LitSegment {
                    segment,
                    propagation_per_m: wave.propagation / line.length_m,
                    impedance_ohm: wave.impedance_ohm,
                    outward_v: self.answer.waves[segment.line].outward_v,
                    inward_v: self.answer.waves[segment.line].inward_v,
                }
            })
            .collect()
    }
}

/// The bare wire of the rows: 50 mm at 2 mm over a plane in air, radius 0.2 mm, with an upright wire of the height at
/// each end, which carry the wave too: the waves run over 52 mm.
pub fn wire_net(load: &str, edge_distance_m: Option<f64>) -> Net {
    let impedance_ohm = 60.0 * 10f64.acosh();
    let line = PathItem::Line(DirectLine {
        impedance_ohm,
        delay_s: 0.052 / LIGHT_SPEED_M_PER_S,
        length_m: 0.052,
        height_m: 2e-3,
        permittivity: 1.0,
        points_m: Vec::new(),
    });
    let (source_ohm, end) = match load {
        "matched" => (impedance_ohm, shunt(impedance_ohm, 0.0)),
        "cmos" | "5pF" => (3.0, receiver("end", 5e-12)),
        "short" => (3.0, shunt(1e-6, 0.0)),
        "r50" | "50ohm" => (3.0, shunt(50.0, 0.0)),
        other => panic!("a load that the rows do not have: {other}"),
    };
    let path = vec![series(source_ohm - 1e-3), line, end];
    Net {
        edge_distance_m,
        ..net("row", driver(1.0, 1e-3, 1e-9), 1e6, path)
    }
}
