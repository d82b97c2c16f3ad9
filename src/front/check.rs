//! `ringfield check`: which nets of a board will likely fail.

use std::path::{Path, PathBuf};

use clap::Args;
use rayon::prelude::*;
use ringfield::board::{Board, CableRun, Reading, UnusableNet};
use ringfield::limit::{Limit, LimitAt, default_limits, limits_at};
use ringfield::radiation::{COMPARED_TO_HZ, UNKNOWN_CABLE_LENGTHS_M};
use ringfield::show::{
    CheckReport, check_json, check_table, harmonics_csv, march_table, waveform_csv,
};
use ringfield::study::{CheckSetup, NetResult, Verdict, check, scan_band_hz};
use ringfield::text::Severity;

use super::options::{self, SiteChoice, USUAL_DISTANCES_M};
use super::output::Output;
use super::pictures::pictures;
use super::progress::Progress;
use super::{Ending, Refusal, input, output};

/// The board, what it is laid against, and where the answers go.
#[derive(Debug, Args)]
pub struct Options {
    /// The board file
    #[arg(value_name = "BOARD")]
    board: PathBuf,

    /// A limit file; may be repeated [default: the built-in limits, see `ringfield limits`]
    #[arg(long, value_name = "FILE")]
    limit: Vec<PathBuf>,

    /// Distance of the antenna, 1 m to 30 m; may be repeated [default: 3 m and 10 m]
    #[arg(long, value_name = "LENGTH", value_parser = options::distance)]
    distance: Vec<f64>,

    /// Site of the antenna
    #[arg(long, value_enum, value_name = "SITE", default_value = "open-area")]
    site: SiteChoice,

    /// Check only this net; may be repeated
    #[arg(long, value_name = "NAME")]
    net: Vec<String>,

    /// Highest frequency to look at [default: what 47 CFR 15.33 asks for, at least 1 GHz]
    #[arg(long, value_name = "FREQUENCY", value_parser = options::frequency)]
    max_frequency: Option<f64>,

    /// Spread (standard deviation) of what is not modelled, in dB; a judgement
    #[arg(long, value_name = "DECIBELS", default_value = "5 dB", value_parser = options::decibels)]
    sigma: f64,

    /// Write everything as JSON; `-` prints it in place of the table
    #[arg(long, value_name = "FILE")]
    json: Option<PathBuf>,

    /// Write every harmonic as CSV
    #[arg(long, value_name = "FILE")]
    csv: Option<PathBuf>,

    /// Write pictures of spectra and waveforms (PNG and SVG) to this folder
    #[arg(long, value_name = "DIR")]
    plot: Option<PathBuf>,

    /// Write one settled period as CSV; with several nets, each goes to a file of its own with the net's name put
    /// before the extension of FILE
    #[arg(long, value_name = "FILE")]
    waveform: Option<PathBuf>,

    /// Tell also how each settled waveform was reached
    #[arg(long)]
    verbose: bool,
}

/// Checks a board and hands out the answers.
pub fn run(options: &Options) -> Result<Ending, Refusal> {
    let limits = match options.limit.as_slice() {
        [] => default_limits(),
        files => input::limits(files)?,
    };
    let reading = read(&options.board)?;
    // The whole board decides how far to scan, whichever nets are asked for.
    let scan_hz = reading
        .board
        .as_ref()
        .map(|board| scan_band_hz(board, &limits));
    let broken_elsewhere = reading.unusable.is_empty() && has_errors(&reading);
    let (board, unusable) = selected(reading, &options.board, &options.net)?;
    check_places(options)?;

    let setup = setup(options, scan_hz.unwrap_or_default(), limits);
    let report = report(setup, &board, unusable)?;
    let several = report.nets.len() + report.unusable.len() > 1;
    output::write(outputs(options, &report, several))?;
    output::print(&answer(options, &report))?;

    let fails = |net: &NetResult| net.verdict == Verdict::LikelyFail;
    Ok(if broken_elsewhere || !report.unusable.is_empty() {
        Ending::Incomplete
    } else if report.nets.iter().any(fails) {
        Ending::SomeLikelyFail
    } else {
        Ending::NoneLikelyFails
    })
}

/// Reads a board file and passes on what there is to say about it.
pub(super) fn read(path: &Path) -> Result<Reading, Refusal> {
    let reading = input::board(path)?;
    for diagnostic in &reading.diagnostics {
        output::tell(&diagnostic.render());
    }
    Ok(reading)
}

pub(super) fn has_errors(reading: &Reading) -> bool {
    let mut diagnostics = reading.diagnostics.iter();
    diagnostics.any(|diagnostic| diagnostic.severity == Severity::Error)
}

/// The board with only the nets asked for, and the unusable ones among them.
fn selected(
    reading: Reading,
    path: &Path,
    names: &[String],
) -> Result<(Board, Vec<UnusableNet>), Refusal> {
    let no_net = || Refusal::new(format!("there is no usable net in `{}`", path.display()));
    let mut board = reading.board.ok_or_else(no_net)?;
    let mut unusable = reading.unusable;
    if !names.is_empty() {
        let known: Vec<&str> = (board.nets.iter().map(|net| net.name.as_str()))
            .chain(unusable.iter().map(|net| net.name.as_str()))
            .collect();
        if let Some(unknown) = names.iter().find(|name| !known.contains(&name.as_str())) {
            return Err(Refusal::new(unknown_net(unknown, &known)));
        }
        board.nets.retain(|net| names.contains(&net.name));
        unusable.retain(|net| names.contains(&net.name));
    }
    if board.nets.is_empty() {
        return Err(no_net());
    }
    Ok((board, unusable))
}

