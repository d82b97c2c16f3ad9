//! What nets are made of: layers, drivers and receivers.

use super::super::{
    Clamp, Driver, DriverSetting, EdgeShape, HighClamp, Layer, ReceiverPart, Structure, Thresholds,
};
use super::corners::between_corners;
use super::definitions::Part;
use crate::text::{Dimension, Fields, Key, Node, Range, Report, Value};

const DEFAULT_COPPER_M: f64 = 35e-6;
const DEFAULT_LOSS_TANGENT: f64 = 0.02;

impl Part for Layer {
    const KIND: &'static str = "layer";

    fn read(report: &Report, name: &str, node: &Node) -> Option<Self> {
        layer(report, name, node)
    }
}

impl Part for Driver {
    const KIND: &'static str = "driver";

    fn read(report: &Report, name: &str, node: &Node) -> Option<Self> {
        driver(report, name, node)
    }
}

impl Part for ReceiverPart {
    const KIND: &'static str = "receiver";

    fn read(report: &Report, name: &str, node: &Node) -> Option<Self> {
        receiver(report, name, node)
    }
}

/// A layer of the stackup.
fn layer(report: &Report, name: &str, node: &Node) -> Option<Layer> {
    use Dimension::{Length, Number};
    const MATERIAL: [&str; 4] = ["permittivity", "loss_tangent", "copper", "roughness"];
    let called = format!("layer `{name}`");
    let outer = report.fields(node, &*called, &["microstrip", "stripline"])?;
    let (kind, inner) = match (outer.get("microstrip"), outer.get("stripline")) {
        (Some(node), None) => (["height"].as_slice(), node),
        (None, Some(node)) => (["below", "above"].as_slice(), node),
        (None, None) if !outer.lacks(&["microstrip", "stripline"]) => return None,
        _ => {
            outer.error(
                format!("{called} is not one of two kinds"),
                "`microstrip` or `stripline`",
            );
            return None;
        }
    };
    let fields = report.fields(inner, called, &[kind, &MATERIAL].concat())?;
    let lengths: Vec<Option<f64>> = kind
        .iter()
        .map(|field| fields.require_quantity(field, Length, Range::Positive))
        .collect();
    let permittivity = fields.require_quantity("permittivity", Number, Range::AtLeastOne);
    let loss_tangent = fields.quantity("loss_tangent", Number, Range::NotNegative);
    let copper_m = fields.quantity("copper", Length, Range::Positive);
    let roughness_m = fields.quantity("roughness", Length, Range::NotNegative);
    let structure = match lengths.as_slice() {
        [height_m] => Structure::Microstrip {
            height_m: (*height_m)?,
        },
        [below_m, above_m] => Structure::Stripline {
            below_m: (*below_m)?,
            above_m: (*above_m)?,
        },
        _ => return None,
    };
    Some(Layer {
        name: name.to_owned(),
        structure,
        permittivity: permittivity?,
        loss_tangent: loss_tangent.unwrap_or(DEFAULT_LOSS_TANGENT),
        copper_m: copper_m.unwrap_or(DEFAULT_COPPER_M),
        roughness_m: roughness_m.unwrap_or(0.0),
    })
}

/// A driver.
fn driver(report: &Report, name: &str, node: &Node) -> Option<Driver> {
    const FIELDS: [&str; 11] = [
        "swing",
        "low",
        "high",
        "resistance",
        "rise",
        "fall",
        "thresholds",
        "edge",
        "corners",
        "max_current",
        "settings",
    ];
    const THRESHOLDS: [(&str, Thresholds); 3] = [
        ("10-90", Thresholds::TenNinety),
        ("20-80", Thresholds::TwentyEighty),
        ("0-100", Thresholds::Full),
    ];
    const EDGES: [(&str, EdgeShape); 2] =
        [("ramp", EdgeShape::Ramp), ("smooth", EdgeShape::Smooth)];
    let fields = report.fields(node, format!("driver `{name}`"), &FIELDS)?;
    let levels = levels(&fields);
    let resistances = driver_resistances(&fields);
    let rise_s = fields.require_quantity("rise", Dimension::Time, Range::Positive);
    let fall_s = fields
        .quantity("fall", Dimension::Time, Range::Positive)
        .or(rise_s);
    let thresholds = fields.choice("thresholds", &THRESHOLDS).unwrap_or_default();
    let edge = fields.choice("edge", &EDGES).unwrap_or_default();
    let max_current_a = fields.quantity("max_current", Dimension::Current, Range::Positive);
    let usual = DriverSetting {
        name: String::new(),
        low_resistance_ohm: resistances?.0,
        high_resistance_ohm: resistances?.1,
        rise_s: rise_s?,
        fall_s: fall_s?,
    };
    let settings = settings(&fields, &usual)?;
    let (low_v, high_v) = levels?;
    let stated = Driver {
        name: name.to_owned(),
        low_v,
        high_v,
        low_resistance_ohm: usual.low_resistance_ohm,
        high_resistance_ohm: usual.high_resistance_ohm,
        rise_s: usual.rise_s,
        fall_s: usual.fall_s,
        thresholds,
        edge,
        max_current_a,
        settings,
        setting: None,
    };
    between_corners(&fields, stated)
}

