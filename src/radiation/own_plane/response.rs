//! What plane and cables make of a field at the knots, over a band of frequencies.
//!
//! The equations are solved at each frequency where these are few. Where they are many, they are solved at samples
//! enough for a rational function with common poles ([`Rational`]), which gives the frequencies between: the
//! resonances of plane and cables are its poles. Neither the nets nor the antenna's places are in it, whose phases
//! would need many more samples.

use super::knots::Knots;
use super::samples::{between, length_m, samples_hz, sign};
use crate::LIGHT_SPEED_M_PER_S;
use crate::radiation::plate::{Floor, Plate, Structure, Wire};
use crate::radiation::rational::Rational;
use crate::watch::Watch;
use num_complex::Complex64;
use rayon::prelude::*;
use std::f64::consts::TAU;
use std::ops::{Range, RangeInclusive};

/// Samples that a board without cables needs up to 1 GHz, and how many more for each metre of conductor.
const SAMPLES: f64 = 34.0;
const SAMPLES_PER_M: f64 = 16.0;
/// Share of the largest value that a fit may miss at a sample.
const TOLERANCE: f64 = 1e-6;
/// More supports than this share of the samples are the sign of too few samples.
const CROWDED: f64 = 0.75;
/// A fit may miss a fresh solution by this share of the largest value.
const FRESH_TOLERANCE: f64 = 2e-3;
/// Where so many samples are not enough, the frequencies themselves are solved.
const MOST_SAMPLES: usize = 350;
/// Mixtures of each kind of row that a fit is made for.
const MIXTURES: usize = 8;

/// A structure's answers over a band.
#[derive(Debug)]
pub(super) struct Response {
    pub(super) structure: Structure,
    pub(super) knots: Knots,
    kept: Vec<Answer>,
    /// Through the kept answers; without it they are all the frequencies wanted.
    fit: Option<Rational>,
    /// Where a fit holds.
    band_hz: RangeInclusive<f64>,
}

/// What fields of 1 V/m at the knots make at one frequency, one row for each thing made: charge of each cell over
/// 2 eps0, in V m; current of each branch of the plate times jk / 2; stray fields at the knots of the plane, upwards
/// in V/m, magnetic along x and y in A/m times jk. So no row grows towards low frequencies.
#[derive(Debug, Clone)]
struct Answer {
    frequency_hz: f64,
    re: Vec<f32>,
    im: Vec<f32>,
}

impl Response {
    /// Solves the structure for frequencies, rising, all within a band up to a top frequency.
    pub(super) fn new(
        plate: Plate,
        wires: &[Wire],
        floor: Option<Floor>,
        frequencies_hz: &[f64],
        top_frequency_hz: f64,
        watch: &dyn Watch,
    ) -> Self {
        let mut response = Self {
            structure: Structure::new(plate, wires, floor, top_frequency_hz),
            knots: Knots::new(plate, wires, top_frequency_hz),
            kept: Vec::new(),
            fit: None,
            band_hz: 0.0..=0.0,
        };
        let [Some(&first_hz), Some(&last_hz)] = [frequencies_hz.first(), frequencies_hz.last()]
        else {
            return response;
        };
        response.band_hz = first_hz..=last_hz;
        let conductor_m: f64 =
            wires.iter().map(length_m).sum::<f64>() + plate.length_m.max(plate.width_m);
        let samples = SAMPLES + SAMPLES_PER_M * conductor_m * last_hz / 1e9;
        let mut samples_hz = samples_hz(first_hz, last_hz, samples.ceil() as usize);
        if frequencies_hz.len() <= samples_hz.len() {
            response.kept = response.solve(frequencies_hz, watch);
            return response;
        }
        let mut answers = response.solve(&samples_hz, watch);
        loop {
            let fit = response.fitted(&answers);
            let crowded = fit.supports.len() as f64 > CROWDED * samples_hz.len() as f64;
            let trusted = !crowded
                && response.fresh_deviation(&fit, &samples_hz, &answers, watch) < FRESH_TOLERANCE;
            if trusted {
                response.keep(fit, answers);
                return response;
            }
            if samples_hz.len() >= frequencies_hz.len().min(MOST_SAMPLES) {
                response.kept = response.solve(frequencies_hz, watch);
                return response;
            }
            let between_hz = between(&samples_hz);
            answers.extend(response.solve(&between_hz, watch));
            answers.sort_by(|a, b| a.frequency_hz.total_cmp(&b.frequency_hz));
            samples_hz = answers.iter().map(|answer| answer.frequency_hz).collect();
        }
    }

