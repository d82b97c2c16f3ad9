//! Quantities: a number with its unit, read into SI units.

mod tolerance;
mod units;

use super::diagnostic::near_miss;
use units::Scale::{self, Decibels, Fraction, Ten};
use units::{HABITS, UNITS};

pub use tolerance::{Distribution, Stated, Tolerance, parse_stated};

/// What a quantity measures.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Dimension {
    /// Metres.
    Length,
    /// Seconds.
    Time,
    /// Ohms.
    Resistance,
    /// Farads.
    Capacitance,
    /// Henries.
    Inductance,
    /// Hertz.
    Frequency,
    /// Volts.
    Voltage,
    /// Amperes.
    Current,
    /// Field strength, read into dBuV/m.
    FieldStrength,
    /// A share in per cent, read into 0 to 1.
    Share,
    /// A number without a unit.
    Number,
}

impl Dimension {
    /// What it is called, with its article: `a length`.
    pub fn name(self) -> &'static str {
        match self {
            Self::Length => "a length",
            Self::Time => "a time",
            Self::Resistance => "a resistance",
            Self::Capacitance => "a capacitance",
            Self::Inductance => "an inductance",
            Self::Frequency => "a frequency",
            Self::Voltage => "a voltage",
            Self::Current => "a current",
            Self::FieldStrength => "a field strength",
            Self::Share => "a percentage",
            Self::Number => "a plain number",
        }
    }

    /// What to write, with an example: ``a resistance such as `33 ohm` or `1 kohm` ``.
    pub fn expectation(self) -> String {
        let example = match self {
            Self::Length => "`4 mil`, `160 mm` or `3 m`",
            Self::Time => "`0.8 ns` or `870 ps`",
            Self::Resistance => "`33 ohm` or `1 kohm`",
            Self::Capacitance => "`5 pF` or `100 nF`",
            Self::Inductance => "`0.8 nH` or `47 nH`",
            Self::Frequency => "`48 MHz` or `1 GHz`",
            Self::Voltage => "`3.3 V` or `700 mV`",
            Self::Current => "`10 mA`",
            Self::FieldStrength => "`40 dBuV/m` or `100 uV/m`",
            Self::Share => "`50 %`",
            Self::Number => "`4.3`",
        };
        format!("{} such as {example}", self.name())
    }

    fn units(self) -> &'static [(&'static str, Scale)] {
        UNITS
            .iter()
            .find(|(dimension, _)| *dimension == self)
            .map_or(&[], |(_, units)| units)
    }
}

/// Why a text is not the quantity that was asked for.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("`{text}` {problem}, expected {expected}{}", near_miss.as_ref().map(|n| format!("; did you mean `{n}`?")).unwrap_or_default())]
pub struct QuantityError {
    /// What was written.
    pub text: String,
    /// What is wrong with it, to be read after the name of the thing: `has no unit`.
    pub problem: String,
    /// What was expected, to be read after "expected".
    pub expected: String,
    /// What was perhaps meant.
    pub near_miss: Option<String>,
}

/// Reads a quantity with its unit, for example `0.8 ns` or `1kΩ`, into SI units (field strength into dBuV/m).
///
/// Powers of ten are shifted in the text, so `0.8 ns` is exactly `0.8e-9`.
///
/// # Errors
///
/// A text that is no number, is not finite, or has a missing, unknown or wrong unit.
pub fn parse_quantity(text: &str, dimension: Dimension) -> Result<f64, QuantityError> {
    let text = text.trim();
    let error = |problem: String, near_miss: Option<String>| QuantityError {
        text: shortened(text),
        problem,
        expected: dimension.expectation(),
        near_miss,
    };
    let spelt = plain_spelling(text);
    let Some((mantissa, exponent, unit)) = split_number(&spelt) else {
        // std's own spellings of what is not finite, and YAML's, which put a point before them
        let word = spelt
            .trim_start_matches(['+', '-', '.'])
            .to_ascii_lowercase();
        if word.starts_with("nan") || word.starts_with("inf") {
            return Err(error("is not a finite number".into(), None));
        }
        return Err(error(format!("is not {}", dimension.name()), None));
    };
    if unit.contains(tolerance::MARK) || unit.contains('\u{b1}') {
        return Err(error("cannot have a tolerance here".into(), None));
    }
    if unit.starts_with(',') {
        let pointed = (!text.contains('.')).then(|| text.replacen(',', ".", 1));
        return Err(error("has a decimal comma".into(), pointed));
    }
    if unit.starts_with(['.', '+', '-']) {
        return Err(error(format!("is not {}", dimension.name()), None));
    }
    let units = dimension.units();
    let Some((_, scale)) = units.iter().find(|(symbol, _)| *symbol == unit) else {
        let (problem, meant) = unit_problem(unit, dimension);
        let number = spelt.strip_suffix(unit).unwrap_or_default().trim_end();
        return Err(error(
            problem,
            meant.map(|meant| format!("{number} {meant}")),
        ));
    };
    let shift = if let Ten(shift) = *scale { shift } else { 0 };
    let number = exponent
        .checked_add(shift)
        .and_then(|exponent| format!("{mantissa}e{exponent}").parse::<f64>().ok())
        .filter(|number| number.is_finite())
        .ok_or_else(|| error("is too large".into(), None))?;
    match *scale {
        Ten(_) => Ok(number),
        Fraction(over, under) => Ok(number * over / under),
        Decibels(_) if number <= 0.0 => Err(error(
            "is a field strength that is not above zero".into(),
            None,
        )),
        Decibels(offset) => Ok(20.0 * number.log10() + offset),
    }
}

