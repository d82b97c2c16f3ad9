use super::super::*;
use super::*;
use crate::text::Severity;

/// A sound board, to be changed in one place.
const BOARD: &str = "\
title: Brackwater buoy controller
stackup:
  outer:
    microstrip: {height: 4 mil, permittivity: 4.3, loss_tangent: 0.015, copper: 18 um, roughness: 1 um}
  core:
    stripline: {below: 5 mil, above: 6 mil, permittivity: 4.2}
plane: {length: 160 mm, width: 100 mm, orientation: standing}
drivers:
  strong-cmos: {swing: 3.3 V, resistance: 3 ohm, rise: 0.8 ns}
  split: {low: 0.2 V, high: 2.5 V, resistance: {high: 20 ohm, low: 14 ohm}, rise: 1 ns, fall: 2 ns, thresholds: 20-80, edge: smooth}
receivers:
  cmos-input:
    capacitance: 5 pF
    clamps: {knee: 0.7 V, resistance: 10 ohm, supply: 3.3 V}
  bus-input:
    capacitance: 0 pF
    resistance: 1 kohm
    clamps: {low: {knee: 0.6 V, resistance: 0 ohm}, high: {knee: 0.8 V, resistance: 5 ohm}, supply: 2.5 V}
    low_threshold: 0.8 V
    high_threshold: 2 V
    clamp_rating: 10 mA
    package: {inductance: 2 nH, capacitance: 0.3 pF}
cables:
  - {name: sensor harness, length: 1.5 m, edge: left, at: 40 mm, run: bonded, diameter: 6 mm}
  - {name: mast cable, length: unknown, edge: back}
nets:
  - name: CAM_PCLK
    driver: strong-cmos
    clock: 48 MHz
    path:
      - series: 33 ohm
      - trace: {layer: outer, width: 4 mil, length: 6 in}
      - receiver: cmos-input
  - name: BUS
    driver: split
    clock: 10 MHz
    duty: 40 %
    edge_distance: 10 mm
    along: width
    path:
      - series: {inductance: 47 nH}
      - line: {impedance: 64 ohm, delay: 870 ps, length: 6 in, height: 4 mil}
      - via: {inductance: 0.8 nH}
      - receiver: cmos-input
      - branch:
          - trace: {layer: core, width: 5 mil, points: [[10 mm, 10 mm], [10 mm, 40 mm], [50 mm, 40 mm]]}
          - receiver: {part: cmos-input, name: U7}
          - receiver: bus-input
      - shunt: {resistance: 64 ohm, capacitance: 100 pF, to: 1.65 V}
      - receiver: cmos-input
";

fn read(text: &str) -> Reading {
    read_board(text, "board.yaml")
}

/// The board with `from` replaced by `to`.
fn changed(from: &str, to: &str) -> Reading {
    assert!(BOARD.contains(from), "{from}");
    read(&BOARD.replacen(from, to, 1))
}

fn rendered(reading: &Reading) -> String {
    reading
        .diagnostics
        .iter()
        .map(|d| d.render() + "\n")
        .collect()
}

fn unusable(reading: &Reading) -> Vec<&str> {
    reading
        .unusable
        .iter()
        .map(|net| net.name.as_str())
        .collect()
}

#[test]
fn a_sound_board_is_read_without_a_word() {
    let reading = read(BOARD);
    assert_eq!(rendered(&reading), "");
    assert_eq!(reading.unusable, []);
    let board = reading.board.unwrap();
    assert_eq!(board.title, "Brackwater buoy controller");
    let plane = Plane {
        length_m: 0.16,
        width_m: 0.1,
        orientation: Orientation::Standing,
    };
    assert_eq!(board.plane, Some(plane));
    let cables = board.cables.unwrap();
    assert_eq!(
        cables[0],
        Cable {
            name: "sensor harness".into(),
            length_m: Some(1.5),
            edge: Edge::Left,
            at_m: Some(0.04),
            run: CableRun::Bonded,
            diameter_m: 6e-3,
        }
    );
    assert_eq!(
        (cables[1].length_m, cables[1].at_m, cables[1].diameter_m),
        (None, None, 5e-3)
    );
    assert_eq!(cables[1].run, CableRun::Straight);
}

