//! Limit files.

use super::{Band, Detector, Limit};
use crate::text::{
    Diagnostic, Dimension, Fields, Node, Range, Report, Value, alternatives, parse_yaml,
};

const DETECTORS: [(&str, Detector); 3] = [
    ("quasi-peak", Detector::QuasiPeak),
    ("average", Detector::Average),
    ("peak", Detector::Peak),
];

/// Reads a limit file.
///
/// # Errors
///
/// Everything that is wrong with it.
pub fn read_limit(text: &str, file_name: &str) -> Result<Limit, Vec<Diagnostic>> {
    let document = parse_yaml(text, file_name).map_err(|error| vec![*error])?;
    let report = Report::new(&document);
    let limit = report.attempt(|| limit(&report, &document.root));
    limit.map_err(|_| report.into_diagnostics())
}

fn limit(report: &Report, root: &Node) -> Option<Limit> {
    const EXPECTED: &str =
        "a list of bands such as `- {from: 30 MHz, to: 88 MHz, limit: 100 uV/m}`";
    let known = ["title", "source", "distance", "detector", "bands"];
    if root.has_key("nets") {
        let message = "this is a board file, not a limit file";
        report.error(root, message, |d| d.expected(alternatives(&known, "and")));
        return None;
    }
    let fields = report.fields(root, "the limit", &known)?;
    let title = fields.require_name("title");
    let source = fields.name("source");
    let distance_m = fields.require_quantity("distance", Dimension::Length, Range::Positive);
    let detector = fields
        .require("detector", "`quasi-peak`, `average` or `peak`")
        .and_then(|_| fields.choice("detector", &DETECTORS));
    let node = fields.require("bands", EXPECTED)?;
    let nodes = report.list(node, "bands of the limit", EXPECTED)?;
    if nodes.is_empty() {
        report.error(node, "the limit has no bands", |d| d.expected(EXPECTED));
    }
    let bands = nodes.iter().map(|node| Some((node, band(report, node)?)));
    let mut bands: Vec<(&Node, Band)> = bands
        .collect::<Vec<_>>()
        .into_iter()
        .collect::<Option<_>>()?;
    bands.sort_by(|(_, a), (_, b)| a.from_hz.total_cmp(&b.from_hz));
    for pair in bands.windows(2) {
        let [(_, lower), (node, upper)] = pair else {
            continue;
        };
        if upper.from_hz < lower.to_hz {
            report.error(*node, "the band overlaps another one", |diagnostic| {
                diagnostic.expected("bands that share no more than their edges")
            });
        }
    }
    Some(Limit {
        title: title?,
        source,
        distance_m: distance_m?,
        detector: detector?,
        bands: bands.into_iter().map(|(_, band)| band).collect(),
    })
}

fn band(report: &Report, node: &Node) -> Option<Band> {
    let fields = report.fields(node, "the band", &["from", "to", "limit", "detector"])?;
    let from_hz = fields.require_quantity("from", Dimension::Frequency, Range::Positive);
    let to_hz = fields.require_quantity("to", Dimension::Frequency, Range::Positive);
    let levels = levels(&fields);
    let detector = fields.choice("detector", &DETECTORS);
    let (from_hz, to_hz) = (from_hz?, to_hz?);
    if from_hz >= to_hz {
        fields.error("the band ends before it starts", "`from` below `to`");
        return None;
    }
    let (from_dbuv_per_m, to_dbuv_per_m) = levels?;
    Some(Band {
        from_hz,
        to_hz,
        from_dbuv_per_m,
        to_dbuv_per_m,
        detector,
    })
}

/// The limit at the two edges of a band.
fn levels(band: &Fields) -> Option<(f64, f64)> {
    const EXPECTED: &str = "a field strength such as `40 dBuV/m` or `100 uV/m`, or two in a list";
    let level = |node, name: &str| {
        band.report
            .quantity(node, name, Dimension::FieldStrength, Range::Any)
    };
    let node = band.require("limit", EXPECTED)?;
    let called = band.called("limit");
    let Value::List(ends) = &node.value else {
        let level = level(node, &called)?;
        return Some((level, level));
    };
    let [from, to] = ends.as_slice() else {
        let message = format!("{called} has {} values", ends.len());
        band.report.error(node, message, |d| d.expected(EXPECTED));
        return None;
    };
    let (from, to) = (level(from, &called), level(to, &called));
    Some((from?, to?))
}
