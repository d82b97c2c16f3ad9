//! A quantity with its tolerance: `33 ohm +/- 5 %`, `0.8 ns ± 0.2 ns normal`.

use super::{Dimension, QuantityError, parse_quantity, plain_spelling, shortened, split_number};
use crate::text::diagnostic::near_miss;

/// The mark between a quantity and its tolerance, once other spellings are replaced.
pub(super) const MARK: &str = "+/-";
const WORDS: [(&str, Distribution); 2] = [
    ("uniform", Distribution::Uniform),
    ("normal", Distribution::Normal),
];
const EXPECTED: &str =
    "a tolerance such as `+/- 5 %` or `+/- 0.2 ns`, then `uniform` (default) or `normal`";
/// Normal scores are cut here, at twice the tolerance, so that a quantity has an end (1 draw in 16 000 lies beyond).
const FARTHEST_SIGMA: f64 = 4.0;
/// Standard deviations in the tolerance of a normal distribution.
const SIGMA_STATED: f64 = 2.0;

/// How a quantity is spread over its tolerance.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Distribution {
    /// Anywhere within the tolerance alike, never beyond: what is taken where nothing but limits is known (GUM 4.3.7,
    /// from memory).
    #[default]
    Uniform,
    /// Normal; the tolerance is two standard deviations (95 % lie within), and nothing lies beyond four.
    Normal,
}

/// How far a quantity may lie from what is stated.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Tolerance {
    /// Half of the stated width, in the unit of the quantity; above zero.
    pub reach: f64,
    /// How the quantity is spread.
    pub distribution: Distribution,
}

impl Tolerance {
    /// The deviation that belongs to a standard normal score: at 0 none, at +2 well up in the tolerance.
    pub fn deviation(&self, score: f64) -> f64 {
        match self.distribution {
            // 2 Phi(score) - 1
            Distribution::Uniform => self.reach * libm::erf(score / std::f64::consts::SQRT_2),
            Distribution::Normal => {
                self.reach * score.clamp(-FARTHEST_SIGMA, FARTHEST_SIGMA) / SIGMA_STATED
            }
        }
    }

    /// The largest deviation there is.
    pub fn farthest(&self) -> f64 {
        match self.distribution {
            Distribution::Uniform => self.reach,
            Distribution::Normal => self.reach * FARTHEST_SIGMA / SIGMA_STATED,
        }
    }
}

/// A quantity as it is stated.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Stated {
    /// The value itself.
    pub nominal: f64,
    /// What it may deviate by; `None` is exact.
    pub tolerance: Option<Tolerance>,
}

/// Reads a quantity with or without a tolerance into SI units.
///
/// The tolerance is a share of the value (`33 ohm +/- 5 %`) or stands in its unit (`0.8 ns +/- 0.2 ns`); that of a
/// percentage is in points (`50 % +/- 5 %` is 45 % to 55 %). The mark is `+/-`, `+-` or `±`; a tolerance of zero is none.
///
/// # Errors
///
/// As [`parse_quantity`], of the value or of its tolerance; an unknown distribution.
pub fn parse_stated(text: &str, dimension: Dimension) -> Result<Stated, QuantityError> {
    let spelt = with_plain_mark(text);
    let Some((value, tolerance)) = spelt.split_once(MARK) else {
        return match parse_quantity(text, dimension) {
            Ok(nominal) => Ok(Stated {
                nominal,
                tolerance: None,
            }),
            Err(error) => Err(markless(&spelt, dimension).unwrap_or(error)),
        };
    };
    let (value, tolerance) = (value.trim(), tolerance.trim());
    let whole = |error: QuantityError| QuantityError {
        text: shortened(text.trim()),
        ..error
    };
    let nominal = parse_quantity(value, dimension).map_err(|error| {
        let near_miss = error.near_miss.as_ref();
        let near_miss = near_miss.map(|meant| format!("{meant} {MARK} {tolerance}"));
        whole(QuantityError { near_miss, ..error })
    })?;
    let (width, distribution) = width_and_distribution(tolerance).map_err(|(problem, meant)| {
        let near_miss = meant.map(|meant| format!("{value} {MARK} {meant}"));
        whole(error(problem, near_miss))
    })?;
    let reach = reach(width, nominal, dimension).map_err(|inner| {
        let meant = match inner.near_miss {
            Some(meant) => Some(meant),
            None if inner.problem == "has no unit" => {
                split_number(value).map(|(_, _, unit)| format!("{width} {unit}"))
            }
            None => None,
        };
        let near_miss = meant.map(|meant| format!("{value} {MARK} {meant}"));
        let problem = format!("has a tolerance that {}", inner.problem);
        whole(error(problem, near_miss))
    })?;
    if reach < 0.0 {
        let meant = width.trim_start_matches(['-', '\u{2212}']);
        let near_miss = format!("{value} {MARK} {meant}");
        return Err(whole(error(
            "has a tolerance below zero".into(),
            Some(near_miss),
        )));
    }
    Ok(Stated {
        nominal,
        tolerance: (reach > 0.0).then_some(Tolerance {
            reach,
            distribution,
        }),
    })
}

