//! The remedies as a table.

use std::fmt::Write as _;

use super::{RemedyReport, cost, lever, range};
use crate::show::compare::{ASSUMED_THRESHOLDS, push_table};
use crate::show::table::{plain_table, push_foot, push_unusable, push_warnings};
use crate::show::words;
use crate::study::change::terminations;
use crate::study::compare::Variant;
use crate::study::remedy::{Attempt, Hopeless, Outcome, Remedied, Remedy};

/// Every net that needs something, worst first, and what the reader must know below.
pub fn remedy_table(report: &RemedyReport) -> String {
    let mut nets: Vec<&Remedied> = report.nets.iter().collect();
    nets.sort_by(|a, b| a.before.margin_db().total_cmp(&b.before.margin_db()));
    let goal = report.goal.margin_db;
    let mut text = format!("{}\n\n", report.frame.board);
    let in_need =
        |net: &&&Remedied| matches!(net.outcome, Outcome::Found(_) | Outcome::Hopeless(_));
    if nets.iter().any(|net| in_need(&net)) {
        push_summary(&mut text, nets.iter().filter(in_need).copied(), goal);
    } else {
        let _ = writeln!(
            text,
            "No net needs a remedy: all reach a margin of {goal:.1} dB."
        );
    }
    let left: Vec<&str> = (nets.iter())
        .filter(|net| matches!(net.outcome, Outcome::LeftAlone))
        .map(|net| net.before.net.name.as_str())
        .collect();
    if !left.is_empty() {
        let _ = writeln!(
            text,
            "\nLeft alone, since they reach {goal:.1} dB: {}",
            left.join(", ")
        );
    }
    for net in &nets {
        match &net.outcome {
            Outcome::Found(remedy) => push_remedy(&mut text, net, remedy),
            Outcome::Hopeless(hopeless) => push_hopeless(&mut text, net, hopeless, goal),
            Outcome::LeftAlone | Outcome::NotJudged => {}
        }
    }
    let assumed = (nets.iter())
        .filter(in_need)
        .flat_map(|net| &net.before.receptions)
        .any(|reception| !reception.thresholds_given);
    if assumed {
        text.push_str(ASSUMED_THRESHOLDS);
    }
    push_unusable(&mut text, &report.frame);
    push_warnings(&mut text, &report.frame);
    push_foot(&mut text, &report.frame);
    text
}

fn push_summary<'r>(text: &mut String, nets: impl Iterator<Item = &'r Remedied>, goal: f64) {
    let header = [
        "net",
        "now",
        "margin\ndB",
        "remedy",
        "takes",
        "then\ndB",
        "verdict",
        "chance of\nfailing",
        "parts\nmW",
        "added\ndelay ns",
    ];
    let mut table = plain_table(&header, &[2, 5, 7, 8, 9]);
    for net in nets {
        let result = &net.before.result;
        let mut row = vec![
            net.before.net.name.clone(),
            result.verdict.as_str().into(),
            format!("{:.1}", net.before.margin_db()),
        ];
        match &net.outcome {
            Outcome::Found(remedy) => {
                let after = &remedy.after;
                row.extend([
                    remedy.tried.to_string(),
                    cost(remedy.cost),
                    format!("{:.1}", after.margin_db()),
                    after.result.verdict.as_str().into(),
                    after
                        .result
                        .chance_of_failing
                        .map_or("-".into(), words::chance),
                    format!(
                        "{:.1}",
                        (after.power.static_w + after.power.dynamic_w) * 1e3
                    ),
                    added_delay_ns(&net.before, after).map_or("-".into(), |ns| format!("{ns:+.2}")),
                ]);
            }
            _ => {
                row.push(format!("none reaches {goal:.1} dB"));
                row.push("see below".into());
            }
        }
        table.add_row(row);
    }
    push_table(text, &table);
}

/// The most that any receiver gets later.
pub(super) fn added_delay_ns(before: &Variant, after: &Variant) -> Option<f64> {
    let pairs = before.receptions.iter().zip(&after.receptions);
    pairs
        .filter_map(|(before, after)| Some(after.delay_s? - before.delay_s?))
        .reduce(f64::max)
        .map(|s| s * 1e9)
}

fn push_remedy(text: &mut String, net: &Remedied, remedy: &Remedy) {
    let _ = write!(text, "\n{}: {}", net.before.net.name, remedy.tried);
    if let Some(values) = remedy.range_ohm {
        let _ = write!(
            text,
            "; of the E24 values tried, {} reach the margin",
            range(values)
        );
    }
    text.push('\n');
    push_taken_out(text, net, remedy);
    for (was, is) in
        (net.before.result.signal.receivers.iter()).zip(&remedy.after.result.signal.receivers)
    {
        let _ = writeln!(
            text,
            "  {}: overshoot {:.2} -> {:.2} V, undershoot {:.2} -> {:.2} V, clamps {:.0} -> {:.0} mA",
            is.name,
            was.overshoot_v,
            is.overshoot_v,
            was.undershoot_v,
            is.undershoot_v,
            was.clamp_peak_a() * 1e3,
            is.clamp_peak_a() * 1e3
        );
    }
    push_attempts(text, "cheaper, but not enough", &remedy.cheaper);
}

/// Says which parts of now the remedy does without.
fn push_taken_out(text: &mut String, net: &Remedied, remedy: &Remedy) {
    let kept = terminations(&remedy.after.net);
    let gone: Vec<String> = (terminations(&net.before.net).into_iter())
        .filter(|part| !kept.contains(part))
        .collect();
    if !gone.is_empty() {
        let _ = writeln!(text, "  in place of what is there now: {}", gone.join(", "));
    }
}

fn push_hopeless(text: &mut String, net: &Remedied, hopeless: &Hopeless, goal: f64) {
    let name = &net.before.net.name;
    let _ = writeln!(text, "\n{name}: no change of parts reaches {goal:.1} dB.");
    push_attempts(text, "tried", &hopeless.attempts);
    let with = match &hopeless.best {
        Some((tried, variant)) => {
            let _ = writeln!(
                text,
                "  The best that is safe is `{tried}`, which comes to {:.1} dB.",
                variant.margin_db()
            );
            "With it in place, the".to_owned()
        }
        None => {
            text.push_str("  None of them is safe and better than the net as it is.\n");
            "The".to_owned()
        }
    };
    let (enough, short): (Vec<_>, Vec<_>) = hopeless
        .levers
        .iter()
        .partition(|lever| lever.reach.suffices);
    for (levers, what) in [
        (enough, "levers, each of which would reach it alone:"),
        (short, "levers that would not reach it alone:"),
    ] {
        if levers.is_empty() {
            continue;
        }
        let _ = writeln!(text, "  {with} {what}");
        for found in levers {
            let margin_db = found.reach.margin_db;
            let comes_to = if margin_db.is_finite() {
                format!("{margin_db:.1} dB")
            } else {
                "between two planes, which contain it; its ends and vias are left to see to".into()
            };
            let fault = found.faults.first();
            let unsafe_ = fault.map_or(String::new(), |fault| format!(", not safe: {fault}"));
            let _ = writeln!(text, "    {}: {comes_to}{unsafe_}", lever(found));
        }
    }
}

fn push_attempts(text: &mut String, what: &str, attempts: &[Attempt]) {
    for attempt in attempts {
        let fault = attempt.faults.first();
        let unsafe_ = fault.map_or(String::new(), |fault| format!(", not safe: {fault}"));
        let _ = writeln!(
            text,
            "  {what}: {}: {:.1} dB{unsafe_}",
            attempt.tried, attempt.margin_db
        );
    }
}
