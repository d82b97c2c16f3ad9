use std::sync::atomic::{AtomicUsize, Ordering};

use super::*;
use crate::board::{Board, read_board};
use crate::limit::default_limits;
use crate::radiation::Site;

const PARTS: &str = "\
stackup: {outer: {microstrip: {height: 4 mil, permittivity: 4.3}}, deep: {microstrip: {height: 12 mil, permittivity: 4.3}}}
drivers: {strong: {swing: 3.3 V, resistance: 3 ohm, rise: 0.8 ns}, weak: {swing: 3.3 V, resistance: 60 ohm, rise: 3 ns}}
receivers: {input: {capacitance: 5 pF}}
cables: []
nets:
";

fn net(name: &str, more: &str) -> String {
    format!(
        "  - {{name: {name}, driver: strong, clock: 48 MHz, {more}path: [trace: {{layer: outer, width: 4 mil, length: 6 in}}, receiver: input]}}\n"
    )
}

fn board(nets: &[String]) -> Board {
    let reading = read_board(&format!("{PARTS}{}", nets.concat()), "board.yaml");
    assert!(reading.diagnostics.is_empty(), "{:?}", reading.diagnostics);
    reading.board.unwrap()
}

fn setup() -> CheckSetup {
    CheckSetup {
        limits: default_limits(),
        distances_m: vec![3.0, 10.0],
        site: Site::OpenArea,
        heights: crate::radiation::Heights::default(),
        lowest_frequency_hz: 30e6,
        top_frequency_hz: 1e9,
        model_sigma_db: 5.0,
    }
}

fn ranked(nets: &[String]) -> Ranking {
    rank(
        &board(nets),
        &setup(),
        &Filter::default(),
        None,
        (None, 0),
        &Unwatched,
    )
}

/// By how much each level of the sum lies over that of one net alone.
fn over_one(nets: &[String]) -> Vec<[f64; 2]> {
    let alone = ranked(&[net("A", "")]).sum;
    let sum = ranked(nets).sum;
    assert_eq!(alone.lines.len(), sum.lines.len());
    let lines = alone.lines.iter().zip(&sum.lines);
    lines
        .flat_map(|(one, all)| one.levels.iter().zip(&all.levels))
        .map(|(one, all)| {
            let (one, all) = (one.as_ref().unwrap(), all.as_ref().unwrap());
            [
                all.field_dbuv_per_m - one.field_dbuv_per_m,
                all.by_power_dbuv_per_m - one.field_dbuv_per_m,
            ]
        })
        .collect()
}

#[track_caller]
fn all_are(levels: &[[f64; 2]], in_step_db: f64, by_power_db: f64) {
    assert!(!levels.is_empty());
    for level in levels {
        assert!((level[0] - in_step_db).abs() < 1e-9, "{level:?}");
        assert!((level[1] - by_power_db).abs() < 1e-9, "{level:?}");
    }
}

/// Two in-phase lines in one bandwidth, 0 dB apart: +6.02 dB (Paul, Introduction to Electromagnetic Compatibility,
/// table 3.3); N of them 20 log N.
#[test]
fn equal_nets_of_one_source_add_their_fields() {
    let db = |factor: f64| 20.0 * factor.log10();
    let nets = |count: usize, more: &str| -> Vec<String> {
        (0..count).map(|n| net(&format!("N{n}"), more)).collect()
    };
    all_are(&over_one(&nets(2, "")), db(2.0), db(2.0_f64.sqrt()));
    assert!((db(2.0) - 6.02).abs() < 0.005);
    all_are(
        &over_one(&nets(7, "clock_source: x, ")),
        db(7.0),
        db(7.0_f64.sqrt()),
    );
    // One net that stands for seven is the same.
    all_are(&over_one(&[net("BUS", "count: 7, ")]), db(7.0), db(7.0));
}

