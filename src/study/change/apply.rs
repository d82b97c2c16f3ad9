//! Changes put into a net.

use std::sync::Arc;

use super::place::{
    at_far_ends, branching, delay_s, find_receiver, has_line, is_termination, receiver_names,
};
use super::{Change, SeriesPlace, Try};
use crate::board::{Board, Driver, Layer, Net, PathItem, Series, Shunt, Structure, Trace};
use crate::text::{alternatives, near_miss};

/// Of the way to the far end, a series resistor this far out still counts as one at the driver.
const NEAR_DRIVER: f64 = 0.25;

/// Why a net cannot take a change.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("`{change}` does not fit net `{net}`: {reason}")]
pub struct ApplyError {
    /// The net.
    pub net: String,
    /// The change.
    pub change: String,
    /// Why not.
    pub reason: String,
}

pub(super) fn apply(tried: &Try, net: &Net, board: &Board) -> Result<Net, ApplyError> {
    let mut changed = net.clone();
    let slot = series_slot(&net.path);
    let slot = if !tried.keeps && tried.changes.iter().any(Change::terminates) {
        let kept = |items: &[PathItem]| items.iter().filter(|i| !is_termination(i)).count();
        changed.path = without_terminations(&net.path);
        kept(&net.path[..slot])
    } else {
        slot
    };
    for change in &tried.changes {
        one(change, &mut changed, slot, board).map_err(|reason| ApplyError {
            net: net.name.clone(),
            change: change.to_string(),
            reason,
        })?;
    }
    Ok(changed)
}

fn one(change: &Change, net: &mut Net, slot: usize, board: &Board) -> Result<(), String> {
    match change {
        Change::AsIs | Change::Bare => {}
        Change::Series {
            resistance_ohm,
            inductance_h,
            at,
        } => {
            let part = PathItem::Series(Series {
                resistance_ohm: *resistance_ohm,
                inductance_h: *inductance_h,
            });
            add_series(&mut net.path, &part, at, slot)?;
        }
        Change::End {
            resistance_ohm,
            capacitance_f,
            to_v,
            at,
        } => {
            let parts = [shunt(*resistance_ohm, *capacitance_f, *to_v)];
            add_at_ends(&mut net.path, &parts, at.as_deref())?;
        }
        Change::Split {
            up_ohm,
            down_ohm,
            to_v,
            at,
        } => {
            let to_v = to_v.unwrap_or(net.driver.high_v);
            let parts = [shunt(*up_ohm, None, to_v), shunt(*down_ohm, None, 0.0)];
            add_at_ends(&mut net.path, &parts, at.as_deref())?;
        }
        Change::Rise(time_s) => {
            let driver = Arc::make_mut(&mut net.driver);
            (driver.rise_s, driver.fall_s) = (*time_s, *time_s);
            edges_fit(net)?;
        }
        Change::Resistance(ohm) => {
            let driver = Arc::make_mut(&mut net.driver);
            (driver.low_resistance_ohm, driver.high_resistance_ohm) = (*ohm, *ohm);
        }
        Change::Setting(name) => {
            net.driver = Arc::new(set(&net.driver, name)?);
            edges_fit(net)?;
        }
        Change::Length(length_m) => scale_length(&mut net.path, *length_m)?,
        Change::Height(height_m) => {
            if !set_height(&mut net.path, *height_m) {
                return Err("none of its lines runs over a single plane".into());
            }
        }
        Change::Layer(name) => {
            let layer = find_layer(board, name)?;
            if !set_layer(&mut net.path, &layer) {
                return Err("it has no trace".into());
            }
        }
    }
    Ok(())
}

fn shunt(resistance_ohm: f64, capacitance_f: Option<f64>, to_v: f64) -> PathItem {
    PathItem::Shunt(Shunt {
        resistance_ohm,
        capacitance_f,
        inductance_h: 0.0,
        to_v,
    })
}

/// A path without its terminations; branches that held nothing else go with them.
fn without_terminations(path: &[PathItem]) -> Vec<PathItem> {
    path.iter()
        .filter(|item| !is_termination(item))
        .filter_map(|item| match item {
            PathItem::Branch(items) => {
                let left = without_terminations(items);
                (!left.is_empty()).then_some(PathItem::Branch(left))
            }
            item => Some(item.clone()),
        })
        .collect()
}