fn error(problem: String, near_miss: Option<String>) -> QuantityError {
    QuantityError {
        text: String::new(),
        problem,
        expected: EXPECTED.into(),
        near_miss,
    }
}

fn with_plain_mark(text: &str) -> String {
    text.replace('\u{b1}', MARK)
        .replace("+/\u{2212}", MARK)
        .replace("+-", MARK)
        .replace("+\u{2212}", MARK)
}

/// Splits `5 % normal`; the error is the problem and what was perhaps meant.
fn width_and_distribution(
    tolerance: &str,
) -> Result<(&str, Distribution), (String, Option<String>)> {
    let unit = split_number(tolerance).map_or("", |(_, _, unit)| unit);
    let last = unit.split_whitespace().last().unwrap_or_default();
    if let Some((word, distribution)) = WORDS.iter().find(|(word, _)| *word == last) {
        let width = tolerance.strip_suffix(word).unwrap_or(tolerance);
        return Ok((width.trim_end(), *distribution));
    }
    let Some((_, word)) = unit.split_once(char::is_whitespace) else {
        return Ok((tolerance, Distribution::default()));
    };
    let word = word.trim_start();
    let width = tolerance.strip_suffix(word).unwrap_or(tolerance).trim_end();
    let meant = near_miss(word, WORDS.iter().map(|(word, _)| *word));
    Err((
        format!("has an unknown distribution, `{}`", shortened(word)),
        meant.map(|meant| format!("{width} {meant}")),
    ))
}

/// Half of the width in the quantity's unit.
fn reach(width: &str, nominal: f64, dimension: Dimension) -> Result<f64, QuantityError> {
    let is_share = split_number(&plain_spelling(width)).is_some_and(|(_, _, unit)| unit == "%");
    if is_share && dimension != Dimension::Share {
        return Ok(nominal.abs() * parse_quantity(width, Dimension::Share)?);
    }
    parse_quantity(width, dimension)
}

/// The error of `33 ohm 5 %`, if the text is such a one.
fn markless(text: &str, dimension: Dimension) -> Option<QuantityError> {
    if dimension == Dimension::Share {
        return None;
    }
    let before = text.trim().strip_suffix('%')?.trim_end();
    let is_of_number = |c: char| c.is_ascii_digit() || c == '.';
    let value = before.trim_end_matches(is_of_number);
    let percent = &before[value.len()..];
    let value = value.trim_end_matches(['+', '-', '/', ',', ' ']);
    parse_quantity(value, dimension).ok()?;
    Some(QuantityError {
        text: shortened(text.trim()),
        ..error(
            format!("has a tolerance without `{MARK}`"),
            (!percent.is_empty()).then(|| format!("{value} {MARK} {percent} %")),
        )
    })
}

#[cfg(test)]
mod tests {
    use super::Dimension::*;
    use super::*;

    #[track_caller]
    fn reads(text: &str, dimension: Dimension, nominal: f64, reach: f64, spread: Distribution) {
        let stated = parse_stated(text, dimension).unwrap();
        assert_eq!(stated.nominal, nominal, "{text}");
        let tolerance = stated.tolerance.unwrap();
        assert!((tolerance.reach / reach - 1.0).abs() < 1e-12, "{text}");
        assert_eq!(tolerance.distribution, spread, "{text}");
    }

