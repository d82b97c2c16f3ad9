//! Which nets of a board to see to first, and what they make together.
//!
//! Nets are worked out in chunks, clock source by clock source, and only a few figures of each are kept, so that
//! memory grows neither with waveforms nor with harmonics times nets.

mod change;
mod filter;
mod sum;

pub use change::{Change, Remedy};
pub use filter::Filter;
pub use sum::{BoardSum, OWNERS_NAMED, Owner, SumLevel, SumLine, SumWorst};

use std::cmp::Ordering;

use super::check::{CheckSetup, board_antenna, judge_all, ring_all};
use super::tolerance::{Spread, spread_all};
use super::verdict::{Verdict, total_sigma_db};
use super::{Mechanism, NetResult, Worst};
use crate::board::{Board, Net, PathItem, VariedNets};
use crate::limit::{LimitAt, limits_at};
use crate::radiation::Antenna;
use crate::watch::{Unwatched, Watch};
use change::Before;
use sum::Summing;

/// Nets that are worked out at a time: enough to keep every thread busy, few enough for their waveforms to be held.
const CHUNK: usize = 128;

/// The nets of a board, worst first, and their sum.
#[derive(Debug, Clone)]
pub struct Ranking {
    /// The nets that were asked for, worst first.
    pub listed: Vec<RankedNet>,
    /// Number of nets that the filter keeps, listed or not.
    pub kept: usize,
    /// Every net that was worked out, by verdict.
    pub tally: Tally,
    /// Names of the nets that did not settle, in the order of the ranking.
    pub unsettled: Vec<String>,
    /// All nets together.
    pub sum: BoardSum,
    /// Nets that were worked out.
    pub done: usize,
    /// Nets that were to be.
    pub of: usize,
    /// Whether every change was tried that was to be.
    pub has_all_changes: bool,
}

impl Ranking {
    /// Whether it was stopped before every net was worked out, or every change tried.
    pub fn is_partial(&self) -> bool {
        self.done < self.of || !self.has_all_changes
    }
}

/// One net in the ranking.
#[derive(Debug, Clone)]
pub struct RankedNet {
    /// Its place among all nets, 1 is the worst.
    pub place: usize,
    /// Its name.
    pub name: String,
    /// Its clock.
    pub clock_hz: f64,
    /// The clock source, where the file names one.
    pub clock_source: Option<String>,
    /// Lines that it stands for.
    pub count: u32,
    /// The layers it runs on, each once, outwards from the driver.
    pub layers: Vec<String>,
    /// What its worst margin means.
    pub verdict: Verdict,
    /// Chance of failing, 0 to 1; `None` where nothing could be judged.
    pub chance_of_failing: Option<f64>,
    /// The smallest margin; `None` where no limit covers a harmonic or nothing radiates.
    pub worst: Option<Worst>,
    /// Standard deviation of the margin: of what is not modelled, of the instruments and of the tolerances drawn.
    pub sigma_db: f64,
    /// What its tolerances make of the margin, where it has some that were drawn.
    pub spread: Option<Spread>,
    /// Single changes that were tried, the most helpful first; empty where the net likely passes.
    pub changes: Vec<Change>,
    /// What the user should know, in plain sentences.
    pub warnings: Vec<String>,
}

/// Numbers of nets by verdict.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub struct Tally {
    /// Likely to fail.
    pub likely_fail: usize,
    /// In doubt.
    pub marginal: usize,
    /// Likely to pass.
    pub likely_pass: usize,
    /// Not judged.
    pub not_judged: usize,
}

/// What is kept of a net.
struct Summary {
    /// Its number on the board.
    net: usize,
    verdict: Verdict,
    chance_of_failing: Option<f64>,
    worst: Option<Worst>,
    settled: bool,
    warnings: Vec<String>,
    spread: Option<Spread>,
    before: Before,
}

