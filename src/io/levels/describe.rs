//! What was understood of level tables: at once from headers, or in full from a pass over all rows.

use super::error::LevelError;
use super::open::{Format, LevelTable};
use super::plan::{WindowRule, reference_name};
use crate::model::{Band, LevelKind, LevelRow, Missing, Stamp};
use crate::units::{Hertz, Instant, Window};
use std::collections::BTreeMap;
use std::path::PathBuf;

/// What was understood of one file from its header and first rows.
#[derive(Debug, Clone, PartialEq)]
pub struct LevelFileSummary {
    /// The file.
    pub path: PathBuf,
    /// "delimited text" or "Parquet".
    pub format: &'static str,
    /// "long" or "wide".
    pub layout: &'static str,
    /// Rows, where the file states them.
    pub rows: Option<u64>,
    /// Reference of the levels in the file.
    pub reference: &'static str,
    /// Length of the windows, s; `None` where two columns give them.
    pub window_s: Option<f64>,
    /// Which instant of the window the stamp is; `None` where two columns give both.
    pub stamp: Option<Stamp>,
    /// Remarks: what was taken how.
    pub notes: Vec<String>,
    /// What the user should look at.
    pub warnings: Vec<String>,
}

/// What was understood of a level table without reading all rows.
#[derive(Debug, Clone, PartialEq)]
pub struct LevelSummary {
    /// The files.
    pub files: Vec<LevelFileSummary>,
    /// What the levels describe.
    pub kind: LevelKind,
    /// Sites known so far.
    pub sites: Vec<String>,
    /// Bands known so far.
    pub bands: Vec<Band>,
    /// Remarks on all files together, such as the zone of times without one.
    pub notes: Vec<String>,
}

/// What a pass over all rows found.
#[derive(Debug, Clone, PartialEq)]
pub struct LevelSurvey {
    /// Level samples (a wide row has one a band).
    pub samples: u64,
    /// Samples with a level that is used.
    pub usable: u64,
    /// How many samples are not used, by reason.
    pub reasons: BTreeMap<Missing, u64>,
    /// Start of the first and end of the last window.
    pub span: Option<Window>,
    /// Samples whose window starts before that of the sample before them at the same site and band.
    pub out_of_order: u64,
    /// Samples whose window overlaps that of the sample before them at the same site and band.
    pub overlapping: u64,
    /// Smallest and largest level, dB, where there is one.
    pub range_db: Option<(f64, f64)>,
}

impl LevelTable {
    /// What was understood so far, without reading more.
    pub fn describe(&self) -> LevelSummary {
        let files = self
            .files
            .iter()
            .map(|file| {
                let (window_s, stamp) = match file.plan.window {
                    WindowRule::Stamped { stamp, length_ms, .. } => (Some(length_ms as f64 / 1000.0), Some(stamp)),
                    WindowRule::Both { .. } => (None, None),
                };
                LevelFileSummary {
                    path: file.path.clone(),
                    format: match file.format {
                        Format::Text => "delimited text",
                        Format::Parquet => "Parquet",
                    },
                    layout: file.plan.layout.name(),
                    rows: file.rows,
                    reference: reference_name(file.plan.reference),
                    window_s,
                    stamp,
                    notes: file.notes.iter().chain(&file.plan.notes).cloned().collect(),
                    warnings: file.plan.warnings.clone(),
                }
            })
            .collect();
        LevelSummary {
            files,
            kind: self.kind(),
            sites: self.names().sites.clone(),
            bands: self.names().bands.clone(),
            notes: self.notes(),
        }
    }

    /// Remarks on the rows read so far: each said once.
    pub fn notes(&self) -> Vec<String> {
        let mut notes = Vec::new();
        if self.remarks.naive && self.times.zone_minutes.is_none() {
            notes.push("times without zone are taken as UTC (set `levels.time_zone` if they are not)".to_owned());
        }
        if self.blank_rows > 0 {
            notes.push(format!("rows with nothing in them, passed over: {}", self.blank_rows));
        }
        if self.remarks.leap_second {
            notes.push("a 60th second is counted as the next second (a leap second)".to_owned());
        }
        if self.remarks.hour_24 {
            notes.push("24:00 is counted as 00:00 of the next day".to_owned());
        }
        notes
    }

    /// The rows whose window holds an instant (all of them where there are several), for one look-up; only bands that hold
    /// the frequency, and only one site, where these are given.
    ///
    /// # Errors
    /// As `for_each`.
    pub fn rows_at(
        &mut self,
        instant: Instant,
        frequency: Option<Hertz>,
        site: Option<&str>,
    ) -> Result<Vec<LevelRow>, LevelError> {
        let mut found = Vec::new();
        self.for_each(|names, row| -> Result<(), LevelError> {
            let band = names.bands[row.band as usize];
            let holds = |frequency: Hertz| band.low_hz <= frequency.hz() && frequency.hz() < band.high_hz;
            if row.window.contains(instant)
                && frequency.is_none_or(holds)
                && site.is_none_or(|site| site == names.sites[row.site as usize])
            {
                found.push(row);
            }
            Ok(())
        })?;
        Ok(found)
    }

    /// Reads all rows and counts them.
    ///
    /// # Errors
    /// As `for_each`.
    pub fn survey(&mut self) -> Result<LevelSurvey, LevelError> {
        let mut survey = LevelSurvey {
            samples: 0,
            usable: 0,
            reasons: BTreeMap::new(),
            span: None,
            out_of_order: 0,
            overlapping: 0,
            range_db: None,
        };
        let mut before: Vec<Vec<Option<Window>>> = Vec::new();
        self.for_each(|_, row| -> Result<(), LevelError> {
            survey.samples += 1;
            if let Some(reason) = row.reason {
                *survey.reasons.entry(reason).or_default() += 1;
            } else {
                survey.usable += 1;
                let (low, high) = survey.range_db.unwrap_or((row.level_db, row.level_db));
                survey.range_db = Some((low.min(row.level_db), high.max(row.level_db)));
            }
            let span = survey.span.unwrap_or(row.window);
            let (start, end): (Instant, Instant) = (span.start.min(row.window.start), span.end.max(row.window.end));
            survey.span = Some(Window { start, end });
            let (site, band) = (row.site as usize, row.band as usize);
            if before.len() <= site {
                before.resize_with(site + 1, Vec::new);
            }
            let bands = &mut before[site];
            if bands.len() <= band {
                bands.resize(band + 1, None);
            }
            if let Some(last) = bands[band] {
                survey.out_of_order += u64::from(row.window.start < last.start);
                survey.overlapping += u64::from(row.window.start < last.end && last.start < row.window.end);
            }
            bands[band] = Some(row.window);
            Ok(())
        })?;
        Ok(survey)
    }
}
