//! `sample`: one look-up, through exactly the code that `match` uses.

use super::inputs::open_levels_of;
use super::progress::Silent;
use super::sampling::sample_wind;
use crate::Error;
use crate::config::{level_options_from, wind_options_from};
use crate::io::levels::LevelError;
use crate::io::netcdf::{WindSource, open_wind};
use crate::io::sites::{SiteOptions, find_site};
use crate::model::{FieldSource, FlagSet, Missing, Point, Site, SourceId, SpatialRule, Track, WindSeries};
use crate::science::matchup::wind_at;
use crate::units::{ComingFrom, Compass, Instant, Window};
use serde::Serialize;
use std::path::PathBuf;

/// What to look up.
#[derive(Debug, Clone, Default)]
pub struct LookUp {
    /// The files.
    pub files: Vec<PathBuf>,
    /// Degrees north.
    pub latitude_deg: Option<f64>,
    /// Degrees east.
    pub longitude_deg: Option<f64>,
    /// Instant, ISO 8601.
    pub time: Option<String>,
    /// Name of the quantity.
    pub quantity: Option<String>,
    /// Site.
    pub site: Option<String>,
    /// Band centre, Hz.
    pub frequency_hz: Option<f64>,
    /// Direction of travel, degrees.
    pub direction_deg: Option<f64>,
    /// How wind is taken from the grid.
    pub spatial: SpatialRule,
    /// Keys of the input's section, `key=value`.
    pub settings: Vec<String>,
}

/// The answer, as `--json` prints it.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Answer {
    /// `ok`, `flagged`, `missing` or `refused`.
    pub status: &'static str,
    /// Name of the quantity.
    pub quantity: String,
    /// The value; null where it is missing.
    pub value: Option<f64>,
    /// Its unit.
    pub unit: String,
    /// Names of the flags.
    pub flags: Vec<&'static str>,
    /// One sentence, where the status is not `ok`.
    pub message: Option<String>,
    /// What the value was made of.
    pub inputs: serde_json::Value,
}

impl Answer {
    pub(super) fn value(quantity: &str, value: f64, unit: &str) -> Self {
        Self {
            status: "ok",
            quantity: quantity.to_owned(),
            value: Some(value),
            unit: unit.to_owned(),
            flags: Vec::new(),
            message: None,
            inputs: serde_json::Value::Null,
        }
    }

    pub(super) fn missing(quantity: &str, unit: &str, why: Missing, detail: &str) -> Self {
        let message =
            if detail.is_empty() { why.sentence().to_owned() } else { format!("{}: {detail}", why.sentence()) };
        Self { status: "missing", value: None, message: Some(message), ..Self::value(quantity, 0.0, unit) }
    }

    pub(super) fn flagged(mut self, flags: FlagSet) -> Self {
        if !flags.is_empty() {
            self.status = "flagged";
            self.flags = flags.iter().map(crate::model::Flag::name).collect();
            let sentences: Vec<&str> = flags.iter().map(crate::model::Flag::sentence).collect();
            self.message = Some(sentences.join("; "));
        }
        self
    }

    /// The answer to a question that was refused.
    pub fn refused(quantity: &str, message: String) -> Self {
        Self { status: "refused", value: None, message: Some(message), ..Self::value(quantity, 0.0, "") }
    }
}

pub(super) fn needed<T>(value: Option<T>, option: &'static str) -> Result<T, Error> {
    value.ok_or_else(|| Error::CommandLine(format!("this look-up needs {option}")))
}

pub(super) fn instant(text: &str) -> Result<Instant, Error> {
    Instant::parse(text).map_err(|error| Error::CommandLine(format!("--time: {error}")))
}

