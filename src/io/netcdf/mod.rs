//! Gridded fields in NetCDF: classic files by our own parser, NetCDF-4 through its index and our own decoding.
//!
//! Headers are read once; after that values come by positioned reads in any thread, outside the libraries' lock.

mod calendar;
mod chunks;
mod classic;
mod error;
mod hdf5;
mod header;
mod layout;
mod library;
mod packing;
mod probe;
mod read;
mod roles;
mod scattered;
mod sniff;
mod spectra;
mod time_axis;
mod waves;
mod wind;
mod wind_merge;
mod wind_options;
mod wind_part;

pub use error::NetcdfError;
pub use probe::{probe, probe_with};
pub use spectra::*;
pub use waves::{WaveParameter, open_waves};
pub use wind::{WindKind, WindSource, open_wind};
pub use wind_options::{DirectionSense, WindOptions};
