//! The board's own plane, with its edges, and the cables that hang on it, on the test site.
//!
//! By reciprocity the board is lit from the antenna's places ([`lights`]). The incident wave is known by its values at
//! few knots of plane and cables ([`knots`]); what they make of it, solved once for the board ([`response`]), is a
//! matrix from knots to charges and currents of the plane; what a net picks up of these is a weighted sum. The three
//! follow one another for each net and frequency, from the net's end, so that the places come last.

mod cables;
mod compression;
mod footprint;
mod kept;
mod knots;
mod lights;
mod response;
mod samples;
mod sources;
mod stand;

pub use cables::root as cable_root;
pub use lights::Aim;

use super::plate::{Plate, Wire};
use super::site::{FLOOR_ABSORBED_ABOVE_HZ, Site, TestSite};
use super::vector::norm;
use super::{Antenna, Layout, LitNet, Reading, near_field_factor};
use crate::board::{Cable, CableRun, Plane};
use crate::watch::Watch;
use crate::{LIGHT_SPEED_M_PER_S, MU0_H_PER_M};
use footprint::{Factors, Footprint};
use kept::Kept;
use lights::{Lights, Scan};
use num_complex::Complex64;
use response::Response;
use stand::Stand;
use std::f64::consts::TAU;

/// Up to here the solver has been compared with others; above, the mesh is that of this frequency.
pub const COMPARED_TO_HZ: f64 = 2e9;
/// What a cable of unknown length is tried with: a quarter and a half wave of the band's lower half.
pub const UNKNOWN_CABLE_LENGTHS_M: [f64; 4] = [0.5, 1.0, 1.5, 2.0];
/// Where frequencies are many, those this close, as a share of themselves, are lit alike: a scan's largest reading
/// hardly changes when its lobes move a little. What plane and cables make of the light is exact for each.
const FREQUENCY_SHARE: f64 = 1e-2;
/// So many frequencies are looked at one by one.
const FEW_FREQUENCIES: usize = 120;
/// Fewest and most directions to the half turn in free space; between, two more for each radian of phase from the
/// middle to the farthest end. A parabola finds the peak between directions.
const STEPS_PER_HALF_TURN: [usize; 2] = [12, 40];

/// A board's plane of finite size with its cables.
#[derive(Debug)]
pub struct OwnPlane {
    sides_m: [f64; 2],
    test_site: TestSite,
    stand: Stand,
    /// Over the floor, and above it or on a site that has none.
    bands: Vec<Band>,
    frequency_share: f64,
    /// Lights that may be wanted again, for another net or variant.
    kept: Kept,
}

/// A band with one mesh.
#[derive(Debug)]
struct Band {
    top_frequency_hz: f64,
    floor: bool,
    /// One for each length that cables of unknown length are tried with, of which the strongest counts, net by net
    /// and frequency by frequency.
    variants: Vec<Variant>,
}

/// Plane and cables of known length.
#[derive(Debug)]
struct Variant {
    whole: Response,
    /// The plane alone, where there are cables.
    bare: Option<Response>,
    /// From the middle of everything to its farthest end, and from the turntable's axis, level.
    reach_m: f64,
    level_reach_m: f64,
}

/// Why the first cable that cannot hang as described on a site cannot; `None` if all can.
pub fn cable_objection(plane: &Plane, cables: &[Cable], test_site: &TestSite) -> Option<String> {
    if test_site.site == Site::FreeSpace {
        return None;
    }
    let stand = Stand::new(plane, test_site.heights.table_m);
    let nearest_m = test_site
        .distances_m
        .iter()
        .copied()
        .fold(f64::INFINITY, f64::min);
    let longest_m = UNKNOWN_CABLE_LENGTHS_M[UNKNOWN_CABLE_LENGTHS_M.len() - 1];
    cables.iter().find_map(|cable| {
        let length_m = cable.length_m.unwrap_or(longest_m);
        cables::objection(plane, cable, length_m, &stand, nearest_m)
    })
}

