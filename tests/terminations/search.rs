//! Which remedy is taken, and when none is.

use crate::{board_of, first, near, setup, tried};
use ringfield::board::Board;
use ringfield::study::compare::Bench;
use ringfield::study::remedy::{Cost, Goal, Hopeless, Outcome, Remedied, Remedy, remedy};
use ringfield::study::{NetResult, Unwatched, check};

const DRIVER: &str = "{swing: 3.3 V, resistance: 3 ohm, rise: 0.8 ns}";
const LINE: &str = "{line: {impedance: 64 ohm, delay: 870 ps, length: 6 in, height: 4 mil}}";

fn margin_now_db(board: &Board) -> f64 {
    let nets = check(board, &setup(board), &Unwatched);
    nets[0].worst.as_ref().expect("it is judged").margin_db
}

/// What is done about the board's net where its margin shall grow by so much.
fn remedied(board: &Board, more_db: f64) -> Remedied {
    let setup = setup(board);
    let bench = Bench::new(&board.nets, board, &setup, &Unwatched);
    let goal = Goal {
        margin_db: margin_now_db(board) + more_db,
    };
    remedy(&bench, goal, &Unwatched).remove(0)
}

fn found(board: &Board, more_db: f64) -> Remedy {
    match remedied(board, more_db).outcome {
        Outcome::Found(remedy) => *remedy,
        other => panic!("{other:?}"),
    }
}

fn hopeless(board: &Board, more_db: f64) -> Hopeless {
    match remedied(board, more_db).outcome {
        Outcome::Hopeless(hopeless) => *hopeless,
        other => panic!("{other:?}"),
    }
}

/// Rms distance of the wave from its levels at rest, from 2.2 ns after each edge's start on (0.87 ns of flight and 1 ns
/// of edge), in a period of 48 MHz.
fn unrest_v(net: &NetResult) -> f64 {
    let (wave, receiver) = (&net.waveform, &net.signal.receivers[0]);
    let half_s = 0.5 / 48e6;
    let samples = wave.receivers_v[0].iter().enumerate();
    let squares = samples.filter_map(|(step, v)| {
        let time_s = wave.pace.time_s(step);
        let (since_s, rest_v) = if time_s < half_s {
            (time_s, receiver.rest_high_v)
        } else {
            (time_s - half_s, receiver.rest_low_v)
        };
        (since_s > 2.2e-9).then(|| (v - rest_v).powi(2))
    });
    (squares.sum::<f64>() / wave.receivers_v[0].len() as f64).sqrt()
}

/// Series R = Z0 - R_driver = 61 ohm (Paul, sec. 4): within one E24 step, and quieter in `check` than both neighbours.
#[test]
fn a_line_that_can_be_matched_is_matched() {
    let board = board_of(
        DRIVER,
        "{capacitance: 1 pF}",
        "48 MHz",
        &format!("{LINE}, {{receiver: r}}"),
    );
    let remedy = found(&board, 4.0);
    assert_eq!(remedy.cost, Cost::OnePart);
    let value = remedy.tried.to_string();
    assert!(
        ["series 56 ohm", "series 62 ohm", "series 68 ohm"].contains(&value.as_str()),
        "{value}"
    );

    let in_check = |text: &str| {
        let net = tried(&board, &[text]).remove(0).net;
        let board = Board {
            nets: vec![net],
            ..board.clone()
        };
        check(&board, &setup(&board), &Unwatched).remove(0)
    };
    let e24 = [47.0, 51.0, 56.0, 62.0, 68.0, 75.0, 82.0];
    let place = e24
        .iter()
        .position(|ohm| value == format!("series {ohm} ohm"))
        .unwrap();
    let taken = in_check(&value);
    for neighbour in [e24[place - 1], e24[place + 1]] {
        let other = in_check(&format!("series {neighbour} ohm"));
        assert!(
            unrest_v(&taken) < unrest_v(&other),
            "{value} against {neighbour}"
        );
    }
    near(
        taken.worst.unwrap().margin_db,
        remedy.after.margin_db(),
        1e-6,
    );
}

#[test]
fn a_net_that_reaches_the_margin_is_left_alone() {
    let board = board_of(
        DRIVER,
        "{capacitance: 1 pF}",
        "48 MHz",
        &format!("{LINE}, {{receiver: r}}"),
    );
    assert!(matches!(remedied(&board, -1.0).outcome, Outcome::LeftAlone));
}

