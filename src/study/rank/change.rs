//! The one change that would help a net most: a few are tried on it, through the same ringing and the same antenna.

use std::sync::Arc;

use super::super::check::CheckSetup;
use super::{CHUNK, worked_out};
use crate::board::{Board, Driver, Layer, Net, PathItem, Series, Structure, Trace};
use crate::limit::LimitAt;
use crate::line::{line_of_direct, line_of_trace};
use crate::radiation::Antenna;
use crate::study::{FieldReading, NetResult};
use crate::watch::Watch;

/// A change that was tried on a net.
#[derive(Debug, Clone, PartialEq)]
pub struct Change {
    /// What was changed.
    pub remedy: Remedy,
    /// The smallest margin after it.
    pub margin_db: f64,
    /// What that is better by.
    pub gain_db: f64,
}

/// What to change.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Remedy {
    /// A resistor in series at the driver, in place of one that is there.
    SeriesResistor {
        /// Its resistance, a usual value near the line's impedance less the driver's resistance.
        resistance_ohm: f64,
    },
    /// A driver whose edges take twice the time.
    SlowerEdge {
        /// Its rise time, between the thresholds of the driver as it is.
        rise_s: f64,
    },
    /// Traces at half the height over their plane.
    HalfHeight {
        /// The height of the first of them.
        height_m: f64,
    },
    /// Cables that carry nothing off the board: as far as a filter or choke at their connector can go.
    QuietCables,
}

/// What is remembered of a net before any change.
pub(super) struct Before {
    /// The smallest swing at a receiver.
    swing_v: f64,
    /// The smallest margin if the cables added nothing; `None` where they add nothing anyhow.
    quiet_cables_margin_db: Option<f64>,
}

impl Before {
    pub(super) fn of(result: &NetResult, limits: &[Vec<LimitAt>]) -> Self {
        Self {
            swing_v: swing_v(result),
            quiet_cables_margin_db: quiet_cables_margin_db(result, limits),
        }
    }
}

/// A net that is worth a change.
pub(super) struct Patient<'a> {
    pub net: &'a Net,
    /// Its margin; `None` where it needs no change.
    pub margin_db: Option<f64>,
    /// Whether cables make most of its worst reading.
    pub cables_rule: bool,
    pub before: &'a Before,
}

/// The changes tried on each net, the most helpful first, and whether all of them were tried.
pub(super) fn tried(
    patients: &[Patient],
    board: &Board,
    antenna: &dyn Antenna,
    setup: &CheckSetup,
    watch: &dyn Watch,
) -> (Vec<Vec<Change>>, bool) {
    let mut changes: Vec<Vec<Change>> = Vec::with_capacity(patients.len());
    let worth: Vec<(usize, Remedy, Net)> = patients
        .iter()
        .enumerate()
        .flat_map(|(number, patient)| {
            let candidates = match patient.margin_db {
                Some(_) => candidates(patient.net),
                None => Vec::new(),
            };
            let numbered = candidates.into_iter();
            numbered.map(move |(remedy, net)| (number, remedy, net))
        })
        .collect();
    for patient in patients {
        changes.push(patient.cables_quieted().into_iter().collect());
    }
    let mut tried = 0;
    watch.begin("changes", worth.len());
    for chunk in worth.chunks(CHUNK) {
        if watch.is_stopped() {
            break;
        }
        let nets: Vec<Net> = chunk.iter().map(|(_, _, net)| net.clone()).collect();
        let results = worked_out(&nets, board, antenna, setup, watch);
        for ((number, remedy, _), result) in chunk.iter().zip(results) {
            let change = patients[*number].after(*remedy, &result);
            changes[*number].extend(change);
            tried += 1;
        }
    }
    for changes in &mut changes {
        changes.sort_by(|a, b| b.gain_db.total_cmp(&a.gain_db));
    }
    (changes, tried == worth.len())
}

impl Patient<'_> {
    /// What a change made of the net; `None` where the signal would no longer do.
    fn after(&self, remedy: Remedy, result: &NetResult) -> Option<Change> {
        /// A receiver may lose this share of its swing.
        const SWING_KEPT: f64 = 0.9;
        let margin_db = result.worst.as_ref()?.margin_db;
        let mut receivers = result.signal.receivers.iter();
        let still_works = swing_v(result) >= SWING_KEPT * self.before.swing_v
            && receivers.all(|receiver| receiver.reaches_thresholds != Some(false));
        still_works.then_some(Change {
            remedy,
            margin_db,
            gain_db: margin_db - self.margin_db?,
        })
    }

    fn cables_quieted(&self) -> Option<Change> {
        let margin_db = self.before.quiet_cables_margin_db?;
        self.cables_rule.then_some(Change {
            remedy: Remedy::QuietCables,
            margin_db,
            gain_db: margin_db - self.margin_db?,
        })
    }
}

/// The smallest swing that a receiver comes to at rest.
fn swing_v(result: &NetResult) -> f64 {
    let receivers = result.signal.receivers.iter();
    receivers
        .map(|receiver| receiver.rest_high_v - receiver.rest_low_v)
        .fold(f64::INFINITY, f64::min)
}

/// The smallest margin of loops and charges alone, taken to add up: no better than it can be.
fn quiet_cables_margin_db(result: &NetResult, limits: &[Vec<LimitAt>]) -> Option<f64> {
    let bare_dbuv_per_m = |reading: &FieldReading| {
        let field = |level: Option<f64>| level.map_or(0.0, |level| 10f64.powf(level / 20.0));
        let sum = field(reading.loops_dbuv_per_m) + field(reading.charges_dbuv_per_m);
        20.0 * sum.log10()
    };
    let mut least: Option<f64> = None;
    for harmonic in &result.harmonics {
        for (reading, limits) in harmonic.fields.iter().zip(limits) {
            reading.cable_dbuv_per_m?;
            for limit in limits {
                let Some(limit) = limit.at(harmonic.frequency_hz) else {
                    continue;
                };
                let margin_db = limit - bare_dbuv_per_m(reading);
                least = Some(least.map_or(margin_db, |least| least.min(margin_db)));
            }
        }
    }
    least
}

