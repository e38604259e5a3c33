//! Reading the track of a moving site.

use super::error::SiteError;
use super::list::SiteOptions;
use super::rows::{position, shown};
use crate::io::table::{Conflict, MissingTexts, Plain, PlainTable, PlainValues, TextColumn};
use crate::model::{Point, Track};
use crate::units::Instant;
use std::path::Path;

/// Nothing that carries a hydrophone moves faster, m/s (common practice).
const FASTEST_M_S: f64 = 100.0;

/// A track with remarks.
#[derive(Debug, Clone, PartialEq)]
pub struct TrackList {
    /// The track: positions in increasing time.
    pub track: Track,
    /// Remarks.
    pub notes: Vec<String>,
}

const TIME: &[&str] = &["time", "time_utc", "utc", "datetime", "timestamp", "date_time"];
const LATITUDE: &[&str] = &["latitude", "lat", "latitude_deg", "lat_deg", "latitude_degrees"];
const LONGITUDE: &[&str] = &["longitude", "lon", "long", "lng", "longitude_deg", "lon_deg", "longitude_degrees"];

/// Reads a track: columns time, latitude, longitude. Rows may come in any order.
///
/// # Errors
/// When a row cannot be read, two rows put the site at two places at once, or the site would move too fast.
pub fn read_track(path: &Path, options: &SiteOptions) -> Result<TrackList, SiteError> {
    let table = PlainTable::open(path, &options.text, "sites")?;
    let need = |named: Option<&str>, known: &[&str], role, key: &str| {
        table.find_plain(named, known, role, key)?.ok_or_else(|| table.no_column(role, known, key))
    };
    let time = need(None, TIME, "the time", "sites.time")?;
    let latitude = need(options.columns.latitude.as_deref(), LATITUDE, "the latitude", "sites.latitude")?;
    let longitude = need(options.columns.longitude.as_deref(), LONGITUDE, "the longitude", "sites.longitude")?;
    let wanted = [(time, Plain::Time), (latitude, Plain::Text), (longitude, Plain::Text)];
    let (values, rows, remarks) = table.read(&wanted, options.times, &MissingTexts::default())?;
    let mut notes = table.notes().to_vec();
    if remarks.naive && options.times.zone_minutes.is_none() {
        notes.push("times of the track without zone are taken as UTC".to_owned());
    }
    let mut texts = Vec::new();
    let mut times = Vec::new();
    for values in values {
        match values {
            PlainValues::Time(ms) => times = ms,
            PlainValues::Text(distinct, codes) => texts.push(TextColumn { texts: distinct, codes }),
            PlainValues::Number(_) => {}
        }
    }
    let mut positions: Vec<(Instant, Point, u64)> = Vec::with_capacity(times.len());
    let place = |row: u64| format!("{} {row}", table.row_word());
    for (index, ms) in times.iter().enumerate() {
        let row = rows[index];
        let point = position(path, &place(row), texts[0].text(index), texts[1].text(index), false)?;
        positions.push((Instant(*ms), point, row));
    }
    if positions.windows(2).any(|pair| pair[1].0 < pair[0].0) {
        notes.push("the rows of the track are not in order of time; they were sorted".to_owned());
        positions.sort_by_key(|(time, ..)| *time);
    }
    let mut kept: Vec<(Instant, Point, u64)> = Vec::with_capacity(positions.len());
    let mut merged = 0_usize;
    for (time, point, row) in positions {
        if let Some((before_time, before, before_row)) = kept.last().copied() {
            let distance_km = distance_km(before, point);
            if time == before_time {
                if distance_km > 0.001 {
                    return Err(Box::new(Conflict {
                        path: path.to_owned(),
                        place: place(row),
                        what: format!("the track at {}", time.iso()),
                        found: format!("at {}", shown(point)),
                        expected: format!("at {}", shown(before)),
                        first: place(before_row),
                        rule: "one position at a time",
                    })
                    .into());
                }
                merged += 1;
                continue;
            }
            let seconds = (time.0 - before_time.0) as f64 / 1000.0;
            if distance_km * 1000.0 > FASTEST_M_S * seconds + 500.0 {
                return Err(SiteError::TooFast {
                    path: path.to_owned(),
                    place: place(row),
                    distance_km,
                    seconds,
                    limit_m_s: FASTEST_M_S,
                });
            }
        }
        kept.push((time, point, row));
    }
    if merged > 0 {
        notes.push(format!("{merged} rows of the track repeat a time and its position; they count once"));
    }
    let track = Track::Moving(kept.into_iter().map(|(time, point, _)| (time, point)).collect());
    Ok(TrackList { track, notes })
}

/// Great-circle distance on a sphere of 6371 km (haversine).
fn distance_km(a: Point, b: Point) -> f64 {
    let (latitude_a, latitude_b) = (a.latitude_deg().to_radians(), b.latitude_deg().to_radians());
    let half_latitude = (latitude_b - latitude_a) / 2.0;
    let half_longitude = (b.longitude_deg() - a.longitude_deg()).to_radians() / 2.0;
    let square = |x: f64| x * x;
    let haversine = square(libm::sin(half_latitude))
        + libm::cos(latitude_a) * libm::cos(latitude_b) * square(libm::sin(half_longitude));
    2.0 * 6371.0 * libm::asin(haversine.sqrt().min(1.0))
}
