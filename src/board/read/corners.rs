//! The fast and the slow corner of a driver.

use super::super::Driver;
use super::parts::{driver_resistances, levels};
use crate::text::{Dimension, Distribution, Fields, Node, Range, Tolerance};

/// From the slow corner, at -1, over what is stated outside of the corners, at 0, to the fast one.
const SLOW_TO_FAST: Tolerance = Tolerance {
    reach: 1.0,
    distribution: Distribution::Uniform,
};

/// The driver where this reading puts it between its corners; itself where it has none. All that differs between the
/// corners moves together, in a straight line from what is stated to either corner.
pub(super) fn between_corners(fields: &Fields, stated: Driver) -> Option<Driver> {
    let Some(node) = fields.get("corners") else {
        return Some(stated);
    };
    let called = fields.called("corners");
    let corners = fields.report.fields(node, called, &["fast", "slow"])?;
    let corner = |which| {
        let expected = "what differs there, such as `{resistance: 2 ohm, rise: 0.5 ns}`";
        let node = corners.require(which, expected)?;
        let why = "a corner is itself the end of a tolerance";
        let read = || corner(fields, node, which, &stated);
        fields.report.refusing_tolerances(why, read)
    };
    let (fast, slow) = (corner("fast"), corner("slow"));
    let (fast, slow) = (fast?, slow?);
    let place = fields.report.deviation(node, SLOW_TO_FAST);
    let corner = if place < 0.0 { slow } else { fast };
    let at = |of: fn(&Driver) -> f64| of(&stated) + place.abs() * (of(&corner) - of(&stated));
    Some(Driver {
        low_v: at(|driver| driver.low_v),
        high_v: at(|driver| driver.high_v),
        low_resistance_ohm: at(|driver| driver.low_resistance_ohm),
        high_resistance_ohm: at(|driver| driver.high_resistance_ohm),
        rise_s: at(|driver| driver.rise_s),
        fall_s: at(|driver| driver.fall_s),
        ..stated
    })
}

/// A driver at one corner: what the corner gives, and for the rest what is stated.
fn corner(driver: &Fields, node: &Node, which: &str, stated: &Driver) -> Option<Driver> {
    const FIELDS: [&str; 6] = ["swing", "low", "high", "resistance", "rise", "fall"];
    let owner = format!("{which} corner of {}", driver.owner);
    let fields = driver.report.fields(node, owner, &FIELDS)?;
    if fields.lacks(&FIELDS) {
        let message = format!("{} differs in nothing", fields.owner);
        fields.error(
            message,
            "at least one of swing, low and high, resistance, rise, fall",
        );
        return None;
    }
    let levels = if fields.lacks(&["swing", "low", "high"]) {
        Some((stated.low_v, stated.high_v))
    } else {
        levels(&fields)
    };
    let resistances = if fields.lacks(&["resistance"]) {
        Some((stated.low_resistance_ohm, stated.high_resistance_ohm))
    } else {
        driver_resistances(&fields)
    };
    let time = |field| fields.quantity(field, Dimension::Time, Range::Positive);
    let rise_s = time("rise");
    // Where the driver falls as it rises, so do its corners.
    let fall_s = time("fall").or(rise_s.filter(|_| !driver.has("fall")));
    let (low_v, high_v) = levels?;
    let (low_resistance_ohm, high_resistance_ohm) = resistances?;
    Some(Driver {
        low_v,
        high_v,
        low_resistance_ohm,
        high_resistance_ohm,
        rise_s: rise_s.unwrap_or(stated.rise_s),
        fall_s: fall_s.unwrap_or(stated.fall_s),
        ..stated.clone()
    })
}
