//! Helpers of these tests: fixtures and look-ups.

use crate::support::project;
use std::path::PathBuf;
use underwind::Error;
use underwind::pipeline::{Answer, LookUp, look_up_spectrum};

/// A file of this folder's fixtures.
pub(super) fn fixture(name: &str) -> PathBuf {
    project().join("tests/fixtures/spectra").join(name)
}

/// One look-up; a place and a frequency where they are needed.
pub(super) fn ask(
    files: &[PathBuf],
    place: Option<(f64, f64)>,
    time: &str,
    quantity: &str,
    frequency_hz: f64,
) -> Result<Answer, Error> {
    look_up_spectrum(&LookUp {
        files: files.to_vec(),
        latitude_deg: place.map(|(latitude, _)| latitude),
        longitude_deg: place.map(|(_, longitude)| longitude),
        time: Some(time.to_owned()),
        quantity: Some(quantity.to_owned()),
        frequency_hz: Some(frequency_hz),
        ..LookUp::default()
    })
}
