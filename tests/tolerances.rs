//! What tolerances make of margins, held against closed forms, and what must not change it.

use ringfield::board::{Reading, read_board};
use ringfield::limit::default_limits;
use ringfield::radiation::Site;
use ringfield::study::{
    CheckSetup, MODEL_SIGMA_DB, MarginSpread, NetResult, Unwatched, Verdict, chance_of_failing,
    check, check_drawn, total_sigma_db,
};

/// Twenty times the logarithm of e: what a small relative change is in dB.
const DECIBELS_A_NEPER: f64 = 8.685_889_638;

fn reading(swing: &str, height: &str, rise: &str, clock: &str) -> Reading {
    let text = format!(
        "drivers: {{d: {{swing: {swing}, resistance: 40 ohm, rise: {rise}}}}}\n\
         receivers: {{input: {{capacitance: 5 pF}}}}\n\
         nets:\n\
         - name: CLK\n  driver: d\n  clock: {clock}\n  path:\n  \
         - line: {{impedance: 64 ohm, delay: 870 ps, length: 6 in, height: {height}}}\n  \
         - receiver: input\n\
         - name: OTHER\n  driver: d\n  clock: {clock}\n  path:\n  \
         - series: 33 ohm +/- 5 %\n  \
         - line: {{impedance: 64 ohm, delay: 600 ps, length: 4 in, height: 4 mil}}\n  \
         - receiver: input\n"
    );
    let reading = read_board(&text, "board.yaml");
    assert!(reading.unusable.is_empty(), "{:?}", reading.diagnostics);
    reading
}

fn setup() -> CheckSetup {
    CheckSetup {
        limits: default_limits(),
        distances_m: vec![3.0, 10.0],
        site: Site::OpenArea,
        heights: ringfield::radiation::Heights::default(),
        lowest_frequency_hz: 30e6,
        top_frequency_hz: 1e9,
        model_sigma_db: MODEL_SIGMA_DB,
    }
}

fn drawn(reading: &Reading, draws: usize) -> Vec<NetResult> {
    let board = reading.board.as_ref().expect("a sound board");
    check_drawn(board, reading.varied.as_ref(), draws, &setup(), &Unwatched)
}

/// The spread of `CLK`.
fn margins(reading: &Reading, draws: usize) -> MarginSpread {
    let spread = drawn(reading, draws).remove(0).spread.expect("was drawn");
    assert_eq!((spread.draws, spread.failed), (draws, 0));
    spread.margins.expect("has margins")
}

#[track_caller]
fn near(found: f64, expected: f64, share: f64) {
    assert!(
        (found / expected - 1.0).abs() < share,
        "{found} instead of {expected}"
    );
}

/// The net is linear, so every field is proportional to the swing: d(dB) = 8.686 dx / x. A normal tolerance is two
/// standard deviations, a uniform one the square root of three.
#[test]
fn a_small_spread_of_the_swing_is_its_logarithm() {
    for (swing, relative) in [
        ("3.3 V +/- 1 % normal", 0.01 / 2.0),
        ("3.3 V +/- 1 %", 0.01 / 3_f64.sqrt()),
        ("3.3 V +/- 33 mV uniform", 0.01 / 3_f64.sqrt()),
    ] {
        let spread = margins(&reading(swing, "4 mil", "0.8 ns", "48 MHz"), 256);
        near(spread.sd_db, DECIBELS_A_NEPER * relative, 0.01);
        let carried = spread.carried.expect("draws enough");
        assert_eq!(carried.by[0].name, "d swing");
        assert!(carried.unexplained < 1e-3, "{carried:?}");
    }
}

/// A field proportional to x, uniform over 1 +- a, has a mean of 20 lg x = 8.686 (((1+a) ln(1+a) - (1-a) ln(1-a)) / 2a - 1),
/// and quantiles of 20 lg(1 -+ 0.9 a). The height of a line acts on its field alone, and in proportion.
#[test]
fn a_wide_uniform_spread_has_its_mean_and_quantiles() {
    let a = 0.3_f64;
    let reading = reading("3.3 V", "4 mil +/- 30 %", "0.8 ns", "48 MHz");
    let nominal_db = drawn(&reading, 0)[0]
        .worst
        .as_ref()
        .expect("judged")
        .margin_db;
    let spread = margins(&reading, 1024);
    let mean = ((1.0 + a) * (1.0 + a).ln() - (1.0 - a) * (1.0 - a).ln()) / (2.0 * a) - 1.0;
    let expected_db = nominal_db - DECIBELS_A_NEPER * mean;
    assert!((spread.mean_db - expected_db).abs() < 0.005);
    for (found, x) in [
        (spread.low_db, 1.0 + 0.9 * a),
        (spread.high_db, 1.0 - 0.9 * a),
    ] {
        let expected_db = nominal_db - 20.0 * x.log10();
        assert!((found - expected_db).abs() < 0.02, "{found} {expected_db}");
    }
}

