//! Sound levels: what a level table states about its numbers, and its rows.

use crate::model::Band;
use crate::units::{Instant, Window};
use serde::{Deserialize, Serialize};

/// The reference pressure of the levels in a file.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum PressureReference {
    /// 1 micropascal, the reference in water (ISO 18405).
    #[serde(rename = "1 uPa")]
    Micropascal,
    /// 1 pascal.
    #[serde(rename = "1 Pa")]
    Pascal,
    /// 20 micropascals, the reference in air.
    #[serde(rename = "20 uPa")]
    TwentyMicropascals,
}

impl PressureReference {
    /// What must be added to a level with this reference to refer it to 1 uPa, dB.
    pub fn to_micropascal_db(self) -> f64 {
        match self {
            Self::Micropascal => 0.0,
            // 20 log10(1 Pa / 1 uPa), exact.
            Self::Pascal => 120.0,
            // 20 log10(20).
            Self::TwentyMicropascals => 26.020_599_913_279_625,
        }
    }
}

/// What a level describes.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum LevelKind {
    /// Level of the mean-square pressure in the band, dB re 1 uPa^2.
    BandLevel,
    /// Level of the mean-square pressure spectral density in the band, dB re 1 uPa^2/Hz.
    SpectralDensityLevel,
}

impl LevelKind {
    /// Unit text with its reference.
    pub fn unit(self) -> &'static str {
        match self {
            Self::BandLevel => "dB re 1 uPa2",
            Self::SpectralDensityLevel => "dB re 1 uPa2/Hz",
        }
    }

    /// What must be added to a level of this kind in this band to make it a level of the other kind, dB.
    pub fn to_other_db(self, to: Self, band: Band) -> f64 {
        match (self, to) {
            (Self::BandLevel, Self::SpectralDensityLevel) => -band.width_db(),
            (Self::SpectralDensityLevel, Self::BandLevel) => band.width_db(),
            _ => 0.0,
        }
    }
}

/// Whether numbers are decibels or linear.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, Default)]
#[serde(rename_all = "snake_case")]
pub enum LevelScale {
    /// Decibels.
    #[default]
    Decibel,
    /// Mean-square pressure (or its density) over the square of the reference.
    MeanSquare,
    /// Root-mean-square pressure (or the root of its density) over the reference.
    RootMeanSquare,
}

/// Which instant of its window a row's time stamp is.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Stamp {
    /// The first instant.
    Start,
    /// The middle.
    Centre,
    /// The end.
    End,
}

impl Stamp {
    /// The window of this length whose stamp is the instant.
    pub fn window(self, stamp: Instant, length_ms: i64) -> Window {
        let start = match self {
            Self::Start => stamp,
            Self::Centre => stamp.plus_ms(-length_ms / 2),
            Self::End => stamp.plus_ms(-length_ms),
        };
        Window { start, end: start.plus_ms(length_ms) }
    }
}

/// The statistic that stands for the level samples of a window.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, Default)]
#[serde(rename_all = "snake_case")]
pub enum LevelStatistic {
    /// Median of the levels (the middle two averaged in decibels).
    #[default]
    Median,
    /// Level of the mean power.
    PowerMean,
}

impl LevelStatistic {
    /// Its name in words.
    pub fn name(self) -> &'static str {
        match self {
            Self::Median => "median",
            Self::PowerMean => "power mean",
        }
    }
}

/// One level sample as a reader hands it over: already in dB re 1 uPa (band level) or 1 uPa^2/Hz (density level).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LevelRow {
    /// Index into the reader's list of site names.
    pub site: u32,
    /// Index into the reader's list of bands.
    pub band: u32,
    /// The span of time that the sample stands for.
    pub window: Window,
    /// The level; NaN where there is none.
    pub level_db: f64,
    /// Line (CSV, from 1 with the header) or row (Parquet, from 1) for messages.
    pub row: u64,
    /// Why the row is not used, where it is not.
    pub reason: Option<crate::model::Missing>,
}
