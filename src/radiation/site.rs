//! The test site: free space, or an open area with a metal floor and a height scan.

use super::peak::vertex;
use crate::LIGHT_SPEED_M_PER_S;
use std::f64::consts::TAU;

/// Height of the product on its table (CISPR 16-2-3; ANSI C63.4).
pub const TABLE_HEIGHT_M: f64 = 0.8;
/// Above this the floor between product and antenna is covered with absorber (CISPR 16-2-3).
pub const FLOOR_ABSORBED_ABOVE_HZ: f64 = 1e9;
const LOWEST_ANTENNA_M: f64 = 1.0;
const HIGHEST_ANTENNA_M: f64 = 4.0;
/// The interference pattern over height turns slowly: 10 cm is a quarter of its shortest period, and a parabola
/// finds the peak between.
const HEIGHT_STEPS: usize = 30;

/// Where the field is measured.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Site {
    /// An open area over a metal floor, the antenna moved from 1 m to 4 m.
    #[default]
    OpenArea,
    /// Free space.
    FreeSpace,
}

/// How the receiver's antenna lies.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Polarisation {
    /// Level, across the line from the product.
    Horizontal,
    /// Upright.
    Vertical,
}

/// Heights on the open-area site.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Heights {
    /// Lowest point of the product over the floor.
    pub table_m: f64,
    /// Lowest and highest place of the antenna.
    pub antenna_m: [f64; 2],
}

impl Default for Heights {
    fn default() -> Self {
        Self {
            table_m: TABLE_HEIGHT_M,
            antenna_m: [LOWEST_ANTENNA_M, HIGHEST_ANTENNA_M],
        }
    }
}

/// Where and how a scan is done.
#[derive(Debug, Clone, PartialEq)]
pub struct TestSite {
    /// The kind of site.
    pub site: Site,
    /// Its heights.
    pub heights: Heights,
    /// Distances of the antenna, from the middle of the turntable.
    pub distances_m: Vec<f64>,
}

impl Site {
    /// The highest reading over the antenna's heights and polarisations, as a multiple of the free-space
    /// field at the same level distance.
    pub fn factor(self, heights: &Heights, frequency_hz: f64, distance_m: f64) -> f64 {
        if self == Self::FreeSpace || frequency_hz > FLOOR_ABSORBED_ABOVE_HZ {
            return 1.0;
        }
        let [horizontal, vertical] = two_ray_factors(frequency_hz, distance_m, heights);
        horizontal.max(vertical)
    }
}

/// The highest sum of the direct and the reflected ray over the antenna's heights, antenna
/// level and upright, as a multiple of the free-space field at the same level distance; the floor
/// conducts perfectly and the source is a point at the table's height.
pub fn two_ray_factors(frequency_hz: f64, distance_m: f64, heights: &Heights) -> [f64; 2] {
    let [lowest_m, highest_m] = heights.antenna_m;
    let mut sums = [[0.0; 2]; HEIGHT_STEPS + 1];
    for (step, sum) in sums.iter_mut().enumerate() {
        let share = step as f64 / HEIGHT_STEPS as f64;
        let antenna_m = lowest_m + share * (highest_m - lowest_m);
        *sum = two_rays(frequency_hz, distance_m, heights.table_m, antenna_m);
    }
    [0, 1].map(|way| {
        let peaks = sums
            .windows(3)
            .map(|w| vertex(w[0][way], w[1][way], w[2][way]));
        peaks
            .fold(sums[0][way].max(sums[HEIGHT_STEPS][way]), f64::max)
            .sqrt()
    })
}

