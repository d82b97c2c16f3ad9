//! What `rank` answers: the shortlist, the sum, the files, and what becomes of bad rows and of Ctrl-C.

use super::readings::{json, list, number};
use super::*;
use serde_json::Value;
use std::fmt::Write as _;

const WHOLE_BOARD: &str = "examples/brackwater-board.yaml";

/// A small board with its nets in a table.
const BOARD_OF_TABLE: &str = "\
title: test buoy
stackup:
  outer: {microstrip: {height: 4 mil, permittivity: 4.3}}
drivers:
  strong: {swing: 3.3 V, resistance: 3 ohm, rise: 0.8 ns}
receivers:
  input: {capacitance: 5 pF}
cables: []
nets: {table: nets.csv}
";
const HEADER: &str = "net;driver;clock [MHz];layer;width [mil];length [in];receiver;count\n";

fn board_with(folder: &Folder, rows: &str) -> String {
    folder.file("nets.csv", format!("{HEADER}{rows}"));
    folder.file("board.yaml", BOARD_OF_TABLE)
}

#[test]
fn the_shortlist_of_the_example_is_what_its_tour_says() {
    let run = run(&["rank", WHOLE_BOARD]).ends(1);
    assert!(run.stderr.is_empty(), "{}", run.stderr);
    assert!(run.stdout.contains(NOTICE) && run.stdout.contains("201 nets: "));
    let rows: Vec<&str> = run
        .stdout
        .lines()
        .skip_while(|line| !line.starts_with("place "))
        .skip(2)
        .take_while(|line| !line.is_empty())
        .collect();
    assert_eq!(rows.len(), 20);
    assert!(rows[0].contains("CAM_D[0..9]") && rows[0].contains("in series at the driver"));
    assert!(run.stdout.contains("All nets together: likely fail"));
}

#[test]
fn the_json_has_the_names_and_figures_it_promises() {
    let (board, code) = json(&["rank", WHOLE_BOARD, "--top", "all"]);
    assert_eq!(code, Some(1));
    assert_eq!(board["notice"], NOTICE);
    assert_eq!(board["partial"], false);
    let nets = list(&board["nets"]);
    assert_eq!(nets.len(), 201);
    assert_eq!(number(&board["nets_done"]), 201.0);
    let chance = |net: &Value| net["chance_of_failing"].as_f64().unwrap_or(-1.0);
    let margin = |net: &Value| net["worst"]["margin_db"].as_f64().unwrap_or(f64::INFINITY);
    for pair in nets.windows(2) {
        assert!(chance(&pair[0]) >= chance(&pair[1]));
        assert!(margin(&pair[0]) <= margin(&pair[1]));
    }
    for (index, net) in nets.iter().enumerate() {
        assert_eq!(number(&net["place"]), (index + 1) as f64);
        for change in list(&net["changes_tried"]) {
            let gain_db = number(&change["margin_db"]) - margin(net);
            assert!((number(&change["gain_db"]) - gain_db).abs() < 1e-9);
        }
    }
    // The worst case is never below the power sum, nor below any owner of it.
    for line in list(&board["sum"]["lines"]) {
        for field in list(&line["fields"]) {
            let sum = number(&field["field_dbuv_per_m"]);
            assert!(sum >= number(&field["by_power_dbuv_per_m"]) - 1e-9);
            for owner in list(&field["owners"]) {
                assert!(sum >= number(&owner["field_dbuv_per_m"]) - 1e-9);
            }
        }
    }
    let worst = &board["sum"]["worst"];
    let margin_db = number(&worst["limit_dbuv_per_m"]) - number(&worst["field_dbuv_per_m"]);
    assert!((number(&worst["margin_db"]) - margin_db).abs() < 1e-9);
    assert!(number(&worst["margin_db"]) <= margin(&nets[0]));
}

#[test]
fn a_group_of_lines_says_the_same_in_rank_and_in_check() {
    let folder = Folder::new();
    let board = board_with(
        &folder,
        "ONE;strong;48;outer;4;6;input;\nBUS;strong;48;outer;4;6;input;16\n",
    );
    let margin = |command: &str, net: &str| {
        let (board, _) = json(&[command, &board, "--net", net]);
        number(&board["nets"][0]["worst"]["margin_db"])
    };
    let bus_db = margin("rank", "BUS");
    assert!((bus_db - margin("check", "BUS")).abs() < 1e-9);
    assert!((margin("rank", "ONE") - bus_db - 20.0 * 16.0_f64.log10()).abs() < 1e-9);
}

