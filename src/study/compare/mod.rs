//! One net under several terminations, edges or layouts: what each buys, and what it costs.

mod fault;
mod incidence;
mod power;
mod probe;
mod reception;

pub use fault::Fault;
pub use incidence::FirstWave;
pub use power::TerminationPower;
pub use reception::{Reception, USUAL_THRESHOLDS};

use rayon::prelude::*;

use self::power::termination_power;
use self::probe::{Probed, probed, taken_out};
use self::reception::receptions;
use super::change::place::{branching, is_leg, is_terminated};
use super::change::{ApplyError, Change, SeriesPlace, Sweep, Try};
use super::values::E24Step;
use super::{CheckSetup, Harmonic, NetResult, RungNet, Watch, board_antenna, judge_all, ring};
use crate::board::{Board, Net, PathItem};
use crate::limit::{LimitAt, limits_at};
use crate::line::{line_of_direct, line_of_trace};
use crate::radiation::Antenna;

/// How many of the worst harmonics are followed through the variants.
const FOLLOWED: usize = 3;

/// A net with a try on it, worked out.
#[derive(Debug, Clone)]
pub struct Variant {
    /// What it is called: the try, or the board it stands on.
    pub name: String,
    /// The net with the try on it.
    pub net: Net,
    /// What `check` says of it.
    pub result: NetResult,
    /// How every receiver is served, in the order of [`Signal::receivers`](super::Signal::receivers).
    pub receptions: Vec<Reception>,
    /// The power of its terminating parts.
    pub power: TerminationPower,
}

/// Several variants of a net; the first is what the others are held against.
#[derive(Debug, Clone)]
pub struct Comparison {
    /// The net's name.
    pub net: String,
    /// The variants.
    pub variants: Vec<Variant>,
    /// The worst harmonics of the first variant, worst first.
    pub followed: Vec<Followed>,
}

/// A harmonic that is followed through the variants.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Followed {
    /// Its number.
    pub harmonic: usize,
    /// Its frequency.
    pub frequency_hz: f64,
    /// The distance at which its margin is smallest.
    pub distance_m: f64,
    /// That margin, of the first variant.
    pub margin_db: f64,
}

impl Variant {
    /// The worst margin; infinite where nothing is judged.
    pub fn margin_db(&self) -> f64 {
        let worst = self.result.worst.as_ref();
        worst.map_or(f64::INFINITY, |worst| worst.margin_db)
    }

    /// The largest overshoot or undershoot of all receivers.
    pub fn overshoot_v(&self) -> f64 {
        let receivers = self.result.signal.receivers.iter();
        receivers
            .map(|receiver| receiver.overshoot_v.max(receiver.undershoot_v))
            .fold(0.0, f64::max)
    }

    /// The longest settling of all receivers; `None` where one does not settle.
    pub fn settling_s(&self) -> Option<f64> {
        let mut receivers = self.result.signal.receivers.iter();
        receivers.try_fold(0.0f64, |longest, receiver| {
            Some(longest.max(receiver.settling_s?))
        })
    }

    /// Everything about it that is not safe.
    pub fn faults(&self) -> Vec<Fault> {
        fault::faults(self)
    }

    /// Everything about it that is not safe, and what it makes worse than it was before.
    pub fn faults_against(&self, before: &Self) -> Vec<Fault> {
        let mut faults = self.faults();
        faults.extend(fault::worsened(self, before));
        faults
    }

    /// The field of a harmonic at a distance.
    pub fn field_dbuv_per_m(&self, harmonic: usize, distance_m: f64) -> Option<f64> {
        let harmonic = self
            .result
            .harmonics
            .iter()
            .find(|h| h.number == harmonic)?;
        let field = harmonic
            .fields
            .iter()
            .find(|f| f.distance_m == distance_m)?;
        field.field_dbuv_per_m
    }
}

impl Comparison {
    /// Change of a followed harmonic against the first variant, in dB.
    pub fn change_db(&self, variant: &Variant, followed: &Followed) -> Option<f64> {
        let field =
            |variant: &Variant| variant.field_dbuv_per_m(followed.harmonic, followed.distance_m);
        Some(field(variant)? - field(self.variants.first()?)?)
    }

