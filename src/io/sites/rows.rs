//! The rows of a list of sites: which columns they have, and what one row says.

use super::coordinate::{Axis, parse_coordinate};
use super::error::SiteError;
use super::list::SiteOptions;
use crate::io::delimited::{DecimalMark, plain_number};
use crate::io::table::{MissingTexts, Plain, PlainTable, PlainValues, TextColumn};
use crate::io::time_text::{TimeReader, TimeRules};
use crate::model::{Deployment, Point};
use crate::units::{Instant, Window};
use std::path::{Path, PathBuf};

const SITE: &[&str] =
    &["site", "site_id", "id", "site_name", "name", "station", "station_id", "station_name", "mooring"];
const LATITUDE: &[&str] = &[
    "latitude",
    "lat",
    "latitude_deg",
    "lat_deg",
    "latitude_degrees",
    "latitude_degrees_north",
    "lat_n",
    "latitude_n",
    "latitude_deg_n",
    "lat_deg_n",
    "decimal_latitude",
];
const LONGITUDE: &[&str] = &[
    "longitude",
    "lon",
    "long",
    "lng",
    "longitude_deg",
    "lon_deg",
    "longitude_degrees",
    "longitude_degrees_east",
    "lon_e",
    "longitude_e",
    "longitude_deg_e",
    "lon_deg_e",
    "decimal_longitude",
];
const WEST: &[&str] =
    &["longitude_w", "lon_w", "longitude_deg_w", "lon_deg_w", "longitude_degrees_west", "longitude_west"];
const DEPTH: &[&str] = &[
    "depth",
    "depth_m",
    "sensor_depth",
    "sensor_depth_m",
    "instrument_depth",
    "instrument_depth_m",
    "hydrophone_depth",
    "hydrophone_depth_m",
];
const SENSOR: &[&str] =
    &["sensor", "sensor_id", "sensor_name", "instrument", "instrument_id", "hydrophone", "hydrophone_id", "recorder"];
const DEPLOYMENT: &[&str] = &["deployment", "deployment_id", "deployment_name"];
const START: &[&str] =
    &["start", "start_utc", "start_time", "deployment_start", "deployment_start_utc", "deployed", "deployed_utc"];
const END: &[&str] =
    &["end", "end_utc", "end_time", "deployment_end", "deployment_end_utc", "recovered", "recovered_utc"];

/// An open start and an open end of a deployment: the years 1 and 9999.
const OPEN: (Instant, Instant) = (Instant(-62_135_596_800_000), Instant(253_402_300_800_000));

/// One row as texts.
pub(super) struct RowText<'a> {
    pub(super) place: String,
    pub(super) row: u64,
    pub(super) site: &'a str,
    pub(super) latitude: &'a str,
    pub(super) longitude: &'a str,
    pub(super) depth: &'a str,
    pub(super) sensor: &'a str,
    pub(super) deployment: &'a str,
    pub(super) start: &'a str,
    pub(super) end: &'a str,
}

/// One row understood.
pub(super) struct RowSite {
    pub(super) place: String,
    pub(super) row: u64,
    pub(super) site: String,
    pub(super) point: Point,
    pub(super) sensor: String,
    pub(super) depth_m: Option<f64>,
    pub(super) deployment: Option<Deployment>,
}

/// The columns of a list as texts.
pub(super) struct Columns {
    pub(super) path: PathBuf,
    pub(super) row_word: &'static str,
    pub(super) texts: Vec<Option<TextColumn>>,
    pub(super) rows: Vec<u64>,
    pub(super) west: bool,
    pub(super) notes: Vec<String>,
}

impl Columns {
    pub(super) fn open(path: &Path, options: &SiteOptions) -> Result<Self, SiteError> {
        let table = PlainTable::open(path, &options.text, "sites")?;
        let columns = &options.columns;
        let find = |named: &Option<String>, known: &[&str], role, key: &str| {
            table.find_plain(named.as_deref(), known, role, key)
        };
        let need = |found: Option<usize>, known: &[&str], role, key: &str| {
            found.ok_or_else(|| table.no_column(role, known, key))
        };
        let site = need(find(&columns.site, SITE, "the site", "sites.site")?, &SITE[..3], "the site", "sites.site")?;
        let latitude = find(&columns.latitude, LATITUDE, "the latitude", "sites.latitude")?;
        let latitude = need(latitude, &LATITUDE[..3], "the latitude", "sites.latitude")?;
        let mut longitude = find(&columns.longitude, LONGITUDE, "the longitude", "sites.longitude")?;
        let west =
            if longitude.is_none() { table.find_plain(None, WEST, "the longitude", "sites.longitude")? } else { None };
        longitude = longitude.or(west);
        let longitude = need(longitude, &LONGITUDE[..3], "the longitude", "sites.longitude")?;
        let optional = [
            find(&columns.depth, DEPTH, "the depth", "sites.depth")?,
            find(&columns.sensor, SENSOR, "the sensor", "sites.sensor")?,
            find(&columns.deployment, DEPLOYMENT, "the deployment", "sites.deployment")?,
            find(&columns.start, START, "the start of the deployment", "sites.start")?,
            find(&columns.end, END, "the end of the deployment", "sites.end")?,
        ];
        let all: Vec<Option<usize>> =
            [Some(site), Some(latitude), Some(longitude)].into_iter().chain(optional).collect();
        let wanted: Vec<(usize, Plain)> = all.iter().flatten().map(|column| (*column, Plain::Text)).collect();
        let (values, rows, _) = table.read(&wanted, options.times, &MissingTexts::default())?;
        let mut read = values.into_iter().map(|values| match values {
            PlainValues::Text(texts, codes) => TextColumn { texts, codes },
            PlainValues::Number(_) | PlainValues::Time(_) => TextColumn::default(),
        });
        let texts = all.iter().map(|column| column.and_then(|_| read.next())).collect();
        let mut notes = table.notes().to_vec();
        if west.is_some() {
            notes.push(format!("column `{}` counts degrees west", table.names()[longitude]));
        }
        Ok(Self { path: path.to_owned(), row_word: table.row_word(), texts, rows, west: west.is_some(), notes })
    }

