//! What tolerances make of a margin: its spread, the chance of failing, and which of them carry the spread.
//!
//! A net that has tolerances is read, rung and judged again for every draw, on the same antenna. The draws are points
//! of one fixed low-discrepancy sequence, so a result depends on the net, the setup and the number of draws alone:
//! neither on the other nets nor on the number of threads.

mod carried;
mod scores;

pub use scores::MOST_DRAWS;

use super::verdict::{Verdict, chance_of_failing, total_sigma_db};
use super::{CheckSetup, NetResult, Unwatched, Watch, board_antenna, judge_all, ring, ring_all};
use crate::board::{Board, VariedNet, VariedNets};
use crate::radiation::Antenna;
use crate::text::Tolerance;
use ndarray::{Array1, Array2};
use rayon::prelude::*;
use scores::scores;

/// Fewer draws say nothing of a 5 % quantile.
pub const FEWEST_DRAWS: usize = 16;
/// Samples of a net's waveforms kept at a time, over several draws.
const SAMPLES_AT_A_TIME: usize = 1 << 21;
const MOST_AT_A_TIME: usize = 256;

/// What its tolerances make of a net's margin.
#[derive(Debug, Clone, PartialEq)]
pub struct Spread {
    /// How many draws were tried.
    pub draws: usize,
    /// How many of them gave no margin; they are in no figure.
    pub failed: usize,
    /// Why the first of these gave none.
    pub first_failure: Option<String>,
    /// The margins of the others; `None` where fewer than two gave one.
    pub margins: Option<MarginSpread>,
}

/// How margins are spread over draws.
#[derive(Debug, Clone, PartialEq)]
pub struct MarginSpread {
    /// Their mean.
    pub mean_db: f64,
    /// Their standard deviation.
    pub sd_db: f64,
    /// 5 % lie below.
    pub low_db: f64,
    /// 5 % lie above.
    pub high_db: f64,
    /// Mean over the draws of the chance of failing that each margin has by what is not modelled and by the
    /// instruments.
    pub chance_of_failing: f64,
    /// What carries the spread; `None` where the draws are too few to tell.
    pub carried: Option<Carried>,
}

/// What carries a spread.
#[derive(Debug, Clone, PartialEq)]
pub struct Carried {
    /// Every tolerance of the net, the largest share first.
    pub by: Vec<CarriedBy>,
    /// The share that no tolerance makes by itself, 0 to 1.
    pub unexplained: f64,
}

/// What one tolerance carries.
#[derive(Debug, Clone, PartialEq)]
pub struct CarriedBy {
    /// What the user calls it: `strong-cmos rise`.
    pub name: String,
    /// Its share of the variance, 0 to 1.
    pub share: f64,
}

/// [`check`](super::check), and what tolerances make of the margins by so many draws.
pub fn check_drawn(
    board: &Board,
    varied: Option<&VariedNets>,
    draws: usize,
    setup: &CheckSetup,
    watch: &dyn Watch,
) -> Vec<NetResult> {
    let rung = ring_all(&board.nets, board, setup, watch);
    let antenna = board_antenna(board, &rung, setup, watch);
    let mut results = judge_all(antenna.as_ref(), rung, setup, watch);
    if let Some(varied) = varied {
        spread_all(
            &mut results,
            varied,
            draws,
            antenna.as_ref(),
            board,
            setup,
            watch,
        );
    }
    results
}

/// Draws every judged net that has tolerances: its spread, and its chance of failing and verdict from the draws in
/// place of the nominal ones. The other figures stay nominal. No draws change nothing.
pub fn spread_all(
    results: &mut [NetResult],
    varied: &VariedNets,
    draws: usize,
    antenna: &dyn Antenna,
    board: &Board,
    setup: &CheckSetup,
    watch: &dyn Watch,
) {
    let draws = draws.min(MOST_DRAWS);
    let mut drawn: Vec<(&mut NetResult, &VariedNet)> = results
        .iter_mut()
        .filter(|result| result.worst.is_some() && draws > 0)
        .filter_map(|result| varied.get(&result.name).map(|net| (result, net)))
        .collect();
    watch.begin("draws", drawn.len() * draws);
    for (result, net) in &mut drawn {
        let samples = result.waveform.driver_v.len().max(1);
        let at_a_time = (SAMPLES_AT_A_TIME / samples).clamp(1, MOST_AT_A_TIME);
        let mut margins_db = Vec::with_capacity(draws);
        for first in (0..draws).step_by(at_a_time) {
            let batch = first..draws.min(first + at_a_time);
            let read = |draw| varied.drawn(net, &scores(draw, net.tolerances.len()));
            let rung: Vec<_> = batch
                .into_par_iter()
                .map(|draw| {
                    let rung = read(draw).map(|net| ring(&net, board, setup));
                    watch.step();
                    rung
                })
                .collect();
            margins_db.extend(margins(antenna, rung, setup));
        }
        let spread = spread(net, margins_db, setup.model_sigma_db);
        if let Some(margins) = &spread.margins {
            result.chance_of_failing = Some(margins.chance_of_failing);
            result.verdict = Verdict::of(margins.chance_of_failing);
        }
        result.spread = Some(spread);
    }
}

