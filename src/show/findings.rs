//! What the ringing does to the parts, in short plain words.

use crate::study::{ReceiverSignal, Signal};

/// Overshoot, undershoot and ringback below this share of the swing are not worth a word.
const WORTH_A_WORD: f64 = 0.15;
/// Clamp currents below this are not, either.
const WORTH_A_WORD_A: f64 = 1e-3;

/// A sentence for each receiver that has something to tell.
pub(super) fn findings(signal: &Signal) -> Vec<String> {
    signal.receivers.iter().filter_map(finding).collect()
}

fn finding(receiver: &ReceiverSignal) -> Option<String> {
    let swing_v = receiver.rest_high_v - receiver.rest_low_v;
    let mut parts = Vec::new();
    let mut beyond = |voltage_v: f64, what: &str| {
        if voltage_v > WORTH_A_WORD * swing_v {
            parts.push(format!("{voltage_v:.1} V {what}"));
        }
    };
    beyond(receiver.overshoot_v, "overshoot");
    beyond(receiver.undershoot_v, "undershoot");
    beyond(receiver.ringback_v, "ringback");
    if !parts.is_empty() {
        parts.push(match receiver.settling_s {
            Some(settling_s) => format!("settles in {:.1} ns", settling_s * 1e9),
            None => "does not settle before the next edge".into(),
        });
    }
    match receiver.extra_crossings {
        0 => {}
        1 => parts.push("one extra threshold crossing: may clock twice".into()),
        count => parts.push(format!(
            "{count} extra threshold crossings: may clock twice"
        )),
    }
    if receiver.reaches_thresholds == Some(false) {
        parts.push("does not reach its thresholds".into());
    }
    let peak_a = receiver.clamp_peak_a();
    match receiver.clamp_rating_a {
        Some(rating_a) if peak_a > rating_a => parts.push(format!(
            "CAUTION: its clamps carry {:.0} mA, over their rating of {:.0} mA: the part may be harmed",
            peak_a * 1e3,
            rating_a * 1e3
        )),
        _ if peak_a > WORTH_A_WORD_A => parts.push(format!(
            "its clamps carry {:.0} mA at the peak and {:.1} mW: check them against the part's rating",
            peak_a * 1e3,
            receiver.clamp_power_w() * 1e3
        )),
        _ => {}
    }
    (!parts.is_empty()).then(|| format!("{}: {}", receiver.name, parts.join(", ")))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::show::samples;

    fn receiver() -> ReceiverSignal {
        samples::net("A", 48e6, 3).signal.receivers.remove(0)
    }

    #[test]
    fn a_ringing_receiver_gets_one_sentence() {
        let sentence = finding(&receiver()).expect("it rings");
        assert_eq!(
            sentence,
            "cmos-input: 1.2 V overshoot, 1.2 V undershoot, 0.8 V ringback, settles in 7.4 ns, \
             its clamps carry 20 mA at the peak and 1.2 mW: check them against the part's rating"
        );
    }

    #[test]
    fn a_clamp_over_its_rating_is_a_caution() {
        let rated = ReceiverSignal {
            clamp_rating_a: Some(0.01),
            ..receiver()
        };
        assert!(
            finding(&rated)
                .expect("it rings")
                .contains("CAUTION: its clamps carry 20 mA")
        );
        let spared = ReceiverSignal {
            clamp_rating_a: Some(0.1),
            ..receiver()
        };
        assert!(!finding(&spared).expect("it rings").contains("CAUTION"));
    }

    #[test]
    fn a_quiet_receiver_gets_none() {
        let quiet = ReceiverSignal {
            overshoot_v: 0.1,
            undershoot_v: 0.1,
            ringback_v: 0.1,
            low_clamp: None,
            ..receiver()
        };
        assert_eq!(finding(&quiet), None);
        let twice = ReceiverSignal {
            extra_crossings: 2,
            ..quiet
        };
        assert!(
            finding(&twice)
                .expect("a finding")
                .contains("may clock twice")
        );
    }
}
