//! A slow, obvious, exact answer for a net without clamps and with a steady driver, straight from the
//! board model: at every harmonic each item of the path is a two-port, and the source is the closed
//! Fourier series of its trapezoid. Nothing is taken from the engine but a trace's cross-section.

// Every test crate uses a part of this module.
#![allow(dead_code)]

pub mod build;
pub mod lit;
pub mod published;
pub mod run;

use num_complex::Complex64;
use ringfield::board::{DirectLine, Driver, EdgeShape, Net, PathItem, ReceiverPart, Shunt, Trace};
use ringfield::line::line_of_trace;
use std::f64::consts::{FRAC_PI_4, PI, SQRT_2, TAU};

const J: Complex64 = Complex64::I;
const ONE: Complex64 = Complex64::ONE;
const ZERO: Complex64 = Complex64::ZERO;

/// One harmonic of a net, as rms phasors; the rising edge starts at time zero.
#[derive(Debug, Clone)]
pub struct Answer {
    /// Current out of the driver.
    pub driver_a: Complex64,
    /// Voltage at the driver's pin.
    pub driver_v: Complex64,
    /// Voltage at the receivers, in the order of the path.
    pub receivers_v: Vec<Complex64>,
    /// The waves of the lines, in the order of the path.
    pub waves: Vec<Waves>,
}

/// The two waves of a line, each where it sets out.
#[derive(Debug, Clone, Copy)]
pub struct Waves {
    pub outward_v: Complex64,
    pub inward_v: Complex64,
}

/// The answer at one harmonic.
pub fn harmonic(net: &Net, number: usize) -> Answer {
    let source_v = source_phasor_v(&net.driver, net.clock_hz, net.duty, number);
    respond(net, TAU * number as f64 * net.clock_hz, source_v)
}

/// The answer to a source of one frequency; at zero frequency every rail counts as 0 V.
pub fn respond(net: &Net, omega: f64, source_v: Complex64) -> Answer {
    let driver = &net.driver;
    assert_eq!(
        driver.low_resistance_ohm, driver.high_resistance_ohm,
        "a driver whose resistance changes is not linear"
    );
    let into_path_s = admittance_s(&net.path, omega);
    let driver_v = source_v / (ONE + driver.low_resistance_ohm * into_path_s);
    let mut answer = Answer {
        driver_a: driver_v * into_path_s,
        driver_v,
        receivers_v: Vec::new(),
        waves: Vec::new(),
    };
    walk(&net.path, omega, driver_v, &mut answer);
    answer
}

/// Voltage at the first receiver at some times, as the sum of `count` harmonics of the net's clock.
pub fn receiver_at(net: &Net, count: usize, times_s: &[f64]) -> Vec<f64> {
    sum_of_harmonics(net, count, times_s, |answer| answer.receivers_v[0])
}

/// Voltage at the driver's pin at some times, as the sum of `count` harmonics of the net's clock.
pub fn driver_at(net: &Net, count: usize, times_s: &[f64]) -> Vec<f64> {
    sum_of_harmonics(net, count, times_s, |answer| answer.driver_v)
}

fn sum_of_harmonics(
    net: &Net,
    count: usize,
    times_s: &[f64],
    quantity: impl Fn(&Answer) -> Complex64,
) -> Vec<f64> {
    let driver = &net.driver;
    let mean_v = driver.low_v + (driver.high_v - driver.low_v) * net.duty;
    let steady_v = quantity(&respond(net, 0.0, mean_v.into())).re;
    let mut sums = vec![steady_v; times_s.len()];
    for number in 1..=count {
        let phasor = quantity(&harmonic(net, number));
        for (sum, time_s) in sums.iter_mut().zip(times_s) {
            let turn = Complex64::cis(TAU * number as f64 * net.clock_hz * time_s);
            *sum += SQRT_2 * (phasor * turn).re;
        }
    }
    sums
}

