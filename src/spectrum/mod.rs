//! The line spectrum of one settled period, as rms phasors.
//!
//! The transform covers exactly one period, so each harmonic is one bin and nothing leaks. A receiver
//! reads the rms value of a steady line, which is the peak value over the square root of two.

use crate::ringing::{Network, Settled, Taken, WaveRecord};
use ndarray::{Array2, ArrayView1};
use num_complex::Complex64;
use realfft::RealFftPlanner;
use std::cell::RefCell;
use std::f64::consts::{SQRT_2, TAU};
use std::ops::RangeInclusive;

/// The harmonics of a net within a band. The phase reference is the start of the rising edge.
#[derive(Debug, Clone)]
pub struct Spectrum {
    /// Numbers of the harmonics; 1 is the clock.
    pub harmonics: RangeInclusive<usize>,
    /// Frequency of the clock.
    pub clock_hz: f64,
    /// Current out of the driver, one value a harmonic.
    pub driver_a: Vec<Complex64>,
    /// Voltage at the receivers: receiver by harmonic.
    pub receivers_v: Array2<Complex64>,
    /// The wave that leaves each line's near end: line by harmonic.
    pub outward_v: Array2<Complex64>,
    /// The wave that leaves each line's far end: line by harmonic.
    pub inward_v: Array2<Complex64>,
}

impl Spectrum {
    /// Number of harmonics.
    pub fn len(&self) -> usize {
        self.driver_a.len()
    }

    /// Whether the band holds no harmonic.
    pub fn is_empty(&self) -> bool {
        self.driver_a.is_empty()
    }

    /// Frequency of the harmonic at a place in the arrays.
    pub fn frequency_hz(&self, place: usize) -> f64 {
        (self.harmonics.start() + place) as f64 * self.clock_hz
    }
}

/// The harmonics of a settled period from `lowest_hz` to `top_hz`, both included.
///
/// # Panics
///
/// If the period has fewer than two samples for the highest harmonic.
pub fn spectrum(network: &Network, settled: &Settled, lowest_hz: f64, top_hz: f64) -> Spectrum {
    let clock_hz = 1.0 / network.period_s;
    // A clock given in decimals may miss the band's edge by a rounding.
    let slack = 1e-9;
    let first = ((lowest_hz / clock_hz) * (1.0 - slack)).ceil().max(1.0) as usize;
    let last = ((top_hz / clock_hz) * (1.0 + slack)).floor() as usize;
    let harmonics = first..=last;
    let count = (last + 1).saturating_sub(first);

    let mut transform = Transform::new(settled.report.steps_per_period, harmonics.clone());
    let driver_a = transform.phasors(&settled.waveform.driver_a);
    let mut receivers_v = Array2::zeros((network.inputs.len(), count));
    for (mut row, record) in receivers_v
        .rows_mut()
        .into_iter()
        .zip(&settled.waveform.receivers_v)
    {
        row.assign(&ArrayView1::from(&transform.phasors(record)));
    }
    let mut outward_v = Array2::zeros((network.spans.len(), count));
    let mut inward_v = Array2::zeros((network.spans.len(), count));
    for (line, (span, waves)) in network.spans.iter().zip(&settled.waves).enumerate() {
        let WaveRecord {
            outward_v: out,
            inward_v: back,
            taken,
        } = waves;
        outward_v
            .row_mut(line)
            .assign(&ArrayView1::from(&transform.phasors(out)));
        inward_v
            .row_mut(line)
            .assign(&ArrayView1::from(&transform.phasors(back)));
        if *taken == Taken::InMiddle {
            // Each wave was at its start half a flight time earlier.
            for (place, harmonic) in harmonics.clone().enumerate() {
                let wave = span.line.wave_at(TAU * harmonic as f64 * clock_hz);
                let earlier = (wave.propagation / 2.0).exp();
                outward_v[[line, place]] *= earlier;
                inward_v[[line, place]] *= earlier;
            }
        }
    }
    Spectrum {
        harmonics,
        clock_hz,
        driver_a,
        receivers_v,
        outward_v,
        inward_v,
    }
}

thread_local! {
    /// Plans are dear to make and the same for every net of one clock.
    static PLANNER: RefCell<RealFftPlanner<f64>> = RefCell::new(RealFftPlanner::new());
}

/// A transform of real periods of one length.
struct Transform {
    plan: std::sync::Arc<dyn realfft::RealToComplex<f64>>,
    input: Vec<f64>,
    bins: Vec<Complex64>,
    scratch: Vec<Complex64>,
    harmonics: RangeInclusive<usize>,
}

impl Transform {
    fn new(length: usize, harmonics: RangeInclusive<usize>) -> Self {
        assert!(
            2 * harmonics.end() < length,
            "too few samples for the highest harmonic"
        );
        let plan = PLANNER.with_borrow_mut(|planner| planner.plan_fft_forward(length));
        Self {
            input: plan.make_input_vec(),
            bins: plan.make_output_vec(),
            scratch: plan.make_scratch_vec(),
            plan,
            harmonics,
        }
    }

    /// The rms phasors of the wanted harmonics.
    fn phasors(&mut self, period: &[f64]) -> Vec<Complex64> {
        self.input.copy_from_slice(period);
        self.plan
            .process_with_scratch(&mut self.input, &mut self.bins, &mut self.scratch)
            .expect("all buffers were made by the plan");
        let to_rms = SQRT_2 / period.len() as f64;
        self.harmonics
            .clone()
            .map(|harmonic| self.bins[harmonic] * to_rms)
            .collect()
    }
}
