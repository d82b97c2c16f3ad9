//! What the project ships and says is what the program does.

use super::*;

#[test]
fn every_shipped_example_runs() {
    let examples = paths_in(&Path::new(env!("CARGO_MANIFEST_DIR")).join("examples"));
    let boards: Vec<&PathBuf> = examples
        .iter()
        .filter(|path| path.extension().is_some_and(|ending| ending == "yaml"))
        .collect();
    assert!(!boards.is_empty());
    for board in boards {
        let run = run(&["check", board.to_str().expect("a plain name")]);
        assert!(
            matches!(run.code, Some(0 | 1)),
            "{}: {}",
            board.display(),
            run.stderr
        );
        assert!(
            run.stderr.is_empty() && run.stdout.contains(NOTICE),
            "{}",
            board.display()
        );
    }
}

/// Every limit file that is shipped can be read, and laid against the example.
#[test]
fn every_shipped_limit_is_read() {
    for path in paths_in(&Path::new(env!("CARGO_MANIFEST_DIR")).join("limits")) {
        let path = path.to_str().expect("a plain name");
        run(&["limits", path]).ends(0);
        let run = run(&["check", BRACKWATER, "--net", "CAM_MCLK", "--limit", path]);
        assert!(matches!(run.code, Some(0 | 1)), "{path}: {}", run.stderr);
    }
}

/// The README's first listing is the table of the example, row by row: names and places as they are, numbers
/// within 0.1, chances within 1 %.
#[test]
fn the_readme_shows_what_the_example_gives() {
    let readme = include_str!("../../README.md");
    let listing = readme
        .split("```text\n")
        .nth(1)
        .expect("the README shows the table");
    let (shown, given) = (rows(listing), run(&["check", BRACKWATER]).rows());
    assert!(!shown.is_empty());
    assert_eq!(shown.len(), given.len());
    let mut wrong = Vec::new();
    for (shown, given) in shown.iter().zip(&given) {
        // net, verdict, margin, chance, frequency, harmonic, field, limit, distance, limit line
        let same = [0, 1, 4, 5, 8, 9]
            .iter()
            .all(|&cell| shown[cell] == given[cell]);
        let close = [(2, 0.1), (3, 1.0), (6, 0.1), (7, 0.1)]
            .iter()
            .all(|&(cell, within)| {
                (number(&shown[cell]) - number(&given[cell])).abs() < within + 1e-6
            });
        if !same || !close {
            wrong.push(format!("shown {shown:?}\ngiven {given:?}"));
        }
    }
    assert!(
        wrong.is_empty(),
        "the README's table is out of date:\n{}",
        wrong.join("\n")
    );
}

/// The number of a cell such as `-5.4`, `82 %` or `<1 %`.
fn number(cell: &str) -> f64 {
    let digits = cell.trim_matches([' ', '%', '<', '>']);
    digits.parse().unwrap_or_else(|_| panic!("{cell}"))
}
