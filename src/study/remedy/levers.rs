//! What else could change where no part suffices, and how far it would have to go.

use super::search::Search;
use crate::board::{Board, Net};
use crate::study::Mechanism;
use crate::study::change::{Change, Try};
use crate::study::compare::{Bench, Fault, Variant};

/// Something beside the parts that moves the margin.
#[derive(Debug, Clone, PartialEq)]
pub struct Lever {
    /// The change that reaches the margin alone, or where none does, the farthest that was tried.
    pub tried: LeverChange,
    /// The value now, where there is one.
    pub now: Option<f64>,
    /// How far it gets.
    pub reach: Reach,
    /// What is not safe about it; a layout may want its terminations matched anew.
    pub faults: Vec<Fault>,
}

/// A change of a lever.
#[derive(Debug, Clone, PartialEq)]
pub enum LeverChange {
    /// Another height, length, edge or layer.
    Try(Try),
    /// No cable on the board.
    NoCables,
}

/// How far a lever gets.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Reach {
    /// The margin it comes to; infinite where nothing is left that could be estimated (between two planes).
    pub margin_db: f64,
    /// Whether that is enough; an edge must be safe, too.
    pub suffices: bool,
}

/// How far layouts are tried: down to this share of what they are now.
const LEAST_SHARE: f64 = 0.1;
/// How far edges are tried: up to so many times what they are now.
const MOST_TIMES: f64 = 10.0;
/// Steps of the first and of the second look.
const LOOK: usize = 8;

/// Every lever of a net, those that suffice first.
pub fn levers(net: &Net, search: &Search) -> Vec<Lever> {
    let mut levers = Vec::new();
    if let Some(now_m) = Try::greatest_height_m(net) {
        levers.extend(slide(
            net,
            search,
            now_m,
            LEAST_SHARE,
            false,
            Change::Height,
        ));
    }
    let length_m = Try::longest_way_m(net);
    if length_m > 0.0 {
        levers.extend(slide(
            net,
            search,
            length_m,
            LEAST_SHARE,
            false,
            Change::Length,
        ));
    }
    levers.extend(slide(
        net,
        search,
        net.driver.rise_s,
        MOST_TIMES,
        true,
        Change::Rise,
    ));
    levers.extend(layers(net, search));
    levers.extend(no_cables(net, search));
    levers.sort_by_key(|lever| !lever.reach.suffices);
    levers
}

/// Slides a value by some factor at most, and gives the nearest that reaches the margin, else the farthest.
fn slide(
    net: &Net,
    search: &Search,
    now: f64,
    factor: f64,
    must_be_safe: bool,
    change: impl Fn(f64) -> Change,
) -> Option<Lever> {
    let (mut from, mut to) = (0.0, 1.0);
    let mut found = None;
    for _ in 0..2 {
        let share = |step: usize| from + (to - from) * step as f64 / LOOK as f64;
        let values: Vec<f64> = (1..=LOOK)
            .map(|step| rounded(now * factor.powf(share(step))))
            .filter(|value| *value != now)
            .collect();
        let tries = values.iter().map(|&value| Try::of(vec![change(value)]));
        let measured = search.measure(net, tries.collect());
        let enough = measured.iter().position(|(_, variant)| {
            variant.margin_db() >= search.goal.margin_db
                && (!must_be_safe || search.is_safe(variant))
        });
        let Some(place) = enough else {
            return found.or_else(|| {
                let (tried, variant) = measured.last()?;
                Some(lever(tried.clone(), now, variant, search, false))
            });
        };
        let (tried, variant) = &measured[place];
        found = Some(lever(tried.clone(), now, variant, search, true));
        (from, to) = (share(place), share(place + 1));
    }
    found
}

fn lever(tried: Try, now: f64, variant: &Variant, search: &Search, suffices: bool) -> Lever {
    Lever {
        tried: LeverChange::Try(tried),
        now: Some(now),
        reach: Reach {
            margin_db: variant.margin_db(),
            suffices,
        },
        faults: search.faults(variant),
    }
}

/// Two digits are as much as a layout or a driver can be asked for.
fn rounded(value: f64) -> f64 {
    let scale = 10f64.powf(value.log10().floor() - 1.0);
    let digits = (value / scale).round();
    format!("{digits}e{}", scale.log10().round())
        .parse()
        .unwrap_or(value)
}

/// Other layers that the board has.
fn layers(net: &Net, search: &Search) -> Vec<Lever> {
    let tries = Try::other_layers(net, search.bench.layers_of());
    let measured = search.measure(net, tries);
    measured
        .into_iter()
        .map(|(tried, variant)| Lever {
            tried: LeverChange::Try(tried),
            now: None,
            reach: Reach {
                margin_db: variant.margin_db(),
                suffices: variant.margin_db() >= search.goal.margin_db,
            },
            faults: search.faults(&variant),
        })
        .collect()
}

/// The board without its cables, where they rule.
fn no_cables(net: &Net, search: &Search) -> Option<Lever> {
    let with = search
        .bench
        .measure(vec![(String::new(), net.clone())], search.watch);
    let rules = with.first()?.result.worst.as_ref()?.mechanism;
    if rules != Mechanism::Cables {
        return None;
    }
    let bare = Board {
        cables: Some(Vec::new()),
        nets: vec![net.clone()],
        ..search.bench.board().clone()
    };
    let bench = Bench::new(&bare.nets, &bare, search.bench.setup(), search.watch);
    let without = bench.measure(vec![(String::new(), net.clone())], search.watch);
    let margin_db = without.first()?.margin_db();
    Some(Lever {
        tried: LeverChange::NoCables,
        now: None,
        reach: Reach {
            margin_db,
            suffices: margin_db >= search.goal.margin_db,
        },
        faults: Vec::new(),
    })
}
