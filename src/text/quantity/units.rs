//! The units of each dimension.

use super::Dimension;
use Scale::{Decibels, Fraction, Ten};

/// How a unit turns into the SI unit.
#[derive(Debug, Clone, Copy)]
pub(super) enum Scale {
    /// Times a power of ten.
    Ten(i32),
    /// Times a fraction that no power of ten expresses.
    Fraction(f64, f64),
    /// Twenty times the common logarithm of the number, plus this.
    Decibels(f64),
}

/// The units of each dimension as the trade writes them, case included (mm and Mohm are not MM and mohm).
pub(super) const UNITS: &[(Dimension, &[(&str, Scale)])] = &[
    (
        Dimension::Length,
        &[
            ("m", Ten(0)),
            ("cm", Ten(-2)),
            ("mm", Ten(-3)),
            ("um", Ten(-6)),
            ("nm", Ten(-9)),
            // 1 in = 25.4 mm exactly
            ("mil", Fraction(254.0, 1e7)),
            ("in", Fraction(254.0, 1e4)),
        ],
    ),
    (
        Dimension::Time,
        &[
            ("s", Ten(0)),
            ("ms", Ten(-3)),
            ("us", Ten(-6)),
            ("ns", Ten(-9)),
            ("ps", Ten(-12)),
            ("fs", Ten(-15)),
        ],
    ),
    (
        Dimension::Resistance,
        &[
            ("ohm", Ten(0)),
            ("kohm", Ten(3)),
            ("Mohm", Ten(6)),
            ("mohm", Ten(-3)),
        ],
    ),
    (
        Dimension::Capacitance,
        &[
            ("F", Ten(0)),
            ("mF", Ten(-3)),
            ("uF", Ten(-6)),
            ("nF", Ten(-9)),
            ("pF", Ten(-12)),
            ("fF", Ten(-15)),
        ],
    ),
    (
        Dimension::Inductance,
        &[
            ("H", Ten(0)),
            ("mH", Ten(-3)),
            ("uH", Ten(-6)),
            ("nH", Ten(-9)),
            ("pH", Ten(-12)),
        ],
    ),
    (
        Dimension::Frequency,
        &[
            ("Hz", Ten(0)),
            ("kHz", Ten(3)),
            ("MHz", Ten(6)),
            ("GHz", Ten(9)),
        ],
    ),
    (
        Dimension::Voltage,
        &[
            ("V", Ten(0)),
            ("kV", Ten(3)),
            ("mV", Ten(-3)),
            ("uV", Ten(-6)),
        ],
    ),
    (
        Dimension::Current,
        &[
            ("A", Ten(0)),
            ("mA", Ten(-3)),
            ("uA", Ten(-6)),
            ("nA", Ten(-9)),
        ],
    ),
    (
        Dimension::FieldStrength,
        &[
            ("dBuV/m", Ten(0)),
            ("dB(uV/m)", Ten(0)),
            ("uV/m", Decibels(0.0)),
            ("mV/m", Decibels(60.0)),
            ("V/m", Decibels(120.0)),
        ],
    ),
    (Dimension::Share, &[("%", Ten(-2))]),
    (Dimension::Number, &[("", Ten(0))]),
];

/// What people write for a unit that a comparison of letters would not find.
pub(super) const HABITS: &[(&str, &str)] = &[
    ("inch", "in"),
    ("inches", "in"),
    ("\"", "in"),
    ("mils", "mil"),
    ("thou", "mil"),
    ("micron", "um"),
    ("sec", "s"),
    ("nsec", "ns"),
    ("psec", "ps"),
    ("R", "ohm"),
    ("k", "kohm"),
    ("dBuV", "dBuV/m"),
    ("uV", "uV/m"),
    ("mV", "mV/m"),
    ("V", "V/m"),
];
