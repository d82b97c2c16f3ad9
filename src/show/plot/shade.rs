//! A scale of colours whose lightness rises evenly, so that it reads alike in grey and with any colour vision.

use plotters::style::RGBColor;

/// The colour of a share from 0, dark blue, to 1, light yellow.
///
/// The way is drawn in Ottosson's Oklab ("A perceptual color space for image processing", 2020; coefficients from
/// memory), in which a step of lightness looks the same anywhere.
pub(super) fn shade(share: f64) -> RGBColor {
    let share = share.clamp(0.0, 1.0);
    let lightness = 0.25 + 0.71 * share;
    let a = -0.07 * (std::f64::consts::PI * share).sin() - 0.03 * share;
    let b = -0.08 + 0.16 * share;
    let l = (lightness + 0.396_337_8 * a + 0.215_803_8 * b).powi(3);
    let m = (lightness - 0.105_561_3 * a - 0.063_854_2 * b).powi(3);
    let s = (lightness - 0.089_484_2 * a - 1.291_485_5 * b).powi(3);
    let channel = |linear: f64| {
        let value = match linear {
            small if small <= 0.003_130_8 => 12.92 * small.max(0.0),
            large => 1.055 * large.powf(1.0 / 2.4) - 0.055,
        };
        (255.0 * value.min(1.0)).round() as u8
    };
    RGBColor(
        channel(4.076_741_7 * l - 3.307_711_6 * m + 0.230_969_9 * s),
        channel(-1.268_438_0 * l + 2.609_757_4 * m - 0.341_319_4 * s),
        channel(-0.004_196_1 * l - 0.703_418_6 * m + 1.707_614_7 * s),
    )
}

#[cfg(test)]
mod tests {
    use super::*;

    /// CIE lightness L* of the relative luminance of sRGB (IEC 61966-2-1; from memory).
    fn lightness(RGBColor(red, green, blue): RGBColor) -> f64 {
        let linear = |value: u8| match f64::from(value) / 255.0 {
            small if small <= 0.040_45 => small / 12.92,
            large => ((large + 0.055) / 1.055).powf(2.4),
        };
        let y = 0.2126 * linear(red) + 0.7152 * linear(green) + 0.0722 * linear(blue);
        116.0 * y.cbrt() - 16.0
    }

    #[test]
    fn in_grey_the_scale_rises_in_even_steps() {
        let steps: Vec<f64> = (0..=20)
            .map(|i| lightness(shade(f64::from(i) / 20.0)))
            .collect();
        let mean = (steps[20] - steps[0]) / 20.0;
        assert!(mean > 3.5, "{steps:?}");
        for pair in steps.windows(2) {
            assert!((pair[1] - pair[0] - mean).abs() < 0.1 * mean, "{steps:?}");
        }
    }
}
