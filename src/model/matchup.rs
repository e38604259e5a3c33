//! Conditions and matchups: the two tables that everything downstream stands on, as plain columns.

use crate::model::{Band, Exclusion, FlagSet, LevelKind, LevelStatistic, Missing, SourceId};
use crate::units::{Compass, Window};

/// The wind in one window.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct WindowWind {
    /// Mean of the component towards the east, m/s; NaN for a source without direction.
    pub eastward_mean_m_s: f64,
    /// Mean of the component towards the north, m/s; NaN for a source without direction.
    pub northward_mean_m_s: f64,
    /// Mean of the speed, m/s.
    pub speed_mean_m_s: f64,
    /// Speed of the mean components, m/s; NaN for a source without direction.
    pub speed_of_mean_m_s: f64,
    /// Mean of the speed interpolated in space as a scalar, m/s.
    pub scalar_speed_mean_m_s: f64,
    /// Longest time between two steps that the mean bridged, s.
    pub step_bridged_s: f64,
}

impl WindowWind {
    /// Direction that the mean wind comes from, degrees clockwise from true north; NaN for a calm or without direction.
    pub fn from_direction_deg(&self) -> f64 {
        Compass::of_wind(self.eastward_mean_m_s, self.northward_mean_m_s).map_or(f64::NAN, Compass::degrees)
    }
}

/// What one wind source says at one site in each window of the site's record.
#[derive(Debug, Clone, PartialEq)]
pub struct Conditions {
    /// The source.
    pub source: SourceId,
    /// Site name.
    pub site: String,
    /// One entry a window: the wind, or NaN throughout.
    pub wind: Vec<Option<WindowWind>>,
    /// Remarks on each window.
    pub flags: Vec<FlagSet>,
    /// Why a window has no wind.
    pub missing: Vec<Option<Missing>>,
    /// Distance from the site to the nearest node used, km; NaN where no node was found or the source is a table.
    pub nearest_node_km: f64,
    /// What the study's rules leave out.
    pub exclusion: Exclusion,
}

impl Conditions {
    /// No wind in any of so many windows.
    pub fn empty(source: SourceId, site: String, windows: usize) -> Self {
        Self {
            source,
            site,
            wind: vec![None; windows],
            flags: vec![FlagSet::default(); windows],
            missing: vec![None; windows],
            nearest_node_km: f64::NAN,
            exclusion: Exclusion::default(),
        }
    }

    /// Why the pair of a window and a band of this record is not used, or `None` when it is.
    pub fn pair_reason(&self, record: &SensorRecord, band: usize, window: usize) -> Option<Missing> {
        let levels = &record.bands[band];
        levels.reason[window]
            .or_else(|| (!levels.level_db[window].is_finite()).then_some(Missing::NotFinite))
            .or_else(|| record.deployment[window].is_none().then_some(Missing::OutsideDeployment))
            .or(self.missing[window])
            .or_else(|| self.exclusion.rule(window, band).map(|_| Missing::Excluded))
    }
}

/// The levels of one sensor, window by window and band by band.
#[derive(Debug, Clone, PartialEq)]
pub struct SensorRecord {
    /// Site name.
    pub site: String,
    /// Sensor name.
    pub sensor: String,
    /// Depth below the surface, m, where known.
    pub depth_m: Option<f64>,
    /// What the levels describe.
    pub kind: LevelKind,
    /// The statistic that made one level of several samples.
    pub statistic: LevelStatistic,
    /// Windows in increasing order, none twice.
    pub windows: Vec<Window>,
    /// Deployment of each window: an index into `deployments`; `None` outside all of them.
    pub deployment: Vec<Option<u32>>,
    /// Names of the deployments; empty where the study names none.
    pub deployments: Vec<String>,
    /// Bands in increasing order of frequency.
    pub bands: Vec<BandLevels>,
}

/// The levels of one band, one entry a window.
#[derive(Debug, Clone, PartialEq)]
pub struct BandLevels {
    /// The band.
    pub band: Band,
    /// Level, dB, of the record's kind; NaN where there is none.
    pub level_db: Vec<f64>,
    /// Number of level samples behind each level. Empty: one sample a level.
    pub samples: Vec<u32>,
    /// Seconds of level samples behind each level. Empty: the length of the window.
    pub seconds: Vec<f32>,
    /// Why a level is missing or not used.
    pub reason: Vec<Option<Missing>>,
}

impl BandLevels {
    /// Number of level samples behind the level of a window.
    pub fn samples_at(&self, window: usize) -> u32 {
        self.samples.get(window).copied().unwrap_or_else(|| u32::from(self.level_db[window].is_finite()))
    }

    /// Seconds of level samples behind the level of a window of this length, s.
    pub fn seconds_at(&self, window: usize, length_s: f64) -> f64 {
        match self.seconds.get(window) {
            Some(seconds) => f64::from(*seconds),
            None if self.level_db[window].is_finite() => length_s,
            None => 0.0,
        }
    }
}

impl SensorRecord {
    /// How many pairs of neighbouring windows overlap in time: such levels are not independent.
    pub fn overlapping_windows(&self) -> usize {
        self.windows.windows(2).filter(|pair| pair[1].start < pair[0].end).count()
    }
}
