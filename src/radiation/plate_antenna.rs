//! The board's own plane, with its edges, and the cables that hang on it.
//!
//! The plate-and-wire solver ([`super::plate`]) is lit, in effect, from every direction. By reciprocity one
//! solution serves them all: the branches are driven with what the net picks up of charge and current at its
//! points, and the currents' far field is the net's own, scattered part; the incident wave's part is added.

use super::far_field::{Directions, Flow, Pickup};
use super::plate::{BranchPlace, Plate, Probe, Solved, Structure, Wire};
use super::{Antenna, LitSegment, Strongest};
use crate::board::{Cable, Edge, Plane};
use crate::{LIGHT_SPEED_M_PER_S, MU0_H_PER_M};
use num_complex::Complex64;
use std::f64::consts::TAU;

/// Up to here one mesh serves, since a finer one costs as the third power of its cells.
const COARSE_TO_HZ: f64 = 1e9;
/// Up to here the solver has been compared with others; above, the mesh is that of this frequency.
pub const COMPARED_TO_HZ: f64 = 2e9;
/// What a cable of unknown length is tried with: a quarter and a half wave of the band's lower half.
pub const UNKNOWN_CABLE_LENGTHS_M: [f64; 4] = [0.5, 1.0, 1.5, 2.0];
/// Longest piece of a trace that one set of sample points serves.
const PIECE_M: f64 = 20e-3;
/// Gauss-Legendre points and weights on a piece from 0 to 1 (Abramowitz & Stegun, table 25.4).
const POINTS: [(f64, f64); 3] = [
    (0.112_701_665_379_258_3, 5.0 / 18.0),
    (0.5, 8.0 / 18.0),
    (0.887_298_334_620_741_7, 5.0 / 18.0),
];
/// Nearer to its edge than this the plane's fields are not looked at: there they grow beyond bounds.
const RIM_M: f64 = 0.5e-3;
/// A board and its cables radiate so well that no resonance is sharper than about a tenth of its frequency: half of
/// this off changes no field by more than 0.3 dB.
const FREQUENCY_SHARE: f64 = 5e-3;
/// Fewest and most directions to the half turn; between, two more for each radian of phase from the middle to the
/// farthest end. A parabola finds the peak between directions.
const STEPS_PER_HALF_TURN: [usize; 2] = [9, 18];

/// A board's plane of finite size with its cables.
#[derive(Debug)]
pub struct PlateAntenna {
    /// Plane and cables.
    whole: Structure,
    /// The plane alone, where there are cables.
    bare: Option<Structure>,
    sides_m: [f64; 2],
    /// From the middle of everything to its farthest end.
    reach_m: f64,
}

/// What a net picks up at one point of the plane.
struct Source {
    pickup: Pickup,
    /// On the plane with its cables, and on the plane alone.
    probes: [Option<Probe>; 2],
}

/// Which of a net's parts to look at.
#[derive(Clone, Copy, PartialEq)]
enum Part {
    Loops,
    Charges,
    Both,
}

/// A board's antennas: one for each length that cables of unknown length are tried with, of which the strongest
/// counts, net by net and frequency by frequency; and the same cut more finely for the upper frequencies.
#[derive(Debug)]
pub struct WorstOf {
    coarse: Vec<PlateAntenna>,
    fine: Vec<PlateAntenna>,
}

impl WorstOf {
    /// The antennas of a plane and its cables up to a top frequency.
    pub fn new(plane: &Plane, cables: &[Cable], top_frequency_hz: f64) -> Self {
        let known = cables.iter().all(|cable| cable.length_m.is_some());
        let lengths_m = if known {
            &UNKNOWN_CABLE_LENGTHS_M[..1]
        } else {
            &UNKNOWN_CABLE_LENGTHS_M
        };
        let antennas = |up_to_hz: f64| -> Vec<PlateAntenna> {
            let antenna = |&length_m: &f64| {
                let cables: Vec<Cable> = cables
                    .iter()
                    .map(|cable| Cable {
                        length_m: cable.length_m.or(Some(length_m)),
                        ..cable.clone()
                    })
                    .collect();
                PlateAntenna::new(plane, &cables, up_to_hz)
            };
            lengths_m.iter().map(antenna).collect()
        };
        Self {
            coarse: antennas(top_frequency_hz.min(COARSE_TO_HZ)),
            fine: if top_frequency_hz > COARSE_TO_HZ {
                antennas(top_frequency_hz.min(COMPARED_TO_HZ))
            } else {
                Vec::new()
            },
        }
    }
}

impl Antenna for WorstOf {
    fn frequency_share(&self) -> f64 {
        FREQUENCY_SHARE
    }

