//! Values that parts are sold in: the E series of IEC 60063.

const E24: [f64; 24] = [
    1.0, 1.1, 1.2, 1.3, 1.5, 1.6, 1.8, 2.0, 2.2, 2.4, 2.7, 3.0, 3.3, 3.6, 3.9, 4.3, 4.7, 5.1, 5.6,
    6.2, 6.8, 7.5, 8.2, 9.1,
];

/// A value of the E24 series, as a number of steps from 1.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct E24Step(pub i32);

impl E24Step {
    /// The step whose value is nearest to a positive number, in proportion.
    pub fn nearest(value: f64) -> Self {
        let about = (value.max(1e-15).log10() * 24.0).round() as i32;
        let distance = |step: &Self| (step.value() / value).ln().abs();
        (about - 2..=about + 2)
            .map(Self)
            .min_by(|a, b| distance(a).total_cmp(&distance(b)))
            .unwrap_or(Self(about))
    }

    /// The value.
    pub fn value(self) -> f64 {
        let decade = self.0.div_euclid(24);
        let digits = E24[self.0.rem_euclid(24) as usize];
        // Through text, so that 4.7 x 10 is what a file's `47` reads as.
        format!("{digits}e{decade}").parse().unwrap_or(digits)
    }
}

/// The value of the E6 series, in which capacitors are common, that is not below a positive number.
pub fn e6_at_least(value: f64) -> f64 {
    let start = (value.max(1e-15).log10() * 24.0).floor() as i32;
    (start - 4..)
        .filter(|step| step.rem_euclid(4) == 0)
        .map(|step| E24Step(step).value())
        .find(|candidate| *candidate >= value * (1.0 - 1e-9))
        .unwrap_or(value)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// IEC 60063.
    #[test]
    fn steps_are_those_of_the_series() {
        assert_eq!(E24Step::nearest(61.0).value(), 62.0);
        assert_eq!(E24Step::nearest(47.2).value(), 47.0);
        assert_eq!(E24Step::nearest(9.6).value(), 10.0);
        assert_eq!(E24Step::nearest(0.099).value(), 0.1);
        assert_eq!(E24Step(E24Step::nearest(91.0).0 + 1).value(), 100.0);
        assert_eq!(E24Step(E24Step::nearest(100.0).0 - 1).value(), 91.0);
    }

    #[test]
    fn capacitors_come_in_steps_of_e6() {
        let near = |value: f64, expected: f64| {
            assert!(
                (e6_at_least(value) / expected - 1.0).abs() < 1e-12,
                "{value}"
            );
        };
        near(40e-12, 47e-12);
        near(47e-12, 47e-12);
        near(48e-12, 68e-12);
        near(69e-12, 100e-12);
    }
}
