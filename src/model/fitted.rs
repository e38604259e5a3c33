//! Relations with what they belong to, and what was checked beside them.

use crate::model::{Band, LevelKind, Relation, Resolved, SourceId};
use serde::Serialize;

/// The relation of one band at one sensor to the wind of one source.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct FittedBand {
    /// The wind input.
    pub source: SourceId,
    /// Site name.
    pub site: String,
    /// Sensor name.
    pub sensor: String,
    /// The band; `None` for a table of pairs that names none.
    pub band: Option<Band>,
    /// What the levels describe; `None` for a table of pairs, which does not say it.
    pub kind: Option<LevelKind>,
    /// The relation.
    pub relation: Relation,
    /// What was checked beside it.
    pub checks: BandChecks,
}

impl FittedBand {
    /// Label of the band with its unit; "all" without one.
    pub fn band_label(&self) -> String {
        self.band.map_or_else(|| "all".to_owned(), Band::label)
    }
}

/// What was checked beside a relation.
#[derive(Debug, Clone, PartialEq, Serialize, Default)]
pub struct BandChecks {
    /// p value of the test against no onset, corrected for the number of bands of the sensor (false discovery rate under any
    /// dependence, Benjamini and Yekutieli 2001).
    pub p_onset_false_discovery: Option<f64>,
    /// Linear trend of the residuals, dB per year, with its 95 % interval.
    pub drift_db_per_year: Option<Resolved>,
    /// Whether another lag between wind and level predicts better.
    pub lag: Option<Lag>,
    /// Estimates as if the wind had a random error: none (the plain fit), then 0.75, 1 and 1.25 times the stated one. Empty
    /// unless an error was stated.
    pub wind_error: Vec<WindErrorEstimate>,
    /// The relation with short events left in, where they were screened out.
    pub unscreened: Option<Box<Relation>>,
}

/// A search for a lag between wind and level, by refit and prediction of held-out blocks of time.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Lag {
    /// Hours by which the level follows the wind; 0 unless another lag predicts better by more than two standard errors.
    pub lag_h: f64,
    /// Gain of that lag over none, in standard errors of paired blocks; of the best other lag where none is better.
    pub gain_in_standard_errors: f64,
    /// Longest lag that was tried in both directions, h.
    pub longest_h: f64,
}

/// Estimates for one assumed size of the wind error.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct WindErrorEstimate {
    /// Assumed standard deviation of the error, m/s; 0 for the plain estimate.
    pub wind_error_sd_m_s: f64,
    /// Floor of each deployment, dB.
    pub floor_db: Vec<f64>,
    /// Wind part alone at 10 m/s of each deployment, dB.
    pub wind_component_at_10_m_s_db: Vec<f64>,
    /// Slope, dB per decade.
    pub slope_db_per_decade: f64,
    /// Onset, m/s.
    pub onset_m_s: f64,
}

/// One onset for several bands.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct CommonOnset {
    /// Index of each band that was used: those with a named onset and with replicates.
    pub bands: Vec<usize>,
    /// The common onset, m/s, with its 95 % interval.
    pub onset_m_s: Resolved,
    /// Wald statistic of equal onsets.
    pub wald: f64,
    /// Its degrees of freedom.
    pub degrees: usize,
    /// p value of equal onsets (chi-squared).
    pub p_equal: f64,
}

/// What was found over the bands of one sensor together.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct FittedSensor {
    /// The wind input.
    pub source: SourceId,
    /// Site name.
    pub site: String,
    /// Sensor name.
    pub sensor: String,
    /// One onset for all bands that have one.
    pub common_onset: Option<CommonOnset>,
    /// Names of the segments (deployments, months) that relations number; empty where there is but one.
    pub segments: Vec<String>,
    /// What the screen for short events found, where it is on.
    pub screen: Option<Screened>,
}

/// What a screen for short events (passing ships, handling) found at one sensor.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
pub struct Screened {
    /// Events that were screened out.
    pub events: usize,
    /// Windows in them.
    pub windows: usize,
    /// Windows that were raised as well, but for longer than a ship takes; they are kept.
    pub kept_windows: usize,
}

/// All relations of a run.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Fitted {
    /// By source, site, sensor and band.
    pub bands: Vec<FittedBand>,
    /// By source, site and sensor.
    pub sensors: Vec<FittedSensor>,
}

impl Fitted {
    /// What was found over the bands of the sensor that a band belongs to.
    pub fn sensor_of(&self, band: &FittedBand) -> Option<&FittedSensor> {
        self.sensors
            .iter()
            .find(|known| (&known.source, &known.site, &known.sensor) == (&band.source, &band.site, &band.sensor))
    }
}
