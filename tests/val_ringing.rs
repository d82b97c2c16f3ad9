//! The march and its spectrum against published results.

mod oracle;

use oracle::build::{
    branch, clamped, driver, line, net, part, receiver, receiver_of, series, shunt,
};
use oracle::published::{FLIGHT_S, LATTICES, TRAPEZOIDS};
use ringfield::board::{Clamp, Net, PathItem};
use ringfield::ringing::{Network, Settled, settle};
use ringfield::spectrum::spectrum;

/// How far, in shares of the swing, a wave may overshoot the corner of its ramp: the interpolation of a delay
/// draws a smooth line through it, 6 % of one step's rise too high, and an edge has 100 steps here.
const CORNER: f64 = 0.001;

/// A settled net, to be read at times of its period.
struct Run {
    network: Network,
    settled: Settled,
}

impl Run {
    fn new(net: &Net, top_hz: f64) -> Self {
        let network = Network::of(net);
        let settled = settle(&network, top_hz);
        assert!(settled.report.settled, "{}: {:?}", net.name, settled.report);
        Self { network, settled }
    }

    fn receiver_v(&self) -> &[f64] {
        &self.settled.waveform.receivers_v[0]
    }

    /// The value at a time, on the straight line between two samples.
    fn at(&self, samples: &[f64], time_s: f64) -> f64 {
        let place = time_s / self.settled.waveform.pace.step_s;
        let before = place.floor() as usize;
        let share = place.fract();
        samples[before] * (1.0 - share) + samples[before + 1] * share
    }

    fn receiver_at(&self, time_s: f64) -> f64 {
        self.at(self.receiver_v(), time_s)
    }

    fn driver_at(&self, time_s: f64) -> f64 {
        self.at(&self.settled.waveform.driver_v, time_s)
    }

    /// When the receiver first rises past a level.
    fn receiver_rises_past_s(&self, level_v: f64) -> f64 {
        let samples = self.receiver_v();
        let after = samples
            .iter()
            .position(|&v| v > level_v)
            .expect("it rises past the level");
        let share = (level_v - samples[after - 1]) / (samples[after] - samples[after - 1]);
        (after as f64 - 1.0 + share) * self.settled.waveform.pace.step_s
    }

    fn highest_v(&self) -> f64 {
        self.receiver_v()
            .iter()
            .copied()
            .fold(f64::NEG_INFINITY, f64::max)
    }

    fn lowest_v(&self) -> f64 {
        self.receiver_v()
            .iter()
            .copied()
            .fold(f64::INFINITY, f64::min)
    }
}

#[test]
fn lattice_diagrams() {
    for lattice in LATTICES {
        let run = Run::new(&lattice.net(1e-6), 2e9);
        let [load_s, source_s] = lattice.middles_s();
        let load_v: Vec<f64> = load_s
            .iter()
            .map(|&time_s| run.receiver_at(time_s))
            .collect();
        let source_v: Vec<f64> = source_s
            .iter()
            .map(|&time_s| run.driver_at(time_s))
            .collect();
        // The march stops within a millionth of the swing.
        lattice.compare(&load_v, &source_v, 2e-6 * lattice.step_v);
    }
}

#[test]
fn trapezoid_spectra() {
    for trapezoid in TRAPEZOIDS {
        let run = Run::new(&trapezoid.net(), 1e9);
        let spectrum = spectrum(&run.network, &run.settled, 0.0, 1e9);
        let place = trapezoid.harmonic - spectrum.harmonics.start();
        // Where a corner falls between two steps, the samples are those of a slightly other wave.
        trapezoid.compare(spectrum.receivers_v[[0, place]].norm(), 0.002);
    }
}

/// The net of reference/clamped_net.py, which solves it as a stiff ladder of LC cells (SciPy BDF, 120 and
/// 240 cells agree to 0.02 %).
fn clamped_net() -> Net {
    let clamp = Clamp {
        knee_v: 0.707,
        resistance_ohm: 10.0,
    };
    let input = receiver_of("input", clamped(part(5e-12), clamp, 3.3));
    net(
        "clamped",
        driver(3.3, 3.0, 1e-9),
        25e6,
        vec![line(65.0, 1e-9), input],
    )
}

