//! Energy over a settled period: what the driver gives is what resistors, rails, clamps and lossy lines take.
//! Inductances, capacitances and lossless lines give back all they got.

use super::*;
use crate::board::{Net, read_board};
use proptest::prelude::*;
use proptest::test_runner::{Config, RngAlgorithm, TestRng, TestRunner};
use std::cell::RefCell;

const TOP_HZ: f64 = 1e9;
/// What may go astray, as a share of all that is turned to heat: the march stops within a millionth of the swing.
const ASTRAY: f64 = 1e-5;

/// Mean powers over a settled period.
#[derive(Debug, Default)]
struct Powers {
    /// Given by the driver's open-circuit voltage.
    given_w: f64,
    /// Heat in the driver's own resistance and in all others.
    resistors_w: f64,
    rails_w: f64,
    clamps_w: f64,
    /// Taken by each line that carries waves.
    lines_w: Vec<f64>,
}

impl Powers {
    /// Marches one more period of a settled net and watches every part. Voltages are counted from the middle of the
    /// driver's levels, which shifts no power: all currents into the net add up to none.
    fn of(march: &mut March) -> Self {
        let steps = march.drive.len();
        let mut records = vec![vec![0.0; steps]; 4 + march.lines.len()];
        for step in 0..steps {
            march.one_step(step);
            let voltage_v = &march.voltage_v;
            let (conductance_s, short_circuit_a) = march.drive[step];
            let open_v = short_circuit_a / conductance_s;
            let driver_a = short_circuit_a - conductance_s * voltage_v[DRIVER_NODE];
            records[0][step] = open_v * driver_a;
            records[1][step] = driver_a * driver_a / conductance_s;
            for branch in &march.branches {
                let own_ohm =
                    1.0 / branch.conductance_s - branch.inductor_ohm - branch.capacitor_ohm;
                records[1][step] += own_ohm * branch.current_a.powi(2);
                if let BranchEnd::RailV(rail_v) = branch.to {
                    records[2][step] += rail_v * branch.current_a;
                }
            }
            for input in &march.network.inputs {
                let input_v = voltage_v[input.node];
                let clamps = input.clamps.counted_from(march.middle_v);
                records[3][step] += input_v * clamps.load(input_v).0;
            }
            for (line, record) in march.lines.iter().zip(&mut records[4..]) {
                if let LineState::Waves(line) = line {
                    record[step] = line.power_w(voltage_v);
                }
            }
        }
        let means: Vec<f64> = records
            .iter()
            .map(|record| march.pace.mean(record, |power_w| power_w))
            .collect();
        Self {
            given_w: means[0],
            resistors_w: means[1],
            rails_w: means[2],
            clamps_w: means[3],
            lines_w: means[4..].to_vec(),
        }
    }

    fn taken_w(&self) -> f64 {
        self.resistors_w + self.rails_w + self.clamps_w + self.lines_w.iter().sum::<f64>()
    }

    /// All that is turned to heat outside the lines.
    fn heat_w(&self) -> f64 {
        self.resistors_w + self.clamps_w.abs()
    }
}

/// A board of one net from the items of its path.
fn net_of(driver: &str, clock_mhz: f64, path: &[String]) -> Net {
    let text = format!(
        "title: energy\n\
         stackup: {{outer: {{microstrip: {{height: 4 mil, permittivity: 4.3, loss_tangent: 0.02, copper: 35 um}}}}}}\n\
         drivers: {{d: {{{driver}}}}}\n\
         receivers:\n  \
           plain: {{capacitance: 4 pF}}\n  \
           clamped: {{capacitance: 4 pF, clamps: {{knee: 0.7 V, resistance: 10 ohm, supply: 3.3 V}}}}\n\
         cables: []\n\
         nets:\n  - {{name: N, driver: d, clock: {clock_mhz} MHz, path: [{}]}}\n",
        path.join(", ")
    );
    let reading = read_board(&text, "board.yaml");
    let said: String = reading.diagnostics.iter().map(|d| d.render()).collect();
    let board = reading.board.unwrap_or_else(|| panic!("{said}\n{text}"));
    assert_eq!(board.nets.len(), 1, "{said}\n{text}");
    board.nets[0].clone()
}

fn settled_powers(net: &Net) -> Option<(Powers, Network)> {
    let network = Network::of(net);
    let mut pace = Pace::first(&network, TOP_HZ);
    loop {
        let mut march = March::new(&network, &line_models(&network, TOP_HZ), pace, TOP_HZ);
        let report = march.settle();
        if pace.is_whole() || march.restlessness() < SETTLED * network.source.swing_v() {
            let powers = report.settled.then(|| Powers::of(&mut march));
            return powers.map(|powers| (powers, network.clone()));
        }
        pace = pace.longer();
    }
}

/// What is wrong with the energy of a net, in words; else its powers.
fn audit(net: &Net) -> Result<Powers, String> {
    let (powers, network) = settled_powers(net).ok_or("did not settle")?;
    let heat_w = powers.heat_w();
    let astray = (powers.given_w - powers.taken_w()).abs() / heat_w;
    if astray > ASTRAY {
        return Err(format!("{astray:.1e} goes astray: {powers:?}"));
    }
    for (span, line_w) in network.spans.iter().zip(&powers.lines_w) {
        match span.line.loss {
            None if line_w.abs() > ASTRAY * heat_w => {
                return Err(format!("a lossless line takes {line_w:e} W: {powers:?}"));
            }
            Some(_) if *line_w < 0.0 => {
                return Err(format!("a lossy line gives {line_w:e} W: {powers:?}"));
            }
            _ => {}
        }
    }
    Ok(powers)
}

