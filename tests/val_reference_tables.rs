//! The tables of `tests/reference/`, made by independent programs, against lines, oracle and engine.

mod oracle;

use num_complex::Complex64;
use oracle::build::{driver, line, net, receiver, shunt, trace_on};
use ringfield::board::{Driver, Layer, Net, PathItem, Structure};
use ringfield::line::{Line, line_of_trace};
use ringfield::ringing::{Network, settle};
use ringfield::spectrum::{Spectrum, spectrum};
use serde::Deserialize;
use std::f64::consts::TAU;
use std::sync::Arc;

const LIGHT_SPEED_M_PER_S: f64 = 299_792_458.0;

#[derive(Deserialize)]
struct LossyLines {
    traces: Vec<TraceTable>,
    nets: Vec<NetTable>,
}

#[derive(Deserialize)]
struct TraceTable {
    name: String,
    width_m: f64,
    height_m: f64,
    copper_m: f64,
    permittivity: f64,
    loss_tangent: f64,
    dc_ohm_per_m: f64,
    /// Of R(f) = dc + skin sqrt(j f / 1 Hz).
    skin_ohm_per_m: f64,
    rows: Vec<LineRow>,
}

#[derive(Deserialize)]
struct LineRow {
    frequency_hz: f64,
    lossless_copper_ohm: f64,
    dielectric_np_per_m: f64,
    resistance_ohm_per_m: f64,
    inductance_h_per_m: f64,
    conductance_s_per_m: f64,
    capacitance_f_per_m: f64,
    propagation_per_m: Complex,
    impedance_ohm: Complex,
}

#[derive(Deserialize)]
struct NetTable {
    trace: String,
    length_m: f64,
    driver_ohm: f64,
    load_f: f64,
    clock_hz: f64,
    top_hz: f64,
    rows: Vec<NetRow>,
}

/// Per volt of the driver's open-circuit voltage.
#[derive(Deserialize)]
struct NetRow {
    harmonic: usize,
    receiver: Complex,
    driver_s: Complex,
}

#[derive(Deserialize, Clone, Copy)]
struct Complex(f64, f64);

impl From<Complex> for Complex64 {
    fn from(Complex(re, im): Complex) -> Self {
        Self::new(re, im)
    }
}

fn lossy_lines() -> LossyLines {
    serde_json::from_str(include_str!("reference/lossy_lines.json")).expect("the table is sound")
}

impl TraceTable {
    fn item(&self, length_m: f64) -> PathItem {
        let layer = Layer {
            name: self.name.clone(),
            structure: Structure::Microstrip {
                height_m: self.height_m,
            },
            permittivity: self.permittivity,
            loss_tangent: self.loss_tangent,
            copper_m: self.copper_m,
            roughness_m: 0.0,
        };
        trace_on(&Arc::new(layer), self.width_m, length_m)
    }

    /// A metre of it.
    fn line(&self) -> Line {
        match self.item(1.0) {
            PathItem::Trace(trace) => line_of_trace(&trace).0,
            _ => unreachable!("it is a trace"),
        }
    }
}

fn within(what: &str, computed: f64, table: f64, share: f64) {
    let off = computed / table - 1.0;
    assert!(
        off.abs() <= share,
        "{what}: {computed:.6e} against {table:.6e}, {:+.3} %",
        100.0 * off
    );
}

/// scikit-rf's MLine computes Hammerstad & Jensen's share of the field in the board anew from the permittivity at each
/// frequency; here it is that of the stated permittivity: some parts in ten thousand.
#[test]
fn impedance_and_dielectric_loss_of_microstrips() {
    for trace in lossy_lines().traces {
        let line = trace.line();
        let loss = line.loss.as_ref().expect("a trace has loss");
        let air_ohm = line.impedance_ohm * line.delay_s * LIGHT_SPEED_M_PER_S;
        for row in &trace.rows {
            let what = format!("{}, {:e} Hz", trace.name, row.frequency_hz);
            let omega = TAU * row.frequency_hz;
            let index = loss.effective_permittivity(omega).sqrt();
            let ohm = air_ohm / index.re;
            within(
                &format!("{what}, impedance"),
                ohm,
                row.lossless_copper_ohm,
                0.0005,
            );
            let attenuation = -omega / LIGHT_SPEED_M_PER_S * index.im;
            within(
                &format!("{what}, attenuation"),
                attenuation,
                row.dielectric_np_per_m,
                0.001,
            );
        }
    }
}