/// What is wrong with a unit that the dimension does not have, and the unit that was perhaps meant.
fn unit_problem(unit: &str, dimension: Dimension) -> (String, Option<String>) {
    let symbols = dimension.units().iter().map(|(symbol, _)| *symbol);
    if unit.is_empty() {
        return ("has no unit".into(), None);
    }
    if dimension == Dimension::Number {
        return (
            format!("has a unit, `{}`, but is a plain number", shortened(unit)),
            None,
        );
    }
    let habit = HABITS
        .iter()
        .filter(|(written, _)| *written == unit)
        .find(|(_, meant)| symbols.clone().any(|symbol| symbol == *meant));
    let other = UNITS
        .iter()
        .find(|(_, units)| units.iter().any(|(symbol, _)| *symbol == unit));
    match (habit, other) {
        (Some((_, meant)), Some((other, _))) => {
            (is_other(*other, dimension), Some((*meant).into()))
        }
        (None, Some((other, _))) => (is_other(*other, dimension), None),
        (habit, None) => {
            let meant = habit.map(|(_, meant)| (*meant).into());
            let problem = format!("has an unknown unit, `{}`", shortened(unit));
            (problem, meant.or_else(|| near_miss(unit, symbols)))
        }
    }
}

fn is_other(other: Dimension, wanted: Dimension) -> String {
    format!("is {}, not {}", other.name(), wanted.name())
}

/// Replaces the letters that have several code points or a plain substitute.
fn plain_spelling(text: &str) -> String {
    // micro sign and Greek mu; ohm sign and Greek omega; the typographic minus
    text.replace(['\u{b5}', '\u{3bc}'], "u")
        .replace(['\u{2126}', '\u{3a9}'], "ohm")
        .replace('\u{2212}', "-")
}

/// Splits `-1.5e3 mil` into `-1.5`, `3` and `mil`; `None` where it starts with no number.
fn split_number(text: &str) -> Option<(&str, i32, &str)> {
    let bytes = text.as_bytes();
    let digits_from = |start: usize| {
        start
            + bytes[start..]
                .iter()
                .take_while(|byte| byte.is_ascii_digit())
                .count()
    };
    let sign = usize::from(matches!(bytes.first(), Some(b'+' | b'-')));
    let mut end = digits_from(sign);
    let mut digits = end - sign;
    if bytes.get(end) == Some(&b'.') {
        let fraction = digits_from(end + 1);
        digits += fraction - end - 1;
        end = fraction;
    }
    if digits == 0 {
        return None;
    }
    let mantissa = &text[..end];
    let mut exponent = 0;
    if matches!(bytes.get(end), Some(b'e' | b'E')) {
        let sign = end + 1 + usize::from(matches!(bytes.get(end + 1), Some(b'+' | b'-')));
        let exponent_end = digits_from(sign);
        if exponent_end > sign {
            exponent = text[end + 1..exponent_end].parse().unwrap_or(i32::MAX);
            end = exponent_end;
        }
    }
    Some((mantissa, exponent, text[end..].trim()))
}

/// The text, cut where it is too long to be quoted in a message.
pub(super) fn shortened(text: &str) -> String {
    const SHOWN: usize = 40;
    if text.chars().count() <= SHOWN {
        return text.to_owned();
    }
    text.chars().take(SHOWN).chain("...".chars()).collect()
}

#[cfg(test)]
mod tests;
