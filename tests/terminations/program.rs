//! `compare` and `remedy` as their user meets them.

use assert_cmd::Command;
use serde_json::Value;
use std::fs;
use std::path::Path;

const BRACKWATER: &str = "examples/brackwater.yaml";
const NOTICE: &str = "pre-compliance estimate, not a compliance test";

/// Runs the program in the project's folder; gives its standard output and error.
fn run(arguments: &[&str], code: i32) -> (String, String) {
    let output = Command::new(env!("CARGO_BIN_EXE_ringfield"))
        .current_dir(env!("CARGO_MANIFEST_DIR"))
        .args(arguments)
        .output()
        .expect("the program starts");
    let text = |bytes| String::from_utf8(bytes).expect("the program speaks UTF-8");
    let (stdout, stderr) = (text(output.stdout), text(output.stderr));
    assert_eq!(output.status.code(), Some(code), "{stdout}\n{stderr}");
    (stdout, stderr)
}

fn json(arguments: &[&str], code: i32) -> Value {
    serde_json::from_str(&run(arguments, code).0).expect("JSON alone")
}

#[test]
fn a_bare_net_is_held_against_its_matched_series_resistor() {
    let document = json(
        &["compare", BRACKWATER, "--net", "CAM_PCLK", "--json", "-"],
        0,
    );
    let net = &document["nets"][0];
    assert_eq!(net["variants"][0]["variant"], "as is");
    assert_eq!(net["variants"][1]["variant"], "series 62 ohm");
    assert_eq!(net["worst_harmonics"].as_array().unwrap().len(), 3);
    assert_eq!(document["notice"], NOTICE);
    let checked = json(
        &["check", BRACKWATER, "--net", "CAM_PCLK", "--json", "-"],
        0,
    );
    let margin = |net: &Value| net["worst"]["margin_db"].as_f64().unwrap();
    let same = margin(&checked["nets"][0]) - margin(&net["variants"][0]["net"]);
    assert!(same.abs() < 1e-6, "{same}");
    // What the probes of the power figures saw is not the user's business.
    assert_eq!(
        net["variants"][1]["net"]["signal"]["receivers"]
            .as_array()
            .unwrap()
            .len(),
        1
    );
    let seen = net["variants"][1]["net"]["harmonics"][0]["receiver_voltage_v"]
        .as_object()
        .unwrap();
    assert_eq!(seen.keys().collect::<Vec<_>>(), ["cmos-input"]);
}

#[test]
fn a_terminated_net_is_held_against_the_bare_one() {
    let (table, _) = run(&["compare", BRACKWATER, "--net", "ETH_REFCLK"], 0);
    assert!(
        table.contains("\nas is ") && table.contains("\nbare "),
        "{table}"
    );
    assert!(table.contains(NOTICE));
}

#[test]
fn pictures_and_csv_are_written() {
    let folder = tempfile::tempdir().unwrap();
    let csv = folder.path().join("variants.csv");
    let plots = folder.path().join("plots");
    let (csv_text, plots_text) = (csv.to_str().unwrap(), plots.to_str().unwrap());
    run(
        &[
            "compare",
            BRACKWATER,
            "--net",
            "LCD_DCLK",
            "--try",
            "series 56 ohm at legs",
            "--try",
            "end 64 ohm + 100 pF",
            "--csv",
            csv_text,
            "--plot",
            plots_text,
        ],
        0,
    );
    for name in [
        "compare-spectrum-3m",
        "compare-spectrum-10m",
        "compare-waveform-U7",
        "compare-waveform-U8",
    ] {
        let svg = fs::read_to_string(plots.join(format!("LCD_DCLK-{name}.svg"))).unwrap();
        assert!(
            svg.contains(NOTICE) && svg.contains("series 56 ohm at legs"),
            "{name}"
        );
        assert!(plots.join(format!("LCD_DCLK-{name}.png")).exists());
    }
    let text = fs::read_to_string(&csv).unwrap();
    assert!(text.starts_with("net,variant,harmonic,frequency_hz,distance_m,field_dbuv_per_m,change_db,limit,limit_dbuv_per_m,margin_db\n"));
    assert!(text.contains("\nLCD_DCLK,end 64 ohm + 100 pF,1,3"));
    assert!(text.ends_with(&format!("# notice: {NOTICE}\n")));
}

#[test]
fn a_sweep_goes_over_the_range() {
    let folder = tempfile::tempdir().unwrap();
    let arguments = [
        "compare",
        BRACKWATER,
        "--net",
        "CAM_PCLK",
        "--sweep",
        "series 0..100 ohm",
    ];
    let plots = folder.path().to_str().unwrap();
    let document = json(
        &[&arguments[..], &["--json", "-", "--plot", plots]].concat(),
        0,
    );
    let points = document["nets"][0]["sweep"]["points"].as_array().unwrap();
    assert_eq!(points.len(), 21);
    let figure = |point: &Value, name: &str| point[name].as_f64().unwrap();
    assert_eq!(figure(&points[20], "value"), 100.0);
    // No resistor rings most and radiates most.
    for point in &points[1..] {
        assert!(figure(point, "overshoot_v") <= figure(&points[0], "overshoot_v"));
        assert!(figure(point, "margin_db") > figure(&points[0], "margin_db"));
    }
    assert!(folder.path().join("CAM_PCLK-sweep.png").exists());
    let (table, _) = run(&arguments, 0);
    assert!(table.contains("\n   50 "), "{table}");
}