/// Ranks the nets of a board by chance of failing, then margin, then name.
///
/// Every net is worked out and summed; of those that the filter keeps the worst `top` are listed, with the changes that
/// would help. Nets with tolerances are drawn so many times: their chance of failing is over the draws. The answer does not depend on the order of the nets or the number of threads. Where the watch says to
/// stop, what is finished by then is ranked.
pub fn rank(
    board: &Board,
    setup: &CheckSetup,
    filter: &Filter,
    top: Option<usize>,
    (varied, draws): (Option<&VariedNets>, usize),
    watch: &dyn Watch,
) -> Ranking {
    let order = by_clock_source(&board.nets);
    let antenna = antenna(board, &order, setup, watch);
    let limits = limits_of(setup);
    let mut summing = Summing::new(&setup.distances_m);
    let mut summaries: Vec<Summary> = Vec::with_capacity(order.len());
    watch.begin("nets", order.len());
    for chunk in order.chunks(CHUNK) {
        if watch.is_stopped() {
            break;
        }
        let nets: Vec<Net> = chunk.iter().map(|&net| board.nets[net].clone()).collect();
        let mut results = worked_out(&nets, board, antenna.as_ref(), setup, watch);
        if let Some(varied) = varied {
            let antenna = antenna.as_ref();
            spread_all(
                &mut results,
                varied,
                draws,
                antenna,
                board,
                setup,
                &Unwatched,
            );
        }
        for (&number, result) in chunk.iter().zip(results) {
            summing.add(number, &board.nets[number], &result);
            summaries.push(summary(number, result, &limits));
        }
    }
    let by_name = |net: usize| board.nets[net].name.as_str();
    summaries.sort_by(|a, b| worse_first(a, b).then_with(|| by_name(a.net).cmp(by_name(b.net))));
    let done = summaries.len();
    let tally = tally(&summaries);
    let unsettled = summaries.iter().filter(|summary| !summary.settled);
    let unsettled = unsettled.map(|s| by_name(s.net).to_owned()).collect();
    let mut kept: Vec<(usize, Summary)> = summaries
        .into_iter()
        .enumerate()
        .filter(|(_, summary)| filter.keeps(&board.nets[summary.net], summary.verdict))
        .collect();
    let kept_count = kept.len();
    kept.truncate(top.unwrap_or(usize::MAX));
    let (changes, has_all_changes) = change::tried(
        &patients(&kept, board),
        board,
        antenna.as_ref(),
        setup,
        watch,
    );
    let listed = kept.into_iter().zip(changes);
    let listed = listed
        .map(|((index, summary), changes)| ranked(index + 1, summary, changes, board, setup))
        .collect();
    Ranking {
        listed,
        kept: kept_count,
        tally,
        unsettled,
        sum: summing.finish(board, &limits, setup),
        done,
        of: order.len(),
        has_all_changes,
    }
}

/// Numbers of the nets, those of one clock source together, by names alone: whatever the order of the file.
fn by_clock_source(nets: &[Net]) -> Vec<usize> {
    let mut order: Vec<usize> = (0..nets.len()).collect();
    order.sort_by(|&a, &b| {
        let source = |net: usize| sum::source_of(&nets[net]);
        source(a)
            .cmp(&source(b))
            .then_with(|| nets[a].name.cmp(&nets[b].name))
    });
    order
}

/// The board's antenna, made for every clock there is.
fn antenna(
    board: &Board,
    order: &[usize],
    setup: &CheckSetup,
    watch: &dyn Watch,
) -> Box<dyn Antenna> {
    let mut of_each_clock: Vec<Net> = Vec::new();
    if board.plane.is_some() {
        let mut clocks_hz = std::collections::HashSet::new();
        for &net in order {
            let net = &board.nets[net];
            if clocks_hz.insert(net.clock_hz.to_bits()) {
                of_each_clock.push(net.clone());
            }
        }
    }
    let rung = ring_all(&of_each_clock, board, setup, watch);
    board_antenna(board, &rung, setup, watch)
}

/// Tells of the steps within a stretch that has begun elsewhere.
struct StepsOf<'a>(&'a dyn Watch);

impl Watch for StepsOf<'_> {
    fn begin(&self, _: &'static str, _: usize) {}

    fn step(&self) {
        self.0.step();
    }
}

