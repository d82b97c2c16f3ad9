//! The figures for other programs: the JSON's names and readings, the CSV files, and that they agree.

use super::*;
use serde_json::Value;
use std::collections::BTreeSet;

pub(crate) fn json(arguments: &[&str]) -> (Value, Option<i32>) {
    let run = run(&[arguments, &["--json", "-"]].concat());
    let value =
        serde_json::from_str(&run.stdout).unwrap_or_else(|error| panic!("{error}: {}", run.stdout));
    (value, run.code)
}

pub(crate) fn list(value: &Value) -> &[Value] {
    value
        .as_array()
        .unwrap_or_else(|| panic!("no list: {value}"))
}

pub(crate) fn number(value: &Value) -> f64 {
    value
        .as_f64()
        .unwrap_or_else(|| panic!("no number: {value}"))
}

/// All of these names stand in the object; there may be more.
fn has(object: &Value, names: &[&str]) {
    for name in names {
        assert!(object.get(name).is_some(), "{name} is missing in {object}");
    }
}

#[test]
fn the_json_has_the_names_and_figures_it_promises() {
    let (board, code) = json(&["check", BRACKWATER]);
    assert_eq!(code, Some(1));
    has(&board, &["notice", "board", "site", "nets"]);
    assert_eq!(board["notice"], NOTICE);
    assert_eq!(board["board"], "Brackwater buoy controller, revision C");
    assert_eq!(board["site"], "open-area");
    let mut verdicts = BTreeSet::new();
    for net in list(&board["nets"]) {
        has(net, &["name", "verdict", "worst", "harmonics", "signal"]);
        verdicts.insert(net["verdict"].as_str().expect("a verdict"));
        check_worst(net);
        check_harmonics(net);
        check_signal(net);
    }
    assert_eq!(
        verdicts.into_iter().collect::<Vec<_>>(),
        ["likely fail", "likely pass", "marginal"]
    );
}

fn check_worst(net: &Value) {
    let worst = &net["worst"];
    has(
        worst,
        &[
            "limit",
            "harmonic",
            "frequency_hz",
            "distance_m",
            "field_dbuv_per_m",
            "limit_dbuv_per_m",
            "margin_db",
        ],
    );
    let margin_db = number(&worst["limit_dbuv_per_m"]) - number(&worst["field_dbuv_per_m"]);
    assert!(
        (number(&worst["margin_db"]) - margin_db).abs() < 1e-9,
        "{worst}"
    );
    // It is one of the net's own readings.
    let harmonic = list(&net["harmonics"])
        .iter()
        .find(|harmonic| harmonic["harmonic"] == worst["harmonic"])
        .expect("the worst harmonic is listed");
    assert_eq!(harmonic["frequency_hz"], worst["frequency_hz"]);
    let field = list(&harmonic["fields"])
        .iter()
        .find(|field| field["distance_m"] == worst["distance_m"])
        .expect("the worst distance is listed");
    assert_eq!(field["field_dbuv_per_m"], worst["field_dbuv_per_m"]);
}

fn check_harmonics(net: &Value) {
    let clock_hz = number(&net["clock_hz"]);
    let (lowest, top) = ((30e6 / clock_hz).ceil(), (1e9 / clock_hz).floor());
    let harmonics = list(&net["harmonics"]);
    assert_eq!(
        harmonics.len(),
        (top - lowest) as usize + 1,
        "{}",
        net["name"]
    );
    let receivers: Vec<&str> = list(&net["signal"]["receivers"])
        .iter()
        .map(|receiver| receiver["name"].as_str().expect("a name"))
        .collect();
    for (index, harmonic) in harmonics.iter().enumerate() {
        has(
            harmonic,
            &[
                "harmonic",
                "frequency_hz",
                "driver_current_a",
                "receiver_voltage_v",
                "fields",
            ],
        );
        let order = number(&harmonic["harmonic"]);
        assert_eq!(order, lowest + index as f64);
        let frequency_hz = number(&harmonic["frequency_hz"]);
        assert!((frequency_hz / (order * clock_hz) - 1.0).abs() < 1e-12);
        assert!(number(&harmonic["driver_current_a"]) >= 0.0);
        for receiver in &receivers {
            assert!(number(&harmonic["receiver_voltage_v"][receiver]) >= 0.0);
        }
        let fields = list(&harmonic["fields"]);
        let distances_m: Vec<f64> = fields
            .iter()
            .map(|field| number(&field["distance_m"]))
            .collect();
        assert_eq!(distances_m, [3.0, 10.0]);
        for field in fields {
            has(
                field,
                &[
                    "distance_m",
                    "field_dbuv_per_m",
                    "loop_area_dbuv_per_m",
                    "cable_dbuv_per_m",
                ],
            );
            number(&field["field_dbuv_per_m"]);
            number(&field["loop_area_dbuv_per_m"]);
        }
    }
}

fn check_signal(net: &Value) {
    let signal = &net["signal"];
    has(signal, &["driver_peak_current_a", "receivers"]);
    assert!(number(&signal["driver_peak_current_a"]) > 0.0);
    assert!(!list(&signal["receivers"]).is_empty());
    for receiver in list(&signal["receivers"]) {
        has(
            receiver,
            &[
                "name",
                "maximum_v",
                "minimum_v",
                "overshoot_v",
                "undershoot_v",
                "ringback_v",
                "extra_crossings",
                "settling_s",
                "clamp_peak_current_a",
                "clamp_power_w",
            ],
        );
        has(&receiver["clamp_peak_current_a"], &["low", "high"]);
        assert!(number(&receiver["maximum_v"]) > number(&receiver["minimum_v"]));
        for figure in ["overshoot_v", "undershoot_v", "ringback_v", "clamp_power_w"] {
            assert!(number(&receiver[figure]) >= 0.0, "{figure}");
        }
    }
}