    pub(super) fn row(&self, index: usize) -> RowText<'_> {
        let text =
            |column: usize| self.texts.get(column).and_then(Option::as_ref).map_or("", |texts| texts.text(index));
        RowText {
            place: format!("{} {}", self.row_word, self.rows[index]),
            row: self.rows[index],
            site: text(0),
            latitude: text(1),
            longitude: text(2),
            depth: text(3),
            sensor: text(4),
            deployment: text(5),
            start: text(6),
            end: text(7),
        }
    }

    pub(super) fn understood(&self, row: &RowText<'_>, times: TimeRules) -> Result<RowSite, SiteError> {
        let (path, place) = (self.path.clone(), row.place.clone());
        if row.site.is_empty() {
            return Err(SiteError::NoName { path, place });
        }
        let point = position(&self.path, &row.place, row.latitude, row.longitude, self.west)?;
        let depth_m = match row.depth {
            "" => None,
            text => {
                let text = text.trim_end_matches('m').trim_end();
                let mark = if text.contains(',') { DecimalMark::Comma } else { DecimalMark::Point };
                match plain_number(text.as_bytes(), mark) {
                    Some(depth_m) if (0.0..=11_000.0).contains(&depth_m) => Some(depth_m),
                    _ => return Err(SiteError::Depth { path, place, found: row.depth.to_owned() }),
                }
            }
        };
        let deployment = self.deployment(row, times)?;
        let sensor = if row.sensor.is_empty() { "1" } else { row.sensor }.to_owned();
        Ok(RowSite { place, row: row.row, site: row.site.to_owned(), point, sensor, depth_m, deployment })
    }

    fn deployment(&self, row: &RowText<'_>, times: TimeRules) -> Result<Option<Deployment>, SiteError> {
        if row.start.is_empty() && row.end.is_empty() && row.deployment.is_empty() {
            return Ok(None);
        }
        let wrong = |what, found: &str, expected: &str| SiteError::Time {
            path: self.path.clone(),
            place: row.place.clone(),
            what,
            found: found.to_owned(),
            expected: expected.to_owned(),
        };
        let read = |what, text: &str, open| {
            if text.is_empty() {
                return Ok(open);
            }
            TimeReader::new(times).read(text.as_bytes()).map_err(|problem| wrong(what, text, problem.expected().0))
        };
        let start = read("the start of the deployment", row.start, OPEN.0)?;
        let end = read("the end of the deployment", row.end, OPEN.1)?;
        let window = Window::new(start, end)
            .filter(|window| window.length_ms() > 0)
            .ok_or_else(|| wrong("the end of the deployment", row.end, "a time after its start"))?;
        Ok(Some(Deployment { id: row.deployment.to_owned(), window }))
    }
}

/// The position of a row.
pub(super) fn position(
    path: &Path,
    place: &str,
    latitude: &str,
    longitude: &str,
    west: bool,
) -> Result<Point, SiteError> {
    let read = |text: &str, axis: Axis| {
        parse_coordinate(text, axis).map_err(|problem| SiteError::Coordinate {
            path: path.to_owned(),
            place: place.to_owned(),
            axis: axis.name(),
            found: text.to_owned(),
            problem,
        })
    };
    let latitude_deg = read(latitude, Axis::Latitude)?;
    let mut longitude_deg = read(longitude, Axis::Longitude)?;
    if west {
        longitude_deg = -longitude_deg;
    }
    Point::new(latitude_deg, longitude_deg).map_err(|problem| SiteError::Position {
        path: path.to_owned(),
        place: place.to_owned(),
        problem,
    })
}

/// A position for a message.
pub(super) fn shown(point: Point) -> String {
    format!("{} N {} E", point.latitude_deg(), point.longitude_deg())
}
