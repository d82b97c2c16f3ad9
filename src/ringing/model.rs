//! How a line is marched: its pure delay, and causal filters for what its loss does beside it.

use super::filter::{Basis, Relaxations, Sample};
use super::network::Network;
use crate::LIGHT_SPEED_M_PER_S;
use crate::line::{Line, Loss, WaveOnLine};
use num_complex::Complex64;
use std::cell::RefCell;
use std::f64::consts::TAU;
use std::rc::Rc;

/// Losses are fitted from here on: what lies lower is not radiated, and its slow relaxations would keep a net long
/// from its settled state.
const LOWEST_LOSSY_HZ: f64 = 20e6;

/// How a line is marched: its reference impedance, its pure delay and the filters that its loss is.
#[derive(Debug, Clone)]
pub struct Model {
    pub(super) impedance_ohm: f64,
    pub(super) delay_s: f64,
    pub(super) propagation: Relaxations,
    pub(super) reflection: Relaxations,
    /// To direct current, at each end.
    pub(super) dc_ohm: f64,
    /// Above this the relaxations hold that resistance too.
    pub(super) corner_rad_per_s: f64,
}

/// The lowest frequency that matters is lowered to one of so many an octave, since all nets of one band share most of
/// the work.
const BANDS_PER_OCTAVE: f64 = 2.0;
/// Of lines with lumped resistance to direct current: how far below the band it starts.
const CORNER_BELOW: f64 = 5.0;

/// How to march each line of a net whose waves matter up to a top frequency, in the order of [`Network::spans`].
pub fn line_models(network: &Network, top_frequency_hz: f64) -> Vec<Model> {
    let lowest_hz = (1.0 / network.period_s).max(LOWEST_LOSSY_HZ);
    let spans = network.spans.iter();
    spans
        .map(|span| Model::of(&span.line, lowest_hz, top_frequency_hz))
        .collect()
}

impl Model {
    /// How to march a line whose waves matter from `lowest_hz` to `top_hz`.
    pub(super) fn of(line: &Line, lowest_hz: f64, top_hz: f64) -> Self {
        match &line.loss {
            Some(loss) => {
                let octaves = lowest_hz.log2() * BANDS_PER_OCTAVE;
                // A clock that is such a frequency itself may miss it by a rounding.
                let lowest_hz = 2f64.powf((octaves + 1e-9).floor() / BANDS_PER_OCTAVE);
                Band::of(lowest_hz, top_hz).model(line, loss)
            }
            None => Self {
                impedance_ohm: line.impedance_ohm,
                delay_s: line.delay_s,
                propagation: Relaxations::constant(1.0),
                reflection: Relaxations::constant(0.0),
                dc_ohm: 0.0,
                corner_rad_per_s: TAU * lowest_hz,
            },
        }
    }
}

/// What the fits of all lines have in common whose waves matter between the same frequencies.
struct Band {
    lowest_hz: f64,
    top_hz: f64,
    samples: Vec<Sample>,
    propagation: Basis,
    reflection: Basis,
}

thread_local! {
    static BANDS: RefCell<Vec<Rc<Band>>> = const { RefCell::new(Vec::new()) };
}

impl Band {
    /// Bands are dear to make, and a board needs few.
    const KEPT: usize = 32;

    fn of(lowest_hz: f64, top_hz: f64) -> Rc<Self> {
        BANDS.with_borrow_mut(|bands| {
            let same = |band: &&Rc<Self>| band.lowest_hz == lowest_hz && band.top_hz == top_hz;
            if let Some(band) = bands.iter().find(same) {
                return band.clone();
            }
            let band = Rc::new(Self::new(lowest_hz, top_hz));
            if bands.len() == Self::KEPT {
                bands.clear();
            }
            bands.push(band.clone());
            band
        })
    }

    fn new(lowest_hz: f64, top_hz: f64) -> Self {
        // Found by trial: with these the fits stay within two parts in ten thousand for lines up to 0.25 m. A
        // reflection with slower poles than these makes a line give energy below the band.
        const SAMPLES_PER_DECADE: f64 = 10.0;
        const WEIGHT_ABOVE: f64 = 0.01;
        // Above the band the fit need not be close, but must not amplify.
        let weighted = |from_hz, to_hz, weight| {
            let omegas = spread(from_hz, to_hz, SAMPLES_PER_DECADE);
            omegas
                .into_iter()
                .map(move |omega| Sample { omega, weight })
        };
        let samples: Vec<Sample> = weighted(0.7 * lowest_hz, 1.5 * top_hz, 1.0)
            .chain(weighted(2.0 * top_hz, 50.0 * top_hz, WEIGHT_ABOVE))
            .collect();
        let propagation_poles = spread(lowest_hz / 8.0, 12.0 * top_hz, 2.8);
        let reflection_poles = spread(lowest_hz / 6.0, 1.5 * top_hz, 2.2);
        Self {
            lowest_hz,
            top_hz,
            propagation: Basis::new(propagation_poles, &samples, Some(1.0)),
            reflection: Basis::new(reflection_poles, &samples, None),
            samples,
        }
    }

    fn model(&self, line: &Line, loss: &Loss) -> Model {
        let wave_at = |sample: &Sample| line.wave_at(sample.omega);
        let waves: Vec<WaveOnLine> = self.samples.iter().map(wave_at).collect();
        // The reference impedance leaves nothing to reflect at the top.
        let top_omega = TAU * self.top_hz;
        let impedance_ohm = line.wave_at(top_omega).impedance_ohm.re;
        let reflected = |wave: &WaveOnLine| {
            (wave.impedance_ohm - impedance_ohm) / (wave.impedance_ohm + impedance_ohm)
        };
        let reflected: Vec<Complex64> = waves.iter().map(reflected).collect();
        let (delay_s, propagation) = self.delayed(line, loss, &waves);
        Model {
            impedance_ohm,
            delay_s,
            propagation,
            reflection: self.reflection.fit(&reflected),
            dc_ohm: loss.dc_ohm_per_m * line.length_m / 2.0,
            corner_rad_per_s: TAU * self.lowest_hz / CORNER_BELOW,
        }
    }

