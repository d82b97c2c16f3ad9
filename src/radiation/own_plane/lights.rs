//! What the receiver's antenna would throw onto the board from every place that the scan looks at.
//!
//! In free space plane waves of 1 V/m from all directions. On the open-area site a short dipole, level or upright,
//! at all heights and turntable angles, with its exact near field and its image in the floor (Balanis, Antenna
//! Theory, chapter 4). A dipole is so strong that its far field is 1 V at 1 m: what a net picks up of it, times
//! f mu0 / 2, is the net's field at the dipole along the dipole.
//!
//! The fields at all knots hang together ([`Compression`]), so that most places need only a few of them.

use super::compression::Compression;
use super::knots::{Knots, Spot};
use super::sources::{Source, Wave};
use super::stand::Stand;
use crate::LIGHT_SPEED_M_PER_S;
use crate::radiation::peak::vertex;
use crate::radiation::site::Polarisation;
use num_complex::Complex64;
use std::collections::BTreeMap;
use std::f64::consts::{PI, TAU};

/// Places that show how the fields at the knots hang together: at least so many,
const FEWEST_SHOWN: usize = 50;
/// and one for so many fields.
const FIELDS_FOR_EACH_SHOWN: usize = 5;
/// What the fields may be off by, as a share of the largest, from the frequency at which the board is no longer
/// small; below, loops live on ever smaller differences of the electric field.
const FIELD_TOLERANCE: f64 = 3e-4;
const TOLERANCE_FROM_HZ: f64 = 500e6;

/// Where the antenna stands for a reading on the open-area site.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Aim {
    /// Height over the floor.
    pub antenna_height_m: f64,
    /// Which way it stands from the middle of the turntable, in degrees from the board's x axis (from y, where a
    /// board wider than long stands), counter-clockwise seen from above.
    pub angle_deg: f64,
    /// How its elements lie.
    pub polarisation: Polarisation,
}

/// The antenna's scan on the open-area site.
#[derive(Debug, Clone, Copy)]
pub(super) struct Scan {
    pub(super) distance_m: f64,
    pub(super) heights_m: [f64; 2],
    pub(super) stand: Stand,
    /// From the turntable's axis to the farthest conductor, level.
    pub(super) reach_m: f64,
}

/// All places of one scan at one frequency, in rows and columns, the columns all the way round. At each the antenna
/// lies in two ways.
#[derive(Debug, Clone)]
pub(super) struct Lights {
    compression: Compression,
    columns: usize,
    /// By way.
    fields: [Fields; 2],
    /// Of the rows, on the open-area site; there the two ways are read one at a time.
    heights_m: Vec<f64>,
}

/// The few fields of all places, for each field all places in a row, their parts apart so that the loops become
/// vector code. Single precision is far finer than what the fields are known to.
#[derive(Debug, Clone)]
struct Fields {
    places: usize,
    re: Vec<f32>,
    im: Vec<f32>,
}

impl Fields {
    fn new(few: usize, places: usize) -> Self {
        Self {
            places,
            re: vec![0.0; few * places],
            im: vec![0.0; few * places],
        }
    }

    fn set(&mut self, number: usize, place: usize, value: Complex64) {
        self.re[number * self.places + place] = value.re as f32;
        self.im[number * self.places + place] = value.im as f32;
    }

    fn squares(&self, few: &[Complex64]) -> Vec<f64> {
        // So that no sum leaves the range of single precision.
        let largest = few.iter().map(|factor| factor.norm()).fold(0.0, f64::max);
        let scale = if largest > 0.0 { 1.0 / largest } else { 0.0 };
        let (mut re, mut im) = (vec![0.0f32; self.places], vec![0.0f32; self.places]);
        let fields = self
            .re
            .chunks_exact(self.places)
            .zip(self.im.chunks_exact(self.places));
        for (factor, (a, b)) in few.iter().zip(fields) {
            let (c, d) = ((factor.re * scale) as f32, (factor.im * scale) as f32);
            let sums = re.iter_mut().zip(&mut im);
            for ((x, y), (a, b)) in sums.zip(a.iter().zip(b)) {
                *x += a * c - b * d;
                *y += a * d + b * c;
            }
        }
        let square = |(re, im): (&f32, &f32)| {
            let (re, im) = (f64::from(*re), f64::from(*im));
            largest * largest * (re * re + im * im)
        };
        re.iter().zip(&im).map(square).collect()
    }

