//! What tolerances make of the margins, for the eye and as JSON.

use std::fmt::Write as _;

use serde::Serialize;

use super::table::plain_table;
use crate::study::{Carried, MarginSpread, Spread};

/// Most tolerances named in a row, and the least share that is.
const NAMED: usize = 3;
const LEAST_SHARE: f64 = 0.01;

/// The table of spreads of nets with their names and nominal margins, in the order given; nothing where no tolerance was
/// drawn.
pub(super) fn push_spreads<'n>(
    text: &mut String,
    spreads: impl Iterator<Item = (&'n str, Option<f64>, &'n Spread)>,
) {
    let spreads: Vec<_> = spreads.collect();
    let Some((_, _, first)) = spreads.first() else {
        return;
    };
    let header = [
        "net",
        "nominal\ndB",
        "mean\ndB",
        "sigma\ndB",
        "5 % below\ndB",
        "5 % above\ndB",
        "carried by",
    ];
    let mut table = plain_table(&header, &[1, 2, 3, 4, 5]);
    for (name, nominal, spread) in &spreads {
        let mut cells = vec![(*name).to_owned(), nominal.map_or("-".into(), decibels)];
        match &spread.margins {
            Some(margins) => cells.extend(figures(margins)),
            None => cells.extend(["-"; 5].map(String::from)),
        }
        table.add_row(cells);
    }
    let _ = writeln!(
        text,
        "\nWhat tolerances make of the margins ({} draws a net; the chances of failing above are over them):\n",
        first.draws
    );
    for line in table.lines() {
        text.push_str(line.trim_end());
        text.push('\n');
    }
    for (name, _, spread) in spreads {
        if let Some(reason) = &spread.first_failure {
            let _ = writeln!(
                text,
                "  {name}: {} of {} draws are left out, the first because {reason}",
                spread.failed, spread.draws
            );
        }
    }
}

fn figures(margins: &MarginSpread) -> [String; 5] {
    [
        decibels(margins.mean_db),
        decibels(margins.sd_db),
        decibels(margins.low_db),
        decibels(margins.high_db),
        margins
            .carried
            .as_ref()
            .map_or("(too few draws to tell)".into(), carriers),
    ]
}

fn decibels(value_db: f64) -> String {
    // A margin of -0.04 is 0.0, not -0.0.
    format!("{:.1}", (value_db * 10.0).round() / 10.0 + 0.0)
}

/// `60 % strong-cmos rise, 31 % path item 1 series, 9 % none alone`.
fn carriers(carried: &Carried) -> String {
    let (named, rest) = carried.by.split_at(carried.by.len().min(NAMED));
    let rest: f64 = rest.iter().map(|carried| carried.share).sum();
    let words = named
        .iter()
        .map(|carried| (carried.share, carried.name.as_str()))
        .chain([(rest, "others"), (carried.unexplained, "none alone")])
        .filter(|(share, _)| *share >= LEAST_SHARE)
        .map(|(share, name)| format!("{:.0} % {name}", 100.0 * share));
    let words: Vec<String> = words.collect();
    if words.is_empty() {
        return "-".into();
    }
    words.join(", ")
}

/// A spread in the JSON. Fields are a contract.
#[derive(Serialize)]
pub(super) struct SpreadEntry<'a> {
    draws: usize,
    failed_draws: usize,
    first_failure: Option<&'a str>,
    mean_margin_db: Option<f64>,
    sigma_db: Option<f64>,
    margin_5_percent_db: Option<f64>,
    margin_95_percent_db: Option<f64>,
    tolerances: Vec<ToleranceEntry<'a>>,
    unexplained_share: Option<f64>,
}

#[derive(Serialize)]
struct ToleranceEntry<'a> {
    name: &'a str,
    share: f64,
}

pub(super) fn spread_entry(spread: &Spread) -> SpreadEntry<'_> {
    let margins = spread.margins.as_ref();
    let carried = margins.and_then(|margins| margins.carried.as_ref());
    SpreadEntry {
        draws: spread.draws,
        failed_draws: spread.failed,
        first_failure: spread.first_failure.as_deref(),
        mean_margin_db: margins.map(|margins| margins.mean_db),
        sigma_db: margins.map(|margins| margins.sd_db),
        margin_5_percent_db: margins.map(|margins| margins.low_db),
        margin_95_percent_db: margins.map(|margins| margins.high_db),
        tolerances: carried
            .map_or(&[][..], |carried| &carried.by)
            .iter()
            .map(|by| ToleranceEntry {
                name: &by.name,
                share: by.share,
            })
            .collect(),
        unexplained_share: carried.map(|carried| carried.unexplained),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::show::samples;
    use crate::study::{CarriedBy, NetResult};

    fn spreads(net: &NetResult) -> impl Iterator<Item = (&str, Option<f64>, &Spread)> {
        let nominal_db = net.worst.as_ref().map(|worst| worst.margin_db);
        let spread = net.spread.iter();
        spread.map(move |spread| (net.name.as_str(), nominal_db, spread))
    }

    fn net() -> NetResult {
        let by = |(name, share): (&str, f64)| CarriedBy {
            name: name.into(),
            share,
        };
        let mut net = samples::net("CAM_PCLK", 48e6, 20);
        net.spread = Some(Spread {
            draws: 256,
            failed: 2,
            first_failure: Some("the edges do not fit".into()),
            margins: Some(MarginSpread {
                mean_db: -0.04,
                sd_db: 1.26,
                low_db: -2.0,
                high_db: 2.1,
                chance_of_failing: 0.5,
                carried: Some(Carried {
                    by: [
                        ("strong rise", 0.6),
                        ("path item 1 series", 0.2),
                        ("input capacitance", 0.004),
                        ("outer height", 0.03),
                    ]
                    .map(by)
                    .into(),
                    unexplained: 0.166,
                }),
            }),
        });
        net
    }

    #[test]
    fn a_row_names_what_carries_the_spread() {
        let mut text = String::new();
        push_spreads(&mut text, spreads(&net()));
        let row = text
            .lines()
            .find(|line| line.starts_with("CAM_PCLK"))
            .expect("a row");
        let cells: Vec<&str> = row.split_whitespace().take(6).collect();
        assert_eq!(cells, ["CAM_PCLK", "-1.5", "0.0", "1.3", "-2.0", "2.1"]);
        assert!(
            row.ends_with("60 % strong rise, 20 % path item 1 series, 3 % others, 17 % none alone"),
            "{row}"
        );
        assert!(text.contains("2 of 256 draws are left out, the first because the edges"));
        assert!(text.contains("256 draws a net"));
    }

    #[test]
    fn nothing_is_said_where_nothing_was_drawn() {
        let mut text = String::new();
        push_spreads(&mut text, spreads(&samples::net("CAM_PCLK", 48e6, 20)));
        assert_eq!(text, "");
    }

    #[test]
    fn the_json_has_the_names_of_its_contract() {
        let net = net();
        let entry = spread_entry(net.spread.as_ref().expect("a spread"));
        let json = serde_json::to_value(entry).expect("plain data");
        let keys: Vec<&str> = json
            .as_object()
            .expect("an object")
            .keys()
            .map(String::as_str)
            .collect();
        assert_eq!(
            keys,
            [
                "draws",
                "failed_draws",
                "first_failure",
                "margin_5_percent_db",
                "margin_95_percent_db",
                "mean_margin_db",
                "sigma_db",
                "tolerances",
                "unexplained_share"
            ]
        );
        assert_eq!(json["tolerances"][0]["name"], "strong rise");
        assert_eq!(json["tolerances"][0]["share"], 0.6);
    }
}
