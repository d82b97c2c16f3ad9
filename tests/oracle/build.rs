//! Boards in few words.

use ringfield::board::{
    Along, Clamp, DirectLine, Driver, EdgeShape, Group, HighClamp, Layer, Net, PathItem, Receiver,
    ReceiverPart, Series, Shunt, Thresholds, Trace, Via,
};
use std::sync::Arc;

/// A driver from 0 V with straight edges of one whole duration (0-100 %).
pub fn driver(swing_v: f64, resistance_ohm: f64, edge_s: f64) -> Driver {
    Driver {
        name: "driver".into(),
        low_v: 0.0,
        high_v: swing_v,
        low_resistance_ohm: resistance_ohm,
        high_resistance_ohm: resistance_ohm,
        rise_s: edge_s,
        fall_s: edge_s,
        thresholds: Thresholds::Full,
        edge: EdgeShape::Ramp,
        max_current_a: None,
        settings: Vec::new(),
        setting: None,
    }
}

/// A net of 50 % duty.
pub fn net(name: &str, driver: Driver, clock_hz: f64, path: Vec<PathItem>) -> Net {
    Net {
        name: name.into(),
        driver: Arc::new(driver),
        clock_hz,
        duty: 0.5,
        path,
        edge_distance_m: None,
        along: Along::Length,
        group: Group::default(),
    }
}

/// A line without length.
pub fn line(impedance_ohm: f64, delay_s: f64) -> PathItem {
    PathItem::Line(DirectLine {
        impedance_ohm,
        delay_s,
        length_m: 0.0,
        height_m: 0.0,
        permittivity: 4.3,
        points_m: Vec::new(),
    })
}

/// A trace on a layer, without points.
pub fn trace_on(layer: &Arc<Layer>, width_m: f64, length_m: f64) -> PathItem {
    PathItem::Trace(Trace {
        layer: layer.clone(),
        width_m,
        length_m,
        points_m: Vec::new(),
    })
}

/// An input that is a capacitance.
pub fn receiver(name: &str, capacitance_f: f64) -> PathItem {
    receiver_of(name, part(capacitance_f))
}

pub fn receiver_of(name: &str, part: ReceiverPart) -> PathItem {
    PathItem::Receiver(Receiver {
        name: name.into(),
        part: Arc::new(part),
    })
}

pub fn part(capacitance_f: f64) -> ReceiverPart {
    ReceiverPart {
        name: "input".into(),
        capacitance_f,
        resistance_ohm: None,
        low_clamp: None,
        high_clamp: None,
        low_threshold_v: None,
        high_threshold_v: None,
        clamp_rating_a: None,
        package_inductance_h: 0.0,
        package_capacitance_f: 0.0,
        max_rise_s: None,
    }
}

/// The part with equal clamps to 0 V and to a supply.
pub fn clamped(part: ReceiverPart, clamp: Clamp, supply_v: f64) -> ReceiverPart {
    ReceiverPart {
        low_clamp: Some(clamp),
        high_clamp: Some(HighClamp { clamp, supply_v }),
        ..part
    }
}

pub fn series(resistance_ohm: f64) -> PathItem {
    PathItem::Series(Series {
        resistance_ohm,
        inductance_h: 0.0,
    })
}

pub fn coil(resistance_ohm: f64, inductance_h: f64) -> PathItem {
    PathItem::Series(Series {
        resistance_ohm,
        inductance_h,
    })
}

pub fn via(inductance_h: f64, capacitance_f: f64) -> PathItem {
    PathItem::Via(Via {
        inductance_h,
        capacitance_f,
    })
}

/// A resistor to a rail.
pub fn shunt(resistance_ohm: f64, to_v: f64) -> PathItem {
    PathItem::Shunt(Shunt {
        resistance_ohm,
        capacitance_f: None,
        inductance_h: 0.0,
        to_v,
    })
}

/// Resistance, inductance and capacitance in series to 0 V.
pub fn shunt_rlc(resistance_ohm: f64, inductance_h: f64, capacitance_f: f64) -> PathItem {
    PathItem::Shunt(Shunt {
        resistance_ohm,
        capacitance_f: Some(capacitance_f),
        inductance_h,
        to_v: 0.0,
    })
}

pub fn branch(items: Vec<PathItem>) -> PathItem {
    PathItem::Branch(items)
}