/// The rows of a CSV, without its header, and its header; comments left out.
fn table(text: &str) -> (Vec<String>, Vec<Vec<String>>) {
    let mut reader = csv::ReaderBuilder::new()
        .comment(Some(b'#'))
        .from_reader(text.as_bytes());
    let owned = |record: &csv::StringRecord| record.iter().map(str::to_owned).collect();
    let header = owned(reader.headers().expect("a header"));
    let rows = reader
        .records()
        .map(|record| owned(&record.expect("rows of one length")))
        .collect();
    (header, rows)
}

fn numbers(rows: &[Vec<String>], column: usize) -> Vec<f64> {
    let number = |row: &Vec<String>| row[column].parse().expect("a number");
    rows.iter().map(number).collect()
}

/// Rms value of a harmonic, as the plain Fourier sum over one period of equal steps.
fn rms(samples: &[f64], harmonic: usize) -> f64 {
    let (mut cosine, mut sine) = (0.0, 0.0);
    for (step, sample) in samples.iter().enumerate() {
        let angle =
            std::f64::consts::TAU * (step * harmonic % samples.len()) as f64 / samples.len() as f64;
        cosine += sample * angle.cos();
        sine += sample * angle.sin();
    }
    std::f64::consts::SQRT_2 * f64::hypot(cosine, sine) / samples.len() as f64
}

#[test]
fn harmonics_are_the_rms_values_of_the_waveform() {
    let folder = Folder::new();
    let path = folder.path("period.csv");
    let (board, _) = json(&[
        "check",
        BRACKWATER,
        "--net",
        "CAM_PCLK",
        "--waveform",
        &path,
    ]);
    let text = folder.read("period.csv");
    assert!(text.contains(NOTICE));
    let (header, rows) = table(&text);
    assert_eq!(header, ["time_s", "driver_v", "driver_a", "cmos-input_v"]);
    let times_s = numbers(&rows, 0);
    // One period of equal steps, its end not repeated.
    let step_s = times_s[1] - times_s[0];
    for (place, time_s) in times_s.iter().enumerate() {
        assert!((time_s - place as f64 * step_s).abs() < 1e-6 * step_s);
    }
    let period_s = step_s * times_s.len() as f64;
    assert!((period_s * 48e6 - 1.0).abs() < 1e-9, "{period_s:e}");
    let (current_a, voltage_v) = (numbers(&rows, 2), numbers(&rows, 3));
    let close = |what: &str, figure: f64, sum: f64| {
        assert!(
            (figure / sum - 1.0).abs() < 0.01,
            "{what}: {figure:e} against {sum:e}"
        );
    };
    for harmonic in list(&board["nets"][0]["harmonics"]) {
        let order = number(&harmonic["harmonic"]) as usize;
        // Even harmonics of equal halves are next to nothing.
        if order % 2 == 1 {
            close(
                "A",
                number(&harmonic["driver_current_a"]),
                rms(&current_a, order),
            );
            let receiver_v = number(&harmonic["receiver_voltage_v"]["cmos-input"]);
            close("V", receiver_v, rms(&voltage_v, order));
        }
    }
    let signal = &board["nets"][0]["signal"];
    let largest = |values: &[f64]| values.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    let smallest = |values: &[f64]| values.iter().copied().fold(f64::INFINITY, f64::min);
    close(
        "peak",
        number(&signal["driver_peak_current_a"]),
        largest(&current_a).max(-smallest(&current_a)),
    );
    close(
        "high",
        number(&signal["receivers"][0]["maximum_v"]),
        largest(&voltage_v),
    );
    close(
        "low",
        number(&signal["receivers"][0]["minimum_v"]),
        smallest(&voltage_v),
    );
}

#[test]
fn the_csv_holds_a_row_for_every_harmonic_and_distance() {
    let folder = Folder::new();
    let path = folder.path("harmonics.csv");
    let (board, _) = json(&["check", BRACKWATER, "--csv", &path]);
    let text = folder.read("harmonics.csv");
    assert!(text.contains(NOTICE));
    let (header, rows) = table(&text);
    let harmonics: usize = list(&board["nets"])
        .iter()
        .map(|net| list(&net["harmonics"]).len())
        .sum();
    assert_eq!(rows.len(), 2 * harmonics);
    let column = |name: &str| header.iter().position(|cell| cell == name).expect(name);
    let first = &list(&board["nets"])[0];
    let reading = &first["harmonics"][0]["fields"][0];
    assert_eq!(
        rows[0][column("net")],
        first["name"].as_str().expect("a name")
    );
    let field = numbers(&rows, column("field_dbuv_per_m"))[0];
    assert!((field - number(&reading["field_dbuv_per_m"])).abs() < 1e-9);
    // The worst margin of the table is the worst of all rows.
    let worst = rows
        .iter()
        .filter_map(|row| row[column("margin_db")].parse::<f64>().ok())
        .fold(f64::INFINITY, f64::min);
    let margins = list(&board["nets"])
        .iter()
        .map(|net| number(&net["worst"]["margin_db"]));
    assert!((worst - margins.fold(f64::INFINITY, f64::min)).abs() < 1e-9);
}