/// Resistance and inner inductance by the incremental-inductance rule on MLine's impedance in air.
#[test]
fn parameters_and_waves_of_lossy_microstrips() {
    for trace in lossy_lines().traces {
        let line = trace.line();
        let loss = line.loss.as_ref().expect("a trace has loss");
        within(
            "direct current",
            loss.dc_ohm_per_m,
            trace.dc_ohm_per_m,
            1e-6,
        );
        for row in &trace.rows {
            let what = format!("{}, {:e} Hz", trace.name, row.frequency_hz);
            let omega = TAU * row.frequency_hz;
            let (series, shunt) = (loss.series_ohm_per_m(omega), loss.shunt_s_per_m(omega));
            let skin = (series.re - loss.dc_ohm_per_m) / (row.frequency_hz / 2.0).sqrt();
            within(&format!("{what}, skin"), skin, trace.skin_ohm_per_m, 1e-5);
            within(
                &format!("{what}, R"),
                series.re,
                row.resistance_ohm_per_m,
                1e-5,
            );
            within(
                &format!("{what}, L"),
                series.im / omega,
                row.inductance_h_per_m,
                1e-5,
            );
            within(
                &format!("{what}, G"),
                shunt.re,
                row.conductance_s_per_m,
                1e-5,
            );
            within(
                &format!("{what}, C"),
                shunt.im / omega,
                row.capacitance_f_per_m,
                1e-5,
            );
            let wave = line.wave_at(omega);
            let (gamma, ohm) = (row.propagation_per_m.into(), row.impedance_ohm.into());
            for (quantity, ours, table) in [
                ("propagation", wave.propagation, gamma),
                ("impedance", wave.impedance_ohm, ohm),
            ] {
                let table: Complex64 = table;
                let apart = (ours - table).norm() / table.norm();
                assert!(apart < 1e-5, "{what}, {quantity}: {ours} against {table}");
            }
            within(
                &format!("{what}, attenuation"),
                wave.propagation.re,
                gamma.re,
                1e-5,
            );
        }
    }
}

fn engine(net: &Net, lowest_hz: f64, top_hz: f64) -> Spectrum {
    let network = Network::of(net);
    let settled = settle(&network, top_hz);
    assert!(settled.report.settled, "{}: {:?}", net.name, settled.report);
    spectrum(&network, &settled, lowest_hz, top_hz)
}

fn db(ratio: f64) -> f64 {
    20.0 * ratio.log10()
}

