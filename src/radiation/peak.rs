//! The peak between samples.

/// Height of the parabola through three even samples if they hold a peak, else the middle one.
pub(super) fn vertex(left: f64, middle: f64, right: f64) -> f64 {
    let bend = left - 2.0 * middle + right;
    if bend < 0.0 && middle >= left && middle >= right {
        middle - (right - left).powi(2) / (8.0 * bend)
    } else {
        middle
    }
}
