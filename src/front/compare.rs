//! `ringfield compare`: one net under several terminations, edges or layouts.

use std::path::{Path, PathBuf};

use clap::Args;
use rayon::prelude::*;
use ringfield::board::{Board, Net};
use ringfield::show::{
    self, CheckReport, CompareReport, Picture, SweepResult, comparison_csv, comparison_json,
    comparison_table, sweep_csv, sweep_picture, variants_spectrum_picture,
    variants_waveform_picture,
};
use ringfield::study::change::{ApplyError, Sweep, Try, read_sweep, read_try};
use ringfield::study::compare::{Bench, Comparison, Variant, compare, comparison, sweep};

use super::output::{self, Output, check_places};
use super::progress::Progress;
use super::question::{Asked, Question, read};
use super::{Ending, Refusal};

/// How to write a try, for the help.
const GRAMMAR: &str = "\
A try is one change or several with commas between them:
  bare                                    no termination at all
  series 47 ohm                           at the driver; `+ 47 nH` adds an inductance
  series 47 ohm at legs                   at the head of every leg; also: at branch, at a RECEIVER
  end 64 ohm                              at every far end to 0 V; `to 1.65 V`, `at RECEIVER`
  end 64 ohm + 100 pF                     with a capacitor
  split 130 ohm / 130 ohm to 3.3 V        to a rail and to 0 V
  rise 2 ns, resistance 25 ohm            another driver
  setting slow                            a setting that the board file gives the driver
  length 3 in, height 4 mil, layer core   another layout
A try that names a termination names all of them: what the net has now goes, unless the try begins
with `keep,`. A sweep is a try with a range in place of one number: `series 0..100 ohm`.";

/// The net, what is tried on it, and where the answers go.
#[derive(Debug, Args)]
#[command(after_help = GRAMMAR)]
pub struct Options {
    #[command(flatten)]
    question: Question,

    /// What to try, such as `series 47 ohm`; may be repeated [default: bare, or where the net is bare, its matched
    /// series resistor]
    #[arg(long = "try", value_name = "TRY", value_parser = read_try)]
    tries: Vec<Try>,

    /// Another board file whose nets of the same names are compared; may be repeated
    #[arg(long = "board", value_name = "FILE", conflicts_with_all = ["tries", "sweep"])]
    others: Vec<PathBuf>,

    /// Work out margin, overshoot and settling over a range, such as `series 0..100 ohm`
    #[arg(long, value_name = "TRY", value_parser = read_sweep, conflicts_with = "tries")]
    sweep: Option<Sweep>,

    /// Write everything as JSON; `-` prints it in place of the table
    #[arg(long, value_name = "FILE")]
    json: Option<PathBuf>,

    /// Write every harmonic of every variant as CSV; of a sweep, every value
    #[arg(long, value_name = "FILE")]
    csv: Option<PathBuf>,

    /// Write pictures (PNG and SVG) of all variants over one another to this folder
    #[arg(long, value_name = "DIR")]
    plot: Option<PathBuf>,
}

/// Compares and hands out the answers.
pub fn run(options: &Options) -> Result<Ending, Refusal> {
    let asked = options.question.open()?;
    let (json, csv) = (options.json.as_deref(), options.csv.as_deref());
    check_places(&[json, csv], options.plot.as_deref())?;
    if options.others.is_empty() && options.question.net.is_empty() && asked.board.nets.len() > 1 {
        let names: Vec<&str> = asked
            .board
            .nets
            .iter()
            .map(|net| net.name.as_str())
            .collect();
        return Err(Refusal::new(format!(
            "say which net to compare with --net; the board has {}",
            names.join(", ")
        )));
    }
    let incomplete = asked.is_incomplete();
    let report = report(options, asked)?;
    output::write(outputs(options, &report))?;
    let text = if json == Some(Path::new("-")) {
        comparison_json(&report)
    } else {
        comparison_table(&report)
    };
    output::print(&text)?;
    Ok(if incomplete {
        Ending::Incomplete
    } else {
        Ending::NoneLikelyFails
    })
}

/// Works everything out.
fn report(options: &Options, asked: Asked) -> Result<CompareReport, Refusal> {
    let watch = Progress::new();
    let Asked {
        board,
        setup,
        whole,
        ..
    } = &asked;
    let bench = Bench::new(&board.nets, board, setup, &watch);
    // Layers that only other nets run on may be tried, too.
    let bench = bench.with_layers_of(whole);
    let refused = |error: ApplyError| Refusal::new(error);
    let (mut comparisons, mut sweeps) = (Vec::new(), Vec::new());
    if options.others.is_empty() {
        for net in &board.nets {
            match &options.sweep {
                Some(swept) => {
                    let variants = sweep(net, swept, &bench, &watch).map_err(refused)?;
                    sweeps.push(swept_result(net, swept, variants));
                }
                None => {
                    let tried = compare(net, &options.tries, &bench, &watch);
                    comparisons.push(tried.map_err(refused)?);
                }
            }
        }
    } else {
        comparisons = boards(options, &asked, &bench, &watch)?;
    }
    let bases = comparisons.iter().filter_map(|c| c.variants.first());
    let swept = sweeps
        .iter()
        .filter_map(|sweep| Some(&sweep.points.first()?.1));
    let nets = bases
        .chain(swept)
        .map(|variant| variant.result.clone())
        .collect();
    Ok(CompareReport {
        frame: CheckReport {
            site: asked.setup.site,
            remarks: asked.remarks(),
            limits: asked.limits(),
            nets,
            board: asked.board.title,
            distances_m: asked.setup.distances_m,
            unusable: asked.unusable,
        },
        comparisons,
        sweeps,
    })
}