    fn solve(&self, frequencies_hz: &[f64], watch: &dyn Watch) -> Vec<Answer> {
        watch.begin("solutions of the plane", frequencies_hz.len());
        frequencies_hz
            .par_iter()
            .map(|&frequency_hz| {
                let answer = self.answer(frequency_hz);
                watch.step();
                answer
            })
            .collect()
    }

    /// One solution.
    fn answer(&self, frequency_hz: f64) -> Answer {
        let solved = self.structure.at(frequency_hz);
        let branches = solved.branches();
        let drives = self.knots.drives();
        let mut voltages = vec![vec![Complex64::ZERO; branches.len()]; drives];
        for (number, branch) in branches.iter().enumerate() {
            for (drive, weight) in self.knots.driving(branch) {
                voltages[drive][number] += weight;
            }
        }
        let k = TAU * frequency_hz / LIGHT_SPEED_M_PER_S;
        let per_charge = crate::MU0_H_PER_M * LIGHT_SPEED_M_PER_S.powi(2) / 2.0;
        let stray = match self.structure.strays() {
            true => self.structure.stray(frequency_hz, &self.knots.plane_m()),
            false => Vec::new(),
        };
        let rows = self.rows();
        let mut answer = Answer {
            frequency_hz,
            re: vec![0.0; rows * drives],
            im: vec![0.0; rows * drives],
        };
        let mut set = |row: usize, drive: usize, value: Complex64| {
            answer.re[row * drives + drive] = value.re as f32;
            answer.im[row * drives + drive] = value.im as f32;
        };
        let driven = solved.driven(voltages);
        for (drive, currents) in driven.iter().enumerate() {
            for (row, charge_c) in currents.cells_c().into_iter().enumerate() {
                set(row, drive, charge_c * per_charge);
            }
            let in_plate = &currents.branches_a()[..self.structure.plate_branches()];
            for (row, current_a) in self.branch_rows().zip(in_plate) {
                set(row, drive, current_a * Complex64::new(0.0, k / 2.0));
            }
        }
        let by_branch: Vec<Vec<Complex64>> = match stray.is_empty() {
            true => Vec::new(),
            false => (0..branches.len())
                .map(|branch| driven.iter().map(|c| c.branches_a()[branch]).collect())
                .collect(),
        };
        let mut sums = vec![Complex64::ZERO; drives];
        for (knot, fields) in stray.iter().enumerate() {
            for (kind, factors) in fields.iter().enumerate() {
                sums.fill(Complex64::ZERO);
                for (factor, currents) in factors.iter().zip(&by_branch) {
                    for (sum, current) in sums.iter_mut().zip(currents) {
                        *sum += factor * current;
                    }
                }
                let scale = match kind {
                    0 => Complex64::ONE,
                    _ => Complex64::new(0.0, k),
                };
                let row = self.stray_row(kind, knot);
                for (drive, sum) in sums.iter().enumerate() {
                    set(row, drive, sum * scale);
                }
            }
        }
        answer
    }

    fn branch_rows(&self) -> Range<usize> {
        let cells = self.structure.cell_count();
        cells..cells + self.structure.plate_branches()
    }

    fn stray_row(&self, kind: usize, knot: usize) -> usize {
        self.branch_rows().end + kind * self.knots.on_plane() + knot
    }