/// Where a series resistor goes: where the first one is, if that is near the driver; else at the driver.
fn series_slot(path: &[PathItem]) -> usize {
    let whole_s: f64 = path.iter().map(delay_s).sum();
    let mut before_s = 0.0;
    for (place, item) in path.iter().enumerate() {
        match item {
            PathItem::Series(part) if part.resistance_ohm > 0.0 => return place,
            PathItem::Receiver(_) | PathItem::Branch(_) => return 0,
            item => before_s += delay_s(item),
        }
        if before_s > NEAR_DRIVER * whole_s {
            return 0;
        }
    }
    0
}

fn add_series(
    path: &mut Vec<PathItem>,
    part: &PathItem,
    at: &SeriesPlace,
    slot: usize,
) -> Result<(), String> {
    const NO_LEGS: &str = "its path does not branch into legs";
    match at {
        SeriesPlace::Driver => path.insert(slot, part.clone()),
        SeriesPlace::Branch => {
            let (first, _) = branching(path).ok_or(NO_LEGS)?;
            path.insert(first, part.clone());
        }
        SeriesPlace::Legs => {
            let (first, after) = branching(path).ok_or(NO_LEGS)?;
            for item in &mut path[first..after] {
                if let PathItem::Branch(items) = item
                    && has_line(items)
                {
                    items.insert(0, part.clone());
                }
            }
            if has_line(&path[after..]) {
                path.insert(after, part.clone());
            }
        }
        SeriesPlace::LegOf(name) => {
            let known = receiver_names(path);
            let (first, after) = branching(path).ok_or(NO_LEGS)?;
            let is_on_it = |item: &PathItem| match item {
                PathItem::Branch(items) => receiver_names(items).contains(name),
                _ => false,
            };
            let leg = path[first..after].iter().position(is_on_it);
            if let Some(leg) = leg {
                if let PathItem::Branch(items) = &mut path[first + leg] {
                    items.insert(0, part.clone());
                }
            } else if receiver_names(&path[after..]).contains(name) {
                path.insert(after, part.clone());
            } else {
                return Err(no_receiver(name, &known, "driver, branch, legs or "));
            }
        }
    }
    Ok(())
}

fn add_at_ends(
    path: &mut Vec<PathItem>,
    parts: &[PathItem],
    at: Option<&str>,
) -> Result<(), String> {
    let Some(name) = at else {
        at_far_ends(path, &mut |items| items.extend_from_slice(parts));
        return Ok(());
    };
    let known = receiver_names(path);
    let (items, place) = find_receiver(path, name).ok_or_else(|| no_receiver(name, &known, ""))?;
    items.splice(place + 1..place + 1, parts.iter().cloned());
    Ok(())
}

fn no_receiver(name: &str, known: &[String], also: &str) -> String {
    let known: Vec<&str> = known.iter().map(String::as_str).collect();
    let meant = match near_miss(name, known.iter().copied()) {
        Some(near) => format!("; did you mean `{near}`?"),
        None => String::new(),
    };
    format!(
        "it has no receiver `{name}`, expected {also}{}{meant}",
        alternatives(&known, "or")
    )
}

fn set(driver: &Driver, name: &str) -> Result<Driver, String> {
    driver.with_setting(name).ok_or_else(|| {
        let known: Vec<&str> = driver.settings.iter().map(|s| s.name.as_str()).collect();
        let has = match known.as_slice() {
            [] => "none".into(),
            known => alternatives(known, "and"),
        };
        format!(
            "driver `{}` has no setting `{name}`; it has {has}",
            driver.name
        )
    })
}

/// Refuses edges that do not fit into the high or the low time.
fn edges_fit(net: &Net) -> Result<(), String> {
    let needed_s = (net.driver.full_rise_s() + net.driver.full_fall_s()) / 2.0;
    let time_s = net.duty.min(1.0 - net.duty) / net.clock_hz;
    if needed_s <= time_s {
        return Ok(());
    }
    Err(format!(
        "its edges would need {:.3} ns, and its shorter half of a period has {:.3} ns",
        needed_s * 1e9,
        time_s * 1e9
    ))
}

/// The length of the longest way out from the driver.
pub(super) fn longest_way_m(path: &[PathItem]) -> f64 {
    let (mut here_m, mut longest_m) = (0.0, 0.0f64);
    for item in path {
        match item {
            PathItem::Trace(trace) => here_m += trace.length_m,
            PathItem::Line(line) => here_m += line.length_m,
            PathItem::Branch(items) => longest_m = longest_m.max(here_m + longest_way_m(items)),
            _ => {}
        }
    }
    longest_m.max(here_m)
}

