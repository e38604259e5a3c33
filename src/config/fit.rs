//! `[relation]`: how level is fitted against wind speed.

use super::error::{Complaint, StudyError};
use super::place::WindSpeedMS;
use crate::science::level_wind::{KeepReplicates, Loss, Options, ScatterModel, Segments};
use serde::{Deserialize, Serialize};
use toml::Spanned;

/// Most replicates that are allowed: more change no interval by a printed digit.
const MOST_REPLICATES: usize = 20_000;

/// `[relation]` as written.
#[derive(Debug, Clone, Default, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct RawRelation {
    loss: Option<Loss>,
    scatter: Option<ScatterModel>,
    segments: Option<Segments>,
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
        let keep_replicates = match self.keep_replicates {
            Some(true) => KeepReplicates::Yes,
            Some(false) | None => defaults.keep_replicates,
        };
        Ok(RelationSection {
            options: Options {
                loss: self.loss.unwrap_or(defaults.loss),
                scatter: self.scatter.unwrap_or(defaults.scatter),
                segments: self.segments.unwrap_or(defaults.segments),
                replicates,
                seed: self.seed.unwrap_or(defaults.seed),
                keep_replicates,
                wind_error_sd_m_s: self.wind_error_sd_m_s.map(|sd| sd.0).filter(|sd| *sd > 0.0),
            },
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
