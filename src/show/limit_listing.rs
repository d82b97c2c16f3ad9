//! What limit lines say, as text.

use std::fmt::Write as _;

use super::{table::plain_table, words};
use crate::limit::{Band, Detector, Limit, LimitAt};

/// A limit as its standard states it.
pub fn limit_listing(limit: &Limit) -> String {
    let mut text = format!(
        "{}\n  at {}, {} detector\n",
        limit.title,
        words::distance(limit.distance_m),
        words::detector(limit.detector)
    );
    if let Some(source) = &limit.source {
        let _ = writeln!(text, "  source: {source}");
    }
    let detector = |band: &Band| band.detector.unwrap_or(limit.detector);
    push_bands(
        &mut text,
        limit.bands.iter().map(|band| (band, detector(band))),
    );
    text
}

/// A limit as it stands at some distance.
pub fn limit_at_listing(limit: &LimitAt) -> String {
    let mut text = format!(
        "{}\n  at {}\n",
        limit.title,
        words::distance(limit.distance_m)
    );
    if let Some(note) = limit.note() {
        let _ = writeln!(text, "  {note} Its standard may ask for another rule.");
    }
    push_bands(
        &mut text,
        limit.bands.iter().map(|band| (&band.band, band.detector)),
    );
    text
}

fn push_bands<'a>(text: &mut String, bands: impl Iterator<Item = (&'a Band, Detector)>) {
    let mut table = plain_table(
        &["", "from", "to", "dBµV/m", "µV/m", "detector"],
        &[1, 2, 3, 4],
    );
    for (band, detector) in bands {
        table.add_row(vec![
            String::new(),
            words::frequency(band.from_hz),
            words::frequency(band.to_hz),
            both_ends(band, |level| format!("{level:.1}")),
            both_ends(band, |level| words::trimmed(10f64.powf(level / 20.0), 1)),
            words::detector(detector).to_string(),
        ]);
    }
    for line in table.lines() {
        text.push_str(line.trim_end());
        text.push('\n');
    }
}

/// One value where a band is level, two where it slopes.
fn both_ends(band: &Band, show: impl Fn(f64) -> String) -> String {
    if band.from_dbuv_per_m == band.to_dbuv_per_m {
        show(band.from_dbuv_per_m)
    } else {
        format!(
            "{} to {}",
            show(band.from_dbuv_per_m),
            show(band.to_dbuv_per_m)
        )
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::show::samples;

    #[test]
    fn a_listing_has_both_units() {
        let text = limit_listing(&samples::limit());
        // 47 CFR 15.109(a): 100 uV/m at 3 m from 30 to 88 MHz.
        let band = text
            .lines()
            .find(|line| line.contains("88 MHz"))
            .expect("a band");
        assert!(
            band.contains("30 MHz") && band.contains("40.0") && band.contains("100"),
            "{band}"
        );
    }

    #[test]
    fn a_moved_limit_says_from_where_and_by_how_much() {
        let [near, far] = samples::limits_at_both_distances();
        assert!(!limit_at_listing(&near).contains("moved"));
        assert!(
            limit_at_listing(&far)
                .contains("moved to 10 m at 20 dB per decade of distance (-10.46 dB)")
        );
    }

    #[test]
    fn a_sloping_band_has_two_values() {
        let mut limit = samples::limit();
        limit.bands[0].to_dbuv_per_m = 43.0;
        assert!(limit_listing(&limit).contains("40.0 to 43.0"));
    }
}
