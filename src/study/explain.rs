//! Why a net reads what it reads: what each piece of it contributes at its worst harmonic, and what halves that.

use super::check::segment_readings;
use super::compare::Bench;
use super::remedy::{Goal, Lever, Outcome, levers_for, remedy_for};
use super::{FieldReading, Watch, Worst, ring};
use crate::board::Net;

/// Half of a field, in dB.
const HALF_DB: f64 = 6.02;

/// The worst reading of a net, taken apart.
#[derive(Debug, Clone)]
pub struct Explanation {
    /// The net's name.
    pub net: String,
    /// The reading.
    pub worst: Worst,
    /// What it is made of.
    pub reading: FieldReading,
    /// The pieces of its route that radiate, in its order.
    pub pieces: Vec<Piece>,
    /// What of its parts would have to change for half the field; nothing does where it is left alone.
    pub parts: Outcome,
    /// What else would halve it, or how far that gets.
    pub levers: Vec<Lever>,
}

/// A straight piece of a route.
#[derive(Debug, Clone, PartialEq)]
pub struct Piece {
    /// Number of its line along the path, from 1.
    pub line: usize,
    /// Where it starts on the plane.
    pub start_m: [f64; 2],
    /// Where it ends.
    pub end_m: [f64; 2],
    /// Its length.
    pub length_m: f64,
    /// Height over the plane.
    pub height_m: f64,
    /// Current and voltage in its middle, rms.
    pub middle_current_a: f64,
    /// The voltage.
    pub middle_voltage_v: f64,
    /// What it would read alone, with the currents it has.
    pub alone_dbuv_per_m: Option<f64>,
    /// What the rest would read without it; `None` where nothing is left.
    pub rest_dbuv_per_m: Option<f64>,
}

/// Explains every net of the bench's board that has a worst reading.
pub fn explain(bench: &Bench, watch: &dyn Watch) -> Vec<Explanation> {
    let nets = bench.board().nets.iter();
    nets.filter_map(|net| explained(net, bench, watch))
        .collect()
}

fn explained(net: &Net, bench: &Bench, watch: &dyn Watch) -> Option<Explanation> {
    let named = vec![("as it is".to_string(), net.clone())];
    let before = bench.measure(named, watch).pop()?;
    let worst = before.result.worst.clone()?;
    let mut harmonics = before.result.harmonics.iter();
    let harmonic = harmonics.find(|harmonic| harmonic.number == worst.harmonic)?;
    let mut fields = harmonic.fields.iter();
    let reading = fields
        .find(|field| field.distance_m == worst.distance_m)?
        .clone();
    let rung = ring(net, bench.board(), bench.setup());
    let pieces = segment_readings(bench.antenna(), &rung, &worst, bench.setup())?;
    let goal = Goal {
        margin_db: worst.margin_db + HALF_DB,
    };
    Some(Explanation {
        net: net.name.clone(),
        reading,
        pieces,
        parts: remedy_for(net, &before, bench, goal, watch),
        levers: levers_for(net, &before, bench, goal, watch),
        worst,
    })
}