/// Independent small spreads add by their squares, and each carries its own: 3 % and 4 % make 5 %, 36 to 64.
#[test]
fn spreads_of_two_tolerances_add_by_their_squares() {
    let reading = reading(
        "3.3 V +/- 6 % normal",
        "4 mil +/- 8 % normal",
        "0.8 ns",
        "48 MHz",
    );
    let spread = margins(&reading, 256);
    near(spread.sd_db, DECIBELS_A_NEPER * 0.05, 0.01);
    let carried = spread.carried.expect("draws enough");
    for (by, (name, share)) in carried
        .by
        .iter()
        .zip([("path item 1 line height", 0.64), ("d swing", 0.36)])
    {
        assert_eq!(by.name, name);
        assert!((by.share - share).abs() < 0.01, "{carried:?}");
    }
}

/// A margin normal in dB with a spread s, under an error normal with sigma: Phi(-m / sqrt(sigma^2 + s^2)).
#[test]
fn the_chance_of_failing_is_that_of_both_spreads_together() {
    let reading = reading("3.3 V +/- 20 % normal", "4 mil", "0.8 ns", "48 MHz");
    let result = drawn(&reading, 1024).remove(0);
    let spread = result
        .spread
        .and_then(|spread| spread.margins)
        .expect("drawn");
    let sigma_db = total_sigma_db(MODEL_SIGMA_DB).hypot(spread.sd_db);
    let expected = chance_of_failing(spread.mean_db, sigma_db);
    near(spread.chance_of_failing, expected, 0.005);
    assert_eq!(result.chance_of_failing, Some(spread.chance_of_failing));
    assert_eq!(result.verdict, Verdict::of(spread.chance_of_failing));
}

#[test]
fn without_draws_a_tolerance_changes_nothing_and_with_draws_no_nominal_figure() {
    let tolerant = reading("3.3 V +/- 20 %", "4 mil +/- 10 %", "0.8 ns", "48 MHz");
    let exact = reading("3.3 V", "4 mil", "0.8 ns", "48 MHz");
    let board = exact.board.as_ref().expect("a sound board");
    assert_eq!(tolerant.board.as_ref(), Some(board));
    let nominal = check(board, &setup(), &Unwatched);
    for (draws, results) in [(0, drawn(&tolerant, 0)), (32, drawn(&tolerant, 32))] {
        for (result, nominal) in results.iter().zip(&nominal) {
            assert_eq!(result.worst, nominal.worst);
            assert_eq!(result.harmonics, nominal.harmonics);
            assert_eq!(result.spread.is_some(), draws > 0);
            if draws == 0 {
                assert_eq!(result.chance_of_failing, nominal.chance_of_failing);
            }
        }
    }
}

#[test]
fn a_draw_that_makes_no_net_is_counted_and_the_rest_goes_on() {
    // Edges of 1 ns whole fill the high time of 500 MHz: every slower draw is no net.
    let reading = reading("3.3 V", "4 mil", "0.8 ns +/- 10 %", "500 MHz");
    let spread = drawn(&reading, 64).remove(0).spread.expect("was drawn");
    assert_eq!((spread.draws, spread.failed), (64, 32));
    let reason = spread.first_failure.expect("a reason");
    assert!(reason.contains("do not fit into the high time"), "{reason}");
    assert!(spread.margins.is_some());
}

#[test]
fn neither_threads_nor_other_nets_change_a_digit() {
    let reading = reading(
        "3.3 V +/- 20 %",
        "4 mil +/- 10 %",
        "0.8 ns +/- 0.1 ns",
        "48 MHz",
    );
    let on_threads = |threads| {
        let pool = rayon::ThreadPoolBuilder::new()
            .num_threads(threads)
            .build()
            .expect("a pool");
        pool.install(|| drawn(&reading, 64))
    };
    let (one, two) = (on_threads(1), on_threads(2));
    let mut turned = reading.clone();
    turned.board.as_mut().expect("a board").nets.reverse();
    let mut turned = drawn(&turned, 64);
    turned.reverse();
    for ((one, two), turned) in one.iter().zip(&two).zip(&turned) {
        assert!(one.spread.is_some());
        assert_eq!(one.spread, two.spread);
        assert_eq!(one.spread, turned.spread);
        assert_eq!(one.chance_of_failing, two.chance_of_failing);
    }
}
