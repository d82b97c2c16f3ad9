//! Nets on a plane of finite size, bare and with a cable, against full-wave rows. `--nocapture` prints the statistics.

#![allow(clippy::print_stdout)]

mod oracle;

use oracle::lit::{Lit, wire_net};
use ringfield::board::{Cable, CableRun, Edge, Net, Orientation, Plane};
use ringfield::radiation::{Antenna, Heights, OwnPlane, Site, TestSite, near_field_factor};
use ringfield::watch::Unwatched;
use serde_json::Value;

const PLANE: Plane = Plane {
    length_m: 0.16,
    width_m: 0.1,
    orientation: Orientation::Flat,
};

fn cable() -> Cable {
    Cable {
        name: "cable".into(),
        length_m: Some(1.0),
        edge: Edge::Left,
        at_m: None,
        run: CableRun::Straight,
        diameter_m: 1e-3,
    }
}

/// A plane and its cables in free space, seen from 3 m.
fn free_space(cables: &[Cable], frequencies_hz: &[f64]) -> OwnPlane {
    let test_site = TestSite {
        site: Site::FreeSpace,
        heights: Heights::default(),
        distances_m: vec![3.0],
    };
    OwnPlane::new(&PLANE, cables, test_site, frequencies_hz, &Unwatched)
}

/// The far field times the distance.
fn strongest_v(antenna: &OwnPlane, net: &Net, frequency_hz: f64) -> f64 {
    let segments = Lit::new(net, &PLANE, frequency_hz);
    let reading = segments.readings(antenna)[0][0];
    reading.field_v_per_m * 3.0 / near_field_factor(frequency_hz, 3.0)
}

/// Plates and cable, from 50 MHz up: an own plate-and-wire solver of the reference's makers, three meshes within
/// 0.1 dB (finite_plates.json).
#[test]
fn finite_plates_and_a_cable() {
    let text = include_str!("reference/finite_plates.json");
    let table: Value = serde_json::from_str(text).expect("JSON");
    let rows = table["rows"].as_array().expect("rows");
    let mut frequencies_hz: Vec<f64> = rows
        .iter()
        .map(|row| row["frequency_hz"].as_f64().expect("a number"))
        .collect();
    frequencies_hz.sort_by(f64::total_cmp);
    frequencies_hz.dedup();
    let bare = free_space(&[], &frequencies_hz);
    let cabled = free_space(&[cable()], &frequencies_hz);
    for case in [
        "plate, centred",
        "plate, 10 mm from the edge",
        "plate with 1 m cable",
    ] {
        let (antenna, edge_m) = match case {
            "plate, centred" => (&bare, None),
            "plate, 10 mm from the edge" => (&bare, Some(0.01)),
            _ => (&cabled, None),
        };
        let mut off: Vec<(f64, String)> = Vec::new();
        for row in rows {
            let frequency_hz = row["frequency_hz"].as_f64().expect("a number");
            if row["case"] != case || frequency_hz < 50e6 {
                continue;
            }
            let load = row["load"].as_str().expect("a load");
            let published = row["field_3m_v_per_m"].as_f64().expect("a number") * 3.0;
            let computed = strongest_v(antenna, &wire_net(load, edge_m), frequency_hz);
            let db = 20.0 * (computed / published).log10();
            off.push((
                db.abs(),
                format!("{load}, {:.0} MHz: {db:+.2} dB", frequency_hz / 1e6),
            ));
        }
        off.sort_by(|a, b| a.0.total_cmp(&b.0));
        let at = |share: f64| off[((off.len() - 1) as f64 * share).round() as usize].0;
        let (median_db, most_db) = (at(0.5), at(0.95));
        println!(
            "{case}: {} points, median {median_db:.2} dB, 95 % {most_db:.2} dB, worst {}",
            off.len(),
            off[off.len() - 1].1
        );
        assert!(
            median_db <= 0.5 && most_db <= 1.5,
            "{case}: {:#?}",
            &off[off.len() * 9 / 10..]
        );
    }
}

/// Many frequencies: a rational fit through samples, and near ones looked at together. Together that moves no reading
/// by more than 0.3 dB from the solution at its own frequency, resonances of cable and plane included.
#[test]
fn many_frequencies_keep_to_the_exact_solutions() {
    let net = wire_net("r50", None);
    let lowest_hz = 30e6;
    let many: Vec<f64> = (0..=1500)
        .map(|step| lowest_hz * (1e9_f64 / lowest_hz).powf(f64::from(step) / 1500.0))
        .collect();
    let looked_at: Vec<f64> = many.iter().copied().step_by(15).collect();
    let fitted = free_space(&[cable()], &many);
    let exact = free_space(&[cable()], &looked_at);
    assert!(exact.frequency_share() == 0.0 && fitted.frequency_share() > 0.0);
    let half_share = fitted.frequency_share() / 2.0;
    let mut worst = [(0.0, 0.0); 2];
    for &frequency_hz in &looked_at {
        let own_v = strongest_v(&exact, &net, frequency_hz);
        let segments = Lit::new(&net, &PLANE, frequency_hz);
        for (which, aside) in [(0, 1.0), (1, 1.0 - half_share), (1, 1.0 + half_share)] {
            let reading = segments.readings_near(&fitted, frequency_hz * aside)[0][0];
            let near = near_field_factor(frequency_hz, 3.0);
            let db = 20.0 * (reading.field_v_per_m * 3.0 / near / own_v).log10();
            if db.abs() > f64::abs(worst[which].0) {
                worst[which] = (db, frequency_hz / 1e6);
            }
        }
    }
    println!(
        "many frequencies, cable 1 m: fit at most {:+.3} dB (at {:.0} MHz), shared {:+.2} dB (at {:.0} MHz)",
        worst[0].0, worst[0].1, worst[1].0, worst[1].1
    );
    assert!(
        worst[0].0.abs() <= 0.05 && worst[1].0.abs() <= 0.3,
        "{worst:?}"
    );
}
