//! What the user sees: the terminal table, JSON, CSV and pictures, all as values in memory.
//!
//! Nothing here prints or opens a file; the front does. Every output carries [`NOTICE`].

mod compare;
mod csv;
mod explain;
mod findings;
mod json;
mod limit_listing;
mod plot;
mod rank;
mod remedy;
#[cfg(test)]
mod samples;
mod spread;
mod table;
mod words;

pub use compare::{
    CompareReport, SweepResult, comparison_csv, comparison_json, comparison_table, sweep_csv,
};
pub use csv::{harmonics_csv, waveform_csv};
pub use explain::explanations_text;
pub use json::check_json;
pub use limit_listing::{limit_at_listing, limit_listing};
pub use plot::{
    Picture, antenna_picture, board_spectrum_picture, plan_picture, ranking_picture, scan_picture,
    spectrum_parts_picture, spectrum_picture, sweep_picture, variants_spectrum_picture,
    variants_waveform_picture, waveform_picture,
};
pub use rank::{RankReport, rank_json, rank_table, ranking_csv};
pub use remedy::{RemedyReport, remedy_csv, remedy_json, remedy_table};
pub use table::{check_table, march_table};
pub use words::distance;

use crate::board::UnusableNet;
use crate::limit::LimitAt;
use crate::radiation::Site;
use crate::study::{NOTICE, NetResult};

/// Stands beside the notice wherever there is room for a sentence.
const LABORATORY: &str = "the product must be tested by an accredited laboratory";

/// The answer of a check of a whole board, ready to be shown.
#[derive(Debug, Clone)]
pub struct CheckReport {
    /// Title of the board.
    pub board: String,
    /// Site that the antenna figures are for.
    pub site: Site,
    /// Distances of the antenna, in the order they were asked for.
    pub distances_m: Vec<f64>,
    /// Every limit at every distance.
    pub limits: Vec<LimitAt>,
    /// The nets that could be worked out, in the order of the board.
    pub nets: Vec<NetResult>,
    /// The nets that could not.
    pub unusable: Vec<UnusableNet>,
    /// What concerns the whole board, in plain sentences.
    pub remarks: Vec<String>,
}

impl CheckReport {
    /// The lowest limit at a distance and frequency, and its level in dBuV/m.
    fn tightest_limit(&self, distance_m: f64, frequency_hz: f64) -> Option<(&LimitAt, f64)> {
        self.limits_at(distance_m)
            .filter_map(|limit| Some((limit, limit.at(frequency_hz)?)))
            .min_by(|a, b| a.1.total_cmp(&b.1))
    }

    /// The limits at one of the report's distances.
    fn limits_at(&self, distance_m: f64) -> impl Iterator<Item = &LimitAt> {
        self.limits
            .iter()
            .filter(move |limit| limit.distance_m == distance_m)
    }
}
