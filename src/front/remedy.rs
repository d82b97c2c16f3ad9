//! `ringfield remedy`: what to solder in, for every net that does not likely pass.

use std::path::{Path, PathBuf};

use clap::Args;
use rayon::prelude::*;
use ringfield::board::{Net, rewrite_board};
use ringfield::show::{
    self, CheckReport, RemedyReport, remedy_csv, remedy_json, remedy_table,
    variants_spectrum_picture,
};
use ringfield::study::compare::{Bench, comparison};
use ringfield::study::remedy::{Goal, Outcome, remedy};
use ringfield::study::{CheckSetup, NOTICE};

use super::output::{self, Output, check_places};
use super::progress::Progress;
use super::question::{Asked, Question};
use super::{Ending, Refusal, input, options};

/// The board, what is to be reached, and where the answers go.
#[derive(Debug, Args)]
pub struct Options {
    #[command(flatten)]
    question: Question,

    /// Margin to reach, in dB [default: what makes a net likely pass]
    #[arg(long, value_name = "DECIBELS", value_parser = options::margin)]
    margin: Option<f64>,

    /// Write the board file with the remedies in place
    #[arg(long, value_name = "FILE")]
    write: Option<PathBuf>,

    /// Write everything as JSON; `-` prints it in place of the table
    #[arg(long, value_name = "FILE")]
    json: Option<PathBuf>,

    /// Write a row for every net as CSV
    #[arg(long, value_name = "FILE")]
    csv: Option<PathBuf>,

    /// Write pictures (PNG and SVG) of every remedied net, before and after, to this folder
    #[arg(long, value_name = "DIR")]
    plot: Option<PathBuf>,
}

/// Looks for remedies and hands out the answers.
pub fn run(options: &Options) -> Result<Ending, Refusal> {
    let asked = options.question.open()?;
    let (json, csv) = (options.json.as_deref(), options.csv.as_deref());
    check_places(
        &[json, csv, options.write.as_deref()],
        options.plot.as_deref(),
    )?;

    let incomplete = asked.is_incomplete();
    let setup = asked.setup.clone();
    let report = report(options, asked);
    output::write(outputs(options, &report, &setup)?)?;
    let text = if json == Some(Path::new("-")) {
        remedy_json(&report)
    } else {
        remedy_table(&report)
    };
    output::print(&text)?;

    let hopeless = |outcome: &Outcome| matches!(outcome, Outcome::Hopeless(_));
    Ok(if incomplete {
        Ending::Incomplete
    } else if report.nets.iter().any(|net| hopeless(&net.outcome)) {
        Ending::SomeLikelyFail
    } else {
        Ending::NoneLikelyFails
    })
}

/// Works everything out.
fn report(options: &Options, asked: Asked) -> RemedyReport {
    let watch = Progress::new();
    let goal = match options.margin {
        Some(margin_db) => Goal { margin_db },
        None => Goal::likely_pass(&asked.setup),
    };
    let bench = Bench::new(&asked.board.nets, &asked.board, &asked.setup, &watch)
        .with_layers_of(&asked.whole);
    let nets = remedy(&bench, goal, &watch);
    RemedyReport {
        frame: CheckReport {
            site: asked.setup.site,
            remarks: asked.remarks(),
            limits: asked.limits(),
            nets: nets.iter().map(|net| net.before.result.clone()).collect(),
            board: asked.board.title,
            distances_m: asked.setup.distances_m,
            unusable: asked.unusable,
        },
        goal,
        nets,
    }
}

/// Every file asked for, complete.
fn outputs(
    options: &Options,
    report: &RemedyReport,
    setup: &CheckSetup,
) -> Result<Vec<Output>, Refusal> {
    let mut outputs = Vec::new();
    let mut push = |path: &Path, contents: String| {
        outputs.push(Output {
            path: path.to_owned(),
            contents: contents.into_bytes(),
        });
    };
    if let Some(path) = options
        .json
        .as_deref()
        .filter(|path| *path != Path::new("-"))
    {
        push(path, remedy_json(report));
    }
    if let Some(path) = &options.csv {
        push(path, remedy_csv(report));
    }
    if let Some(path) = &options.write {
        push(path, rewritten(options, report)?);
    }
    if let Some(folder) = &options.plot {
        outputs.extend(pictures(report, setup, folder));
    }
    Ok(outputs)
}

/// The board file with the remedies in place.
fn rewritten(options: &Options, report: &RemedyReport) -> Result<String, Refusal> {
    let board = &options.question.board;
    let changed: Vec<Net> = (report.nets.iter())
        .filter(|net| matches!(net.outcome, Outcome::Found(_)))
        .map(|net| net.after().net.clone())
        .collect();
    let remark = format!(
        "Remedies put in by ringfield; what was there is kept as comments. {NOTICE}, see `ringfield check`."
    );
    let text = input::read_text(board)?;
    rewrite_board(&text, &board.display().to_string(), &changed, &remark).map_err(Refusal::new)
}

/// Before and after, for every remedied net and distance.
fn pictures(report: &RemedyReport, setup: &CheckSetup, folder: &Path) -> Vec<Output> {
    let names = output::file_names(report.nets.iter().map(|net| net.before.net.name.as_str()));
    let mut wanted = Vec::new();
    for (net, name) in report.nets.iter().zip(names) {
        let Outcome::Found(remedy) = &net.outcome else {
            continue;
        };
        let pair = vec![net.before.clone(), remedy.after.clone()];
        let pair = comparison(&net.before.net.name, pair, setup);
        for distance_m in &report.frame.distances_m {
            let distance = show::distance(*distance_m).replace(' ', "");
            let picture = variants_spectrum_picture(&report.frame, &pair, *distance_m);
            wanted.push((format!("{name}-remedy-spectrum-{distance}"), picture));
        }
    }
    let painted = wanted.par_iter().flat_map(|(name, picture)| {
        let output = |ending: &str, contents| Output {
            path: folder.join(format!("{name}.{ending}")),
            contents,
        };
        [
            output("png", picture.png()),
            output("svg", picture.svg().into_bytes()),
        ]
    });
    painted.collect()
}
