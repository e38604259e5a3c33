//! Plain texts of buoy archives: density, directions and moments at every frequency, one line a spectrum.

mod error;
mod read;

pub use error::BuoyError;
pub use read::{is_buoy_text, read_buoy_spectra};