fn unknown_net(name: &str, known: &[&str]) -> String {
    let distance =
        |other: &&&str| strsim::damerau_levenshtein(&name.to_lowercase(), &other.to_lowercase());
    let near = known.iter().filter(|other| distance(other) <= 3);
    match near.min_by_key(distance) {
        Some(near) => format!("the board has no net `{name}`; did you mean `{near}`?"),
        None => format!("the board has no net `{name}`; it has {}", known.join(", ")),
    }
}

/// Finds out before the work whether every answer could be written.
fn check_places(options: &Options) -> Result<(), Refusal> {
    let json = options
        .json
        .as_deref()
        .filter(|path| *path != Path::new("-"));
    let files = [json, options.csv.as_deref(), options.waveform.as_deref()];
    let files: Vec<&Path> = files.into_iter().flatten().collect();
    for (index, path) in files.iter().enumerate() {
        if files[..index].contains(path) {
            return Err(Refusal::new(format!(
                "two answers would be written to `{}`",
                path.display()
            )));
        }
        output::check_file(path)?;
    }
    options
        .plot
        .as_deref()
        .map_or(Ok(()), output::check_new_folder)
}

/// Works out every net.
fn report(
    setup: CheckSetup,
    board: &Board,
    unusable: Vec<UnusableNet>,
) -> Result<CheckReport, Refusal> {
    let distances = setup.distances_m.iter();
    let limits: Vec<LimitAt> = distances
        .flat_map(|distance_m| limits_at(&setup.limits, *distance_m))
        .collect();
    let report = CheckReport {
        board: board.title.clone(),
        site: setup.site,
        remarks: cable_remarks(board)
            .into_iter()
            .chain(beyond_comparison(board, &setup))
            .collect(),
        nets: check(board, &setup, &Progress::new()),
        distances_m: setup.distances_m,
        limits,
        unusable,
    };
    if covers_nothing(&report) {
        return Err(Refusal::new(
            "no limit given covers any harmonic of any net, so nothing can be judged: \
             give other limits (--limit) or a higher frequency (--max-frequency)",
        ));
    }
    Ok(report)
}

fn setup(
    options: &Options,
    (lowest_frequency_hz, top_frequency_hz): (f64, f64),
    limits: Vec<Limit>,
) -> CheckSetup {
    let mut distances_m = Vec::new();
    for distance_m in &options.distance {
        if !distances_m.contains(distance_m) {
            distances_m.push(*distance_m);
        }
    }
    if distances_m.is_empty() {
        distances_m = USUAL_DISTANCES_M.into();
    }
    CheckSetup {
        limits,
        distances_m,
        site: options.site.into(),
        lowest_frequency_hz,
        top_frequency_hz: options.max_frequency.unwrap_or(top_frequency_hz),
        model_sigma_db: options.sigma,
    }
}

/// What has to be said of frequencies at which nothing was compared.
pub(super) fn beyond_comparison(board: &Board, setup: &CheckSetup) -> Option<String> {
    (board.plane.is_some() && setup.top_frequency_hz > COMPARED_TO_HZ).then(|| {
        "Above 2 GHz the plane's and the cables' part in the figures has not been compared with any \
         other solution."
            .into()
    })
}

/// What has to be said about the cables.
pub(super) fn cable_remarks(board: &Board) -> Vec<String> {
    let Some(cables) = board.cables.as_deref() else {
        return vec![
            "The file does not say what hangs on the board (`cables: []` says that nothing does), \
             and cables often dominate."
                .into(),
        ];
    };
    if cables.is_empty() {
        return Vec::new();
    }
    if board.plane.is_none() {
        return vec![
            "Cables are not yet in the figures, since the file gives no `plane` for them to hang on, \
             and they often dominate."
                .into(),
        ];
    }
    let mut remarks = vec![
        "Cables are in the figures as straight wires in free space; the floor acts on them by the same \
         factor as on the board, where it may in truth move them by many dB either way."
            .into(),
    ];
    if cables.iter().any(|cable| cable.run != CableRun::Straight) {
        remarks.push("Cables that drop to the floor are taken as straight.".into());
    }
    if cables.iter().any(|cable| cable.length_m.is_none()) {
        let lengths = UNKNOWN_CABLE_LENGTHS_M
            .map(|length_m| length_m.to_string())
            .join(", ");
        remarks.push(format!(
            "Cables of unknown length are tried with {lengths} m; the worst counts."
        ));
    }
    remarks
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
                .flat_map(|(net, name)| pictures(report, net, &folder.join(name))),
        );
    }
    outputs
}

/// What goes to standard output.
fn answer(options: &Options, report: &CheckReport) -> String {
    if options.json.as_deref() == Some(Path::new("-")) {
        return check_json(report);
    }
    let mut text = check_table(report);
    if options.verbose {
        text.push('\n');
        text.push_str(&march_table(&report.nets));
    }
    text
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_near_miss_is_named() {
        let known = ["CAM_PCLK", "FLASH_SCK"];
        assert!(unknown_net("cam_plck", &known).contains("did you mean `CAM_PCLK`?"));
        assert!(unknown_net("USB", &known).ends_with("it has CAM_PCLK, FLASH_SCK"));
    }
}
