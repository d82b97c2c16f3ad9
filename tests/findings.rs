//! What the ringing does to the parts, against cases worked out by hand.

mod oracle;

use oracle::build::{clamped, driver, line, net, part, receiver, receiver_of, shunt};
use ringfield::board::{Board, Clamp, Driver, Net, PathItem, ReceiverPart};
use ringfield::limit::default_limits;
use ringfield::radiation::{Heights, Site};
use ringfield::study::{CheckSetup, ReceiverSignal, Signal, Unwatched, check};

/// Flight time of the lines here.
const T_S: f64 = 1e-9;

fn signal(net: &Net, top_frequency_hz: f64) -> Signal {
    let setup = CheckSetup {
        limits: default_limits(),
        distances_m: vec![3.0],
        site: Site::OpenArea,
        heights: Heights::default(),
        lowest_frequency_hz: 30e6,
        top_frequency_hz,
        model_sigma_db: 5.0,
    };
    let board = Board {
        title: String::new(),
        plane: None,
        cables: None,
        nets: vec![net.clone()],
    };
    let result = check(&board, &setup, &Unwatched).swap_remove(0);
    assert!(result.march.settled, "{}: {:?}", net.name, result.march);
    result.signal
}

fn of(driver: Driver, clock_hz: f64, path: Vec<PathItem>) -> Signal {
    signal(&net("by hand", driver, clock_hz, path), 2e9)
}

fn close(what: &str, computed: f64, expected: f64, within: f64) {
    assert!(
        (computed - expected).abs() <= within,
        "{what}: {computed:e} against {expected:e}"
    );
}

/// 5 V through a resistance into 50 ohm, 1 ns, open, edges of half a flight time, 5 MHz.
fn lattice(source_ohm: f64, input: ReceiverPart) -> ReceiverSignal {
    let path = vec![line(50.0, T_S), receiver_of("end", input)];
    let mut signal = of(driver(5.0, source_ohm, 0.5 * T_S), 5e6, path);
    assert_eq!(signal.receivers.len(), 1);
    signal.receivers.remove(0)
}

fn thresholds(low_v: f64, high_v: f64) -> ReceiverPart {
    ReceiverPart {
        low_threshold_v: Some(low_v),
        high_threshold_v: Some(high_v),
        ..part(0.0)
    }
}

/// Paul, Scully & Steffka, 3rd ed., sec. 4: 10 ohm into an open 50 ohm: 8.33, 2.78 V at 5 V. The levels go on with
/// a reflection of -2/3: 6.48, 4.01, 5.66, 4.56, 5.29 V, the last two within 10 % of the 5 V swing.
#[test]
fn a_textbook_lattice() {
    let end = lattice(10.0, part(0.0));
    // Corners of a sampled ramp are drawn a little round.
    let within_v = 0.005;
    close("rest low", end.rest_low_v, 0.0, 1e-4);
    close("rest high", end.rest_high_v, 5.0, 1e-4);
    close("maximum", end.maximum_v, 8.333, within_v);
    close("minimum", end.minimum_v, -3.333, within_v);
    close("overshoot", end.overshoot_v, 3.333, within_v);
    close("undershoot", end.undershoot_v, 3.333, within_v);
    close("ringback", end.ringback_v, 2.222, within_v);
    assert_eq!(end.extra_crossings, 0);
    assert_eq!(end.reaches_thresholds, None);
    // The first rise, to 8.33 V, passes the middle, 2.5 V, after 0.3 of its edge.
    let step_s = 6e-12;
    let flight_s = end.flight_s.expect("it arrives");
    close("flight", flight_s, T_S + (0.3 - 0.5) * 0.5 * T_S, step_s);
    // From 5.66 to 4.56 V, an edge about 11 flight times, it comes within 0.5 V of rest.
    let deviation_v = |level: i32| 5.0 * (2.0_f64 / 3.0).powi(level);
    let share = (deviation_v(5) - 0.5) / (deviation_v(5) + deviation_v(6));
    let settling_s = end.settling_s.expect("it settles");
    close(
        "settling",
        settling_s,
        11.0 * T_S + (share - 0.5) * 0.5 * T_S,
        step_s,
    );
    assert!(end.low_clamp.is_none() && end.high_clamp.is_none());
}

