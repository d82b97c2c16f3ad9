//! Input that cannot be used: exit code 2, one clear message, nothing half-written.

use super::*;
use ringfield::board::read_board;
use std::time::{Duration, Instant};

/// Loose, so that a busy machine does not fail it; what it must not be is minutes.
const AT_ONCE: Duration = Duration::from_secs(5);

/// A check that asks for every kind of file, all in one folder of its own.
fn check_all_into(folder: &Folder, board: &str, more: &[&str]) -> Run {
    let files = ["a.json", "a.csv", "a-wave.csv", "plots"].map(|name| folder.path(name));
    let [json, csv, waveform, plots] = &files;
    let arguments = [
        "check",
        board,
        "--json",
        json,
        "--csv",
        csv,
        "--waveform",
        waveform,
        "--plot",
        plots,
    ];
    run(&[&arguments, more].concat())
}

#[test]
fn a_board_without_a_usable_net_leaves_nothing_behind() {
    let gallery = paths_in(&Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/bad_input"));
    let mut refused = 0;
    for path in &gallery {
        let path = path.to_str().expect("a plain name");
        let text = fs::read_to_string(path).expect("the gallery is readable");
        let out = Folder::new();
        let run = if path.contains("/limit-") {
            check_all_into(&out, BRACKWATER, &["--limit", path])
        } else if read_board(&text, path)
            .board
            .is_none_or(|board| board.nets.is_empty())
        {
            check_all_into(&out, path, &[])
        } else {
            continue;
        };
        let run = run.ends(2);
        assert!(run.stdout.is_empty(), "{path}: {}", run.stdout);
        assert!(run.stderr.contains("error"), "{path}: {}", run.stderr);
        assert_eq!(out.names(), [""; 0], "{path}");
        refused += 1;
    }
    assert!(refused > 30, "{refused}");
}

/// The same mistakes as those of a single net: each in the only net of a board.
#[test]
fn every_mistake_in_the_only_net_leaves_nothing_behind() {
    for (sound, wrong) in [
        ("48 MHz", "48"),
        ("48 MHz", "48 mm"),
        ("48 MHz", "0 Hz"),
        ("48 MHz", "-48 MHz"),
        ("48 MHz", ".nan"),
        ("48 MHz", "900 MHz"),
        ("clock: 48 MHz", "clokc: 48 MHz"),
        (" clock: 48 MHz,", ""),
        ("driver: strong", "driver: weak"),
        ("layer: outer", "layer: outter"),
        ("width: 4 mil", "width: 4"),
        ("width: 4 mil", "width: -4 mil"),
        ("width: 4 mil", "width: 0 mil"),
        ("length: 6 in", "length: 0 in"),
        ("receiver: input", "receiver: inptu"),
        ("receiver: input", "resistor: 5 ohm"),
        ("0.8 ns", "0 ns"),
        ("0.8 ns", "inf ns"),
        ("3 ohm", "0 ohm"),
        ("3 ohm", "-3 ohm"),
        ("5 pF", "-5 pF"),
        ("permittivity: 4.3", "permittivity: 0.5"),
        ("height: 4 mil", "height: 0 mil"),
    ] {
        let board = BOARD.replace(sound, wrong);
        assert_ne!(board, BOARD, "{sound}");
        let folder = Folder::new();
        let file = folder.file("board.yaml", board);
        let run = check_all_into(&folder, &file, &[]).ends(2);
        assert!(run.stdout.is_empty(), "{wrong}");
        assert!(
            run.stderr.contains("error:") && run.stderr.contains("board.yaml:"),
            "{wrong}: {}",
            run.stderr
        );
        assert_eq!(folder.names(), ["board.yaml"], "{wrong}");
    }
}

#[test]
fn one_bad_net_does_not_lose_the_others() {
    let folder = Folder::new();
    let board = folder.file("board.yaml", [BOARD, BROKEN_NET].concat());
    let run = check_all_into(&folder, &board, &[]).ends(2);
    assert_eq!(run.rows().len(), 1);
    assert_eq!(run.rows()[0][0], "CLK");
    assert!(run.stdout.contains("BAD") && run.stdout.contains(NOTICE));
    // Its place in the file is named.
    let line = BOARD.lines().count() + 1;
    assert!(
        run.stderr.contains(&format!("board.yaml:{line}:")),
        "{}",
        run.stderr
    );
    let json: serde_json::Value = serde_json::from_str(&folder.read("a.json")).expect("JSON");
    assert_eq!(json["nets"][0]["name"], "CLK");
    assert_eq!(json["nets"][1], serde_json::Value::Null);
    assert_eq!(json["unusable"][0]["name"], "BAD");
    assert!(
        json["unusable"][0]["reason"]
            .as_str()
            .is_some_and(|reason| !reason.is_empty())
    );
    // Some nets are not all nets: the waveform goes to a file with the net's name.
    assert_eq!(
        folder.names(),
        ["a-wave-CLK.csv", "a.csv", "a.json", "board.yaml", "plots"]
    );
    assert!(run.stderr.contains("48"));
    // Asked for alone, the sound one is sound; the bad one is not.
    self::run(&["check", &board, "--net", "BAD"]).ends(2);
}

#[test]
fn a_limit_over_no_harmonic_is_refused() {
    let folder = Folder::new();
    let limit = folder.file(
        "low.yaml",
        "title: low\ndistance: 3 m\ndetector: peak\nbands:\n  - {from: 31 MHz, to: 32 MHz, limit: 40 dBuV/m}\n",
    );
    let run = check_all_into(
        &folder,
        BRACKWATER,
        &["--net", "CAM_PCLK", "--limit", &limit],
    )
    .ends(2);
    assert!(
        run.stdout.is_empty() && run.stderr.contains("no limit given covers any harmonic"),
        "{}",
        run.stderr
    );
    assert_eq!(folder.names(), ["low.yaml"]);
}

#[test]
fn a_place_that_cannot_be_written_is_refused_before_anything_is() {
    let folder = Folder::new();
    let file = folder.file("file", "as it was");
    let below_a_file = format!("{file}/below");
    let missing = folder.path("missing/x.json");
    let itself = folder.path(".");
    let same = folder.path("same");
    let mut places = vec![
        vec!["--json", missing.as_str()],
        vec!["--csv", &missing],
        vec!["--waveform", &missing],
        vec!["--json", &itself],
        vec!["--plot", &file],
        vec!["--plot", &below_a_file],
        vec!["--json", &same, "--csv", &same],
    ];
    // Nobody can write there, not even the superuser.
    if cfg!(target_os = "linux") {
        places.extend([
            vec!["--json", "/proc/x.json"],
            vec!["--plot", "/proc/plots"],
        ]);
    }
    for place in places {
        let good = folder.path("good.csv");
        let also = if place.contains(&"--csv") {
            vec![]
        } else {
            vec!["--csv", good.as_str()]
        };
        let arguments = [
            vec!["check", BRACKWATER, "--net", "XTAL_OUT"],
            place.clone(),
            also,
        ]
        .concat();
        let run = run(&arguments).ends(2);
        assert!(run.stdout.is_empty(), "{place:?}");
        assert!(
            run.stderr.starts_with("error: "),
            "{place:?}: {}",
            run.stderr
        );
        assert_eq!(folder.names(), ["file"], "{place:?}");
    }
    assert_eq!(folder.read("file"), "as it was");
}

#[test]
fn hostile_files_are_refused_at_once() {
    let folder = Folder::new();
    let large = folder.file("large.yaml", "# the buoy\n".repeat(50_000_000 / 11));
    let deep = folder.file("deep.yaml", format!("nets: {}", "[".repeat(40_000)));
    let many_maps = folder.file("maps.yaml", format!("nets: {}", "{a: ".repeat(40_000)));
    let binary = folder.file("binary.yaml", [0xff, 0xfe, 0x00, 0x80]);
    for path in [&large, &deep, &many_maps, &binary] {
        for arguments in [
            &["check", path.as_str()][..],
            &["check", BRACKWATER, "--limit", path.as_str()],
            &["limits", path.as_str()],
        ] {
            let start = Instant::now();
            let run = run(arguments).ends(2);
            assert!(
                start.elapsed() < AT_ONCE,
                "{arguments:?}: {:?}",
                start.elapsed()
            );
            assert!(
                run.stdout.is_empty() && run.stderr.contains("error"),
                "{arguments:?}"
            );
            assert!(
                run.stderr.len() < 2000,
                "{arguments:?}: {} bytes of message",
                run.stderr.len()
            );
        }
    }
}
