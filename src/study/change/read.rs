//! The grammar of tries, read.

use super::{Change, SeriesPlace, Sweep, Try};
use crate::text::{Dimension, near_miss, parse_quantity};

/// Most steps of a sweep.
const MOST_STEPS: f64 = 25.0;

const WORDS: [&str; 11] = [
    "as is",
    "bare",
    "series",
    "end",
    "split",
    "rise",
    "resistance",
    "setting",
    "length",
    "height",
    "layer",
];

/// Why a text is no try.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("`{part}` {problem}, expected {expected}{}", near_miss.as_ref().map(|n| format!("; did you mean `{n}`?")).unwrap_or_default())]
pub struct TryError {
    /// The part of the text that is wrong.
    pub part: String,
    /// What is wrong with it.
    pub problem: String,
    /// What was expected.
    pub expected: String,
    /// What was perhaps meant.
    pub near_miss: Option<String>,
}

impl TryError {
    fn new(part: &str, problem: impl Into<String>, expected: impl Into<String>) -> Self {
        Self {
            part: part.trim().into(),
            problem: problem.into(),
            expected: expected.into(),
            near_miss: None,
        }
    }
}

/// Reads a try such as `series 47 ohm` or `keep, setting slow`.
///
/// # Errors
///
/// The first part that is not of the grammar, with what was expected.
pub fn read_try(text: &str) -> Result<Try, TryError> {
    let mut parts: Vec<&str> = text.split(',').map(str::trim).collect();
    let keeps = parts.first() == Some(&"keep");
    if keeps {
        parts.remove(0);
    }
    if parts.iter().all(|part| part.is_empty()) {
        return Err(TryError::new(text, "says no change", example()));
    }
    let changes: Vec<Change> = parts.into_iter().map(change).collect::<Result<_, _>>()?;
    if changes.len() > 1
        && let Some(whole) = (changes.iter()).find(|c| matches!(c, Change::AsIs | Change::Bare))
    {
        let problem = format!("does not go together with `{whole}`");
        return Err(TryError::new(text, problem, "one or the other"));
    }
    Ok(Try { keeps, changes })
}

/// Reads a sweep such as `series 0..100 ohm`: a try with a range in place of one number.
///
/// # Errors
///
/// A text without one rising range, or that is no try at one of its values.
pub fn read_sweep(text: &str) -> Result<Sweep, TryError> {
    let expected = "a try with a range in place of one number, such as `series 0..100 ohm`";
    let error = |problem: &str| TryError::new(text, problem, expected);
    let (before, after) = text.split_once("..").ok_or_else(|| error("has no range"))?;
    let is_number = |c: char| c.is_ascii_digit() || c == '.';
    let head = before.trim_end_matches(is_number);
    let from: Result<f64, _> = before[head.len()..].parse();
    let tail = after.trim_start().trim_start_matches(is_number);
    let to: Result<f64, _> = after.trim_start()[..after.trim_start().len() - tail.len()].parse();
    let (Ok(from), Ok(to)) = (from, to) else {
        return Err(error("has a range that is not of two numbers"));
    };
    if from >= to {
        return Err(error("has a range that does not rise"));
    }
    let unit: String = (tail.trim_start().chars())
        .take_while(|c| c.is_alphabetic())
        .collect();
    let step = round_step((to - from) / MOST_STEPS);
    let first = (from / step).floor();
    let between = (1..=MOST_STEPS as i32 + 1)
        .map(|count| (first + f64::from(count)) * step)
        .filter(|value| *value > from + 1e-6 * step && *value < to - 1e-6 * step);
    let at = |value: f64| {
        let value = format!("{value:.9}").parse().unwrap_or(value);
        Ok((
            value,
            read_try(&format!("{head}{value} {}", tail.trim_start()))?,
        ))
    };
    Ok(Sweep {
        label: text.trim().into(),
        unit,
        steps: std::iter::once(from)
            .chain(between)
            .chain([to])
            .map(at)
            .collect::<Result<_, TryError>>()?,
    })
}

/// The smallest of 1, 2, 5, 10 ... that is not below a positive number.
fn round_step(at_least: f64) -> f64 {
    let decade = 10f64.powf(at_least.log10().floor());
    let digits = [1.0, 2.0, 5.0].into_iter();
    let mut steps = digits.map(|digit| digit * decade);
    steps
        .find(|step| *step >= at_least * (1.0 - 1e-9))
        .unwrap_or(10.0 * decade)
}

