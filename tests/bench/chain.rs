//! Time of the whole chain a net (fit, march, transform, radiation, both distances), its ratio to the transform of the
//! net's own waveforms, and nets a second on all cores. `cargo bench --bench chain`
//!
//! Splits and ratios are of one thread and one run, since machines differ, and each net counts at its best of some rounds.

#![allow(clippy::print_stdout)]

use std::hint::black_box;
use std::time::{Duration, Instant};

use rayon::prelude::*;

use ringfield::board::read_board;
use ringfield::board::{Board, Net};
use ringfield::limit::default_limits;
use ringfield::radiation::{Heights, LargePlane, Layout, Site, lit_segments, strongest};
use ringfield::ringing::{Network, line_models, settle, settle_lines};
use ringfield::spectrum::spectrum;
use ringfield::study::{CheckSetup, MODEL_SIGMA_DB, Unwatched, judge_all, ring};

const LOWEST_HZ: f64 = 30e6;
const TOP_HZ: f64 = 1e9;

fn main() {
    let pool = rayon::ThreadPoolBuilder::new().num_threads(1).build();
    let pool = pool.expect("a pool");
    let (one, thousand) = (board(1), board(1000));
    println!("clamped nets on a 4 mil microstrip, lossy, 25-125 MHz, to 1 GHz; one thread");
    for (label, board, rounds) in [("one net", &one, 100), ("1 000 nets", &thousand, 5)] {
        pool.install(|| report(label, board, rounds));
    }
    all_cores(&board(10_000));
}

/// Ringing and spectrum of every net.
fn all_cores(board: &Board) {
    let started = Instant::now();
    board.nets.par_iter().for_each(|net| {
        let network = Network::of(net);
        let settled = settle(&network, TOP_HZ);
        assert!(settled.report.settled, "{}", net.name);
        black_box(spectrum(&network, &settled, LOWEST_HZ, TOP_HZ));
    });
    let taken_s = started.elapsed().as_secs_f64();
    println!(
        "10 000 nets, ringing and spectrum, {} threads: {taken_s:.2} s, {:.0} nets/s",
        rayon::current_num_threads(),
        board.nets.len() as f64 / taken_s
    );
}

fn report(label: &str, board: &Board, rounds: usize) {
    let nets = &board.nets;
    let setup = CheckSetup {
        limits: default_limits(),
        distances_m: vec![3.0, 10.0],
        site: Site::OpenArea,
        heights: Heights::default(),
        lowest_frequency_hz: LOWEST_HZ,
        top_frequency_hz: TOP_HZ,
        model_sigma_db: MODEL_SIGMA_DB,
    };
    let antenna = LargePlane {
        test_site: setup.test_site(),
    };
    let check = |net: &Net| {
        let rung = vec![ring(net, board, &setup)];
        black_box(judge_all(&antenna, rung, &setup, &Unwatched));
    };
    // A first net fills the caches of plans and pages.
    check(&nets[0]);
    let whole = time(nets, rounds, check);
    let modelled: Vec<_> = nets
        .iter()
        .map(|net| {
            let network = Network::of(net);
            let models = line_models(&network, TOP_HZ);
            (network, models)
        })
        .collect();
    let fit = time(&modelled, rounds, |(network, _)| {
        black_box(line_models(network, TOP_HZ));
    });
    let march = time(&modelled, rounds, |(network, models)| {
        black_box(settle_lines(network, models, TOP_HZ));
    });
    let worked: Vec<_> = nets
        .iter()
        .map(|net| {
            let network = Network::of(net);
            let settled = settle(&network, TOP_HZ);
            let layout = Layout::of(&network, net, None);
            (network, settled, layout)
        })
        .collect();
    let transform = time(&worked, rounds, |(network, settled, _)| {
        black_box(spectrum(network, settled, LOWEST_HZ, TOP_HZ));
    });
    let spectra: Vec<_> = worked
        .iter()
        .map(|(network, settled, layout)| {
            (
                network,
                layout,
                spectrum(network, settled, LOWEST_HZ, TOP_HZ),
            )
        })
        .collect();
    let radiation = time(&spectra, rounds, |(network, layout, spectrum)| {
        let at = |place| {
            let lit = lit_segments(network, layout, spectrum, place);
            strongest(spectrum.frequency_hz(place), &lit)
        };
        black_box((0..spectrum.len()).map(at).collect::<Vec<_>>());
    });
    let steps: usize = worked
        .iter()
        .map(|(_, settled, _)| settled.report.marched_steps * settled.report.periods)
        .sum();
    let micros = |time: Duration| time.as_secs_f64() * 1e6;
    println!(
        "{label}: {:.3} ms a net, {:.1} times its transform",
        micros(whole) / 1e3,
        micros(whole) / micros(transform)
    );
    println!(
        "  fit {:.1} us, march {:.0} us ({} steps of {:.1} ns), transform {:.1} us, radiation {:.0} us, rest {:.0} us",
        micros(fit),
        micros(march),
        steps / nets.len(),
        micros(march) * 1e3 * nets.len() as f64 / steps as f64,
        micros(transform),
        micros(radiation),
        micros(whole) - micros(fit) - micros(march) - micros(transform) - micros(radiation)
    );
}

/// Mean time of one item, each at its best of some rounds: other work on the machine only ever adds.
fn time<T>(items: &[T], rounds: usize, mut work: impl FnMut(&T)) -> Duration {
    let mut best = vec![Duration::MAX; items.len()];
    for _ in 0..rounds {
        for (item, best) in items.iter().zip(&mut best) {
            let started = Instant::now();
            work(item);
            *best = started.elapsed().min(*best);
        }
    }
    best.iter().sum::<Duration>() / items.len() as u32
}

/// A board of clamped nets of many clocks, lengths and loads.
fn board(count: usize) -> Board {
    let mut text = String::from(
        "stackup: {outer: {microstrip: {height: 4 mil, permittivity: 4.3}}}\n\
         receivers:\n  input: {capacitance: 5 pF, clamps: {knee: 0.7 V, resistance: 10 ohm, supply: 3.3 V}}\n\
         drivers:\n",
    );
    for strength in 0..8 {
        let resistance_ohm = 3 + 5 * strength;
        text += &format!(
            "  d{strength}: {{swing: 3.3 V, resistance: {resistance_ohm} ohm, rise: 0.8 ns}}\n"
        );
    }
    text += "nets:\n";
    for net in 0..count {
        let clock_mhz = 25 + net * 37 % 101;
        let length_mil = 1500 + net * 53 % 5000;
        text += &format!(
            "  - {{name: N{net}, driver: d{}, clock: {clock_mhz} MHz, path: [trace: {{layer: outer, width: 4 mil, length: {length_mil} mil}}, receiver: input]}}\n",
            net % 8
        );
    }
    let reading = read_board(&text, "bench");
    reading.board.expect("the board is sound")
}