/// A level at a time and in a band, or the number of usable levels or of bands.
///
/// # Errors
/// When the table cannot be read, or the question is incomplete.
pub fn look_up_levels(question: &LookUp) -> Result<Answer, Error> {
    let options = level_options_from(&question.settings)?;
    let quantity = question.quantity.as_deref().unwrap_or("level");
    let only = question.site.as_deref().unwrap_or("here");
    let mut table = open_levels_of(&question.files, &options, Some(only))?;
    match quantity {
        "count_valid" => Ok(Answer::value(quantity, table.survey()?.usable as f64, "1")),
        "count_bands" => {
            table.survey()?;
            Ok(Answer::value(quantity, table.names().bands.len() as f64, "1"))
        }
        "level" => {
            let time = instant(&needed(question.time.clone(), "--time")?)?;
            let unit = table.kind().unit();
            let mut found: Option<Answer> = None;
            let mut several = false;
            table.for_each(|names, row| -> Result<(), LevelError> {
                let band = names.bands[row.band as usize];
                let wanted_band = question.frequency_hz.is_none_or(|hz| (band.centre_hz / hz - 1.0).abs() < 0.03);
                let site = names.sites.get(row.site as usize).map_or("", String::as_str);
                let wanted_site = question.site.as_deref().is_none_or(|wanted| wanted == site);
                if !(row.window.contains(time) && wanted_band && wanted_site) {
                    return Ok(());
                }
                several |= found.is_some();
                if found.is_none() {
                    let mut answer = match row.reason {
                        None => Answer::value(quantity, row.level_db, unit),
                        Some(why) => Answer::missing(quantity, unit, why, &format!("row {}", row.row)),
                    };
                    answer.inputs = serde_json::json!({
                        "row": row.row, "site": site, "band_centre_hz": band.centre_hz, "band_low_hz": band.low_hz,
                        "band_high_hz": band.high_hz, "window_start": row.window.start.iso(),
                        "window_end": row.window.end.iso(),
                    });
                    found = Some(answer);
                }
                Ok(())
            })?;
            if several && (question.site.is_none() || question.frequency_hz.is_none()) {
                return Err(Error::CommandLine(
                    "several levels answer this; say which with --frequency-hz and --site".to_owned(),
                ));
            }
            Ok(found.unwrap_or_else(|| Answer::missing(quantity, unit, Missing::NoLevel, &format!("at {time}"))))
        }
        other => Err(unknown(other, "level, count_valid or count_bands")),
    }
}

pub(super) fn unknown(quantity: &str, expected: &str) -> Error {
    Error::CommandLine(format!("--quantity {quantity} is not known here; expected {expected}"))
}

/// A coordinate or depth of a site in a site list.
///
/// # Errors
/// When the list cannot be read, has no such site, or the site's row is refused.
pub fn look_up_sites(question: &LookUp) -> Result<Answer, Error> {
    let quantity = question.quantity.as_deref().unwrap_or("latitude");
    let id = needed(question.site.as_deref(), "--site")?;
    let path = question.files.first().expect("the command line asks for a file");
    let (site, notes) = find_site(path, &SiteOptions::default(), id)?;
    let point = site.track.nominal();
    let mut answer = match quantity {
        "latitude" => point.map(|p| Answer::value(quantity, p.latitude_deg(), "degree_north")),
        "longitude" => point.map(|p| Answer::value(quantity, p.longitude_deg(), "degree_east")),
        "depth" => site.sensors.first().and_then(|sensor| sensor.depth_m).map(|m| Answer::value(quantity, m, "m")),
        other => return Err(unknown(other, "latitude, longitude or depth")),
    }
    .unwrap_or_else(|| Answer::missing(quantity, "", Missing::NoPosition, "the list does not say it"));
    answer.inputs = serde_json::json!({ "file": path, "site": site.id, "notes": notes });
    Ok(answer)
}