/// The changes that make sense for a net, each with the net as it would be.
fn candidates(net: &Net) -> Vec<(Remedy, Net)> {
    [series_resistor(net), slower_edge(net), half_height(net)]
        .into_iter()
        .flatten()
        .collect()
}

fn series_resistor(net: &Net) -> Option<(Remedy, Net)> {
    /// A smaller step would not be felt.
    const LEAST_STEP_OHM: f64 = 5.0;
    let driver = &net.driver;
    let own_ohm = (driver.low_resistance_ohm + driver.high_resistance_ohm) / 2.0;
    let wanted_ohm = usual_resistance_ohm(first_impedance_ohm(&net.path)? - own_ohm)?;
    let (there_ohm, rest) = match net.path.split_first() {
        Some((PathItem::Series(series), rest)) if series.inductance_h == 0.0 => {
            (series.resistance_ohm, rest)
        }
        _ => (0.0, net.path.as_slice()),
    };
    if wanted_ohm < there_ohm + LEAST_STEP_OHM {
        return None;
    }
    let resistor = PathItem::Series(Series {
        resistance_ohm: wanted_ohm,
        inductance_h: 0.0,
    });
    let path = std::iter::once(resistor)
        .chain(rest.iter().cloned())
        .collect();
    let remedy = Remedy::SeriesResistor {
        resistance_ohm: wanted_ohm,
    };
    Some((
        remedy,
        Net {
            path,
            ..net.clone()
        },
    ))
}

/// The impedance of the first line outwards from the driver.
fn first_impedance_ohm(path: &[PathItem]) -> Option<f64> {
    path.iter().find_map(|item| match item {
        PathItem::Trace(trace) => Some(line_of_trace(trace).0.impedance_ohm),
        PathItem::Line(direct) => Some(line_of_direct(direct).impedance_ohm),
        PathItem::Branch(items) => first_impedance_ohm(items),
        _ => None,
    })
}

/// The nearest of the twelve values to a decade that resistors are sold in (IEC 60063, E12); `None` below 1 ohm.
fn usual_resistance_ohm(wanted_ohm: f64) -> Option<f64> {
    const E12: [f64; 13] = [
        1.0, 1.2, 1.5, 1.8, 2.2, 2.7, 3.3, 3.9, 4.7, 5.6, 6.8, 8.2, 10.0,
    ];
    if wanted_ohm < 1.0 {
        return None;
    }
    let decade = 10f64.powf(wanted_ohm.log10().floor());
    let farness = |value: f64| (value * decade / wanted_ohm).ln().abs();
    let nearest = E12
        .into_iter()
        .min_by(|a, b| farness(*a).total_cmp(&farness(*b)))?;
    // Rid of the product's last digits.
    Some((nearest * decade * 1e3).round() / 1e3)
}

fn slower_edge(net: &Net) -> Option<(Remedy, Net)> {
    let slower = Driver {
        rise_s: 2.0 * net.driver.rise_s,
        fall_s: 2.0 * net.driver.fall_s,
        ..(*net.driver).clone()
    };
    // Half of each edge lies on either side of the 50 % point.
    let needed_s = (slower.full_rise_s() + slower.full_fall_s()) / 2.0;
    let least_time_s = net.duty.min(1.0 - net.duty) / net.clock_hz;
    let remedy = Remedy::SlowerEdge {
        rise_s: slower.rise_s,
    };
    (needed_s <= least_time_s).then(|| {
        let driver = Arc::new(slower);
        (
            remedy,
            Net {
                driver,
                ..net.clone()
            },
        )
    })
}

fn half_height(net: &Net) -> Option<(Remedy, Net)> {
    fn lower(path: &[PathItem], first_m: &mut Option<f64>) -> Vec<PathItem> {
        let items = path.iter().map(|item| match item {
            PathItem::Trace(trace) => PathItem::Trace(lower_trace(trace, first_m)),
            PathItem::Branch(items) => PathItem::Branch(lower(items, first_m)),
            other => other.clone(),
        });
        items.collect()
    }
    let mut first_m = None;
    let path = lower(&net.path, &mut first_m);
    let remedy = Remedy::HalfHeight { height_m: first_m? };
    Some((
        remedy,
        Net {
            path,
            ..net.clone()
        },
    ))
}

/// A trace over one plane at half its height.
fn lower_trace(trace: &Trace, first_m: &mut Option<f64>) -> Trace {
    let Structure::Microstrip { height_m } = trace.layer.structure else {
        return trace.clone();
    };
    let height_m = height_m / 2.0;
    first_m.get_or_insert(height_m);
    Trace {
        layer: Arc::new(Layer {
            structure: Structure::Microstrip { height_m },
            ..(*trace.layer).clone()
        }),
        ..trace.clone()
    }
}

#[cfg(test)]
mod tests {
    use super::usual_resistance_ohm;

    #[test]
    fn resistors_are_sold_in_twelve_values_a_decade() {
        for (wanted_ohm, usual_ohm) in [
            (61.0, Some(56.0)),
            (62.5, Some(68.0)),
            (33.0, Some(33.0)),
            (9.5, Some(10.0)),
            (98.0, Some(100.0)),
            (1.0, Some(1.0)),
            (0.4, None),
            (-12.0, None),
        ] {
            assert_eq!(usual_resistance_ohm(wanted_ohm), usual_ohm, "{wanted_ohm}");
        }
    }
}
