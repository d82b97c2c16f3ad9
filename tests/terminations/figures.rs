//! Figures of terminations against values worked by hand.

use crate::{board, board_of, first, near, tried};
use ringfield::study::compare::{Fault, matched_series};

const LINE: &str = "{line: {impedance: 50 ohm, delay: 1 ns}}";

/// Series R = Z0 - R_driver (Paul, Introduction to EMC, sec. 4): 64 - 3 = 61 ohm, in E24 62 ohm.
#[test]
fn the_series_rule() {
    let board = board_of(
        "{swing: 3.3 V, resistance: 3 ohm, rise: 1 ns}",
        "{capacitance: 1 pF}",
        "10 MHz",
        "{line: {impedance: 64 ohm, delay: 1 ns}}, {receiver: r}",
    );
    assert_eq!(matched_series(first(&board)).to_string(), "series 62 ohm");
}

/// By hand: two legs of 64 ohm at a driver of 3 ohm; alike, they share it, so that each sees 2 x 3 ohm: 58 ohm, in E24
/// 56 ohm (the nearer in proportion).
#[test]
fn the_series_rule_of_a_star() {
    let leg = "{line: {impedance: 64 ohm, delay: 1 ns}}, {receiver: r}";
    let board = board_of(
        "{swing: 3.3 V, resistance: 3 ohm, rise: 1 ns}",
        "{capacitance: 1 pF}",
        "10 MHz",
        &format!("{{branch: [{leg}]}}, {leg}"),
    );
    assert_eq!(
        matched_series(first(&board)).to_string(),
        "series 56 ohm at legs"
    );
}

/// Parallel R = Z0: 25 ohm and 50 ohm at 5 V leave 3.33 V (Paul, sec. 4). By hand: 66.7 mA from the driver while high,
/// 222 mW in the resistor while high, half of that on average.
#[test]
fn a_parallel_termination_divides() {
    let board = board_of(
        "{swing: 5 V, resistance: 25 ohm, rise: 1 ns}",
        "{capacitance: 0 pF}",
        "1 MHz",
        &format!("{LINE}, {{receiver: r}}"),
    );
    let variant = &tried(&board, &["end 50 ohm"])[0];
    let receiver = &variant.result.signal.receivers[0];
    near(receiver.rest_high_v, 10.0 / 3.0, 1e-4);
    assert!(receiver.rest_low_v.abs() < 1e-6);
    near(variant.power.driver_high_a, 5.0 / 75.0, 1e-4);
    near(
        variant.power.static_w,
        (10.0f64 / 3.0).powi(2) / 50.0 / 2.0,
        1e-4,
    );
    // The first wave is all there is: the end is matched.
    near(variant.receptions[0].first.risen_v, 10.0 / 3.0, 1e-4);
}

/// Idle power of a split termination: Vcc^2 / (R1 + R2), the driver switched off. By hand: 3.3^2 / 260 = 41.9 mW.
#[test]
fn a_split_termination_idles() {
    let board = board("1 MHz", &format!("{LINE}, {{receiver: r}}"));
    let variant = &tried(&board, &["split 130 ohm / 130 ohm"])[0];
    near(variant.power.idle_w, 3.3 * 3.3 / 260.0, 1e-4);
    // By hand, driver high: 65 ohm to 1.65 V, 1.65 V / 75 ohm = 22 mA out, and as much in while low.
    near(variant.power.driver_high_a, 0.022, 1e-3);
    near(-variant.power.driver_low_a, 0.022, 1e-3);
    let high_v: f64 = 3.3 - 0.22;
    let hot_w = (3.3 - high_v).powi(2) / 130.0 + high_v.powi(2) / 130.0;
    near(variant.power.static_w, hot_w, 1e-3);
}

/// Heat in a resistor of `share` of all resistance that charges C through R over a ramp T, both edges of a cycle: by
/// hand 2 C V^2 f share x (1 - x (1 - e^(-1/x))), x = R C / T; with a short edge, C V^2 f share.
fn charging_w(ohm: f64, farad: f64, volt: f64, hertz: f64, ramp_s: f64, share: f64) -> f64 {
    let x = ohm * farad / ramp_s;
    2.0 * farad * volt * volt * hertz * share * x * (1.0 - x * (1.0 - (-1.0 / x).exp()))
}

/// Power of an RC termination: about C V^2 f (from memory), of which R / (R + R_driver) is the resistor's; none at rest.
#[test]
fn an_rc_termination_costs_its_charge() {
    let board = board("1 MHz", "{receiver: r}");
    let variant = &tried(&board, &["end 50 ohm + 100 pF"])[0];
    assert_eq!(variant.power.static_w, 0.0);
    // 10-90 % in 1 ns is 1.25 ns in all.
    let expected = charging_w(60.0, 100e-12, 3.3, 1e6, 1.25e-9, 50.0 / 60.0);
    near(variant.power.dynamic_w, expected, 2e-3);
    near(
        variant.power.dynamic_w,
        100e-12 * 3.3 * 3.3 * 1e6 * 50.0 / 60.0,
        0.1,
    );
}