    fn rows(&self) -> usize {
        match self.structure.strays() {
            true => self.stray_row(3, 0),
            false => self.branch_rows().end,
        }
    }

    /// The rows of each kind.
    fn row_kinds(&self) -> Vec<Range<usize>> {
        let branches = self.branch_rows();
        let mut kinds = vec![0..branches.start, branches];
        if self.structure.strays() {
            kinds.extend((0..3).map(|kind| self.stray_row(kind, 0)..self.stray_row(kind + 1, 0)));
        }
        kinds
    }

    /// Mixtures of all entries of each kind of row, with signs that follow no pattern.
    fn mixtures(&self, answer: &Answer) -> Vec<Complex64> {
        let drives = self.knots.drives();
        let mut mixtures = Vec::new();
        for rows in self.row_kinds() {
            for mixture in 0..MIXTURES {
                let mut sum = Complex64::ZERO;
                for row in rows.clone() {
                    let mut of_row = Complex64::ZERO;
                    for drive in 0..drives {
                        let at = row * drives + drive;
                        let value = Complex64::new(answer.re[at].into(), answer.im[at].into());
                        of_row += sign(drive, mixture) * value;
                    }
                    sum += sign(row, mixture + MIXTURES) * of_row;
                }
                mixtures.push(sum);
            }
        }
        mixtures
    }

    /// A function of frequency for each mixture.
    fn functions(&self, answers: &[Answer]) -> Vec<Vec<Complex64>> {
        let by_answer: Vec<Vec<Complex64>> = answers
            .par_iter()
            .map(|answer| self.mixtures(answer))
            .collect();
        (0..by_answer[0].len())
            .map(|mixture| by_answer.iter().map(|values| values[mixture]).collect())
            .collect()
    }

    fn fitted(&self, answers: &[Answer]) -> Rational {
        let places: Vec<f64> = answers.iter().map(|answer| answer.frequency_hz).collect();
        Rational::fit(
            &places,
            &self.functions(answers),
            TOLERANCE,
            answers.len() - 1,
        )
    }

    /// How far a fit is off at fresh solutions in between, as a share of each mixture's largest value.
    fn fresh_deviation(
        &self,
        fit: &Rational,
        samples_hz: &[f64],
        answers: &[Answer],
        watch: &dyn Watch,
    ) -> f64 {
        let between_hz = between(samples_hz);
        let fresh_hz: Vec<f64> = [0.03, 0.4, 0.62, 0.97]
            .map(|share| between_hz[((between_hz.len() - 1) as f64 * share) as usize])
            .into();
        let fresh = self.solve(&fresh_hz, watch);
        let (known, exact) = (self.functions(answers), self.functions(&fresh));
        let mut worst: f64 = 0.0;
        for (place, &frequency_hz) in fresh_hz.iter().enumerate() {
            let shares = fit.shares(frequency_hz);
            for (known, exact) in known.iter().zip(&exact) {
                let largest = known.iter().map(|value| value.norm()).fold(0.0, f64::max);
                let off = (fit.sum(&shares, known) - exact[place]).norm();
                worst = worst.max(if largest > 0.0 { off / largest } else { 0.0 });
            }
        }
        worst
    }

    /// Keeps the fit and only the answers that it rests on.
    fn keep(&mut self, fit: Rational, answers: Vec<Answer>) {
        let mut answers: Vec<Option<Answer>> = answers.into_iter().map(Some).collect();
        let supports = fit.supports.iter();
        self.kept = supports
            .filter_map(|&sample| answers[sample].take())
            .collect();
        self.fit = Some(fit);
    }