impl OwnPlane {
    /// The antenna of a plane and its cables for frequencies, rising. At others it answers too, more slowly.
    pub fn new(
        plane: &Plane,
        cables: &[Cable],
        test_site: TestSite,
        frequencies_hz: &[f64],
        watch: &dyn Watch,
    ) -> Self {
        let stand = Stand::new(plane, test_site.heights.table_m);
        let (over_floor, above) = frequencies_hz
            .split_at(frequencies_hz.partition_point(|&f| f <= FLOOR_ABSORBED_ABOVE_HZ));
        let mut bands = Vec::new();
        for (frequencies_hz, low) in [(over_floor, true), (above, false)] {
            let Some(&last_hz) = frequencies_hz.last() else {
                continue;
            };
            let mut band = Band {
                top_frequency_hz: if low {
                    FLOOR_ABSORBED_ABOVE_HZ
                } else {
                    last_hz
                },
                floor: low && test_site.site == Site::OpenArea,
                variants: Vec::new(),
            };
            band.variants = lengths_m(cables)
                .iter()
                .map(|&length_m| {
                    band.variant(plane, cables, length_m, &stand, frequencies_hz, watch)
                })
                .collect();
            bands.push(band);
        }
        Self {
            sides_m: [plane.length_m, plane.width_m],
            test_site,
            stand,
            bands,
            frequency_share: match frequencies_hz.len() <= FEW_FREQUENCIES {
                true => 0.0,
                false => FREQUENCY_SHARE,
            },
            kept: Kept::default(),
        }
    }
}

/// What cables of unknown length are tried with; one try where none is.
fn lengths_m(cables: &[Cable]) -> &'static [f64] {
    let unknown = |cable: &Cable| cable.length_m.is_none() && cable.run != CableRun::Bonded;
    match cables.iter().any(unknown) {
        true => &UNKNOWN_CABLE_LENGTHS_M,
        false => &UNKNOWN_CABLE_LENGTHS_M[3..],
    }
}

impl Band {
    fn variant(
        &self,
        plane: &Plane,
        cables: &[Cable],
        length_m: f64,
        stand: &Stand,
        frequencies_hz: &[f64],
        watch: &dyn Watch,
    ) -> Variant {
        let plate = Plate {
            length_m: plane.length_m,
            width_m: plane.width_m,
        };
        let wires: Vec<Wire> = cables
            .iter()
            .map(|cable| {
                let length_m = cable.length_m.unwrap_or(length_m);
                cables::wire(plane, cable, length_m, stand, self.floor)
            })
            .collect();
        // A bare board hardly feels the floor: 1.6 m from itself to its image.
        let floor = (self.floor && !wires.is_empty()).then_some(stand.floor);
        let top_hz = self.top_frequency_hz.min(COMPARED_TO_HZ);
        let response =
            |wires: &[Wire]| Response::new(plate, wires, floor, frequencies_hz, top_hz, watch);
        let corners = [[0.0, 0.0, 0.0], [plane.length_m, plane.width_m, 0.0]];
        let ends = wires.iter().flat_map(|wire| wire.points_m.iter().copied());
        let points_m: Vec<[f64; 3]> = ends.chain(corners).collect();
        let level = points_m.iter().map(|&point_m| stand.off_axis_m(point_m));
        Variant {
            whole: response(&wires),
            bare: (!wires.is_empty()).then(|| response(&[])),
            reach_m: reach_m(&points_m),
            level_reach_m: level.fold(0.0, f64::max),
        }
    }
}

/// Half the diagonal of the box about points.
fn reach_m(points_m: &[[f64; 3]]) -> f64 {
    let half = |axis: usize| {
        let along = points_m.iter().map(|p| p[axis]);
        let least = along.clone().fold(f64::INFINITY, f64::min);
        (along.fold(f64::NEG_INFINITY, f64::max) - least) / 2.0
    };
    norm([0, 1, 2].map(half))
}

impl OwnPlane {
    fn band(&self, frequency_hz: f64) -> Option<usize> {
        let last = self.bands.len().checked_sub(1)?;
        let covers = |band: &Band| frequency_hz <= band.top_frequency_hz;
        Some(self.bands.iter().position(covers).unwrap_or(last))
    }
}

impl Antenna for OwnPlane {
    fn frequency_share(&self) -> f64 {
        self.frequency_share
    }

