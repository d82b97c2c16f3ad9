//! The engine's march and transform against the exact answer, harmonic by harmonic: driver current and
//! receiver voltages within 0.1 dB wherever they are within 50 dB of their strongest.

mod oracle;

use num_complex::Complex64;
use oracle::build::{
    branch, coil, driver, line, net, part, receiver, receiver_of, series, shunt, shunt_rlc, via,
};
use proptest::prelude::*;
use proptest::test_runner::{Config, RngAlgorithm, TestRng, TestRunner};
use ringfield::board::{Driver, EdgeShape, Net, PathItem, ReceiverPart, Thresholds};
use ringfield::ringing::{MarchReport, Network, settle};
use ringfield::spectrum::{Spectrum, spectrum};

const AGREED_DB: f64 = 0.1;
/// The same, taken with the phase.
const AGREED_PHASORS: f64 = 0.0116;
const JUDGED_DB: f64 = 50.0;

fn engine(net: &Net, top_hz: f64) -> (MarchReport, Spectrum) {
    let network = Network::of(net);
    let settled = settle(&network, top_hz);
    (settled.report, spectrum(&network, &settled, 30e6, top_hz))
}

fn db(ratio: f64) -> f64 {
    20.0 * ratio.log10()
}

/// All disagreements in words.
fn compare(net: &Net, top_hz: f64) -> Result<(), String> {
    let (report, spectrum) = engine(net, top_hz);
    if !report.settled {
        return Err(format!("{}: did not settle: {report:?}", net.name));
    }
    let answers: Vec<oracle::Answer> = spectrum
        .harmonics
        .clone()
        .map(|number| oracle::harmonic(net, number))
        .collect();
    let exact_a: Vec<Complex64> = answers.iter().map(|answer| answer.driver_a).collect();
    let mut said = compare_quantity(
        net,
        "driver current, A",
        &spectrum,
        &spectrum.driver_a,
        &exact_a,
    );
    for (receiver, row) in spectrum.receivers_v.rows().into_iter().enumerate() {
        let exact_v: Vec<Complex64> = answers
            .iter()
            .map(|answer| answer.receivers_v[receiver])
            .collect();
        let quantity = format!("receiver {receiver}, V");
        said += &compare_quantity(net, &quantity, &spectrum, &row.to_vec(), &exact_v);
    }
    if said.is_empty() { Ok(()) } else { Err(said) }
}

fn compare_quantity(
    net: &Net,
    quantity: &str,
    spectrum: &Spectrum,
    engine: &[Complex64],
    exact: &[Complex64],
) -> String {
    let strongest = exact.iter().map(|phasor| phasor.norm()).fold(0.0, f64::max);
    let mut said = String::new();
    for (place, (engine, exact)) in engine.iter().zip(exact).enumerate() {
        if db(exact.norm() / strongest) < -JUDGED_DB {
            continue;
        }
        let off_db = db(engine.norm() / exact.norm());
        let apart = (engine - exact).norm() / exact.norm();
        if off_db.abs() > AGREED_DB || apart > AGREED_PHASORS || !off_db.is_finite() {
            said += &format!(
                "{}: harmonic {} ({:.1} MHz), {quantity}: engine {:.4e}, exact {:.4e}, {off_db:+.3} dB, phasors {:.1} % apart, {:.1} dB below the strongest\n",
                net.name,
                spectrum.harmonics.start() + place,
                spectrum.frequency_hz(place) / 1e6,
                engine.norm(),
                exact.norm(),
                100.0 * apart,
                db(strongest / exact.norm()),
            );
        }
    }
    said
}

fn agree(nets: &[Net], top_hz: f64) {
    let said: String = nets
        .iter()
        .filter_map(|net| compare(net, top_hz).err())
        .collect();
    assert!(said.is_empty(), "\n{said}");
}

#[test]
fn single_lines() {
    let mut nets = Vec::new();
    for line_ohm in [35.0, 50.0, 65.0, 90.0, 120.0] {
        for source_ohm in [1.0, 3.0, 47.0] {
            for capacitance_f in [2e-12, 5e-12, 10e-12] {
                let name = format!("{source_ohm} ohm, {line_ohm} ohm 870 ps, {capacitance_f:e} F");
                let path = vec![line(line_ohm, 0.87e-9), receiver("end", capacitance_f)];
                nets.push(net(&name, driver(3.3, source_ohm, 1e-9), 48e6, path));
            }
        }
    }
    agree(&nets, 1e9);
}

