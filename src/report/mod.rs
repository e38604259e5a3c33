//! Results as a reader sees them: figures (SVG and PNG), numbers in words, and one self-contained page.
//!
//! Nothing here reads a file or a clock; the same input gives the same bytes. Figures and pages measure and draw with
//! one embedded font (see `font/README.md`).

mod against_peak;
mod axis;
mod calendar;
mod colour;
pub mod columns;
mod coverage;
mod document;
mod estimate;
mod figure;
mod font;
mod frequency;
mod html;
mod interval_rows;
mod level_wind;
mod level_wind_panel;
mod mark;
pub mod number;
mod overlap_map;
mod panel;
mod peak_cells;
mod polar_spectrum;
mod radiated_spectra;
mod relation_text;
mod residual;
mod sensitivity_text;
mod site_map;
mod spreading_text;
mod statistics;
mod svg;
mod testability_map;
mod time_series;
mod wind_class;
mod wind_distribution;

pub use against_peak::*;
pub use calendar::iso_date;
pub use coverage::*;
pub use document::*;
pub use estimate::*;
pub use figure::*;
pub use frequency::*;
pub use html::html;
pub use interval_rows::*;
pub use level_wind::*;
pub use overlap_map::*;
pub use polar_spectrum::*;
pub use radiated_spectra::*;
pub(crate) use relation_text::p_text;
pub use relation_text::{findings, relation_text};
pub use residual::*;
pub use sensitivity_text::sensitivity_text;
pub use site_map::*;
pub use spreading_text::spreading_text;
pub use testability_map::*;
pub use time_series::*;
pub use wind_class::*;
pub use wind_distribution::*;