/// Wind at a place and an instant.
///
/// # Errors
/// When a file cannot be read or understood, or the question is incomplete.
pub fn look_up_wind(question: &LookUp) -> Result<Answer, Error> {
    let options = wind_options_from(&question.settings)?;
    let quantity = question.quantity.as_deref().unwrap_or("wind_speed");
    let unit = match quantity {
        "wind_speed" | "eastward_wind" | "northward_wind" => "m s-1",
        "wind_from_direction" => "degree",
        other => return Err(unknown(other, "wind_speed, wind_from_direction, eastward_wind or northward_wind")),
    };
    let latitude_deg = needed(question.latitude_deg, "--latitude")?;
    let longitude_deg = needed(question.longitude_deg, "--longitude")?;
    let place = Point::new(latitude_deg, longitude_deg).map_err(|error| Error::CommandLine(error.to_string()))?;
    let time = instant(&needed(question.time.clone(), "--time")?)?;
    let source = open_wind(SourceId("wind".into()), &question.files, &options)?;
    let sensors = Vec::new();
    let site = Site { id: "here".into(), track: Track::Fixed(place), sensors };
    let window = Window { start: time, end: time };
    let series = sample_wind(&source, &[site], Some(window), &question.spatial, &Silent)?.remove(0);
    let sampled = wind_at(&series, time);
    let around = steps_around(&series, time, sampled.value().is_some());
    let inputs = serde_json::json!({
        "files": source.files().iter().map(|(path, format)| serde_json::json!({ "file": path, "format": format })).collect::<Vec<_>>(),
        "variables": source.variables(),
        "nodes": series.nodes,
        "steps": around.iter().map(|step| step.iso()).collect::<Vec<_>>(),
        "height_m": series.height_m,
        "notes": source.warnings(),
    });
    let value = sampled.value().map(|wind| match quantity {
        "eastward_wind" => wind.eastward_mean_m_s,
        "northward_wind" => wind.northward_mean_m_s,
        "wind_from_direction" => Compass::<ComingFrom>::of_wind(wind.eastward_mean_m_s, wind.northward_mean_m_s)
            .map_or(f64::NAN, Compass::degrees),
        _ => wind.speed_mean_m_s,
    });
    let mut answer = match (value, sampled.missing()) {
        (Some(value), _) if value.is_finite() => Answer::value(quantity, value, unit).flagged(sampled.flags()),
        (Some(_), _) => Answer {
            message: Some("the wind has no direction here: a calm, or a source that gives the speed alone".to_owned()),
            ..Answer::missing(quantity, unit, Missing::NoWind, "")
        },
        (None, why) => {
            let why = why.unwrap_or(Missing::NoWind);
            Answer::missing(quantity, unit, why, &detail(&source, why, &around))
        }
    };
    answer.inputs = inputs;
    Ok(answer)
}

/// The steps on either side of an instant, or the step at it: those with a value where there is an answer (steps without one
/// were bridged), else the nearest.
fn steps_around(series: &WindSeries, time: Instant, with_value: bool) -> Vec<Instant> {
    let known = series.steps.iter().zip(&series.missing).filter(|(_, why)| why.is_none() || !with_value);
    let steps: Vec<Instant> = known.map(|(step, _)| *step).collect();
    let after = steps.partition_point(|step| *step < time);
    if steps.get(after) == Some(&time) {
        return vec![time];
    }
    steps[after.saturating_sub(1)..(after + 1).min(steps.len())].to_vec()
}

/// The limits that a missing value lies outside of.
fn detail(source: &WindSource, why: Missing, around: &[Instant]) -> String {
    let meta = source.meta();
    match why {
        Missing::OutsideGrid => {
            let [south, north, west, east] = meta.grid.limits();
            let (rows, columns) = meta.grid.size();
            if rows == 1 || columns == 1 {
                return format!(
                    "the grid has {rows} x {columns} nodes from {south} to {north} degrees north and from {west} to {east} degrees east, which does not surround a site; the nearest node can be taken (`match.spatial = \"nearest\"`)"
                );
            }
            format!("the grid runs from {south} to {north} degrees north and from {west} to {east} degrees east")
        }
        Missing::OutsideTime => match (meta.steps.first(), meta.steps.last()) {
            (Some(first), Some(last)) => format!("the field runs from {first} to {last}"),
            _ => String::new(),
        },
        Missing::TimeGap => match around {
            [first, .., last] => {
                format!("from {first} to {last}; the limit is {} h", source.max_gap_ms() as f64 / 3.6e6)
            }
            _ => String::new(),
        },
        _ => String::new(),
    }
}