#[test]
fn defaults_are_those_of_the_grammar() {
    let board = read(BOARD).board.unwrap();
    let net = &board.nets[0];
    assert_eq!(
        (net.name.as_str(), net.clock_hz, net.duty),
        ("CAM_PCLK", 48e6, 0.5)
    );
    assert_eq!((net.edge_distance_m, net.along), (None, Along::Length));
    assert_eq!((net.driver.low_v, net.driver.high_v), (0.0, 3.3));
    assert_eq!((net.driver.rise_s, net.driver.fall_s), (0.8e-9, 0.8e-9));
    assert_eq!(net.driver.thresholds, Thresholds::TenNinety);
    assert_eq!(net.driver.edge, EdgeShape::Ramp);
    let PathItem::Trace(trace) = &net.path[1] else {
        panic!("a trace")
    };
    assert_eq!((trace.width_m, trace.length_m), (101.6e-6, 0.1524));
    assert_eq!(
        (trace.layer.copper_m, trace.layer.roughness_m),
        (18e-6, 1e-6)
    );
    let PathItem::Branch(branch) = &board.nets[1].path[4] else {
        panic!("a branch")
    };
    let PathItem::Trace(trace) = &branch[0] else {
        panic!("a trace")
    };
    assert_eq!(
        (trace.layer.copper_m, trace.layer.roughness_m),
        (35e-6, 0.0)
    );
    assert_eq!(trace.layer.loss_tangent, 0.02);
    assert_eq!(
        trace.layer.structure,
        Structure::Stripline {
            below_m: 127e-6,
            above_m: 152.4e-6
        }
    );
}

#[test]
fn every_item_of_a_path_is_read() {
    let board = read(BOARD).board.unwrap();
    let net = &board.nets[1];
    assert_eq!(net.edge_distance_m, Some(0.01));
    assert_eq!((net.duty, net.along), (0.4, Along::Width));
    assert_eq!(
        (
            net.driver.low_resistance_ohm,
            net.driver.high_resistance_ohm
        ),
        (14.0, 20.0)
    );
    let [series, line, via, _, branch, shunt, _] = net.path.as_slice() else {
        panic!("7 items")
    };
    assert_eq!(
        *series,
        PathItem::Series(Series {
            resistance_ohm: 0.0,
            inductance_h: 47e-9
        })
    );
    assert_eq!(
        *via,
        PathItem::Via(Via {
            inductance_h: 0.8e-9,
            capacitance_f: 0.0
        })
    );
    let PathItem::Line(line) = line else {
        panic!("a line")
    };
    assert_eq!(
        (line.impedance_ohm, line.delay_s, line.permittivity),
        (64.0, 870e-12, 4.3)
    );
    assert_eq!((line.length_m, line.height_m), (0.1524, 101.6e-6));
    let expected = Shunt {
        resistance_ohm: 64.0,
        capacitance_f: Some(100e-12),
        inductance_h: 0.0,
        to_v: 1.65,
    };
    assert_eq!(*shunt, PathItem::Shunt(expected));
    let PathItem::Branch(branch) = branch else {
        panic!("a branch")
    };
    let [PathItem::Trace(trace), _, PathItem::Receiver(bus)] = branch.as_slice() else {
        panic!("a trace and two receivers")
    };
    assert_eq!(trace.points_m.len(), 3);
    approx::assert_relative_eq!(trace.length_m, 0.07, max_relative = 1e-12);
    assert_eq!(
        bus.part.low_clamp,
        Some(Clamp {
            knee_v: 0.6,
            resistance_ohm: 0.0
        })
    );
    let clamp = Clamp {
        knee_v: 0.8,
        resistance_ohm: 5.0,
    };
    assert_eq!(
        bus.part.high_clamp,
        Some(HighClamp {
            clamp,
            supply_v: 2.5
        })
    );
    assert_eq!(
        (bus.part.capacitance_f, bus.part.resistance_ohm),
        (0.0, Some(1000.0))
    );
    assert_eq!(
        (bus.part.low_threshold_v, bus.part.high_threshold_v),
        (Some(0.8), Some(2.0))
    );
    assert_eq!(bus.part.clamp_rating_a, Some(0.01));
    assert_eq!(
        (
            bus.part.package_inductance_h,
            bus.part.package_capacitance_f
        ),
        (2e-9, 0.3e-12)
    );
}

fn receiver_names(path: &[PathItem]) -> Vec<String> {
    path.iter()
        .flat_map(|item| match item {
            PathItem::Receiver(receiver) => vec![receiver.name.clone()],
            PathItem::Branch(items) => receiver_names(items),
            _ => Vec::new(),
        })
        .collect()
}

#[test]
fn receivers_are_named_after_their_part_and_numbered_where_needed() {
    let names = |board: Board| receiver_names(&board.nets[1].path);
    let board = read(BOARD).board.unwrap();
    assert_eq!(receiver_names(&board.nets[0].path), ["cmos-input"]);
    assert_eq!(
        names(board),
        ["cmos-input-1", "U7", "bus-input", "cmos-input-2"]
    );
    let taken = changed("name: U7", "name: cmos-input-1").board.unwrap();
    assert_eq!(
        names(taken),
        ["cmos-input-2", "cmos-input-1", "bus-input", "cmos-input-3"]
    );
}

#[test]
fn one_bad_net_never_loses_the_rest_and_all_its_mistakes_are_told() {
    let bad = "    clock: 10 mhz\n    duty: 40 %";
    let reading = read(
        &BOARD
            .replacen("    clock: 10 MHz\n    duty: 40 %", bad, 1)
            .replacen("width: 5 mil", "width: 5", 1)
            .replacen("to: 1.65 V", "to: 1.65 ohm", 1),
    );
    assert_eq!(reading.diagnostics.len(), 3, "{}", rendered(&reading));
    assert_eq!(unusable(&reading), ["BUS"]);
    assert!(reading.unusable[0].reason.contains("clock of net `BUS`"));
    assert_eq!(reading.board.unwrap().nets.len(), 1);
}

