//! Pictures: first a list of shapes, then painted as PNG or SVG.

mod antenna;
mod axis;
mod board_spectrum;
mod canvas;
mod label;
mod page;
mod paint;
mod picture;
mod place;
mod plan;
mod ranking;
mod readings;
mod scan;
mod shade;
mod spectrum;
mod sweep;
mod variants;
mod waveform;

pub use antenna::antenna_picture;
pub use board_spectrum::board_spectrum_picture;
pub use picture::Picture;
pub use plan::plan_picture;
pub use ranking::ranking_picture;
pub use scan::scan_picture;
pub use spectrum::{spectrum_parts_picture, spectrum_picture};
pub use sweep::sweep_picture;
pub use variants::{variants_spectrum_picture, variants_waveform_picture};
pub use waveform::waveform_picture;

use plotters::style::RGBColor;

// The palette of Okabe and Ito (2008), told apart with any colour vision; values from memory.
const BLACK: RGBColor = RGBColor(0, 0, 0);
const ORANGE: RGBColor = RGBColor(230, 159, 0);
const GREEN: RGBColor = RGBColor(0, 158, 115);
const BLUE: RGBColor = RGBColor(0, 114, 178);
const VERMILLION: RGBColor = RGBColor(213, 94, 0);
const PURPLE: RGBColor = RGBColor(204, 121, 167);

const WHITE: RGBColor = RGBColor(255, 255, 255);
const GREY: RGBColor = RGBColor(95, 95, 95);
const GRID: RGBColor = RGBColor(225, 225, 225);
