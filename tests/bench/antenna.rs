//! What the board as an antenna costs: solving plane and cable, reading nets, on the open-area site.
//!
//! `cargo bench --bench antenna`; the times are of all cores.

#![allow(clippy::print_stdout)]

#[path = "../oracle/mod.rs"]
mod oracle;

use oracle::lit::{Lit, wire_net};
use rayon::prelude::*;
use ringfield::board::{Cable, CableRun, Edge, Net, Orientation, Plane};
use ringfield::radiation::plate::{Plate, Structure, Wire};
use ringfield::radiation::{Antenna, Heights, OwnPlane, Site, TestSite};
use ringfield::watch::Unwatched;
use std::hint::black_box;
use std::time::{Duration, Instant};

const PLANE: Plane = Plane {
    length_m: 0.16,
    width_m: 0.1,
    orientation: Orientation::Flat,
};

fn main() {
    let cables = [Cable {
        name: "harness".into(),
        length_m: Some(1.0),
        edge: Edge::Left,
        at_m: None,
        run: CableRun::Straight,
        diameter_m: 5e-3,
    }];
    println!("160 x 100 mm, one cable of 1 m");
    solver();
    for (count, label) in [(64, "64 frequencies"), (1000, "1 000 frequencies")] {
        let frequencies_hz: Vec<f64> = (1..=count)
            .map(|step| 30e6 + 970e6 * f64::from(step) / f64::from(count))
            .collect();
        for site in [Site::FreeSpace, Site::OpenArea] {
            let test_site = TestSite {
                site,
                heights: Heights::default(),
                distances_m: vec![3.0, 10.0],
            };
            let (antenna, solved) =
                timed(|| OwnPlane::new(&PLANE, &cables, test_site, &frequencies_hz, &Unwatched));
            let first = reading(&antenna, &frequencies_hz, 1);
            // The antenna keeps the light of places that it has worked out.
            let one = reading(&antenna, &frequencies_hz, 1);
            let eleven = reading(&antenna, &frequencies_hz, 11);
            println!(
                "{label}, {site:?}, 3 m and 10 m: plane and cable {:.2} s, first net {:.2} s, each further net {:.1} ms",
                solved.as_secs_f64(),
                first.as_secs_f64(),
                eleven.saturating_sub(one).as_secs_f64() * 1e3 / 10.0
            );
        }
    }
    if let Some(line) = peak_memory() {
        println!("{line}");
    }
}

/// The solver's own parts at one frequency.
fn solver() {
    let plate = Plate {
        length_m: PLANE.length_m,
        width_m: PLANE.width_m,
    };
    let wire = Wire {
        points_m: vec![[0.0, 0.05, 0.0], [-1.0, 0.05, 0.0]],
        radius_m: 2.5e-3,
        attached: true,
        grounded: false,
    };
    let (structure, geometry) = timed(|| Structure::new(plate, &[wire], None, 1e9));
    let (solved, factored) = timed(|| structure.at(500e6));
    let sides = vec![structure.gap_v(0, 0.5); 64];
    let (_, answered) = timed(|| black_box(solved.driven(sides)));
    println!(
        "{} unknowns: geometry {:.0} ms once, equations of one frequency {:.1} ms, 64 right-hand sides {:.1} ms",
        structure.unknowns(),
        geometry.as_secs_f64() * 1e3,
        factored.as_secs_f64() * 1e3,
        answered.as_secs_f64() * 1e3
    );
}

/// Reads so many nets at all frequencies, one net after the other's harmonics as a study does.
fn reading(antenna: &OwnPlane, frequencies_hz: &[f64], nets: usize) -> Duration {
    let net: Net = wire_net("5pF", None);
    let share = antenna.frequency_share();
    let start = Instant::now();
    let groups = grouped(frequencies_hz, share);
    groups.par_iter().for_each(|group| {
        let lit: Vec<Lit> = group.iter().map(|&f| Lit::new(&net, &PLANE, f)).collect();
        let footing = lit[0].footing(antenna);
        let harmonics: Vec<_> = lit
            .iter()
            .flat_map(|lit| (0..nets).map(|_| lit.net(&footing)))
            .collect();
        black_box(antenna.readings(group[0], &harmonics));
    });
    start.elapsed()
}

fn grouped(mut all: &[f64], share: f64) -> Vec<&[f64]> {
    let mut groups = Vec::new();
    while let Some(first) = all.first() {
        let count = all.partition_point(|f| *f <= first * (1.0 + share));
        let (group, rest) = all.split_at(count);
        groups.push(group);
        all = rest;
    }
    groups
}

fn timed<T>(work: impl FnOnce() -> T) -> (T, Duration) {
    let start = Instant::now();
    let done = work();
    (done, start.elapsed())
}

/// The most memory that was held, where the system tells.
fn peak_memory() -> Option<String> {
    let status = std::fs::read_to_string("/proc/self/status").ok()?;
    let line = status.lines().find(|line| line.starts_with("VmHWM"))?;
    Some(format!(
        "most memory held: {}",
        line.trim_start_matches("VmHWM:").trim()
    ))
}