/// The settings of a driver; what one leaves out is as usual, and a fall is as its own rise.
fn settings(driver: &Fields, usual: &DriverSetting) -> Option<Vec<DriverSetting>> {
    let Some(node) = driver.get("settings") else {
        return Some(Vec::new());
    };
    let expected = "a map from names to what differs, such as `slow: {rise: 3 ns}`";
    let entries = driver
        .report
        .map(node, &driver.called("settings"), expected)?;
    let setting = |(key, node): &(Key, Node)| {
        let owner = format!("setting `{}` of {}", key.text, driver.owner);
        let known = ["resistance", "rise", "fall"];
        let fields = driver.report.fields(node, owner, &known)?;
        let time = |field| fields.quantity(field, Dimension::Time, Range::Positive);
        let (rise_s, fall_s) = (time("rise"), time("fall"));
        let (low_resistance_ohm, high_resistance_ohm) = if fields.has("resistance") {
            driver_resistances(&fields)?
        } else {
            (usual.low_resistance_ohm, usual.high_resistance_ohm)
        };
        Some(DriverSetting {
            name: key.text.clone(),
            low_resistance_ohm,
            high_resistance_ohm,
            rise_s: rise_s.unwrap_or(usual.rise_s),
            fall_s: fall_s.or(rise_s).unwrap_or(usual.fall_s),
        })
    };
    entries.iter().map(setting).collect()
}

/// The low and the high level of a driver.
pub(super) fn levels(fields: &Fields) -> Option<(f64, f64)> {
    use Dimension::Voltage;
    const EXPECTED: &str = "`swing: 3.3 V`, or `low` and `high`";
    let has_levels = !fields.lacks(&["low", "high"]);
    if has_levels && fields.has("swing") {
        fields.error(
            format!("{} has both `swing` and levels", fields.owner),
            EXPECTED,
        );
        return None;
    }
    if has_levels {
        let low_v = fields.require_quantity("low", Voltage, Range::Any);
        let high_v = fields.require_quantity("high", Voltage, Range::Any);
        return rising(fields, low_v?, high_v?);
    }
    fields.require("swing", EXPECTED)?;
    Some((0.0, fields.quantity("swing", Voltage, Range::Positive)?))
}

/// The pair itself, if it rises.
fn rising(fields: &Fields, low_v: f64, high_v: f64) -> Option<(f64, f64)> {
    if low_v < high_v {
        return Some((low_v, high_v));
    }
    let message = format!(
        "the high level of {} is not above its low level",
        fields.owner
    );
    fields.error(message, "`low` below `high`");
    None
}

/// The resistance of a driver in its low and its high state.
pub(super) fn driver_resistances(fields: &Fields) -> Option<(f64, f64)> {
    use Dimension::Resistance;
    let expected = "a resistance such as `3 ohm`, or `{high: 20 ohm, low: 14 ohm}`";
    let node = fields.require("resistance", expected)?;
    if let Value::Map(_) = node.value {
        let states = fields
            .report
            .fields(node, fields.called("resistance"), &["high", "low"])?;
        let high_ohm = states.require_quantity("high", Resistance, Range::Positive);
        let low_ohm = states.require_quantity("low", Resistance, Range::Positive);
        return Some((low_ohm?, high_ohm?));
    }
    let both_ohm = fields.quantity("resistance", Resistance, Range::Positive)?;
    Some((both_ohm, both_ohm))
}