    fn lay(&self, layout: &Layout) -> Footing {
        let of_variant = |variant: &Variant| {
            let on = |response: &Response| Footprint::new(layout, self.sides_m, response);
            (on(&variant.whole), variant.bare.as_ref().map(on))
        };
        let of_band = |band: &Band| band.variants.iter().map(of_variant).collect();
        Footing(self.bands.iter().map(of_band).collect())
    }

    fn readings(&self, frequency_hz: f64, harmonics: &[LitNet]) -> Vec<Vec<Reading>> {
        let Some(number) = self.band(frequency_hz) else {
            return vec![
                vec![Reading::default(); self.test_site.distances_m.len()];
                harmonics.len()
            ];
        };
        let band = &self.bands[number];
        let mut strongest: Vec<Vec<Reading>> = Vec::new();
        for (place, variant) in band.variants.iter().enumerate() {
            let footprints: Vec<&Footprints> = harmonics
                .iter()
                .map(|harmonic| &harmonic.footing.0[number][place])
                .collect();
            let readings =
                self.of_variant(frequency_hz, band, (place, variant), harmonics, &footprints);
            if strongest.is_empty() {
                strongest = readings;
                continue;
            }
            let all = strongest
                .iter_mut()
                .flatten()
                .zip(readings.into_iter().flatten());
            for (strongest, reading) in all {
                if reading.field_v_per_m > strongest.field_v_per_m {
                    *strongest = reading;
                }
            }
        }
        strongest
    }
}

/// A net on the plane with its cables, and where there are any, without.
type Footprints = (Footprint, Option<Footprint>);

/// Where a net lies on an antenna, with all that no frequency changes.
#[derive(Debug, Clone, Default)]
pub struct Footing(Vec<Vec<Footprints>>);

/// The readings of one harmonic over the open-area site.
#[derive(Debug, Clone, PartialEq)]
pub struct ScanMap {
    /// Heights of the antenna.
    pub heights_m: Vec<f64>,
    /// Horizontal and vertical, by height, evenly round the turntable from 0 degrees on ([`Aim::angle_deg`]); rms.
    pub fields_v_per_m: [Vec<Vec<f64>>; 2],
}

impl ScanMap {
    /// How many angles it has.
    pub fn columns(&self) -> usize {
        self.fields_v_per_m[0].first().map_or(0, Vec::len)
    }

    /// The largest reading.
    pub fn largest_v_per_m(&self) -> f64 {
        let all = self.fields_v_per_m.iter().flatten().flatten();
        all.copied().fold(0.0, f64::max)
    }
}

impl OwnPlane {
    fn of_variant(
        &self,
        shared_hz: f64,
        band: &Band,
        (number, variant): (usize, &Variant),
        harmonics: &[LitNet],
        footprints: &[&Footprints],
    ) -> Vec<Vec<Reading>> {
        let on_whole: Vec<&Footprint> = footprints.iter().map(|(whole, _)| whole).collect();
        let on_bare: Vec<&Footprint> = footprints
            .iter()
            .filter_map(|(_, bare)| bare.as_ref())
            .collect();
        let whole = factors(&variant.whole, harmonics, &on_whole);
        let bare = variant
            .bare
            .as_ref()
            .map(|bare| factors(bare, harmonics, &on_bare));
        let cabled = bare.is_some();
        let both: Vec<Vec<Complex64>> = whole
            .iter()
            .map(|Factors { loops, charges }| {
                loops.iter().zip(charges).map(|(a, b)| a + b).collect()
            })
            .collect();
        let parts = bare.unwrap_or(whole);
        let read = |lights: &Lights, distance: &dyn Fn(f64) -> f64| -> Vec<Reading> {
            let nets = both.iter().zip(&parts).zip(harmonics);
            nets.map(|((both, Factors { loops, charges }), net)| {
                // What is picked up of a dipole whose far field is 1 V, as the net's own field there.
                let scale = distance(net.frequency_hz) * net.frequency_hz * MU0_H_PER_M / 2.0;
                let [both, loops, charges] = [both, loops, charges].map(|f| lights.few(f));
                let (field, place) = lights.strongest(&both);
                let [total, of_loops, of_charges] =
                    [&both, &loops, &charges].map(|few| lights.at(place, few));
                let rest = [0, 1].map(|c| total[c] - of_loops[c] - of_charges[c]);
                let size = |[a, b]: [Complex64; 2]| scale * (a.norm_sqr() + b.norm_sqr()).sqrt();
                Reading {
                    field_v_per_m: scale * field,
                    loops_v_per_m: size(of_loops),
                    charges_v_per_m: size(of_charges),
                    cables_v_per_m: cabled.then(|| size(rest)),
                    aim: lights.aim(place),
                }
            })
            .collect()
        };
        let distances_m = self.test_site.distances_m.iter();
        let knots = &variant.whole.knots;
        let kept = |scan: usize, light: &dyn Fn() -> Lights| {
            let key = (number, scan, shared_hz.to_bits());
            self.kept.or_made(key, light)
        };
        let by_distance: Vec<Vec<Reading>> = if band.floor {
            distances_m
                .enumerate()
                .map(|(place, &distance_m)| {
                    let scan = self.scan(distance_m, variant);
                    let lights = kept(place, &|| Lights::scanned(shared_hz, knots, &scan));
                    read(&lights, &|_| 1.0)
                })
                .collect()
        } else {
            let k = TAU * shared_hz / LIGHT_SPEED_M_PER_S;
            let [fewest, most] = STEPS_PER_HALF_TURN;
            let steps = (fewest + (2.0 * k * variant.reach_m) as usize).min(most);
            let lights = kept(0, &|| Lights::all_round(shared_hz, knots, steps));
            distances_m
                .map(|&d| {
                    let near = |frequency_hz| near_field_factor(frequency_hz, d) / d;
                    read(&lights, &near)
                })
                .collect()
        };
        (0..harmonics.len())
            .map(|net| by_distance.iter().map(|readings| readings[net]).collect())
            .collect()
    }