fn scale_length(path: &mut [PathItem], length_m: f64) -> Result<(), String> {
    let now_m = longest_way_m(path);
    if now_m <= 0.0 {
        return Err("none of its lines has a length".into());
    }
    let scale = length_m / now_m;
    let origin = first_point(path);
    if scale > 1.0 && origin.is_some() {
        return Err("its route has points, which could come to lie outside of the plane".into());
    }
    scale_lines(path, scale, origin.unwrap_or_default());
    Ok(())
}

fn first_point(path: &[PathItem]) -> Option<[f64; 2]> {
    path.iter().find_map(|item| match item {
        PathItem::Trace(trace) => trace.points_m.first().copied(),
        PathItem::Line(line) => line.points_m.first().copied(),
        PathItem::Branch(items) => first_point(items),
        _ => None,
    })
}

fn scale_lines(path: &mut [PathItem], scale: f64, origin: [f64; 2]) {
    let moved = |points: &mut [[f64; 2]]| {
        for point in points {
            for (at_m, origin_m) in point.iter_mut().zip(origin) {
                *at_m = origin_m + scale * (*at_m - origin_m);
            }
        }
    };
    for item in path {
        match item {
            PathItem::Trace(trace) => {
                trace.length_m *= scale;
                moved(&mut trace.points_m);
            }
            PathItem::Line(line) => {
                line.length_m *= scale;
                line.delay_s *= scale;
                moved(&mut line.points_m);
            }
            PathItem::Branch(items) => scale_lines(items, scale, origin),
            _ => {}
        }
    }
}

/// The greatest height of the lines over a single plane.
pub(super) fn greatest_height_m(path: &[PathItem]) -> Option<f64> {
    path.iter()
        .filter_map(|item| match item {
            PathItem::Trace(trace) => match trace.layer.structure {
                Structure::Microstrip { height_m } => Some(height_m),
                Structure::Stripline { .. } => None,
            },
            PathItem::Line(line) => (line.height_m > 0.0).then_some(line.height_m),
            PathItem::Branch(items) => greatest_height_m(items),
            _ => None,
        })
        .reduce(f64::max)
}

fn set_height(path: &mut [PathItem], new_m: f64) -> bool {
    let mut any = false;
    for item in path {
        any |= match item {
            PathItem::Trace(trace) => match &mut Arc::make_mut(&mut trace.layer).structure {
                Structure::Microstrip { height_m } => {
                    *height_m = new_m;
                    true
                }
                Structure::Stripline { .. } => false,
            },
            PathItem::Line(line) if line.height_m > 0.0 => {
                line.height_m = new_m;
                true
            }
            PathItem::Branch(items) => set_height(items, new_m),
            _ => false,
        };
    }
    any
}

fn find_layer(board: &Board, name: &str) -> Result<Arc<Layer>, String> {
    let layers = layers(&board.nets);
    let found = layers.iter().find(|layer| layer.name == name);
    found.cloned().ok_or_else(|| {
        let known: Vec<&str> = layers.iter().map(|layer| layer.name.as_str()).collect();
        format!(
            "no net of the board runs on a layer `{name}`, expected {}",
            alternatives(&known, "or")
        )
    })
}

/// The layers that some nets run on.
pub(super) fn layers(nets: &[Net]) -> Vec<Arc<Layer>> {
    fn collect(path: &[PathItem], layers: &mut Vec<Arc<Layer>>) {
        for item in path {
            match item {
                PathItem::Trace(Trace { layer, .. })
                    if !layers.iter().any(|known| known.name == layer.name) =>
                {
                    layers.push(Arc::clone(layer));
                }
                PathItem::Branch(items) => collect(items, layers),
                _ => {}
            }
        }
    }
    let mut layers = Vec::new();
    for net in nets {
        collect(&net.path, &mut layers);
    }
    layers
}

fn set_layer(path: &mut [PathItem], layer: &Arc<Layer>) -> bool {
    let mut any = false;
    for item in path {
        any |= match item {
            PathItem::Trace(trace) => {
                trace.layer = Arc::clone(layer);
                true
            }
            PathItem::Branch(items) => set_layer(items, layer),
            _ => false,
        };
    }
    any
}
