//! What a user tries on a net: other terminations, another edge, another layout.
//!
//! One short grammar names them all, in `compare --try`, in `remedy` and in every table:
//!
//! ```text
//! try     = ["keep,"] change {"," change}
//! change  = "as is" | "bare"
//!         | "series" R ["+" L] ["at" ("driver" | "branch" | "legs" | RECEIVER)]
//!         | "end" R ["+" C] ["to" V] ["at" RECEIVER]
//!         | "split" R "/" R ["to" V] ["at" RECEIVER]
//!         | "rise" T | "resistance" R | "setting" NAME
//!         | "length" L | "height" L | "layer" NAME
//! ```
//!
//! A try that names a termination names all of them: what the net has now goes, unless it begins with `keep`. A try
//! that changes only the driver or the layout leaves the terminations alone.

mod apply;
pub(super) mod place;
mod read;
mod words;

pub use apply::ApplyError;
pub use read::{TryError, read_sweep, read_try};
pub use words::terminations;

use crate::board::{Board, Net};

/// One variant of a net: the changes to it, in order.
#[derive(Debug, Clone, PartialEq)]
pub struct Try {
    /// Whether the terminations that the net has now stay where the changes name others.
    pub keeps: bool,
    /// The changes.
    pub changes: Vec<Change>,
}

/// One change of a net.
#[derive(Debug, Clone, PartialEq)]
pub enum Change {
    /// Nothing.
    AsIs,
    /// Every termination goes.
    Bare,
    /// A resistor, and perhaps an inductance, in series with the path.
    Series {
        /// Resistance.
        resistance_ohm: f64,
        /// Inductance; zero is none.
        inductance_h: f64,
        /// Where.
        at: SeriesPlace,
    },
    /// A resistor, and perhaps a capacitor behind it, from the far end to a rail.
    End {
        /// Resistance.
        resistance_ohm: f64,
        /// Capacitance; `None` is no capacitor.
        capacitance_f: Option<f64>,
        /// Voltage of the rail.
        to_v: f64,
        /// At this receiver; `None` is every far end.
        at: Option<String>,
    },
    /// A resistor from the far end to a rail and one to 0 V.
    Split {
        /// To the rail.
        up_ohm: f64,
        /// To 0 V.
        down_ohm: f64,
        /// Voltage of the rail; `None` is the driver's high level.
        to_v: Option<f64>,
        /// At this receiver; `None` is every far end.
        at: Option<String>,
    },
    /// Another edge, rise and fall, between the driver's own thresholds.
    Rise(f64),
    /// Another output resistance, in both states.
    Resistance(f64),
    /// A setting that the driver has.
    Setting(String),
    /// Another length of the whole route, all parts of it in proportion.
    Length(f64),
    /// Another height over the plane for every outer part.
    Height(f64),
    /// Every trace on another layer.
    Layer(String),
}

/// Where a series part goes.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum SeriesPlace {
    /// In the place of the first series resistor before the path branches; at the driver where there is none.
    Driver,
    /// Right before the path branches.
    Branch,
    /// At the head of every leg.
    Legs,
    /// At the head of the leg with this receiver.
    LegOf(String),
}

/// Tries that differ in one number.
#[derive(Debug, Clone, PartialEq)]
pub struct Sweep {
    /// What is swept, with the range in place of the number: `series 0..100 ohm`.
    pub label: String,
    /// The unit of the numbers.
    pub unit: String,
    /// The numbers, rising, each with its try.
    pub steps: Vec<(f64, Try)>,
}

impl Try {
    /// The net as it is.
    pub fn as_is() -> Self {
        Self::of(vec![Change::AsIs])
    }

    /// The net without terminations.
    pub fn bare() -> Self {
        Self::of(vec![Change::Bare])
    }

    /// These changes.
    pub fn of(changes: Vec<Change>) -> Self {
        Self {
            keeps: false,
            changes,
        }
    }

    /// The net with this tried on it; the board is where layers are looked up.
    ///
    /// # Errors
    ///
    /// A change that this net cannot take.
    pub fn on(&self, net: &Net, board: &Board) -> Result<Net, ApplyError> {
        apply::apply(self, net, board)
    }

    /// The greatest height of a net's lines over a single plane: what `height` changes.
    pub fn greatest_height_m(net: &Net) -> Option<f64> {
        apply::greatest_height_m(&net.path)
    }

    /// The longest way from a net's driver to a far end: what `length` changes.
    pub fn longest_way_m(net: &Net) -> f64 {
        apply::longest_way_m(&net.path)
    }

    /// The moves to those layers of a board that a net does not run on.
    pub fn other_layers(net: &Net, board: &Board) -> Vec<Self> {
        let own = apply::layers(std::slice::from_ref(net));
        apply::layers(&board.nets)
            .iter()
            .filter(|layer| !own.is_empty() && own.iter().all(|own| own.name != layer.name))
            .map(|layer| Self::of(vec![Change::Layer(layer.name.clone())]))
            .collect()
    }
}

impl Change {
    /// Whether this names a termination.
    fn terminates(&self) -> bool {
        matches!(
            self,
            Self::Bare | Self::Series { .. } | Self::End { .. } | Self::Split { .. }
        )
    }
}
