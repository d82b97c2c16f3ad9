//! Changes as they are written.

use std::fmt;

use super::place::is_termination;
use super::{Change, SeriesPlace, Try};
use crate::board::{Net, PathItem};
use crate::text::{farads, henries, metres, ohms, seconds, volts};

impl fmt::Display for Try {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let changes: Vec<String> = self.changes.iter().map(Change::to_string).collect();
        let keep = if self.keeps { "keep, " } else { "" };
        f.pad(&format!("{keep}{}", changes.join(", ")))
    }
}

impl fmt::Display for Change {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let at = |at: &Option<String>| {
            at.as_ref()
                .map_or(String::new(), |receiver| format!(" at {receiver}"))
        };
        match self {
            Self::AsIs => f.write_str("as is"),
            Self::Bare => f.write_str("bare"),
            Self::Series {
                resistance_ohm,
                inductance_h,
                at,
            } => {
                write!(f, "series {}", ohms(*resistance_ohm))?;
                if *inductance_h > 0.0 {
                    write!(f, " + {}", henries(*inductance_h))?;
                }
                match at {
                    SeriesPlace::Driver => Ok(()),
                    SeriesPlace::Branch => f.write_str(" at branch"),
                    SeriesPlace::Legs => f.write_str(" at legs"),
                    SeriesPlace::LegOf(receiver) => write!(f, " at {receiver}"),
                }
            }
            Self::End {
                resistance_ohm,
                capacitance_f,
                to_v,
                at: place,
            } => {
                write!(f, "end {}", ohms(*resistance_ohm))?;
                if let Some(capacitance_f) = capacitance_f {
                    write!(f, " + {}", farads(*capacitance_f))?;
                }
                if *to_v != 0.0 {
                    write!(f, " to {}", volts(*to_v))?;
                }
                f.write_str(&at(place))
            }
            Self::Split {
                up_ohm,
                down_ohm,
                to_v,
                at: place,
            } => {
                write!(f, "split {} / {}", ohms(*up_ohm), ohms(*down_ohm))?;
                if let Some(to_v) = to_v {
                    write!(f, " to {}", volts(*to_v))?;
                }
                f.write_str(&at(place))
            }
            Self::Rise(time_s) => write!(f, "rise {}", seconds(*time_s)),
            Self::Resistance(ohm) => write!(f, "resistance {}", ohms(*ohm)),
            Self::Setting(name) => write!(f, "setting {name}"),
            Self::Length(length_m) => write!(f, "length {}", metres(*length_m)),
            Self::Height(height_m) => write!(f, "height {}", metres(*height_m)),
            Self::Layer(name) => write!(f, "layer {name}"),
        }
    }
}

/// The terminating parts of a path, each as a change would put it there.
pub fn terminations(net: &Net) -> Vec<String> {
    fn collect(path: &[PathItem], found: &mut Vec<String>) {
        for item in path {
            match item {
                PathItem::Branch(items) => collect(items, found),
                PathItem::Series(part) if is_termination(item) => {
                    let part = Change::Series {
                        resistance_ohm: part.resistance_ohm,
                        inductance_h: part.inductance_h,
                        at: SeriesPlace::Driver,
                    };
                    found.push(part.to_string());
                }
                PathItem::Shunt(part) if is_termination(item) => {
                    let part = Change::End {
                        resistance_ohm: part.resistance_ohm,
                        capacitance_f: part.capacitance_f,
                        to_v: part.to_v,
                        at: None,
                    };
                    found.push(part.to_string());
                }
                _ => {}
            }
        }
    }
    let mut found = Vec::new();
    collect(&net.path, &mut found);
    found
}
