//! Where on a path things are: its legs, its far ends, its lines.

use crate::board::PathItem;
use crate::line::{line_of_direct, line_of_trace};

/// Whether there is a line among these items, branches included.
pub fn has_line(items: &[PathItem]) -> bool {
    items.iter().any(|item| match item {
        PathItem::Trace(_) | PathItem::Line(_) => true,
        PathItem::Branch(items) => has_line(items),
        _ => false,
    })
}

/// Whether an item is a leg: a branch with a line.
pub fn is_leg(item: &PathItem) -> bool {
    matches!(item, PathItem::Branch(items) if has_line(items))
}

/// Flight time over one item.
pub fn delay_s(item: &PathItem) -> f64 {
    match item {
        PathItem::Trace(trace) => line_of_trace(trace).0.delay_s,
        PathItem::Line(line) => line_of_direct(line).delay_s,
        _ => 0.0,
    }
}

/// The first place where a path branches into legs: the first of its neighbouring branches and the place after the
/// last of them.
pub fn branching(path: &[PathItem]) -> Option<(usize, usize)> {
    let first = path.iter().position(is_leg)?;
    let more = path[first..]
        .iter()
        .take_while(|item| matches!(item, PathItem::Branch(_)))
        .count();
    Some((first, first + more))
}

/// How many far ends a path has.
pub fn far_ends(path: &[PathItem]) -> usize {
    let mut count = 0;
    // Counting needs no change, but it must never differ from what is done.
    at_far_ends(&mut path.to_vec(), &mut |_| count += 1);
    count
}

/// Does something to the list of items that each far end closes.
pub fn at_far_ends(path: &mut Vec<PathItem>, act: &mut impl FnMut(&mut Vec<PathItem>)) {
    for item in path.iter_mut() {
        if let PathItem::Branch(items) = item
            && has_line(items)
        {
            at_far_ends(items, act);
        }
    }
    let after_legs = path.iter().rposition(is_leg).map_or(0, |last| last + 1);
    if after_legs == 0 || has_line(&path[after_legs..]) {
        act(path);
    }
}

/// The list of items that holds a receiver, and its place in it.
pub fn find_receiver<'p>(
    path: &'p mut Vec<PathItem>,
    name: &str,
) -> Option<(&'p mut Vec<PathItem>, usize)> {
    let is_it = |item: &PathItem| matches!(item, PathItem::Receiver(r) if r.name == name);
    if let Some(place) = path.iter().position(is_it) {
        return Some((path, place));
    }
    path.iter_mut().find_map(|item| match item {
        PathItem::Branch(items) => find_receiver(items, name),
        _ => None,
    })
}

/// The names of all receivers, in the order of the path.
pub fn receiver_names(path: &[PathItem]) -> Vec<String> {
    path.iter()
        .flat_map(|item| match item {
            PathItem::Receiver(receiver) => vec![receiver.name.clone()],
            PathItem::Branch(items) => receiver_names(items),
            _ => Vec::new(),
        })
        .collect()
}

/// Whether an item ends or damps the net: a part with a resistance.
pub fn is_termination(item: &PathItem) -> bool {
    match item {
        PathItem::Series(part) => part.resistance_ohm > 0.0,
        PathItem::Shunt(part) => part.resistance_ohm > 0.0,
        _ => false,
    }
}

/// Whether a path has any termination.
pub fn is_terminated(path: &[PathItem]) -> bool {
    path.iter().any(|item| match item {
        PathItem::Branch(items) => is_terminated(items),
        item => is_termination(item),
    })
}