#[test]
fn clamped_levels_and_currents() {
    let run = Run::new(&clamped_net(), 1e9);
    let close = |computed: f64, expected: f64, within: f64| {
        assert!(
            (computed - expected).abs() < within,
            "{computed} {expected}"
        );
    };
    close(run.lowest_v(), -1.201, 0.010);
    close(run.highest_v(), 4.501, 0.010);
    let clamps = run.network.inputs[0].clamps;
    let low_a = |v: f64| clamps.low_a(v).expect("it has one");
    let high_a = |v: f64| clamps.high_a(v).expect("it has one");
    close(low_a(run.lowest_v()), 39.9e-3, 0.6e-3);
    close(high_a(run.highest_v()), 39.9e-3, 0.6e-3);
    let step_s = run.settled.waveform.pace.step_s;
    let charge_c = |current: &dyn Fn(f64) -> f64| -> f64 {
        run.receiver_v().iter().map(|&v| current(v) * step_s).sum()
    };
    close(charge_c(&low_a), 70.3e-12, 0.02 * 70.3e-12);
    close(charge_c(&high_a), 70.3e-12, 0.02 * 70.3e-12);
}

#[test]
fn clamped_spectrum() {
    const DBUA: [f64; 10] = [
        79.68, 79.13, 78.28, 78.80, 71.14, 69.92, 67.38, 64.07, 58.99, 56.64,
    ];
    let run = Run::new(&clamped_net(), 1e9);
    let spectrum = spectrum(&run.network, &run.settled, 0.0, 1e9);
    for (place, expected_dbua) in DBUA.into_iter().enumerate() {
        let harmonic = 2 * place + 1;
        let current_a = spectrum.driver_a[harmonic - spectrum.harmonics.start()].norm();
        let dbua = 20.0 * (current_a * 1e6).log10();
        assert!(
            (dbua - expected_dbua).abs() < 0.3,
            "{harmonic}: {dbua:.2} {expected_dbua}"
        );
    }
}

/// Paul, Scully & Steffka, 3rd ed., sec. 4: 5 V, 20 ohm, 50 ohm, 5 pF, 0.2 ns; edges of 1, 5, 10 and 20 flight
/// times peak at 7, about 6, 5.3 and 5.2 V. Half a unit of the last printed place for the two of two
/// places; a tenth of a volt for the two read off roughly.
#[test]
fn peaks_over_slower_edges() {
    for (edge_flights, peak_v, within_v) in [
        (1.0, 7.0, 0.1),
        (5.0, 6.0, 0.1),
        (10.0, 5.3, 0.05),
        (20.0, 5.2, 0.05),
    ] {
        let edge = driver(5.0, 20.0, edge_flights * 0.2e-9);
        let path = vec![line(50.0, 0.2e-9), receiver("end", 5e-12)];
        let run = Run::new(&net("Paul", edge, 10e6, path), 5e9);
        let highest_v = run.highest_v();
        assert!(
            (highest_v - peak_v).abs() < within_v,
            "{edge_flights}: {highest_v} {peak_v}"
        );
    }
}

/// Paul, Scully & Steffka, 3rd ed., sec. 4: from a matched source a capacitance delays the 50 % point by
/// 0.693 Z0 C; 50 ohm, 5 pF: 0.173 ns.
#[test]
fn a_capacitance_delays() {
    let edge_s = 5e-12;
    let half_at_s = |capacitance_f: f64| {
        let path = vec![line(50.0, 1e-9), receiver("end", capacitance_f)];
        Run::new(&net("Paul", driver(5.0, 50.0, edge_s), 50e6, path), 1e9)
            .receiver_rises_past_s(2.5)
    };
    let added_s = half_at_s(5e-12) - half_at_s(0.0);
    assert!((added_s - 0.173e-9).abs() < 0.001e-9, "{added_s:e}");
}

/// Johnson & Graham, High-Speed Signal Propagation, 2003: loads spread evenly along a line lower its
/// impedance to Z0 sqrt(C / (C + CL)); 34.6 pF of line and 15 pF of loads: 41.7 ohm (so Z0 is 50 ohm).
#[test]
fn loads_along_a_line_lower_its_impedance() {
    let (pieces, flight_s) = (60, 50.0 * 34.6e-12);
    let piece = || line(50.0, flight_s / (2 * pieces) as f64);
    let mut path: Vec<PathItem> = (0..pieces)
        .flat_map(|tap| {
            [
                piece(),
                receiver(&format!("tap {tap}"), 15e-12 / pieces as f64),
                piece(),
            ]
        })
        .collect();
    path.push(shunt(41.7, 0.0));
    let run = Run::new(&net("loaded", driver(2.0, 50.0, 0.5e-9), 25e6, path), 2e9);
    // A level that the edge has reached and no reflection yet.
    let launched_v = run.driver_at(2e-9);
    let impedance_ohm = 50.0 * launched_v / (2.0 - launched_v);
    assert!((impedance_ohm - 41.7).abs() < 0.2, "{impedance_ohm}");
    // Matched, it stays so.
    let later_v = run.driver_at(8e-9);
    assert!(
        (later_v - launched_v).abs() < 0.005,
        "{launched_v} {later_v}"
    );
}

