//! `[spreading]`: the sound of opposing waves, and how a model's spreading is compared with it.

use super::error::{Complaint, StudyError};
use super::place::in_words;
use crate::model::TailPower;
use crate::science::spreading::SpreadOptions;
use crate::science::waves::{BandSettings, Radiator, Water};
use serde::{Deserialize, Serialize};

/// What is laid on beyond the last frequency of the spectra, as written.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "snake_case")]
enum RawTail {
    /// Nothing: bands there have no radiated level.
    None,
    /// E falls with f^-4.
    F4,
    /// E falls with f^-5.
    F5,
}

/// `[spreading]` as written.
#[derive(Debug, Clone, Default, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct RawSpreading {
    bands_hz: Option<Vec<f64>>,
    highest_hz: Option<f64>,
    tail: Option<RawTail>,
    bottom_gain_db: Option<f64>,
    sound_speed_m_s: Option<f64>,
    water_density_kg_m3: Option<f64>,
    surface_tension_n_m: Option<f64>,
    gravity_m_s2: Option<f64>,
    water_depth_m: Option<f64>,
    density_sd_db: Option<f64>,
    law_spread_db: Option<f64>,
    block_h: Option<f64>,
    replicates: Option<usize>,
    seed: Option<u64>,
}

/// `[spreading]` with its defaults.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SpreadingSection {
    /// Bands that are compared, by centre, Hz; empty: all up to `highest_hz`.
    pub bands_hz: Vec<f64>,
    /// Highest band that is compared where none are named, Hz: twice what gravity waves can radiate.
    pub highest_hz: f64,
    /// The water and what lies under it.
    #[serde(serialize_with = "in_words")]
    pub radiator: Radiator,
    /// Tail beyond the last frequency of the spectra.
    #[serde(serialize_with = "in_words")]
    pub extend: Option<TailPower>,
    /// Settings of the comparison.
    #[serde(serialize_with = "in_words")]
    pub options: SpreadOptions,
}

/// Gravity waves end where surface tension takes over, near 13.5 Hz: twice that in sound.
const HIGHEST_HZ: f64 = 27.0;

impl RawSpreading {
    pub(super) fn resolve(self, complaint: Complaint<'_>) -> Result<SpreadingSection, StudyError> {
        let checked = |key: &str, value: Option<f64>, low: f64, high: f64, default: f64| match value {
            None => Ok(default),
            Some(value) if (low..=high).contains(&value) => Ok(value),
            Some(value) => Err(complaint.lacking(format!("`spreading.{key}` is {value}; expected {low} to {high}"))),
        };
        let water = Water::default();
        let defaults = SpreadOptions::default();
        let depth_m = match self.water_depth_m {
            None => None,
            depth => Some(checked("water_depth_m", depth, 0.5, 12_000.0, 0.0)?),
        };
        let replicates = self.replicates.unwrap_or(defaults.replicates);
        if !(100..=20_000).contains(&replicates) {
            return Err(complaint.lacking(format!("`spreading.replicates` is {replicates}; expected 100 to 20000")));
        }
        Ok(SpreadingSection {
            bands_hz: self.bands_hz.unwrap_or_default(),
            highest_hz: checked("highest_hz", self.highest_hz, 0.01, 1000.0, HIGHEST_HZ)?,
            radiator: Radiator {
                water: Water {
                    gravity_m_s2: checked("gravity_m_s2", self.gravity_m_s2, 9.7, 9.9, water.gravity_m_s2)?,
                    density_kg_m3: checked(
                        "water_density_kg_m3",
                        self.water_density_kg_m3,
                        950.0,
                        1300.0,
                        water.density_kg_m3,
                    )?,
                    tension_n_m: checked("surface_tension_n_m", self.surface_tension_n_m, 0.0, 0.1, water.tension_n_m)?,
                    sound_speed_m_s: checked(
                        "sound_speed_m_s",
                        self.sound_speed_m_s,
                        1300.0,
                        1700.0,
                        water.sound_speed_m_s,
                    )?,
                    depth_m,
                },
                bottom_gain_db: checked("bottom_gain_db", self.bottom_gain_db, -20.0, 40.0, 0.0)?,
            },
            extend: match self.tail.unwrap_or(RawTail::F5) {
                RawTail::None => None,
                RawTail::F4 => Some(TailPower::Fourth),
                RawTail::F5 => Some(TailPower::Fifth),
            },
            options: SpreadOptions {
                density_sd_db: checked("density_sd_db", self.density_sd_db, 0.0, 10.0, defaults.density_sd_db)?,
                law_spread_db: checked("law_spread_db", self.law_spread_db, 0.0, 20.0, defaults.law_spread_db)?,
                block_h: checked("block_h", self.block_h, 1.0, 1000.0, defaults.block_h)?,
                replicates,
                seed: self.seed.unwrap_or(defaults.seed),
                ..defaults
            },
        })
    }
}

impl SpreadingSection {
    /// How bands radiate to a sensor at this depth.
    pub fn band_settings(&self, sensor_depth_m: Option<f64>) -> BandSettings {
        BandSettings { extend: self.extend, sensor_depth_m }
    }

    /// Whether a band is compared.
    pub fn compares(&self, centre_hz: f64) -> bool {
        if self.bands_hz.is_empty() {
            return centre_hz <= self.highest_hz;
        }
        self.bands_hz.iter().any(|wanted| (centre_hz / wanted - 1.0).abs() < 0.03)
    }
}
