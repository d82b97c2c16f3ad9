//! Probes: receivers that load nothing, put beside every terminating part to see what it carries.

use std::sync::Arc;

use crate::board::{Net, PathItem, Receiver, ReceiverPart};
use crate::study::NetResult;
use crate::study::change::place::is_termination;

/// Begins the name of every probe; no file can hold it.
const MARK: char = '\u{1}';

/// A terminating part between two probes, or between one and a rail.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Probed {
    /// What it is.
    pub part: Part,
    /// Number of the probe on its driver's side, among all receivers of the probed net.
    pub near: usize,
    /// Number of the other one; `None` where it goes to a rail.
    pub far: Option<usize>,
}

/// A terminating part: a resistance, with one part that stores beside it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Part {
    /// Resistance.
    pub resistance_ohm: f64,
    /// Inductance; zero is none.
    pub inductance_h: f64,
    /// Capacitance; `None` is none.
    pub capacitance_f: Option<f64>,
    /// Voltage of its rail; zero where it goes to none.
    pub to_v: f64,
}

/// A net with a probe at each side of its terminating parts, and these parts.
pub fn probed(net: &Net) -> (Net, Vec<Probed>) {
    let mut maker = Maker {
        part: Arc::new(ReceiverPart {
            name: "probe".into(),
            capacitance_f: 0.0,
            resistance_ohm: None,
            low_clamp: None,
            high_clamp: None,
            low_threshold_v: None,
            high_threshold_v: None,
            clamp_rating_a: None,
            max_rise_s: None,
            package_inductance_h: 0.0,
            package_capacitance_f: 0.0,
        }),
        count: 0,
        found: Vec::new(),
    };
    let path = maker.path(&net.path);
    let net = Net {
        path,
        ..net.clone()
    };
    (net, maker.found)
}

/// Takes a net's probes out of its result; gives their waveforms and levels at rest, low and high, by their number.
pub fn taken_out(result: &mut NetResult) -> Vec<Option<Reading>> {
    let is_probe: Vec<bool> = (result.signal.receivers.iter())
        .map(|receiver| receiver.name.starts_with(MARK))
        .collect();
    for harmonic in &mut result.harmonics {
        let mut places = is_probe.iter();
        harmonic
            .receiver_voltage_v
            .retain(|_| places.next() == Some(&false));
    }
    let signals = std::mem::take(&mut result.signal.receivers);
    let waves = std::mem::take(&mut result.waveform.receivers_v);
    let mut readings = Vec::with_capacity(is_probe.len());
    for ((signal, voltage_v), probe) in signals.into_iter().zip(waves).zip(is_probe) {
        if probe {
            readings.push(Some(Reading {
                at_rest_v: [signal.rest_low_v, signal.rest_high_v],
                voltage_v,
            }));
        } else {
            result.signal.receivers.push(signal);
            result.waveform.receivers_v.push(voltage_v);
            readings.push(None);
        }
    }
    readings
}

/// What a probe saw.
#[derive(Debug, Clone, PartialEq)]
pub struct Reading {
    /// The levels at rest, driver low and driver high.
    pub at_rest_v: [f64; 2],
    /// One settled period.
    pub voltage_v: Vec<f64>,
}

struct Maker {
    part: Arc<ReceiverPart>,
    /// Receivers and probes so far.
    count: usize,
    found: Vec<Probed>,
}

impl Maker {
    fn path(&mut self, path: &[PathItem]) -> Vec<PathItem> {
        let mut probed = Vec::new();
        for item in path {
            match item {
                PathItem::Series(part) if is_termination(item) => {
                    let near = self.probe(&mut probed);
                    probed.push(item.clone());
                    let far = Some(self.probe(&mut probed));
                    let part = Part {
                        resistance_ohm: part.resistance_ohm,
                        inductance_h: part.inductance_h,
                        capacitance_f: None,
                        to_v: 0.0,
                    };
                    self.found.push(Probed { part, near, far });
                }
                PathItem::Shunt(part) if is_termination(item) => {
                    let near = self.probe(&mut probed);
                    probed.push(item.clone());
                    let part = Part {
                        resistance_ohm: part.resistance_ohm,
                        // A parasitic one beside a capacitor changes the heat little.
                        inductance_h: if part.capacitance_f.is_some() {
                            0.0
                        } else {
                            part.inductance_h
                        },
                        capacitance_f: part.capacitance_f,
                        to_v: part.to_v,
                    };
                    let far = None;
                    self.found.push(Probed { part, near, far });
                }
                PathItem::Branch(items) => {
                    let items = self.path(items);
                    probed.push(PathItem::Branch(items));
                }
                PathItem::Receiver(_) => {
                    self.count += 1;
                    probed.push(item.clone());
                }
                item => probed.push(item.clone()),
            }
        }
        probed
    }

    fn probe(&mut self, path: &mut Vec<PathItem>) -> usize {
        path.push(PathItem::Receiver(Receiver {
            name: format!("{MARK}{}", self.count),
            part: Arc::clone(&self.part),
        }));
        self.count += 1;
        self.count - 1
    }
}