fn example() -> &'static str {
    "a change such as `series 47 ohm`, `end 64 ohm + 100 pF`, `split 130 ohm / 130 ohm to 3.3 V`, \
     `bare` or `rise 2 ns`"
}

fn change(part: &str) -> Result<Change, TryError> {
    if part == "as is" {
        return Ok(Change::AsIs);
    }
    let (word, rest) = part.split_once(' ').unwrap_or((part, ""));
    let words = Words {
        part,
        rest: rest.trim(),
    };
    match word {
        "bare" if words.rest.is_empty() => Ok(Change::Bare),
        "series" => words.series(),
        "end" => words.end(),
        "split" => words.split(),
        "rise" => words.above_zero(Dimension::Time).map(Change::Rise),
        "resistance" => (words.above_zero(Dimension::Resistance)).map(Change::Resistance),
        "length" => words.above_zero(Dimension::Length).map(Change::Length),
        "height" => words.above_zero(Dimension::Length).map(Change::Height),
        "setting" => words
            .name("the name of one of the driver's settings")
            .map(Change::Setting),
        "layer" => words.name("the name of a layer").map(Change::Layer),
        "keep" => Err(TryError::new(
            part,
            "stands where a change was expected",
            "`keep` only at the beginning, before a comma",
        )),
        "bare" | "as" => Err(TryError::new(
            part,
            "is not a change",
            "`bare` or `as is` alone",
        )),
        _ => Err(TryError {
            near_miss: near_miss(word, WORDS),
            ..TryError::new(part, "is not a change", example())
        }),
    }
}

/// What follows the word of a change.
struct Words<'t> {
    part: &'t str,
    rest: &'t str,
}

impl<'t> Words<'t> {
    fn error(&self, problem: impl Into<String>, expected: &str) -> TryError {
        TryError::new(self.part, problem, expected)
    }

    fn name(&self, expected: &str) -> Result<String, TryError> {
        if self.rest.is_empty() {
            return Err(self.error("has no name", expected));
        }
        Ok(self.rest.into())
    }

    fn quantity(&self, text: &str, dimension: Dimension) -> Result<f64, TryError> {
        if text.trim().is_empty() {
            let problem = format!("lacks {}", dimension.name());
            return Err(self.error(problem, &dimension.expectation()));
        }
        let value = parse_quantity(text, dimension).map_err(|error| TryError {
            near_miss: error.near_miss,
            ..TryError::new(text, error.problem, error.expected)
        })?;
        if value < 0.0 && dimension != Dimension::Voltage {
            return Err(TryError::new(text, "is negative", "zero or more"));
        }
        Ok(value)
    }

    fn positive(&self, text: &str, dimension: Dimension) -> Result<f64, TryError> {
        let value = self.quantity(text, dimension)?;
        if value == 0.0 {
            return Err(TryError::new(text, "is zero", "more than zero"));
        }
        Ok(value)
    }

    fn above_zero(&self, dimension: Dimension) -> Result<f64, TryError> {
        self.positive(self.rest, dimension)
    }

    /// Splits off what follows a word, if the word is there.
    fn split_off(text: &'t str, word: &str) -> (&'t str, Option<&'t str>) {
        match text.split_once(&format!(" {word} ")) {
            Some((before, after)) => (before.trim(), Some(after.trim())),
            None => (text, None),
        }
    }

    fn series(&self) -> Result<Change, TryError> {
        let (values, at) = Self::split_off(self.rest, "at");
        if let (_, Some(_)) = Self::split_off(values, "to") {
            let expected = "`end` or `split` for a termination to a rail";
            return Err(self.error("has a rail, but lies in series", expected));
        }
        let (resistance, inductance) = match values.split_once('+') {
            Some((resistance, inductance)) => (resistance, Some(inductance)),
            None => (values, None),
        };
        let inductance_h = match inductance {
            Some(text) => self.quantity(text, Dimension::Inductance)?,
            None => 0.0,
        };
        Ok(Change::Series {
            resistance_ohm: self.quantity(resistance, Dimension::Resistance)?,
            inductance_h,
            at: match at {
                None | Some("driver") => SeriesPlace::Driver,
                Some("branch") => SeriesPlace::Branch,
                Some("legs") => SeriesPlace::Legs,
                Some(receiver) => SeriesPlace::LegOf(receiver.into()),
            },
        })
    }