/// A harmonic of the driver's open-circuit voltage, rms.
///
/// The derivative of the wave is one pulse for each edge. A pulse of unit area has the transform of its
/// shape about its middle, and dividing by j omega integrates it.
pub fn source_phasor_v(driver: &Driver, clock_hz: f64, duty: f64, number: usize) -> Complex64 {
    let omega = TAU * number as f64 * clock_hz;
    let (rise_s, fall_s) = (driver.full_rise_s(), driver.full_fall_s());
    let rise_middle_s = rise_s / 2.0;
    let fall_middle_s = rise_middle_s + duty / clock_hz;
    let pulse = |middle_s: f64, edge_s: f64| {
        Complex64::cis(-omega * middle_s) * edge_transform(driver.edge, omega * edge_s)
    };
    let coefficient = (driver.high_v - driver.low_v) * clock_hz / (J * omega)
        * (pulse(rise_middle_s, rise_s) - pulse(fall_middle_s, fall_s));
    SQRT_2 * coefficient
}

/// Transform of an edge's slope about its middle over x = angular frequency times its whole duration.
fn edge_transform(edge: EdgeShape, x: f64) -> f64 {
    match edge {
        // a flat slope
        EdgeShape::Ramp => (x / 2.0).sin() / (x / 2.0),
        // half a sine
        EdgeShape::Smooth if (x - PI).abs() < 1e-6 => FRAC_PI_4,
        EdgeShape::Smooth => (x / 2.0).cos() / (1.0 - (x / PI).powi(2)),
    }
}

/// A two-port: near voltage = a far voltage + b far current; near current = c far voltage + d far current.
#[derive(Clone, Copy)]
struct TwoPort {
    a: Complex64,
    b: Complex64,
    c: Complex64,
    d: Complex64,
}

impl TwoPort {
    fn in_series(impedance_ohm: Complex64) -> Self {
        Self {
            a: ONE,
            b: impedance_ohm,
            c: ZERO,
            d: ONE,
        }
    }

    fn across(admittance_s: Complex64) -> Self {
        Self {
            a: ONE,
            b: ZERO,
            c: admittance_s,
            d: ONE,
        }
    }

    /// A uniform line from its propagation over the whole length (neper and, imaginary, radians).
    fn line(impedance_ohm: Complex64, propagation: Complex64) -> Self {
        let (sinh, cosh) = (propagation.sinh(), propagation.cosh());
        Self {
            a: cosh,
            b: impedance_ohm * sinh,
            c: sinh / impedance_ohm,
            d: cosh,
        }
    }

    fn then(self, next: Self) -> Self {
        Self {
            a: self.a * next.a + self.b * next.c,
            b: self.a * next.b + self.b * next.d,
            c: self.c * next.a + self.d * next.c,
            d: self.c * next.b + self.d * next.d,
        }
    }

    /// Admittance seen from the near side with an admittance at the far side.
    fn admittance_s(self, load_s: Complex64) -> Complex64 {
        (self.c + self.d * load_s) / (self.a + self.b * load_s)
    }

    /// Voltage at the far side over that at the near side.
    fn transfer(self, load_s: Complex64) -> Complex64 {
        ONE / (self.a + self.b * load_s)
    }
}

/// Admittance looking outwards at the start of a path.
fn admittance_s(path: &[PathItem], omega: f64) -> Complex64 {
    match path.split_first() {
        None => ZERO,
        Some((item, rest)) => two_port(item, omega).admittance_s(admittance_s(rest, omega)),
    }
}

