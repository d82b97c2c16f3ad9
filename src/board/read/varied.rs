//! Nets whose quantities have tolerances, to be had again with other values.

use std::collections::BTreeMap;

use super::super::{Driver, Layer, Net, Plane, ReceiverPart};
use super::definitions::Definitions;
use super::net::NetReader;
use super::nets::OfDraws;
use crate::text::{Draw, Node, Noted, Report, Tolerance};

/// The nets of a board file that have tolerances, on what its other parts define.
///
/// A tolerance is one quantity at its place in the file: that of a part of a path is the net's own, that of a driver,
/// receiver or layer is one for all that use it, so two receivers of one kind on a net vary together.
#[derive(Debug, Clone, PartialEq)]
pub struct VariedNets {
    pub(super) plane: Option<Plane>,
    pub(super) layers: Definitions<Layer>,
    pub(super) drivers: Definitions<Driver>,
    pub(super) receivers: Definitions<ReceiverPart>,
    pub(super) by_name: BTreeMap<String, VariedNet>,
}

/// A net that has tolerances.
#[derive(Debug, Clone, PartialEq)]
pub struct VariedNet {
    node: Node,
    noted: Vec<Noted>,
    /// Its tolerances, those of its parts among them, in the order of reading.
    pub tolerances: Vec<NamedTolerance>,
}

/// A tolerance and what the user calls it.
#[derive(Debug, Clone, PartialEq)]
pub struct NamedTolerance {
    /// The keys that lead to it in the file: `strong-cmos rise`, `path item 1 series`.
    pub name: String,
    /// The tolerance.
    pub tolerance: Tolerance,
}

impl VariedNets {
    /// A net by its name; `None` where it has no tolerances.
    pub fn get(&self, net: &str) -> Option<&VariedNet> {
        self.by_name.get(net)
    }

    /// Whether no net has tolerances.
    pub fn is_empty(&self) -> bool {
        self.by_name.is_empty()
    }

    /// The net with other values: a standard normal score for each of its tolerances, in their order. Zero is nominal.
    ///
    /// # Errors
    ///
    /// Why the net is no net with these values, such as edges that do not fit into its clock.
    pub fn drawn(&self, net: &VariedNet, scores: &[f64]) -> Result<Net, String> {
        let report = Report::of_draw(Draw::new(&net.noted, scores));
        let reader = NetReader {
            report: &report,
            plane: self.plane,
            layers: &self.layers,
            drivers: &self.drivers,
            receivers: &self.receivers,
        };
        reader.net(&net.node)
    }

    /// Takes up a net and the tolerances that were met in reading it.
    pub(super) fn add(&mut self, name: &str, of_draws: OfDraws) {
        let OfDraws {
            node,
            is_of_file,
            tolerances: noted,
        } = of_draws;
        // A row of a table has none of its own, and its places are another file's.
        let own = |noted: &Noted| is_of_file.then(|| noted.way_from(&node)).flatten();
        let named = |noted: &Noted| NamedTolerance {
            name: own(noted)
                .or_else(|| self.drivers.name_of(noted))
                .or_else(|| self.receivers.name_of(noted))
                .or_else(|| self.layers.name_of(noted))
                .unwrap_or_default(),
            tolerance: noted.tolerance,
        };
        let net = VariedNet {
            tolerances: noted.iter().map(named).collect(),
            node,
            noted,
        };
        self.by_name.insert(name.to_owned(), net);
    }
}

#[cfg(test)]
mod tests {
    use super::super::super::{Board, PathItem};
    use super::super::{Reading, read_board};
    use super::*;

    const BOARD: &str = "\
stackup:
  outer: {microstrip: {height: 4 mil +/- 10 %, permittivity: 4.3 +/- 0.2 normal}}
  exact: {microstrip: {height: 4 mil, permittivity: 4.3}}
drivers:
  strong: {swing: 3.3 V, resistance: 3 ohm, rise: 0.8 ns +/- 0.2 ns}
  cornered:
    swing: 3.3 V
    resistance: {high: 6 ohm, low: 4 ohm}
    rise: 0.8 ns
    corners: {fast: {swing: 3.6 V, resistance: 2 ohm, rise: 0.5 ns}, slow: {rise: 1.2 ns}}
receivers:
  input: {capacitance: 5 pF +/- 20 %, clamps: {knee: 0.7 V, resistance: 10 ohm +/- 50 %, supply: 3.3 V}}
nets:
  - name: A
    driver: strong
    clock: 48 MHz
    path:
      - series: 33 ohm +/- 5 %
      - trace: {layer: outer, width: 4 mil +/- 0.5 mil, length: 6 in}
      - branch: [{trace: {layer: outer, width: 4 mil, length: 1 in}}, {receiver: input}]
      - receiver: input
  - {name: B, driver: cornered, clock: 48 MHz, path: [{trace: {layer: exact, width: 4 mil, length: 6 in}}]}
";

