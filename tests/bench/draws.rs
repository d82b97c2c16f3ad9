//! Time of a tolerance study: nets with tolerances, many draws each. `cargo bench --bench draws`; other sizes by
//! `cargo bench --bench draws -- NETS DRAWS`.
//!
//! Runs on as many threads as the machine has cores, or RAYON_NUM_THREADS.

#![allow(clippy::print_stdout)]

use std::fmt::Write;
use std::hint::black_box;
use std::time::Instant;

use ringfield::board::{Reading, read_board};
use ringfield::limit::default_limits;
use ringfield::radiation::{LargePlane, Site};
use ringfield::study::{
    CheckSetup, MODEL_SIGMA_DB, NetResult, Unwatched, check_drawn, judge_all, ring,
};

fn main() {
    let sizes: Vec<usize> = std::env::args().filter_map(|a| a.parse().ok()).collect();
    let (nets, draws) = match sizes.as_slice() {
        [nets, draws] => (*nets, *draws),
        _ => (100, 1000),
    };
    let setup = CheckSetup {
        limits: default_limits(),
        distances_m: vec![3.0, 10.0],
        site: Site::OpenArea,
        heights: ringfield::radiation::Heights::default(),
        lowest_frequency_hz: 30e6,
        top_frequency_hz: 1e9,
        model_sigma_db: MODEL_SIGMA_DB,
    };
    let reading = read(nets);
    let (board, varied) = match (&reading.board, &reading.varied) {
        (Some(board), Some(varied)) => (board, varied),
        _ => panic!("{:?}", reading.diagnostics),
    };
    let threads = rayon::current_num_threads();
    println!(
        "{nets} clamped nets of 25-125 MHz to 1 GHz, 7 tolerances each, {draws} draws; {threads} threads"
    );
    let started = Instant::now();
    let results = check_drawn(board, Some(varied), draws, &setup, &Unwatched);
    let all_s = started.elapsed().as_secs_f64();
    let count = nets * draws;
    println!(
        "{all_s:.1} s, {:.0} us a draw and thread",
        all_s * 1e6 * threads as f64 / count as f64
    );
    let spread = |net: &NetResult| {
        net.spread
            .as_ref()
            .map_or(0, |spread| spread.draws - spread.failed)
    };
    println!(
        "{} draws gave a margin",
        results.iter().map(spread).sum::<usize>()
    );

    // The parts of one draw, on one thread.
    let rounds = 200;
    let part = |name: &str, mut work: Box<dyn FnMut(usize) + '_>| {
        let started = Instant::now();
        (0..rounds).for_each(&mut work);
        let each_us = started.elapsed().as_secs_f64() * 1e6 / f64::from(rounds as u32);
        println!("  {name} {each_us:.0} us");
    };
    let net = |number: usize| varied.get(&board.nets[number % nets].name);
    part(
        "reading again",
        Box::new(|number| {
            black_box(net(number).map(|net| varied.drawn(net, &[0.3; 7])));
        }),
    );
    part(
        "ringing and spectrum",
        Box::new(|number| {
            black_box(ring(&board.nets[number % nets], board, &setup));
        }),
    );
    let mut rung: Vec<_> = (0..rounds)
        .map(|number| ring(&board.nets[number % nets], board, &setup))
        .collect();
    part(
        "field and margin",
        Box::new(move |_| {
            let net = rung.pop().into_iter().collect();
            let test_site = setup.test_site();
            black_box(judge_all(
                &LargePlane { test_site },
                net,
                &setup,
                &Unwatched,
            ));
        }),
    );
}

/// A board of clamped nets of many clocks, lengths and loads, on parts with tolerances.
fn read(count: usize) -> Reading {
    let mut text = String::from(
        "stackup: {outer: {microstrip: {height: 4 mil +/- 10 %, permittivity: 4.3 +/- 0.2}}}\n\
         receivers: {input: {capacitance: 5 pF +/- 30 %, clamps: {knee: 0.7 V, resistance: 10 ohm +/- 50 %, supply: 3.3 V}}}\n\
         drivers:\n",
    );
    for strength in 0..8 {
        let ohm = 3 + 5 * strength;
        let _ = writeln!(
            text,
            "  d{strength}: {{swing: 3.3 V +/- 5 %, resistance: {ohm} ohm, rise: 0.8 ns, \
             corners: {{fast: {{resistance: {} ohm, rise: 0.5 ns}}, slow: {{rise: 1.2 ns}}}}}}",
            0.6 * f64::from(ohm)
        );
    }
    text += "nets:\n";
    for net in 0..count {
        let clock_mhz = 25 + net * 37 % 101;
        let length_mil = 1500 + net * 53 % 5000;
        let _ = writeln!(
            text,
            "  - {{name: N{net}, driver: d{}, clock: {clock_mhz} MHz, path: [trace: {{layer: outer, width: 4 mil +/- 0.5 mil, length: {length_mil} mil}}, receiver: input]}}",
            net % 8
        );
    }
    read_board(&text, "bench")
}
