//! Axes: where a value lies, and which values are written.

use crate::show::words::trimmed;

/// An axis of a picture.
#[derive(Debug, Clone, Copy)]
pub(super) struct Axis {
    from: f64,
    to: f64,
    log: bool,
    /// Where `from` and `to` lie in the picture.
    places: (f64, f64),
}

/// A value marked on an axis; the unlabelled ones only carry a grid line.
pub(super) struct Tick {
    pub value: f64,
    pub label: Option<String>,
}

impl Axis {
    pub fn linear(range: (f64, f64), places: (f64, f64)) -> Self {
        Self {
            from: range.0,
            to: range.1,
            log: false,
            places,
        }
    }

    pub fn log(range: (f64, f64), places: (f64, f64)) -> Self {
        Self {
            from: range.0,
            to: range.1,
            log: true,
            places,
        }
    }

    pub fn range(&self) -> (f64, f64) {
        (self.from, self.to)
    }

    /// Where a value lies in the picture; values outside the axis lie at its end.
    pub fn place(&self, value: f64) -> f64 {
        let share = if self.log {
            (value / self.from).ln() / (self.to / self.from).ln()
        } else {
            (value - self.from) / (self.to - self.from)
        };
        self.places.0 + share.clamp(0.0, 1.0) * (self.places.1 - self.places.0)
    }

    pub fn ticks(&self) -> Vec<Tick> {
        if self.log {
            self.log_ticks()
        } else {
            self.linear_ticks()
        }
    }

    /// About eight labelled ticks, a round step apart.
    fn linear_ticks(&self) -> Vec<Tick> {
        let step = round_step((self.to - self.from) / 8.0);
        let decimals = (-step.log10().floor()).max(0.0) as usize;
        let first = (self.from / step - 1e-9).ceil() as i64;
        let last = (self.to / step + 1e-9).floor() as i64;
        (first..=last)
            .map(|index| {
                let value = index as f64 * step;
                Tick {
                    value,
                    label: Some(trimmed(value, decimals)),
                }
            })
            .collect()
    }

    /// 1 to 9 in every decade, of which as many are labelled as fit.
    fn log_ticks(&self) -> Vec<Tick> {
        let decades = (self.to / self.from).log10();
        let labelled: &[u32] = match decades {
            d if d < 1.1 => &[1, 2, 3, 4, 5, 6, 7, 8, 9],
            d if d < 2.6 => &[1, 2, 3, 5, 7],
            d if d < 4.0 => &[1, 3],
            _ => &[1],
        };
        let first = self.from.log10().floor() as i32;
        let last = self.to.log10().ceil() as i32;
        (first..=last)
            .flat_map(|decade| (1..=9).map(move |digit| (digit, decade)))
            .map(|(digit, decade)| Tick {
                value: f64::from(digit) * 10f64.powi(decade),
                label: labelled
                    .contains(&digit)
                    .then(|| trimmed(f64::from(digit) * 10f64.powi(decade), 6)),
            })
            .filter(|tick| {
                tick.value >= self.from * (1.0 - 1e-9) && tick.value <= self.to * (1.0 + 1e-9)
            })
            .collect()
    }
}

/// The smallest of 1, 2, 5, 10 ... that is not below a positive number.
fn round_step(at_least: f64) -> f64 {
    let decade = 10f64.powf(at_least.log10().floor());
    [1.0, 2.0, 5.0]
        .into_iter()
        .map(|digit| digit * decade)
        .find(|step| *step >= at_least)
        .unwrap_or(10.0 * decade)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn labels(axis: &Axis) -> Vec<String> {
        axis.ticks().into_iter().filter_map(|t| t.label).collect()
    }

    #[test]
    fn a_log_axis_is_labelled_at_round_values() {
        let axis = Axis::log((30.0, 1000.0), (0.0, 100.0));
        assert_eq!(
            labels(&axis),
            ["30", "50", "70", "100", "200", "300", "500", "700", "1000"]
        );
        assert!((axis.place(30.0 * (1000.0f64 / 30.0).sqrt()) - 50.0).abs() < 1e-9);
    }

    #[test]
    fn a_linear_axis_is_labelled_at_round_steps() {
        let axis = Axis::linear((-1.3, 4.6), (100.0, 0.0));
        assert_eq!(labels(&axis), ["-1", "0", "1", "2", "3", "4"]);
    }

    #[test]
    fn nothing_lies_outside() {
        let axis = Axis::linear((0.0, 1.0), (100.0, 0.0));
        assert_eq!(axis.place(7.0), 0.0);
        assert_eq!(axis.place(-7.0), 100.0);
    }
}