    /// How much of the phase is pure delay lies between what holds far above the band and what holds at its top; the
    /// rest is left to the relaxations. The best split is the one they fit best.
    fn delayed(&self, line: &Line, loss: &Loss, waves: &[WaveOnLine]) -> (f64, Relaxations) {
        const FAR_ABOVE_RAD_PER_S: f64 = 1e18;
        const ROUNDS: usize = 6;
        let delay_s = |omega: f64| {
            line.length_m * loss.effective_permittivity(omega).re.sqrt() / LIGHT_SPEED_M_PER_S
        };
        let (shortest_s, longest_s) = (delay_s(FAR_ABOVE_RAD_PER_S), delay_s(TAU * self.top_hz));
        let filtered = |delay_s: f64| -> Vec<Complex64> {
            let value = |(sample, wave): (&Sample, &WaveOnLine)| {
                (Complex64::new(0.0, sample.omega * delay_s) - wave.propagation).exp()
            };
            self.samples.iter().zip(waves).map(value).collect()
        };
        const CLOSE: f64 = 0.01;
        // Newton's method: what the fit leaves, and how that changes with the delay, are known.
        let mut next_s = 0.5 * (shortest_s + longest_s);
        let mut best = (f64::INFINITY, next_s, Vec::new());
        for _ in 0..ROUNDS {
            let values = filtered(next_s);
            let slopes: Vec<Complex64> = (values.iter().zip(&self.samples))
                .map(|(value, sample)| Complex64::new(0.0, sample.omega) * value)
                .collect();
            let left = self.propagation.left(&values, true);
            let left_slope = self.propagation.left(&slopes, false);
            let dot = |a: &[f64], b: &[f64]| a.iter().zip(b).map(|(a, b)| a * b).sum::<f64>();
            let (error, slope) = (dot(&left, &left), dot(&left, &left_slope));
            let curvature = dot(&left_slope, &left_slope);
            let this_s = next_s;
            if curvature > 0.0 {
                next_s = (next_s - slope / curvature).clamp(shortest_s, longest_s);
            }
            if error < best.0 {
                best = (error, this_s, values);
            }
            if (next_s - this_s).abs() < CLOSE * (longest_s - shortest_s) {
                break;
            }
        }
        (best.1, self.propagation.fit(&best.2))
    }
}

/// Angular frequencies from one frequency to another, so many to the decade.
fn spread(from_hz: f64, to_hz: f64, per_decade: f64) -> Vec<f64> {
    let decades = (to_hz / from_hz).log10();
    let steps = (decades * per_decade).ceil().max(1.0);
    (0..=steps as usize)
        .map(|i| TAU * from_hz * 10f64.powf(i as f64 / steps * decades))
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::board::{Layer, Structure, Trace};
    use crate::line::line_of_trace;
    use std::sync::Arc;

    fn line(structure: Structure, width_m: f64, length_m: f64) -> Line {
        let layer = Layer {
            name: "layer".into(),
            structure,
            permittivity: 4.3,
            loss_tangent: 0.02,
            copper_m: 35e-6,
            roughness_m: 0.0,
        };
        let points_m = Vec::new();
        line_of_trace(&Trace {
            layer: Arc::new(layer),
            width_m,
            length_m,
            points_m,
        })
        .0
    }

    /// In the band the fits are good to one part in a thousand, and nowhere do they give more than they take.
    #[test]
    fn loss_is_fitted_closely_and_never_amplifies() {
        let microstrip = (Structure::Microstrip { height_m: 101.6e-6 }, 101.6e-6);
        let stripline = (
            Structure::Stripline {
                below_m: 127e-6,
                above_m: 200e-6,
            },
            127e-6,
        );
        for (lowest_hz, top_hz) in [(20e6, 1e9), (48e6, 1e9), (156e6, 6e9), (500e6, 2e9)] {
            for (structure, width_m) in [microstrip, stripline] {
                for length_m in [0.01, 0.1, 0.25, 0.6] {
                    let line = line(structure, width_m, length_m);
                    let model = Model::of(&line, lowest_hz, top_hz);
                    let what =
                        format!("{structure:?}, {length_m} m, {lowest_hz:e} to {top_hz:e} Hz");
                    for omega in spread(lowest_hz, top_hz, 50.0) {
                        let wave = line.wave_at(omega);
                        let delay = Complex64::new(0.0, omega * model.delay_s);
                        let reflection = (wave.impedance_ohm - model.impedance_ohm)
                            / (wave.impedance_ohm + model.impedance_ohm);
                        let off =
                            (model.propagation.at(omega) - (delay - wave.propagation).exp()).norm();
                        assert!(
                            off < 1e-3,
                            "{what}: propagation off by {off:.1e} at {omega:e}"
                        );
                        let off = (model.reflection.at(omega) - reflection).norm();
                        assert!(
                            off < 1e-3,
                            "{what}: reflection off by {off:.1e} at {omega:e}"
                        );
                    }
                    for omega in spread(lowest_hz / 1e3, top_hz * 1e4, 20.0) {
                        let gain = model.propagation.at(omega).norm();
                        assert!(gain < 1.0 + 1e-4, "{what}: gain of {gain} at {omega:e}");
                    }
                }
            }
        }
    }
}
