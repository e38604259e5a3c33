//! `[relation]`: how level is fitted against wind speed.

use super::error::{Complaint, StudyError};
use super::place::WindSpeedMS;
use crate::science::level_wind::{KeepReplicates, Loss, Options, ScatterModel, Segments};
use serde::{Deserialize, Serialize};
use toml::Spanned;

/// Most replicates that are allowed: more change no interval by a printed digit.
const MOST_REPLICATES: usize = 20_000;

/// What may have an offset of its own, which moves floor and wind part together.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum OffsetBy {
    /// Every deployment.
    Deployment,
}

/// What may have a floor of its own.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum FloorBy {
    /// Every deployment.
    Deployment,
    /// Every calendar month (UTC).
    Month,
}

/// What the segments of a record are.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Default)]
#[serde(rename_all = "snake_case")]
pub enum SegmentBy {
    /// Deployments.
    #[default]
    Deployment,
    /// Calendar months (UTC).
    Month,
    /// Calendar months within deployments.
    DeploymentAndMonth,
}

/// Which parameters segments have of their own, and what the segments are. With neither choice, deployments have a floor and
/// a wind part of their own if a test finds that they differ.
///
/// # Errors
/// A sentence, when the choices contradict each other.
pub fn segment_choice(
    offset_by: Option<OffsetBy>,
    floor_by: Option<FloorBy>,
    pool_deployments: bool,
) -> Result<(Segments, SegmentBy), String> {
    match (offset_by, floor_by, pool_deployments) {
        (None, None, true) => Ok((Segments::Pooled, SegmentBy::Deployment)),
        (_, _, true) => {
            Err("`relation.pool_deployments` contradicts `offset_by` and `floor_by`; expected one of them".to_owned())
        }
        (None, None, false) => Ok((Segments::Tested, SegmentBy::Deployment)),
        (Some(OffsetBy::Deployment), None, false) => Ok((Segments::Offset, SegmentBy::Deployment)),
        (None, Some(FloorBy::Deployment), false) => Ok((Segments::Floor, SegmentBy::Deployment)),
        (None, Some(FloorBy::Month), false) => Ok((Segments::Floor, SegmentBy::Month)),
        (Some(OffsetBy::Deployment), Some(FloorBy::Deployment), false) => {
            Ok((Segments::FloorAndWindPart, SegmentBy::Deployment))
        }
        // Free wind parts of the months hold the offset of the deployment.
        (Some(OffsetBy::Deployment), Some(FloorBy::Month), false) => {
            Ok((Segments::FloorAndWindPart, SegmentBy::DeploymentAndMonth))
        }
    }
}

/// `[relation]` as written.
#[derive(Debug, Clone, Default, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct RawRelation {
    loss: Option<Loss>,
    scatter: Option<ScatterModel>,
    offset_by: Option<OffsetBy>,
    floor_by: Option<FloorBy>,
    pool_deployments: Option<bool>,
    replicates: Option<Spanned<usize>>,
    seed: Option<u64>,
    keep_replicates: Option<bool>,
    screen: Option<bool>,
    wind_error_sd_m_s: Option<WindSpeedMS>,
}

/// `[relation]` with its defaults.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct RelationSection {
    /// The choices of the fit.
    pub options: Options,
    /// What the segments are that may differ.
    pub segment_by: SegmentBy,
    /// Whether short events that raise most bands at once are left out.
    pub screen: bool,
}

impl RawRelation {
    pub(super) fn resolve(self, complaint: Complaint<'_>) -> Result<RelationSection, StudyError> {
        let defaults = Options::default();
        let replicates = match self.replicates {
            None => defaults.replicates,
            Some(number) => {
                let place = number.span().start;
                check_replicates(number.into_inner()).map_err(|problem| complaint.at(place, problem))?
            }
        };
        let pool = self.pool_deployments.unwrap_or(false);
        let (segments, segment_by) =
            segment_choice(self.offset_by, self.floor_by, pool).map_err(|problem| complaint.lacking(&problem))?;
        let keep_replicates = match self.keep_replicates {
            Some(true) => KeepReplicates::Yes,
            Some(false) | None => defaults.keep_replicates,
        };
        Ok(RelationSection {
            options: Options {
                loss: self.loss.unwrap_or(defaults.loss),
                scatter: self.scatter.unwrap_or(defaults.scatter),
                segments,
                replicates,
                seed: self.seed.unwrap_or(defaults.seed),
                keep_replicates,
                wind_error_sd_m_s: self.wind_error_sd_m_s.map(|sd| sd.0).filter(|sd| *sd > 0.0),
            },
            segment_by,
            screen: self.screen.unwrap_or(false),
        })
    }
}

/// Checks a number of replicates: 0 for estimates alone, or 100 to 20000.
///
/// # Errors
/// A sentence, when the number is another one.
pub fn check_replicates(number: usize) -> Result<usize, String> {
    if number == 0 || (100..=MOST_REPLICATES).contains(&number) {
        Ok(number)
    } else {
        Err(format!(
            "{number} replicates are not allowed; expected 0 (estimates alone) or 100 to {MOST_REPLICATES}: fewer give no 95 % interval"
        ))
    }
}
