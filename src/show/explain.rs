//! Why a net reads what it reads, in plain words.

use std::fmt::Write as _;

use super::remedy::lever;
use super::table::plain_table;
use super::words;
use crate::study::explain::{Explanation, Piece};
use crate::study::remedy::Outcome;

/// What each piece of the nets contributes to their worst readings, and what halves these.
pub fn explanations_text(explanations: &[Explanation]) -> String {
    explanations.iter().map(explanation_text).collect()
}

fn explanation_text(explanation: &Explanation) -> String {
    let worst = &explanation.worst;
    let mut text = format!(
        "\n{}: {:.1} dBµV/m at {}, harmonic {}, at {}, mainly from {}\n",
        explanation.net,
        worst.field_dbuv_per_m,
        words::frequency(worst.frequency_hz),
        worst.harmonic,
        words::distance(worst.distance_m),
        worst.mechanism.as_str()
    );
    let reading = &explanation.reading;
    let parts = [
        ("loops", reading.loops_dbuv_per_m),
        ("charged traces", reading.charges_dbuv_per_m),
        ("cables", reading.cable_dbuv_per_m),
    ];
    let parts: Vec<String> = parts
        .iter()
        .filter_map(|(name, level)| Some(format!("{name} {:.1}", (*level)?)))
        .collect();
    let _ = writeln!(text, "  By itself, in dBµV/m: {}", parts.join(", "));
    if let Some(aim) = &reading.aim {
        let _ = writeln!(text, "  Antenna: {}", words::aim(aim));
    }
    text.push('\n');
    push_pieces(&mut text, explanation);
    let _ = writeln!(text, "\nWhat halves it (6 dB):");
    match &explanation.parts {
        Outcome::Found(remedy) => {
            let _ = writeln!(
                text,
                "  `{}`: margin {:.1} dB in place of {:.1} dB",
                remedy.tried,
                remedy.after.margin_db(),
                worst.margin_db
            );
        }
        Outcome::Hopeless(hopeless) => match &hopeless.best {
            Some((tried, variant)) => {
                let _ = writeln!(
                    text,
                    "  no change of parts that is safe; the best, `{tried}`, comes to {:.1} dB of margin in place of {:.1} dB",
                    variant.margin_db(),
                    worst.margin_db
                );
            }
            None => text.push_str("  no change of parts that is safe\n"),
        },
        Outcome::LeftAlone | Outcome::NotJudged => {}
    }
    for found in &explanation.levers {
        let gain_db = found.reach.margin_db - worst.margin_db;
        let _ = match (found.reach.suffices, gain_db.is_finite()) {
            (true, true) => writeln!(text, "  {}: {gain_db:.1} dB", lever(found)),
            (false, true) => writeln!(
                text,
                "  {}: would not do alone, {gain_db:.1} dB",
                lever(found)
            ),
            (_, false) => writeln!(
                text,
                "  {}: contained between two planes but for its ends and vias",
                lever(found)
            ),
        };
    }
    text
}

fn push_pieces(text: &mut String, explanation: &Explanation) {
    let header = [
        "line of\nthe path",
        "from\nx, y mm",
        "to\nx, y mm",
        "length\nmm",
        "height\nmm",
        "current\nmA",
        "voltage\nV",
        "alone\ndBµV/m",
        "without it\ndBµV/m",
    ];
    let mut table = plain_table(&header, &[0, 1, 2, 3, 4, 5, 6, 7, 8]);
    let mm = |m: f64| words::trimmed(m * 1e3, 2);
    let at = |[x, y]: [f64; 2]| {
        format!(
            "{}, {}",
            words::trimmed(x * 1e3, 1),
            words::trimmed(y * 1e3, 1)
        )
    };
    let level = |level: Option<f64>| level.map_or("-".to_string(), |level| format!("{level:.1}"));
    for piece in &explanation.pieces {
        let Piece {
            line,
            start_m,
            end_m,
            length_m,
            height_m,
            middle_current_a,
            middle_voltage_v,
            alone_dbuv_per_m,
            rest_dbuv_per_m,
        } = piece;
        table.add_row(vec![
            line.to_string(),
            at(*start_m),
            at(*end_m),
            words::trimmed(length_m * 1e3, 1),
            mm(*height_m),
            mm(*middle_current_a),
            words::trimmed(*middle_voltage_v, 3),
            level(*alone_dbuv_per_m),
            level(*rest_dbuv_per_m),
        ]);
    }
    for line in table.lines() {
        let _ = writeln!(text, "  {}", line.trim_end());
    }
    text.push_str("  (current and voltage in its middle, rms; alone: the field of this piece with the waves it has)\n");
}