/// Paul, table 3.3: lines 3, 6 and 10 dB apart add 4.65, 3.53 and 2.39 dB to the larger one.
#[test]
fn unequal_nets_of_one_source_add_their_fields() {
    for (apart_db, gain_db) in [(3.0, 4.65), (6.0, 3.53), (10.0, 2.39)] {
        let result = ranked_result();
        let mut weaker = result.clone();
        for field in weaker.harmonics.iter_mut().flat_map(|h| &mut h.fields) {
            field.field_dbuv_per_m = field.field_dbuv_per_m.map(|level| level - apart_db);
        }
        let board = board(&[net("A", ""), net("B", "")]);
        let mut summing = Summing::new(&setup().distances_m);
        summing.add(0, &board.nets[0], &result);
        summing.add(1, &board.nets[1], &weaker);
        let sum = summing.finish(&board, &limits_of(&setup()), &setup());
        for (line, harmonic) in sum.lines.iter().zip(&result.harmonics) {
            let level = line.levels[0].as_ref().unwrap();
            let gain = level.field_dbuv_per_m - harmonic.fields[0].field_dbuv_per_m.unwrap();
            assert!((gain - gain_db).abs() < 0.01, "{apart_db}: {gain}");
            // Without the larger one the smaller is left.
            assert_eq!(level.owners[0].net, "A");
            assert!((level.owners[0].relief_db - gain_db - apart_db).abs() < 0.01);
        }
    }
}

fn ranked_result() -> NetResult {
    let board = board(&[net("A", "")]);
    let antenna = antenna(&board, &[0], &setup(), &Unwatched);
    worked_out(&board.nets, &board, antenna.as_ref(), &setup(), &Unwatched).remove(0)
}

#[test]
fn independent_nets_and_other_sources_add_their_powers() {
    let db = |factor: f64| 10.0 * factor.log10();
    let free = |n: usize| net(&format!("N{n}"), "phase: independent, ");
    let source = |n: usize| net(&format!("S{n}"), &format!("clock_source: s{n}, "));
    all_are(&over_one(&[free(0), free(1), free(2)]), db(3.0), db(3.0));
    all_are(&over_one(&[source(0), source(1)]), db(2.0), db(2.0));
    let bus = net("BUS", "count: 5, phase: independent, ");
    all_are(&over_one(&[bus]), db(5.0), db(5.0));
    // Two in step beside one that is not: 4 + 1 powers.
    let mixed = [net("A", ""), net("B", ""), free(0)];
    all_are(&over_one(&mixed), db(5.0), db(3.0));
}

#[test]
fn clocks_of_one_source_meet_where_their_harmonics_do() {
    let half = net("HALF", "clock_source: pll, ").replace("48 MHz", "24 MHz");
    let of_sources = |other: &str| {
        let whole = net("WHOLE", &format!("clock_source: {other}, "));
        ranked(&[whole, half.clone()]).sum
    };
    let (one, two) = (of_sources("pll"), of_sources("other"));
    let mut stronger = 0;
    for (one, two) in one.lines.iter().zip(&two.lines) {
        let (one, two) = (
            one.levels[0].as_ref().unwrap(),
            two.levels[0].as_ref().unwrap(),
        );
        if one.nets == 2 {
            assert!(one.field_dbuv_per_m > two.field_dbuv_per_m);
            stronger += 1;
        }
    }
    assert_eq!(stronger, 20, "48 MHz has 20 harmonics from 30 MHz to 1 GHz");
}

/// Everything that may be printed.
fn told(ranking: &Ranking) -> String {
    format!("{ranking:?}")
}

#[test]
fn the_order_of_the_file_and_the_number_of_threads_change_nothing() {
    let mut nets: Vec<String> = (0..300)
        .map(|n: usize| {
            let length_mm = 20 + n * 37 % 120;
            // Some are equal but for their names.
            let length = format!("length: {length_mm} mm");
            let driver = if n.is_multiple_of(3) {
                "strong"
            } else {
                "weak"
            };
            net(
                &format!("N{n}"),
                if n.is_multiple_of(5) {
                    "count: 3, "
                } else {
                    ""
                },
            )
            .replace("48 MHz", ["48 MHz", "24 MHz", "33 MHz"][n % 3])
            .replace("length: 6 in", &length)
            .replace("driver: strong", &format!("driver: {driver}"))
        })
        .collect();
    let with_threads = |threads: usize, nets: &[String]| {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build();
        pool.unwrap().install(|| told(&ranked(nets)))
    };
    let first = with_threads(1, &nets);
    assert!(first.contains("N299"));
    assert!(first == with_threads(2, &nets));
    nets.reverse();
    nets.swap(3, 250);
    assert!(first == with_threads(2, &nets));
}

