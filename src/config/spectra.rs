//! `[[spectra]]`: directional wave spectra.

use super::error::{Complaint, StudyError};
use super::place::{DistanceKm, FilePatterns, LatitudeDeg, LongitudeDeg, SpanH, in_words};
use crate::io::netcdf::{DensityEncoding, DirectionRotation, DirectionSense, SpectraOptions};
use crate::model::SourceId;
use serde::{Deserialize, Serialize};
use std::path::{Path, PathBuf};

/// The sense of directions, as written.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "snake_case")]
pub(super) enum RawSense {
    /// Where waves come from.
    From,
    /// Where they go to.
    To,
}

/// How directions are counted, as written.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "snake_case")]
enum RawRotation {
    /// Clockwise from true north.
    ClockwiseFromNorth,
    /// Counter-clockwise from east.
    CounterclockwiseFromEast,
}

/// How densities are stored, as written.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "snake_case")]
enum RawEncoding {
    /// As they are.
    Linear,
    /// As decimal logarithms.
    Log10,
}

/// `[[spectra]]` as written. Everything but `id` and `files` is only needed where the files do not say it.
#[derive(Debug, Clone, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct RawSpectra {
    id: Option<String>,
    files: Option<FilePatterns>,
    wind: Option<String>,
    density: Option<String>,
    density_units: Option<String>,
    encoding: Option<RawEncoding>,
    log10_added: Option<f64>,
    frequency: Option<String>,
    frequency_units: Option<String>,
    frequency_hz: Option<Vec<f64>>,
    direction: Option<String>,
    direction_units: Option<String>,
    direction_deg: Option<Vec<f64>>,
    direction_sense: Option<RawSense>,
    direction_rotation: Option<RawRotation>,
    tail_start_hz: Option<f64>,
    member: Option<i64>,
    time: Option<String>,
    time_units: Option<String>,
    calendar: Option<String>,
    latitude: Option<String>,
    longitude: Option<String>,
    latitude_deg: Option<LatitudeDeg>,
    longitude_deg: Option<LongitudeDeg>,
    max_distance_km: Option<DistanceKm>,
    max_gap_h: Option<SpanH>,
}

/// A spectra input of the study.
#[derive(Debug, Clone, Serialize)]
pub struct SpectraInput {
    /// Its id.
    pub id: SourceId,
    /// The files.
    pub files: Vec<PathBuf>,
    /// The wind input that tells wind sea from swell; `None`: the first of the study.
    pub wind: Option<String>,
    /// Start of the laid-on tail as the study states it, Hz.
    pub tail_start_hz: Option<f64>,
    /// What the study adds to what the files say.
    #[serde(serialize_with = "in_words")]
    pub options: SpectraOptions,
}

impl RawSpectra {
    pub(super) fn resolve(
        self,
        base: &Path,
        complaint: Complaint<'_>,
        place: usize,
    ) -> Result<SpectraInput, StudyError> {
        let Some(id) = self.id.clone() else {
            return Err(complaint.at(place, "`[[spectra]]` needs `id`: a short name that tables carry"));
        };
        let Some(files) = &self.files else {
            return Err(complaint.at(place, format!("spectra `{id}` needs `files`")));
        };
        let files = files.resolve(base, "spectra.files", complaint)?;
        let options = self.options().map_err(|problem| complaint.at(place, problem))?;
        Ok(SpectraInput { id: SourceId(id), files, wind: self.wind, tail_start_hz: self.tail_start_hz, options })
    }

    fn options(&self) -> Result<SpectraOptions, String> {
        let positive = |key: &str, value: Option<f64>| match value {
            Some(value) if !(value > 0.0 && value.is_finite()) => {
                Err(format!("`spectra.{key}` is {value}; expected a frequency above 0 Hz"))
            }
            _ => Ok(()),
        };
        positive("tail_start_hz", self.tail_start_hz)?;
        for value in self.frequency_hz.iter().flatten() {
            positive("frequency_hz", Some(*value))?;
        }
        if let Some(value) = self.direction_deg.iter().flatten().find(|value| !(-360.0..=720.0).contains(*value)) {
            return Err(format!("`spectra.direction_deg` holds {value}; expected degrees of -360 to 720"));
        }
        let encoding = match (self.encoding, self.log10_added) {
            (Some(RawEncoding::Linear), Some(_)) => {
                return Err("`spectra.log10_added` goes with `spectra.encoding = \"log10\"`".to_owned());
            }
            (Some(RawEncoding::Linear), None) => Some(DensityEncoding::Linear),
            (Some(RawEncoding::Log10), added) => Some(DensityEncoding::Log10 { added: added.unwrap_or(0.0) }),
            (None, Some(added)) => Some(DensityEncoding::Log10 { added }),
            (None, None) => None,
        };
        if self.latitude_deg.is_some() != self.longitude_deg.is_some() {
            return Err("`spectra.latitude_deg` and `spectra.longitude_deg` go together".to_owned());
        }
        Ok(SpectraOptions {
            density: self.density.clone(),
            frequency: self.frequency.clone(),
            frequency_units: self.frequency_units.clone(),
            frequency_hz: self.frequency_hz.clone(),
            direction: self.direction.clone(),
            direction_units: self.direction_units.clone(),
            direction_deg: self.direction_deg.clone(),
            direction_sense: self.direction_sense.map(|sense| match sense {
                RawSense::From => DirectionSense::From,
                RawSense::To => DirectionSense::To,
            }),
            direction_rotation: self.direction_rotation.map(|rotation| match rotation {
                RawRotation::ClockwiseFromNorth => DirectionRotation::ClockwiseFromNorth,
                RawRotation::CounterclockwiseFromEast => DirectionRotation::CounterclockwiseFromEast,
            }),
            density_units: self.density_units.clone(),
            encoding,
            member: self.member,
            time: self.time.clone(),
            time_units: self.time_units.clone(),
            calendar: self.calendar.clone(),
            latitude: self.latitude.clone(),
            longitude: self.longitude.clone(),
            latitude_deg: self.latitude_deg.map(|value| value.0),
            longitude_deg: self.longitude_deg.map(|value| value.0),
            max_distance_km: self.max_distance_km.map(|km| km.0),
            max_gap_ms: self.max_gap_h.map(|hours| (hours.0 * 3.6e6).round() as i64),
        })
    }
}

/// The options that `key=value` texts of the command line give: exactly the keys of `[[spectra]]`; and the stated start of
/// the tail.
///
/// # Errors
/// When a key is unknown or a value does not fit; the message names it.
pub fn spectra_options_from(settings: &[String]) -> Result<(SpectraOptions, Option<f64>), StudyError> {
    let raw: RawSpectra = super::set::parse(settings)?;
    let options = raw.options().map_err(|problem| StudyError::Lacking { path: "--set".into(), problem })?;
    Ok((options, raw.tail_start_hz))
}
