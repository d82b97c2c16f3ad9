//! What all nets of a board make together.
//!
//! Lines of one clock source keep step. How their fields lie to one another at the antenna hangs on edges, routes and
//! directions that no board file tells, so the worst case is taken: the sizes of their fields add up. That is an upper
//! bound; the power sum of all nets, as if none kept step, stands beside it. Different sources, and nets whose phase is
//! independent, add by power. What lies within one bandwidth of the receiver is read as one.

use std::collections::BTreeMap;

use super::super::check::CheckSetup;
use super::super::verdict::{Verdict, chance_of_failing, total_sigma_db};
use crate::board::{Board, Net, Phase};
use crate::limit::LimitAt;
use crate::study::NetResult;

/// Owners that are named of a frequency.
pub const OWNERS_NAMED: usize = 3;
/// Bandwidth of the receiver up to 1 GHz and above (CISPR 16-1-1).
const BANDWIDTH_HZ: f64 = 120e3;
const BANDWIDTH_ABOVE_1_GHZ_HZ: f64 = 1e6;

/// All nets together.
#[derive(Debug, Clone, Default)]
pub struct BoardSum {
    /// What the receiver reads, by rising frequency.
    pub lines: Vec<SumLine>,
    /// The smallest margin; `None` where no limit covers a line.
    pub worst: Option<SumWorst>,
}

/// What the receiver reads at one frequency.
#[derive(Debug, Clone, PartialEq)]
pub struct SumLine {
    /// The frequency of its strongest part.
    pub frequency_hz: f64,
    /// The levels at each distance asked for; `None` where nothing radiates.
    pub levels: Vec<Option<SumLevel>>,
}

/// The sum at one frequency and distance.
#[derive(Debug, Clone, PartialEq)]
pub struct SumLevel {
    /// Nets of one clock source in step.
    pub field_dbuv_per_m: f64,
    /// As if no net kept step with another.
    pub by_power_dbuv_per_m: f64,
    /// Number of nets with a part in it.
    pub nets: usize,
    /// The nets with the largest part, the largest first.
    pub owners: Vec<Owner>,
}

/// A net with a large part in a sum.
#[derive(Debug, Clone, PartialEq)]
pub struct Owner {
    /// The net's name.
    pub net: String,
    /// What it makes alone.
    pub field_dbuv_per_m: f64,
    /// What the sum would fall by without it.
    pub relief_db: f64,
}

/// The line of the sum with the smallest margin.
#[derive(Debug, Clone, PartialEq)]
pub struct SumWorst {
    /// Title of the limit.
    pub limit: String,
    /// The frequency.
    pub frequency_hz: f64,
    /// Distance of the antenna.
    pub distance_m: f64,
    /// The limit there.
    pub limit_dbuv_per_m: f64,
    /// Limit less sum.
    pub margin_db: f64,
    /// Standard deviation of the margin.
    pub sigma_db: f64,
    /// Chance of failing, 0 to 1.
    pub chance_of_failing: f64,
    /// What that means.
    pub verdict: Verdict,
    /// The sum there.
    pub level: SumLevel,
}

/// What makes nets keep step: the name of their clock source, or else their clock.
pub(super) fn source_of(net: &Net) -> (Option<&str>, u64) {
    match net.group.clock_source.as_deref() {
        Some(name) => (Some(name), 0),
        // Positive numbers are ordered as their bits are.
        None => (None, net.clock_hz.to_bits()),
    }
}

/// A frequency in whole hertz: multiples of two clocks may differ by a rounding.
type Hertz = u64;

/// The sum while nets are added, clock source by clock source.
pub(super) struct Summing {
    distances: usize,
    /// The source at hand, as its name and clock.
    source: Option<(Option<String>, u64)>,
    /// The lines of the source at hand, distance by distance.
    in_step: Vec<BTreeMap<Hertz, InStep>>,
    /// All finished sources.
    board: Vec<BTreeMap<Hertz, ByPower>>,
}

