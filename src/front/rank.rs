//! `ringfield rank`: which nets of a whole board to see to first.

use std::path::{Path, PathBuf};

use clap::{Args, ValueEnum};
use ringfield::board::Board;
use ringfield::show::{RankReport, rank_json, rank_table, ranking_csv};
use ringfield::study::{CheckSetup, Filter, Verdict, rank};

use super::options;
use super::output::Output;
use super::progress::Progress;
use super::question::{self, Against};
use super::{Ending, Refusal, interrupt, output, pictures};

/// The board, what it is laid against, which nets to list, and where the answers go.
#[derive(Debug, Args)]
pub struct Options {
    /// The board file
    #[arg(value_name = "BOARD")]
    board: PathBuf,

    /// How many nets to list, the worst first; `all` lists every one
    #[arg(long, value_name = "NUMBER", default_value = "20", value_parser = top)]
    top: Top,

    /// List only nets of this name, in which `*` stands for any text and `?` for any character; may be repeated
    #[arg(long, value_name = "PATTERN")]
    net: Vec<String>,

    /// List only nets of this clock; may be repeated
    #[arg(long, value_name = "FREQUENCY", value_parser = options::frequency_of_clock)]
    clock: Vec<f64>,

    /// List only nets of this clock source; may be repeated
    #[arg(long, value_name = "NAME")]
    clock_source: Vec<String>,

    /// List only nets that run on this layer; may be repeated
    #[arg(long, value_name = "NAME")]
    layer: Vec<String>,

    /// List only nets with this verdict; may be repeated
    #[arg(long, value_enum, value_name = "VERDICT")]
    verdict: Vec<VerdictChoice>,

    #[command(flatten)]
    against: Against,

    /// Draws of the tolerances of each net that has some; 0 is none
    #[arg(long, value_name = "NUMBER", default_value_t = 256, value_parser = options::draws)]
    draws: usize,

    /// Write the ranking and the sum as JSON; `-` prints it in place of the table
    #[arg(long, value_name = "FILE")]
    json: Option<PathBuf>,

    /// Write the ranking as CSV
    #[arg(long, value_name = "FILE")]
    csv: Option<PathBuf>,

    /// Write pictures of the ranking and of the board's spectrum (PNG and SVG) to this folder
    #[arg(long, value_name = "DIR")]
    plot: Option<PathBuf>,
}

/// How many nets to list; `None` is all.
#[derive(Debug, Clone, Copy)]
struct Top(Option<usize>);

fn top(text: &str) -> Result<Top, String> {
    match text.trim() {
        "all" => Ok(Top(None)),
        number => match number.parse() {
            Ok(number) if number > 0 => Ok(Top(Some(number))),
            _ => Err("a number of nets from 1 on, or `all`, was expected".into()),
        },
    }
}

/// A verdict as written on the command line.
#[derive(Debug, Clone, Copy, ValueEnum)]
enum VerdictChoice {
    LikelyFail,
    Marginal,
    LikelyPass,
    NotJudged,
}

impl From<VerdictChoice> for Verdict {
    fn from(choice: VerdictChoice) -> Self {
        match choice {
            VerdictChoice::LikelyFail => Self::LikelyFail,
            VerdictChoice::Marginal => Self::Marginal,
            VerdictChoice::LikelyPass => Self::LikelyPass,
            VerdictChoice::NotJudged => Self::NotJudged,
        }
    }
}

/// Ranks a board and hands out the answers. Ctrl-C leaves what is finished by then.
pub fn run(options: &Options) -> Result<Ending, Refusal> {
    let stop = interrupt::stop_flag();
    let limits = options.against.limits()?;
    let reading = question::read(&options.board)?;
    let has_errors = question::has_errors(&reading);
    let board = reading.board.ok_or_else(|| {
        let file = options.board.display();
        Refusal::new(format!("there is no usable net in `{file}`"))
    })?;
    let (json, csv) = (options.json.as_deref(), options.csv.as_deref());
    output::check_places(&[json, csv], options.plot.as_deref())?;

    let setup = options.against.setup(limits, &board)?;
    let ranking = rank(
        &board,
        &setup,
        &filter(options),
        options.top.0,
        (reading.varied.as_ref(), options.draws),
        &Progress::until(stop),
    );
    if ranking.done == 0 {
        return Err(Refusal::new("stopped before any net was finished"));
    }
    let report = report(&board, setup, ranking, reading.unusable);
    output::write(outputs(options, &report))?;
    output::print(&answer(options, &report))?;
    Ok(if has_errors || report.ranking.is_partial() {
        Ending::Incomplete
    } else if report.ranking.tally.likely_fail > 0 {
        Ending::SomeLikelyFail
    } else {
        Ending::NoneLikelyFails
    })
}

fn filter(options: &Options) -> Filter {
    Filter {
        names: options.net.clone(),
        clocks_hz: options.clock.clone(),
        clock_sources: options.clock_source.clone(),
        layers: options.layer.clone(),
        verdicts: options
            .verdict
            .iter()
            .map(|&choice| choice.into())
            .collect(),
    }
}

fn report(
    board: &Board,
    setup: CheckSetup,
    ranking: ringfield::study::Ranking,
    unusable: Vec<ringfield::board::UnusableNet>,
) -> RankReport {
    RankReport {
        board: board.title.clone(),
        site: setup.site,
        limits: question::limits_everywhere(&setup),
        remarks: question::remarks(board, &setup),
        distances_m: setup.distances_m,
        ranking,
        unusable,
    }
}

fn is_stdout(path: &Path) -> bool {
    path == Path::new("-")
}

/// Every file asked for, complete.
fn outputs(options: &Options, report: &RankReport) -> Vec<Output> {
    let mut outputs = Vec::new();
    let mut push = |path: &Path, contents: String| {
        outputs.push(Output {
            path: path.to_path_buf(),
            contents: contents.into_bytes(),
        });
    };
    if let Some(path) = options.json.as_deref().filter(|path| !is_stdout(path)) {
        push(path, rank_json(report));
    }
    if let Some(path) = &options.csv {
        push(path, ranking_csv(report));
    }
    if let Some(folder) = &options.plot {
        outputs.extend(pictures::of_ranking(report, folder));
    }
    outputs
}

/// What goes to standard output.
fn answer(options: &Options, report: &RankReport) -> String {
    if options.json.as_deref().is_some_and(is_stdout) {
        rank_json(report)
    } else {
        rank_table(report)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_number_of_nets_or_all() {
        assert_eq!(top("7").unwrap().0, Some(7));
        assert_eq!(top("all").unwrap().0, None);
        assert!(top("0").is_err() && top("-1").is_err() && top("some").is_err());
    }
}