/// Driver, lossy line and capacitance as ABCD matrices: the oracle has to give the same, the engine within 0.2 dB to 1 GHz
/// and 0.5 dB above, wherever a harmonic is within 50 dB of its strongest.
#[test]
fn nets_over_lossy_lines() {
    let table = lossy_lines();
    for values in &table.nets {
        let trace = table.traces.iter().find(|trace| trace.name == values.trace);
        let item = trace
            .expect("the table holds the net's trace")
            .item(values.length_m);
        let path = vec![item, receiver("end", values.load_f)];
        let driver = driver(3.3, values.driver_ohm, 0.1e-9);
        let net = net(&values.trace, driver, values.clock_hz, path);
        let spectrum = engine(&net, 30e6, values.top_hz);
        let mut rows = Vec::new();
        for row in &values.rows {
            let source_v =
                oracle::source_phasor_v(&net.driver, net.clock_hz, net.duty, row.harmonic);
            let answer = oracle::harmonic(&net, row.harmonic);
            let place = row.harmonic - spectrum.harmonics.start();
            rows.push((
                row.harmonic,
                source_v * Complex64::from(row.receiver),
                answer.receivers_v[0],
                spectrum.receivers_v[[0, place]],
            ));
            rows.push((
                row.harmonic,
                source_v * Complex64::from(row.driver_s),
                answer.driver_a,
                spectrum.driver_a[place],
            ));
        }
        for quantity in [0, 1] {
            let rows = rows.iter().skip(quantity).step_by(2);
            let strongest = rows.clone().map(|row| row.1.norm()).fold(0.0, f64::max);
            for (harmonic, table, oracle, engine) in rows {
                let frequency_hz = *harmonic as f64 * net.clock_hz;
                let oracle_db = db(oracle.norm() / table.norm());
                assert!(
                    oracle_db.abs() < 0.002,
                    "{}, harmonic {harmonic}: oracle {oracle_db:+.3} dB",
                    net.name
                );
                if table.norm() > strongest * 10f64.powf(-50.0 / 20.0) {
                    let engine_db = db(engine.norm() / table.norm());
                    let allowed_db = if frequency_hz <= 1e9 { 0.2 } else { 0.5 };
                    assert!(
                        engine_db.abs() < allowed_db,
                        "{}, harmonic {harmonic}: engine {engine_db:+.3} dB",
                        net.name
                    );
                }
            }
        }
    }
}

#[derive(Deserialize)]
struct TwoState {
    clock_hz: f64,
    swing_v: f64,
    drivers: std::collections::BTreeMap<String, TwoStateDriver>,
    rc: Rc,
    line: DelayLine,
    rows: Vec<TwoStateRow>,
}

#[derive(Deserialize)]
struct TwoStateDriver {
    high_ohm: f64,
    low_ohm: f64,
    rise_s: f64,
    fall_s: f64,
}

#[derive(Deserialize)]
struct Rc {
    ohm: f64,
    farad: f64,
}

#[derive(Deserialize)]
struct DelayLine {
    ohm: f64,
    delay_s: f64,
    farad: f64,
}

/// From the first harmonic on, odd and even.
#[derive(Deserialize)]
struct TwoStateRow {
    driver: String,
    load: String,
    driver_current_a: Vec<f64>,
    receiver_v: Vec<f64>,
}

/// Drivers of two resistances into loads that remember, solved by SciPy as ordinary differential equations; the ladder's
/// 240 and 480 cells agree to 0.008 %.
#[test]
fn two_state_drivers() {
    let table: TwoState =
        serde_json::from_str(include_str!("reference/two_state.json")).expect("the table is sound");
    for row in &table.rows {
        let name = format!("{}, {}", row.driver, row.load);
        let values = &table.drivers[&row.driver];
        let driver = Driver {
            high_resistance_ohm: values.high_ohm,
            fall_s: values.fall_s,
            ..driver(table.swing_v, values.low_ohm, values.rise_s)
        };
        let path = match row.load.as_str() {
            "rc" => vec![shunt(table.rc.ohm, 0.0), receiver("end", table.rc.farad)],
            _ => vec![
                line(table.line.ohm, table.line.delay_s),
                receiver("end", table.line.farad),
            ],
        };
        let net = net(&name, driver, table.clock_hz, path);
        let spectrum = engine(&net, table.clock_hz, 1e9);
        let voltages = spectrum.receivers_v.row(0).to_vec();
        for (engine, exact) in [
            (&spectrum.driver_a, &row.driver_current_a),
            (&voltages, &row.receiver_v),
        ] {
            let strongest = exact.iter().copied().fold(0.0, f64::max);
            for (place, (engine, exact)) in engine.iter().zip(exact).enumerate() {
                if *exact > strongest * 10f64.powf(-60.0 / 20.0) {
                    let off_db = db(engine.norm() / exact);
                    assert!(
                        off_db.abs() < 0.02,
                        "{name}, harmonic {}: {off_db:+.3} dB",
                        place + 1
                    );
                }
            }
        }
    }
}
