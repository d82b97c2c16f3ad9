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

/// Every listing of the README is what the command before it prints: each of its lines stands there, in the same order,
/// the words as they are, numbers within 0.1 or 2 %. Dots stand for what is left out.
#[test]
fn every_listing_of_the_readme_is_what_its_command_prints() {
    const COMMAND: &str = "    cargo run --release -- ";
    let readme = include_str!("../../README.md");
    let mut listings = 0;
    let mut command = "";
    let mut wrong = Vec::new();
    let mut lines = readme.lines();
    while let Some(line) = lines.next() {
        command = line.strip_prefix(COMMAND).unwrap_or(command);
        if line != "```text" {
            continue;
        }
        let listing = lines.by_ref().take_while(|line| *line != "```");
        let shown: Vec<&str> = listing
            .filter(|line| !line.is_empty() && *line != "...")
            .collect();
        // A message about a file that is not shipped.
        if shown[0].contains("error:") {
            continue;
        }
        listings += 1;
        let folder = Folder::new();
        let words = command.split_whitespace().map(|word| match word {
            "out" | "remedied.yaml" => folder.path(word),
            word => word.to_owned(),
        });
        let words: Vec<String> = words.collect();
        let given = run(&words.iter().map(String::as_str).collect::<Vec<_>>()).stdout;
        let mut given = given.lines();
        for shown in shown {
            if !given.any(|given| is_alike(shown, given)) {
                wrong.push(format!("{command}: {shown}"));
                break;
            }
        }
    }
    assert!(listings >= 6, "{listings}");
    assert!(wrong.is_empty(), "out of date:\n{}", wrong.join("\n"));
}

/// Whether two lines have the same words, and numbers that are close.
fn is_alike(a: &str, b: &str) -> bool {
    let words = |line: &str| -> Vec<String> {
        let parts = line.split(|c: char| c.is_whitespace() || ",;:()".contains(c));
        let parts = parts.filter(|part| !part.is_empty());
        parts.map(str::to_owned).collect()
    };
    let (a, b) = (words(a), words(b));
    let close = |a: &str, b: &str| match (a.parse::<f64>(), b.parse::<f64>()) {
        (Ok(a), Ok(b)) => (a - b).abs() <= 0.1 + 1e-9 || (a - b).abs() <= 0.02 * b.abs(),
        _ => a == b,
    };
    a.len() == b.len() && a.iter().zip(&b).all(|(a, b)| close(a, b))
}

/// The number of a cell such as `-5.4`, `82 %` or `<1 %`.
fn number(cell: &str) -> f64 {
    let digits = cell.trim_matches([' ', '%', '<', '>']);
    digits.parse().unwrap_or_else(|_| panic!("{cell}"))
}
