//! The sea in the rows of tables: over windows, and at half of a band's frequency.

use super::matchup::SensorRecord;
use super::outcome::{FlagSet, Missing};
use super::radiated::{NotRadiated, Radiated};
use super::sea_state::WindSea;
use super::series::SourceId;

/// The sea over one window; missing numbers are NaN.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SeaSummary {
    /// Significant height, m.
    pub hs_m: f64,
    /// Peak frequency (parabola), Hz.
    pub peak_hz: f64,
    /// Mean period m0/m1, s.
    pub tm01_s: f64,
    /// Mean direction that waves come from, degrees.
    pub mean_from_deg: f64,
    /// Directional spread, degrees.
    pub spread_deg: f64,
    /// The wind sea.
    pub wind_sea: Option<WindSea>,
    /// Significant height of the rest, m.
    pub swell_hs_m: f64,
    /// Start of the laid-on tail, Hz; NaN where none is found.
    pub tail_start_hz: f64,
}

/// The sea of one spectra source over the windows of a sensor's record.
#[derive(Debug, Clone, PartialEq)]
pub struct SeaConditions {
    /// The spectra input.
    pub source: SourceId,
    /// The wind input that tells wind sea from swell; `None` without one.
    pub wind: Option<SourceId>,
    /// One entry a window.
    pub sea: Vec<Option<SeaSummary>>,
    /// Remarks on each window.
    pub flags: Vec<FlagSet>,
    /// Why a window has no sea.
    pub missing: Vec<Option<Missing>>,
    /// Distance from the site to the nearest node or station used, km.
    pub nearest_km: f64,
}

/// The sea at half of a band's frequency in one window; missing numbers are NaN.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct BandSea {
    /// Half the centre frequency over the peak frequency of the wind sea.
    pub f_over_fp: f64,
    /// Elevation density E(f), m2/Hz.
    pub density_m2_hz: f64,
    /// Overlap of opposing waves over the whole circle, 1/rad.
    pub overlap_2pi_per_rad: f64,
    /// Share of the overlap that blending of stored spectra made.
    pub cross_share: f64,
    /// What opposing waves radiate in the band.
    pub radiated: Radiated,
}

impl BandSea {
    /// A window without a sea.
    pub const NONE: Self = Self {
        f_over_fp: f64::NAN,
        density_m2_hz: f64::NAN,
        overlap_2pi_per_rad: f64::NAN,
        cross_share: f64::NAN,
        radiated: Err(NotRadiated::NoSpectrum),
    };

    /// Radiated level in the record's own kind, dB; NaN where there is none.
    pub fn radiated_db(&self, record: &SensorRecord, band: usize) -> f64 {
        self.radiated.map_or(f64::NAN, |level| level.in_kind_db(record.kind, record.bands[band].band))
    }
}

/// Rows of the sea for a run of windows: bands vary fastest.
#[derive(Debug, Clone)]
pub struct SeaRows<'a> {
    /// The whole record's conditions.
    pub conditions: &'a SeaConditions,
    /// Window by window, band by band, for the run of windows alone.
    pub bands: Vec<BandSea>,
}