/// A receiver.
fn receiver(report: &Report, name: &str, node: &Node) -> Option<ReceiverPart> {
    use Dimension::{Capacitance, Current, Inductance, Resistance, Time, Voltage};
    const FIELDS: [&str; 8] = [
        "capacitance",
        "resistance",
        "clamps",
        "low_threshold",
        "high_threshold",
        "clamp_rating",
        "max_rise",
        "package",
    ];
    let fields = report.fields(node, format!("receiver `{name}`"), &FIELDS)?;
    let capacitance_f = fields.require_quantity("capacitance", Capacitance, Range::NotNegative);
    let resistance_ohm = fields.quantity("resistance", Resistance, Range::Positive);
    let (low_clamp, high_clamp) = clamps(&fields);
    let low_threshold_v = fields.quantity("low_threshold", Voltage, Range::Any);
    let high_threshold_v = fields.quantity("high_threshold", Voltage, Range::Any);
    if let (Some(low_v), Some(high_v)) = (low_threshold_v, high_threshold_v)
        && low_v > high_v
    {
        let message = format!("the thresholds of {} are the wrong way round", fields.owner);
        fields.error(message, "`low_threshold` below `high_threshold`");
    }
    let clamp_rating_a = fields.quantity("clamp_rating", Current, Range::Positive);
    let max_rise_s = fields.quantity("max_rise", Time, Range::Positive);
    let package = fields.get("package").and_then(|node| {
        report.fields(
            node,
            fields.called("package"),
            &["inductance", "capacitance"],
        )
    });
    let package = |field, dimension| {
        package
            .as_ref()
            .and_then(|package| package.quantity(field, dimension, Range::NotNegative))
    };
    Some(ReceiverPart {
        name: name.to_owned(),
        capacitance_f: capacitance_f?,
        resistance_ohm,
        low_clamp,
        high_clamp,
        low_threshold_v,
        high_threshold_v,
        clamp_rating_a,
        max_rise_s,
        package_inductance_h: package("inductance", Inductance).unwrap_or(0.0),
        package_capacitance_f: package("capacitance", Capacitance).unwrap_or(0.0),
    })
}

/// The clamps of a receiver to 0 V and to its supply: two alike, or each by itself.
fn clamps(receiver: &Fields) -> (Option<Clamp>, Option<HighClamp>) {
    const EXPECTED: &str = "`knee`, `resistance` and `supply`, or `low` and `high` clamps";
    let Some(node) = receiver.get("clamps") else {
        return (None, None);
    };
    let called = receiver.called("`clamps`");
    let known = ["knee", "resistance", "supply", "low", "high"];
    let Some(fields) = receiver.report.fields(node, called, &known) else {
        return (None, None);
    };
    let is_alike = !fields.lacks(&["knee", "resistance"]);
    if fields.lacks(&["low", "high"]) {
        if !is_alike {
            fields.error(format!("{} describes no clamp", fields.owner), EXPECTED);
            return (None, None);
        }
        let clamp = clamp(&fields);
        let supply_v = require_supply(&fields);
        let high = clamp
            .zip(supply_v)
            .map(|(clamp, supply_v)| HighClamp { clamp, supply_v });
        return (clamp, high);
    }
    if is_alike {
        fields.error(format!("{} mixes two forms", fields.owner), EXPECTED);
        return (None, None);
    }
    let side = |side: &str, known: &[&str]| {
        fields.report.fields(
            fields.get(side)?,
            format!("{side} clamp of {}", receiver.owner),
            known,
        )
    };
    let low = side("low", &["knee", "resistance"]).and_then(|low| clamp(&low));
    let high = side("high", &["knee", "resistance", "supply"]).and_then(|high| {
        if high.has("supply") && fields.has("supply") {
            high.error(
                format!("supply of the {} is given twice", high.owner),
                "one `supply`",
            );
        }
        let supply_v = if high.has("supply") || !fields.has("supply") {
            require_supply(&high)
        } else {
            require_supply(&fields)
        };
        Some(HighClamp {
            clamp: clamp(&high)?,
            supply_v: supply_v?,
        })
    });
    (low, high)
}

fn require_supply(fields: &Fields) -> Option<f64> {
    fields.require_quantity("supply", Dimension::Voltage, Range::Any)
}

fn clamp(fields: &Fields) -> Option<Clamp> {
    let knee_v = fields.require_quantity("knee", Dimension::Voltage, Range::Positive);
    let resistance_ohm =
        fields.require_quantity("resistance", Dimension::Resistance, Range::NotNegative);
    Some(Clamp {
        knee_v: knee_v?,
        resistance_ohm: resistance_ohm?,
    })
}
