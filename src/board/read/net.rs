//! A net: its driver, clock and path.

use std::cell::RefCell;
use std::sync::Arc;

use super::super::{Along, Driver, Group, Layer, Net, Phase, Plane, ReceiverPart};
use super::antenna::in_mm;
use super::definitions::{Definitions, Part, Unavailable};
use super::path::PathReader;
use crate::text::{Dimension, Fields, Node, Range, Report, alternatives, near_miss};

const DEFAULT_DUTY: f64 = 0.5;
/// Rounding that a comparison of times and lengths allows for.
const ROUNDING: f64 = 1e-9;

/// Reads nets against what the rest of the board file defines.
pub(super) struct NetReader<'r> {
    pub(super) report: &'r Report<'r>,
    pub(super) plane: Option<Plane>,
    pub(super) layers: &'r Definitions<Layer>,
    pub(super) drivers: &'r Definitions<Driver>,
    pub(super) receivers: &'r Definitions<ReceiverPart>,
}

impl NetReader<'_> {
    /// Reads one net; the error says why it is unusable.
    pub(super) fn net(&self, node: &Node) -> Result<Net, String> {
        let unreadable = RefCell::new(None);
        self.report
            .attempt(|| self.read(node, &unreadable))
            .map_err(|reported| {
                reported
                    .or(unreadable.take())
                    .unwrap_or_else(|| "cannot be read".into())
            })
    }

    fn read(&self, node: &Node, unreadable: &RefCell<Option<String>>) -> Option<Net> {
        const FIELDS: [&str; 11] = [
            "name",
            "driver",
            "setting",
            "clock",
            "duty",
            "path",
            "edge_distance",
            "along",
            "count",
            "clock_source",
            "phase",
        ];
        const ALONG: [(&str, Along); 2] = [("length", Along::Length), ("width", Along::Width)];
        let mut fields = self.report.fields(node, "the net", &FIELDS)?;
        let name = fields.require_name("name");
        if let Some(name) = &name {
            fields.owner = format!("net `{name}`");
        }
        let driver = fields
            .require_name("driver")
            .and_then(|name| self.find(self.drivers, fields.get("driver")?, &name, unreadable))
            .and_then(|driver| set(&fields, driver));
        // Each draw would have lines, and an antenna, of its own.
        let clock_hz = self.report.refusing_tolerances(
            "the lines of a net stay where they are in all draws",
            || fields.require_quantity("clock", Dimension::Frequency, Range::Positive),
        );
        let duty = self.duty(&fields);
        if let (Some(driver), Some(clock_hz), Some(duty)) = (&driver, clock_hz, duty) {
            edges_fit(&fields, driver, clock_hz, duty);
        }
        let along = fields.choice("along", &ALONG).unwrap_or_default();
        let edge_distance_m = self.edge_distance(&fields, along);
        let group = self.group(&fields);
        let path = fields
            .require("path", "a list of items outwards from the driver")
            .and_then(|node| PathReader::new(self, unreadable).path(node, &fields.owner));
        Some(Net {
            name: name?,
            driver: driver?,
            clock_hz: clock_hz?,
            duty: duty?,
            path: path?,
            edge_distance_m,
            along,
            group,
        })
    }

    /// Finds a part, and keeps it in mind where the part itself cannot be read.
    pub(super) fn find<T: Part>(
        &self,
        definitions: &Definitions<T>,
        node: &Node,
        name: &str,
        unreadable: &RefCell<Option<String>>,
    ) -> Option<Arc<T>> {
        match definitions.find(self.report, node, name) {
            Ok(part) => Some(part),
            Err(Unavailable::Undefined) => None,
            Err(Unavailable::Unreadable(reason)) => {
                unreadable.borrow_mut().get_or_insert(reason);
                None
            }
        }
    }

    fn duty(&self, fields: &Fields) -> Option<f64> {
        let Some(node) = fields.get("duty") else {
            return Some(DEFAULT_DUTY);
        };
        let duty = fields.quantity("duty", Dimension::Share, Range::Any)?;
        if duty > 0.0 && duty < 1.0 {
            return Some(duty);
        }
        let message = format!("{} cannot be {}", fields.called("duty"), node.describe());
        self.report.error(node, message, |d| {
            d.expected("more than 0 % and less than 100 %")
        });
        None
    }

    /// How many lines the net stands for, and what they keep step with.
    fn group(&self, fields: &Fields) -> Group {
        const PHASES: [(&str, Phase); 2] = [
            ("locked", Phase::Locked),
            ("independent", Phase::Independent),
        ];
        const MOST: f64 = 10_000.0;
        let count = fields.quantity("count", Dimension::Number, Range::AtLeastOne);
        if let (Some(count), Some(node)) = (count, fields.get("count"))
            && (count.fract() != 0.0 || count > MOST)
        {
            let message = format!("{} cannot be {}", fields.called("count"), node.describe());
            self.report.error(node, message, |d| {
                d.expected("a whole number of lines from 1 to 10000")
            });
        }
        Group {
            count: count.map_or(1, |count| count as u32),
            clock_source: fields.name("clock_source").map(Arc::from),
            phase: fields.choice("phase", &PHASES).unwrap_or_default(),
        }
    }

    /// The distance of a straight path from the nearest edge of the plane.
    fn edge_distance(&self, fields: &Fields, along: Along) -> Option<f64> {
        let distance_m = fields.quantity("edge_distance", Dimension::Length, Range::NotNegative)?;
        if let (Some(plane), Some(node)) = (self.plane, fields.get("edge_distance")) {
            let across_m = match along {
                Along::Length => plane.width_m,
                Along::Width => plane.length_m,
            };
            if distance_m > across_m / 2.0 * (1.0 + ROUNDING) {
                let called = fields.called("edge_distance");
                let message = format!("{called} is more than half of the plane");
                let expected =
                    format!("at most {}: the nearest edge counts", in_mm(across_m / 2.0));
                self.report
                    .error(node, message, |diagnostic| diagnostic.expected(expected));
            }
        }
        Some(distance_m)
    }
}