/// Paul, Scully & Steffka, 3rd ed., sec. 4: 5 V through 25 ohm into a line ended by its 50 ohm leaves 3.33 V;
/// a series resistor of Z0 less the driver's resistance gives the whole swing without ringing.
#[test]
fn terminations() {
    let of =
        |path: Vec<PathItem>| Run::new(&net("Paul", driver(5.0, 25.0, 0.5e-9), 10e6, path), 2e9);
    let end = || receiver("end", 0.0);
    let parallel = of(vec![line(50.0, 1e-9), shunt(50.0, 0.0), end()]);
    let in_series = of(vec![series(25.0), line(50.0, 1e-9), end()]);
    for time_s in [1.6e-9, 3.7e-9, 20e-9] {
        assert!((parallel.receiver_at(time_s) - 3.33).abs() < 0.005);
        assert!((in_series.receiver_at(time_s) - 5.0).abs() < 1e-4);
    }
    assert!(
        parallel.highest_v() < 3.3333 + CORNER * 5.0 && in_series.highest_v() < 5.0 + CORNER * 5.0
    );
    // Split into two resistors the line sees both side by side, between their levels.
    let split = of(vec![
        line(50.0, 1e-9),
        shunt(100.0, 5.0),
        shunt(100.0, 0.0),
        end(),
    ]);
    assert!((split.receiver_at(20e-9) - (5.0 * 50.0 + 2.5 * 25.0) / 75.0).abs() < 1e-4);
    assert!((split.receiver_at(70e-9) - 2.5 * 25.0 / 75.0).abs() < 1e-4);
}

/// A matched tee: two lines of twice the impedance take the wave without reflection. Kirchhoff's laws.
#[test]
fn a_matched_tee_does_not_reflect() {
    let arm = || vec![line(100.0, 0.7e-9), shunt(100.0, 0.0), receiver("end", 0.0)];
    let path = vec![line(50.0, 1e-9), branch(arm()), branch(arm())];
    let run = Run::new(&net("tee", driver(2.0, 50.0, 0.5e-9), 10e6, path), 2e9);
    assert!(
        (run.receiver_at(20e-9) - 1.0).abs() < 1e-5 && (run.driver_at(20e-9) - 1.0).abs() < 1e-5
    );
    assert!(run.highest_v() < 1.0 + CORNER * 2.0, "{}", run.highest_v());
}

/// Overshoot of a strong driver (3 ohm, 3.3 V) over a line of six inches a nanosecond into 5 pF, in shares of the
/// swing.
fn overshoot(length_in: f64, ten_ninety_s: f64) -> f64 {
    let path = vec![line(65.0, length_in / 6.0 * 1e-9), receiver("end", 5e-12)];
    let run = Run::new(
        &net("practice", driver(3.3, 3.0, ten_ninety_s / 0.8), 10e6, path),
        2e9,
    );
    run.highest_v() / 3.3 - 1.0
}

/// Common practice, no source: a 10 ns edge is about 60 in long on the board, so a 6 in trace sees a
/// tenth of it and hardly rings; a modern edge rings on anything over half an inch.
#[test]
fn short_and_long_for_an_edge() {
    assert!(overshoot(6.0, 10e-9) < 0.2, "{}", overshoot(6.0, 10e-9));
    assert!(overshoot(6.0, 0.8e-9) > 0.5, "{}", overshoot(6.0, 0.8e-9));
    assert!(overshoot(0.5, 0.3e-9) > 0.2, "{}", overshoot(0.5, 0.3e-9));
}

/// Common practice, no source: a silicon junction's knee is 0.707 V, and a clamped line flattens at
/// 1.2 to 1.3 V beyond the rail because of the clamp's series resistance.
#[test]
fn a_clamped_line_flattens() {
    let run = Run::new(&clamped_net(), 1e9);
    for beyond_v in [-run.lowest_v(), run.highest_v() - 3.3] {
        assert!((1.15..1.35).contains(&beyond_v), "{beyond_v}");
    }
    // Without clamps the far end would nearly double.
    let path = vec![line(65.0, FLIGHT_S), receiver("input", 5e-12)];
    let bare = Run::new(&net("bare", driver(3.3, 3.0, 1e-9), 25e6, path), 1e9);
    assert!(bare.highest_v() - 3.3 > 2.0, "{}", bare.highest_v());
}
