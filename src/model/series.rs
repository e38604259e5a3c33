//! Wind at sites, at the native steps of its source.

use crate::model::{FlagSet, Missing};
use crate::units::Instant;
use serde::{Deserialize, Serialize};

/// Name of a wind or spectra input; unique within a study, and a column of every table.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
pub struct SourceId(pub String);

impl std::fmt::Display for SourceId {
    fn fmt(&self, formatter: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        formatter.write_str(&self.0)
    }
}

/// A grid node or station that a site's values were taken from.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct NodeUse {
    /// Degrees north.
    pub latitude_deg: f64,
    /// Degrees east.
    pub longitude_deg: f64,
    /// Weight of the node at the site, 0 to 1, before the coast rule.
    pub weight: f64,
    /// Distance from the site along the sphere, km.
    pub distance_km: f64,
}

/// Wind at one site at the native steps of one source. All vectors but `nodes` have one entry per step; missing numbers
/// are NaN and have their reason in `missing`.
#[derive(Debug, Clone, PartialEq)]
pub struct WindSeries {
    /// The source.
    pub source: SourceId,
    /// Site name.
    pub site: String,
    /// Native steps, strictly increasing.
    pub steps: Vec<Instant>,
    /// Component towards the east, m/s; NaN throughout where the source has only a speed.
    pub eastward_m_s: Vec<f64>,
    /// Component towards the north, m/s.
    pub northward_m_s: Vec<f64>,
    /// Speed interpolated as a scalar in space, m/s (at most the mean of the nodes' speeds; never below the speed of the
    /// interpolated components).
    pub scalar_speed_m_s: Vec<f64>,
    /// Remarks.
    pub flags: Vec<FlagSet>,
    /// Why a step has no value.
    pub missing: Vec<Option<Missing>>,
    /// Nodes used (for a moving site: at its first position on the grid).
    pub nodes: Vec<NodeUse>,
    /// Height above the surface that the wind refers to, m, where known.
    pub height_m: Option<f64>,
    /// Steps farther apart than this are a gap, never bridged, ms.
    pub max_gap_ms: i64,
}

impl WindSeries {
    /// Whether the source has a direction and not only a speed.
    pub fn has_components(&self) -> bool {
        self.eastward_m_s.iter().any(|value| value.is_finite())
    }
}