#[test]
fn a_bad_part_costs_the_nets_that_use_it() {
    let reading = changed("swing: 3.3 V", "swing: 3.3");
    assert_eq!(reading.diagnostics.len(), 1);
    assert_eq!(unusable(&reading), ["CAM_PCLK"]);
    assert_eq!(
        reading.unusable[0].reason,
        "uses driver `strong-cmos`, which cannot be read"
    );
    assert_eq!(reading.board.unwrap().nets.len(), 1);
    assert_eq!(
        unusable(&changed("height: 4 mil, perm", "perm")),
        ["CAM_PCLK"]
    );
    let receiver = changed("capacitance: 5 pF", "capacitance: -5 pF");
    assert_eq!(unusable(&receiver), ["CAM_PCLK", "BUS"]);
    assert_eq!(receiver.board, None);
}

#[test]
fn what_all_nets_share_costs_the_board() {
    for (from, to) in [
        ("stackup:", "stack:"),
        ("drivers:\n", "drivers: [1]\n#"),
        ("length: 160 mm", "length: 160"),
        ("edge: back", "edge: top"),
        ("at: 40 mm", "at: 140 mm"),
    ] {
        let reading = changed(from, to);
        assert_eq!(reading.board, None, "{from} -> {to}");
        assert!(!reading.diagnostics.is_empty());
    }
}

#[test]
fn cables_without_a_plane_are_a_warning() {
    let reading = changed("plane:", "#");
    assert_eq!(reading.diagnostics.len(), 1);
    assert_eq!(reading.diagnostics[0].severity, Severity::Warning);
    assert_eq!(reading.board.unwrap().nets.len(), 2);
}

#[test]
fn two_nets_of_one_name_are_both_unusable() {
    let reading = changed("name: BUS", "name: CAM_PCLK");
    assert_eq!(unusable(&reading), ["CAM_PCLK", "CAM_PCLK"]);
    assert_eq!(reading.diagnostics.len(), 1);
    assert_eq!(reading.board, None);
}

#[test]
fn absent_and_empty_cables_differ() {
    let (before, _) = BOARD.split_once("cables:").unwrap();
    let (_, nets) = BOARD.split_once("nets:").unwrap();
    let absent = read(&format!("{before}nets:{nets}")).board.unwrap();
    assert_eq!(absent.cables, None);
    let empty = read(&format!("{before}cables: []\nnets:{nets}"))
        .board
        .unwrap();
    assert_eq!(empty.cables, Some(Vec::new()));
}

#[test]
fn a_path_without_a_receiver_is_only_doubtful() {
    let reading = changed(
        "      - receiver: cmos-input\n  - name: BUS",
        "  - name: BUS",
    );
    assert_eq!(reading.diagnostics.len(), 1);
    assert_eq!(reading.diagnostics[0].severity, Severity::Warning);
    assert_eq!(reading.board.unwrap().nets.len(), 2);
}

#[test]
fn edges_may_just_fill_the_pulse() {
    // 1 ns from 10 % to 90 % is 1.25 ns in all: the whole of half a period of 400 MHz
    let fits = changed(
        "swing: 3.3 V, resistance: 3 ohm, rise: 0.8 ns",
        "swing: 3.3 V, resistance: 3 ohm, rise: 1 ns",
    );
    assert_eq!(rendered(&fits), "");
    let text = BOARD.replacen("rise: 0.8 ns", "rise: 1 ns", 1);
    assert_eq!(rendered(&read(&text.replacen("48 MHz", "400 MHz", 1))), "");
    let reading = read(&text.replacen("48 MHz", "401 MHz", 1));
    assert_eq!(unusable(&reading), ["CAM_PCLK"]);
    assert!(rendered(&reading).contains("they need 1.250 ns of its 1.247 ns"));
}

#[test]
fn names_that_look_like_numbers_are_kept() {
    let text = BOARD
        .replace("strong-cmos", "74")
        .replacen("name: BUS", "name: 12", 1);
    let board = read(&text).board.unwrap();
    assert_eq!(board.nets[0].driver.name, "74");
    assert_eq!(board.nets[1].name, "12");
    let reading = changed("name: BUS", "name: 1.10");
    assert!(
        rendered(&reading).contains("quotes"),
        "{}",
        rendered(&reading)
    );
    let title = changed("title: Brackwater buoy controller\n", "");
    assert_eq!(title.board.unwrap().title, "board.yaml");
}

#[test]
fn length_and_points_may_agree() {
    let with = |length: &str| {
        changed(
            "width: 5 mil, points",
            &format!("width: 5 mil, length: {length}, points"),
        )
    };
    assert_eq!(rendered(&with("70.5 mm")), "");
    assert_eq!(unusable(&with("71 mm")), ["BUS"]);
}