/// The driver in the setting that the net asks for.
fn set(fields: &Fields, driver: Arc<Driver>) -> Option<Arc<Driver>> {
    let Some(node) = fields.get("setting") else {
        return Some(driver);
    };
    let name = fields.name("setting")?;
    if let Some(set) = driver.with_setting(&name) {
        return Some(Arc::new(set));
    }
    let known: Vec<&str> = driver.settings.iter().map(|s| s.name.as_str()).collect();
    let message = format!("driver `{}` has no setting `{name}`", driver.name);
    let expected = match known.as_slice() {
        [] => "no `setting`: the driver defines no `settings`".into(),
        known => format!("one that it defines: {}", alternatives(known, "or")),
    };
    fields.report.error(node, message, |diagnostic| {
        diagnostic
            .expected(expected)
            .near_miss(near_miss(&name, known))
    });
    None
}

/// Reports edges that do not fit into the high or the low time.
fn edges_fit(fields: &Fields, driver: &Driver, clock_hz: f64, duty: f64) {
    // Between the 50 % points lie half of the one edge and half of the other.
    let needed_s = (driver.full_rise_s() + driver.full_fall_s()) / 2.0;
    let (name, time_s) = if duty <= 0.5 {
        ("high", duty / clock_hz)
    } else {
        ("low", (1.0 - duty) / clock_hz)
    };
    if time_s < needed_s * (1.0 - ROUNDING) {
        let message = format!(
            "the edges of driver `{}` do not fit into the {name} time of {}: they need {:.3} ns of its {:.3} ns",
            driver.name,
            fields.owner,
            needed_s * 1e9,
            time_s * 1e9,
        );
        fields.error(
            message,
            "a slower clock, a duty nearer to 50 % or faster edges",
        );
    }
}