#[test]
fn the_worst_come_first_and_filters_only_choose_what_is_listed() {
    let nets = [
        net("QUIET", "").replace("strong", "weak"),
        net("LOUD", "count: 16, "),
        net("DEEP", "clock_source: pll, ").replace("outer", "deep"),
    ];
    let all = ranked(&nets);
    let names = |ranking: &Ranking| -> Vec<String> {
        ranking.listed.iter().map(|net| net.name.clone()).collect()
    };
    assert_eq!(names(&all), ["LOUD", "DEEP", "QUIET"]);
    assert_eq!(all.tally.likely_fail, 2);
    let board = board(&nets);
    let listed = |filter: Filter, top| rank(&board, &setup(), &filter, top, (None, 0), &Unwatched);
    let deep = listed(
        Filter {
            layers: vec!["deep".into()],
            ..Filter::default()
        },
        None,
    );
    assert_eq!(
        (names(&deep), deep.listed[0].place, deep.kept),
        (vec!["DEEP".into()], 2, 1)
    );
    assert_eq!(deep.tally, all.tally);
    assert_eq!(deep.sum.lines, all.sum.lines);
    let likely_pass = listed(
        Filter {
            verdicts: vec![all.listed[2].verdict],
            ..Filter::default()
        },
        None,
    );
    assert_eq!(names(&likely_pass), ["QUIET"]);
    let by_source = Filter {
        clock_sources: vec!["pll".into()],
        names: vec!["D*".into(), "L*".into()],
        clocks_hz: vec![48.000_001e6],
        ..Filter::default()
    };
    assert_eq!(names(&listed(by_source, None)), ["DEEP"]);
    assert_eq!(names(&listed(Filter::default(), Some(1))), ["LOUD"]);
}

#[test]
fn the_change_that_helps_is_found_by_trying() {
    let ranking = ranked(&[net("OPEN", "count: 4, ")]);
    let open = &ranking.listed[0];
    let best = &open.changes[0];
    assert!(best.gain_db > 3.0, "{:?}", open.changes);
    assert!(open.changes.iter().any(|change| matches!(
        change.remedy,
        Remedy::SeriesResistor { resistance_ohm } if (47.0..=68.0).contains(&resistance_ohm)
    )));
    // What is promised is what the net so changed would get.
    let resistor = open.changes.iter().find_map(|change| match change.remedy {
        Remedy::SeriesResistor { resistance_ohm } => Some((resistance_ohm, change.margin_db)),
        _ => None,
    });
    let (resistance_ohm, promised_db) = resistor.unwrap();
    let path = format!("path: [series: {resistance_ohm} ohm, trace");
    let changed = ranked(&[net("OPEN", "count: 4, ").replace("path: [trace", &path)]);
    let margin_db = changed.listed[0].worst.as_ref().unwrap().margin_db;
    assert!((margin_db - promised_db).abs() < 1e-9);
}

#[test]
fn a_resistor_that_would_spoil_the_signal_is_not_offered() {
    let ended = net("ENDED", "count: 16, ").replace(
        "receiver: input]",
        "receiver: input, shunt: {resistance: 25 ohm}]",
    );
    let ranking = ranked(&[ended]);
    let changes = &ranking.listed[0].changes;
    assert!(!changes.is_empty());
    assert!(
        !changes
            .iter()
            .any(|change| matches!(change.remedy, Remedy::SeriesResistor { .. }))
    );
}

/// Stops after so many nets.
struct StopsAfter(usize, AtomicUsize);

impl Watch for StopsAfter {
    fn begin(&self, _: &'static str, _: usize) {}

    fn step(&self) {
        self.1.fetch_add(1, Ordering::Relaxed);
    }

    fn is_stopped(&self) -> bool {
        self.1.load(Ordering::Relaxed) >= self.0
    }
}

#[test]
fn what_is_finished_when_stopped_is_ranked_and_said_to_be_partial() {
    let nets: Vec<String> = (0..300).map(|n| net(&format!("N{n}"), "")).collect();
    let board = board(&nets);
    let stopped_after = |count| {
        let watch = StopsAfter(count, AtomicUsize::new(0));
        rank(
            &board,
            &setup(),
            &Filter::default(),
            Some(3),
            (None, 0),
            &watch,
        )
    };
    let part = stopped_after(1);
    assert!(part.is_partial());
    assert_eq!((part.done, part.of, part.listed.len()), (CHUNK, 300, 3));
    assert!(part.sum.worst.is_some());
    // All nets are done, but no change is tried any more.
    let unchanged = stopped_after(300);
    assert_eq!((unchanged.done, unchanged.is_partial()), (300, true));
    let none = stopped_after(0);
    assert_eq!((none.done, none.listed.len()), (0, 0));
    assert!(none.sum.worst.is_none());
}