    fn strongest(&self, frequency_hz: f64, nets: &[Vec<LitSegment>]) -> Vec<Strongest> {
        let antennas = if frequency_hz > COARSE_TO_HZ {
            &self.fine
        } else {
            &self.coarse
        };
        let mut worst = vec![Strongest::default(); nets.len()];
        for antenna in antennas {
            for (worst, other) in worst.iter_mut().zip(antenna.strongest(frequency_hz, nets)) {
                if other.total_v >= worst.total_v {
                    *worst = other;
                }
            }
        }
        worst
    }
}

impl PlateAntenna {
    /// The antenna of a plane and its straight cables of known length up to a top frequency.
    pub fn new(plane: &Plane, cables: &[Cable], top_frequency_hz: f64) -> Self {
        let plate = Plate {
            length_m: plane.length_m,
            width_m: plane.width_m,
        };
        let wires: Vec<Wire> = cables
            .iter()
            .filter_map(|cable| Some(straight(plane, cable, cable.length_m?)))
            .collect();
        Self {
            bare: (!wires.is_empty()).then(|| Structure::new(plate, &[], top_frequency_hz)),
            whole: Structure::new(plate, &wires, top_frequency_hz),
            sides_m: [plane.length_m, plane.width_m],
            reach_m: reach_m(plane, &wires),
        }
    }

    fn structures(&self) -> [Option<&Structure>; 2] {
        [Some(&self.whole), self.bare.as_ref()]
    }

    fn sources(&self, frequency_hz: f64, segments: &[LitSegment]) -> Vec<Source> {
        segments
            .iter()
            .flat_map(|lit| self.sources_of(frequency_hz, lit))
            .collect()
    }

    fn sources_of(&self, frequency_hz: f64, lit: &LitSegment) -> Vec<Source> {
        let omega = TAU * frequency_hz;
        let segment = lit.segment;
        let pieces = (segment.length_m / PIECE_M).ceil().max(1.0) as usize;
        let piece_m = segment.length_m / pieces as f64;
        let admittance_s_per_m = lit.propagation_per_m / lit.impedance_ohm;
        let mut sources = Vec::with_capacity(pieces * POINTS.len());
        for piece in 0..pieces {
            for (place, weight) in POINTS {
                let x_m = (piece as f64 + place) * piece_m;
                let outward = lit.outward_v * (-lit.propagation_per_m * x_m).exp();
                let inward =
                    lit.inward_v * (-lit.propagation_per_m * (segment.length_m - x_m)).exp();
                let height = weight * piece_m * segment.height_m;
                let at_m = [0, 1].map(|axis| {
                    let place_m = segment.start_m[axis] + segment.direction[axis] * x_m;
                    // A route that runs off the plane is reported; its field is taken from the plane's rim.
                    place_m.clamp(RIM_M, self.sides_m[axis] - RIM_M)
                });
                let charge =
                    height * (outward + inward) * admittance_s_per_m * Complex64::new(0.0, -1.0)
                        / segment.permittivity;
                let loop_ = -height * omega * MU0_H_PER_M * (outward - inward) / lit.impedance_ohm;
                sources.push(Source {
                    pickup: Pickup {
                        at_m,
                        charge,
                        loop_: segment.direction.map(|d| d * loop_),
                    },
                    probes: self
                        .structures()
                        .map(|s| s.map(|s| s.probe(at_m[0], at_m[1]))),
                });
            }
        }
        sources
    }
}

impl Antenna for PlateAntenna {
    fn frequency_share(&self) -> f64 {
        FREQUENCY_SHARE
    }

    fn strongest(&self, frequency_hz: f64, nets: &[Vec<LitSegment>]) -> Vec<Strongest> {
        let whole = self.whole.at(frequency_hz);
        let bare = self.bare.as_ref().map(|bare| bare.at(frequency_hz));
        let k = TAU * frequency_hz / LIGHT_SPEED_M_PER_S;
        let [fewest, most] = STEPS_PER_HALF_TURN;
        let branches = whole.branches();
        let bare_branches = bare.as_ref().map(Solved::branches);
        let steps = (fewest + (2.0 * k * self.reach_m) as usize).min(most);
        let directions = Directions::new(steps, k, &branches);
        // far field times distance = f mu0 / 2 times what is picked up from a wave of 1 V/m
        let scale = frequency_hz * MU0_H_PER_M / 2.0;
        let size =
            |[theta, phi]: [Complex64; 2]| scale * (theta.norm_sqr() + phi.norm_sqr()).sqrt();
        let sources: Vec<Vec<Source>> = nets
            .iter()
            .map(|segments| self.sources(frequency_hz, segments))
            .collect();
        let part = |part: Part| sources.iter().map(|s| part.of(s)).collect::<Vec<_>>();
        let [both, loops, charges] = [Part::Both, Part::Loops, Part::Charges].map(part);
        let flows = driven(&branches, &whole, frequency_hz, 0, &sources, &[&both]);
        let parts = match (&bare_branches, &bare) {
            (Some(bare_branches), Some(solved)) => driven(
                bare_branches,
                solved,
                frequency_hz,
                1,
                &sources,
                &[&loops, &charges],
            ),
            _ => driven(
                &branches,
                &whole,
                frequency_hz,
                0,
                &sources,
                &[&loops, &charges],
            ),
        };
        let (of_loops, of_charges) = parts.split_at(nets.len());
        (0..nets.len())
            .map(|net| {
                let (squared, at) = directions.strongest(&flows[net], &both[net]);
                let loops = of_loops[net].toward(at, k, &loops[net]);
                let charges = of_charges[net].toward(at, k, &charges[net]);
                let cables_v = self.bare.is_some().then(|| {
                    let total = flows[net].toward(at, k, &both[net]);
                    size([0, 1].map(|c| total[c] - loops[c] - charges[c]))
                });
                Strongest {
                    total_v: scale * squared.sqrt(),
                    loops_v: size(loops),
                    charges_v: size(charges),
                    cables_v,
                }
            })
            .collect()
    }
}

