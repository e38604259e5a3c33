//! `[[levels]]`: tables of band levels.

use super::error::{Complaint, StudyError};
use super::place::{Code, FilePatterns, WindowS, in_words};
use crate::io::delimited::TextOptions;
use crate::io::levels::{BandEdges, Layout, LevelColumns, LevelOptions};
use crate::model::{BandScheme, LevelKind, LevelScale, PressureReference, Stamp};
use serde::{Deserialize, Serialize};
use std::path::{Path, PathBuf};

/// A layout as written.
#[derive(Debug, Clone, Copy, Deserialize)]
#[serde(rename_all = "snake_case")]
enum RawLayout {
    Long,
    Wide,
}

/// `[[levels.band_edges]]` as written.
#[derive(Debug, Clone, Deserialize)]
#[serde(deny_unknown_fields)]
struct RawBandEdges {
    #[serde(default)]
    name: String,
    low_hz: f64,
    high_hz: f64,
}

fn texts(codes: Vec<Code>) -> Vec<String> {
    codes.into_iter().map(|code| code.0).collect()
}

/// `[[levels]]` as written. Everything but `files` is only needed where the files do not say it.
#[derive(Debug, Clone, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct RawLevels {
    files: Option<FilePatterns>,
    sensor: Option<String>,
    layout: Option<RawLayout>,
    time: Option<String>,
    site: Option<String>,
    site_id: Option<String>,
    band: Option<String>,
    level: Option<String>,
    window_start: Option<String>,
    window_end: Option<String>,
    qc: Option<String>,
    #[serde(default)]
    qc_keep: Vec<Code>,
    reference: Option<PressureReference>,
    kind: Option<LevelKind>,
    scale: Option<LevelScale>,
    bands: Option<BandScheme>,
    #[serde(default)]
    band_edges: Vec<RawBandEdges>,
    band_prefix: Option<String>,
    window_s: Option<WindowS>,
    stamp: Option<Stamp>,
    time_zone: Option<String>,
    time_unit: Option<String>,
    date_order: Option<String>,
    #[serde(default)]
    missing_codes: Vec<Code>,
    delimiter: Option<String>,
    decimal_mark: Option<String>,
    encoding: Option<String>,
    comment: Option<String>,
}

/// A level table of the study.
#[derive(Debug, Clone, Serialize)]
pub struct LevelsInput {
    /// The files.
    pub files: Vec<PathBuf>,
    /// The sensor that measured; `None`: the first sensor of each site.
    pub sensor: Option<String>,
    /// What the study adds to what the files say.
    #[serde(serialize_with = "in_words")]
    pub options: LevelOptions,
}

impl RawLevels {
    pub(super) fn resolve(
        self,
        base: &Path,
        complaint: Complaint<'_>,
        place: usize,
    ) -> Result<LevelsInput, StudyError> {
        let Some(patterns) = &self.files else {
            return Err(complaint.at(place, "`[[levels]]` needs `files`: one or more level tables"));
        };
        let files = patterns.resolve(base, "levels.files", complaint)?;
        Ok(LevelsInput { files, sensor: self.sensor.clone(), options: self.options() })
    }

    /// The options of the reader.
    fn options(self) -> LevelOptions {
        LevelOptions {
            layout: self.layout.map(|layout| match layout {
                RawLayout::Long => Layout::Long,
                RawLayout::Wide => Layout::Wide,
            }),
            columns: LevelColumns {
                time: self.time,
                site: self.site,
                band: self.band,
                level: self.level,
                window_start: self.window_start,
                window_end: self.window_end,
                qc: self.qc,
            },
            site: self.site_id,
            reference: self.reference,
            kind: self.kind,
            scale: self.scale,
            bands: self.bands,
            band_edges: self
                .band_edges
                .into_iter()
                .map(|raw| BandEdges { name: raw.name, low_hz: raw.low_hz, high_hz: raw.high_hz })
                .collect(),
            band_prefix: self.band_prefix,
            window_s: self.window_s.map(|span| span.0),
            stamp: self.stamp,
            time_zone: self.time_zone,
            time_unit: self.time_unit,
            date_order: self.date_order,
            missing_codes: texts(self.missing_codes),
            qc_keep: texts(self.qc_keep),
            text: TextOptions {
                delimiter: self.delimiter,
                decimal_mark: self.decimal_mark,
                encoding: self.encoding,
                comment: self.comment,
            },
        }
    }
}

/// The options that `key=value` texts of the command line give: exactly the keys of `[[levels]]`.
///
/// # Errors
/// When a key is unknown or a value does not fit; the message names it.
pub fn level_options_from(settings: &[String]) -> Result<LevelOptions, StudyError> {
    let raw: RawLevels = super::set::parse(settings)?;
    Ok(raw.options())
}
