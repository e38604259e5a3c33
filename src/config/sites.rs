//! `[[site]]` and `[sites]`: where sound is measured.

use super::error::{Complaint, StudyError};
use super::place::{DepthM, LatitudeDeg, LongitudeDeg, in_words, time_rules};
use crate::io::delimited::TextOptions;
use crate::io::sites::{SiteColumns, SiteOptions};
use crate::model::{Deployment, Point, Sensor, Site, Track};
use crate::units::{Instant, Window};
use serde::{Deserialize, Serialize};
use std::path::{Path, PathBuf};
use toml::Spanned;

/// `[[site]]` as written.
#[derive(Debug, Clone, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct RawSite {
    id: Spanned<String>,
    latitude_deg: Option<LatitudeDeg>,
    longitude_deg: Option<LongitudeDeg>,
    track: Option<Spanned<String>>,
    depth_m: Option<DepthM>,
    #[serde(default)]
    sensor: Vec<RawSensor>,
}

/// `[[site.sensor]]` as written.
#[derive(Debug, Clone, Deserialize)]
#[serde(deny_unknown_fields)]
struct RawSensor {
    id: Spanned<String>,
    depth_m: Option<DepthM>,
    #[serde(default)]
    deployment: Vec<RawDeployment>,
}

/// `[[site.sensor.deployment]]` as written.
#[derive(Debug, Clone, Deserialize)]
#[serde(deny_unknown_fields)]
struct RawDeployment {
    id: String,
    start: Spanned<TimeText>,
    end: Spanned<TimeText>,
}

/// A time in the study file: a TOML date-time, or a text in ISO 8601.
#[derive(Debug, Clone, Copy, Deserialize)]
#[serde(try_from = "toml::Value")]
pub(super) struct TimeText(pub(super) Instant);

impl TryFrom<toml::Value> for TimeText {
    type Error = String;

    fn try_from(value: toml::Value) -> Result<Self, String> {
        let text = match value {
            toml::Value::String(text) => text,
            toml::Value::Datetime(time) => time.to_string(),
            other => return Err(format!("{other} is no time; expected such as 2031-05-04T13:00:00Z")),
        };
        Instant::parse(&text).map(Self).map_err(|error| error.to_string())
    }
}

/// `[sites]` as written.
#[derive(Debug, Clone, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct RawSites {
    file: Spanned<String>,
    site: Option<String>,
    latitude: Option<String>,
    longitude: Option<String>,
    depth: Option<String>,
    sensor: Option<String>,
    deployment: Option<String>,
    start: Option<String>,
    end: Option<String>,
    check_signs: Option<bool>,
    time_zone: Option<String>,
    time_unit: Option<String>,
    date_order: Option<String>,
    delimiter: Option<String>,
    decimal_mark: Option<String>,
    encoding: Option<String>,
    comment: Option<String>,
}

impl RawSites {
    fn options(&self) -> Result<SiteOptions, String> {
        let times =
            time_rules("sites", self.time_zone.as_deref(), self.time_unit.as_deref(), self.date_order.as_deref())?;
        Ok(SiteOptions {
            columns: SiteColumns {
                site: self.site.clone(),
                latitude: self.latitude.clone(),
                longitude: self.longitude.clone(),
                depth: self.depth.clone(),
                sensor: self.sensor.clone(),
                deployment: self.deployment.clone(),
                start: self.start.clone(),
                end: self.end.clone(),
            },
            times,
            text: TextOptions {
                delimiter: self.delimiter.clone(),
                decimal_mark: self.decimal_mark.clone(),
                encoding: self.encoding.clone(),
                comment: self.comment.clone(),
            },
            check_signs: self.check_signs.unwrap_or(SiteOptions::default().check_signs),
        })
    }
}

