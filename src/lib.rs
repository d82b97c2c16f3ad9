//! Estimates what a board's ringing nets radiate, and lays it against limit lines.
//!
//! The crate is a pipeline; each stage is a folder, a plain function from plain data to plain data,
//! and imports only the stages before it:
//!
//! 1. [`text`]: quantities with units, and files that say where they are wrong.
//! 2. [`board`]: the board as the user describes it.
//! 3. [`mod@line`]: impedance and delay of its traces.
//! 4. [`ringing`]: one settled period of the waves on a net, in the time domain.
//! 5. [`spectrum`]: the harmonics of that period, as rms phasors.
//! 6. [`radiation`]: the field they make at the antenna.
//! 7. [`limit`]: limit lines.
//! 8. [`study`]: questions of a user, answered for one net: will it likely fail?
//! 9. [`show`]: tables, JSON, CSV and pictures.
//!
//! Nothing here prints, opens a file or reads a clock: that is left to the binary.
//! Every number is SI and `f64`; names of plain numbers carry their unit.

pub mod board;
pub mod limit;
pub mod line;
pub mod radiation;
pub mod ringing;
pub mod show;
pub mod spectrum;
pub mod study;
pub mod text;
pub mod watch;

/// Speed of light in vacuum.
pub(crate) const LIGHT_SPEED_M_PER_S: f64 = 299_792_458.0;
/// Magnetic constant (CODATA 2018, to the digits that matter here).
pub(crate) const MU0_H_PER_M: f64 = 1.256_637_062e-6;
/// Impedance of free space.
pub(crate) const ETA0_OHM: f64 = MU0_H_PER_M * LIGHT_SPEED_M_PER_S;
