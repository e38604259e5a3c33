//! The spreading comparison of one sensor, with what it belongs to.

use super::matchup::SensorRecord;
use super::spreading::{BandComparison, PairedComparison, Testability, density_words};
use serde::Serialize;

/// All comparisons of one sensor.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SensorSpreading {
    /// Site name.
    pub site: String,
    /// Sensor name.
    pub sensor: String,
    /// Standard uncertainty of the model's density that the intervals contain, dB.
    pub density_sd_db: f64,
    /// Band by band, model by model.
    pub comparisons: Vec<BandComparison>,
    /// Models side by side.
    pub pairs: Vec<PairedComparison>,
    /// By model: in how many hours of each month sound could judge each band.
    pub testability: Vec<(String, Testability)>,
}

impl SensorSpreading {
    /// Nothing compared yet.
    pub fn new(record: &SensorRecord, density_sd_db: f64) -> Self {
        Self {
            site: record.site.clone(),
            sensor: record.sensor.clone(),
            density_sd_db,
            comparisons: Vec::new(),
            pairs: Vec::new(),
            testability: Vec::new(),
        }
    }

    /// What bounds the density, as the verdicts say it.
    pub fn density_words(&self) -> String {
        density_words(self.density_sd_db, false)
    }
}
