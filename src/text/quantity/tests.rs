use super::*;
use Dimension::*;

#[track_caller]
fn reads(text: &str, dimension: Dimension, expected: f64) {
    assert_eq!(parse_quantity(text, dimension), Ok(expected), "{text}");
}

#[test]
fn powers_of_ten_are_exact() {
    reads("0.8 ns", Time, 0.8e-9);
    reads("0.8ns", Time, 0.8e-9);
    reads("870 ps", Time, 870e-12);
    reads("48 MHz", Frequency, 48e6);
    reads("10 pF", Capacitance, 10e-12);
    reads("47 nH", Inductance, 47e-9);
    reads("3.3 V", Voltage, 3.3);
    reads("10 mA", Current, 0.01);
    reads("50 %", Share, 0.5);
    reads("50%", Share, 0.5);
    reads("4.3", Number, 4.3);
    reads("1.5e3 mm", Length, 1.5);
    reads("-5 mV", Voltage, -0.005);
    reads(".5 mm", Length, 0.5e-3);
}

#[test]
fn inches_and_mils_are_exact() {
    reads("6 in", Length, 0.1524);
    reads("4 mil", Length, 101.6e-6);
    reads("10 mil", Length, 254e-6);
}

#[test]
fn every_spelling_of_a_letter_is_read() {
    for ohms in ["65 ohm", "65 \u{3a9}", "65\u{2126}", "65\u{a0}ohm"] {
        reads(ohms, Resistance, 65.0);
    }
    for kilohms in ["1 kohm", "1k\u{3a9}", "1 k\u{2126}"] {
        reads(kilohms, Resistance, 1000.0);
    }
    for microns in ["35 um", "35 \u{b5}m", "35 \u{3bc}m"] {
        reads(microns, Length, 35e-6);
    }
    reads("\u{2212}40 dB\u{b5}V/m", FieldStrength, -40.0);
}

#[test]
fn field_strengths_become_decibels() {
    reads("-40 dBuV/m", FieldStrength, -40.0);
    reads("40 dB(\u{3bc}V/m)", FieldStrength, 40.0);
    reads("100 uV/m", FieldStrength, 40.0);
    reads("1 mV/m", FieldStrength, 60.0);
    reads("1 V/m", FieldStrength, 120.0);
}

#[track_caller]
fn fails(text: &str, dimension: Dimension, problem: &str, near_miss: Option<&str>) {
    let error = parse_quantity(text, dimension).unwrap_err();
    assert_eq!(error.problem, problem, "{text}");
    assert_eq!(error.near_miss.as_deref(), near_miss, "{text}");
}

#[test]
fn errors_say_what_was_meant() {
    fails("4", Length, "has no unit", None);
    fails("4 ohm", Length, "is a resistance, not a length", None);
    fails(
        "48 mhz",
        Frequency,
        "has an unknown unit, `mhz`",
        Some("48 MHz"),
    );
    fails("0.8NS", Time, "has an unknown unit, `NS`", Some("0.8 ns"));
    fails("4 Mil", Length, "has an unknown unit, `Mil`", Some("4 mil"));
    fails(
        "4 mils",
        Length,
        "has an unknown unit, `mils`",
        Some("4 mil"),
    );
    fails(
        "33R",
        Resistance,
        "has an unknown unit, `R`",
        Some("33 ohm"),
    );
    fails(
        "1 k",
        Resistance,
        "has an unknown unit, `k`",
        Some("1 kohm"),
    );
    fails(
        "6 inches",
        Length,
        "has an unknown unit, `inches`",
        Some("6 in"),
    );
    fails(
        "100 uV",
        FieldStrength,
        "is a voltage, not a field strength",
        Some("100 uV/m"),
    );
    fails("5 furlong", Length, "has an unknown unit, `furlong`", None);
    fails(
        "4.3 mm",
        Number,
        "has a unit, `mm`, but is a plain number",
        None,
    );
    fails("0,8 ns", Time, "has a decimal comma", Some("0.8 ns"));
    fails("1.2.3 ns", Time, "is not a time", None);
    fails("fast", Time, "is not a time", None);
    fails("", Time, "is not a time", None);
    fails("NaN ohm", Resistance, "is not a finite number", None);
    fails("-.inf", Resistance, "is not a finite number", None);
    fails("1e400 V", Voltage, "is too large", None);
    fails("1e99999999999 V", Voltage, "is too large", None);
    fails(
        "0 uV/m",
        FieldStrength,
        "is a field strength that is not above zero",
        None,
    );
}

#[test]
fn an_error_reads_as_one_sentence() {
    assert_eq!(
        parse_quantity("3 M", Length).unwrap_err().to_string(),
        "`3 M` has an unknown unit, `M`, expected a length such as `4 mil`, `160 mm` or `3 m`; did you mean `3 m`?"
    );
}