    /// The readings of a net at one harmonic at every place of the open-area site, for each variant of cables of
    /// unknown length the strongest; `None` in free space.
    pub fn scan_map(&self, net: &LitNet, distance_m: f64) -> Option<ScanMap> {
        let number = self.band(net.frequency_hz)?;
        let band = &self.bands[number];
        let maps = band.variants.iter().zip(&net.footing.0[number]);
        let maps = maps.map(|(variant, (footprint, _))| {
            let nets = std::slice::from_ref(net);
            let [Factors { loops, charges }] = &factors(&variant.whole, nets, &[footprint])[..]
            else {
                return None;
            };
            let both: Vec<Complex64> = loops.iter().zip(charges).map(|(a, b)| a + b).collect();
            let scan = self.scan(distance_m, variant);
            let lights = Lights::scanned(net.frequency_hz, &variant.whole.knots, &scan);
            let scale = net.frequency_hz * MU0_H_PER_M / 2.0;
            let picked_up = lights.everywhere(&lights.few(&both));
            Some(ScanMap {
                heights_m: lights.heights_m().to_vec(),
                fields_v_per_m: picked_up.map(|rows| {
                    let scaled = |row: Vec<f64>| row.iter().map(|value| scale * value).collect();
                    rows.into_iter().map(scaled).collect()
                }),
            })
        });
        let maps = maps.flatten().filter(|_| band.floor);
        maps.max_by(|a, b| a.largest_v_per_m().total_cmp(&b.largest_v_per_m()))
    }

    fn scan(&self, distance_m: f64, variant: &Variant) -> Scan {
        Scan {
            distance_m,
            heights_m: self.test_site.heights.antenna_m,
            stand: self.stand,
            reach_m: variant.level_reach_m,
        }
    }
}

/// The factors of nets at their own frequencies; those of one frequency share the response's rows.
fn factors(response: &Response, harmonics: &[LitNet], footprints: &[&Footprint]) -> Vec<Factors> {
    let mut factors = Vec::with_capacity(harmonics.len());
    let mut first = 0;
    for together in harmonics.chunk_by(|a, b| a.frequency_hz == b.frequency_hz) {
        let footprints = &footprints[first..first + together.len()];
        first += together.len();
        let mut needed = response.none_needed();
        for footprint in footprints {
            footprint.mark(&mut needed);
        }
        let frequency_hz = together[0].frequency_hz;
        let rows = response.at(frequency_hz, &needed);
        let nets = footprints.iter().zip(together);
        factors.extend(nets.map(|(f, net)| f.factors(frequency_hz, &net.segments, &rows)));
    }
    factors
}
