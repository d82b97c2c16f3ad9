//! The line spectrum of one settled period, as rms phasors.
//!
//! The transform covers exactly one period, so each harmonic is one bin and nothing leaks. A receiver
//! reads the rms value of a steady line, which is the peak value over the square root of two.

mod transform;

use crate::ringing::{Network, Settled, Taken, WaveRecord};
use ndarray::{Array2, ArrayView1};
use num_complex::Complex64;
use std::f64::consts::TAU;
use std::ops::RangeInclusive;
use transform::Transform;

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

    let mut transform = Transform::new(&settled.waveform.pace, harmonics.clone());
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