    fn at(&self, place: usize, few: &[Complex64]) -> Complex64 {
        let value = |number: usize| {
            let at = number * self.places + place;
            Complex64::new(self.re[at].into(), self.im[at].into())
        };
        let factors = few.iter().enumerate();
        factors.map(|(number, factor)| factor * value(number)).sum()
    }
}

/// One place and way among all.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Place {
    place: usize,
    way: usize,
}

impl Lights {
    /// Plane waves from all over the sphere, so many directions to the half turn.
    pub(super) fn all_round(frequency_hz: f64, knots: &Knots, steps: usize) -> Self {
        let k = TAU * frequency_hz / LIGHT_SPEED_M_PER_S;
        let columns = 2 * steps;
        let step = PI / steps as f64;
        let source = |place: usize| {
            let (theta, phi) = (
                (place / columns) as f64 * step,
                (place % columns) as f64 * step,
            );
            let ((sin_theta, cos_theta), (sin_phi, cos_phi)) = (theta.sin_cos(), phi.sin_cos());
            Source::Direction {
                k,
                toward: [sin_theta * cos_phi, sin_theta * sin_phi, cos_theta],
                ways: [
                    [cos_theta * cos_phi, cos_theta * sin_phi, -sin_theta],
                    [-sin_phi, cos_phi, 0.0],
                ],
            }
        };
        let sources: Vec<Source> = (0..(steps + 1) * columns).map(source).collect();
        Self::of(frequency_hz, knots, &sources, columns, Vec::new())
    }

    /// Dipoles over the floor at all heights and angles.
    pub(super) fn scanned(frequency_hz: f64, knots: &Knots, scan: &Scan) -> Self {
        let k = TAU * frequency_hz / LIGHT_SPEED_M_PER_S;
        let (rows, columns) = (scan.rows(k), scan.columns(k));
        let [lowest_m, highest_m] = scan.heights_m;
        let step_m = (highest_m - lowest_m) / (rows.max(2) - 1) as f64;
        let heights_m: Vec<f64> = (0..rows)
            .map(|row| lowest_m + row as f64 * step_m)
            .collect();
        let source = |place: usize| {
            let angle = TAU * (place % columns) as f64 / columns as f64;
            Source::dipoles(k, scan, angle, heights_m[place / columns])
        };
        let sources: Vec<Source> = (0..rows * columns).map(source).collect();
        Self::of(frequency_hz, knots, &sources, columns, heights_m)
    }

    fn of(
        frequency_hz: f64,
        knots: &Knots,
        sources: &[Source],
        columns: usize,
        heights_m: Vec<f64>,
    ) -> Self {
        let shown = (knots.fields() / FIELDS_FOR_EACH_SHOWN)
            .max(FEWEST_SHOWN)
            .min(sources.len());
        // Spread over rows and columns alike: steps of the golden section.
        let place = |i: usize| (i as f64 * 0.618_033_988_749_895).fract() * sources.len() as f64;
        let mut examples = Vec::with_capacity(2 * shown);
        for i in 0..shown {
            let source = &sources[place(i) as usize];
            let waves: Vec<[Wave; 2]> = knots
                .places_m()
                .iter()
                .map(|&at_m| source.at(at_m))
                .collect();
            for way in [0, 1] {
                let of_spot = |(_, spot): (usize, Spot)| spot.of(&waves[spot.knot][way]);
                examples.push(knots.spots().map(of_spot).collect());
            }
        }
        let tolerance = FIELD_TOLERANCE * (frequency_hz / TOLERANCE_FROM_HZ).min(1.0);
        let compression = Compression::new(&examples, tolerance);
        let places = sources.len();
        let mut fields = [0, 1].map(|_| Fields::new(compression.kept().len(), places));
        let mut by_knot: BTreeMap<usize, Vec<(usize, Spot)>> = BTreeMap::new();
        for (number, &field) in compression.kept().iter().enumerate() {
            let spot = knots.spot(field);
            by_knot.entry(spot.knot).or_default().push((number, spot));
        }
        for (knot, spots) in by_knot {
            let at_m = knots.places_m()[knot];
            for (place, source) in sources.iter().enumerate() {
                let waves = source.at(at_m);
                for (number, spot) in &spots {
                    for (fields, wave) in fields.iter_mut().zip(&waves) {
                        fields.set(*number, place, spot.of(wave));
                    }
                }
            }
        }
        Self {
            compression,
            columns,
            fields,
            heights_m,
        }
    }