impl Part {
    /// What a net picks up by this part alone.
    fn of(self, sources: &[Source]) -> Vec<Pickup> {
        let pickup = |source: &Source| {
            let mut pickup = source.pickup;
            if self == Self::Loops {
                pickup.charge = Complex64::ZERO;
            }
            if self == Self::Charges {
                pickup.loop_ = [Complex64::ZERO; 2];
            }
            pickup
        };
        sources.iter().map(pickup).collect()
    }
}

/// The currents that stand, by reciprocity, for what each net picks up of any wave, for each list of the nets' pickups.
fn driven<'a>(
    branches: &'a [BranchPlace],
    solved: &Solved,
    frequency_hz: f64,
    probes: usize,
    sources: &[Vec<Source>],
    parts: &[&Vec<Vec<Pickup>>],
) -> Vec<Flow<'a>> {
    // The upper face has half of the charge, E_z = sigma / 2 eps0, and half of the current, H = -K / 2.
    let per_charge = MU0_H_PER_M * LIGHT_SPEED_M_PER_S.powi(2) / 2.0;
    let voltages_of = |sources: &Vec<Source>, pickups: &Vec<Pickup>| {
        let mut voltages = vec![Complex64::ZERO; branches.len()];
        for (source, pickup) in sources.iter().zip(pickups) {
            if let Some(probe) = &source.probes[probes] {
                let current = pickup.loop_.map(|along| -along / 2.0);
                probe.add_pickup(
                    frequency_hz,
                    pickup.charge * per_charge,
                    current,
                    &mut voltages,
                );
            }
        }
        voltages
    };
    let voltages = parts
        .iter()
        .flat_map(|of_nets| sources.iter().zip(*of_nets).map(|(s, p)| voltages_of(s, p)))
        .collect();
    let currents = solved.driven(voltages);
    currents
        .iter()
        .map(|currents| Flow::new(branches, currents.branches_a()))
        .collect()
}

/// From the middle of a plane and its wires to their farthest end.
fn reach_m(plane: &Plane, wires: &[Wire]) -> f64 {
    let ends = wires
        .iter()
        .flat_map(|wire| wire.points_m.iter().map(|p| [p[0], p[1]]));
    let all: Vec<[f64; 2]> = ends
        .chain([[0.0, 0.0], [plane.length_m, plane.width_m]])
        .collect();
    let half = |axis: usize| {
        let least = all.iter().map(|p| p[axis]).fold(f64::INFINITY, f64::min);
        let most = all
            .iter()
            .map(|p| p[axis])
            .fold(f64::NEG_INFINITY, f64::max);
        (most - least) / 2.0
    };
    half(0).hypot(half(1))
}

/// A straight cable as a wire.
fn straight(plane: &Plane, cable: &Cable, length_m: f64) -> Wire {
    let (along_m, middle_m) = match cable.edge {
        Edge::Left | Edge::Right => (plane.width_m, plane.width_m / 2.0),
        Edge::Front | Edge::Back => (plane.length_m, plane.length_m / 2.0),
    };
    let at_m = cable.at_m.unwrap_or(middle_m).clamp(0.0, along_m);
    let (root, away) = match cable.edge {
        Edge::Left => ([0.0, at_m], [-1.0, 0.0]),
        Edge::Right => ([plane.length_m, at_m], [1.0, 0.0]),
        Edge::Front => ([at_m, 0.0], [0.0, -1.0]),
        Edge::Back => ([at_m, plane.width_m], [0.0, 1.0]),
    };
    Wire {
        points_m: vec![
            [root[0], root[1], 0.0],
            [
                root[0] + away[0] * length_m,
                root[1] + away[1] * length_m,
                0.0,
            ],
        ],
        radius_m: cable.diameter_m / 2.0,
        attached: true,
    }
}
