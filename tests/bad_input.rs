//! Files that are wrong in one way each, and what is said about them; read the snapshots as a user would.

use std::fmt::Write;
use std::time::{Duration, Instant};

use ringfield::board::read_board;
use ringfield::limit::read_limit;
use ringfield::text::Diagnostic;

/// Everything the reader of a file says about it.
fn verdict(text: &str, file_name: &str) -> String {
    let lines = |diagnostics: &[Diagnostic]| -> String {
        diagnostics
            .iter()
            .map(|diagnostic| diagnostic.render() + "\n")
            .collect()
    };
    if file_name.starts_with("limit") {
        return match read_limit(text, file_name) {
            Ok(limit) => format!("limit {}\n", limit.title),
            Err(diagnostics) => lines(&diagnostics),
        };
    }
    let reading = read_board(text, file_name);
    let mut said = lines(&reading.diagnostics);
    for net in reading.unusable {
        let _ = writeln!(said, "unusable: {}: {}", net.name, net.reason);
    }
    let usable = reading
        .board
        .map(|board| board.nets.into_iter().map(|net| net.name).collect());
    let usable = usable.map_or("none".to_owned(), |nets: Vec<String>| nets.join(", "));
    let _ = writeln!(said, "usable: {usable}");
    said
}

#[test]
fn every_wrong_file_is_explained() {
    insta::glob!("bad_input/*.yaml", |path| {
        let text = std::fs::read_to_string(path).expect("the gallery is readable");
        let name = path.file_name().expect("a file").to_string_lossy();
        insta::assert_snapshot!(verdict(&text, &name));
    });
}

#[test]
fn hostile_files_are_refused_at_once() {
    let start = Instant::now();
    let deep = verdict(&format!("nets: {}", "[".repeat(40_000)), "board.yaml");
    assert!(
        deep.contains("board.yaml:1:71: error: brackets are nested too deeply"),
        "{deep}"
    );
    assert!(start.elapsed() < Duration::from_secs(1));
    let large = verdict(&"# the buoy\n".repeat(5 << 20), "board.yaml");
    assert!(
        large.contains("board.yaml: error: the file is too large"),
        "{large}"
    );
}

#[test]
fn a_thousand_mistakes_take_no_longer_than_the_first_few() {
    let net = "  - {name: N, driver: x, clock: 1, path: [{receiver: y}]}\n";
    let start = Instant::now();
    let said = verdict(&format!("nets:\n{}", net.repeat(10_000)), "board.yaml");
    assert!(said.contains("unusable: N: more than one net is called `N`"));
    assert!(
        start.elapsed() < Duration::from_secs(30),
        "{:?}",
        start.elapsed()
    );
}

/// Whatever single character is cut off, lost or replaced, the reader has an answer and does not panic.
#[test]
fn no_slip_of_the_keyboard_is_a_panic() {
    let text = include_str!("bad_input/board-points-off-the-plane.yaml");
    for (at, c) in text.char_indices() {
        let (before, after) = (&text[..at], &text[at + c.len_utf8()..]);
        read_board(before, "board.yaml");
        for slip in [
            "", "[", "}", ":", ",", "\"", "-", "#", "&", "*", "!", "\n", "\t", "\0", "µ",
        ] {
            read_board(&format!("{before}{slip}{after}"), "board.yaml");
        }
    }
}
