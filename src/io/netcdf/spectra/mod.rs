//! Directional wave spectra in NetCDF: on grids, at stations, along drifting positions.

mod axes;
mod find;
mod gather;
mod open;
mod options;
mod part;
mod place;
mod source;
mod units;

pub use open::open_spectra;
pub use options::{DensityEncoding, DirectionRotation, SpectraOptions};
pub use source::{SpectraPlace, SpectraSlab, SpectraSource};
