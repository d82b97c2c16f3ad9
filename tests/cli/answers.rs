//! What `check` answers: exit codes, the table, and the options that choose.

use super::readings::{json, list, number};
use super::*;
use serde_json::Value;
use std::collections::BTreeSet;
use std::process::Stdio;

#[test]
fn the_example_has_nets_that_likely_fail_and_lists_them_worst_first() {
    let run = run(&["check", BRACKWATER]).ends(1);
    assert!(run.stdout.contains(NOTICE) && run.stderr.is_empty());
    let rows = run.rows();
    let margins: Vec<f64> = rows
        .iter()
        .map(|row| row[2].parse().expect("a margin"))
        .collect();
    assert!(rows.len() > 10 && margins.is_sorted(), "{margins:?}");
    assert_eq!(rows[0][1], "likely fail");
    assert_eq!(rows[rows.len() - 1][1], "likely pass");
}

#[test]
fn nothing_that_likely_fails_is_exit_code_0() {
    run(&["check", BRACKWATER, "--net", "CAM_MCLK"]).ends(0);
    run(&["limits"]).ends(0);
    run(&[
        "limits",
        "--distance",
        "5m",
        "limits/47-cfr-15-109-class-b.yaml",
    ])
    .ends(0);
}

#[test]
fn wrong_arguments_are_exit_code_2() {
    for arguments in [
        &["check"][..],
        &["chek", BRACKWATER],
        &["check", BRACKWATER, "--distance", "3"],
        &["check", BRACKWATER, "--distance", "-3 m"],
        &["check", BRACKWATER, "--distance", "300 m"],
        &["check", BRACKWATER, "--max-frequency", "1 m"],
        &["check", BRACKWATER, "--site", "moon"],
        &["check", BRACKWATER, "--sigma", "NaN"],
        &["check", "no-such-board.yaml"],
        &["check", "examples"],
        &["limits", "no-such-limit.yaml"],
    ] {
        let run = run(arguments).ends(2);
        assert!(
            run.stdout.is_empty() && run.stderr.contains("error:"),
            "{arguments:?}"
        );
    }
}

#[test]
fn nets_are_chosen_by_name_and_a_near_miss_is_named() {
    let chosen = run(&[
        "check", BRACKWATER, "--net", "XTAL_OUT", "--net", "CAM_MCLK",
    ])
    .ends(0);
    let names: Vec<String> = chosen
        .rows()
        .into_iter()
        .map(|row| row[0].clone())
        .collect();
    assert_eq!(names, ["CAM_MCLK", "XTAL_OUT"]);
    let missed = run(&["check", BRACKWATER, "--net", "CAM_PCKL"]).ends(2);
    assert!(missed.stdout.is_empty());
    assert!(missed.stderr.contains("`CAM_PCKL`"), "{}", missed.stderr);
    assert!(
        missed.stderr.contains("did you mean `CAM_PCLK`?"),
        "{}",
        missed.stderr
    );
}

/// The fields of the first net's harmonics at the first distance.
fn fields(board: &Value) -> Vec<f64> {
    let harmonics = list(&board["nets"][0]["harmonics"]);
    let field = |harmonic: &Value| number(&harmonic["fields"][0]["field_dbuv_per_m"]);
    harmonics.iter().map(field).collect()
}

#[test]
fn distance_site_and_top_frequency_do_what_they_say() {
    let one = ["check", BRACKWATER, "--net", "CAM_PCLK"];
    let with = |more: &[&str]| json(&[&one, more].concat()).0;
    let at_5m = with(&["--distance", "5m"]);
    let distances: Vec<&Value> = list(&at_5m["nets"][0]["harmonics"][0]["fields"])
        .iter()
        .map(|field| &field["distance_m"])
        .collect();
    assert_eq!(distances, [5.0]);
    // A limit that is stated elsewhere is moved, and the output says so.
    let said = run(&[&one[..], &["--distance", "5m"]].concat());
    assert!(
        said.stdout
            .contains("is stated at 3 m and moved to 5 m at 20 dB per decade")
    );

    let [near, far] = ["3 m", "10 m"]
        .map(|distance| fields(&with(&["--site", "free-space", "--distance", distance])));
    // In free space and far away the field falls with distance; the near field at 48 MHz adds a dB to that.
    for (harmonic, (near, far)) in near.iter().zip(&far).enumerate() {
        let fall = near - far - 20.0 * (10.0_f64 / 3.0).log10();
        assert!((-0.01..0.6).contains(&fall), "{harmonic}: {fall}");
    }
    let free = with(&["--site", "free-space", "--distance", "3 m"]);
    assert_eq!(free["site"], "free-space");
    let over_a_floor = fields(&with(&["--distance", "3 m"]));
    assert!(
        near.iter()
            .zip(&over_a_floor)
            .any(|(free, floor)| (floor - free).abs() > 2.0)
    );

    let short = with(&["--max-frequency", "300 MHz"]);
    assert_eq!(list(&short["nets"][0]["harmonics"]).len(), 6);
    let long = with(&["--max-frequency", "2 GHz"]);
    assert_eq!(list(&long["nets"][0]["harmonics"]).len(), 41);
}

