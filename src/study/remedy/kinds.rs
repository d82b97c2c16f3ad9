//! The kinds of change that may help a net, cheapest first.

use crate::board::{Net, PathItem};
use crate::study::change::place::{branching, delay_s, far_ends, has_line};
use crate::study::change::{Change, SeriesPlace, Try};
use crate::study::compare::{first_impedance_ohm, star_legs};
use crate::study::values::e6_at_least;

/// What a change costs, cheapest first.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Cost {
    /// A setting of the driver: no part at all.
    Setting,
    /// One part.
    OnePart,
    /// So many parts.
    Parts(usize),
    /// Parts that burn power at rest.
    Power(usize),
}

/// One kind of change, over a resistance where it has one.
pub struct Kind {
    /// What it costs.
    pub cost: Cost,
    /// The resistance to start from; `None` for a change without any.
    pub start_ohm: Option<f64>,
    /// The change at a resistance.
    pub at: Box<dyn Fn(f64) -> Try>,
}

/// Inductances of a ferrite-like part beside its resistance; both are sold as chip parts (E6 values).
const INDUCTANCES_H: [f64; 2] = [33e-9, 100e-9];
/// The capacitor of an RC termination is at least 3 T / Z0, T the flight time (from memory), and R C longer than the
/// edge.
const FLIGHT_TIMES: f64 = 3.0;
/// Resistances below this are not worth a part.
const LEAST_OHM: f64 = 10.0;

/// Every kind of change that is worth trying on a net, cheapest first.
pub fn kinds(net: &Net) -> Vec<Kind> {
    let driver = &net.driver;
    let driver_ohm = (driver.low_resistance_ohm + driver.high_resistance_ohm) / 2.0;
    let line_ohm = first_impedance_ohm(&net.path);
    let legs = legs(&net.path);
    let star = star_legs(&net.path);
    let ends = far_ends(&net.path);
    // A star shows the driver all of its legs at once.
    let seen_ohm = line_ohm / star.max(1) as f64;
    let source_ohm = (seen_ohm - driver_ohm).max(LEAST_OHM);
    let leg_ohm = (line_ohm - star as f64 * driver_ohm).max(LEAST_OHM);
    let parts = |count: usize| {
        if count == 1 {
            Cost::OnePart
        } else {
            Cost::Parts(count)
        }
    };

    let mut kinds = Vec::new();
    for setting in &driver.settings {
        if driver.setting.as_ref() != Some(&setting.name) {
            let name = setting.name.clone();
            kinds.push(Kind {
                cost: Cost::Setting,
                start_ohm: None,
                at: Box::new(move |_| Try::of(vec![Change::Setting(name.clone())])),
            });
        }
    }
    kinds.push(series(parts(1), source_ohm, 0.0, SeriesPlace::Driver));
    if legs > 0 && star == 0 {
        kinds.push(series(parts(1), source_ohm, 0.0, SeriesPlace::Branch));
    }
    if legs > 0 {
        kinds.push(series(parts(legs), leg_ohm, 0.0, SeriesPlace::Legs));
    }
    for inductance_h in INDUCTANCES_H {
        kinds.push(series(
            Cost::Parts(2),
            source_ohm,
            inductance_h,
            SeriesPlace::Driver,
        ));
    }
    let held_s = FLIGHT_TIMES * longest_delay_s(&net.path);
    let edge_s = driver.full_rise_s().max(driver.full_fall_s());
    let capacitance_f = e6_at_least(held_s.max(edge_s) / line_ohm);
    kinds.push(Kind {
        cost: Cost::Parts(2 * ends),
        start_ohm: Some(line_ohm),
        at: Box::new(move |ohm| Try::of(vec![end(ohm, Some(capacitance_f))])),
    });
    // Both ends of a line with several receivers: the source takes what comes back.
    kinds.push(Kind {
        cost: Cost::Parts(2 * ends + 1),
        start_ohm: Some(source_ohm / 2.0),
        at: Box::new(move |ohm| {
            let source = Change::Series {
                resistance_ohm: ohm,
                inductance_h: 0.0,
                at: SeriesPlace::Driver,
            };
            Try::of(vec![source, end(rounded(line_ohm), Some(capacitance_f))])
        }),
    });
    kinds.push(Kind {
        cost: Cost::Power(ends),
        start_ohm: Some(line_ohm),
        at: Box::new(move |ohm| Try::of(vec![end(ohm, None)])),
    });
    kinds.push(Kind {
        cost: Cost::Power(2 * ends),
        start_ohm: Some(2.0 * line_ohm),
        at: Box::new(move |ohm| {
            Try::of(vec![Change::Split {
                up_ohm: ohm,
                down_ohm: ohm,
                to_v: None,
                at: None,
            }])
        }),
    });
    kinds.sort_by_key(|kind| kind.cost);
    kinds
}

fn series(cost: Cost, start_ohm: f64, inductance_h: f64, at: SeriesPlace) -> Kind {
    Kind {
        cost,
        start_ohm: Some(start_ohm),
        at: Box::new(move |resistance_ohm| {
            Try::of(vec![Change::Series {
                resistance_ohm,
                inductance_h,
                at: at.clone(),
            }])
        }),
    }
}

fn end(resistance_ohm: f64, capacitance_f: Option<f64>) -> Change {
    Change::End {
        resistance_ohm,
        capacitance_f,
        to_v: 0.0,
        at: None,
    }
}

fn rounded(ohm: f64) -> f64 {
    crate::study::values::E24Step::nearest(ohm).value()
}

/// How many legs leave the first place where a path branches.
fn legs(path: &[PathItem]) -> usize {
    let Some((first, after)) = branching(path) else {
        return 0;
    };
    let branches = path[first..after].iter().filter(|item| match item {
        PathItem::Branch(items) => has_line(items),
        _ => false,
    });
    branches.count() + usize::from(has_line(&path[after..]))
}

/// Flight time to the farthest end.
fn longest_delay_s(path: &[PathItem]) -> f64 {
    let (mut here_s, mut longest_s) = (0.0, 0.0f64);
    for item in path {
        match item {
            PathItem::Branch(items) => longest_s = longest_s.max(here_s + longest_delay_s(items)),
            item => here_s += delay_s(item),
        }
    }
    longest_s.max(here_s)
}
