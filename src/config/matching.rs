//! `[match]`: how levels are gathered and how wind is taken from the grid.

use super::error::{Complaint, StudyError};
use super::place::{DistanceKm, SpanS, in_words};
use crate::model::{CoastRule, LevelKind, LevelStatistic, SpatialRule};
use serde::{Deserialize, Serialize};

/// Which wind speed of a window the fit uses.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, Default)]
#[serde(rename_all = "snake_case")]
pub enum WindowSpeed {
    /// Mean over the window of the speed of the interpolated components.
    #[default]
    SpeedMean,
    /// Speed of the mean components.
    SpeedOfMean,
    /// Mean over the window of the speed interpolated as a scalar.
    ScalarSpeedMean,
}

impl WindowSpeed {
    /// The column of the matchup table that holds it.
    pub fn column(self) -> &'static str {
        match self {
            Self::SpeedMean => "wind_speed_mean_m_s",
            Self::SpeedOfMean => "wind_speed_of_mean_m_s",
            Self::ScalarSpeedMean => "scalar_wind_speed_mean_m_s",
        }
    }
}

/// How a value is taken from grid nodes.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, Default)]
#[serde(rename_all = "snake_case")]
enum Spatial {
    #[default]
    Bilinear,
    Nearest,
    Footprint,
}

/// What happens where a node around the site is land.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, Default)]
#[serde(rename_all = "snake_case")]
enum Coast {
    #[default]
    Missing,
    Renormalise,
}

/// `[match]` as written.
#[derive(Debug, Clone, Default, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct RawMatch {
    statistic: Option<LevelStatistic>,
    kind: Option<LevelKind>,
    window_s: Option<SpanS>,
    wind_speed: Option<WindowSpeed>,
    spatial: Option<Spatial>,
    coast: Option<Coast>,
    footprint_km: Option<DistanceKm>,
    max_distance_km: Option<DistanceKm>,
}

/// `[match]` with its defaults.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct MatchSection {
    /// Statistic that stands for several level samples of a window.
    pub statistic: LevelStatistic,
    /// Kind of level in the tables; `None`: as the level tables have it.
    pub kind: Option<LevelKind>,
    /// Length of the windows that samples are gathered into, s; `None`: each sample's own span.
    pub window_s: Option<f64>,
    /// The wind speed that the fit uses.
    pub wind_speed: WindowSpeed,
    /// How a value is taken from the grid.
    #[serde(serialize_with = "in_words")]
    pub spatial: SpatialRule,
}

/// Farthest nearest node that is allowed where the study does not say it, km.
const MAX_DISTANCE_KM: f64 = 50.0;
/// Radius of a footprint where the study does not say it, km.
const FOOTPRINT_KM: f64 = 50.0;

impl RawMatch {
    pub(super) fn resolve(self, complaint: Complaint<'_>) -> Result<MatchSection, StudyError> {
        let spatial = match (self.spatial.unwrap_or_default(), self.coast) {
            (Spatial::Bilinear, coast) => SpatialRule::Bilinear(match coast.unwrap_or_default() {
                Coast::Missing => CoastRule::Missing,
                Coast::Renormalise => CoastRule::Renormalise,
            }),
            (_, Some(_)) => {
                return Err(complaint.lacking(
                    "`match.coast` goes with `match.spatial = \"bilinear\"` alone; the others leave land out",
                ));
            }
            (Spatial::Nearest, None) => {
                SpatialRule::Nearest { max_distance_km: self.max_distance_km.map_or(MAX_DISTANCE_KM, |km| km.0) }
            }
            (Spatial::Footprint, None) => {
                SpatialRule::Footprint { radius_km: self.footprint_km.map_or(FOOTPRINT_KM, |km| km.0) }
            }
        };
        Ok(MatchSection {
            statistic: self.statistic.unwrap_or_default(),
            kind: self.kind,
            window_s: self.window_s.map(|span| span.0),
            wind_speed: self.wind_speed.unwrap_or_default(),
            spatial,
        })
    }
}

impl MatchSection {
    /// How a value is taken from the grid, in words.
    pub fn spatial_words(&self) -> String {
        match self.spatial {
            SpatialRule::Bilinear(CoastRule::Missing) => {
                "bilinear between the four nodes around the site; missing where one that is needed is land".to_owned()
            }
            SpatialRule::Bilinear(CoastRule::Renormalise) => {
                "bilinear between the four nodes around the site; where one is land, the weights of the others are scaled up and the value is flagged".to_owned()
            }
            SpatialRule::Nearest { max_distance_km } => format!("nearest node with data, at most {max_distance_km} km away"),
            SpatialRule::Footprint { radius_km } => format!("mean of all nodes with data within {radius_km} km"),
        }
    }
}
