//! Wave spectra known by directional moments alone, as buoys measure them.

use crate::units::Instant;

/// Density and first and second directional moments at every frequency of every step. Missing numbers are NaN; a missing
/// direction where there is no energy does no harm.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct MomentSeries {
    /// Frequencies, Hz, ascending.
    pub frequency_hz: Vec<f64>,
    /// Steps, strictly increasing.
    pub steps: Vec<Instant>,
    /// Density E(f), m2/Hz, step by step, frequency by frequency.
    pub density_m2_hz: Vec<f64>,
    /// Mean direction that waves come from, degrees.
    pub mean_from_deg: Vec<f64>,
    /// Principal direction that waves come from, degrees.
    pub principal_from_deg: Vec<f64>,
    /// First moment r1, 0 to 1.
    pub r1: Vec<f64>,
    /// Second moment r2, 0 to 1.
    pub r2: Vec<f64>,
    /// What the reader should know.
    pub notes: Vec<String>,
}

impl MomentSeries {
    /// One step's part of a column.
    pub fn of_step<'a>(&self, column: &'a [f64], step: usize) -> &'a [f64] {
        let count = self.frequency_hz.len();
        column.get(step * count..(step + 1) * count).unwrap_or_default()
    }
}