    fn end(&self) -> Result<Change, TryError> {
        let (values, at) = Self::split_off(self.rest, "at");
        let (values, to) = Self::split_off(values, "to");
        let (resistance, capacitance) = match values.split_once('+') {
            Some((resistance, capacitance)) => (resistance, Some(capacitance)),
            None => (values, None),
        };
        let capacitance_f = capacitance
            .map(|text| self.positive(text, Dimension::Capacitance))
            .transpose()?;
        Ok(Change::End {
            resistance_ohm: self.positive(resistance, Dimension::Resistance)?,
            capacitance_f,
            to_v: to.map_or(Ok(0.0), |text| self.quantity(text, Dimension::Voltage))?,
            at: at.map(str::to_owned),
        })
    }

    fn split(&self) -> Result<Change, TryError> {
        let expected = "two resistances such as `split 130 ohm / 130 ohm to 3.3 V`";
        let (values, at) = Self::split_off(self.rest, "at");
        let (values, to) = Self::split_off(values, "to");
        let (up, down) = values
            .split_once('/')
            .ok_or_else(|| self.error("is not split", expected))?;
        Ok(Change::Split {
            up_ohm: self.positive(up, Dimension::Resistance)?,
            down_ohm: self.positive(down, Dimension::Resistance)?,
            to_v: to
                .map(|text| self.quantity(text, Dimension::Voltage))
                .transpose()?,
            at: at.map(str::to_owned),
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_form_is_read_and_written_alike() {
        for text in [
            "as is",
            "bare",
            "series 47 ohm",
            "series 10 ohm + 47 nH",
            "series 56 ohm at legs",
            "series 22 ohm at branch",
            "series 33 ohm at U 7",
            "end 64 ohm",
            "end 64 ohm + 100 pF",
            "end 64 ohm to 1.65 V at U8",
            "split 130 ohm / 130 ohm to 3.3 V",
            "split 100 ohm / 150 ohm",
            "rise 2 ns",
            "resistance 25 ohm",
            "setting slow",
            "keep, setting slow",
            "length 76.2 mm",
            "height 101.6 um",
            "layer core",
            "series 22 ohm, end 100 ohm + 47 pF",
        ] {
            let read = read_try(text).unwrap();
            assert_eq!(read.to_string(), text);
            assert_eq!(read_try(&read.to_string()).unwrap(), read);
        }
    }

    #[test]
    fn a_mistake_is_named_with_what_was_expected() {
        let said = |text: &str| read_try(text).unwrap_err().to_string();
        assert!(said("seris 47 ohm").contains("did you mean `series`?"));
        assert!(said("series 47").contains("`47` has no unit, expected a resistance"));
        assert!(said("series").contains("lacks a resistance"));
        assert!(said("series 47 ohm to 3.3 V").contains("lies in series"));
        assert!(said("split 130 ohm").contains("is not split"));
        assert!(said("end 0 ohm").contains("`0 ohm` is zero"));
        assert!(said("end 64 ohm + 10 nH").contains("capacitance"));
        assert!(said("bare, series 47 ohm").contains("does not go together"));
        assert!(said("").contains("says no change"));
        assert!(said("series -5 ohm").contains("negative"));
        assert!(said("rise 0 ns").contains("is zero"));
    }

    #[test]
    fn a_sweep_is_a_try_with_a_range() {
        let sweep = read_sweep("series 0..100 ohm at legs").unwrap();
        assert_eq!(sweep.unit, "ohm");
        let values: Vec<f64> = sweep.steps.iter().map(|(value, _)| *value).collect();
        assert_eq!(values.len(), 21);
        assert_eq!(values[..3], [0.0, 5.0, 10.0]);
        assert_eq!(sweep.steps[0].1.to_string(), "series 0 ohm at legs");
        assert_eq!(values[20], 100.0);
        for text in [
            "series 47 ohm",
            "series 9..5 ohm",
            "series ..9 ohm",
            "rise 0..3 ns",
        ] {
            assert!(read_sweep(text).is_err(), "{text}");
        }
    }
}