/// After the rise the levels are 8.33, 2.78, 6.48 ... V: two more crossings of 3 V. After the fall they are -3.33,
/// 2.22, -1.48, 0.99, -0.66, 0.44 V: four more of 0.8 V.
#[test]
fn ringing_crosses_thresholds_again() {
    let end = lattice(10.0, thresholds(0.8, 3.0));
    assert_eq!(end.extra_crossings, 6);
    assert_eq!(end.reaches_thresholds, Some(true));
    // Between 2.22 and 2.78 V nothing comes back.
    assert_eq!(lattice(10.0, thresholds(2.3, 2.7)).extra_crossings, 0);
    let never = lattice(10.0, thresholds(0.8, 8.5));
    assert_eq!(never.reaches_thresholds, Some(false));
}

/// 2 ohm reflects -r, r = 48/52: the levels after an edge of the swing are off by d (-r)^k, d = swing / (1 + r^50) since
/// the edge before, 50 rounds earlier, is not quite over. Off by more than half the swing towards the middle for
/// k = 2, 4, 6, 8: four dips of two crossings after each edge.
#[test]
fn a_strong_driver_crosses_the_middle_many_times() {
    let end = lattice(2.0, part(0.0));
    assert_eq!(end.extra_crossings, 16);
    let reflected: f64 = 48.0 / 52.0;
    let off_v = 5.0 / (1.0 + reflected.powi(50));
    // A corner of a ramp is drawn a little round: by up to a thousandth of the rise, here twice the swing.
    let within_v = 0.001 * 10.0;
    close("overshoot", end.overshoot_v, off_v * reflected, within_v);
    close(
        "ringback",
        end.ringback_v,
        off_v * reflected.powi(2),
        within_v,
    );
}

/// The next edge comes after four flight times, when the wave is still a third of the swing off.
#[test]
fn a_net_that_is_never_at_rest_has_no_settling_time() {
    let path = vec![line(50.0, T_S), receiver("end", 0.0)];
    let signal = of(driver(5.0, 10.0, 0.5 * T_S), 1.0 / (8.0 * T_S), path);
    assert_eq!(signal.receivers[0].settling_s, None);
}

/// Matched at the driver, the wave arrives once and stays: after the delay, with the edge's last tenth outside.
#[test]
fn a_matched_line_is_its_delay() {
    for delay_s in [0.31e-9, 1.37e-9, 6.2e-9] {
        let path = vec![line(50.0, delay_s), receiver("end", 0.0)];
        let signal = of(driver(5.0, 50.0, 0.5e-9), 10e6, path);
        let end = &signal.receivers[0];
        close("flight", end.flight_s.expect("it arrives"), delay_s, 6e-12);
        close(
            "settling",
            end.settling_s.expect("it settles"),
            delay_s + 0.4 * 0.5e-9,
            6e-12,
        );
        close("overshoot", end.overshoot_v, 0.0, 0.005);
        close("undershoot", end.undershoot_v, 0.0, 0.005);
        close("ringback", end.ringback_v, 0.0, 0.005);
        // 5 V over both resistances while the wave is on its way and back.
        close("driver's peak", signal.driver_peak_current_a, 0.05, 1e-4);
    }
}

/// Paul, Scully & Steffka, 3rd ed., sec. 4: from a matched source a capacitance adds 0.693 Z0 C: 50 ohm, 5 pF:
/// 0.173 ns.
#[test]
fn a_capacitance_adds_to_the_flight_time() {
    let flight_s = |capacitance_f: f64| {
        let path = vec![line(50.0, T_S), receiver("end", capacitance_f)];
        let signal = of(driver(5.0, 50.0, 5e-12), 50e6, path);
        signal.receivers[0].flight_s.expect("it arrives")
    };
    close(
        "added delay",
        flight_s(5e-12) - flight_s(0.0),
        0.173e-9,
        0.001e-9,
    );
}