/// The margin of every draw, or why it has none, in their order.
fn margins(
    antenna: &dyn Antenna,
    rung: Vec<Result<super::RungNet, String>>,
    setup: &CheckSetup,
) -> Vec<Result<f64, String>> {
    let failures: Vec<Option<String>> =
        rung.iter().map(|net| net.as_ref().err().cloned()).collect();
    let sound = rung.into_iter().filter_map(Result::ok).collect();
    let mut judged = judge_all(antenna, sound, setup, &Unwatched).into_iter();
    let mut margin = || {
        let worst = judged.next().and_then(|net| net.worst);
        let margin_db = worst.map(|worst| worst.margin_db);
        margin_db
            .filter(|margin_db| margin_db.is_finite())
            .ok_or_else(|| "no part of the net radiates".to_owned())
    };
    failures
        .into_iter()
        .map(|failure| failure.map_or_else(&mut margin, Err))
        .collect()
}

/// The spread of a net from the margins of all its draws.
fn spread(net: &VariedNet, margins: Vec<Result<f64, String>>, model_sigma_db: f64) -> Spread {
    let draws = margins.len();
    let first_failure = margins.iter().find_map(|margin| margin.clone().err());
    let sound: Vec<(usize, f64)> = margins
        .into_iter()
        .enumerate()
        .filter_map(|(draw, margin)| Some((draw, margin.ok()?)))
        .collect();
    Spread {
        draws,
        failed: draws - sound.len(),
        first_failure,
        margins: (sound.len() > 1).then(|| margin_spread(net, &sound, model_sigma_db)),
    }
}

/// How the margins of some draws are spread, each with its number.
fn margin_spread(net: &VariedNet, draws: &[(usize, f64)], model_sigma_db: f64) -> MarginSpread {
    let count = draws.len() as f64;
    let margins_db: Array1<f64> = draws.iter().map(|(_, margin_db)| *margin_db).collect();
    let mean_db = margins_db.sum() / count;
    let squares: f64 = margins_db
        .iter()
        .map(|margin| (margin - mean_db).powi(2))
        .sum();
    let sigma_db = total_sigma_db(model_sigma_db);
    let chances = margins_db
        .iter()
        .map(|&margin_db| chance_of_failing(margin_db, sigma_db));
    let mut sorted = margins_db.to_vec();
    sorted.sort_by(f64::total_cmp);
    MarginSpread {
        mean_db,
        sd_db: (squares / (count - 1.0)).sqrt(),
        low_db: quantile(&sorted, 0.05),
        high_db: quantile(&sorted, 0.95),
        chance_of_failing: chances.sum::<f64>() / count,
        carried: carried(net, draws, &margins_db),
    }
}

/// What carries the spread of these draws.
fn carried(net: &VariedNet, draws: &[(usize, f64)], margins_db: &Array1<f64>) -> Option<Carried> {
    let tolerances: Vec<Tolerance> = net.tolerances.iter().map(|named| named.tolerance).collect();
    let of_draws = draws
        .iter()
        .flat_map(|(draw, _)| scores(*draw, tolerances.len()));
    let shape = (draws.len(), tolerances.len());
    let table = Array2::from_shape_vec(shape, of_draws.collect()).ok()?;
    let shares = carried::shares(&tolerances, &table, margins_db)?;
    let unexplained = (1.0 - shares.iter().sum::<f64>()).clamp(0.0, 1.0);
    let names = net.tolerances.iter().map(|named| named.name.clone());
    let mut by: Vec<CarriedBy> = names
        .zip(shares)
        .map(|(name, share)| CarriedBy { name, share })
        .collect();
    by.sort_by(|a, b| b.share.total_cmp(&a.share));
    Some(Carried { by, unexplained })
}

/// The value below which a share of some sorted values lies, on the straight line between the two nearest.
fn quantile(sorted: &[f64], share: f64) -> f64 {
    let place = share * (sorted.len() - 1) as f64;
    let below = place as usize;
    let above = (below + 1).min(sorted.len() - 1);
    sorted[below] + (place - below as f64) * (sorted[above] - sorted[below])
}
