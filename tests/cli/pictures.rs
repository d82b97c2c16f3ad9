//! The pictures on request: of the board as an antenna, from above, of scans, and what spectra are made of.

use super::files::{assert_drawn, assert_well_formed};
use super::*;

const HARNESS: &str = "examples/brackwater-harness.yaml";

#[test]
fn each_picture_asked_for_is_written_whole() {
    let folder = Folder::new();
    let plots = folder.path("plots");
    let run = run(&[
        "check",
        HARNESS,
        "--net",
        "MIXER_CLK_R",
        "--net",
        "MIXER_CLK",
        "--max-frequency",
        "300 MHz",
        "--distance",
        "3m",
        "--plot",
        &plots,
        "--plot-antenna",
        "--plot-plan",
        "--plot-scan",
        "--plot-parts",
    ]);
    assert!(matches!(run.code, Some(0 | 1)), "{}", run.stderr);
    assert_eq!(run.stderr, "");
    let expected: [(&str, &[&str]); 5] = [
        (
            "board-antenna",
            &[
                "Frequency (MHz)",
                "Field of the loop (dBµV/m)",
                "MHz, cables",
            ],
        ),
        (
            "board-plan",
            &[
                "length (mm)",
                "width (mm)",
                "MIXER_CLK_R ",
                "MIXER_CLK ",
                "sensor harness",
            ],
        ),
        (
            "MIXER_CLK_R-scan",
            &[
                "Antenna height over the floor (m)",
                "axis (°)",
                "Field strength (dBµV/m)",
                "strongest place",
            ],
        ),
        ("MIXER_CLK-scan", &["strongest place"]),
        (
            "MIXER_CLK-spectrum-3m",
            &[
                "of it by loops",
                "by charged traces",
                "by cables",
                "Frequency (MHz)",
            ],
        ),
    ];
    for (name, sentences) in expected {
        let path = |ending: &str| format!("plots/{name}.{ending}");
        let png = fs::read(folder.path(&path("png"))).expect("a picture");
        assert!(png.starts_with(b"\x89PNG\r\n\x1a\n"), "{name}");
        assert_drawn(Path::new(&folder.path(&path("png"))));
        let svg = folder.read(&path("svg"));
        assert!(svg.starts_with("<svg "), "{name}");
        assert_well_formed(&svg, name);
        for words in sentences.iter().chain([&NOTICE]) {
            assert!(svg.contains(words), "{name}: {words}");
        }
    }
    assert_eq!(paths_in(Path::new(&plots)).len(), 2 * (2 + 2 * 3));
}

#[test]
fn without_a_folder_they_are_refused() {
    for flag in [
        "--plot-antenna",
        "--plot-plan",
        "--plot-scan",
        "--plot-parts",
    ] {
        let run = run(&["check", HARNESS, flag]).ends(2);
        assert!(run.stderr.contains("--plot <DIR>"), "{}", run.stderr);
        assert_eq!(run.stdout, "");
    }
}

/// A board without a plane, and a site without a turntable: the answer is given, and a sentence a picture says why.
#[test]
fn where_there_is_no_picture_a_sentence_says_why() {
    let folder = Folder::new();
    let plots = folder.path("plots");
    let board = folder.file(
        "board.yaml",
        BOARD.replace("plane: {length: 160 mm, width: 100 mm}\n", ""),
    );
    let flags = [
        "--plot",
        &plots,
        "--plot-antenna",
        "--plot-plan",
        "--plot-scan",
    ];
    let bare = run(&[&["check", &board], &flags[..]].concat());
    let notes: Vec<&str> = bare.stderr.lines().collect();
    assert_eq!(notes.len(), 3, "{notes:?}");
    for note in notes {
        assert!(
            note.starts_with("note: ") && note.contains("no `plane`"),
            "{note}"
        );
    }
    assert!(bare.stdout.contains("CLK"));
    assert_eq!(paths_in(Path::new(&plots)).len(), 2 * 3);

    let site = ["--site", "free-space", "--plot", &plots, "--plot-scan"];
    let free = run(&[
        &[
            "check",
            HARNESS,
            "--net",
            "MIXER_CLK_R",
            "--max-frequency",
            "200 MHz",
        ],
        &site[..],
    ]
    .concat());
    assert!(
        free.stderr
            .starts_with("note: no scan is shown: in free space"),
        "{}",
        free.stderr
    );
}
