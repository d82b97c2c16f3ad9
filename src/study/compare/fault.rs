//! What a variant does that a designer would not sign.

use std::fmt;

use super::Variant;

/// Something about a variant that is not safe.
#[derive(Debug, Clone, PartialEq)]
pub enum Fault {
    /// A receiver's level at rest is short of its thresholds.
    ShortAtRest {
        /// The receiver.
        receiver: String,
        /// Its levels at rest, low and high.
        rest_v: [f64; 2],
        /// Its thresholds, low and high.
        thresholds_v: [f64; 2],
    },
    /// A receiver switches only once a reflection has come back: its edge has a step.
    WaitsForReflection {
        /// The receiver.
        receiver: String,
        /// Level that the rising edge's first wave brings.
        risen_v: f64,
        /// Level that the falling edge's first wave brings.
        fallen_v: f64,
    },
    /// A receiver sees more edges than the driver made.
    ExtraCrossings {
        /// The receiver.
        receiver: String,
        /// How many.
        count: usize,
    },
    /// A receiver does not get from 10 % to 90 % before the next edge, or slower than it may.
    SlowEdge {
        /// The receiver.
        receiver: String,
        /// How slow; `None` is never.
        edge_s: Option<f64>,
        /// How slow it may be, where the file says.
        most_s: Option<f64>,
    },
    /// The clamps of a receiver carry more than they are rated for.
    ClampCurrent {
        /// The receiver.
        receiver: String,
        /// Peak current.
        peak_a: f64,
        /// What they are rated for.
        rating_a: f64,
    },
    /// A receiver is overshot more than it is now, and by more than a little.
    RingsMore {
        /// The receiver.
        receiver: String,
        /// The larger of overshoot and undershoot.
        overshoot_v: f64,
        /// What it is now.
        before_v: f64,
    },
    /// The driver's current at rest is more than it may carry.
    DriverCurrent {
        /// The current.
        at_rest_a: f64,
        /// What it may be.
        most_a: f64,
    },
}

impl fmt::Display for Fault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::ShortAtRest {
                receiver,
                rest_v: [low_v, high_v],
                thresholds_v: [low_threshold_v, high_threshold_v],
            } => write!(
                f,
                "{receiver} rests at {low_v:.2} V and {high_v:.2} V, short of its thresholds of {low_threshold_v:.2} V and {high_threshold_v:.2} V"
            ),
            Self::WaitsForReflection {
                receiver,
                risen_v,
                fallen_v,
            } => write!(
                f,
                "{receiver} does not switch on the first wave ({risen_v:.2} V up, {fallen_v:.2} V down) but waits for a reflection"
            ),
            Self::ExtraCrossings { receiver, count } => {
                write!(
                    f,
                    "{receiver} crosses its thresholds {count} times too often"
                )
            }
            Self::SlowEdge {
                receiver,
                edge_s: Some(edge_s),
                most_s: Some(most_s),
            } => write!(
                f,
                "the edge at {receiver} takes {:.1} ns, over its {:.1} ns",
                edge_s * 1e9,
                most_s * 1e9
            ),
            Self::SlowEdge { receiver, .. } => {
                write!(
                    f,
                    "{receiver} does not get to its level before the next edge"
                )
            }
            Self::ClampCurrent {
                receiver,
                peak_a,
                rating_a,
            } => write!(
                f,
                "the clamps of {receiver} carry {:.0} mA, over their rating of {:.0} mA",
                peak_a * 1e3,
                rating_a * 1e3
            ),
            Self::RingsMore {
                receiver,
                overshoot_v,
                before_v,
            } => write!(
                f,
                "{receiver} is overshot by {overshoot_v:.2} V, more than the {before_v:.2} V of now"
            ),
            Self::DriverCurrent { at_rest_a, most_a } => write!(
                f,
                "the driver carries {:.1} mA at rest, over its {:.1} mA",
                at_rest_a * 1e3,
                most_a * 1e3
            ),
        }
    }
}

/// Everything about a variant that is not safe.
pub(super) fn faults(variant: &Variant) -> Vec<Fault> {
    let mut faults = Vec::new();
    let at_rest_a = variant.power.driver_static_a();
    if let Some(most_a) = variant.net.driver.max_current_a
        && at_rest_a > most_a
    {
        faults.push(Fault::DriverCurrent { at_rest_a, most_a });
    }
    for (reception, signal) in (variant.receptions.iter()).zip(&variant.result.signal.receivers) {
        let receiver = || reception.name.clone();
        if !reception.rests_beyond {
            faults.push(Fault::ShortAtRest {
                receiver: receiver(),
                rest_v: [signal.rest_low_v, signal.rest_high_v],
                thresholds_v: [reception.low_threshold_v, reception.high_threshold_v],
            });
            // It cannot do anything else right then.
            continue;
        }
        if !reception.on_first_wave {
            faults.push(Fault::WaitsForReflection {
                receiver: receiver(),
                risen_v: reception.first.risen_v,
                fallen_v: reception.first.fallen_v,
            });
        }
        if signal.extra_crossings > 0 {
            faults.push(Fault::ExtraCrossings {
                receiver: receiver(),
                count: signal.extra_crossings,
            });
        }
        let too_slow = match (reception.edge_s, reception.max_edge_s) {
            (None, _) => true,
            (Some(edge_s), Some(most_s)) => edge_s > most_s,
            (Some(_), None) => false,
        };
        if too_slow || reception.delay_s.is_none() {
            faults.push(Fault::SlowEdge {
                receiver: receiver(),
                edge_s: reception.edge_s,
                most_s: reception.max_edge_s,
            });
        }
        let peak_a = signal.clamp_peak_a();
        if let Some(rating_a) = signal.clamp_rating_a
            && peak_a > rating_a
        {
            faults.push(Fault::ClampCurrent {
                receiver: receiver(),
                peak_a,
                rating_a,
            });
        }
    }
    faults
}

/// What a variant makes worse than it is: overshoot over a share of the swing that is worth a word.
pub(super) fn worsened(variant: &Variant, before: &Variant) -> Vec<Fault> {
    const WORTH_A_WORD: f64 = 0.15;
    /// Below this, more is no worse.
    const ALIKE_V: f64 = 0.02;
    let pairs = (variant.result.signal.receivers.iter()).zip(&before.result.signal.receivers);
    pairs
        .filter_map(|(now, was)| {
            let overshoot_v = now.overshoot_v.max(now.undershoot_v);
            let before_v = was.overshoot_v.max(was.undershoot_v);
            let swing_v = now.rest_high_v - now.rest_low_v;
            (overshoot_v > before_v + ALIKE_V && overshoot_v > WORTH_A_WORD * swing_v).then(|| {
                Fault::RingsMore {
                    receiver: now.name.clone(),
                    overshoot_v,
                    before_v,
                }
            })
        })
        .collect()
}