/// Nets of one source at one frequency.
#[derive(Default)]
struct InStep {
    field_v_per_m: f64,
    power: f64,
    nets: usize,
    largest: Largest,
}

/// Sources at one frequency.
#[derive(Default, Clone)]
struct ByPower {
    power: f64,
    unrelated_power: f64,
    nets: usize,
    largest: Largest,
}

/// The nets with the largest fields, the largest first.
#[derive(Default, Clone)]
struct Largest(Vec<Part>);

#[derive(Clone, Copy)]
struct Part {
    net: usize,
    field_v_per_m: f64,
    /// What the sum's power would lose without it.
    relief_power: f64,
}

impl Largest {
    fn add(&mut self, part: Part) {
        let place = self
            .0
            .partition_point(|other| other.field_v_per_m >= part.field_v_per_m);
        if place < OWNERS_NAMED {
            self.0.insert(place, part);
            self.0.truncate(OWNERS_NAMED);
        }
    }
}

impl Summing {
    pub(super) fn new(distances_m: &[f64]) -> Self {
        let distances = distances_m.len();
        Self {
            distances,
            source: None,
            in_step: (0..distances).map(|_| BTreeMap::new()).collect(),
            board: vec![BTreeMap::new(); distances],
        }
    }

    /// Adds a net. Nets of one source have to come together.
    pub(super) fn add(&mut self, number: usize, net: &Net, result: &NetResult) {
        let (name, clock) = source_of(net);
        let source = Some((name.map(str::to_owned), clock));
        if self.source != source {
            self.finish_source();
            self.source = source;
        }
        for harmonic in &result.harmonics {
            let hertz = harmonic.frequency_hz.round() as Hertz;
            for (distance, reading) in harmonic.fields.iter().enumerate() {
                let level = reading.field_dbuv_per_m.filter(|level| level.is_finite());
                let Some(level) = level else { continue };
                let field_v_per_m = 1e-6 * 10f64.powf(level / 20.0);
                self.add_line(distance, hertz, number, field_v_per_m, net.group.phase);
            }
        }
    }

    fn add_line(
        &mut self,
        distance: usize,
        hertz: Hertz,
        net: usize,
        field_v_per_m: f64,
        phase: Phase,
    ) {
        let power = field_v_per_m * field_v_per_m;
        let part = Part {
            net,
            field_v_per_m,
            relief_power: power,
        };
        match phase {
            Phase::Locked => {
                let sum = self.in_step[distance].entry(hertz).or_default();
                sum.field_v_per_m += field_v_per_m;
                sum.power += power;
                sum.nets += 1;
                sum.largest.add(part);
            }
            Phase::Independent => {
                let sum = self.board[distance].entry(hertz).or_default();
                sum.power += power;
                sum.unrelated_power += power;
                sum.nets += 1;
                sum.largest.add(part);
            }
        }
    }

    /// Adds the source at hand to the board by power.
    fn finish_source(&mut self) {
        for (in_step, board) in self.in_step.iter_mut().zip(&mut self.board) {
            for (hertz, source) in std::mem::take(in_step) {
                let sum = board.entry(hertz).or_default();
                let whole = source.field_v_per_m;
                sum.power += whole * whole;
                sum.unrelated_power += source.power;
                sum.nets += source.nets;
                for part in source.largest.0 {
                    let rest = whole - part.field_v_per_m;
                    sum.largest.add(Part {
                        relief_power: whole * whole - rest * rest,
                        ..part
                    });
                }
            }
        }
    }

    /// The sum of all nets added.
    pub(super) fn finish(
        mut self,
        board: &Board,
        limits: &[Vec<LimitAt>],
        setup: &CheckSetup,
    ) -> BoardSum {
        self.finish_source();
        let lines = self.lines(board);
        let worst = worst(&lines, limits, setup);
        BoardSum { lines, worst }
    }

