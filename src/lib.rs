#![doc = "Underwater sound levels against the modelled wind overhead."]
//!
//! An ocean-acoustics analyst has months of sound levels in frequency bands and the 10 m wind of an atmosphere model on a
//! grid. This library takes the wind at every sensor for every level, and fits, band by band, the quiet floor, the slope
//! and the wind speed at which the band stops responding. The program `underwind` is a thin shell around it.
//!
//! Layers, each knowing only those below: `units` and `numerics` know no sea; `model` is plain data; `science` turns model
//! into model without files; `io` turns bytes into model and back; `report` makes figures, tables and text; `config` reads
//! the study file; `pipeline` runs the jobs; `cli` is what the shell sees.

pub mod cli;
pub mod config;
pub mod error;
pub mod io;
pub mod model;
pub mod numerics;
pub mod pipeline;
pub mod report;
pub mod science;
pub mod units;

pub use error::Error;