/// A site of the study file; its track may still be a file to read.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SitesInput {
    /// Sites written in the study file itself; the track file where one is named.
    pub sites: Vec<(Site, Option<PathBuf>)>,
    /// A site list (CSV).
    pub file: Option<PathBuf>,
    /// How to read the list and tracks.
    #[serde(serialize_with = "in_words")]
    pub options: SiteOptions,
}

impl SitesInput {
    pub(super) fn resolve(
        list: Vec<RawSite>,
        file: Option<RawSites>,
        base: &Path,
        complaint: Complaint<'_>,
    ) -> Result<Self, StudyError> {
        let options = match &file {
            Some(raw) => raw.options().map_err(|problem| complaint.at(raw.file.span().start, problem))?,
            None => SiteOptions::default(),
        };
        let file = file
            .map(|raw| {
                let path = base.join(raw.file.get_ref());
                if path.is_file() {
                    Ok(path)
                } else {
                    Err(complaint
                        .at(raw.file.span().start, format!("`sites.file`: there is no file {}", path.display())))
                }
            })
            .transpose()?;
        if list.is_empty() && file.is_none() {
            return Err(complaint.lacking(
                "no site: give `[[site]]` with id, latitude_deg and longitude_deg, or `[sites] file = \"sites.csv\"`",
            ));
        }
        let mut sites: Vec<(Site, Option<PathBuf>)> = Vec::new();
        for raw in list {
            let place = raw.id.span().start;
            if sites.iter().any(|(site, _)| site.id == *raw.id.get_ref()) {
                return Err(complaint.at(place, format!("site `{}` is there twice; ids must differ", raw.id.get_ref())));
            }
            sites.push(raw.resolve(base, complaint)?);
        }
        Ok(Self { sites, file, options })
    }
}

impl RawSite {
    fn resolve(self, base: &Path, complaint: Complaint<'_>) -> Result<(Site, Option<PathBuf>), StudyError> {
        let place = self.id.span().start;
        let id = self.id.into_inner();
        let (track, file) = match (self.latitude_deg, self.longitude_deg, self.track) {
            (Some(latitude), Some(longitude), None) => {
                let point = Point::new(latitude.0, longitude.0)
                    .map_err(|error| complaint.at(place, format!("site `{id}`: {error}")))?;
                (Track::Fixed(point), None)
            }
            (None, None, Some(track)) => {
                let path = base.join(track.get_ref());
                if !path.is_file() {
                    return Err(complaint
                        .at(track.span().start, format!("site `{id}`: there is no track file {}", path.display())));
                }
                (Track::Moving(Vec::new()), Some(path))
            }
            _ => {
                return Err(complaint
                    .at(place, format!("site `{id}` needs either `latitude_deg` and `longitude_deg`, or `track`")));
            }
        };
        let mut sensors: Vec<Sensor> = Vec::new();
        for raw in self.sensor {
            if sensors.iter().any(|known| known.id == *raw.id.get_ref()) {
                let problem = format!("site `{id}`: sensor `{}` is there twice; ids must differ", raw.id.get_ref());
                return Err(complaint.at(raw.id.span().start, problem));
            }
            let mut deployments = Vec::new();
            for deployment in raw.deployment {
                let (start, end) = (deployment.start.get_ref().0, deployment.end.get_ref().0);
                let window = Window::new(start, end).filter(|window| window.length_ms() > 0).ok_or_else(|| {
                    complaint.at(
                        deployment.end.span().start,
                        format!("deployment `{}` ends at {end}, not after its start {start}", deployment.id),
                    )
                })?;
                deployments.push(Deployment { id: deployment.id, window });
            }
            let depth_m = raw.depth_m.or(self.depth_m).map(|depth| depth.0);
            sensors.push(Sensor { id: raw.id.into_inner(), depth_m, deployments });
        }
        if sensors.is_empty() {
            let depth_m = self.depth_m.map(|depth| depth.0);
            sensors.push(Sensor { id: "1".to_owned(), depth_m, deployments: Vec::new() });
        }
        Ok((Site { id, track, sensors }, file))
    }
}