    fn read(text: &str) -> Reading {
        let reading = read_board(text, "board.yaml");
        let is_sound = reading.unusable.is_empty() && reading.board.is_some();
        assert!(is_sound, "{:?}", reading.diagnostics);
        reading
    }

    fn nominal(text: &str) -> (Board, VariedNets) {
        let reading = read(text);
        (reading.board.unwrap(), reading.varied.unwrap())
    }

    #[test]
    fn the_nominal_board_is_that_without_tolerances() {
        let exact = BOARD
            .replace(" +/- 10 %", "")
            .replace(" +/- 0.2 normal", "")
            .replace(" +/- 0.2 ns", "")
            .replace(" +/- 20 %", "")
            .replace(" +/- 50 %", "")
            .replace(" +/- 5 %", "")
            .replace(" +/- 0.5 mil", "");
        let start = exact.find("    corners:").unwrap();
        let end = exact.find("receivers:").unwrap();
        let exact = format!("{}{}", &exact[..start], &exact[end..]);
        assert!(!exact.contains("+/-") && !exact.contains("corners"));
        let reading = read(&exact);
        assert_eq!(reading.varied, None);
        assert_eq!(reading.board.unwrap(), nominal(BOARD).0);
    }

    #[test]
    fn tolerances_are_called_after_their_way_in_the_file_each_once() {
        let (_, varied) = nominal(BOARD);
        let names = |net: &str| {
            let tolerances = &varied.get(net).unwrap().tolerances;
            let names: Vec<&str> = tolerances.iter().map(|t| t.name.as_str()).collect();
            names.join(", ")
        };
        assert_eq!(
            names("A"),
            "strong rise, path item 1 series, outer microstrip height, outer microstrip permittivity, \
             path item 2 trace width, input capacitance, input clamps resistance"
        );
        assert_eq!(names("B"), "cornered corners");
    }

    #[test]
    fn scores_move_what_they_belong_to_and_nothing_else() {
        let (board, varied) = nominal(BOARD);
        let net = varied.get("A").unwrap();
        let mut scores = [0.0; 7];
        assert_eq!(varied.drawn(net, &scores).as_ref(), Ok(&board.nets[0]));
        scores[1] = 8.0;
        scores[3] = 2.0;
        let drawn = varied.drawn(net, &scores).unwrap();
        let PathItem::Series(series) = &drawn.path[0] else {
            panic!("a series part")
        };
        assert!((series.resistance_ohm - 33.0 * 1.05).abs() < 1e-9);
        let PathItem::Trace(trace) = &drawn.path[1] else {
            panic!("a trace")
        };
        assert!((trace.layer.permittivity - 4.5).abs() < 1e-12);
        let (mut drawn, stated) = (drawn, &board.nets[0]);
        assert_eq!(drawn.driver, stated.driver);
        drawn.path[..3].clone_from_slice(&stated.path[..3]);
        assert_eq!(&drawn, stated);
    }

    #[test]
    fn a_driver_runs_from_corner_to_corner() {
        let (board, varied) = nominal(BOARD);
        let net = varied.get("B").unwrap();
        let driver = |score: f64| varied.drawn(net, &[score]).unwrap().driver;
        assert_eq!(driver(0.0), board.nets[1].driver);
        let fast = driver(9.0);
        assert_eq!(
            (fast.high_v, fast.rise_s, fast.fall_s),
            (3.6, 0.5e-9, 0.5e-9)
        );
        assert_eq!(
            (fast.low_resistance_ohm, fast.high_resistance_ohm),
            (2.0, 2.0)
        );
        let slow = driver(-9.0);
        assert_eq!((slow.high_v, slow.rise_s), (3.3, 1.2e-9));
        assert_eq!(slow.high_resistance_ohm, 6.0);
        // Phi(0.6745) = 3/4: half of the way from what is stated to the fast corner.
        let between = driver(0.674_489_75);
        assert!((between.rise_s - 0.65e-9).abs() < 1e-15);
        assert!((between.high_resistance_ohm - 4.0).abs() < 1e-6);
    }

    #[test]
    fn a_draw_that_makes_no_net_says_why() {
        let (_, varied) = nominal(&BOARD.replace("48 MHz", "500 MHz"));
        let net = varied.get("A").unwrap();
        let scores = [4.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0];
        let reason = varied.drawn(net, &scores).unwrap_err();
        assert!(
            reason.starts_with("the edges of driver `strong` do not fit"),
            "{reason}"
        );
    }
}
