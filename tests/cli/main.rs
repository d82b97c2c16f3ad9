//! The program as its user meets it: arguments in; exit code, standard output, messages and files out.

mod answers;
mod documents;
mod draws;
mod files;
mod pictures;
mod rank;
mod readings;
mod refusals;

use assert_cmd::Command;
use std::fs;
use std::path::{Path, PathBuf};
use tempfile::TempDir;

/// Stands on every table, picture and file.
const NOTICE: &str = "pre-compliance estimate, not a compliance test";
/// What is said of a board whose cables are not in its figures: the one place that knows these words.
const CABLES_LEFT_OUT: &str = "Cables are not in the figures";
const BRACKWATER: &str = "examples/brackwater.yaml";

/// A board of one net, to be written with other values.
const BOARD: &str = "\
title: test buoy
stackup:
  outer: {microstrip: {height: 4 mil, permittivity: 4.3, loss_tangent: 0.02, copper: 35 um}}
drivers:
  strong: {swing: 3.3 V, resistance: 3 ohm, rise: 0.8 ns}
receivers:
  input: {capacitance: 5 pF}
plane: {length: 160 mm, width: 100 mm}
cables: []
nets:
  - {name: CLK, driver: strong, clock: 48 MHz, path: [{trace: {layer: outer, width: 4 mil, length: 6 in}}, {receiver: input}]}
";
/// Another net of that board, whose clock has no unit.
const BROKEN_NET: &str = "  - {name: BAD, driver: strong, clock: 48, path: [{receiver: input}]}\n";

/// The program in the project's folder, standard output and error piped.
fn ringfield(arguments: &[&str]) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_ringfield"));
    command
        .current_dir(env!("CARGO_MANIFEST_DIR"))
        .args(arguments);
    for variable in ["NO_COLOR", "CLICOLOR", "CLICOLOR_FORCE"] {
        command.env_remove(variable);
    }
    command
}

/// How a run ended and what it said.
struct Run {
    code: Option<i32>,
    stdout: String,
    stderr: String,
}

fn run(arguments: &[&str]) -> Run {
    run_command(&mut ringfield(arguments))
}

fn run_command(command: &mut Command) -> Run {
    let output = command.output().expect("the program starts");
    let text = |bytes| String::from_utf8(bytes).expect("the program speaks UTF-8");
    let run = Run {
        code: output.status.code(),
        stdout: text(output.stdout),
        stderr: text(output.stderr),
    };
    assert!(!run.stderr.contains("panicked"), "{}", run.stderr);
    run
}

impl Run {
    /// The exit code has to be this.
    fn ends(self, code: i32) -> Self {
        assert_eq!(self.code, Some(code), "{}\n{}", self.stdout, self.stderr);
        self
    }

    /// The rows of the first table as its cells, without its header.
    fn rows(&self) -> Vec<Vec<String>> {
        rows(&self.stdout)
    }
}

/// The rows of the first table in what `check` prints: cells stand two blanks apart.
fn rows(text: &str) -> Vec<Vec<String>> {
    text.lines()
        .skip_while(|line| !line.starts_with("net "))
        .skip(2)
        .take_while(|line| !line.is_empty())
        .map(|line| {
            let cells = line.split("  ").map(str::trim);
            cells
                .filter(|cell| !cell.is_empty())
                .map(str::to_owned)
                .collect()
        })
        .collect()
}

/// A folder that vanishes at the end of its test.
struct Folder(TempDir);

impl Folder {
    fn new() -> Self {
        Self(tempfile::tempdir().expect("a temporary folder"))
    }

    /// A path in it, as an argument.
    fn path(&self, name: &str) -> String {
        let path = self.0.path().join(name);
        path.to_str()
            .expect("temporary folders have plain names")
            .to_owned()
    }

    /// A new file in it.
    fn file(&self, name: &str, contents: impl AsRef<[u8]>) -> String {
        fs::write(self.path(name), contents).expect("a temporary folder can be written");
        self.path(name)
    }

    fn read(&self, name: &str) -> String {
        fs::read_to_string(self.path(name)).unwrap_or_else(|error| panic!("{name}: {error}"))
    }

    /// The names of what it holds, in order.
    fn names(&self) -> Vec<String> {
        let mut names: Vec<String> = paths_in(self.0.path())
            .iter()
            .filter_map(|path| path.file_name())
            .map(|name| name.to_string_lossy().into_owned())
            .collect();
        names.sort();
        names
    }
}

fn paths_in(folder: &Path) -> Vec<PathBuf> {
    let entries =
        fs::read_dir(folder).unwrap_or_else(|error| panic!("{}: {error}", folder.display()));
    let mut paths: Vec<PathBuf> = entries
        .map(|entry| entry.expect("an entry").path())
        .collect();
    paths.sort();
    paths
}
