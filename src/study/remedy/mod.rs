//! What to solder in: for a net that does not likely pass, the cheapest change that makes it, and is safe.
//!
//! Changes are tried in the order of what they cost: a setting of the driver, one resistor, two parts, what burns power
//! at rest. Within a kind, the value that leaves the least ringing is taken where it reaches the margin, else the next
//! ones towards more margin, as far as the signal stays safe. Every candidate is worked out as `check` would, on the
//! whole net with all its legs: a rule of thumb only says where to start.

mod kinds;
mod levers;
mod search;

pub use kinds::Cost;
pub use levers::{Lever, LeverChange, Reach};

use self::kinds::kinds;
use self::levers::levers;
use self::search::{Search, Trial};
use super::change::Try;
use super::compare::{Bench, Fault, Variant};
use super::verdict::{MARGINAL_FROM, margin_for_chance_db};
use super::{CheckSetup, Watch, total_sigma_db};
use crate::board::Net;

/// What is asked of a remedy.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Goal {
    /// The margin to reach.
    pub margin_db: f64,
}

impl Goal {
    /// Just likely to pass, under the spread of a check.
    pub fn likely_pass(setup: &CheckSetup) -> Self {
        let sigma_db = total_sigma_db(setup.model_sigma_db);
        Self {
            margin_db: margin_for_chance_db(MARGINAL_FROM, sigma_db),
        }
    }
}

/// What became of one net.
#[derive(Debug, Clone)]
pub struct Remedied {
    /// The net as it is.
    pub before: Variant,
    /// What there is to say.
    pub outcome: Outcome,
}

/// What there is to say of a net.
#[derive(Debug, Clone)]
pub enum Outcome {
    /// It reaches the margin as it is.
    LeftAlone,
    /// Nothing of it can be judged.
    NotJudged,
    /// A change makes it.
    Found(Box<Remedy>),
    /// Nothing does that is safe.
    Hopeless(Box<Hopeless>),
}

/// A change that reaches the margin and is safe.
#[derive(Debug, Clone)]
pub struct Remedy {
    /// The change.
    pub tried: Try,
    /// What it costs.
    pub cost: Cost,
    /// The net with it.
    pub after: Variant,
    /// The lowest and highest value of its first resistor that reach the margin and are safe, as far as they were tried.
    pub range_ohm: Option<[f64; 2]>,
    /// Cheaper kinds of change that do not make it.
    pub cheaper: Vec<Attempt>,
}

/// The best of one kind of change that does not make it.
#[derive(Debug, Clone)]
pub struct Attempt {
    /// The change.
    pub tried: Try,
    /// The margin it reaches.
    pub margin_db: f64,
    /// What is not safe about it.
    pub faults: Vec<Fault>,
}

/// What to say where no change of parts suffices.
#[derive(Debug, Clone)]
pub struct Hopeless {
    /// The best of each kind of change, cheapest kind first.
    pub attempts: Vec<Attempt>,
    /// The best safe change of parts; `None` where none is better than the net as it is.
    pub best: Option<(Try, Box<Variant>)>,
    /// What else would have to change, on top of that, and how far each alone.
    pub levers: Vec<Lever>,
}

impl Remedied {
    /// The net as it should be: with its remedy, if it has one.
    pub fn after(&self) -> &Variant {
        match &self.outcome {
            Outcome::Found(remedy) => &remedy.after,
            _ => &self.before,
        }
    }
}

/// Looks for a remedy for every net of the bench's board.
pub fn remedy(bench: &Bench, goal: Goal, watch: &dyn Watch) -> Vec<Remedied> {
    let nets = &bench.board().nets;
    let named = nets
        .iter()
        .map(|net| (Try::as_is().to_string(), net.clone()));
    let before = bench.measure(named.collect(), watch);
    let nets = nets.iter().zip(before);
    nets.map(|(net, before)| {
        let outcome = remedy_for(net, &before, bench, goal, watch);
        Remedied { before, outcome }
    })
    .collect()
}

/// How far each lever beside the parts would have to go for a net, worked out as it is.
pub fn levers_for(
    net: &Net,
    before: &Variant,
    bench: &Bench,
    goal: Goal,
    watch: &dyn Watch,
) -> Vec<Lever> {
    levers(
        net,
        &Search {
            net,
            before,
            bench,
            goal,
            watch,
        },
    )
}

/// Looks for a remedy for one net, worked out as it is.
pub fn remedy_for(
    net: &Net,
    before: &Variant,
    bench: &Bench,
    goal: Goal,
    watch: &dyn Watch,
) -> Outcome {
    if before.result.worst.is_none() {
        return Outcome::NotJudged;
    }
    if before.margin_db() >= goal.margin_db {
        return Outcome::LeftAlone;
    }
    let search = Search {
        net,
        before,
        bench,
        goal,
        watch,
    };
    let mut attempts: Vec<(Cost, Trial)> = Vec::new();
    let mut cost = None;
    for kind in kinds(net) {
        // Kinds of one cost are all looked at: the best of them is taken.
        if cost.is_some_and(|cost| cost != kind.cost)
            && attempts.iter().any(|a| search.makes_it(&a.1))
        {
            break;
        }
        cost = Some(kind.cost);
        attempts.extend(search.best(&kind).map(|trial| (kind.cost, trial)));
    }
    let made = attempts
        .iter()
        .filter(|(_, trial)| search.makes_it(trial))
        .min_by(|a, b| search.ripple_v(&a.1).total_cmp(&search.ripple_v(&b.1)))
        .map(|(cost, trial)| (*cost, trial.clone()));
    let attempt = |trial: &Trial| Attempt {
        tried: trial.tried.clone(),
        margin_db: trial.variant.margin_db(),
        faults: search.faults(&trial.variant),
    };
    if let Some((cost, trial)) = made {
        let cheaper = attempts.iter().filter(|(_, other)| !search.makes_it(other));
        return Outcome::Found(Box::new(Remedy {
            cost,
            cheaper: cheaper.map(|(_, trial)| attempt(trial)).collect(),
            tried: trial.tried,
            after: trial.variant,
            range_ohm: trial.range_ohm,
        }));
    }
    let best = attempts
        .iter()
        .filter(|(_, trial)| search.is_safe(&trial.variant))
        .max_by(|a, b| a.1.variant.margin_db().total_cmp(&b.1.variant.margin_db()))
        .filter(|(_, trial)| trial.variant.margin_db() > before.margin_db())
        .map(|(_, trial)| (trial.tried.clone(), Box::new(trial.variant.clone())));
    let from = best.as_ref().map_or(net, |(_, variant)| &variant.net);
    Outcome::Hopeless(Box::new(Hopeless {
        attempts: attempts.iter().map(|(_, trial)| attempt(trial)).collect(),
        levers: levers(from, &search),
        best,
    }))
}
