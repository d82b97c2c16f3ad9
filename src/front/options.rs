//! Values on the command line.

use clap::ValueEnum;
use ringfield::radiation::Site;
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
    let expected = "a spread from 0 dB to 40 dB was expected";
    let number = text.trim().strip_suffix("dB").unwrap_or(text).trim();
    let decibels = number.parse().map_err(|_| expected.to_string())?;
    in_range(decibels, 0.0..=40.0, expected)
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
    fn a_spread_is_a_finite_number() {
        assert_eq!(decibels("5 dB"), Ok(5.0));
        assert_eq!(decibels("6.5"), Ok(6.5));
        assert!(decibels("NaN").is_err());
        assert!(decibels("-1 dB").is_err());
    }
}