    #[test]
    fn a_tolerance_is_a_share_or_stands_in_the_unit() {
        use Distribution::{Normal, Uniform};
        reads("33 ohm +/- 5 %", Resistance, 33.0, 1.65, Uniform);
        reads("33ohm\u{b1}5%", Resistance, 33.0, 1.65, Uniform);
        reads("33 ohm +- 5 % uniform", Resistance, 33.0, 1.65, Uniform);
        reads("0.8 ns +/- 0.2 ns", Time, 0.8e-9, 0.2e-9, Uniform);
        reads("0.8 ns +/- 200 ps normal", Time, 0.8e-9, 0.2e-9, Normal);
        reads(
            "0.8 ns +/\u{2212} 25 % normal",
            Time,
            0.8e-9,
            0.2e-9,
            Normal,
        );
        reads("4.3 +/- 0.2", Number, 4.3, 0.2, Uniform);
        reads("4.3 +/- 0.2 normal", Number, 4.3, 0.2, Normal);
        reads("4.3 +/- 10 %", Number, 4.3, 0.43, Uniform);
        reads("50 % +/- 5 %", Share, 0.5, 0.05, Uniform);
        reads("-2 V +/- 10 %", Voltage, -2.0, 0.2, Uniform);
        let exact = Stated {
            nominal: 33.0,
            tolerance: None,
        };
        assert_eq!(parse_stated("33 ohm", Resistance), Ok(exact));
        assert_eq!(parse_stated("33 ohm +/- 0 %", Resistance), Ok(exact));
    }

    #[track_caller]
    fn fails(text: &str, dimension: Dimension, problem: &str, near_miss: Option<&str>) {
        let error = parse_stated(text, dimension).unwrap_err();
        assert_eq!(error.problem, problem, "{text}");
        assert_eq!(error.near_miss.as_deref(), near_miss, "{text}");
        assert_eq!(error.text, text);
    }

    #[test]
    fn errors_say_what_was_meant() {
        let unit = "has a tolerance that has no unit";
        fails("0.8 ns +/- 0.2", Time, unit, Some("0.8 ns +/- 0.2 ns"));
        fails(
            "0.8 ns +/- 0.2 NS",
            Time,
            "has a tolerance that has an unknown unit, `NS`",
            Some("0.8 ns +/- 0.2 ns"),
        );
        fails(
            "0.8 ns +/- 2 ohm",
            Time,
            "has a tolerance that is a resistance, not a time",
            None,
        );
        fails(
            "0.8 ns +/-",
            Time,
            "has a tolerance that is not a time",
            None,
        );
        fails("0.8 +/- 5 %", Time, "has no unit", None);
        fails(
            "33 R +/- 5 %",
            Resistance,
            "has an unknown unit, `R`",
            Some("33 ohm +/- 5 %"),
        );
        fails(
            "33 ohm +/- 5 % gauss",
            Resistance,
            "has an unknown distribution, `gauss`",
            None,
        );
        fails(
            "33 ohm +/- 5 % norml",
            Resistance,
            "has an unknown distribution, `norml`",
            Some("33 ohm +/- 5 % normal"),
        );
        fails(
            "33 ohm +/- -5 %",
            Resistance,
            "has a tolerance below zero",
            Some("33 ohm +/- 5 %"),
        );
        let markless = "has a tolerance without `+/-`";
        fails("33 ohm 5 %", Resistance, markless, Some("33 ohm +/- 5 %"));
        fails("33 ohm, 5%", Resistance, markless, Some("33 ohm +/- 5 %"));
    }

    #[test]
    fn a_score_of_zero_is_nominal_and_the_ends_hold() {
        for distribution in [Distribution::Uniform, Distribution::Normal] {
            let tolerance = Tolerance {
                reach: 3.0,
                distribution,
            };
            assert_eq!(tolerance.deviation(0.0), 0.0);
            for score in [-1e3, -5.0, 5.0, 1e3] {
                assert!(tolerance.deviation(score).abs() <= tolerance.farthest());
            }
        }
        let normal = Tolerance {
            reach: 3.0,
            distribution: Distribution::Normal,
        };
        assert_eq!(normal.deviation(2.0), 3.0);
        // Phi(0.6745) = 3/4: halfway up a uniform tolerance (any statistics table).
        let uniform = Tolerance {
            reach: 3.0,
            distribution: Distribution::Uniform,
        };
        assert!((uniform.deviation(0.674_49) - 1.5).abs() < 1e-4);
    }
}
