//! The picture files of a net.

use std::path::{Path, PathBuf};

use ringfield::show::{
    self, CheckReport, Picture, RankReport, board_spectrum_picture, ranking_picture,
    spectrum_picture, waveform_picture,
};
use ringfield::study::NetResult;

use super::output::Output;

/// The spectra and the waveform of one net, under names that begin alike.
pub fn pictures(report: &CheckReport, net: &NetResult, stem: &Path) -> Vec<Output> {
    let spectra = report.distances_m.iter().map(|distance_m| {
        let distance = show::distance(*distance_m).replace(' ', "");
        (
            format!("-spectrum-{distance}"),
            spectrum_picture(report, net, *distance_m),
        )
    });
    let waveform = ("-waveform".to_string(), waveform_picture(report, net));
    spectra
        .chain([waveform])
        .flat_map(|(name, picture)| both_forms(&picture, stem, &name))
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
        .flat_map(|(name, picture)| both_forms(&picture, &folder.join(name), ""))
        .collect()
}

/// A picture as PNG and as SVG.
fn both_forms(picture: &Picture, stem: &Path, name: &str) -> [Output; 2] {
    let path = |ending: &str| {
        let mut path = stem.as_os_str().to_os_string();
        path.push(format!("{name}.{ending}"));
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