/// Goes outwards from the start of a path, where the voltage is `near_v`.
fn walk(path: &[PathItem], omega: f64, near_v: Complex64, answer: &mut Answer) {
    let Some((item, rest)) = path.split_first() else {
        return;
    };
    let load_s = admittance_s(rest, omega);
    let far_v = near_v * two_port(item, omega).transfer(load_s);
    match item {
        PathItem::Line(DirectLine { impedance_ohm, .. }) => {
            let near_a = near_v * two_port(item, omega).admittance_s(load_s);
            answer.waves.push(waves(
                (*impedance_ohm).into(),
                near_v,
                near_a,
                far_v,
                far_v * load_s,
            ));
        }
        PathItem::Trace(trace) => {
            let near_a = near_v * two_port(item, omega).admittance_s(load_s);
            let (impedance_ohm, _) = lossy(trace, omega);
            answer
                .waves
                .push(waves(impedance_ohm, near_v, near_a, far_v, far_v * load_s));
        }
        PathItem::Receiver(receiver) => {
            let bond_ohm = J * omega * receiver.part.package_inductance_h;
            answer
                .receivers_v
                .push(near_v / (ONE + bond_ohm * chip_s(&receiver.part, omega)));
        }
        PathItem::Branch(items) => walk(items, omega, near_v, answer),
        PathItem::Series(_) | PathItem::Via(_) | PathItem::Shunt(_) => {}
    }
    walk(rest, omega, far_v, answer);
}

fn waves(
    impedance_ohm: Complex64,
    near_v: Complex64,
    near_a: Complex64,
    far_v: Complex64,
    far_a: Complex64,
) -> Waves {
    Waves {
        outward_v: (near_v + impedance_ohm * near_a) / 2.0,
        inward_v: (far_v - impedance_ohm * far_a) / 2.0,
    }
}

fn two_port(item: &PathItem, omega: f64) -> TwoPort {
    match item {
        PathItem::Series(part) => {
            TwoPort::in_series(part.resistance_ohm + J * omega * part.inductance_h)
        }
        PathItem::Line(line) => TwoPort::line(line.impedance_ohm.into(), J * omega * line.delay_s),
        PathItem::Trace(trace) => {
            let (impedance_ohm, propagation) = lossy(trace, omega);
            TwoPort::line(impedance_ohm, propagation)
        }
        PathItem::Via(via) => {
            let half = TwoPort::across(J * omega * via.capacitance_f / 2.0);
            half.then(TwoPort::in_series(J * omega * via.inductance_h))
                .then(half)
        }
        PathItem::Shunt(shunt) => TwoPort::across(shunt_s(shunt, omega)),
        PathItem::Receiver(receiver) => TwoPort::across(pin_s(&receiver.part, omega)),
        PathItem::Branch(items) => TwoPort::across(admittance_s(items, omega)),
    }
}

/// Impedance of a trace, and its propagation over the whole length, all loss spread along it.
fn lossy(trace: &Trace, omega: f64) -> (Complex64, Complex64) {
    let (line, _) = line_of_trace(trace);
    let loss = line.loss.expect("a trace has loss");
    let (series, shunt) = (loss.series_ohm_per_m(omega), loss.shunt_s_per_m(omega));
    (
        (series / shunt).sqrt(),
        line.length_m * (series * shunt).sqrt(),
    )
}

/// Resistance, inductance and capacitance in series; a rail is ground to every harmonic.
fn shunt_s(shunt: &Shunt, omega: f64) -> Complex64 {
    let coil_ohm = shunt.resistance_ohm + J * omega * shunt.inductance_h;
    match shunt.capacitance_f {
        None => ONE / coil_ohm,
        Some(capacitance_f) => {
            let capacitor_s = J * omega * capacitance_f;
            capacitor_s / (ONE + capacitor_s * coil_ohm)
        }
    }
}

/// A receiver from its pin: package capacitance, then the bond wire's inductance into the chip.
fn pin_s(part: &ReceiverPart, omega: f64) -> Complex64 {
    let bond = TwoPort::in_series(J * omega * part.package_inductance_h);
    J * omega * part.package_capacitance_f + bond.admittance_s(chip_s(part, omega))
}

fn chip_s(part: &ReceiverPart, omega: f64) -> Complex64 {
    J * omega * part.capacitance_f + part.resistance_ohm.map_or(0.0, f64::recip)
}