const HOUSE_LIMIT: &str = "\
title: house limit
distance: 3 m
detector: quasi-peak
bands:
  - {from: 30 MHz, to: 1 GHz, limit: 20 dBuV/m}
";

#[test]
fn a_users_limit_takes_the_place_of_the_built_in_ones() {
    let folder = Folder::new();
    let limit = folder.file("house.yaml", HOUSE_LIMIT);
    let (board, code) = json(&["check", BRACKWATER, "--net", "CAM_MCLK", "--limit", &limit]);
    assert_eq!(code, Some(1));
    let worst = &board["nets"][0]["worst"];
    assert_eq!(worst["limit"], "house limit");
    if worst["distance_m"] == 3.0 {
        assert!((number(&worst["limit_dbuv_per_m"]) - 20.0).abs() < 1e-9);
    }
    let (both, _) = json(&[
        "check",
        BRACKWATER,
        "--limit",
        &limit,
        "--limit",
        "limits/cispr-32-class-b-3m.yaml",
    ]);
    let titles: BTreeSet<&str> = list(&both["limits"])
        .iter()
        .filter_map(|limit| limit["title"].as_str())
        .collect();
    assert_eq!(titles.len(), 2, "{titles:?}");
}

#[test]
fn cables_are_spoken_of() {
    let folder = Folder::new();
    let named = BOARD.replace(
        "cables: []",
        "cables:\n  - {name: harness, length: 1 m, edge: left}",
    );
    let without_plane = named.replace("plane: {length: 160 mm, width: 100 mm}\n", "");
    let unsaid = BOARD.replace("cables: []\n", "");
    let said = |name: &str, board: &str| run(&["check", &folder.file(name, board)]).stdout;
    assert!(said("without-plane.yaml", &without_plane).contains(CABLES_LEFT_OUT));
    let named = said("named.yaml", &named);
    assert!(!named.contains(CABLES_LEFT_OUT));
    assert!(said("unsaid.yaml", &unsaid).contains("does not say what hangs on the board"));
    let cable_of = |name: &str| {
        let (json, _) = json(&["check", &folder.path(name)]);
        json["nets"][0]["harmonics"][0]["fields"][0]["cable_dbuv_per_m"].clone()
    };
    assert!(cable_of("named.yaml").is_number());
    assert!(cable_of("without-plane.yaml").is_null());
    let none = said("none.yaml", BOARD);
    assert!(cable_of("none.yaml").is_null());
    assert!(!none.contains(CABLES_LEFT_OUT) && !none.contains("does not say what hangs"));
}

#[test]
fn colours_stay_out_of_pipes_and_of_json() {
    let with = |variables: &[(&str, &str)], arguments: &[&str]| {
        let mut command = ringfield(&[&["check", BRACKWATER], arguments].concat());
        run_command(command.envs(variables.iter().copied())).stdout
    };
    assert!(!with(&[], &[]).contains('\x1b'));
    // So there are colours to be left out.
    assert!(with(&[("CLICOLOR_FORCE", "1")], &[]).contains('\x1b'));
    assert!(!with(&[("CLICOLOR_FORCE", "1"), ("NO_COLOR", "1")], &[]).contains('\x1b'));
    assert!(!with(&[("CLICOLOR_FORCE", "1")], &["--json", "-"]).contains('\x1b'));
}

#[test]
fn a_reader_that_has_seen_enough_is_no_error() {
    for (arguments, code) in [
        (&["check", BRACKWATER][..], 1),
        (&["check", BRACKWATER, "--json", "-"], 1),
        (&["limits"], 0),
    ] {
        let mut child = std::process::Command::new(env!("CARGO_BIN_EXE_ringfield"))
            .current_dir(env!("CARGO_MANIFEST_DIR"))
            .args(arguments)
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .expect("the program starts");
        drop(child.stdout.take());
        let output = child.wait_with_output().expect("the program ends");
        assert_eq!(output.status.code(), Some(code), "{arguments:?}");
        assert!(
            output.stderr.is_empty(),
            "{}",
            String::from_utf8_lossy(&output.stderr)
        );
    }
}
