//! The board as it is described: stackup, drivers, receivers, cables and nets, in SI units.
//!
//! This is the only form in which the rest of the program knows a board. Parts are resolved: a net
//! holds the driver, layers and receivers it names, so no later stage looks anything up.

mod read;
mod rewrite;

pub use read::{
    NamedTolerance, Reading, TableText, UnusableNet, VariedNet, VariedNets, read_board,
    read_board_and_tables,
};
pub use rewrite::{RewriteError, rewrite_board};

use std::sync::Arc;

/// A board: its antenna (plane and cables) and the nets on it.
#[derive(Debug, Clone, PartialEq)]
pub struct Board {
    /// What the file calls the board.
    pub title: String,
    /// The reference plane, where its size is given.
    pub plane: Option<Plane>,
    /// What hangs on the board: `None` where the file does not say, empty where it says nothing does.
    pub cables: Option<Vec<Cable>>,
    /// The usable nets, in the order of the file.
    pub nets: Vec<Net>,
}

/// The board's rectangular reference plane.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Plane {
    /// Extent along x.
    pub length_m: f64,
    /// Extent along y.
    pub width_m: f64,
    /// How the board stands on the test site.
    pub orientation: Orientation,
}

/// How the board stands on the test site.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Orientation {
    /// Lying level.
    #[default]
    Flat,
    /// On its long side.
    Standing,
}

/// An edge of the plane.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Edge {
    /// The short edge at x = 0.
    Left,
    /// The short edge at x = length.
    Right,
    /// The long edge at y = 0.
    Front,
    /// The long edge at y = width.
    Back,
}

/// How a cable runs from its edge.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum CableRun {
    /// In the plane of the board, far end open.
    #[default]
    Straight,
    /// Down to the floor and along it.
    Drops,
    /// Down to the floor and joined to it.
    Bonded,
}

/// A cable hanging on the board.
#[derive(Debug, Clone, PartialEq)]
pub struct Cable {
    /// The user's name for it.
    pub name: String,
    /// Its length; `None` where the user does not know it.
    pub length_m: Option<f64>,
    /// The plane's edge it leaves from.
    pub edge: Edge,
    /// Where along that edge; `None` is the middle.
    pub at_m: Option<f64>,
    /// How it runs.
    pub run: CableRun,
    /// Its outer diameter.
    pub diameter_m: f64,
}

/// A signal layer of the stackup.
#[derive(Debug, Clone, PartialEq)]
pub struct Layer {
    /// Its name in the stackup.
    pub name: String,
    /// Where its plane or planes lie.
    pub structure: Structure,
    /// Relative permittivity of the board material.
    pub permittivity: f64,
    /// Loss tangent of the board material.
    pub loss_tangent: f64,
    /// Copper thickness.
    pub copper_m: f64,
    /// Rms roughness of the copper; zero is smooth.
    pub roughness_m: f64,
}

/// Where a layer's plane or planes lie.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Structure {
    /// One plane, a height below the trace; air above.
    Microstrip {
        /// From the plane to the underside of the trace.
        height_m: f64,
    },
    /// A plane below and a plane above.
    Stripline {
        /// From the lower plane to the underside of the trace.
        below_m: f64,
        /// From the top of the trace to the upper plane.
        above_m: f64,
    },
}

/// A driver: a source that changes between two levels through a resistance.
#[derive(Debug, Clone, PartialEq)]
pub struct Driver {
    /// Its name in the file.
    pub name: String,
    /// Open-circuit level of the low state.
    pub low_v: f64,
    /// Open-circuit level of the high state.
    pub high_v: f64,
    /// Output resistance in the low state.
    pub low_resistance_ohm: f64,
    /// Output resistance in the high state.
    pub high_resistance_ohm: f64,
    /// Rise time between the thresholds.
    pub rise_s: f64,
    /// Fall time between the thresholds.
    pub fall_s: f64,
    /// Between which levels the edge times are measured.
    pub thresholds: Thresholds,
    /// The shape of the edge.
    pub edge: EdgeShape,
    /// Largest current it may carry for ever, where the file says.
    pub max_current_a: Option<f64>,
    /// Other strengths and edges that it can be set to.
    pub settings: Vec<DriverSetting>,
    /// The setting that the figures above are of; `None` is its usual one.
    pub setting: Option<String>,
}