fn swept_result(net: &Net, swept: &Sweep, variants: Vec<Variant>) -> SweepResult {
    SweepResult {
        net: net.name.clone(),
        label: swept.label.clone(),
        unit: swept.unit.clone(),
        points: swept
            .steps
            .iter()
            .map(|(value, _)| *value)
            .zip(variants)
            .collect(),
    }
}

/// Compares boards net by net. Each board has an antenna of its own; all are scanned as the first.
fn boards(
    options: &Options,
    asked: &Asked,
    bench: &Bench,
    watch: &Progress,
) -> Result<Vec<Comparison>, Refusal> {
    let name_of = |path: &Path| {
        path.file_name()
            .unwrap_or(path.as_os_str())
            .display()
            .to_string()
    };
    let named = |name: &str, nets: &[Net]| -> Vec<(String, Net)> {
        nets.iter()
            .map(|net| (name.to_owned(), net.clone()))
            .collect()
    };
    let nets = &asked.board.nets;
    let mut rows: Vec<Vec<Variant>> = bench
        .measure(named(&name_of(&options.question.board), nets), watch)
        .into_iter()
        .map(|variant| vec![variant])
        .collect();
    for path in &options.others {
        let mut other = other_board(path)?;
        other
            .nets
            .retain(|net| nets.iter().any(|known| known.name == net.name));
        let missing: Vec<&str> = (nets.iter().map(|net| net.name.as_str()))
            .filter(|name| !other.nets.iter().any(|net| net.name == *name))
            .collect();
        if !missing.is_empty() {
            output::tell(&format!(
                "note: `{}` has no usable net {}",
                path.display(),
                missing.join(", ")
            ));
        }
        let bench = Bench::new(&other.nets, &other, &asked.setup, watch);
        let variants = bench.measure(named(&name_of(path), &other.nets), watch);
        for variant in variants {
            let place = nets.iter().position(|net| net.name == variant.net.name);
            if let Some(place) = place {
                rows[place].push(variant);
            }
        }
    }
    let pairs = nets.iter().zip(rows);
    Ok(pairs
        .map(|(net, variants)| comparison(&net.name, variants, &asked.setup))
        .collect())
}

fn other_board(path: &Path) -> Result<Board, Refusal> {
    let no_net = || Refusal::new(format!("there is no usable net in `{}`", path.display()));
    read(path)?.board.ok_or_else(no_net)
}

/// Every file asked for, complete.
fn outputs(options: &Options, report: &CompareReport) -> Vec<Output> {
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
        push(path, comparison_json(report));
    }
    if let Some(path) = &options.csv {
        let contents = if options.sweep.is_some() {
            sweep_csv(report)
        } else {
            comparison_csv(report)
        };
        push(path, contents);
    }
    if let Some(folder) = &options.plot {
        let pictures: Vec<(String, Picture)> = pictures(report);
        outputs.par_extend(pictures.par_iter().flat_map(|(name, picture)| {
            let output = |ending: &str, contents| Output {
                path: folder.join(format!("{name}.{ending}")),
                contents,
            };
            [
                output("png", picture.png()),
                output("svg", picture.svg().into_bytes()),
            ]
        }));
    }
    outputs
}

/// Every picture with its name.
fn pictures(report: &CompareReport) -> Vec<(String, Picture)> {
    let frame = &report.frame;
    let mut pictures = Vec::new();
    let names = output::file_names(report.comparisons.iter().map(|c| c.net.as_str()));
    for (comparison, name) in report.comparisons.iter().zip(names) {
        for distance_m in &frame.distances_m {
            let distance = show::distance(*distance_m).replace(' ', "");
            let picture = variants_spectrum_picture(frame, comparison, *distance_m);
            pictures.push((format!("{name}-compare-spectrum-{distance}"), picture));
        }
        let Some(first) = comparison.variants.first() else {
            continue;
        };
        let receivers = first
            .receptions
            .iter()
            .map(|reception| reception.name.as_str());
        for (number, receiver) in output::file_names(receivers).iter().enumerate() {
            let picture = variants_waveform_picture(frame, comparison, number);
            pictures.push((format!("{name}-compare-waveform-{receiver}"), picture));
        }
    }
    let names = output::file_names(report.sweeps.iter().map(|sweep| sweep.net.as_str()));
    for (sweep, name) in report.sweeps.iter().zip(names) {
        pictures.push((format!("{name}-sweep"), sweep_picture(frame, sweep)));
    }
    pictures
}
