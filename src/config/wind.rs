//! `[[wind]]`: gridded wind, or wind from a table.

use super::error::{Complaint, StudyError};
use super::place::{Code, FilePatterns, HeightM, SpanH, in_words, time_rules};
use crate::io::delimited::TextOptions;
use crate::io::netcdf::{DirectionSense, WindOptions};
use crate::io::wind_table::{WindColumns, WindTableOptions};
use crate::model::SourceId;
use serde::{Deserialize, Serialize};
use std::path::{Path, PathBuf};

/// The sense of a direction, as written.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
enum RawSense {
    /// Where it comes from.
    From,
    /// Where it goes to.
    To,
}

/// `[[wind]]` as written. Everything but `id` and the files is only needed where the files do not say it.
#[derive(Debug, Clone, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct RawWind {
    id: Option<String>,
    files: Option<FilePatterns>,
    table: Option<FilePatterns>,
    site: Option<String>,
    eastward: Option<String>,
    northward: Option<String>,
    speed: Option<String>,
    direction: Option<String>,
    direction_sense: Option<RawSense>,
    grid_relative: Option<bool>,
    units: Option<String>,
    height_m: Option<HeightM>,
    member: Option<i64>,
    time: Option<String>,
    time_units: Option<String>,
    time_zone: Option<String>,
    calendar: Option<String>,
    latitude: Option<String>,
    longitude: Option<String>,
    max_gap_h: Option<SpanH>,
    time_unit: Option<String>,
    date_order: Option<String>,
    #[serde(default)]
    missing_codes: Vec<Code>,
    delimiter: Option<String>,
    decimal_mark: Option<String>,
    encoding: Option<String>,
    comment: Option<String>,
}

/// Where a wind input comes from.
#[derive(Debug, Clone, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum WindOrigin {
    /// Gridded fields or station files (NetCDF).
    Grid {
        /// The files.
        files: Vec<PathBuf>,
        /// What the study adds to what the files say.
        #[serde(serialize_with = "in_words")]
        options: WindOptions,
    },
    /// A table of one place: buoy, station, ship log.
    Table {
        /// The files.
        files: Vec<PathBuf>,
        /// What the study adds to what the files say.
        #[serde(serialize_with = "in_words")]
        options: WindTableOptions,
        /// The site that it serves; `None`: all.
        site: Option<String>,
        /// Steps farther apart than this are a gap, ms.
        max_gap_ms: i64,
    },
}

/// A wind input of the study.
#[derive(Debug, Clone, Serialize)]
pub struct WindInput {
    /// Its id.
    pub id: SourceId,
    /// Where it comes from.
    pub origin: WindOrigin,
}

impl WindInput {
    /// The files of a gridded input; `None` for a table.
    pub fn grid_files(&self) -> Option<&[PathBuf]> {
        match &self.origin {
            WindOrigin::Grid { files, .. } => Some(files),
            WindOrigin::Table { .. } => None,
        }
    }
}

/// A gap in a wind table that is still bridged where the study does not say it, h: two hourly steps.
const TABLE_GAP_H: f64 = 2.0;

impl RawWind {
    pub(super) fn resolve(self, base: &Path, complaint: Complaint<'_>, place: usize) -> Result<WindInput, StudyError> {
        let Some(id) = self.id.clone() else {
            return Err(complaint.at(place, "`[[wind]]` needs `id`: a short name that tables carry"));
        };
        let origin = match (&self.files, &self.table) {
            (Some(files), None) => {
                let files = files.resolve(base, "wind.files", complaint)?;
                WindOrigin::Grid {
                    files,
                    options: self.grid_options().map_err(|problem| complaint.at(place, problem))?,
                }
            }
            (None, Some(files)) => {
                let files = files.resolve(base, "wind.table", complaint)?;
                let options = self.table_options().map_err(|problem| complaint.at(place, problem))?;
                let max_gap_ms = (self.max_gap_h.map_or(TABLE_GAP_H, |h| h.0) * 3.6e6).round() as i64;
                WindOrigin::Table { files, options, site: self.site, max_gap_ms }
            }
            _ => {
                let problem = format!("wind `{id}` needs either `files` (NetCDF) or `table` (CSV or Parquet)");
                return Err(complaint.at(place, problem));
            }
        };
        Ok(WindInput { id: SourceId(id), origin })
    }
}

impl RawWind {
    fn table_options(&self) -> Result<WindTableOptions, String> {
        let times =
            time_rules("wind", self.time_zone.as_deref(), self.time_unit.as_deref(), self.date_order.as_deref())?;
        Ok(WindTableOptions {
            columns: WindColumns {
                time: self.time.clone(),
                speed: self.speed.clone(),
                direction: self.direction.clone(),
                eastward: self.eastward.clone(),
                northward: self.northward.clone(),
            },
            units: self.units.clone(),
            direction_sense: self.direction_sense.map(|sense| match sense {
                RawSense::From => "from".to_owned(),
                RawSense::To => "to".to_owned(),
            }),
            height_m: self.height_m.map(|height| height.0),
            times,
            missing_codes: self.missing_codes.iter().map(|code| code.0.clone()).collect(),
            text: TextOptions {
                delimiter: self.delimiter.clone(),
                decimal_mark: self.decimal_mark.clone(),
                encoding: self.encoding.clone(),
                comment: self.comment.clone(),
            },
        })
    }
}

impl RawWind {
    fn grid_options(&self) -> Result<WindOptions, String> {
        if self.time_zone.is_some() || self.time_unit.is_some() {
            return Err("`wind.time_zone` and `wind.time_unit` are for tables; the time of NetCDF files is stated by `wind.time_units`".to_owned());
        }
        Ok(WindOptions {
            eastward: self.eastward.clone(),
            northward: self.northward.clone(),
            speed: self.speed.clone(),
            direction: self.direction.clone(),
            direction_sense: self.direction_sense.map(|sense| match sense {
                RawSense::From => DirectionSense::From,
                RawSense::To => DirectionSense::To,
            }),
            grid_relative: self.grid_relative,
            units: self.units.clone(),
            height_m: self.height_m.map(|height| height.0),
            member: self.member,
            time: self.time.clone(),
            time_units: self.time_units.clone(),
            calendar: self.calendar.clone(),
            latitude: self.latitude.clone(),
            longitude: self.longitude.clone(),
            max_gap_ms: self.max_gap_h.map(|hours| (hours.0 * 3.6e6).round() as i64),
        })
    }
}

/// The options of `sample waves`: `variable`, and of the keys of `[[wind]]` those about axes, time and sense.
///
/// # Errors
/// When a key is unknown or a value does not fit; the message names it.
pub fn wave_options_from(settings: &[String]) -> Result<(WindOptions, Option<String>), StudyError> {
    let is_variable = |text: &&String| text.split('=').next().is_some_and(|key| key.trim() == "variable");
    let variable = settings.iter().find(is_variable).and_then(|text| text.split_once('='));
    let rest: Vec<String> = settings.iter().filter(|text| !is_variable(text)).cloned().collect();
    Ok((wind_options_from(&rest)?, variable.map(|(_, name)| name.trim().to_owned())))
}

/// The options that `key=value` texts of the command line give: exactly the keys of `[[wind]]`.
///
/// # Errors
/// When a key is unknown or a value does not fit; the message names it.
pub fn wind_options_from(settings: &[String]) -> Result<WindOptions, StudyError> {
    let raw: RawWind = super::set::parse(settings)?;
    raw.grid_options().map_err(|problem| StudyError::Lacking { path: "--set".into(), problem })
}
