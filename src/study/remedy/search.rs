//! Looks for the value of one kind of change, in E24 steps, coarse to fine.

use std::collections::BTreeMap;

use super::Goal;
use super::kinds::Kind;
use crate::board::Net;
use crate::study::Watch;
use crate::study::change::Try;
use crate::study::compare::{Bench, Fault, Variant};
use crate::study::values::E24Step;

/// Where to look first, in E24 steps from where a rule of thumb says: a factor 2 below to one of 3 above.
const COARSE: [i32; 6] = [-8, -4, 0, 4, 8, 12];
/// What lies between those.
const FINE: [i32; 6] = [-3, -2, -1, 1, 2, 3];

/// A search for one net.
pub struct Search<'s> {
    pub net: &'s Net,
    /// The net as it is.
    pub before: &'s Variant,
    pub bench: &'s Bench<'s>,
    pub goal: Goal,
    pub watch: &'s dyn Watch,
}

/// A change worked out.
#[derive(Debug, Clone)]
pub struct Trial {
    pub tried: Try,
    pub variant: Variant,
    /// Lowest and highest value of those tried that make it.
    pub range_ohm: Option<[f64; 2]>,
}

impl Search<'_> {
    /// Whether a change reaches the margin and is safe.
    pub fn makes_it(&self, trial: &Trial) -> bool {
        self.reaches(&trial.variant) && self.is_safe(&trial.variant)
    }

    pub fn is_safe(&self, variant: &Variant) -> bool {
        self.faults(variant).is_empty()
    }

    /// What is not safe about a variant.
    pub fn faults(&self, variant: &Variant) -> Vec<Fault> {
        variant.faults_against(self.before)
    }

    /// What is left of ringing and slowness at the worst receiver.
    pub fn ripple_v(&self, trial: &Trial) -> f64 {
        ripple_v(&trial.variant)
    }

    fn reaches(&self, variant: &Variant) -> bool {
        variant.margin_db() >= self.goal.margin_db
    }

    /// Works tries out on a net; those that it cannot take are left out.
    pub fn measure(&self, net: &Net, tries: Vec<Try>) -> Vec<(Try, Variant)> {
        let possible: Vec<(Try, Net)> = tries
            .into_iter()
            .filter_map(|tried| {
                let changed = tried.on(net, self.bench.layers_of()).ok()?;
                Some((tried, changed))
            })
            .collect();
        let named = possible
            .iter()
            .map(|(tried, net)| (tried.to_string(), net.clone()));
        let variants = self.bench.measure(named.collect(), self.watch);
        possible
            .into_iter()
            .map(|(tried, _)| tried)
            .zip(variants)
            .collect()
    }

    /// The best of one kind: the quietest that makes it, else the safe one with the most margin, else the one with
    /// the fewest faults.
    pub fn best(&self, kind: &Kind) -> Option<Trial> {
        let Some(start_ohm) = kind.start_ohm else {
            let (tried, variant) = self.measure(self.net, vec![(kind.at)(0.0)]).pop()?;
            return Some(Trial {
                tried,
                variant,
                range_ohm: None,
            });
        };
        let start = E24Step::nearest(start_ohm);
        let mut known: BTreeMap<E24Step, Option<(Try, Variant)>> = BTreeMap::new();
        for offsets in [COARSE, FINE] {
            // The second time, around the best so far.
            let centre = self.choice(&known).unwrap_or(start);
            let wanted: Vec<E24Step> = (offsets.iter())
                .map(|offset| E24Step(centre.0 + offset))
                .filter(|step| !known.contains_key(step))
                .collect();
            let tries = wanted.iter().map(|step| (kind.at)(step.value())).collect();
            let measured = self.measure(self.net, tries);
            for step in wanted {
                let tried = (kind.at)(step.value());
                let found = measured.iter().find(|(other, _)| *other == tried);
                known.insert(step, found.cloned());
            }
        }
        let chosen = self.choice(&known)?;
        let mut making = (known.iter())
            .filter(|(_, found)| found.as_ref().is_some_and(|(_, v)| self.is_made(v)))
            .map(|(step, _)| step.value());
        let lowest = making.next();
        let range_ohm = lowest.map(|lowest| [lowest, making.next_back().unwrap_or(lowest)]);
        let (tried, variant) = known.remove(&chosen)??;
        Some(Trial {
            tried,
            variant,
            range_ohm,
        })
    }

    fn is_made(&self, variant: &Variant) -> bool {
        self.reaches(variant) && self.is_safe(variant)
    }

    fn choice(&self, known: &BTreeMap<E24Step, Option<(Try, Variant)>>) -> Option<E24Step> {
        let found = || {
            known
                .iter()
                .filter_map(|(step, found)| Some((*step, &found.as_ref()?.1)))
        };
        let most_margin = |a: &(E24Step, &Variant), b: &(E24Step, &Variant)| {
            a.1.margin_db().total_cmp(&b.1.margin_db())
        };
        found()
            .filter(|(_, variant)| self.is_made(variant))
            .min_by(|a, b| ripple_v(a.1).total_cmp(&ripple_v(b.1)))
            .or_else(|| found().filter(|(_, v)| self.is_safe(v)).max_by(most_margin))
            .or_else(|| {
                // The least unsafe says best what stands in the way.
                let faults = |v: &Variant| std::cmp::Reverse(self.faults(v).len());
                found().max_by(|a, b| faults(a.1).cmp(&faults(b.1)).then(most_margin(a, b)))
            })
            .map(|(step, _)| step)
    }
}

fn ripple_v(variant: &Variant) -> f64 {
    variant
        .receptions
        .iter()
        .map(|reception| reception.ripple_v)
        .fold(0.0, f64::max)
}
