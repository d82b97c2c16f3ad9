//! What every command that works a board out is asked: which board and nets, against which limits, where.

use std::path::{Path, PathBuf};

use clap::Args;
use ringfield::board::{Board, Reading, UnusableNet, VariedNets};
use ringfield::limit::{Limit, LimitAt, default_limits, limits_at};
use ringfield::radiation::{COMPARED_TO_HZ, Heights, Site, UNKNOWN_CABLE_LENGTHS_M};
use ringfield::study::{CheckSetup, cable_objection, scan_band_hz};
use ringfield::text::Severity;

use super::options::{self, SiteChoice, USUAL_DISTANCES_M};
use super::{Refusal, input, output};

/// The board and what it is laid against.
#[derive(Debug, Args)]
pub struct Question {
    /// The board file
    #[arg(value_name = "BOARD")]
    pub board: PathBuf,

    #[command(flatten)]
    pub against: Against,

    /// Only this net; may be repeated
    #[arg(long, value_name = "NAME")]
    pub net: Vec<String>,
}

/// What a board is laid against.
#[derive(Debug, Args)]
pub struct Against {
    /// A limit file; may be repeated [default: the built-in limits, see `ringfield limits`]
    #[arg(long, value_name = "FILE")]
    pub limit: Vec<PathBuf>,

    /// Distance of the antenna, 1 m to 30 m; may be repeated [default: 3 m and 10 m]
    #[arg(long, value_name = "LENGTH", value_parser = options::distance)]
    pub distance: Vec<f64>,

    /// Site of the antenna
    #[arg(long, value_enum, value_name = "SITE", default_value = "open-area")]
    pub site: SiteChoice,

    /// Height of the product's lowest point over the floor
    #[arg(long, value_name = "LENGTH", default_value = "0.8 m", value_parser = options::table_height)]
    pub table_height: f64,

    /// Heights that the antenna moves over
    #[arg(long, value_name = "LENGTHS", default_value = "1 m to 4 m", value_parser = options::antenna_heights)]
    pub antenna_heights: [f64; 2],

    /// Highest frequency to look at [default: what 47 CFR 15.33 asks for, at least 1 GHz]
    #[arg(long, value_name = "FREQUENCY", value_parser = options::frequency)]
    pub max_frequency: Option<f64>,

    /// Spread (standard deviation) of what is not modelled, in dB; a judgement
    #[arg(long, value_name = "DECIBELS", default_value = "5 dB", value_parser = options::decibels)]
    pub sigma: f64,
}

/// A question whose files have been read.
pub struct Asked {
    /// The board with only the nets asked for.
    pub board: Board,
    /// The board with all of its usable nets.
    pub whole: Board,
    /// The unusable ones among the nets asked for.
    pub unusable: Vec<UnusableNet>,
    /// What to measure and against what.
    pub setup: CheckSetup,
    /// The nets with tolerances, where there are any.
    pub varied: Option<VariedNets>,
    /// Whether the file has mistakes that cost no net.
    broken_elsewhere: bool,
}

impl Question {
    /// Reads the files; says what is wrong with them.
    pub fn open(&self) -> Result<Asked, Refusal> {
        let limits = self.against.limits()?;
        let mut reading = read(&self.board)?;
        let varied = reading.varied.take();
        let broken_elsewhere = reading.unusable.is_empty() && has_errors(&reading);
        let whole = reading.board.clone();
        let (board, unusable) = selected(reading, &self.board, &self.net)?;
        let whole = whole.unwrap_or_else(|| board.clone());
        // The whole board decides how far to scan, whichever nets are asked for.
        let setup = self.against.setup(limits, &whole)?;
        Ok(Asked {
            board,
            whole,
            unusable,
            setup,
            varied,
            broken_elsewhere,
        })
    }
}

impl Against {
    /// The limits asked for.
    pub fn limits(&self) -> Result<Vec<Limit>, Refusal> {
        match self.limit.as_slice() {
            [] => Ok(default_limits()),
            files => input::limits(files),
        }
    }

    /// What to measure of a whole board; refused where a cable cannot hang as described.
    pub fn setup(&self, limits: Vec<Limit>, board: &Board) -> Result<CheckSetup, Refusal> {
        let (lowest_frequency_hz, top_frequency_hz) = scan_band_hz(board, &limits);
        let setup = CheckSetup {
            limits,
            distances_m: distances_m(&self.distance),
            site: self.site.into(),
            heights: Heights {
                table_m: self.table_height,
                antenna_m: self.antenna_heights,
            },
            lowest_frequency_hz,
            top_frequency_hz: self.max_frequency.unwrap_or(top_frequency_hz),
            model_sigma_db: self.sigma,
        };
        match cable_objection(board, &setup) {
            Some(objection) => Err(Refusal::new(objection)),
            None => Ok(setup),
        }
    }
}

impl Asked {
    /// Whether some part of the answer is missing for a mistake in the file.
    pub fn is_incomplete(&self) -> bool {
        self.broken_elsewhere || !self.unusable.is_empty()
    }

    /// Every limit at every distance.
    pub fn limits(&self) -> Vec<LimitAt> {
        limits_everywhere(&self.setup)
    }

    /// What concerns the whole board, in plain sentences.
    pub fn remarks(&self) -> Vec<String> {
        remarks(&self.board, &self.setup)
    }
}

/// Every limit at every distance.
pub fn limits_everywhere(setup: &CheckSetup) -> Vec<LimitAt> {
    let distances = setup.distances_m.iter();
    distances
        .flat_map(|distance_m| limits_at(&setup.limits, *distance_m))
        .collect()
}

/// The distances asked for, each once.
fn distances_m(asked: &[f64]) -> Vec<f64> {
    let mut distances_m: Vec<f64> = Vec::new();
    for distance_m in asked {
        if !distances_m.contains(distance_m) {
            distances_m.push(*distance_m);
        }
    }
    if distances_m.is_empty() {
        distances_m = USUAL_DISTANCES_M.into();
    }
    distances_m
}

/// Reads the board file and passes on what there is to say about it.
pub fn read(path: &Path) -> Result<Reading, Refusal> {
    let reading = input::board(path)?;
    for diagnostic in &reading.diagnostics {
        output::tell(&diagnostic.render());
    }
    Ok(reading)
}

/// Whether the file has mistakes.
pub fn has_errors(reading: &Reading) -> bool {
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

/// What concerns a whole board, in plain sentences.
pub fn remarks(board: &Board, setup: &CheckSetup) -> Vec<String> {
    cable_remarks(board, setup.site)
        .into_iter()
        .chain(beyond_comparison(board, setup))
        .collect()
}

/// What has to be said of frequencies at which nothing was compared.
fn beyond_comparison(board: &Board, setup: &CheckSetup) -> Option<String> {
    (board.plane.is_some() && setup.top_frequency_hz > COMPARED_TO_HZ).then(|| {
        "Above 2 GHz the plane's and the cables' part in the figures has not been compared with any \
         other solution."
            .into()
    })
}

/// What has to be said about the cables.
fn cable_remarks(board: &Board, site: Site) -> Vec<String> {
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
            "Cables are not in the figures, since the file gives no `plane` for them to hang on, \
             and they often dominate."
                .into(),
        ];
    }
    let mut remarks = Vec::new();
    if site == Site::FreeSpace {
        remarks.push(
            "In free space cables hang as described, with no floor below them: one that is bonded ends in the open."
                .into(),
        );
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
