//! `check --draws`: what tolerances make of the margins.

use super::{BOARD, Folder, ringfield, run, run_command};

fn tolerant() -> String {
    BOARD
        .replace("resistance: 3 ohm", "resistance: 3 ohm +/- 1 ohm")
        .replace("rise: 0.8 ns", "rise: 0.8 ns ± 25 % normal")
        .replace("plane: {length: 160 mm, width: 100 mm}\n", "")
}

#[test]
fn one_thread_and_two_write_the_same_bytes() {
    let folder = Folder::new();
    let board = folder.file("board.yaml", tolerant());
    let answer = |threads: &str, arguments: &[&str]| {
        let all = [&["check", &board, "--draws", "64"], arguments].concat();
        run_command(ringfield(&all).env("RAYON_NUM_THREADS", threads)).stdout
    };
    for arguments in [&[][..], &["--json", "-"]] {
        let one = answer("1", arguments);
        assert!(one.contains("strong rise"), "{one}");
        assert_eq!(one, answer("2", arguments));
    }
}

#[test]
fn the_json_says_which_tolerance_carries_the_spread() {
    let folder = Folder::new();
    let board = folder.file("board.yaml", tolerant());
    let answer = run(&["check", &board, "--draws", "64", "--json", "-"]).stdout;
    let json: serde_json::Value = serde_json::from_str(&answer).expect("JSON");
    let spread = &json["nets"][0]["spread"];
    assert_eq!(spread["draws"], 64);
    assert_eq!(spread["failed_draws"], 0);
    let low = spread["margin_5_percent_db"].as_f64().expect("a number");
    let high = spread["margin_95_percent_db"].as_f64().expect("a number");
    assert!(low < high && high - low < 10.0, "{spread}");
    let tolerances = spread["tolerances"].as_array().expect("a list");
    let shares: f64 = tolerances.iter().filter_map(|t| t["share"].as_f64()).sum();
    let unexplained = spread["unexplained_share"].as_f64().expect("a number");
    assert!((shares + unexplained - 1.0).abs() < 1e-9, "{spread}");
    assert_eq!(tolerances.len(), 2);
}

#[test]
fn without_draws_the_answer_is_nominal_and_says_so() {
    let folder = Folder::new();
    let board = folder.file("board.yaml", tolerant());
    let answer = run(&["check", &board]).stdout;
    assert!(answer.contains("`--draws 256` tells"), "{answer}");
    let json = run(&["check", &board, "--json", "-"]).stdout;
    assert!(!json.contains("\"spread\""));
    let exact = folder.file(
        "exact.yaml",
        BOARD.replace("plane: {length: 160 mm, width: 100 mm}\n", ""),
    );
    assert_eq!(
        run(&["check", &exact]).rows(),
        run(&["check", &board]).rows()
    );
    let answer = run(&["check", &exact, "--draws", "64"]).stdout;
    assert!(answer.contains("states no tolerances"), "{answer}");
}

#[test]
fn a_number_of_draws_has_its_range() {
    for draws in ["3", "25.5", "many", "100000"] {
        let run = run(&["check", "board.yaml", "--draws", draws]).ends(2);
        assert!(run.stderr.contains("from 16 to 65536"), "{}", run.stderr);
    }
}