/// Far longer than a period, just about it, and down to far shorter than a step.
#[test]
fn odd_delays() {
    let delays_s = [
        137.31e-9, 41.07e-9, 20.833e-9, 11.0e-9, 3.3333e-9, 777e-12, 123.4e-12, 47e-12, 31e-12,
        21e-12, 19e-12, 11e-12, 7.1e-12, 3e-12, 1e-12, 1e-13,
    ];
    let nets: Vec<Net> = delays_s
        .into_iter()
        .flat_map(|delay_s| {
            [3.0, 47.0].map(|source_ohm| {
                let path = vec![line(65.0, delay_s), receiver("end", 5e-12)];
                let name = format!("{source_ohm} ohm, {delay_s:e} s");
                net(&name, driver(3.3, source_ohm, 0.9e-9), 48e6, path)
            })
        })
        .collect();
    agree(&nets, 1e9);
}

#[test]
fn terminations() {
    let end = || receiver("end", 5e-12);
    let line = || line(64.0, 0.93e-9);
    let strong = |name: &str, path| net(name, driver(3.3, 3.0, 0.8e-9), 48e6, path);
    agree(
        &[
            strong("series", vec![series(61.0), line(), end()]),
            strong(
                "series with ferrite",
                vec![coil(20.0, 47e-9), line(), end()],
            ),
            strong("parallel", vec![line(), shunt(64.0, 0.0), end()]),
            strong(
                "parallel to mid-rail",
                vec![line(), shunt(64.0, 1.65), end()],
            ),
            strong(
                "split",
                vec![line(), shunt(130.0, 3.3), shunt(126.0, 0.0), end()],
            ),
            strong("RC", vec![line(), shunt_rlc(64.0, 0.0, 100e-12), end()]),
            strong(
                "RC small",
                vec![line(), shunt_rlc(64.0, 0.0, 10e-12), end()],
            ),
            strong("RLC", vec![line(), shunt_rlc(64.0, 3e-9, 47e-12), end()]),
            strong(
                "sharp LC trap",
                vec![line(), shunt_rlc(2.0, 5e-9, 4e-12), end()],
            ),
            strong("coil at the end", vec![line(), coil(0.0, 5e-9), end()]),
        ],
        1e9,
    );
}

#[test]
fn chains_tees_and_stars() {
    let packaged = ReceiverPart {
        resistance_ohm: Some(5e3),
        package_inductance_h: 3e-9,
        package_capacitance_f: 0.8e-12,
        ..part(3e-12)
    };
    let leg = |delay_s, name: &str, farad| branch(vec![line(70.0, delay_s), receiver(name, farad)]);
    let strong = |name: &str, path| net(name, driver(3.3, 5.0, 0.8e-9), 40e6, path);
    agree(
        &[
            strong(
                "chain of impedances",
                vec![
                    line(50.0, 0.4e-9),
                    line(80.0, 0.333e-9),
                    line(65.0, 0.71e-9),
                    receiver("a", 5e-12),
                ],
            ),
            strong(
                "daisy chain",
                vec![
                    line(65.0, 0.4e-9),
                    receiver("a", 4e-12),
                    line(65.0, 0.15e-9),
                    receiver("b", 4e-12),
                    line(65.0, 0.3e-9),
                    receiver("c", 6e-12),
                ],
            ),
            strong(
                "tee",
                vec![
                    line(65.0, 0.5e-9),
                    leg(0.3e-9, "a", 5e-12),
                    line(65.0, 0.41e-9),
                    receiver("b", 5e-12),
                ],
            ),
            strong(
                "tee with a short stub",
                vec![
                    line(65.0, 0.5e-9),
                    leg(13e-12, "a", 5e-12),
                    line(65.0, 0.41e-9),
                    receiver("b", 5e-12),
                ],
            ),
            strong(
                "star at the driver",
                vec![
                    leg(0.3e-9, "a", 5e-12),
                    leg(0.52e-9, "b", 2e-12),
                    leg(1.1e-9, "c", 8e-12),
                ],
            ),
            strong(
                "branch of a branch",
                vec![
                    line(60.0, 0.2e-9),
                    branch(vec![
                        line(70.0, 0.3e-9),
                        leg(0.2e-9, "a", 5e-12),
                        shunt(80.0, 0.0),
                    ]),
                    line(65.0, 0.41e-9),
                    receiver("b", 5e-12),
                ],
            ),
            strong(
                "vias",
                vec![
                    line(64.0, 0.1e-9),
                    via(0.8e-9, 0.4e-12),
                    line(55.0, 0.7e-9),
                    via(0.8e-9, 0.4e-12),
                    line(64.0, 0.05e-9),
                    receiver("a", 5e-12),
                ],
            ),
            strong(
                "packages",
                vec![
                    line(64.0, 0.5e-9),
                    receiver_of("a", packaged.clone()),
                    line(64.0, 0.2e-9),
                    receiver_of("b", packaged),
                ],
            ),
            strong("no line at all", vec![series(22.0), receiver("a", 5e-12)]),
        ],
        1e9,
    );
}

