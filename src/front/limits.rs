//! `ringfield limits`: what limit lines say.

use std::path::PathBuf;

use clap::Args;
use ringfield::limit::{BuiltIn, built_in, limits_at};
use ringfield::show::{limit_at_listing, limit_listing};
use ringfield::study::NOTICE;

use super::{Ending, Refusal, input, options, output};

/// Which limit lines, and at what distance.
#[derive(Debug, Args)]
pub struct Options {
    /// Limit files; without any, the built-in limits
    #[arg(value_name = "FILE")]
    files: Vec<PathBuf>,

    /// Show the limits as they stand at this distance; may be repeated
    #[arg(long, value_name = "LENGTH", value_parser = options::distance)]
    distance: Vec<f64>,
}

/// Prints every limit, as stated or at the distances asked for.
pub fn run(options: &Options) -> Result<Ending, Refusal> {
    let limits = if options.files.is_empty() {
        built_in().iter().map(BuiltIn::limit).collect()
    } else {
        input::limits(&options.files)?
    };
    let mut listings: Vec<String> = if options.distance.is_empty() {
        limits.iter().map(limit_listing).collect()
    } else {
        let distances = options.distance.iter();
        let moved = distances.flat_map(|distance_m| limits_at(&limits, *distance_m));
        moved.map(|limit| limit_at_listing(&limit)).collect()
    };
    listings.push(format!(
        "What `ringfield check` lays against a limit is a {NOTICE}.\n"
    ));
    output::print(&listings.join("\n"))?;
    Ok(Ending::NoneLikelyFails)
}
