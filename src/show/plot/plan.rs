//! The plane seen from above, with the nets where they lie and the cables that leave it.

use super::axis::Axis;
use super::label::{COST_LABEL, label_near};
use super::page::{LegendEntry, PANEL_BOTTOM, PANEL_LEFT, PANEL_RIGHT, legend, page, panel};
use super::picture::{Pen, Picture, Point, Rect};
use super::place::Obstacles;
use super::{BLACK, BLUE, GREY, ORANGE, VERMILLION};
use crate::board::CableRun;
use crate::show::{CheckReport, words};
use crate::study::{BoardPlan, PlannedCable, PlannedNet, Verdict};

/// So many nets are named, the worst first.
const NAMED: usize = 12;
/// Beside the plane, as a share of its longer side: room for labels, and for cables where some leave that way.
const ROOM: [f64; 2] = [0.06, 0.18];
/// Length of a cable's stub in the picture.
const STUB: f64 = 44.0;
const COST_NET: f64 = 25.0;

/// Worst first: those that follow are drawn over it, thinner, so that all show where nets lie on one another.
const VERDICTS: [Verdict; 4] = [
    Verdict::LikelyFail,
    Verdict::Marginal,
    Verdict::LikelyPass,
    Verdict::NotJudged,
];

fn pen(verdict: Verdict) -> Pen {
    let (colour, width, dashes): (_, _, &[f64]) = match verdict {
        Verdict::LikelyFail => (VERMILLION, 6.0, &[]),
        Verdict::Marginal => (ORANGE, 4.0, &[10.0, 3.0]),
        Verdict::LikelyPass => (BLUE, 1.8, &[]),
        Verdict::NotJudged => (BLACK, 1.2, &[2.0, 3.0]),
    };
    Pen {
        colour,
        width,
        dashes,
    }
}

/// For pieces that do not radiate.
const QUIET: Pen = Pen {
    colour: GREY,
    width: 1.0,
    dashes: &[6.0, 3.0, 1.5, 3.0],
};

/// Where places on the plane lie in the picture.
struct Map {
    x_mm: Axis,
    y_mm: Axis,
}

impl Map {
    /// The whole plane with some room, to one scale both ways.
    fn new(plan: &BoardPlan, rect: &Rect) -> Self {
        let sides_mm = [plan.plane.length_m, plan.plane.width_m].map(|side_m| 1e3 * side_m);
        let whole_mm = [0, 1].map(|axis| {
            let mut cables = plan.cables.iter();
            let leaves = cables.any(|cable| cable.away[axis] != 0.0);
            sides_mm[axis] + 2.0 * ROOM[usize::from(leaves)] * sides_mm[0].max(sides_mm[1])
        });
        let mm_per_unit = (whole_mm[0] / rect.width()).max(whole_mm[1] / rect.height());
        let range = |side_mm: f64, extent: f64| {
            let half_mm = extent * mm_per_unit / 2.0;
            (side_mm / 2.0 - half_mm, side_mm / 2.0 + half_mm)
        };
        Self {
            x_mm: Axis::linear(range(sides_mm[0], rect.width()), (rect.left, rect.right)),
            y_mm: Axis::linear(range(sides_mm[1], rect.height()), (rect.bottom, rect.top)),
        }
    }

    fn point(&self, [x_m, y_m]: [f64; 2]) -> Point {
        (self.x_mm.place(1e3 * x_m), self.y_mm.place(1e3 * y_m))
    }
}