#[test]
fn duties_and_edges() {
    let path = || vec![line(65.0, 0.87e-9), receiver("end", 5e-12)];
    let of = |name: &str, duty: f64, driver: Driver| Net {
        duty,
        ..net(name, driver, 33e6, path())
    };
    let straight = || driver(3.3, 3.0, 1e-9);
    let smooth = || Driver {
        edge: EdgeShape::Smooth,
        thresholds: Thresholds::TenNinety,
        rise_s: 0.8e-9,
        fall_s: 0.8e-9,
        ..straight()
    };
    agree(
        &[
            of("30 % duty", 0.3, straight()),
            of("71.3 % duty", 0.713, straight()),
            of(
                "slow fall",
                0.5,
                Driver {
                    fall_s: 2.7e-9,
                    ..straight()
                },
            ),
            of(
                "slow rise, 40 %",
                0.4,
                Driver {
                    rise_s: 4.1e-9,
                    ..straight()
                },
            ),
            of(
                "20-80",
                0.5,
                Driver {
                    thresholds: Thresholds::TwentyEighty,
                    ..straight()
                },
            ),
            of("smooth", 0.5, smooth()),
            of(
                "smooth, unequal, 45 %",
                0.45,
                Driver {
                    fall_s: 1.7e-9,
                    ..smooth()
                },
            ),
            of(
                "from -1.65 V",
                0.5,
                Driver {
                    low_v: -1.65,
                    high_v: 1.65,
                    ..straight()
                },
            ),
        ],
        1e9,
    );
}

#[test]
fn fast_clock_to_6_ghz() {
    let path = || vec![line(50.0, 0.31e-9), receiver("end", 2e-12)];
    let terminated = vec![
        series(17.0),
        line(50.0, 0.31e-9),
        via(0.5e-9, 0.3e-12),
        line(50.0, 0.1e-9),
        receiver("end", 2e-12),
    ];
    agree(
        &[
            net("156 MHz", driver(1.8, 10.0, 0.3e-9), 156e6, path()),
            net(
                "156 MHz, 60 ps edges",
                driver(1.8, 33.0, 0.06e-9),
                156e6,
                path(),
            ),
            net(
                "156 MHz, series and via",
                driver(1.8, 33.0, 0.3e-9),
                156e6,
                terminated,
            ),
        ],
        6e9,
    );
}

#[test]
fn slow_clock_with_fast_edges() {
    let path = || vec![line(65.0, 0.87e-9), receiver("end", 5e-12)];
    agree(
        &[
            net("1 MHz", driver(3.3, 3.0, 0.6e-9), 1e6, path()),
            net("1 MHz, 47 ohm", driver(3.3, 47.0, 0.6e-9), 1e6, path()),
        ],
        1e9,
    );
}

/// A via and 10 pF short the driver's pin at 2.9 GHz, where nothing then damps the open line beside them: a march that
/// only waits takes over 5000 periods.
#[test]
fn a_trap_beside_an_open_line() {
    let trap = branch(vec![via(0.3e-9, 0.1e-12), receiver("a", 10e-12)]);
    let path = vec![trap, line(30.0, 6.3e-9)];
    let net = net("trap", driver(3.3, 30.0, 0.5e-9), 20e6, path);
    assert!(engine(&net, 1e9).0.periods < 2000);
    agree(&[net], 1e9);
}

/// Any part that does not branch. Every receiver has some resistance of its own: without it one net in ten
/// holds a resonance above the band that nothing damps.
fn any_item() -> impl Strategy<Value = PathItem> {
    prop_oneof![
        4 => (30.0..120.0, -11.5..-8.5)
            .prop_map(|(ohm, log_s): (f64, f64)| line(ohm, 10_f64.powf(log_s))),
        1 => (1.0..80.0).prop_map(series),
        1 => (0.3e-9..2e-9, 0.1e-12..1e-12).prop_map(|(henry, farad)| via(henry, farad)),
        1 => (40.0..500.0, 0.0..3.3).prop_map(|(ohm, rail_v)| shunt(ohm, rail_v)),
        1 => (20.0..100.0, 0.0..5e-9, 5e-12..200e-12)
            .prop_map(|(ohm, henry, farad)| shunt_rlc(ohm, henry, farad)),
        2 => (5.0..40.0, 1e-12..10e-12)
            .prop_map(|(ohm, farad)| branch(vec![series(ohm), receiver("any", farad)])),
    ]
}