    /// Delay at the threshold of a receiver beyond that of the first variant.
    pub fn added_delay_s(&self, variant: &Variant, receiver: usize) -> Option<f64> {
        let delay = |variant: &Variant| variant.receptions.get(receiver)?.delay_s;
        Some(delay(variant)? - delay(self.variants.first()?)?)
    }
}

/// A bench for variants of some nets of a board: the board's antenna, worked out once.
pub struct Bench<'b> {
    board: &'b Board,
    /// Where layers are looked up.
    layers_of: &'b Board,
    setup: &'b CheckSetup,
    antenna: Box<dyn Antenna>,
}

impl<'b> Bench<'b> {
    /// A bench for these nets and any variant of them.
    pub fn new(nets: &[Net], board: &'b Board, setup: &'b CheckSetup, watch: &dyn Watch) -> Self {
        let rung: Vec<RungNet> = nets.par_iter().map(|net| ring(net, board, setup)).collect();
        Self {
            board,
            layers_of: board,
            setup,
            antenna: board_antenna(board, &rung, setup, watch),
        }
    }

    /// The same, with the layers that this board's nets run on to be tried.
    pub fn with_layers_of(self, layers_of: &'b Board) -> Self {
        Self { layers_of, ..self }
    }

    /// The board.
    pub fn board(&self) -> &'b Board {
        self.board
    }

    /// The board whose layers may be tried.
    pub fn layers_of(&self) -> &'b Board {
        self.layers_of
    }

    /// The antenna that the board is.
    pub fn antenna(&self) -> &dyn Antenna {
        self.antenna.as_ref()
    }

    /// What is measured, and against what.
    pub fn setup(&self) -> &'b CheckSetup {
        self.setup
    }

    /// Works variants out, in their order.
    pub fn measure(&self, named: Vec<(String, Net)>, watch: &dyn Watch) -> Vec<Variant> {
        watch.begin("variants", named.len());
        let rung: Vec<(Net, Vec<Probed>, RungNet)> = named
            .par_iter()
            .map(|(_, net)| {
                let (probed, parts) = probed(net);
                let rung = ring(&probed, self.board, self.setup);
                watch.step();
                (probed, parts, rung)
            })
            .collect();
        let (parts, rung): (Vec<(Net, Vec<Probed>)>, Vec<RungNet>) = rung
            .into_iter()
            .map(|(net, parts, rung)| ((net, parts), rung))
            .unzip();
        let results = judge_all(self.antenna.as_ref(), rung, self.setup, watch);
        let together: Vec<_> = named.into_iter().zip(parts).zip(results).collect();
        together
            .into_par_iter()
            .map(|(((name, net), (probed, parts)), mut result)| {
                let readings = taken_out(&mut result);
                let power = termination_power(&probed, &parts, &readings, &result.waveform.pace);
                Variant {
                    name,
                    receptions: receptions(&net, &result),
                    net,
                    result,
                    power,
                }
            })
            .collect()
    }

    /// Works tries on a net out, in their order.
    ///
    /// # Errors
    ///
    /// A try that the net cannot take.
    pub fn try_on(
        &self,
        net: &Net,
        tries: &[Try],
        watch: &dyn Watch,
    ) -> Result<Vec<Variant>, ApplyError> {
        let named: Vec<(String, Net)> = tries
            .iter()
            .map(|tried| Ok((tried.to_string(), tried.on(net, self.layers_of)?)))
            .collect::<Result<_, ApplyError>>()?;
        Ok(self.measure(named, watch))
    }
}

/// Compares tries on one net; the net as it is comes first. Without tries, it is held against the bare net, or where
/// it is bare itself, against its matched series termination.
///
/// # Errors
///
/// A try that the net cannot take.
pub fn compare(
    net: &Net,
    tries: &[Try],
    bench: &Bench,
    watch: &dyn Watch,
) -> Result<Comparison, ApplyError> {
    let mut all = vec![Try::as_is()];
    match tries {
        [] => all.push(usual_try(net)),
        tries => all.extend(
            tries
                .iter()
                .filter(|tried| **tried != Try::as_is())
                .cloned(),
        ),
    }
    let variants = bench.try_on(net, &all, watch)?;
    Ok(comparison(&net.name, variants, bench.setup))
}