    /// Memory that they take.
    pub(super) fn bytes(&self) -> usize {
        let values: usize = self.fields.iter().map(|fields| 2 * fields.re.len()).sum();
        values * size_of::<f32>() + self.compression.bytes()
    }

    /// A net's factors of the few fields, from those of all at the knots.
    pub(super) fn few(&self, factors: &[Complex64]) -> Vec<Complex64> {
        self.compression.few(factors)
    }

    /// The most that a net with these few factors picks up, and where. Between places a parabola finds the peak.
    pub(super) fn strongest(&self, few: &[Complex64]) -> (f64, Place) {
        let [first, second] = self.squares(few);
        let (square, place, way) = if self.heights_m.is_empty() {
            let both: Vec<f64> = first.iter().zip(&second).map(|(a, b)| a + b).collect();
            let (square, place) = peak(&both, self.columns);
            (square, place, 0)
        } else {
            let [first, second] = [first, second].map(|way| peak(&way, self.columns));
            match first.0 >= second.0 {
                true => (first.0, first.1, 0),
                false => (second.0, second.1, 1),
            }
        };
        (square.sqrt(), Place { place, way })
    }

    /// What is picked up of every place, squared, by way.
    fn squares(&self, few: &[Complex64]) -> [Vec<f64>; 2] {
        self.fields.each_ref().map(|fields| fields.squares(few))
    }

    /// What is picked up of a place: of one way on the open-area site, both in free space.
    pub(super) fn at(&self, Place { place, way }: Place, few: &[Complex64]) -> [Complex64; 2] {
        match self.heights_m.is_empty() {
            true => self.fields.each_ref().map(|fields| fields.at(place, few)),
            false => [self.fields[way].at(place, few), Complex64::ZERO],
        }
    }

    /// Where the antenna stands, on the open-area site.
    pub(super) fn aim(&self, Place { place, way }: Place) -> Option<Aim> {
        Some(Aim {
            antenna_height_m: *self.heights_m.get(place / self.columns)?,
            angle_deg: 360.0 * (place % self.columns) as f64 / self.columns as f64,
            polarisation: match way {
                0 => Polarisation::Horizontal,
                _ => Polarisation::Vertical,
            },
        })
    }

    /// What is picked up of every place of the open-area site: by polarisation and height, round the turntable.
    pub(super) fn everywhere(&self, few: &[Complex64]) -> [Vec<Vec<f64>>; 2] {
        self.squares(few).map(|squares| {
            let row = |row: &[f64]| row.iter().map(|square| square.sqrt()).collect();
            squares.chunks(self.columns).map(row).collect()
        })
    }

    /// Heights of the rows, on the open-area site.
    pub(super) fn heights_m(&self) -> &[f64] {
        &self.heights_m
    }
}

/// The largest of values in rows that close on themselves, by a parabola through it, and the nearest place.
fn peak(values: &[f64], columns: usize) -> (f64, usize) {
    let best = (0..values.len())
        .max_by(|&a, &b| values[a].total_cmp(&values[b]))
        .unwrap_or(0);
    let (row, column) = (best / columns, best % columns);
    let at = |row: usize, column: usize| values[row * columns + column % columns];
    let middle = values[best];
    let sideways = vertex(at(row, column + columns - 1), middle, at(row, column + 1));
    let last = values.len() / columns - 1;
    let upwards = if row == 0 || row == last {
        middle
    } else {
        vertex(at(row - 1, column), middle, at(row + 1, column))
    };
    (sideways + upwards - middle, best)
}

impl Scan {
    /// Heights: so many to each turn of the reflected against the direct ray, and a few.
    fn rows(&self, k: f64) -> usize {
        const PER_TURN: f64 = 6.0;
        const FEWEST: f64 = 5.0;
        if self.heights_m[1] <= self.heights_m[0] {
            return 1;
        }
        let source_m = -self.stand.floor.at_m;
        let lag_m = |height_m: f64| {
            self.distance_m.hypot(height_m + source_m) - self.distance_m.hypot(height_m - source_m)
        };
        let turns = k * (lag_m(self.heights_m[1]) - lag_m(self.heights_m[0])).abs() / TAU;
        (FEWEST + PER_TURN * turns).ceil() as usize
    }

    /// Angles: a few, and more for each radian of phase from the axis to the farthest conductor.
    fn columns(&self, k: f64) -> usize {
        const FEWEST: f64 = 14.0;
        const PER_RADIAN: f64 = 1.2;
        const MOST: f64 = 72.0;
        (FEWEST + PER_RADIAN * k * self.reach_m).min(MOST).ceil() as usize
    }
}