/// A strength or edge that a driver can be set to.
#[derive(Debug, Clone, PartialEq)]
pub struct DriverSetting {
    /// Its name in the file.
    pub name: String,
    /// Output resistance in the low state.
    pub low_resistance_ohm: f64,
    /// Output resistance in the high state.
    pub high_resistance_ohm: f64,
    /// Rise time between the driver's thresholds.
    pub rise_s: f64,
    /// Fall time between them.
    pub fall_s: f64,
}

/// Between which fractions of the swing an edge time is measured.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Thresholds {
    /// 10 % to 90 %.
    #[default]
    TenNinety,
    /// 20 % to 80 %.
    TwentyEighty,
    /// The whole edge.
    Full,
}

/// The shape of a driver's edge.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum EdgeShape {
    /// A straight line.
    #[default]
    Ramp,
    /// A raised cosine.
    Smooth,
}

impl Driver {
    /// The driver in one of its settings; `None` where it has no such.
    pub fn with_setting(&self, name: &str) -> Option<Self> {
        let setting = self.settings.iter().find(|setting| setting.name == name)?;
        Some(Self {
            low_resistance_ohm: setting.low_resistance_ohm,
            high_resistance_ohm: setting.high_resistance_ohm,
            rise_s: setting.rise_s,
            fall_s: setting.fall_s,
            setting: Some(setting.name.clone()),
            ..self.clone()
        })
    }

    /// Whole duration of the rising edge, 0 to 100 %.
    pub fn full_rise_s(&self) -> f64 {
        self.rise_s / self.measured_share()
    }

    /// Whole duration of the falling edge, 0 to 100 %.
    pub fn full_fall_s(&self) -> f64 {
        self.fall_s / self.measured_share()
    }

    /// Share of the whole edge that lies between the thresholds.
    fn measured_share(&self) -> f64 {
        let skipped = match self.thresholds {
            Thresholds::TenNinety => 0.1,
            Thresholds::TwentyEighty => 0.2,
            Thresholds::Full => 0.0,
        };
        match self.edge {
            EdgeShape::Ramp => 1.0 - 2.0 * skipped,
            // (1 - cos(pi t)) / 2 = skipped
            EdgeShape::Smooth => 1.0 - 2.0 * (1.0 - 2.0 * skipped).acos() / std::f64::consts::PI,
        }
    }
}

/// A receiver part.
#[derive(Debug, Clone, PartialEq)]
pub struct ReceiverPart {
    /// Its name in the file.
    pub name: String,
    /// Input capacitance.
    pub capacitance_f: f64,
    /// Input resistance to 0 V; `None` is open.
    pub resistance_ohm: Option<f64>,
    /// Clamp to 0 V.
    pub low_clamp: Option<Clamp>,
    /// Clamp to its supply.
    pub high_clamp: Option<HighClamp>,
    /// Highest level that is surely read as low.
    pub low_threshold_v: Option<f64>,
    /// Lowest level that is surely read as high.
    pub high_threshold_v: Option<f64>,
    /// Largest current the clamps are rated for.
    pub clamp_rating_a: Option<f64>,
    /// Slowest edge that the input takes, 10 % to 90 %.
    pub max_rise_s: Option<f64>,
    /// Lead and bond-wire inductance in front of the input.
    pub package_inductance_h: f64,
    /// Capacitance at the pin, in front of the inductance.
    pub package_capacitance_f: f64,
}

/// A clamp: a junction with a series resistance.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Clamp {
    /// Drop of the junction at 1 mA.
    pub knee_v: f64,
    /// Series resistance.
    pub resistance_ohm: f64,
}

/// A clamp to a supply rail.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct HighClamp {
    /// The clamp itself.
    pub clamp: Clamp,
    /// The rail it conducts to.
    pub supply_v: f64,
}

