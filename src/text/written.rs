//! Quantities as people write them, in a form that is read back.

/// A resistance as people write it.
pub fn ohms(value: f64) -> String {
    scaled(value, &[(1e6, "Mohm"), (1e3, "kohm"), (1.0, "ohm")])
}

/// A capacitance as people write it.
pub fn farads(value: f64) -> String {
    scaled(value, &[(1e-6, "uF"), (1e-9, "nF"), (1e-12, "pF")])
}

/// An inductance as people write it.
pub fn henries(value: f64) -> String {
    scaled(value, &[(1e-6, "uH"), (1e-9, "nH")])
}

/// A time as people write it.
pub fn seconds(value: f64) -> String {
    scaled(value, &[(1e-6, "us"), (1e-9, "ns"), (1e-12, "ps")])
}

/// A voltage as people write it.
pub fn volts(value: f64) -> String {
    scaled(value, &[(1.0, "V")])
}

/// A length as people write it.
pub fn metres(value: f64) -> String {
    scaled(value, &[(1.0, "m"), (1e-3, "mm"), (1e-6, "um")])
}

/// A value in the largest unit of which it is at least one, to six digits.
fn scaled(value: f64, units: &[(f64, &str)]) -> String {
    let fits = |unit: &&(f64, &str)| value.abs() >= unit.0 * (1.0 - 1e-9);
    let smallest = units.last().copied().unwrap_or((1.0, ""));
    let (scale, unit) = units.iter().find(fits).copied().unwrap_or(smallest);
    let number = value / scale;
    let decimals = (5.0 - number.abs().max(1e-3).log10().floor()).clamp(0.0, 9.0) as usize;
    let text = format!("{number:.decimals$}");
    let text = if text.contains('.') {
        text.trim_end_matches('0').trim_end_matches('.')
    } else {
        &text
    };
    format!("{text} {unit}")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn values_take_the_unit_that_keeps_them_short() {
        assert_eq!(ohms(4700.0), "4.7 kohm");
        assert_eq!(ohms(0.0), "0 ohm");
        assert_eq!(farads(100e-12), "100 pF");
        assert_eq!(henries(47e-9), "47 nH");
        assert_eq!(seconds(0.8e-9), "800 ps");
        assert_eq!(metres(0.1016e-3), "101.6 um");
        assert_eq!(volts(-3.3), "-3.3 V");
    }
}
