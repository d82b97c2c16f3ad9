//! Limits at the distance of the antenna.

use super::{Band, Detector, Limit, at_bands};

/// What a limit falls by when the antenna stands farther off: 20 dB per decade of distance (47 CFR 15.31(f)(1), at and
/// above 30 MHz).
///
/// From 3 m to 10 m it is -10.46 dB.
pub fn distance_offset_db(from_m: f64, to_m: f64) -> f64 {
    20.0 * (from_m / to_m).log10()
}

/// A limit as it holds at one distance of the antenna.
#[derive(Debug, Clone, PartialEq)]
pub struct LimitAt {
    /// Title of the limit.
    pub title: String,
    /// Distance of the antenna.
    pub distance_m: f64,
    /// Its bands by rising frequency, moved to that distance.
    pub bands: Vec<BandAt>,
}

/// A band of a limit as it holds at one distance.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct BandAt {
    /// The band, its values moved to the distance of the antenna.
    pub band: Band,
    /// Its detector.
    pub detector: Detector,
    /// The distance its values are stated at.
    pub stated_distance_m: f64,
}

/// The limits at `distance_m`, one for each title in order of its first appearance.
///
/// A limit stated at that distance is taken as it is, else the one stated nearest to it (by ratio) is moved. Bands that
/// only a farther one states are added from there: above 1 GHz some standards state a single distance.
pub fn limits_at(limits: &[Limit], distance_m: f64) -> Vec<LimitAt> {
    let mut found: Vec<LimitAt> = Vec::new();
    for limit in limits {
        if found.iter().all(|other| other.title != limit.title) {
            let title = limit.title.clone();
            found.push(LimitAt {
                title,
                distance_m,
                bands: Vec::new(),
            });
        }
    }
    let farness = |limit: &Limit| (limit.distance_m / distance_m).ln().abs();
    let mut by_nearness: Vec<&Limit> = limits.iter().collect();
    by_nearness.sort_by(|a, b| farness(a).total_cmp(&farness(b)));
    for limit in by_nearness {
        if let Some(of_title) = found.iter_mut().find(|other| other.title == limit.title) {
            of_title.add(limit);
        }
    }
    found
}

impl LimitAt {
    /// The limit at a frequency, in dBuV/m; `None` where it states none.
    pub fn at(&self, frequency_hz: f64) -> Option<f64> {
        at_bands(self.bands.iter().map(|band| &band.band), frequency_hz)
    }

    /// What a reader should know about where the values come from; `None` where all are stated at the distance.
    pub fn note(&self) -> Option<String> {
        let moved: Vec<&BandAt> = self
            .bands
            .iter()
            .filter(|band| band.stated_distance_m != self.distance_m)
            .collect();
        let mut distances_m: Vec<f64> = moved.iter().map(|band| band.stated_distance_m).collect();
        distances_m.sort_by(f64::total_cmp);
        distances_m.dedup();
        let sentences = distances_m.iter().map(|&stated_m| {
            let of_distance = moved.iter().filter(|band| band.stated_distance_m == stated_m);
            let from_hz = of_distance.map(|band| band.band.from_hz).fold(f64::INFINITY, f64::min);
            let part = if moved.len() == self.bands.len() && distances_m.len() == 1 {
                String::new()
            } else {
                format!(" from {} MHz", from_hz / 1e6)
            };
            format!(
                "{}{part} is stated at {stated_m} m and moved to {} m at 20 dB per decade of distance ({:+.2} dB).",
                self.title,
                self.distance_m,
                distance_offset_db(stated_m, self.distance_m),
            )
        });
        let note = sentences.collect::<Vec<_>>().join(" ");
        (!note.is_empty()).then_some(note)
    }

    /// Adds the bands of `limit` where there are none yet.
    fn add(&mut self, limit: &Limit) {
        let offset_db = distance_offset_db(limit.distance_m, self.distance_m);
        for band in &limit.bands {
            let overlaps =
                |other: &BandAt| other.band.from_hz < band.to_hz && band.from_hz < other.band.to_hz;
            if self.bands.iter().any(overlaps) {
                continue;
            }
            let moved = Band {
                from_dbuv_per_m: band.from_dbuv_per_m + offset_db,
                to_dbuv_per_m: band.to_dbuv_per_m + offset_db,
                ..*band
            };
            self.bands.push(BandAt {
                band: moved,
                detector: band.detector.unwrap_or(limit.detector),
                stated_distance_m: limit.distance_m,
            });
        }
        self.bands
            .sort_by(|a, b| a.band.from_hz.total_cmp(&b.band.from_hz));
    }
}

#[cfg(test)]
mod tests {
    use super::super::{built_in, default_limits};
    use super::*;

    fn all() -> Vec<Limit> {
        built_in().iter().map(|file| file.limit()).collect()
    }

    #[track_caller]
    fn is(limit: &LimitAt, frequency_hz: f64, level: f64) {
        let stated = limit.at(frequency_hz).unwrap();
        assert!((stated - level).abs() < 0.005, "{}: {stated}", limit.title);
    }

    /// 47 CFR 15.31(f)(1)
    #[test]
    fn a_limit_falls_20_db_per_decade() {
        assert!((distance_offset_db(3.0, 10.0) + 10.46).abs() < 0.005);
        assert_eq!(distance_offset_db(1.0, 10.0), -20.0);
        assert_eq!(distance_offset_db(3.0, 3.0), 0.0);
    }

    #[test]
    fn each_title_gives_one_limit_and_the_stated_distance_comes_first() {
        let limits = limits_at(&default_limits(), 10.0);
        let titles: Vec<&str> = limits.iter().map(|limit| limit.title.as_str()).collect();
        assert_eq!(titles, ["47 CFR 15.109 class B", "CISPR 32 class B"]);
        is(&limits[0], 50e6, 40.0 - 10.46);
        is(&limits[1], 50e6, 30.0);
        assert_eq!(limits[1].bands[0].stated_distance_m, 10.0);
        is(&limits_at(&default_limits(), 3.0)[1], 50e6, 40.0);
    }

    #[test]
    fn a_band_stated_at_another_distance_only_is_added() {
        let cispr = &limits_at(&default_limits(), 10.0)[1];
        is(cispr, 2e9, 50.0 - 10.46);
        is(cispr, 0.5e9, 37.0);
        assert_eq!(cispr.bands[2].detector, Detector::Average);
        assert_eq!(cispr.at(6.1e9), None);
    }

    #[test]
    fn the_nearest_statement_is_moved() {
        let limits = limits_at(&all(), 5.0);
        let cispr = limits
            .iter()
            .find(|limit| limit.title == "CISPR 32 class B")
            .unwrap();
        assert_eq!(cispr.bands[0].stated_distance_m, 3.0);
        is(cispr, 50e6, 40.0 - 4.44);
    }

    #[test]
    fn the_note_says_what_was_moved() {
        let limits = limits_at(&default_limits(), 10.0);
        assert_eq!(
            limits[0].note().unwrap(),
            "47 CFR 15.109 class B is stated at 3 m and moved to 10 m at 20 dB per decade of distance (-10.46 dB)."
        );
        assert_eq!(
            limits[1].note().unwrap(),
            "CISPR 32 class B from 1000 MHz is stated at 3 m and moved to 10 m at 20 dB per decade of distance (-10.46 dB)."
        );
        assert!(
            limits_at(&default_limits(), 3.0)
                .iter()
                .all(|limit| limit.note().is_none())
        );
    }
}