fn any_item(receiver: &'static str) -> impl Strategy<Value = String> {
    prop_oneof![
        3 => (30.0..120.0, -11.5..-8.5).prop_map(|(ohm, log_s): (f64, f64)| format!(
            "{{line: {{impedance: {ohm:.3} ohm, delay: {:.4} ps}}}}",
            10f64.powf(log_s + 12.0)
        )),
        2 => (3.0..250.0)
            .prop_map(|mm: f64| format!("{{trace: {{layer: outer, width: 4 mil, length: {mm:.3} mm}}}}")),
        1 => (1.0..80.0).prop_map(|ohm: f64| format!("{{series: {ohm:.3} ohm}}")),
        1 => (0.3..2.0, 0.1..1.0).prop_map(|(nh, pf): (f64, f64)| format!(
            "{{via: {{inductance: {nh:.3} nH, capacitance: {pf:.3} pF}}}}"
        )),
        1 => (40.0..500.0, 0.0..3.3)
            .prop_map(|(ohm, rail_v): (f64, f64)| format!("{{shunt: {{resistance: {ohm:.3} ohm, to: {rail_v:.3} V}}}}")),
        1 => (20.0..100.0, 0.0..5.0, 5.0..200.0).prop_map(|(ohm, nh, pf): (f64, f64, f64)| format!(
            "{{shunt: {{resistance: {ohm:.3} ohm, inductance: {nh:.3} nH, capacitance: {pf:.3} pF, to: 1 V}}}}"
        )),
        2 => (5.0..40.0).prop_map(move |ohm: f64| format!("{{branch: [{{series: {ohm:.3} ohm}}, {{receiver: {receiver}}}]}}")),
    ]
}

/// A net of some items and a receiver at its end, a little resistance before each receiver so that nothing rings for ever.
fn any_net(receiver: &'static str) -> impl Strategy<Value = Net> {
    let items = prop::collection::vec(any_item(receiver), 1..6);
    let edges = prop::array::uniform2(0.4..3.0);
    let ohms = prop::array::uniform2(2.0..60.0);
    (items, edges, ohms, any::<bool>(), 20.0..100.0, 5.0..40.0).prop_map(
        move |(mut path, [rise_ns, fall_ns], [low_ohm, high_ohm], steady, clock_mhz, end_ohm): (Vec<String>, _, _, _, f64, f64)| {
            path.push(format!("{{series: {end_ohm:.3} ohm}}"));
            path.push(format!("{{receiver: {receiver}}}"));
            let high_ohm: f64 = if steady { low_ohm } else { high_ohm };
            let driver = format!(
                "low: 0.2 V, high: 3.3 V, resistance: {{high: {high_ohm:.3} ohm, low: {low_ohm:.3} ohm}}, \
                 rise: {rise_ns:.3} ns, fall: {fall_ns:.3} ns"
            );
            net_of(&driver, (clock_mhz * 100.0).round() / 100.0, &path)
        },
    )
}

/// How many of the nets lose more than a hundredth of the heat in their clamps, and in their lines.
fn random_nets_balance(receiver: &'static str, seed: u8) -> [usize; 2] {
    let config = Config {
        cases: 60,
        failure_persistence: None,
        ..Config::default()
    };
    let rng = TestRng::from_seed(RngAlgorithm::ChaCha, &[seed; 32]);
    let counts = RefCell::new([0; 2]);
    let result = TestRunner::new_with_rng(config, rng).run(&any_net(receiver), |net| {
        let powers = audit(&net).map_err(TestCaseError::fail)?;
        let lines_w: f64 = powers.lines_w.iter().sum();
        for (count, power_w) in counts
            .borrow_mut()
            .iter_mut()
            .zip([powers.clamps_w, lines_w])
        {
            *count += usize::from(power_w > 0.01 * powers.heat_w());
        }
        Ok(())
    });
    if let Err(failure) = result {
        panic!("{failure}");
    }
    counts.into_inner()
}

#[test]
fn random_nets_balance_without_clamps() {
    let [clamped, lossy] = random_nets_balance("plain", 11);
    assert!(clamped == 0 && lossy > 15, "{clamped}, {lossy}");
}

#[test]
fn random_nets_balance_with_clamps() {
    let [clamped, lossy] = random_nets_balance("clamped", 12);
    assert!(clamped > 5 && lossy > 10, "{clamped}, {lossy}");
}

/// Time at rest is left out of the march, not of the account.
#[test]
fn a_slow_clock_balances() {
    let driver = "swing: 3.3 V, resistance: {high: 9 ohm, low: 6 ohm}, rise: 0.8 ns";
    let path = [
        "{trace: {layer: outer, width: 4 mil, length: 6 in}}",
        "{shunt: {resistance: 2 kohm, to: 3.3 V}}",
        "{receiver: clamped}",
    ];
    let net = net_of(driver, 0.1, &path.map(str::to_owned));
    let network = Network::of(&net);
    assert!(!Pace::first(&network, TOP_HZ).is_whole());
    let powers = audit(&net).unwrap_or_else(|said| panic!("{said}"));
    assert!(
        powers.clamps_w > 0.0 && powers.lines_w[0] > 0.0,
        "{powers:?}"
    );
}
