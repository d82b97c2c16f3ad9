use super::*;
use crate::board::read_board;
use crate::study::Unwatched;

const HARNESS: &str = include_str!("../../../examples/brackwater-harness.yaml");

/// The example with its sensor harness alone.
fn one_cable() -> String {
    let lines = HARNESS.lines().filter(|line| !line.contains("supply lead"));
    lines.map(|line| format!("{line}\n")).collect()
}

fn board(text: &str) -> Board {
    read_board(text, "board.yaml").board.unwrap()
}

fn frequencies_mhz(curves: &BoardAntenna, source: UnitSource, of: Resonator) -> Vec<f64> {
    let mut all = curves.curves.iter();
    let curve = all.find(|curve| curve.source == source).unwrap();
    let those = curve.resonances.iter().filter(|r| r.of == of);
    those.map(|r| r.frequency_hz / 1e6).collect()
}

/// Plane and cable together are a wire of 1.32 m with open ends, which resonates a little below whole numbers of half
/// waves, the first time by most (end effect; any antenna book): 114, 227 and 341 MHz without it.
#[test]
fn a_cable_with_an_open_end_resonates_near_half_waves() {
    let setup = CheckSetup {
        site: Site::FreeSpace,
        ..CheckSetup::for_tests()
    };
    let curves = antenna_curves(&board(&one_cable()), &setup, &Unwatched).unwrap();
    let found = frequencies_mhz(&curves, UnitSource::ChargedTrace, Resonator::Cables);
    assert_eq!(found.len(), 3, "{found:?}");
    for (number, mhz) in found.iter().enumerate() {
        let half_waves_mhz = (number + 1) as f64 * LIGHT_SPEED_M_PER_S / 2.0 / 1.32 / 1e6;
        let share = mhz / half_waves_mhz;
        assert!((0.8..1.0).contains(&share), "{found:?}: {share}");
    }
    // A loop across the cable's way drives no current along it.
    let across = frequencies_mhz(&curves, UnitSource::LoopAlongWidth, Resonator::Cables);
    assert!(across.is_empty(), "{across:?}");
}

/// One that is joined to the floor: near odd numbers of quarter waves of 1.02 m of plane and cable: 73 and 220 MHz.
#[test]
fn a_bonded_cable_resonates_near_odd_quarter_waves() {
    let text = one_cable().replace(
        "length: 1.2 m, edge: left",
        "length: 0.9 m, edge: left, run: bonded",
    );
    let setup = CheckSetup {
        top_frequency_hz: 300e6,
        ..CheckSetup::for_tests()
    };
    let curves = antenna_curves(&board(&text), &setup, &Unwatched).unwrap();
    let found = frequencies_mhz(&curves, UnitSource::ChargedTrace, Resonator::Cables);
    for (number, mhz) in found.iter().enumerate() {
        let odd = 2.0 * number as f64 + 1.0;
        let share = mhz / (odd * LIGHT_SPEED_M_PER_S / 4.0 / 1.02 / 1e6);
        assert!((0.8..1.05).contains(&share), "{found:?}: {share}");
    }
    assert_eq!(found.len(), 2, "{found:?}");
}

#[test]
fn without_cables_there_is_nothing_to_compare_with() {
    let mut board = board(HARNESS);
    board.cables = Some(Vec::new());
    let curves = antenna_curves(&board, &CheckSetup::for_tests(), &Unwatched).unwrap();
    for curve in &curves.curves {
        assert_eq!(curve.plane_alone_dbuv_per_m, None);
        assert!(curve.resonances.iter().all(|r| r.of == Resonator::Plane));
    }
}

#[test]
fn a_reason_is_given_where_there_are_no_curves() {
    let mut board = board(HARNESS);
    let low = CheckSetup {
        top_frequency_hz: 20e6,
        ..CheckSetup::for_tests()
    };
    let why = antenna_curves(&board, &low, &Unwatched).unwrap_err();
    assert!(why.contains("below 30 MHz"), "{why}");
    board.plane = None;
    let why = antenna_curves(&board, &CheckSetup::for_tests(), &Unwatched).unwrap_err();
    assert!(why.contains("no `plane`"), "{why}");
}

#[test]
fn frequencies_reach_from_end_to_end_with_a_step_where_the_floor_ends() {
    let setup = CheckSetup {
        top_frequency_hz: 2e9,
        ..CheckSetup::for_tests()
    };
    let (hz, stretches) = frequencies(&setup);
    let [low, high] = &stretches[..] else {
        panic!("{stretches:?}")
    };
    assert_eq!((hz[0], hz[low.end - 1], hz[high.end - 1]), (30e6, 1e9, 2e9));
    assert!(hz[high.start] > 1e9 && hz.windows(2).all(|pair| pair[0] < pair[1]));
}

#[test]
fn only_what_stands_out_is_a_peak() {
    let frequencies_hz: Vec<f64> = (0..200).map(|i| 30e6 * 1.02f64.powi(i)).collect();
    let bump = |at: f64, height: f64, i: usize| height * (-((i as f64 - at) / 6.0).powi(2)).exp();
    let level = |i: usize| 10.0 + bump(50.0, 1.5, i) + bump(120.3, 3.0, i);
    let levels: Vec<f64> = (0..200).map(level).collect();
    let found = peaks(&frequencies_hz, &levels, 0..200);
    assert_eq!(found.len(), 1, "{found:?}");
    let expected_hz = 30e6 * 1.02f64.powf(120.3);
    assert!((found[0].frequency_hz / expected_hz - 1.0).abs() < 1e-3);
    assert!((found[0].level - 13.0).abs() < 0.01 && (found[0].stands_out_db - 3.0).abs() < 0.05);
    // One on a flank stands out from its own foot alone, and an end is no peak.
    let rising: Vec<f64> = (0..200).map(|i| level(i) + 0.2 * i as f64).collect();
    assert!(peaks(&frequencies_hz, &rising, 0..200).is_empty());
    assert!(peaks(&frequencies_hz, &levels, 121..200).is_empty());
}

/// The sources are what they are said to be, by the closed form of a large plane in free space: a loop of area A makes
/// twice 1.316e-14 f^2 A I / r (Paul, Introduction to Electromagnetic Compatibility), and the charged trace
/// (w mu0 2h / 4 pi r) w Q in the plane, h its height and Q its charge.
#[test]
fn the_sources_are_of_their_size() {
    use crate::radiation::strongest;
    let plane = board(HARNESS).plane.unwrap();
    let hz = 100e6;
    let far_v = |source| {
        let layout = layout(source, &plane);
        strongest(hz, &[lit(source, &layout.segments[0], hz)]).total_v
    };
    let loop_v = 2.0 * 1.316e-14 * hz * hz * UNIT_AREA_M2 * UNIT_CURRENT_A;
    for source in [UnitSource::LoopAlongLength, UnitSource::LoopAlongWidth] {
        assert!((far_v(source) / loop_v - 1.0).abs() < 0.01);
    }
    let omega = TAU * hz;
    let charge_c = UNIT_CAPACITANCE_F * UNIT_VOLTAGE_V;
    let charge_v = omega * 2e-7 * UNIT_HEIGHT_M * omega * charge_c;
    assert!((far_v(UnitSource::ChargedTrace) / charge_v - 1.0).abs() < 0.01);
}
