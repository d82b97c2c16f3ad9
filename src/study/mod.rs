//! Studies: what a user asks of the pipeline, answered for one net or many.

mod antenna;
mod band;
pub mod change;
mod check;
pub mod compare;
pub mod explain;
mod plan;
mod rank;
pub mod remedy;
mod scan;
mod signal;
mod tolerance;
mod values;
mod verdict;
mod warnings;

pub use crate::watch::{Unwatched, Watch};
pub use antenna::{
    BoardAntenna, Resonance, Resonator, SourceCurve, UNIT_AREA_M2, UNIT_CAPACITANCE_F,
    UNIT_CURRENT_A, UNIT_HEIGHT_M, UNIT_LENGTH_M, UNIT_VOLTAGE_V, UnitSource, antenna_curves,
};
pub use band::scan_band_hz;
pub use check::{
    CheckSetup, RungNet, board_antenna, cable_objection, check, judge_all, ring, ring_all,
};
pub use plan::{BoardPlan, PlannedCable, PlannedNet, board_plan};
pub use rank::{
    BoardSum, Change, Filter, OWNERS_NAMED, Owner, RankedNet, Ranking, Remedy, SumLevel, SumLine,
    SumWorst, Tally, rank,
};
pub use scan::{NetScan, Scans, scan_nets};
pub use signal::{ClampSignal, ReceiverSignal, Signal};
pub use tolerance::{
    Carried, CarriedBy, FEWEST_DRAWS, MOST_DRAWS, MarginSpread, Spread, check_drawn, spread_all,
};
pub use verdict::{
    INSTRUMENT_SIGMA_DB, MODEL_SIGMA_DB, Verdict, chance_of_failing, total_sigma_db,
};

use crate::radiation::Aim;
use crate::ringing::{MarchReport, SettledWaveform};

/// Every output carries this.
pub const NOTICE: &str = "pre-compliance estimate, not a compliance test";

/// What `check` finds out about one net.
#[derive(Debug, Clone)]
pub struct NetResult {
    /// The net's name.
    pub name: String,
    /// Its clock.
    pub clock_hz: f64,
    /// What the worst margin means.
    pub verdict: Verdict,
    /// Chance of failing, 0 to 1, over the draws where tolerances were drawn; `None` where nothing could be judged.
    pub chance_of_failing: Option<f64>,
    /// The smallest margin over limits, distances and harmonics; `None` where no limit covers a harmonic or nothing radiates.
    pub worst: Option<Worst>,
    /// Every harmonic in range, by rising frequency.
    pub harmonics: Vec<Harmonic>,
    /// What the waveform does to the parts.
    pub signal: Signal,
    /// How the waveform was reached.
    pub march: MarchReport,
    /// One settled period.
    pub waveform: SettledWaveform,
    /// What the user should know, in plain sentences.
    pub warnings: Vec<String>,
    /// What its tolerances make of the margin; `None` where none were drawn.
    pub spread: Option<Spread>,
}

/// The reading with the smallest margin.
#[derive(Debug, Clone, PartialEq)]
pub struct Worst {
    /// Title of the limit.
    pub limit: String,
    /// Number of the harmonic.
    pub harmonic: usize,
    /// Its frequency.
    pub frequency_hz: f64,
    /// Distance of the antenna.
    pub distance_m: f64,
    /// The estimate.
    pub field_dbuv_per_m: f64,
    /// The limit there.
    pub limit_dbuv_per_m: f64,
    /// Limit less estimate.
    pub margin_db: f64,
    /// What makes most of the field.
    pub mechanism: Mechanism,
    /// Where the antenna reads it, where that is known.
    pub aim: Option<Aim>,
}

/// What a field is made of.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Mechanism {
    /// The loops between traces and plane.
    Loops,
    /// The charged traces.
    Charges,
    /// The cables.
    Cables,
}

impl Mechanism {
    /// What makes most of a reading.
    fn ruling(reading: &FieldReading) -> Self {
        let parts = [
            (Self::Loops, reading.loops_dbuv_per_m),
            (Self::Charges, reading.charges_dbuv_per_m),
            (Self::Cables, reading.cable_dbuv_per_m),
        ];
        let level = |part: &(Self, Option<f64>)| part.1.unwrap_or(f64::NEG_INFINITY);
        let most = parts
            .into_iter()
            .max_by(|a, b| level(a).total_cmp(&level(b)));
        most.map_or(Self::Loops, |part| part.0)
    }

    /// As shown to the user.
    pub fn as_str(self) -> &'static str {
        match self {
            Self::Loops => "loops",
            Self::Charges => "charged traces",
            Self::Cables => "cables",
        }
    }
}

/// One harmonic of the settled waveform and what it radiates. All levels are rms.
#[derive(Debug, Clone, PartialEq)]
pub struct Harmonic {
    /// Its number; 1 is the clock.
    pub number: usize,
    /// Its frequency.
    pub frequency_hz: f64,
    /// Current out of the driver.
    pub driver_current_a: f64,
    /// Voltage at each receiver, in the order of [`Signal::receivers`].
    pub receiver_voltage_v: Vec<f64>,
    /// The field at each distance asked for.
    pub fields: Vec<FieldReading>,
}

/// The field of one harmonic at one distance. A field of zero has no level and is `None`.
#[derive(Debug, Clone, PartialEq)]
pub struct FieldReading {
    /// Distance of the antenna.
    pub distance_m: f64,
    /// The estimate; `None` where no part of the net radiates.
    pub field_dbuv_per_m: Option<f64>,
    /// The plain loop-area figure; `None` where the loop has no area.
    pub loop_area_dbuv_per_m: Option<f64>,
    /// What the loops between traces and plane make of it, without cables.
    pub loops_dbuv_per_m: Option<f64>,
    /// What the charged traces make of it, without cables.
    pub charges_dbuv_per_m: Option<f64>,
    /// What the cables add; `None` where they are not in the figure.
    pub cable_dbuv_per_m: Option<f64>,
    /// Where the antenna reads it, where that is known.
    pub aim: Option<Aim>,
}
