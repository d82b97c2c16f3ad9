//! The picture files of a net.

use std::path::{Path, PathBuf};

use ringfield::show::{self, CheckReport, spectrum_picture, waveform_picture};
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
        .flat_map(|(name, picture)| {
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
        })
        .collect()
}
