//! Reading a list of sites.

use super::error::SiteError;
use super::rows::{Columns, RowSite, shown};
use super::suspicion::slip;
use crate::io::delimited::TextOptions;
use crate::io::table::Conflict;
use crate::io::time_text::TimeRules;
use crate::model::{Deployment, Point, Sensor, Site, Track};
use std::path::Path;

/// Names of columns, where they are not recognised by themselves. Matched without regard to case.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct SiteColumns {
    /// Site name.
    pub site: Option<String>,
    /// Latitude.
    pub latitude: Option<String>,
    /// Longitude.
    pub longitude: Option<String>,
    /// Sensor depth, m.
    pub depth: Option<String>,
    /// Sensor name.
    pub sensor: Option<String>,
    /// Deployment name.
    pub deployment: Option<String>,
    /// Start of the deployment.
    pub start: Option<String>,
    /// End of the deployment.
    pub end: Option<String>,
}

/// How to read a list of sites or a track.
#[derive(Debug, Clone, PartialEq)]
pub struct SiteOptions {
    /// Names of columns.
    pub columns: SiteColumns,
    /// How to read times.
    pub times: TimeRules,
    /// Delimiter, decimal mark, encoding, comments of delimited text.
    pub text: TextOptions,
    /// Whether positions that look like a lost sign or a swap are refused.
    pub check_signs: bool,
}

impl Default for SiteOptions {
    fn default() -> Self {
        Self {
            columns: SiteColumns::default(),
            times: TimeRules::default(),
            text: TextOptions::default(),
            check_signs: true,
        }
    }
}

/// Sites as a file lists them.
#[derive(Debug, Clone, PartialEq)]
pub struct SiteList {
    /// The sites in the order of their first row.
    pub sites: Vec<Site>,
    /// Line or row of each site's first row.
    pub rows: Vec<u64>,
    /// Remarks.
    pub notes: Vec<String>,
}

/// Reads a list of sites. Several rows of a site are its sensors, or deployments of a sensor.
///
/// # Errors
/// At the first row that cannot be right; the message names its line.
pub fn read_sites(path: &Path, options: &SiteOptions) -> Result<SiteList, SiteError> {
    let columns = Columns::open(path, options)?;
    let mut rows = Vec::with_capacity(columns.rows.len());
    for index in 0..columns.rows.len() {
        rows.push(columns.understood(&columns.row(index), options.times)?);
    }
    let list = gather(path, &rows, columns.notes)?;
    if options.check_signs {
        check_signs(path, &list, &rows, None)?;
    }
    Ok(list)
}

/// Looks one site up. Rows of other sites may be wrong: then the note says so.
///
/// # Errors
/// When the site is not in the list, or when its own row cannot be right.
pub fn find_site(path: &Path, options: &SiteOptions, wanted: &str) -> Result<(Site, Vec<String>), SiteError> {
    let mut columns = Columns::open(path, options)?;
    let mut notes = std::mem::take(&mut columns.notes);
    let mut rows = Vec::new();
    let mut known: Vec<String> = Vec::new();
    let mut wrong = 0_usize;
    for index in 0..columns.rows.len() {
        let row = columns.row(index);
        if !known.iter().any(|name| name == row.site) {
            known.push(row.site.to_owned());
        }
        match columns.understood(&row, options.times) {
            Ok(row) => rows.push(row),
            Err(error) if row.site == wanted => return Err(error),
            Err(_) => wrong += 1,
        }
    }
    if wrong > 0 {
        notes.push(format!("{wrong} rows of other sites cannot be read"));
    }
    let own: Vec<&RowSite> = rows.iter().filter(|row| row.site == wanted).collect();
    let unknown = || {
        let scores = known.iter().map(|name| (strsim::jaro_winkler(name, wanted), name));
        let nearest = scores.max_by(|a, b| a.0.total_cmp(&b.0)).filter(|(score, _)| *score > 0.8);
        let shown: Vec<String> = known.iter().take(12).map(|name| format!("`{name}`")).collect();
        SiteError::Unknown {
            path: path.to_owned(),
            wanted: wanted.to_owned(),
            suggestion: nearest.map(|(_, name)| name.clone()),
            known: shown.join(", "),
        }
    };
    if own.is_empty() {
        return Err(unknown());
    }
    let list = gather(path, own, Vec::new())?;
    if options.check_signs {
        check_signs(path, &list, &rows, Some(wanted))?;
    }
    let site = list.sites.into_iter().next().ok_or_else(unknown)?;
    Ok((site, notes))
}