/// A net: one driver and the way outwards from it.
#[derive(Debug, Clone, PartialEq)]
pub struct Net {
    /// Its name, unique on the board.
    pub name: String,
    /// What drives it.
    pub driver: Arc<Driver>,
    /// Frequency of the clock.
    pub clock_hz: f64,
    /// High share of the period, between the 50 % points: 0 to 1.
    pub duty: f64,
    /// The items outwards from the driver, in order.
    pub path: Vec<PathItem>,
    /// Distance of the whole path from the plane's nearest edge; `None` is centred.
    pub edge_distance_m: Option<f64>,
    /// Which way the path runs where no points are given.
    pub along: Along,
    /// How many lines it stands for, and what they keep step with.
    pub group: Group,
}

/// How many lines a net stands for, and what they keep step with.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Group {
    /// Number of lines alike, such as those of a bus; one or more.
    pub count: u32,
    /// Name of the clock source, where the file gives one; nets without one keep step with all others of their clock.
    pub clock_source: Option<Arc<str>>,
    /// Whether they keep step.
    pub phase: Phase,
}

impl Default for Group {
    fn default() -> Self {
        Self {
            count: 1,
            clock_source: None,
            phase: Phase::Locked,
        }
    }
}

impl Group {
    /// What the field of one line is multiplied by. Lines in step add up their fields, others their powers: 20 or
    /// 10 log of their number in dB.
    pub fn gain(&self) -> f64 {
        match self.phase {
            Phase::Locked => f64::from(self.count),
            Phase::Independent => f64::from(self.count).sqrt(),
        }
    }
}

/// Whether lines keep step with one another.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Phase {
    /// They switch together, or may: the worst case is assumed.
    #[default]
    Locked,
    /// They do not keep step with anything.
    Independent,
}

/// Which way a path without points runs.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Along {
    /// Along x.
    #[default]
    Length,
    /// Along y.
    Width,
}

/// One item of a path.
#[derive(Debug, Clone, PartialEq)]
pub enum PathItem {
    /// A part in series with the path.
    Series(Series),
    /// A trace on a layer of the stackup.
    Trace(Trace),
    /// A line given by its impedance and delay.
    Line(DirectLine),
    /// A via.
    Via(Via),
    /// A part from the path to a rail.
    Shunt(Shunt),
    /// A receiver's input.
    Receiver(Receiver),
    /// A stub or tee that leaves the main path here.
    Branch(Vec<PathItem>),
}

/// A resistance and an inductance in series with the path; either may be zero.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Series {
    /// Resistance.
    pub resistance_ohm: f64,
    /// Inductance.
    pub inductance_h: f64,
}

/// A trace on a layer of the stackup.
#[derive(Debug, Clone, PartialEq)]
pub struct Trace {
    /// The layer it runs on.
    pub layer: Arc<Layer>,
    /// Its width.
    pub width_m: f64,
    /// Its length (along the points, where they are given).
    pub length_m: f64,
    /// Where it runs on the plane, as a polyline; empty where the file does not say.
    pub points_m: Vec<[f64; 2]>,
}

/// A lossless line given by its impedance and delay.
#[derive(Debug, Clone, PartialEq)]
pub struct DirectLine {
    /// Characteristic impedance.
    pub impedance_ohm: f64,
    /// Flight time.
    pub delay_s: f64,
    /// Length, for radiation only; zero where the file gives none.
    pub length_m: f64,
    /// Height over its plane, for radiation only; zero where the file gives none.
    pub height_m: f64,
    /// Relative permittivity of what lies under it, for radiation only.
    pub permittivity: f64,
    /// Where it runs on the plane, as a polyline; empty where the file does not say.
    pub points_m: Vec<[f64; 2]>,
}

/// A via.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Via {
    /// Series inductance.
    pub inductance_h: f64,
    /// Capacitance to the planes, half at each end.
    pub capacitance_f: f64,
}

/// A resistance, a capacitance and an inductance in series from the path to a rail.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Shunt {
    /// Resistance; zero where the file gives none.
    pub resistance_ohm: f64,
    /// Capacitance; `None` is no capacitor (a direct connection).
    pub capacitance_f: Option<f64>,
    /// Inductance; zero where the file gives none.
    pub inductance_h: f64,
    /// Voltage of the rail.
    pub to_v: f64,
}

/// A receiver on the path.
#[derive(Debug, Clone, PartialEq)]
pub struct Receiver {
    /// Its name, unique on the net.
    pub name: String,
    /// The part.
    pub part: Arc<ReceiverPart>,
}
