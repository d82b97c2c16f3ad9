//! Numbers as people read them.

use crate::limit::Detector;
use crate::radiation::{Aim, Polarisation, Site};

/// A frequency with the unit that keeps it short: `48 MHz`, `1.248 GHz`.
pub(super) fn frequency(frequency_hz: f64) -> String {
    let (unit, scale) = match frequency_hz.abs() {
        f if f >= 1e9 => ("GHz", 1e9),
        f if f >= 1e6 => ("MHz", 1e6),
        f if f >= 1e3 => ("kHz", 1e3),
        _ => ("Hz", 1.0),
    };
    format!("{} {unit}", trimmed(frequency_hz / scale, 3))
}

/// A distance in metres: `3 m`, `7.5 m`.
pub fn distance(distance_m: f64) -> String {
    format!("{} m", trimmed(distance_m, 3))
}

/// A number with at most so many decimals and no trailing zeros.
pub(super) fn trimmed(value: f64, decimals: usize) -> String {
    let text = format!("{value:.decimals$}");
    if text.contains('.') {
        text.trim_end_matches('0').trim_end_matches('.').to_string()
    } else {
        text
    }
}

/// A chance in whole percent, never rounded to certainty.
pub(super) fn chance(chance: f64) -> String {
    match 100.0 * chance {
        percent if percent < 1.0 => "<1 %".to_string(),
        percent if percent > 99.0 => ">99 %".to_string(),
        percent => format!("{percent:.0} %"),
    }
}

/// How the antenna lies.
pub(super) fn polarisation(polarisation: Polarisation) -> &'static str {
    match polarisation {
        Polarisation::Horizontal => "horizontal",
        Polarisation::Vertical => "vertical",
    }
}

/// Where the antenna reads a field.
pub(super) fn aim(aim: &Aim) -> String {
    format!(
        "{}, {:.1} m up, at {:.0}°",
        polarisation(aim.polarisation),
        aim.antenna_height_m,
        aim.angle_deg
    )
}

/// The site as it is written on the command line.
pub(super) fn site(site: Site) -> &'static str {
    match site {
        Site::OpenArea => "open-area",
        Site::FreeSpace => "free-space",
    }
}

/// A detector's name.
pub(super) fn detector(detector: Detector) -> &'static str {
    match detector {
        Detector::QuasiPeak => "quasi-peak",
        Detector::Average => "average",
        Detector::Peak => "peak",
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn frequencies_take_the_unit_that_keeps_them_short() {
        assert_eq!(frequency(48e6), "48 MHz");
        assert_eq!(frequency(1.248e9), "1.248 GHz");
        assert_eq!(frequency(32_768.0), "32.768 kHz");
    }

    #[test]
    fn a_chance_is_never_certain() {
        assert_eq!(chance(0.9999), ">99 %");
        assert_eq!(chance(1e-9), "<1 %");
        assert_eq!(chance(0.5), "50 %");
    }

    #[test]
    fn trailing_zeros_go_but_not_those_of_whole_numbers() {
        assert_eq!(trimmed(10.0, 0), "10");
        assert_eq!(trimmed(7.50, 3), "7.5");
    }
}