    /// Frequencies that lie within one bandwidth, read as one.
    fn lines(&self, board: &Board) -> Vec<SumLine> {
        let mut all: Vec<Hertz> = self.board.iter().flat_map(|b| b.keys().copied()).collect();
        all.sort_unstable();
        all.dedup();
        let mut lines = Vec::new();
        let mut rest = all.as_slice();
        while let Some(&first) = rest.first() {
            let bandwidth_hz = if first < 1_000_000_000 {
                BANDWIDTH_HZ
            } else {
                BANDWIDTH_ABOVE_1_GHZ_HZ
            };
            let count = rest.partition_point(|hertz| ((hertz - first) as f64) < bandwidth_hz);
            let (together, after) = rest.split_at(count);
            rest = after;
            lines.push(self.line(together, board));
        }
        lines
    }

    fn line(&self, together: &[Hertz], board: &Board) -> SumLine {
        let mut strongest = (0.0, together[0]);
        let mut levels = Vec::with_capacity(self.distances);
        for at_distance in &self.board {
            let mut sum = ByPower::default();
            for hertz in together {
                let Some(part) = at_distance.get(hertz) else {
                    continue;
                };
                if part.power > strongest.0 {
                    strongest = (part.power, *hertz);
                }
                sum.power += part.power;
                sum.unrelated_power += part.unrelated_power;
                // A net with several harmonics in one bandwidth counts once.
                sum.nets = sum.nets.max(part.nets);
                for owner in &part.largest.0 {
                    if sum.largest.0.iter().all(|other| other.net != owner.net) {
                        sum.largest.add(*owner);
                    }
                }
            }
            levels.push(level(&sum, board));
        }
        SumLine {
            frequency_hz: strongest.1 as f64,
            levels,
        }
    }
}

fn level(sum: &ByPower, board: &Board) -> Option<SumLevel> {
    let decibels = |power: f64| 10.0 * (power * 1e12).log10();
    (sum.power > 0.0).then(|| SumLevel {
        field_dbuv_per_m: decibels(sum.power),
        by_power_dbuv_per_m: decibels(sum.unrelated_power),
        nets: sum.nets,
        owners: sum
            .largest
            .0
            .iter()
            .map(|part| Owner {
                net: board.nets[part.net].name.clone(),
                field_dbuv_per_m: decibels(part.field_v_per_m * part.field_v_per_m),
                relief_db: relief_db(sum.power, part.relief_power),
            })
            .collect(),
    })
}

/// What a power falls by without a part of it; a lone net leaves nothing, which is called 100 dB.
fn relief_db(power: f64, without: f64) -> f64 {
    let rest = ((power - without) / power).max(1e-10);
    -10.0 * rest.log10()
}

fn worst(lines: &[SumLine], limits: &[Vec<LimitAt>], setup: &CheckSetup) -> Option<SumWorst> {
    let sigma_db = total_sigma_db(setup.model_sigma_db);
    let mut worst: Option<SumWorst> = None;
    for line in lines {
        for ((level, limits), &distance_m) in line.levels.iter().zip(limits).zip(&setup.distances_m)
        {
            let Some(level) = level else { continue };
            for limit in limits {
                let Some(limit_dbuv_per_m) = limit.at(line.frequency_hz) else {
                    continue;
                };
                let margin_db = limit_dbuv_per_m - level.field_dbuv_per_m;
                if worst.as_ref().is_some_and(|w| w.margin_db <= margin_db) {
                    continue;
                }
                let chance = chance_of_failing(margin_db, sigma_db);
                worst = Some(SumWorst {
                    limit: limit.title.clone(),
                    frequency_hz: line.frequency_hz,
                    distance_m,
                    limit_dbuv_per_m,
                    margin_db,
                    sigma_db,
                    chance_of_failing: chance,
                    verdict: Verdict::of(chance),
                    level: level.clone(),
                });
            }
        }
    }
    worst
}
