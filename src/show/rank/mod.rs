//! A ranking of a whole board: table, JSON and CSV.

mod csv;
mod json;
mod table;

pub use csv::ranking_csv;
pub use json::rank_json;
pub use table::rank_table;

use super::words;
use crate::board::UnusableNet;
use crate::limit::LimitAt;
use crate::radiation::Site;
use crate::study::{Change, Owner, Ranking, Remedy, SumLevel, SumLine};

/// The answer of a ranking, ready to be shown.
#[derive(Debug, Clone)]
pub struct RankReport {
    /// Title of the board.
    pub board: String,
    /// Site that the antenna figures are for.
    pub site: Site,
    /// Distances of the antenna, in the order they were asked for.
    pub distances_m: Vec<f64>,
    /// Every limit at every distance.
    pub limits: Vec<LimitAt>,
    /// The nets and their sum.
    pub ranking: Ranking,
    /// The nets that could not be worked out.
    pub unusable: Vec<UnusableNet>,
    /// What concerns the whole board, in plain sentences.
    pub remarks: Vec<String>,
}

/// An owner whose part is smaller is not named.
const WORTH_NAMING_DB: f64 = 0.1;

/// A line of the sum where it is worst.
pub(super) struct SumRow<'a> {
    pub frequency_hz: f64,
    pub distance_m: f64,
    pub level: &'a SumLevel,
    pub limit: &'a LimitAt,
    pub limit_dbuv_per_m: f64,
}

impl SumRow<'_> {
    pub fn margin_db(&self) -> f64 {
        self.limit_dbuv_per_m - self.level.field_dbuv_per_m
    }

    /// The owners without which the sum would fall by something to speak of; one at least.
    pub fn named_owners(&self) -> impl Iterator<Item = &Owner> {
        let owners = self.level.owners.iter().enumerate();
        owners
            .filter(|(place, owner)| *place == 0 || owner.relief_db >= WORTH_NAMING_DB)
            .map(|(_, owner)| owner)
    }

    pub fn by_power_margin_db(&self) -> f64 {
        self.limit_dbuv_per_m - self.level.by_power_dbuv_per_m
    }
}

impl RankReport {
    /// The lowest limit at a distance and frequency.
    pub(super) fn tightest_limit(
        &self,
        distance_m: f64,
        frequency_hz: f64,
    ) -> Option<(&LimitAt, f64)> {
        self.limits
            .iter()
            .filter(|limit| limit.distance_m == distance_m)
            .filter_map(|limit| Some((limit, limit.at(frequency_hz)?)))
            .min_by(|a, b| a.1.total_cmp(&b.1))
    }

    /// A line of the sum at one of the report's distances, with the tightest limit there.
    pub(super) fn sum_row<'a>(&'a self, line: &'a SumLine, distance: usize) -> Option<SumRow<'a>> {
        let distance_m = self.distances_m[distance];
        let level = line.levels[distance].as_ref()?;
        let (limit, limit_dbuv_per_m) = self.tightest_limit(distance_m, line.frequency_hz)?;
        Some(SumRow {
            frequency_hz: line.frequency_hz,
            distance_m,
            level,
            limit,
            limit_dbuv_per_m,
        })
    }

    /// The lines of the sum, each at the distance where it is worst, worst first.
    pub(super) fn worst_sum_rows(&self) -> Vec<SumRow<'_>> {
        let by_margin = |a: &SumRow<'_>, b: &SumRow<'_>| a.margin_db().total_cmp(&b.margin_db());
        let lines = self.ranking.sum.lines.iter();
        let mut rows: Vec<SumRow<'_>> = lines
            .filter_map(|line| {
                let distances = 0..self.distances_m.len();
                let rows = distances.filter_map(|distance| self.sum_row(line, distance));
                rows.min_by(by_margin)
            })
            .collect();
        rows.sort_by(by_margin);
        rows
    }
}

/// A smaller gain is not worth a word.
const WORTH_A_WORD_DB: f64 = 0.5;

/// The change that helps most, if any helps.
pub(super) fn best_change(changes: &[Change]) -> Option<&Change> {
    changes
        .first()
        .filter(|change| change.gain_db >= WORTH_A_WORD_DB)
}

/// A change in words.
pub(super) fn remedy(remedy: Remedy) -> String {
    match remedy {
        Remedy::SeriesResistor { resistance_ohm } => {
            format!(
                "{} ohm in series at the driver",
                words::trimmed(resistance_ohm, 1)
            )
        }
        Remedy::SlowerEdge { rise_s } => {
            format!(
                "edges twice as slow ({} ns)",
                words::trimmed(rise_s * 1e9, 2)
            )
        }
        Remedy::HalfHeight { height_m } => {
            format!(
                "half the height over the plane ({} um)",
                words::trimmed(height_m * 1e6, 0)
            )
        }
        Remedy::QuietCables => "a filter or choke on the cables (at best)".into(),
    }
}
