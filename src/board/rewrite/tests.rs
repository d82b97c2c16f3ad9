use super::*;
use std::sync::Arc;

const HEAD: &str = "\
drivers:
  d: {swing: 3.3 V, resistance: 10 ohm, rise: 1 ns, settings: {slow: {rise: 4 ns}, slower: {rise: 5 ns}}}
receivers:
  r: {capacitance: 2 pF}
";

const BLOCK: &str = "\
nets:
  # The first net.
  - name: A       # its name
    driver: d
    clock: 10 MHz
    path:
      # outwards
      - series: 33 ohm      # the old one
      - line: {impedance: 50 ohm, delay: 1 ns}
      - branch:
          - line: {impedance: 50 ohm, delay: 1 ns}
          - receiver: {part: r, name: U1}
      - shunt:
          resistance: 100 ohm
          to: 3.3 V
      # the end
      - receiver: r

  - name: B
    driver: d
    setting: slower   # as slow as it goes
    clock: 10 MHz
    path:
      - receiver: r";

const FLOW: &str = "\
nets:
  - {name: A, driver: d, clock: 10 MHz, path: [{series: 33 ohm}, {line: {impedance: 50 ohm, delay: 1 ns}}, branch: [{receiver: {part: r, name: 'U}1'}}], {receiver: r}, {shunt: {resistance: 100 ohm}}]}
  - {name: B, driver: d, clock: 10 MHz, path: [{receiver: r}]}
";

fn nets(text: &str) -> Vec<Net> {
    let reading = read_board(text, "test");
    assert_eq!(reading.diagnostics, []);
    reading.board.unwrap().nets
}

fn series(ohm: f64) -> PathItem {
    PathItem::Series(Series {
        resistance_ohm: ohm,
        inductance_h: 0.0,
    })
}

fn end(ohm: f64) -> PathItem {
    PathItem::Shunt(Shunt {
        resistance_ohm: ohm,
        capacitance_f: Some(100e-12),
        inductance_h: 0.0,
        to_v: 1.65,
    })
}

/// Another resistor, one in the branch, none at the end, and an RC there.
fn changed(text: &str) -> Net {
    let mut net = nets(text).remove(0);
    net.path
        .retain(|item| !matches!(item, PathItem::Series(_) | PathItem::Shunt(_)));
    for item in &mut net.path {
        if let PathItem::Branch(items) = item {
            items.insert(0, series(22.0));
            items.push(end(68.0));
        }
    }
    net.path.insert(0, series(4.7));
    net.path.push(end(47.0));
    net
}

#[test]
fn a_list_behind_dashes_keeps_its_comments() {
    let text = format!("{HEAD}{BLOCK}");
    let new = rewrite_board(&text, "test", &[changed(&text)], "why").unwrap();
    assert!(new.starts_with("# why\n"));
    for line in [
        "  - name: A       # its name",
        "      # outwards",
        "      # taken out: - series: 33 ohm      # the old one",
        "      - series: 4.7 ohm  # put in",
        "          - series: 22 ohm  # put in",
        "          - shunt: {resistance: 68 ohm, capacitance: 100 pF, to: 1.65 V}  # put in",
        "      # taken out: - shunt:",
        "      # taken out:     resistance: 100 ohm",
        "      # the end",
        "      - shunt: {resistance: 47 ohm, capacitance: 100 pF, to: 1.65 V}  # put in",
    ] {
        assert!(new.lines().any(|other| other == line), "{line}\n{new}");
    }
    assert_eq!(nets(&new)[0], changed(&text));
}

#[test]
fn a_list_between_brackets_is_rewritten_too() {
    let text = format!("{HEAD}{FLOW}");
    let new = rewrite_board(&text, "test", &[changed(&text)], "why").unwrap();
    assert_eq!(nets(&new)[0], changed(&text));
    assert_eq!(nets(&new)[1], nets(&text)[1]);
}

#[test]
fn a_setting_is_put_beside_the_driver_or_exchanged() {
    for body in [BLOCK, FLOW] {
        let text = format!("{HEAD}{body}");
        let mut wanted = nets(&text);
        for net in &mut wanted {
            net.driver = Arc::new(net.driver.with_setting("slow").unwrap());
        }
        let new = rewrite_board(&text, "test", &wanted, "why").unwrap();
        assert_eq!(nets(&new), wanted, "{new}");
        let comment = "# as slow as it goes";
        assert_eq!(new.contains(comment), text.contains(comment));
    }
}

#[test]
fn lines_keep_their_ends() {
    let text = format!("{HEAD}{BLOCK}").replace('\n', "\r\n");
    let new = rewrite_board(&text, "test", &[changed(&text)], "why").unwrap();
    assert_eq!(new.matches('\n').count(), new.matches("\r\n").count());
    assert_eq!(nets(&new)[0], changed(&text));
}

#[test]
fn what_cannot_be_written_is_refused() {
    let text = format!("{HEAD}{BLOCK}");
    let mut net = nets(&text).remove(0);
    net.clock_hz = 11e6;
    let error = rewrite_board(&text, "test", &[net], "why").unwrap_err();
    assert!(error.to_string().contains("net `A`"), "{error}");

    // Two nets that share one path through an alias cannot be changed apart.
    let shared = format!(
        "{HEAD}nets:
  - {{name: A, driver: d, clock: 10 MHz, path: &p [{{receiver: r}}]}}
  - {{name: B, driver: d, clock: 10 MHz, path: *p}}
"
    );
    let mut net = nets(&shared).remove(0);
    net.path.insert(0, series(33.0));
    assert!(rewrite_board(&shared, "test", &[net], "why").is_err());
}