fn any_path() -> impl Strategy<Value = Vec<PathItem>> {
    prop::collection::vec(any_item(), 1..5).prop_recursive(2, 16, 3, |inner| {
        let item = prop_oneof![4 => any_item(), 1 => inner.prop_map(branch)];
        prop::collection::vec(item, 2..6)
    })
}

prop_compose! {
    fn any_net()(
        mut path in any_path(),
        end in 1e-12..10e-12,
        end_ohm in 5.0..40.0,
        source_ohm in 2.0..60.0,
        [rise_s, fall_s] in prop::array::uniform2(0.5e-9..3e-9),
        clock_hz in 20e6..100e6,
        duty in 0.35..0.65,
        smooth in any::<bool>(),
    ) -> Net {
        path.extend([series(end_ohm), receiver("end", end)]);
        let edge = if smooth { EdgeShape::Smooth } else { EdgeShape::Ramp };
        let driver = Driver { fall_s, edge, ..driver(3.3, source_ohm, rise_s) };
        Net { duty, ..net("random", driver, clock_hz, path) }
    }
}

#[test]
fn random_trees() {
    let config = Config {
        cases: 100,
        failure_persistence: None,
        ..Config::default()
    };
    let rng = TestRng::from_seed(RngAlgorithm::ChaCha, &[7; 32]);
    let result = TestRunner::new_with_rng(config, rng).run(&any_net(), |net| {
        compare(&net, 1e9).map_err(TestCaseError::fail)
    });
    if let Err(failure) = result {
        panic!("{failure}");
    }
}

/// The largest difference between two nets' harmonics, dB, over driver current and first receiver.
fn largest_difference_db(one: &Net, other: &Net) -> f64 {
    let [(_, one), (_, other)] = [one, other].map(|net| engine(net, 1e9));
    let currents = one.driver_a.iter().zip(&other.driver_a);
    let voltages = one
        .receivers_v
        .row(0)
        .into_iter()
        .zip(other.receivers_v.row(0));
    let largest = |pairs: &[(f64, f64)]| {
        let strongest = pairs.iter().map(|pair| pair.0).fold(0.0, f64::max);
        pairs
            .iter()
            .filter(|pair| db(pair.0 / strongest) > -JUDGED_DB)
            .map(|pair| db(pair.1 / pair.0).abs())
            .fold(0.0, f64::max)
    };
    let norms = |pair: (&Complex64, &Complex64)| (pair.0.norm(), pair.1.norm());
    largest(&currents.map(norms).collect::<Vec<_>>())
        .max(largest(&voltages.map(norms).collect::<Vec<_>>()))
}

fn strong_to_end(before_the_end: Vec<PathItem>) -> Net {
    let mut path = before_the_end;
    path.push(receiver("end", 5e-12));
    net("strong", driver(3.3, 3.0, 0.8e-9), 48e6, path)
}

#[test]
fn a_line_cut_in_two_stays_the_same() {
    let whole = strong_to_end(vec![line(65.0, 0.87e-9)]);
    for share in [0.5, 0.37, 0.03] {
        let cut = strong_to_end(vec![
            line(65.0, share * 0.87e-9),
            line(65.0, (1.0 - share) * 0.87e-9),
        ]);
        let off_db = largest_difference_db(&whole, &cut);
        assert!(off_db < 0.02, "cut at {share}: {off_db:.4} dB");
    }
}

#[test]
fn a_line_without_delay_is_none() {
    let without = strong_to_end(vec![line(65.0, 0.87e-9)]);
    let with = strong_to_end(vec![
        line(90.0, 1e-15),
        line(65.0, 0.87e-9),
        line(40.0, 1e-15),
    ]);
    let off_db = largest_difference_db(&without, &with);
    assert!(off_db < 0.02, "{off_db:.4} dB");
}

#[test]
fn a_matched_branch_is_its_load() {
    let through =
        |items| strong_to_end(vec![line(65.0, 0.4e-9), branch(items), line(65.0, 0.3e-9)]);
    let load = through(vec![shunt(50.0, 0.0)]);
    for delay_s in [0.7e-9, 33e-9, 5e-12] {
        let matched = through(vec![line(50.0, delay_s), shunt(50.0, 0.0)]);
        let off_db = largest_difference_db(&load, &matched);
        assert!(off_db < 0.02, "{delay_s}: {off_db:.4} dB");
    }
}