/// Rows of a site become its sensors and their deployments.
fn gather<'a>(
    path: &Path,
    rows: impl IntoIterator<Item = &'a RowSite>,
    notes: Vec<String>,
) -> Result<SiteList, SiteError> {
    let mut list = SiteList { sites: Vec::new(), rows: Vec::new(), notes };
    // First row of each site, and of each sensor with its last deployment.
    let mut firsts: Vec<&RowSite> = Vec::new();
    let mut seen: Vec<&RowSite> = Vec::new();
    for row in rows {
        let at = match firsts.iter().position(|first| first.site == row.site) {
            None => {
                firsts.push(row);
                list.rows.push(row.row);
                list.sites.push(Site { id: row.site.clone(), track: Track::Fixed(row.point), sensors: Vec::new() });
                list.sites.len() - 1
            }
            Some(at) => at,
        };
        let first = firsts[at];
        let near = |a: f64, b: f64| (a - b).abs() < 1e-7;
        if !near(first.point.latitude_deg(), row.point.latitude_deg())
            || !near(first.point.longitude_deg(), row.point.longitude_deg())
        {
            return Err(Box::new(Conflict {
                path: path.to_owned(),
                place: row.place.clone(),
                what: format!("site `{}`", row.site),
                found: format!("at {}", shown(row.point)),
                expected: format!("at {}", shown(first.point)),
                first: first.place.clone(),
                rule: "one position for a site (use two names, or a track)",
            })
            .into());
        }
        let before = seen.iter().find(|before| before.site == row.site && before.sensor == row.sensor);
        let twice = |what: String, before: &RowSite| SiteError::Twice {
            path: path.to_owned(),
            place: row.place.clone(),
            what,
            first: before.place.clone(),
        };
        let sensors = &mut list.sites[at].sensors;
        match before {
            None => {
                let deployments = row.deployment.iter().map(|deployment| named(deployment, 1)).collect();
                sensors.push(Sensor { id: row.sensor.clone(), depth_m: row.depth_m, deployments });
            }
            Some(before) => {
                let (Some(deployment), Some(_)) = (&row.deployment, &before.deployment) else {
                    return Err(twice(format!("site `{}`, sensor `{}`", row.site, row.sensor), before));
                };
                let sensor = sensors.iter_mut().find(|sensor| sensor.id == row.sensor).expect("an earlier row made it");
                let deployment = named(deployment, sensor.deployments.len() + 1);
                let overlaps = |other: &Deployment| {
                    other.id == deployment.id
                        || (other.window.start < deployment.window.end && deployment.window.start < other.window.end)
                };
                if let Some(other) = sensor.deployments.iter().find(|other| overlaps(other)) {
                    let what = format!(
                        "site `{}`, sensor `{}`, deployment `{}`, or an overlapping one",
                        row.site, row.sensor, other.id
                    );
                    return Err(twice(what, before));
                }
                sensor.deployments.push(deployment);
            }
        }
        seen.push(row);
    }
    Ok(list)
}

/// A deployment with a name: its own, or its number.
fn named(deployment: &Deployment, number: usize) -> Deployment {
    let id = if deployment.id.is_empty() { number.to_string() } else { deployment.id.clone() };
    Deployment { id, window: deployment.window }
}

/// Refuses positions that look like a lost sign or a swap; of one site only where it is named.
fn check_signs(path: &Path, list: &SiteList, rows: &[RowSite], only: Option<&str>) -> Result<(), SiteError> {
    let mut points: Vec<(&str, Point, &str)> = Vec::new();
    for row in rows {
        if !points.iter().any(|(site, ..)| *site == row.site) {
            points.push((&row.site, row.point, &row.place));
        }
    }
    for (site, point, place) in &points {
        if only.is_some_and(|only| only != *site) || !list.sites.iter().any(|known| known.id == **site) {
            continue;
        }
        let others: Vec<Point> =
            points.iter().filter(|(other, ..)| other != site).map(|(_, point, _)| *point).collect();
        if let Some(slip) = slip(*point, &others) {
            return Err(SiteError::Suspicious {
                path: path.to_owned(),
                place: (*place).to_owned(),
                found: shown(*point),
                distance_deg: slip.distance_deg,
                remedy: slip.remedy,
                key: "sites.check_signs",
            });
        }
    }
    Ok(())
}