/// The squared sum of the direct and the reflected ray between two heights, antenna level and upright.
///
/// Smith, German & Pate, "Calculation of site attenuation from antenna factors", IEEE Trans. EMC 24(3),
/// 1982: a level dipole's reflection comes back turned over; an upright one radiates as the sine of its
/// angle to the ray, and receives likewise.
fn two_rays(frequency_hz: f64, distance_m: f64, source_m: f64, antenna_m: f64) -> [f64; 2] {
    let k = TAU * frequency_hz / LIGHT_SPEED_M_PER_S;
    let path_m = |vertical_m: f64| (distance_m * distance_m + vertical_m * vertical_m).sqrt();
    let (direct_m, reflected_m) = (path_m(antenna_m - source_m), path_m(antenna_m + source_m));
    let (direct, reflected) = (distance_m / direct_m, distance_m / reflected_m);
    let (direct_up, reflected_up) = (direct.powi(3), reflected.powi(3));
    let cos = (k * (reflected_m - direct_m)).cos();
    [
        direct * direct + reflected * reflected - 2.0 * direct * reflected * cos,
        direct_up * direct_up + reflected_up * reflected_up + 2.0 * direct_up * reflected_up * cos,
    ]
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Theoretical normalised site attenuation, ANSI C63.4 / CISPR 16-1-4 (from memory; reproduced
    /// from the two-ray formula of Smith, German & Pate, 1982): source at 1 m, 3 m and 10 m,
    /// horizontal and vertical, dB.
    const NORMALISED_SITE_ATTENUATION: [(f64, [f64; 4]); 10] = [
        (30.0, [15.8, 8.2, 29.8, 16.7]),
        (50.0, [7.8, 4.0, 21.1, 12.3]),
        (80.0, [0.9, 0.6, 13.3, 8.3]),
        (100.0, [-2.0, -0.7, 9.7, 6.4]),
        (160.0, [-7.4, -1.7, 3.0, 2.6]),
        (200.0, [-9.6, -3.6, 0.6, 1.0]),
        (300.0, [-12.8, -10.5, -3.3, -1.5]),
        (500.0, [-17.3, -16.4, -7.9, -6.7]),
        (700.0, [-20.6, -18.4, -10.8, -10.2]),
        (1000.0, [-23.5, -22.4, -13.8, -13.6]),
    ];

    #[test]
    fn both_site_tables_within_a_tenth_of_a_decibel() {
        let source_at_1_m = Heights {
            table_m: 1.0,
            ..Heights::default()
        };
        for (frequency_mhz, row) in NORMALISED_SITE_ATTENUATION {
            let computed = [3.0, 10.0].map(|distance_m| {
                two_ray_factors(frequency_mhz * 1e6, distance_m, &source_at_1_m).map(|factor| {
                    // 1 pW from a half-wave dipole: sqrt(49.2 P) / d
                    let field_uv_per_m = (49.2e-12_f64).sqrt() * 1e6 / distance_m * factor;
                    -20.0 * frequency_mhz.log10() + 48.92 - 20.0 * field_uv_per_m.log10()
                })
            });
            for (computed_db, published_db) in computed.as_flattened().iter().zip(row) {
                assert!(
                    (computed_db - published_db).abs() < 0.1,
                    "{frequency_mhz} MHz: {computed_db:.2} {published_db}"
                );
            }
        }
    }

    /// Paul, Scully & Steffka, Introduction to Electromagnetic Compatibility, 3rd ed., section 7.6:
    /// source and antenna level, 1 m high, 3 m apart: 0.78 dB at 100 MHz, 4.4 dB at 180 MHz.
    #[test]
    fn ground_factor_of_paul() {
        for (frequency_hz, published_db) in [(100e6, 0.78), (180e6, 4.4)] {
            let computed_db = 10.0 * two_rays(frequency_hz, 3.0, 1.0, 1.0)[0].log10();
            assert!(
                (computed_db - published_db).abs() < 0.05,
                "{computed_db} {published_db}"
            );
        }
    }

    #[test]
    fn free_space_and_absorbed_floor_leave_the_field_alone() {
        assert_eq!(Site::FreeSpace.factor(&Heights::default(), 100e6, 3.0), 1.0);
        assert_eq!(Site::OpenArea.factor(&Heights::default(), 1.2e9, 3.0), 1.0);
        assert!(Site::OpenArea.factor(&Heights::default(), 100e6, 3.0) > 1.0);
    }
}