#[test]
fn two_boards_are_compared_net_by_net() {
    let folder = tempfile::tempdir().unwrap();
    let other = folder.path().join("other.yaml");
    let text = fs::read_to_string(Path::new(env!("CARGO_MANIFEST_DIR")).join(BRACKWATER)).unwrap();
    fs::write(
        &other,
        text.replace("rise: 0.8 ns", "rise: 1.6 ns")
            .replace("name: XTAL_OUT", "name: XTAL_NEW"),
    )
    .unwrap();
    let other = other.to_str().unwrap();
    let arguments = [
        "compare", BRACKWATER, "--net", "CAM_PCLK", "--net", "XTAL_OUT", "--board", other,
    ];
    let (table, said) = run(&arguments, 0);
    assert!(
        table.contains("\nbrackwater.yaml ") && table.contains("\nother.yaml "),
        "{table}"
    );
    assert!(said.contains("has no usable net XTAL_OUT"), "{said}");
}

#[test]
fn what_cannot_be_tried_is_refused_with_a_reason() {
    let refused = |arguments: &[&str]| run(&[&["compare", BRACKWATER], arguments].concat(), 2).1;
    assert!(refused(&[]).contains("say which net to compare with --net"));
    let cam = |text: &str| refused(&["--net", "CAM_PCLK", "--try", text]);
    assert!(cam("seris 47 ohm").contains("did you mean `series`?"));
    assert!(cam("series 47").contains("has no unit"));
    assert!(cam("series 47 ohm at legs").contains("does not branch into legs"));
    assert!(cam("end 64 ohm at U9").contains("it has no receiver `U9`"));
    assert!(cam("layer inner").contains("no net of the board runs on a layer `inner`"));
    assert!(cam("setting slow").contains("has no setting `slow`"));
    assert!(cam("rise 30 ns").contains("edges would need"));
    assert!(refused(&["--net", "CAM_PCLK", "--sweep", "series 47 ohm"]).contains("has no range"));
}

/// The promise is kept: written out and checked again, every remedied net has its margin, and the others are as before.
#[test]
fn the_written_board_has_the_margins_it_was_promised() {
    let folder = tempfile::tempdir().unwrap();
    let written = folder.path().join("remedied.yaml");
    let written = written.to_str().unwrap();
    let report = json(
        &["remedy", BRACKWATER, "--json", "-", "--write", written],
        1,
    );
    let before = json(&["check", BRACKWATER, "--json", "-"], 1);
    let after = json(&["check", written, "--json", "-"], 1);
    let nets = |document: &Value| document["nets"].as_array().unwrap().clone();
    let mut found = 0;
    for ((remedied, before), after) in nets(&report).iter().zip(nets(&before)).zip(nets(&after)) {
        assert_eq!(
            (&remedied["name"], &remedied["name"]),
            (&before["name"], &after["name"])
        );
        let promised = match remedied["remedy"]["margin_db"].as_f64() {
            Some(margin_db) => {
                found += 1;
                assert!(margin_db >= remedied["wanted_margin_db"].as_f64().unwrap());
                assert_eq!(after["verdict"], "likely pass");
                margin_db
            }
            None => before["worst"]["margin_db"].as_f64().unwrap(),
        };
        let kept = after["worst"]["margin_db"].as_f64().unwrap();
        assert!(
            (kept - promised).abs() < 0.1,
            "{}: {kept} is not {promised}",
            remedied["name"]
        );
    }
    assert!(found >= 1);
    let text = fs::read_to_string(written).unwrap();
    assert!(text.contains(NOTICE) && text.contains("# put in"));
    for comment in [
        "# A daisy chain of three memories.",
        "# Slow and weak drivers.",
    ] {
        assert!(text.contains(comment), "{comment}");
    }
}

#[test]
fn a_board_that_passes_needs_nothing() {
    let (table, _) = run(&["remedy", BRACKWATER, "--net", "BARO_SCK"], 0);
    assert!(table.contains("No net needs a remedy"), "{table}");
    assert!(table.contains("Left alone") && table.contains("BARO_SCK"));
}

#[test]
fn a_hopeless_net_ends_with_1_and_its_levers() {
    let arguments = [
        "remedy",
        BRACKWATER,
        "--net",
        "CAM2_PCLK",
        "--margin",
        "30 dB",
    ];
    let (table, _) = run(&arguments, 1);
    assert!(
        table.contains("no change of parts reaches 30.0 dB"),
        "{table}"
    );
    assert!(
        table.contains("height 304.8 um (12 mil) ->") && table.contains("layer core"),
        "{table}"
    );
}
