//! Values on the command line.

use clap::ValueEnum;
use ringfield::radiation::Site;
use ringfield::study::{FEWEST_DRAWS, MOST_DRAWS};
use ringfield::text::{Dimension, parse_quantity};

/// Without `--distance`.
pub const USUAL_DISTANCES_M: [f64; 2] = [3.0, 10.0];

/// A site as written on the command line.
#[derive(Debug, Clone, Copy, ValueEnum)]
pub enum SiteChoice {
    /// Over a conducting floor, antenna 1-4 m high.
    OpenArea,
    /// Nothing but board and antenna.
    FreeSpace,
}

impl From<SiteChoice> for Site {
    fn from(choice: SiteChoice) -> Self {
        match choice {
            SiteChoice::OpenArea => Site::OpenArea,
            SiteChoice::FreeSpace => Site::FreeSpace,
        }
    }
}

/// A distance of the antenna.
pub fn distance(text: &str) -> Result<f64, String> {
    let distance_m = quantity(text, Dimension::Length)?;
    in_range(
        distance_m,
        1.0..=30.0,
        "a distance from 1 m to 30 m was expected",
    )
}

/// Height of the table.
pub fn table_height(text: &str) -> Result<f64, String> {
    let height_m = quantity(text, Dimension::Length)?;
    in_range(
        height_m,
        0.1..=3.0,
        "a height from 0.1 m to 3 m was expected",
    )
}

/// The antenna's heights: one, or the lowest and the highest.
pub fn antenna_heights(text: &str) -> Result<[f64; 2], String> {
    let expected = "heights such as `1 m to 4 m`, or one height, from 0.5 m to 10 m were expected";
    let height = |text: &str| {
        let height_m = quantity(text.trim(), Dimension::Length)?;
        in_range(height_m, 0.5..=10.0, expected)
    };
    let (lowest, highest) = text.split_once("to").unwrap_or((text, text));
    match [height(lowest)?, height(highest)?] {
        [lowest_m, highest_m] if lowest_m <= highest_m => Ok([lowest_m, highest_m]),
        _ => Err(expected.into()),
    }
}

/// The highest frequency to look at.
pub fn frequency(text: &str) -> Result<f64, String> {
    let frequency_hz = quantity(text, Dimension::Frequency)?;
    in_range(
        frequency_hz,
        1e6..=40e9,
        "a frequency from 1 MHz to 40 GHz was expected",
    )
}

/// A clock.
pub fn frequency_of_clock(text: &str) -> Result<f64, String> {
    quantity(text, Dimension::Frequency)
}

/// A standard deviation in dB; the unit may be left out.
pub fn decibels(text: &str) -> Result<f64, String> {
    decibels_from_0_to_40(text, "a spread from 0 dB to 40 dB was expected")
}

/// A margin in dB; the unit may be left out.
pub fn margin(text: &str) -> Result<f64, String> {
    decibels_from_0_to_40(text, "a margin from 0 dB to 40 dB was expected")
}

fn decibels_from_0_to_40(text: &str, expected: &str) -> Result<f64, String> {
    let number = text.trim().strip_suffix("dB").unwrap_or(text).trim();
    let decibels = number.parse().map_err(|_| expected.to_string())?;
    in_range(decibels, 0.0..=40.0, expected)
}

/// How many draws of the tolerances.
pub fn draws(text: &str) -> Result<usize, String> {
    match text.trim().parse() {
        Ok(draws) if draws == 0 || (FEWEST_DRAWS..=MOST_DRAWS).contains(&draws) => Ok(draws),
        _ => Err(format!(
            "a number of draws from {FEWEST_DRAWS} to {MOST_DRAWS} was expected, or 0"
        )),
    }
}

fn quantity(text: &str, dimension: Dimension) -> Result<f64, String> {
    parse_quantity(text, dimension).map_err(|error| error.to_string())
}

fn in_range(
    value: f64,
    range: std::ops::RangeInclusive<f64>,
    expected: &str,
) -> Result<f64, String> {
    if range.contains(&value) {
        Ok(value)
    } else {
        Err(expected.to_string())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_distance_has_a_unit_and_a_range() {
        assert_eq!(distance("3m"), Ok(3.0));
        assert_eq!(distance("7.5 m"), Ok(7.5));
        assert!(distance("3").is_err());
        assert!(distance("0.5 m").is_err());
        assert!(distance("100 m").is_err());
    }

    #[test]
    fn heights_are_one_or_a_rising_pair() {
        assert_eq!(antenna_heights("1 m to 4 m"), Ok([1.0, 4.0]));
        assert_eq!(antenna_heights("150 cm"), Ok([1.5, 1.5]));
        assert!(antenna_heights("4 m to 1 m").is_err());
        assert!(antenna_heights("1 to 4").is_err());
        assert!(table_height("80 cm").is_ok() && table_height("0 m").is_err());
    }

    #[test]
    fn a_spread_is_a_finite_number() {
        assert_eq!(decibels("5 dB"), Ok(5.0));
        assert_eq!(decibels("6.5"), Ok(6.5));
        assert!(decibels("NaN").is_err());
        assert!(decibels("-1 dB").is_err());
    }
}