/// Paul, Scully & Steffka, 3rd ed., sec. 4: 25 ohm into 50 ohm at 5 V leave 3.33 V; split into two of 100 ohm to 5 V and
/// to 0 V, the line rests at 0.83 and 4.17 V (Kirchhoff).
#[test]
fn levels_at_rest_are_those_of_the_divider() {
    let ended = |shunts: Vec<PathItem>| {
        let path = [vec![line(50.0, T_S)], shunts, vec![receiver("end", 0.0)]].concat();
        of(driver(5.0, 25.0, 0.5e-9), 10e6, path)
            .receivers
            .remove(0)
    };
    let parallel = ended(vec![shunt(50.0, 0.0)]);
    close("rest high", parallel.rest_high_v, 10.0 / 3.0, 1e-4);
    close("rest low", parallel.rest_low_v, 0.0, 1e-4);
    close("overshoot", parallel.overshoot_v, 0.0, 0.005);
    let split = ended(vec![shunt(100.0, 5.0), shunt(100.0, 0.0)]);
    close("rest high", split.rest_high_v, 62.5 / 15.0, 1e-4);
    close("rest low", split.rest_low_v, 12.5 / 15.0, 1e-4);
}

/// Without a line the current follows the source: a trapezoid of 30 mA, whose mean square is that of its flat top
/// and a third of each edge.
#[test]
fn rms_current_into_a_resistor() {
    let (clock_hz, edge_s) = (20e6, 4e-9);
    for duty in [0.5, 0.3] {
        let path = vec![shunt(100.0, 0.0), receiver("end", 0.0)];
        let net = Net {
            duty,
            ..net("resistor", driver(3.3, 10.0, edge_s), clock_hz, path)
        };
        let signal = signal(&net, 1e9);
        close("peak", signal.driver_peak_current_a, 0.03, 1e-6);
        let share = duty - edge_s * clock_hz + 2.0 / 3.0 * edge_s * clock_hz;
        close(
            "rms",
            signal.driver_rms_current_a,
            0.03 * share.sqrt(),
            2e-5 * 0.03,
        );
    }
}

/// An idle net in its windows: with time at rest left out of the march, means are still those of the whole period.
#[test]
fn rms_current_of_a_slow_clock() {
    let path = vec![shunt(100.0, 0.0), receiver("end", 0.0)];
    let signal = of(driver(3.3, 10.0, 4e-9), 32_768.0, path);
    let share: f64 = 0.5 - 4e-9 * 32_768.0 / 3.0;
    close(
        "rms",
        signal.driver_rms_current_a,
        0.03 * share.sqrt(),
        2e-5 * 0.03,
    );
}

/// The net of reference/clamped_net.py, which solves it as a stiff ladder of LC cells: 4.501 and -1.201 V, 39.9 mA
/// peak in each clamp, 70.3 pC an edge, 1.926 mW.
#[test]
fn clamps_carry_what_the_ladder_says() {
    let clamp = Clamp {
        knee_v: 0.707,
        resistance_ohm: 10.0,
    };
    let input = receiver_of("input", clamped(part(5e-12), clamp, 3.3));
    let path = vec![line(65.0, T_S), input];
    let signal = signal(&net("clamped", driver(3.3, 3.0, 1e-9), 25e6, path), 1e9);
    let end = &signal.receivers[0];
    close("maximum", end.maximum_v, 4.501, 0.002);
    close("minimum", end.minimum_v, -1.201, 0.002);
    close("overshoot", end.overshoot_v, 1.201, 0.002);
    close("undershoot", end.undershoot_v, 1.201, 0.002);
    for clamp in [end.low_clamp, end.high_clamp] {
        let clamp = clamp.expect("it has both");
        close("peak", clamp.peak_a, 39.9e-3, 0.1e-3);
        close("charge", clamp.charge_c, 70.3e-12, 0.1e-12);
        close("power", clamp.power_w, 1.926e-3, 0.005e-3);
    }
    close("both clamps", end.clamp_power_w(), 2.0 * 1.926e-3, 0.01e-3);
}
