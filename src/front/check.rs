//! `ringfield check`: which nets of a board will likely fail.

use std::path::{Path, PathBuf};

use clap::Args;
use rayon::prelude::*;
use ringfield::board::VariedNets;
use ringfield::show::{
    CheckReport, check_json, check_table, explanations_text, harmonics_csv, march_table,
    waveform_csv,
};
use ringfield::study::compare::Bench;
use ringfield::study::explain::{Explanation, explain};
use ringfield::study::{NetResult, Verdict, check_drawn};

use super::options;
use super::output::{self, Output, check_places};
use super::pictures::{MorePictures, pictures};
use super::progress::Progress;
use super::question::{Asked, Question};
use super::{Ending, Refusal};

/// The board, what it is laid against, and where the answers go.
#[derive(Debug, Args)]
pub struct Options {
    #[command(flatten)]
    question: Question,

    /// Draws of the tolerances of each net that has some: spread of the margin, and what carries it; 0 is none
    #[arg(long, value_name = "NUMBER", default_value_t = 0, value_parser = options::draws)]
    draws: usize,

    /// Write everything as JSON; `-` prints it in place of the table
    #[arg(long, value_name = "FILE")]
    json: Option<PathBuf>,

    /// Write every harmonic as CSV
    #[arg(long, value_name = "FILE")]
    csv: Option<PathBuf>,

    /// Write pictures of spectra and waveforms (PNG and SVG) to this folder
    #[arg(long, value_name = "DIR")]
    plot: Option<PathBuf>,

    #[command(flatten)]
    more: MorePictures,

    /// Write one settled period as CSV; with several nets, each goes to a file of its own with the net's name put
    /// before the extension of FILE
    #[arg(long, value_name = "FILE")]
    waveform: Option<PathBuf>,

    /// Tell also what each piece of a net contributes to its worst reading, and what halves it; best with `--net`
    #[arg(long)]
    explain: bool,

    /// Tell also how each settled waveform was reached
    #[arg(long)]
    verbose: bool,
}

/// Checks a board and hands out the answers.
pub fn run(options: &Options) -> Result<Ending, Refusal> {
    let mut asked = options.question.open()?;
    let (json, csv) = (options.json.as_deref(), options.csv.as_deref());
    check_places(
        &[json, csv, options.waveform.as_deref()],
        options.plot.as_deref(),
    )?;

    let incomplete = asked.is_incomplete();
    let varied = asked.varied.take();
    let explanations = if options.explain {
        explain_all(&asked)
    } else {
        Vec::new()
    };
    let (board, setup) = (asked.board.clone(), asked.setup.clone());
    let report = report(asked, varied.as_ref(), options.draws)?;
    let several = report.nets.len() + report.unusable.len() > 1;
    let mut outputs = outputs(options, &report, several);
    if let Some(folder) = &options.plot {
        outputs.extend(options.more.of_board(&report, &board, &setup, folder));
    }
    output::write(outputs)?;
    output::print(&answer(options, &report, &explanations))?;

    let fails = |net: &NetResult| net.verdict == Verdict::LikelyFail;
    Ok(if incomplete {
        Ending::Incomplete
    } else if report.nets.iter().any(fails) {
        Ending::SomeLikelyFail
    } else {
        Ending::NoneLikelyFails
    })
}

/// What is behind the worst reading of every net asked for.
fn explain_all(asked: &Asked) -> Vec<Explanation> {
    let watch = Progress::new();
    let bench = Bench::new(&asked.board.nets, &asked.board, &asked.setup, &watch)
        .with_layers_of(&asked.whole);
    explain(&bench, &watch)
}

/// Works out every net.
fn report(asked: Asked, varied: Option<&VariedNets>, draws: usize) -> Result<CheckReport, Refusal> {
    let mut remarks = asked.remarks();
    remarks.extend(tolerance_remark(varied, draws));
    let report = CheckReport {
        site: asked.setup.site,
        remarks,
        limits: asked.limits(),
        nets: check_drawn(&asked.board, varied, draws, &asked.setup, &Progress::new()),
        board: asked.board.title,
        distances_m: asked.setup.distances_m,
        unusable: asked.unusable,
    };
    if covers_nothing(&report) {
        return Err(Refusal::new(
            "no limit given covers any harmonic of any net, so nothing can be judged: \
             give other limits (--limit) or a higher frequency (--max-frequency)",
        ));
    }
    Ok(report)
}

/// What has to be said of tolerances that are not drawn, or draws of none.
fn tolerance_remark(varied: Option<&VariedNets>, draws: usize) -> Option<String> {
    match (varied, draws) {
        (Some(_), 0) => Some(
            "The file states tolerances, and every figure is nominal: `--draws 256` tells what they make of the \
             margins."
                .into(),
        ),
        (None, 1..) => Some("The file states no tolerances, so there was nothing to draw.".into()),
        _ => None,
    }
}

fn covers_nothing(report: &CheckReport) -> bool {
    let mut harmonics = report.nets.iter().flat_map(|net| &net.harmonics);
    !harmonics.any(|harmonic| {
        let mut limits = report.limits.iter();
        limits.any(|limit| limit.at(harmonic.frequency_hz).is_some())
    })
}

/// Every file asked for, complete.
fn outputs(options: &Options, report: &CheckReport, several: bool) -> Vec<Output> {
    let mut outputs = Vec::new();
    let mut push = |path: PathBuf, contents: String| {
        outputs.push(Output {
            path,
            contents: contents.into_bytes(),
        });
    };
    if let Some(path) = options.json.as_ref().filter(|path| *path != Path::new("-")) {
        push(path.clone(), check_json(report));
    }
    if let Some(path) = &options.csv {
        push(path.clone(), harmonics_csv(report));
    }
    let names = output::file_names(report.nets.iter().map(|net| net.name.as_str()));
    if let Some(path) = &options.waveform {
        for (net, name) in report.nets.iter().zip(&names) {
            let path = if several {
                output::with_net(path, name)
            } else {
                path.clone()
            };
            push(path, waveform_csv(net));
        }
    }
    if let Some(folder) = &options.plot {
        let nets: Vec<_> = report.nets.iter().zip(&names).collect();
        outputs.par_extend(
            nets.par_iter()
                .flat_map(|(net, name)| pictures(report, net, &folder.join(name), &options.more)),
        );
    }
    outputs
}

/// What goes to standard output.
fn answer(options: &Options, report: &CheckReport, explanations: &[Explanation]) -> String {
    if options.json.as_deref() == Some(Path::new("-")) {
        return check_json(report);
    }
    let mut text = check_table(report);
    text.push_str(&explanations_text(explanations));
    if options.verbose {
        text.push('\n');
        text.push_str(&march_table(&report.nets));
    }
    text
}