#[test]
fn a_hopeless_net_says_so_and_names_its_levers() {
    let board = board_of(
        DRIVER,
        "{capacitance: 5 pF}",
        "48 MHz",
        &format!("{LINE}, {{receiver: r}}"),
    );
    let hopeless = hopeless(&board, 20.0);
    assert!(hopeless.attempts.len() > 4);
    let (tried, best) = hopeless.best.as_ref().unwrap();
    assert!(tried.to_string().starts_with("series "));
    let enough: Vec<_> = hopeless
        .levers
        .iter()
        .filter(|lever| lever.reach.suffices)
        .collect();
    assert!(!enough.is_empty());
    let wanted_db = margin_now_db(&board) + 20.0;
    for lever in enough {
        assert!(lever.reach.margin_db >= wanted_db && best.margin_db() < wanted_db);
    }
}

/// A driver that can be set slower needs no part.
#[test]
fn a_setting_comes_before_any_part() {
    let driver = "{swing: 3.3 V, resistance: 3 ohm, rise: 0.8 ns, settings: {slow: {rise: 4 ns, resistance: 40 ohm}}}";
    let board = board_of(
        driver,
        "{capacitance: 5 pF}",
        "48 MHz",
        &format!("{LINE}, {{receiver: r}}"),
    );
    let remedy = found(&board, 4.0);
    assert_eq!(remedy.tried.to_string(), "setting slow");
    assert_eq!(remedy.cost, Cost::Setting);
    // An input that takes no slow edge forbids it.
    let board = board_of(
        driver,
        "{capacitance: 5 pF, max_rise: 3 ns}",
        "48 MHz",
        &format!("{LINE}, {{receiver: r}}"),
    );
    let remedy = found(&board, 4.0);
    assert_eq!(remedy.cost, Cost::OnePart);
    assert_eq!(remedy.cheaper.len(), 1);
    assert!(
        remedy.cheaper[0].faults[0]
            .to_string()
            .contains("over its 3.0 ns")
    );
}

/// Half way along a line, a series resistor that matches the driver leaves half of the swing: whatever is proposed must
/// switch every receiver on the first wave.
#[test]
fn a_remedy_for_one_line_is_not_offered_to_a_bus() {
    let half = "{line: {impedance: 64 ohm, delay: 870 ps, length: 6 in, height: 4 mil}}";
    let path = format!(
        "{half}, {{receiver: {{part: r, name: MID}}}}, {half}, {{receiver: {{part: r, name: END}}}}"
    );
    let board = board_of(DRIVER, "{capacitance: 2 pF}", "24 MHz", &path);
    let matched = tried(&board, &["series 62 ohm"]).remove(0);
    let more_db = matched.margin_db() - margin_now_db(&board);
    assert!(!matched.faults().is_empty());
    let outcome = remedied(&board, more_db - 0.1);
    let safe = |variant: &ringfield::study::compare::Variant| {
        assert_eq!(variant.faults(), []);
        assert!(
            variant
                .receptions
                .iter()
                .all(|reception| reception.on_first_wave)
        );
    };
    match &outcome.outcome {
        Outcome::Found(remedy) => safe(&remedy.after),
        Outcome::Hopeless(hopeless) => hopeless.best.iter().for_each(|(_, best)| safe(best)),
        other => panic!("{other:?}"),
    }
}

/// A star may get a resistor for each leg; every leg must be served.
#[test]
fn a_tee_is_served_on_every_leg() {
    let leg = |name: &str, delay: &str| {
        format!(
            "{{line: {{impedance: 64 ohm, delay: {delay}, length: 3 in, height: 4 mil}}}}, {{receiver: {{part: r, name: {name}}}}}"
        )
    };
    let path = format!(
        "{{branch: [{}]}}, {}",
        leg("U1", "435 ps"),
        leg("U2", "600 ps")
    );
    let board = board_of(DRIVER, "{capacitance: 3 pF}", "48 MHz", &path);
    let remedy = found(&board, 3.0);
    assert_eq!(remedy.after.receptions.len(), 2);
    assert_eq!(remedy.after.faults(), []);
    assert_eq!(first(&board).path.len(), 3);
}