#[test]
fn filters_choose_what_is_listed() {
    let folder = Folder::new();
    let board = board_with(
        &folder,
        "CAM_A;strong;48;outer;4;6;input;\nCAM_B;strong;24;outer;4;6;input;\nY;strong;48;outer;4;0,5;input;\n",
    );
    let names = |arguments: &[&str]| -> Vec<String> {
        let (board, _) = json(&[&["rank", &board], arguments].concat());
        let nets = list(&board["nets"]).iter();
        nets.map(|net| net["name"].as_str().unwrap().to_owned())
            .collect()
    };
    assert_eq!(names(&["--net", "CAM_*"]).len(), 2);
    assert_eq!(names(&["--net", "CAM_*", "--clock", "24 MHz"]), ["CAM_B"]);
    assert_eq!(names(&["--verdict", "likely-pass", "--net", "Y"]), ["Y"]);
    assert!(names(&["--layer", "core"]).is_empty());
    assert_eq!(names(&["--top", "1"]).len(), 1);
    for wrong in [["--top", "0"], ["--verdict", "perhaps"], ["--clock", "48"]] {
        assert!(
            run(&["rank", &board, wrong[0], wrong[1]])
                .ends(2)
                .stdout
                .is_empty()
        );
    }
}

#[test]
fn bad_rows_are_named_and_the_rest_is_ranked() {
    let folder = Folder::new();
    let board = board_with(
        &folder,
        "GOOD;strong;48;outer;4;6,5;input;\nBAD;strong;48;outer;4 ohm;6;input;\n;strong;48;outer;4;6;input;\n",
    );
    let run = run(&["rank", &board]).ends(2);
    assert!(
        run.stderr
            .contains("nets.csv:3:21: error: width of the trace is a resistance"),
        "{}",
        run.stderr
    );
    assert!(run.stdout.contains("1 net: "), "{}", run.stdout);
    assert!(run.stdout.contains("GOOD") && run.stdout.contains("BAD: width of the trace"));
    assert!(
        run.stdout
            .contains("nets.csv, row 4: the net has no `name`")
    );
    fs::remove_file(folder.path("nets.csv")).unwrap();
    let gone = super::run(&["rank", &board]).ends(2);
    assert!(
        gone.stderr
            .contains("cannot read the table `nets.csv`: there is no file"),
        "{}",
        gone.stderr
    );
}

#[test]
fn one_thread_and_two_write_the_same_bytes() {
    let folder = Folder::new();
    let with_threads = |threads: &str| {
        let path = |name: &str| folder.path(&format!("{threads}-{name}"));
        let (json, csv, plots) = (path("r.json"), path("r.csv"), path("plots"));
        let mut command = ringfield(&[
            "rank",
            WHOLE_BOARD,
            "--json",
            &json,
            "--csv",
            &csv,
            "--plot",
            &plots,
        ]);
        let run = run_command(command.env("RAYON_NUM_THREADS", threads)).ends(1);
        let mut files = vec![run.stdout.into_bytes()];
        for file in [json, csv]
            .map(PathBuf::from)
            .into_iter()
            .chain(paths_in(Path::new(&plots)))
        {
            files.push(fs::read(file).expect("it was written"));
        }
        files
    };
    let one = with_threads("1");
    assert_eq!(one.len(), 9);
    assert!(one == with_threads("2"));
    for file in &one[..3] {
        assert!(String::from_utf8_lossy(file).contains(NOTICE));
    }
    let names = |threads: &str| -> Vec<String> {
        let paths = paths_in(Path::new(&folder.path(&format!("{threads}-plots"))));
        paths
            .iter()
            .map(|p| p.file_name().unwrap().to_string_lossy().into_owned())
            .collect()
    };
    assert_eq!(
        names("1"),
        [
            "board-spectrum-10m.png",
            "board-spectrum-10m.svg",
            "board-spectrum-3m.png",
            "board-spectrum-3m.svg",
            "ranking.png",
            "ranking.svg",
        ]
    );
}

/// Ctrl-C, as the terminal sends it.
#[cfg(unix)]
#[test]
fn an_interrupted_ranking_leaves_what_is_finished_and_says_so() {
    use std::process::{Command, Stdio};
    use std::time::{Duration, Instant};
    let folder = Folder::new();
    let mut rows = String::new();
    for net in 0..20_000 {
        let _ = writeln!(
            rows,
            "N{net};strong;{};outer;4;{};input;",
            25 + net % 80,
            2 + net % 5
        );
    }
    let board = board_with(&folder, &rows);
    let csv = folder.path("ranking.csv");
    let child = Command::new(env!("CARGO_BIN_EXE_ringfield"))
        .args(["rank", &board, "--csv", &csv])
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .expect("the program starts");
    let started = Instant::now();
    std::thread::sleep(Duration::from_secs(4));
    let sent = Command::new("kill")
        .args(["-INT", &child.id().to_string()])
        .status();
    assert!(sent.expect("kill is there").success());
    let output = child.wait_with_output().expect("the program ends");
    assert_eq!(output.status.code(), Some(2));
    assert!(started.elapsed() < Duration::from_secs(60));
    let stdout = String::from_utf8_lossy(&output.stdout);
    let stderr = String::from_utf8_lossy(&output.stderr);
    // A very slow machine may not have come to the first nets.
    if stderr.contains("stopped before any net was finished") {
        return;
    }
    assert!(
        stdout.contains("PARTIAL: stopped after"),
        "{stdout}{stderr}"
    );
    let table = folder.read("ranking.csv");
    assert!(
        table.lines().nth(1).expect("a row").ends_with(",true"),
        "{table}"
    );
}
