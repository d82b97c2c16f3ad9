//! The textbook figure of a small current loop, shown beside the estimate.

/// Far field of a small loop in free space in its strongest direction: 1.316e-14 f^2 A I / d.
///
/// Paul, Scully & Steffka, Introduction to Electromagnetic Compatibility, 3rd ed., eq. 8.12. The
/// figure knows no plane, no floor and no ringing along the line; differential mode alone has sat about
/// 20 dB below measurement on short traces (same book, chapter 8).
pub fn loop_area_v_per_m(frequency_hz: f64, area_m2: f64, current_a: f64, distance_m: f64) -> f64 {
    1.316e-14 * frequency_hz * frequency_hz * area_m2 * current_a / distance_m
}

#[cfg(test)]
mod tests {
    use super::loop_area_v_per_m;

    /// Paul, Scully & Steffka, 3rd ed., example 7.2: 1 cm x 1 cm, 100 mA, 50 MHz, 3 m.
    #[test]
    fn paul_example_7_2() {
        let field = loop_area_v_per_m(50e6, 1e-4, 0.1, 3.0);
        assert!((field - 109.6e-6).abs() < 0.1e-6, "{field}");
    }

    /// Paul, Scully & Steffka, 3rd ed., example 8.1: 1 m x 1.27 mm, 30 MHz, 3 m, 100 uV/m.
    #[test]
    fn paul_example_8_1() {
        let current_a = 100e-6 / loop_area_v_per_m(30e6, 1.27e-3, 1.0, 3.0);
        assert!((current_a - 19.95e-3).abs() < 0.01e-3, "{current_a}");
    }

    /// Ott, Electromagnetic Compatibility Engineering, 2009, chapter 12 (from memory): with the
    /// reflection of the ground 263e-16 f^2 A I / r; 25 mA, 30 MHz, 3 m, 100 uV/m is about 5 cm^2.
    #[test]
    fn ott_chapter_12() {
        let area_m2 = 100e-6 / (2.0 * loop_area_v_per_m(30e6, 1.0, 25e-3, 3.0));
        assert!((area_m2 - 5e-4).abs() < 0.1e-4, "{area_m2}");
    }
}
