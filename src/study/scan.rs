//! What the antenna reads of a net at every place of the open-area site.

use super::check::{RungNet, ring};
use super::{CheckSetup, NetResult, Watch, Worst};
use crate::board::{Along, Board, Orientation};
use crate::radiation::{Antenna, FLOOR_ABSORBED_ABOVE_HZ, OwnPlane, ScanMap, Site};
use rayon::prelude::*;

/// The scans of several nets.
#[derive(Debug, Clone, PartialEq)]
pub struct Scans {
    /// The nets that have one, in their order.
    pub nets: Vec<NetScan>,
    /// Why others have none, in plain sentences.
    pub left_out: Vec<String>,
}

/// The readings of a net's worst harmonic.
#[derive(Debug, Clone, PartialEq)]
pub struct NetScan {
    /// The net's name.
    pub name: String,
    /// The reading that it is about.
    pub worst: Worst,
    /// What the antenna reads at every place.
    pub map: ScanMap,
    /// Which of the plane's sides the turntable's angle counts from.
    pub zero_along: Along,
}

/// The readings of each net's worst harmonic over antenna height and turntable angle.
pub fn scan_nets(
    board: &Board,
    results: &[NetResult],
    setup: &CheckSetup,
    watch: &dyn Watch,
) -> Scans {
    let none = |why: &str| Scans {
        nets: Vec::new(),
        left_out: vec![format!("no scan is shown: {why}")],
    };
    let Some(plane) = &board.plane else {
        return none(
            "the file gives no `plane`, and without one it is not known which way the board sends",
        );
    };
    if setup.site == Site::FreeSpace {
        return none("in free space there is neither a turntable nor an antenna mast");
    }
    let mut above = Vec::new();
    let mut unjudged = Vec::new();
    let mut asked: Vec<(RungNet, &Worst, &str)> = Vec::new();
    for result in results {
        let net = board.nets.iter().find(|net| net.name == result.name);
        match (net, &result.worst) {
            (_, Some(worst)) if worst.frequency_hz > FLOOR_ABSORBED_ABOVE_HZ => {
                above.push(result.name.as_str());
            }
            (Some(net), Some(worst)) => asked.push((ring(net, board, setup), worst, &result.name)),
            _ => unjudged.push(result.name.as_str()),
        }
    }
    let mut frequencies_hz: Vec<f64> = asked.iter().map(|(_, w, _)| w.frequency_hz).collect();
    frequencies_hz.sort_by(f64::total_cmp);
    frequencies_hz.dedup();
    let cables = board.cables.as_deref().unwrap_or_default();
    let antenna = OwnPlane::new(plane, cables, setup.test_site(), &frequencies_hz, watch);
    // As in [`Aim::angle_deg`](crate::radiation::Aim).
    let zero_along = match plane.orientation {
        Orientation::Standing if plane.width_m > plane.length_m => Along::Width,
        _ => Along::Length,
    };
    let scan = |(net, worst, name): &(RungNet, &Worst, &str)| {
        let footing = antenna.lay(net.layout());
        let lit = net.lit_harmonic(&footing, worst.harmonic)?;
        Some(NetScan {
            name: (*name).to_owned(),
            worst: (*worst).clone(),
            map: antenna.scan_map(&lit, worst.distance_m)?,
            zero_along,
        })
    };
    let mut left_out = Vec::new();
    if !above.is_empty() {
        left_out.push(format!(
            "no scan is shown of {}: above 1 GHz, where the worst harmonic lies, the floor is covered with absorber \
             and the figure is that of free space",
            above.join(", ")
        ));
    }
    if !unjudged.is_empty() {
        left_out.push(format!(
            "no scan is shown of {}: no harmonic could be judged",
            unjudged.join(", ")
        ));
    }
    Scans {
        nets: asked.par_iter().filter_map(scan).collect(),
        left_out,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::board::read_board;
    use crate::radiation::Polarisation;
    use crate::study::{Unwatched, check};

    const HARNESS: &str = include_str!("../../examples/brackwater-harness.yaml");

    #[test]
    fn the_strongest_place_is_the_reading_but_for_the_parabola() {
        let board = read_board(HARNESS, "board.yaml").board.unwrap();
        let setup = CheckSetup::for_tests();
        let results = check(&board, &setup, &Unwatched);
        let scans = scan_nets(&board, &results, &setup, &Unwatched);
        assert_eq!(scans.nets.len(), 3, "{:?}", scans.left_out);
        for (scan, result) in scans.nets.iter().zip(&results) {
            let worst = result.worst.as_ref().unwrap();
            assert_eq!((&scan.name, &scan.worst), (&result.name, worst));
            let largest = 20.0 * (1e6 * scan.map.largest_v_per_m()).log10();
            let above = worst.field_dbuv_per_m - largest;
            assert!((-1e-3..0.5).contains(&above), "{}: {above} dB", scan.name);
            // The place that the reading names is that of the largest field.
            let aim = worst.aim.unwrap();
            let way = usize::from(aim.polarisation == Polarisation::Vertical);
            let near = |height_m: &f64| (height_m - aim.antenna_height_m).abs() < 1e-9;
            let row = scan.map.heights_m.iter().position(near).unwrap();
            let column = aim.angle_deg / 360.0 * scan.map.columns() as f64;
            let there = scan.map.fields_v_per_m[way][row][column.round() as usize];
            assert_eq!(there, scan.map.largest_v_per_m());
        }
    }

    #[test]
    fn where_there_is_no_scan_a_sentence_says_why() {
        let mut board = read_board(HARNESS, "board.yaml").board.unwrap();
        let mut setup = CheckSetup::for_tests();
        let mut results = check(&board, &setup, &Unwatched);
        results[0].worst.as_mut().unwrap().frequency_hz = 1.2e9;
        let why = |board: &Board, setup: &CheckSetup| {
            let scans = scan_nets(board, &results[..1], setup, &Unwatched);
            assert!(scans.nets.is_empty());
            scans.left_out.concat()
        };
        assert!(why(&board, &setup).contains("of MIXER_CLK: above 1 GHz"));
        setup.site = Site::FreeSpace;
        assert!(why(&board, &setup).contains("free space"));
        board.plane = None;
        assert!(why(&board, &setup).contains("no `plane`"));
    }
}
