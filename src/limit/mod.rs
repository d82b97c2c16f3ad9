//! Limit lines: what a receiver may read at a distance, over frequency.

mod built_in;
mod distance;
mod read;

pub use built_in::{BuiltIn, built_in, default_limits};
pub use distance::{BandAt, LimitAt, distance_offset_db, limits_at};
pub use read::read_limit;

/// A limit line as its standard states it.
#[derive(Debug, Clone, PartialEq)]
pub struct Limit {
    /// Its title, for example `47 CFR 15.109 class B`. Files of one title state one limit at several distances.
    pub title: String,
    /// Where the values come from, if the file says.
    pub source: Option<String>,
    /// The distance it is stated at.
    pub distance_m: f64,
    /// The receiver's detector.
    pub detector: Detector,
    /// Its bands, by rising frequency, not overlapping.
    pub bands: Vec<Band>,
}

/// A receiver's detector.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Detector {
    /// Quasi-peak.
    QuasiPeak,
    /// Average.
    Average,
    /// Peak.
    Peak,
}

/// One band of a limit line.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Band {
    /// Lower edge.
    pub from_hz: f64,
    /// Upper edge.
    pub to_hz: f64,
    /// Limit at the lower edge.
    pub from_dbuv_per_m: f64,
    /// Limit at the upper edge; between them the limit is a line over log frequency.
    pub to_dbuv_per_m: f64,
    /// The detector in this band, where it is not the limit's own.
    pub detector: Option<Detector>,
}

impl Limit {
    /// The limit at a frequency, in dBuV/m; `None` where it states none. At an edge of two bands the lower value holds.
    pub fn at(&self, frequency_hz: f64) -> Option<f64> {
        at_bands(&self.bands, frequency_hz)
    }
}

impl Band {
    /// The limit at a frequency within the band, edges included.
    fn at(&self, frequency_hz: f64) -> Option<f64> {
        if !(self.from_hz..=self.to_hz).contains(&frequency_hz) {
            return None;
        }
        let share = (frequency_hz / self.from_hz).ln() / (self.to_hz / self.from_hz).ln();
        Some(self.from_dbuv_per_m + share * (self.to_dbuv_per_m - self.from_dbuv_per_m))
    }
}

/// The lowest value that any of the bands gives.
fn at_bands<'b>(bands: impl IntoIterator<Item = &'b Band>, frequency_hz: f64) -> Option<f64> {
    bands
        .into_iter()
        .filter_map(|band| band.at(frequency_hz))
        .min_by(f64::total_cmp)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn two_values_are_a_line_over_log_frequency() {
        let text = "
title: sloping
distance: 3 m
detector: peak
bands:
  - {from: 100 MHz, to: 1 GHz, limit: [60 dBuV/m, 40 dBuV/m]}
  - {from: 10 MHz, to: 100 MHz, limit: 1 mV/m, detector: average}
";
        let limit = read_limit(text, "own.yaml").unwrap();
        approx::assert_relative_eq!(limit.at(100e6 * 10f64.sqrt()).unwrap(), 50.0);
        assert_eq!((limit.at(100e6), limit.at(1e9)), (Some(60.0), Some(40.0)));
        assert_eq!(limit.bands[0].detector, Some(Detector::Average));
        assert_eq!((limit.detector, limit.source), (Detector::Peak, None));
    }
}
