//! Nets on a plane with hanging cables on the open-area site, against solved rows. `--nocapture` prints the statistics.

#![allow(clippy::print_stdout)]

mod oracle;

use oracle::lit::{Lit, wire_net};
use ringfield::board::{Cable, CableRun, Edge, Orientation, Plane};
use ringfield::radiation::{Heights, OwnPlane, Site, TestSite};
use ringfield::watch::Unwatched;
use serde_json::Value;
use std::collections::BTreeMap;

fn cables(name: &str) -> Vec<Cable> {
    let (run, length_m) = match name {
        "none" => return Vec::new(),
        "straight1m" => (CableRun::Straight, 1.0),
        "drop_open" => (CableRun::Drops, 0.89),
        "drop_bonded" => (CableRun::Bonded, 0.9),
        "drop_lie1.5m" => (CableRun::Drops, 1.5),
        other => panic!("a cable that the rows do not have: {other}"),
    };
    vec![Cable {
        name: name.into(),
        length_m: Some(length_m),
        edge: Edge::Left,
        at_m: None,
        run,
        diameter_m: 1e-3,
    }]
}

/// Solved with the floor's image in the kernels, the net lit by reciprocity, and, where it was done, with the trace
/// meshed and driven; by the makers of the reference (site.json).
#[test]
fn solved_rows_of_the_open_area_site() {
    let text = include_str!("reference/site.json");
    let table: Value = serde_json::from_str(text).expect("JSON");
    let rows = table["rows"].as_array().expect("rows");
    let number = |row: &Value, key: &str| row[key].as_f64().expect("a number");
    let mut cases: BTreeMap<(String, String), Vec<&Value>> = BTreeMap::new();
    for row in rows {
        let name = |key: &str| row[key].as_str().expect("a name").to_string();
        cases
            .entry((name("case"), name("cable")))
            .or_default()
            .push(row);
    }
    let mut groups: BTreeMap<&str, Vec<f64>> = BTreeMap::new();
    for ((case, cable), rows) in cases {
        let standing = case.starts_with("standing");
        let plane = Plane {
            length_m: 0.16,
            width_m: 0.1,
            orientation: if standing {
                Orientation::Standing
            } else {
                Orientation::Flat
            },
        };
        let edge_m = case.contains("edge").then_some(0.01);
        let mut frequencies_hz: Vec<f64> =
            rows.iter().map(|row| number(row, "frequency_hz")).collect();
        let mut distances_m: Vec<f64> = rows.iter().map(|row| number(row, "distance_m")).collect();
        for values in [&mut frequencies_hz, &mut distances_m] {
            values.sort_by(f64::total_cmp);
            values.dedup();
        }
        let test_site = TestSite {
            site: Site::OpenArea,
            heights: Heights::default(),
            distances_m: distances_m.clone(),
        };
        let antenna = OwnPlane::new(
            &plane,
            &cables(&cable),
            test_site,
            &frequencies_hz,
            &Unwatched,
        );
        let mut off = Vec::new();
        for row in rows {
            let frequency_hz = number(row, "frequency_hz");
            let distance_m = number(row, "distance_m");
            let at = distances_m
                .iter()
                .position(|&d| d == distance_m)
                .expect("a distance");
            let net = wire_net(row["load"].as_str().expect("a load"), edge_m);
            let segments = Lit::new(&net, &plane, frequency_hz);
            let reading = segments.readings(&antenna)[0][at];
            let db = |key: &str| Some(20.0 * (reading.field_v_per_m / row[key].as_f64()?).log10());
            if let Some(db) = db("field_direct_v_per_m") {
                groups.entry("driven directly").or_default().push(db.abs());
            }
            let solved = db("field_v_per_m").expect("every row is solved");
            groups
                .entry("by reciprocity")
                .or_default()
                .push(solved.abs());
            off.push((solved, frequency_hz / 1e6));
        }
        let worst = off
            .iter()
            .max_by(|a, b| a.0.abs().total_cmp(&b.0.abs()))
            .expect("rows");
        println!(
            "{case}, cable {cable}: {} points, worst {:+.2} dB at {:.0} MHz",
            off.len(),
            worst.0,
            worst.1
        );
    }
    for (group, mut off) in groups {
        off.sort_by(f64::total_cmp);
        let at = |share: f64| off[((off.len() - 1) as f64 * share).round() as usize];
        println!(
            "open-area site, {group}: {} points, median {:.2} dB, 95 % {:.2} dB, worst {:.2} dB",
            off.len(),
            at(0.5),
            at(0.95),
            at(1.0)
        );
        assert!(at(0.5) <= 0.5 && at(0.95) <= 1.5, "{group}");
    }
}