/// The board from above.
pub fn plan_picture(report: &CheckReport, plan: &BoardPlan) -> Picture {
    let mut picture = page(
        "The board from above",
        &format!(
            "{} · plane {} mm by {} mm · worst margins, {} site",
            report.board,
            words::trimmed(1e3 * plan.plane.length_m, 1),
            words::trimmed(1e3 * plan.plane.width_m, 1),
            words::site(report.site)
        ),
    );
    let top = legend(&mut picture, &legend_entries(plan));
    let rect = Rect {
        left: PANEL_LEFT,
        top,
        right: PANEL_RIGHT,
        bottom: PANEL_BOTTOM,
    };
    let map = Map::new(plan, &rect);
    let titles = (
        Some("x, along the plane's length (mm)"),
        "y, along its width (mm)",
    );
    panel(&mut picture, &rect, &map.x_mm, &map.y_mm, titles);
    let (front_left, back_right) = (
        map.point([0.0, 0.0]),
        map.point([plan.plane.length_m, plan.plane.width_m]),
    );
    let board = Rect {
        left: front_left.0,
        top: back_right.1,
        right: back_right.0,
        bottom: front_left.1,
    };
    picture.area(&board.corners(), ORANGE, 0.05);
    picture.outline(&board, Pen::solid(BLACK, 1.5));

    let mut beside = Obstacles::default();
    beside.add_rect(board, COST_LABEL);
    let mut obstacles = Obstacles::default();
    for cable in &plan.cables {
        for taken in draw_cable(&mut picture, &mut beside, &map, &rect, cable) {
            obstacles.add_rect(taken, COST_LABEL);
        }
    }
    let [a, b, c, d] = board.corners();
    obstacles.add_line(&[a, b, c, d, a], COST_NET);
    for verdict in VERDICTS {
        for net in plan.nets.iter().filter(|net| net.verdict == verdict) {
            let runs = runs(&net.pieces_m)
                .into_iter()
                .map(|run| (run, pen(verdict)));
            let quiet = self::runs(&net.quiet_m).into_iter().map(|run| (run, QUIET));
            for (run, pen) in runs.chain(quiet) {
                let points: Vec<Point> = run.into_iter().map(|at_m| map.point(at_m)).collect();
                picture.line(&points, pen);
                obstacles.add_line(&points, COST_NET);
            }
        }
    }
    for net in worst_first(plan).into_iter().take(NAMED) {
        let words = match net.margin_db {
            Some(margin_db) => format!("{} {margin_db:.1} dB", net.name),
            None => format!("{} {}", net.name, net.verdict.as_str()),
        };
        let points: Vec<Point> = handles(net).into_iter().map(|at| map.point(at)).collect();
        label_near(&mut picture, &mut obstacles, &rect, &points, &words);
    }
    picture
}

/// A stub out of its edge with a break at its end, and how the cable goes on; gives what it takes up.
fn draw_cable(
    picture: &mut Picture,
    obstacles: &mut Obstacles,
    map: &Map,
    rect: &Rect,
    cable: &PlannedCable,
) -> Vec<Rect> {
    let from = map.point(cable.from_m);
    let (x, y) = (cable.away[0], -cable.away[1]);
    let along = |way: f64, aside: f64| (from.0 + way * x - aside * y, from.1 + way * y + aside * x);
    let pen = Pen::solid(BLACK, 3.0);
    let stub = [along(0.0, 0.0), along(STUB, 0.0)];
    picture.line(&stub, pen);
    let thin = Pen::solid(BLACK, 1.2);
    for way in [STUB + 2.0, STUB + 6.0] {
        let stroke = [along(way - 3.0, -6.0), along(way + 3.0, 6.0)];
        picture.line(&stroke, thin);
        obstacles.add_line(&stroke, COST_LABEL);
    }
    obstacles.add_line(&stub, COST_LABEL);
    let length = match cable.length_m {
        Some(length_m) => words::distance(length_m),
        None => "length unknown".into(),
    };
    let run = match cable.run {
        CableRun::Straight => "straight away",
        CableRun::Drops => "drops to the floor",
        CableRun::Bonded => "down to the floor and bonded",
    };
    let handles = [along(STUB / 2.0, 0.0), along(STUB, 0.0)];
    let drawn = Rect {
        left: stub[0].0.min(stub[1].0),
        top: stub[0].1.min(stub[1].1),
        right: stub[0].0.max(stub[1].0),
        bottom: stub[0].1.max(stub[1].1),
    };
    let words = [cable.name.clone(), format!("{length}, {run}")];
    let labels = words
        .iter()
        .filter_map(|words| label_near(picture, obstacles, rect, &handles, words));
    labels.chain([drawn.grown(4.0)]).collect()
}

fn legend_entries(plan: &BoardPlan) -> Vec<LegendEntry> {
    let entry = |label: String, pen| LegendEntry {
        label,
        pen,
        marker: None,
    };
    let of = |verdict| plan.nets.iter().filter(move |net| net.verdict == verdict);
    let mut entries: Vec<LegendEntry> = VERDICTS
        .into_iter()
        .filter(|&verdict| of(verdict).next().is_some())
        .map(|verdict| {
            entry(
                format!("{} ({})", verdict.as_str(), of(verdict).count()),
                Some(pen(verdict)),
            )
        })
        .collect();
    if plan.nets.iter().any(|net| !net.quiet_m.is_empty()) {
        let label = "between planes or without a height: does not radiate";
        entries.push(entry(label.into(), Some(QUIET)));
    }
    if plan.nets.len() > NAMED {
        let label = format!("the {NAMED} worst of {} nets are named", plan.nets.len());
        entries.push(entry(label, None));
    }
    let names = |nets: Vec<&PlannedNet>| {
        let names: Vec<&str> = nets.iter().map(|net| net.name.as_str()).collect();
        names.join(", ")
    };
    let (drawn, none): (Vec<_>, Vec<_>) =
        (plan.nets.iter()).partition(|net| !handles(net).is_empty());
    if !none.is_empty() {
        let label = format!("without a length, so not drawn: {}", names(none));
        entries.push(entry(label, None));
    }
    let guessed: Vec<_> = drawn.into_iter().filter(|net| !net.placed).collect();
    if !guessed.is_empty() {
        let label = format!(
            "taken to lie straight in the middle, since the file gives no points: {}",
            names(guessed)
        );
        entries.push(entry(label, None));
    }
    entries
}

