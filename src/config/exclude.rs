//! `[[exclude]]`: what is left out by rule.

use super::error::{Complaint, StudyError};
use crate::science::exclusion::{Expression, RULE_COLUMNS};
use serde::{Deserialize, Serialize};
use std::path::{Path, PathBuf};
use toml::Spanned;

/// `[[exclude]]` as written.
#[derive(Debug, Clone, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct RawExclude {
    when: Option<Spanned<String>>,
    intervals: Option<Spanned<String>>,
    reason: Option<String>,
    #[serde(default)]
    sites: Vec<String>,
    #[serde(default)]
    sensors: Vec<String>,
}

/// A rule of the study.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct ExcludeInput {
    /// What is left out.
    pub what: ExcludeWhat,
    /// Why; tables and figures carry it.
    pub reason: String,
    /// Sites that it applies to; empty: all.
    pub sites: Vec<String>,
    /// Sensors that it applies to; empty: all.
    pub sensors: Vec<String>,
}

/// What a rule leaves out.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum ExcludeWhat {
    /// Pairs for which a condition is true.
    When {
        /// As written.
        text: String,
        /// As read.
        #[serde(skip)]
        condition: Expression,
    },
    /// Windows that overlap an interval of a list.
    Intervals(PathBuf),
}

impl RawExclude {
    pub(super) fn resolve(
        self,
        base: &Path,
        complaint: Complaint<'_>,
        place: usize,
    ) -> Result<ExcludeInput, StudyError> {
        let (what, usual_reason) = match (self.when, self.intervals) {
            (Some(when), None) => {
                let at = when.span().start;
                let text = when.into_inner();
                let condition = Expression::parse(&text, &RULE_COLUMNS)
                    .map_err(|error| complaint.at(at, format!("`exclude.when`, {error}")))?;
                (ExcludeWhat::When { text: text.clone(), condition }, text)
            }
            (None, Some(list)) => {
                let path = base.join(list.get_ref());
                if !path.is_file() {
                    let problem = format!("`exclude.intervals`: there is no file {}", path.display());
                    return Err(complaint.at(list.span().start, problem));
                }
                let name = path.file_name().unwrap_or_default().to_string_lossy().into_owned();
                (ExcludeWhat::Intervals(path), name)
            }
            _ => {
                let problem =
                    "`[[exclude]]` needs either `when` (a condition) or `intervals` (a list of start, end, reason)";
                return Err(complaint.at(place, problem));
            }
        };
        Ok(ExcludeInput { what, reason: self.reason.unwrap_or(usual_reason), sites: self.sites, sensors: self.sensors })
    }
}
