//! Terminations: what they cost, what they buy, and which one `remedy` takes.

mod figures;
mod program;
mod search;

use ringfield::board::{Board, Net, read_board};
use ringfield::limit::default_limits;
use ringfield::radiation::Site;
use ringfield::study::change::{Try, read_try};
use ringfield::study::compare::{Bench, Variant};
use ringfield::study::{CheckSetup, MODEL_SIGMA_DB, Unwatched, scan_band_hz};

/// A driver of 3.3 V with 10 ohm and an edge of 1 ns, an input that loads nothing, and one net `A` with this path.
fn board(clock: &str, path: &str) -> Board {
    board_of(
        "{swing: 3.3 V, resistance: 10 ohm, rise: 1 ns}",
        "{capacitance: 0 pF}",
        clock,
        path,
    )
}

fn board_of(driver: &str, receiver: &str, clock: &str, path: &str) -> Board {
    let text = format!(
        "title: test buoy
cables: []
drivers: {{d: {driver}}}
receivers: {{r: {receiver}}}
nets: [{{name: A, driver: d, clock: {clock}, path: [{path}]}}]"
    );
    let reading = read_board(&text, "test");
    reading
        .board
        .unwrap_or_else(|| panic!("{:?}", reading.diagnostics))
}

fn setup(board: &Board) -> CheckSetup {
    let limits = default_limits();
    let (lowest_frequency_hz, top_frequency_hz) = scan_band_hz(board, &limits);
    CheckSetup {
        limits,
        distances_m: vec![3.0, 10.0],
        site: Site::OpenArea,
        heights: ringfield::radiation::Heights::default(),
        lowest_frequency_hz,
        top_frequency_hz,
        model_sigma_db: MODEL_SIGMA_DB,
    }
}

fn tries(texts: &[&str]) -> Vec<Try> {
    texts
        .iter()
        .map(|text| read_try(text).expect("a try"))
        .collect()
}

/// The board's first net with each of these tried on it.
fn tried(board: &Board, texts: &[&str]) -> Vec<Variant> {
    let setup = setup(board);
    let bench = Bench::new(&board.nets, board, &setup, &Unwatched);
    bench
        .try_on(first(board), &tries(texts), &Unwatched)
        .expect("the net can take it")
}

fn first(board: &Board) -> &Net {
    &board.nets[0]
}

#[track_caller]
fn near(left: f64, right: f64, share: f64) {
    assert!(
        (left - right).abs() <= share * right.abs(),
        "{left} is not {right}"
    );
}
