//! Tables of nets as spreadsheets export them: good ones, which all say the same, and what is said about bad ones.

use std::fmt::Write;
use std::path::{Path, PathBuf};

use ringfield::board::{
    Along, Board, Phase, Reading, TableText, read_board, read_board_and_tables,
};

const PARTS: &str = "\
title: Brackwater buoy controller
stackup:
  outer: {microstrip: {height: 4 mil, permittivity: 4.3}}
drivers:
  strong: {swing: 3.3 V, resistance: 3 ohm, rise: 0.8 ns}
receivers:
  input: {capacitance: 5 pF}
";

/// The three nets of every good table, as a board file would say them.
const SAME_IN_YAML: &str = "\
nets:
  - name: CAM_PCLK
    driver: strong
    clock: 48 MHz
    path: [trace: {layer: outer, width: 4 mil, length: 6.5 in}, receiver: input]
  - name: CAM_D
    driver: strong
    clock: 24 MHz
    count: 16
    clock_source: camera
    edge_distance: 12.5 mm
    along: width
    path: [series: 33 ohm, trace: {layer: outer, width: 4 mil, length: 5.25 in}, receiver: input]
  - name: SONAR_CLK, port
    driver: strong
    clock: 12.5 MHz
    duty: 40 %
    clock_source: sonar
    phase: independent
    path:
      - trace: {layer: outer, width: 4 mil, length: 3 in}
      - receiver: input
      - shunt: {resistance: 65 ohm, capacitance: 100 pF, to: 1.65 V}
";

fn reading(nets: &str, table: impl Fn(&str) -> Result<String, String>) -> Reading {
    let handed_out = |name: &str| {
        let text = table(name)?;
        Ok(TableText {
            name: name.into(),
            text,
        })
    };
    read_board_and_tables(&format!("{PARTS}{nets}"), "board.yaml", &handed_out)
}

fn text_of(path: &Path) -> String {
    std::fs::read_to_string(path).unwrap_or_else(|error| panic!("{}: {error}", path.display()))
}

fn sound(reading: Reading) -> Board {
    assert!(reading.diagnostics.is_empty(), "{:?}", reading.diagnostics);
    reading.board.expect("a board")
}

#[test]
fn every_good_export_says_the_same_as_a_board_file() {
    let expected = sound(read_board(&format!("{PARTS}{SAME_IN_YAML}"), "board.yaml")).nets;
    assert_eq!(expected[1].group.count, 16);
    assert_eq!(expected[2].group.phase, Phase::Independent);
    assert_eq!(expected[1].along, Along::Width);
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/tables/good");
    let files: Vec<PathBuf> = std::fs::read_dir(folder)
        .expect("the gallery")
        .map(|entry| entry.expect("an entry").path())
        .collect();
    assert!(files.len() >= 5);
    for file in files {
        let board = sound(reading("nets: {table: nets.csv}", |_| Ok(text_of(&file))));
        for (net, expected) in board.nets.iter().zip(&expected) {
            assert_eq!(net, expected, "{}", file.display());
        }
        assert_eq!(board.nets.len(), expected.len());
    }
}

#[test]
fn every_bad_table_is_explained_and_the_rest_of_it_read() {
    insta::glob!("tables/bad/*.csv", |path| {
        let file = path.file_name().expect("a file").to_string_lossy();
        let reading = reading(&format!("nets: {{table: {file}}}"), |_| Ok(text_of(path)));
        let mut said = String::new();
        for diagnostic in &reading.diagnostics {
            let _ = writeln!(said, "{}", diagnostic.render());
        }
        for net in &reading.unusable {
            let _ = writeln!(said, "unusable: {}: {}", net.name, net.reason);
        }
        let usable = reading.board.map_or("none".to_owned(), |board| {
            let names: Vec<String> = board.nets.into_iter().map(|net| net.name).collect();
            names.join(", ")
        });
        let _ = writeln!(said, "usable: {usable}");
        insta::assert_snapshot!(said);
    });
}

const ROW: &str =
    "net,driver,clock,layer,width,length\nFROM_TABLE,strong,48 MHz,outer,4 mil,6 in\n";
const YAML_NET: &str = "{name: FROM_YAML, driver: strong, clock: 48 MHz, path: [trace: {layer: outer, width: 4 mil, length: 1 in}, receiver: input]}";

fn names(reading: &Reading) -> Vec<&str> {
    let nets = reading.board.iter().flat_map(|board| &board.nets);
    nets.map(|net| net.name.as_str()).collect()
}

#[test]
fn tables_and_nets_mix_in_their_order() {
    let mixed = format!("nets:\n  - table: a.csv\n  - {YAML_NET}\n  - table: b.csv\n");
    let both = reading(&mixed, |name| Ok(ROW.replace("FROM", name)));
    assert_eq!(names(&both), ["a.csv_TABLE", "FROM_YAML", "b.csv_TABLE"]);
    // One name in two places is nobody's.
    let twice = reading(&mixed, |_| Ok(ROW.into()));
    assert_eq!(names(&twice), ["FROM_YAML"]);
    assert_eq!(twice.unusable.len(), 2);
    assert!(twice.diagnostics.iter().any(|diagnostic| {
        let said = diagnostic.render();
        said.starts_with("b.csv:2:1: error: more than one net is called `FROM_TABLE`")
    }));
}

#[test]
fn a_table_that_cannot_be_had_costs_its_own_nets_alone() {
    let mixed = format!("nets:\n  - table: gone.csv\n  - {YAML_NET}\n");
    let rest = reading(&mixed, |_| Err("there is no file".into()));
    assert_eq!(names(&rest), ["FROM_YAML"]);
    assert_eq!(rest.unusable[0].name, "all nets of `gone.csv`");
    let said = rest.diagnostics[0].render();
    assert!(
        said.contains("cannot read the table `gone.csv`: there is no file"),
        "{said}"
    );
    let alone = reading(
        "nets: {table: gone.csv}",
        |_| Err("there is no file".into()),
    );
    assert!(alone.board.is_none());
}

/// Whatever single character is cut off, lost or put in, the reader has an answer and does not panic.
#[test]
fn no_slip_of_the_keyboard_is_a_panic() {
    let text = "net;driver;clock [MHz];layer;width;length\n\"A\"\"µ\";strong;48;outer;4 mil;6,5 in\r\nB;strong;48;outer;4 mil;6 in\n";
    for (at, c) in text.char_indices() {
        let (before, after) = (&text[..at], &text[at + c.len_utf8()..]);
        for slip in ["", "\"", ";", ",", "\n", "\r", "\t", "\0", "[", "]", "µ"] {
            let slipped = format!("{before}{slip}{after}");
            reading("nets: {table: a.csv}", |_| Ok(slipped.clone()));
            reading("nets: {table: a.csv}", |_| Ok(format!("{before}{slip}")));
        }
    }
}

#[test]
fn ten_thousand_bad_rows_take_no_longer_than_the_first_few() {
    let row = "N,x,48,outer,4,6\n";
    let text = format!(
        "net,driver,clock,layer,width,length\n{}",
        row.repeat(10_000)
    );
    let start = std::time::Instant::now();
    let reading = reading("nets: {table: a.csv}", |_| Ok(text.clone()));
    assert_eq!(reading.unusable.len(), 10_000);
    assert!(start.elapsed() < std::time::Duration::from_secs(20));
}
