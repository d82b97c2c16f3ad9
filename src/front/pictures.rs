//! The picture files of a check: of every net, and on request of the whole board.

use std::path::{Path, PathBuf};

use clap::Args;
use rayon::prelude::*;
use ringfield::board::Board;
use ringfield::show::{
    self, CheckReport, Picture, RankReport, antenna_picture, board_spectrum_picture, plan_picture,
    ranking_picture, scan_picture, spectrum_parts_picture, spectrum_picture, waveform_picture,
};
use ringfield::study::{CheckSetup, NetResult, antenna_curves, board_plan, scan_nets};

use super::output::{self, Output};
use super::progress::Progress;

/// Pictures on request, beside those that every net gets.
#[derive(Debug, Args)]
pub struct MorePictures {
    /// Draw also the board as an antenna: the field of unit sources over frequency, with its resonances
    #[arg(long, requires = "plot")]
    plot_antenna: bool,

    /// Draw also the board from above, with its nets by verdict and its cables
    #[arg(long, requires = "plot")]
    plot_plan: bool,

    /// Draw also, for each net's worst harmonic, what the antenna reads over its height and the turntable's angle
    #[arg(long, requires = "plot")]
    plot_scan: bool,

    /// Draw in the spectra also what loops, charged traces and cables make of each harmonic
    #[arg(long, requires = "plot")]
    plot_parts: bool,
}

impl MorePictures {
    /// Those of the board and of its scans. Says of each that cannot be drawn why.
    pub fn of_board(
        &self,
        report: &CheckReport,
        board: &Board,
        setup: &CheckSetup,
        folder: &Path,
    ) -> Vec<Output> {
        let watch = Progress::new();
        let mut wanted = Vec::new();
        let mut left_out = Vec::new();
        if self.plot_antenna {
            match antenna_curves(board, setup, &watch) {
                Ok(curves) => {
                    wanted.push(("board-antenna".to_owned(), antenna_picture(report, &curves)))
                }
                Err(why) => left_out.push(why),
            }
        }
        if self.plot_plan {
            match board_plan(board, &report.nets) {
                Ok(plan) => wanted.push(("board-plan".to_owned(), plan_picture(report, &plan))),
                Err(why) => left_out.push(why),
            }
        }
        if self.plot_scan {
            let scans = scan_nets(board, &report.nets, setup, &watch);
            let names = output::file_names(report.nets.iter().map(|net| net.name.as_str()));
            for (net, name) in report.nets.iter().zip(names) {
                let scan = scans.nets.iter().find(|scan| scan.name == net.name);
                wanted
                    .extend(scan.map(|scan| (format!("{name}-scan"), scan_picture(report, scan))));
            }
            left_out.extend(scans.left_out);
        }
        drop(watch);
        for why in left_out {
            output::tell(&format!("note: {why}"));
        }
        let painted = wanted.into_par_iter();
        painted
            .flat_map(|(name, picture)| files(&picture, &folder.join(name)))
            .collect()
    }
}

/// The spectra and the waveform of one net, under names that begin alike.
pub fn pictures(
    report: &CheckReport,
    net: &NetResult,
    stem: &Path,
    more: &MorePictures,
) -> Vec<Output> {
    let spectrum = match more.plot_parts {
        true => spectrum_parts_picture,
        false => spectrum_picture,
    };
    let spectra = report.distances_m.iter().map(|distance_m| {
        let distance = show::distance(*distance_m).replace(' ', "");
        (
            format!("-spectrum-{distance}"),
            spectrum(report, net, *distance_m),
        )
    });
    let waveform = ("-waveform".to_string(), waveform_picture(report, net));
    spectra
        .chain([waveform])
        .flat_map(|(name, picture)| {
            let mut path = stem.as_os_str().to_os_string();
            path.push(name);
            files(&picture, Path::new(&path))
        })
        .collect()
}

/// The bars of a ranking, and the board's spectrum at every distance.
pub fn of_ranking(report: &RankReport, folder: &Path) -> Vec<Output> {
    let spectra = report.distances_m.iter().map(|distance_m| {
        let distance = show::distance(*distance_m).replace(' ', "");
        let name = format!("board-spectrum-{distance}");
        (name, board_spectrum_picture(report, *distance_m))
    });
    [("ranking".to_string(), ranking_picture(report))]
        .into_iter()
        .chain(spectra)
        .flat_map(|(name, picture)| files(&picture, &folder.join(name)))
        .collect()
}

/// A picture as PNG and as SVG.
fn files(picture: &Picture, stem: &Path) -> [Output; 2] {
    let path = |ending: &str| {
        let mut path = stem.as_os_str().to_os_string();
        path.push(format!(".{ending}"));
        PathBuf::from(path)
    };
    [
        Output {
            path: path("png"),
            contents: picture.png(),
        },
        Output {
            path: path("svg"),
            contents: picture.svg().into_bytes(),
        },
    ]
}