    /// The needed rows at a frequency; others are zero.
    pub(super) fn at(&self, frequency_hz: f64, needed: &[bool]) -> Rows {
        let drives = self.knots.drives();
        let off = |answer: &Answer| (answer.frequency_hz / frequency_hz - 1.0).abs();
        let fresh;
        let parts: Vec<(Complex64, &Answer)> = match &self.fit {
            Some(fit) if self.band_hz.contains(&frequency_hz) => fit
                .shares(frequency_hz)
                .into_iter()
                .zip(&self.kept)
                .collect(),
            _ => {
                let nearest = self.kept.iter().min_by(|a, b| off(a).total_cmp(&off(b)));
                let answer = match nearest {
                    Some(answer) if off(answer) <= 1e-9 => answer,
                    // Not among the frequencies that were announced.
                    _ => {
                        fresh = self.answer(frequency_hz);
                        &fresh
                    }
                };
                vec![(Complex64::ONE, answer)]
            }
        };
        let mut rows = Rows {
            drives,
            re: vec![0.0; self.rows() * drives],
            im: vec![0.0; self.rows() * drives],
        };
        for (row, _) in needed.iter().enumerate().filter(|(_, needed)| **needed) {
            let range = row * drives..(row + 1) * drives;
            let (re, im) = (&mut rows.re[range.clone()], &mut rows.im[range.clone()]);
            for (share, answer) in &parts {
                let values = answer.re[range.clone()]
                    .iter()
                    .zip(&answer.im[range.clone()]);
                let (c, d) = (share.re as f32, share.im as f32);
                for ((x, y), (a, b)) in re.iter_mut().zip(im.iter_mut()).zip(values) {
                    *x += c * a - d * b;
                    *y += c * b + d * a;
                }
            }
        }
        rows
    }

    /// Nothing needed yet.
    pub(super) fn none_needed(&self) -> Vec<bool> {
        vec![false; self.rows()]
    }

    /// What is picked up at a point of the plane: weights of the rows for a factor 1 of the electric field upwards,
    /// and, over jk, for a factor 1 of the magnetic field to the left of a way.
    pub(super) fn weights(&self, at_m: [f64; 2], way: [f64; 2]) -> [Vec<(usize, f64)>; 2] {
        let probe = self.structure.probe(at_m[0], at_m[1]);
        let mut charge = probe.charge;
        let mut loops = Vec::new();
        let first = self.branch_rows().start;
        for (part, current) in way.into_iter().zip(probe.current) {
            if part != 0.0 {
                // H to the left of x is H_y = -K_x / 2, to the left of y -H_x = -K_y / 2.
                let weights = current.into_iter();
                loops.extend(weights.map(|(branch, weight)| (first + branch, -part * weight)));
            }
        }
        if self.structure.strays() {
            for (knot, weight) in self.knots.plane_weights(at_m).into_iter().enumerate() {
                charge.push((self.stray_row(0, knot), weight));
                for (kind, part) in [(1, -way[1]), (2, way[0])] {
                    if part != 0.0 {
                        loops.push((self.stray_row(kind, knot), part * weight));
                    }
                }
            }
        }
        [charge, loops]
    }
}

/// Rows of a response at one frequency.
pub(super) struct Rows {
    drives: usize,
    re: Vec<f32>,
    im: Vec<f32>,
}

impl Rows {
    /// Adds weighted rows up.
    pub(super) fn sum(&self, rows: &[usize], weights: &[Complex64]) -> Vec<Complex64> {
        let mut sum = vec![Complex64::ZERO; self.drives];
        let felt = rows
            .iter()
            .zip(weights)
            .filter(|(_, weight)| **weight != Complex64::ZERO);
        for (row, weight) in felt {
            let range = row * self.drives..(row + 1) * self.drives;
            let values = self.re[range.clone()].iter().zip(&self.im[range]);
            for (sum, (&re, &im)) in sum.iter_mut().zip(values) {
                let (re, im) = (f64::from(re), f64::from(im));
                *sum += Complex64::new(
                    weight.re * re - weight.im * im,
                    weight.re * im + weight.im * re,
                );
            }
        }
        sum
    }
}