fn worst_first(plan: &BoardPlan) -> Vec<&PlannedNet> {
    let mut nets: Vec<&PlannedNet> = plan.nets.iter().collect();
    let margin_db = |net: &PlannedNet| net.margin_db.unwrap_or(f64::INFINITY);
    nets.sort_by(|a, b| margin_db(a).total_cmp(&margin_db(b)));
    nets
}

/// Places at which a net may be named: along its pieces, those that radiate first.
fn handles(net: &PlannedNet) -> Vec<[f64; 2]> {
    const SHARES: [f64; 5] = [0.5, 0.2, 0.8, 0.0, 1.0];
    let pieces = match net.pieces_m.as_slice() {
        [] => &net.quiet_m,
        _ => &net.pieces_m,
    };
    let at = |[from, to]: &[[f64; 2]; 2], share: f64| {
        [0, 1].map(|axis| from[axis] + share * (to[axis] - from[axis]))
    };
    let along = |piece| SHARES.map(|share| at(piece, share));
    pieces.iter().flat_map(along).collect()
}

/// Pieces that follow one another as unbroken lines.
fn runs(pieces: &[[[f64; 2]; 2]]) -> Vec<Vec<[f64; 2]>> {
    let mut runs: Vec<Vec<[f64; 2]>> = Vec::new();
    for &[from, to] in pieces {
        let near = |[x, y]: [f64; 2]| (x - from[0]).hypot(y - from[1]) < 1e-9;
        match runs.last_mut() {
            Some(run) if run.last().is_some_and(|&end| near(end)) => run.push(to),
            _ => runs.push(vec![from, to]),
        }
    }
    runs
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::board::{Orientation, Plane};
    use crate::show::{NOTICE, samples};

    fn plan(nets: usize) -> BoardPlan {
        let net = |number: usize| {
            let y_m = 0.002 * number as f64;
            PlannedNet {
                name: format!("NET{number}_"),
                verdict: VERDICTS[number % 3],
                margin_db: Some(number as f64),
                pieces_m: vec![[[0.01, y_m], [0.1, y_m]], [[0.1, y_m], [0.1, 0.09]]],
                quiet_m: Vec::new(),
                placed: number > 0,
            }
        };
        BoardPlan {
            plane: Plane {
                length_m: 0.16,
                width_m: 0.1,
                orientation: Orientation::Flat,
            },
            nets: (0..nets).map(net).collect(),
            cables: vec![PlannedCable {
                name: "mast".into(),
                length_m: None,
                run: CableRun::Bonded,
                from_m: [0.04, 0.1],
                away: [0.0, 1.0],
            }],
        }
    }

    #[test]
    fn axes_nets_cables_and_notice_are_written() {
        let mut plan = plan(4);
        plan.nets[2].pieces_m.clear();
        plan.nets[3].margin_db = None;
        plan.nets[3].verdict = Verdict::NotJudged;
        plan.nets[3].quiet_m = std::mem::take(&mut plan.nets[3].pieces_m);
        let svg = plan_picture(&samples::report(vec![]), &plan).svg();
        for words in [
            "plane 160 mm by 100 mm",
            "x, along the plane's length (mm)",
            "y, along its width (mm)",
            "NET0_ 0.0 dB",
            "NET1_ 1.0 dB",
            "NET3_ not judged",
            "likely fail (1)",
            "without a length, so not drawn: NET2_",
            "the file gives no points: NET0_",
            "does not radiate",
            "mast",
            "length unknown, down to the floor and bonded",
            NOTICE,
        ] {
            let written = words.replace('\'', "&apos;");
            assert!(svg.contains(words) || svg.contains(&written), "{words}");
        }
    }

    #[test]
    fn the_worst_dozen_is_named_and_no_more() {
        let svg = plan_picture(&samples::report(vec![]), &plan(40)).svg();
        let named = |number: usize| svg.contains(&format!("NET{number}_ "));
        assert!((0..NAMED).all(named) && !(NAMED..40).any(named));
        assert!(svg.contains("the 12 worst of 40 nets are named"));
    }

    #[test]
    fn pieces_that_follow_one_another_are_one_line() {
        let [a, b, c, d] = [[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [3.0, 3.0]];
        assert_eq!(runs(&[[a, b], [b, c], [d, a]]), [vec![a, b, c], vec![d, a]]);
    }
}