/// Fields and margins of some nets; the ringing, which takes most of the time, is watched.
fn worked_out(
    nets: &[Net],
    board: &Board,
    antenna: &dyn Antenna,
    setup: &CheckSetup,
    watch: &dyn Watch,
) -> Vec<NetResult> {
    let rung = ring_all(nets, board, setup, &StepsOf(watch));
    judge_all(antenna, rung, setup, &Unwatched)
}

/// The limits at every distance.
fn limits_of(setup: &CheckSetup) -> Vec<Vec<LimitAt>> {
    let distances_m = setup.distances_m.iter();
    distances_m
        .map(|&distance_m| limits_at(&setup.limits, distance_m))
        .collect()
}

fn summary(net: usize, result: NetResult, limits: &[Vec<LimitAt>]) -> Summary {
    Summary {
        net,
        before: Before::of(&result, limits),
        verdict: result.verdict,
        chance_of_failing: result.chance_of_failing,
        worst: result.worst,
        settled: result.march.settled,
        warnings: result.warnings,
        spread: result.spread,
    }
}

fn worse_first(a: &Summary, b: &Summary) -> Ordering {
    let chance = |s: &Summary| s.chance_of_failing.unwrap_or(-1.0);
    let margin = |s: &Summary| s.worst.as_ref().map_or(f64::INFINITY, |w| w.margin_db);
    chance(b)
        .total_cmp(&chance(a))
        .then_with(|| margin(a).total_cmp(&margin(b)))
}

fn tally(summaries: &[Summary]) -> Tally {
    let mut tally = Tally::default();
    for summary in summaries {
        *match summary.verdict {
            Verdict::LikelyFail => &mut tally.likely_fail,
            Verdict::Marginal => &mut tally.marginal,
            Verdict::LikelyPass => &mut tally.likely_pass,
            Verdict::NotJudged => &mut tally.not_judged,
        } += 1;
    }
    tally
}

/// The nets to be listed, and which of them are worth a change.
fn patients<'a>(kept: &'a [(usize, Summary)], board: &'a Board) -> Vec<change::Patient<'a>> {
    kept.iter()
        .map(|(_, summary)| change::Patient {
            net: &board.nets[summary.net],
            margin_db: match summary.verdict {
                Verdict::LikelyFail | Verdict::Marginal => {
                    summary.worst.as_ref().map(|worst| worst.margin_db)
                }
                Verdict::LikelyPass | Verdict::NotJudged => None,
            },
            cables_rule: summary
                .worst
                .as_ref()
                .is_some_and(|worst| worst.mechanism == Mechanism::Cables),
            before: &summary.before,
        })
        .collect()
}

fn ranked(
    place: usize,
    summary: Summary,
    changes: Vec<Change>,
    board: &Board,
    setup: &CheckSetup,
) -> RankedNet {
    let net = &board.nets[summary.net];
    RankedNet {
        place,
        name: net.name.clone(),
        clock_hz: net.clock_hz,
        clock_source: net.group.clock_source.as_deref().map(str::to_owned),
        count: net.group.count,
        layers: layers(net),
        verdict: summary.verdict,
        chance_of_failing: summary.chance_of_failing,
        worst: summary.worst,
        sigma_db: sigma_db(summary.spread.as_ref(), setup),
        spread: summary.spread,
        changes,
        warnings: summary.warnings,
    }
}

fn sigma_db(spread: Option<&Spread>, setup: &CheckSetup) -> f64 {
    let of_tolerances_db = spread.and_then(|spread| Some(spread.margins.as_ref()?.sd_db));
    total_sigma_db(setup.model_sigma_db).hypot(of_tolerances_db.unwrap_or(0.0))
}

/// The layers a net runs on, each once.
fn layers(net: &Net) -> Vec<String> {
    fn collect(path: &[PathItem], found: &mut Vec<String>) {
        for item in path {
            match item {
                PathItem::Trace(trace) if !found.contains(&trace.layer.name) => {
                    found.push(trace.layer.name.clone());
                }
                PathItem::Branch(items) => collect(items, found),
                _ => {}
            }
        }
    }
    let mut found = Vec::new();
    collect(&net.path, &mut found);
    found
}

#[cfg(test)]
mod tests;
