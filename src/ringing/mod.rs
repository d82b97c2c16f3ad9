//! Ringing: one settled period of the waves on a net.
//!
//! The method of characteristics (Branin, "Transient analysis of lossless transmission lines",
//! Proc. IEEE 55, 1967): each line carries two travelling waves, delayed by its flight time; between
//! lines, each cluster of nodes joined by lumped parts is solved alone from the waves that arrive,
//! the parts' trapezoidal companions and the clamps. The march goes on until a whole period repeats,
//! so that the transform of that period has no leakage.

mod algebra;
mod clamp;
mod cluster;
mod companion;
mod delay;
mod extrapolate;
mod filter;
mod march;
mod model;
mod network;
mod rest;
mod settled;
mod source;
mod steps;
mod travelling;

pub use clamp::Clamps;
pub use march::{settle, settle_lines};
pub use model::{Model, line_models};
pub use network::{Branch, BranchEnd, DRIVER_NODE, Input, Network, Span};
pub use rest::rest_levels_v;
pub use settled::{MarchReport, Settled, SettledWaveform, Taken, WaveRecord};
pub use source::Source;
pub use steps::{Pace, Stretch};