/// The variants of one net side by side, the first of them what the others are held against.
pub fn comparison(net: &str, variants: Vec<Variant>, setup: &CheckSetup) -> Comparison {
    let first = variants.first();
    Comparison {
        net: net.to_owned(),
        followed: first
            .map(|first| followed(first, setup))
            .unwrap_or_default(),
        variants,
    }
}

/// Works a sweep out.
///
/// # Errors
///
/// A try that the net cannot take.
pub fn sweep(
    net: &Net,
    sweep: &Sweep,
    bench: &Bench,
    watch: &dyn Watch,
) -> Result<Vec<Variant>, ApplyError> {
    let tries: Vec<Try> = sweep.steps.iter().map(|(_, tried)| tried.clone()).collect();
    bench.try_on(net, &tries, watch)
}

fn usual_try(net: &Net) -> Try {
    if is_terminated(&net.path) {
        Try::bare()
    } else {
        matched_series(net)
    }
}

/// The matched series termination of a net: what its lines show where they leave the driver, less the driver's own
/// resistance, in E24. Legs that leave the driver each get their own.
pub fn matched_series(net: &Net) -> Try {
    /// Where the driver itself matches already, a little to show what more does.
    const LEAST_OHM: f64 = 10.0;
    let driver = &net.driver;
    let driver_ohm = (driver.low_resistance_ohm + driver.high_resistance_ohm) / 2.0;
    let star = star_legs(&net.path);
    let (ohm, at) = match star {
        // The legs share the driver: each must make up for its own share of it alone.
        count if count > 1 => (
            first_impedance_ohm(&net.path) - count as f64 * driver_ohm,
            SeriesPlace::Legs,
        ),
        _ => (
            first_impedance_ohm(&net.path) - driver_ohm,
            SeriesPlace::Driver,
        ),
    };
    Try::of(vec![Change::Series {
        resistance_ohm: E24Step::nearest(ohm.max(LEAST_OHM)).value(),
        inductance_h: 0.0,
        at,
    }])
}

/// How many legs leave the driver itself, without a line before they part.
pub(super) fn star_legs(path: &[PathItem]) -> usize {
    let Some((first, after)) = branching(path) else {
        return 0;
    };
    let is_line = |item: &PathItem| matches!(item, PathItem::Trace(_) | PathItem::Line(_));
    if path[..first].iter().any(is_line) {
        return 0;
    }
    let legs = path[first..after]
        .iter()
        .filter(|item| is_leg(item))
        .count();
    legs + usize::from(super::change::place::has_line(&path[after..]))
}

/// The impedance of the first line of a path; that of a usual trace where there is none.
pub(super) fn first_impedance_ohm(path: &[PathItem]) -> f64 {
    fn first(path: &[PathItem]) -> Option<f64> {
        path.iter().find_map(|item| match item {
            PathItem::Trace(trace) => Some(line_of_trace(trace).0.impedance_ohm),
            PathItem::Line(line) => Some(line_of_direct(line).impedance_ohm),
            PathItem::Branch(items) => first(items),
            _ => None,
        })
    }
    first(path).unwrap_or(50.0)
}

/// The worst harmonics of a variant, each at the distance where it is worst.
fn followed(variant: &Variant, setup: &CheckSetup) -> Vec<Followed> {
    let limits: Vec<Vec<LimitAt>> = (setup.distances_m.iter())
        .map(|&distance_m| limits_at(&setup.limits, distance_m))
        .collect();
    let worst_of = |harmonic: &Harmonic| {
        let readings = harmonic.fields.iter().zip(&limits);
        let margins = readings.flat_map(|(reading, limits)| {
            limits.iter().filter_map(|limit| {
                Some(Followed {
                    harmonic: harmonic.number,
                    frequency_hz: harmonic.frequency_hz,
                    distance_m: reading.distance_m,
                    margin_db: limit.at(harmonic.frequency_hz)? - reading.field_dbuv_per_m?,
                })
            })
        });
        margins.min_by(|a, b| a.margin_db.total_cmp(&b.margin_db))
    };
    let mut all: Vec<Followed> = variant
        .result
        .harmonics
        .iter()
        .filter_map(worst_of)
        .collect();
    all.sort_by(|a, b| a.margin_db.total_cmp(&b.margin_db));
    all.truncate(FOLLOWED);
    all
}