#[test]
fn a_series_resistor_shares_the_heat_of_charging_the_input() {
    let board = board_of(
        "{swing: 3.3 V, resistance: 10 ohm, rise: 1 ns}",
        "{capacitance: 20 pF}",
        "1 MHz",
        "{receiver: r}",
    );
    let variant = &tried(&board, &["series 40 ohm"])[0];
    assert_eq!(variant.power.static_w, 0.0);
    let expected = charging_w(50.0, 20e-12, 3.3, 1e6, 1.25e-9, 40.0 / 50.0);
    near(variant.power.dynamic_w, expected, 3e-3);
}

/// By hand: the wave is the driver's ramp of 1.25 ns, delayed by 1 ns. Source-matched it ends at 3.3 V and crosses
/// 70 % after 0.2 of the ramp from its middle; end-matched it ends at 3.3 V x 50/60 = 2.75 V, of which 2.31 V are 84 %:
/// after 0.34 of it. Down it starts from 2.75 V and 0.99 V are left after 64 % of it: the rise is the later one.
#[test]
fn the_delay_at_the_threshold() {
    let board = board("10 MHz", &format!("{LINE}, {{receiver: r}}"));
    let variants = tried(&board, &["series 40 ohm", "end 50 ohm"]);
    let delay_s = |index: usize| variants[index].receptions[0].delay_s.unwrap();
    near(delay_s(0), 1e-9 + 0.2 * 1.25e-9, 2e-3);
    near(delay_s(1), 1e-9 + 0.34 * 1.25e-9, 2e-3);
    near(variants[0].receptions[0].edge_s.unwrap(), 1e-9, 5e-3);
}

/// By hand: half way along a source-matched line the first wave brings half of the swing, and the rest comes back from
/// the end 2 ns later: a step in the threshold region.
#[test]
fn a_receiver_half_way_waits_for_the_reflection() {
    let board = board(
        "10 MHz",
        &format!(
            "{LINE}, {{receiver: {{part: r, name: MID}}}}, {LINE}, {{receiver: {{part: r, name: END}}}}"
        ),
    );
    let variants = tried(&board, &["series 40 ohm", "end 50 ohm"]);
    let faults = variants[0].faults();
    let [
        Fault::WaitsForReflection {
            receiver, risen_v, ..
        },
        ..,
    ] = faults.as_slice()
    else {
        panic!("{faults:?}");
    };
    assert_eq!(receiver, "MID");
    near(*risen_v, 1.65, 1e-4);
    assert_eq!(variants[1].faults(), []);
}

#[test]
fn what_the_parts_may_carry_is_watched() {
    let board = board_of(
        "{swing: 3.3 V, resistance: 10 ohm, rise: 1 ns, max_current: 24 mA}",
        "{capacitance: 5 pF, max_rise: 2 ns, low_threshold: 0.8 V, high_threshold: 2.6 V}",
        "10 MHz",
        &format!("{LINE}, {{receiver: r}}"),
    );
    let variants = tried(
        &board,
        &[
            "end 50 ohm",
            "end 15 ohm",
            "series 330 ohm",
            "series 47 ohm",
        ],
    );
    let said = |index: usize| -> Vec<String> {
        variants[index]
            .faults()
            .iter()
            .map(ToString::to_string)
            .collect()
    };
    // By hand: 3.3 V / 60 ohm = 55 mA; 3.3 V x 15 / 25 = 1.98 V.
    assert_eq!(
        said(0),
        ["the driver carries 55.0 mA at rest, over its 24.0 mA"]
    );
    assert!(
        said(1)[1]
            .contains("rests at 0.00 V and 1.98 V, short of its thresholds of 0.80 V and 2.60 V")
    );
    assert!(
        said(2)
            .iter()
            .any(|fault| fault.contains("over its 2.0 ns")),
        "{:?}",
        said(2)
    );
    assert_eq!(said(3), Vec::<String>::new());
}

#[test]
fn each_change_goes_where_it_says() {
    let board = board(
        "10 MHz",
        &format!(
            "{{series: 33 ohm}}, {LINE}, {{branch: [{LINE}, {{receiver: {{part: r, name: U1}}}}]}}, {LINE}, {{receiver: {{part: r, name: U2}}}}, {{shunt: {{resistance: 90 ohm}}}}"
        ),
    );
    let variants = tried(
        &board,
        &[
            "bare",
            "series 22 ohm",
            "series 22 ohm at legs",
            "series 22 ohm at branch",
            "series 22 ohm at U1",
            "end 50 ohm",
            "end 50 ohm at U1",
            "keep, series 22 ohm at legs",
            "rise 3 ns",
        ],
    );
    let shape = |index: usize| format!("{:?}", variants[index].net.path);
    let count = |index: usize, what: &str| shape(index).matches(what).count();
    let parts: Vec<[usize; 2]> = (0..variants.len())
        .map(|index| [count(index, "Series("), count(index, "Shunt(")])
        .collect();
    assert_eq!(
        parts,
        [
            [0, 0],
            [1, 0],
            [2, 0],
            [1, 0],
            [1, 0],
            [0, 2],
            [0, 1],
            [3, 1],
            [1, 1]
        ]
    );
    assert!(shape(1).starts_with("[Series("));
    assert!(shape(4).contains("Branch([Series("));
}
