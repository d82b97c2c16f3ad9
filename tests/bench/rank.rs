//! Time and memory of ranking large boards of clamped nets, stage by stage, and the ratio to the transform of the nets'
//! own waveforms. `cargo bench --bench rank`, or `cargo bench --bench rank -- 100000` for that many nets alone.

#![allow(clippy::print_stdout)]

use std::fmt::Write as _;
use std::hint::black_box;
use std::time::Instant;

use ringfield::board::{Board, Net, TableText, read_board_and_tables};
use ringfield::limit::default_limits;
use ringfield::radiation::{LargePlane, Site};
use ringfield::ringing::{Network, Settled, settle};
use ringfield::spectrum::spectrum;
use ringfield::study::{CheckSetup, Filter, MODEL_SIGMA_DB, Unwatched, judge_all, rank, ring_all};

const LOWEST_HZ: f64 = 30e6;
const TOP_HZ: f64 = 1e9;
/// Nets that the stages are timed on.
const SAMPLE: usize = 256;

fn main() {
    // The harness passes options of its own.
    let asked: Option<usize> = std::env::args().find_map(|argument| argument.parse().ok());
    println!(
        "clamped nets on a 4 mil microstrip, lossy, 101 clocks of 25-125 MHz, to 1 GHz, no plane; {} threads",
        rayon::current_num_threads()
    );
    stages(&read(SAMPLE).0);
    let counts = asked.map_or(vec![2_500, 5_000, 10_000], |count| vec![count]);
    for count in counts {
        whole(count);
    }
}

/// Reads and ranks a board.
fn whole(count: usize) {
    let (board, read_s) = read(count);
    let started = Instant::now();
    let ranking = rank(
        &board,
        &setup(),
        &Filter::default(),
        Some(20),
        (None, 0),
        &Unwatched,
    );
    let rank_s = started.elapsed().as_secs_f64();
    assert_eq!(ranking.done, count);
    println!(
        "{count} nets: read {read_s:.2} s, ranked {rank_s:.2} s ({:.0} us a net), sum of {} lines, peak memory {}",
        rank_s * 1e6 / count as f64,
        ranking.sum.lines.len(),
        peak_memory()
    );
}

/// The stages on one sample, in microseconds a net of wall time.
fn stages(board: &Board) {
    let setup = setup();
    let micros = |started: Instant| started.elapsed().as_secs_f64() * 1e6 / SAMPLE as f64;
    let started = Instant::now();
    let rung = ring_all(&board.nets, board, &setup, &Unwatched);
    let ring_us = micros(started);
    let started = Instant::now();
    let antenna = LargePlane {
        test_site: setup.test_site(),
    };
    black_box(judge_all(&antenna, rung, &setup, &Unwatched));
    let judge_us = micros(started);
    let settled: Vec<(Network, Settled)> = board
        .nets
        .iter()
        .map(|net: &Net| {
            let network = Network::of(net);
            let settled = settle(&network, TOP_HZ);
            (network, settled)
        })
        .collect();
    let started = Instant::now();
    for (network, settled) in &settled {
        black_box(spectrum(network, settled, LOWEST_HZ, TOP_HZ));
    }
    let transform_us = micros(started) / rayon::current_num_threads() as f64;
    println!(
        "a sample of {SAMPLE}: ringing and spectrum {ring_us:.0} us a net, fields and margins {judge_us:.0} us; \
         transforms alone {transform_us:.0} us, {:.0} times which is the whole",
        (ring_us + judge_us) / transform_us
    );
}

fn setup() -> CheckSetup {
    CheckSetup {
        limits: default_limits(),
        distances_m: vec![3.0, 10.0],
        site: Site::OpenArea,
        heights: ringfield::radiation::Heights::default(),
        lowest_frequency_hz: LOWEST_HZ,
        top_frequency_hz: TOP_HZ,
        model_sigma_db: MODEL_SIGMA_DB,
    }
}

/// A board of many nets, and the seconds that reading it took.
fn read(count: usize) -> (Board, f64) {
    let (parts, table) = (parts(), table(count));
    let started = Instant::now();
    let hand_out = |_: &str| {
        Ok(TableText {
            name: "nets.csv".into(),
            text: table.clone(),
        })
    };
    let reading = read_board_and_tables(&parts, "bench", &hand_out);
    let board = reading.board.expect("the board is sound");
    (board, started.elapsed().as_secs_f64())
}

fn parts() -> String {
    let mut text = String::from(
        "stackup: {outer: {microstrip: {height: 4 mil, permittivity: 4.3}}}\n\
         receivers:\n  input: {capacitance: 5 pF, clamps: {knee: 0.7 V, resistance: 10 ohm, supply: 3.3 V}}\n\
         drivers:\n",
    );
    for strength in 0..8 {
        let resistance_ohm = 3 + 5 * strength;
        let _ = writeln!(
            text,
            "  d{strength}: {{swing: 3.3 V, resistance: {resistance_ohm} ohm, rise: 0.8 ns}}"
        );
    }
    text + "nets: {table: nets.csv}\n"
}

/// Nets of many clocks, lengths and drivers, a third of them with a series resistor.
fn table(count: usize) -> String {
    let mut text = String::from(
        "net,driver,clock [MHz],series [ohm],layer,width [mil],length [mil],receiver\n",
    );
    for net in 0..count {
        let clock_mhz = 25 + net * 37 % 101;
        let length_mil = 1500 + net * 53 % 5000;
        let series = if net % 3 == 0 { "33" } else { "" };
        let _ = writeln!(
            text,
            "N{net},d{},{clock_mhz},{series},outer,4,{length_mil},input",
            net % 8
        );
    }
    text
}

/// The most memory the process has held so far, where the system tells.
fn peak_memory() -> String {
    let status = std::fs::read_to_string("/proc/self/status").unwrap_or_default();
    let line = status.lines().find_map(|line| line.strip_prefix("VmHWM:"));
    let kilobytes =
        line.and_then(|line| line.trim().strip_suffix(" kB")?.trim().parse::<f64>().ok());
    kilobytes.map_or("unknown".into(), |kilobytes| {
        format!("{:.0} MB", kilobytes / 1e3)
    })
}
